package quadrature

import (
	"errors"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// vec is a function on a mesh: values at all nodes and, where they are known
// better than by differencing, its first two derivatives.
type vec struct {
	v, d1, d2 []float64
	// rel is the rounding error relative to the average of |v|: differences of
	// nearly equal functions have a larger one.
	rel float64
}

const unitRounding = 2.3e-16

// level is the fast problem on one mesh.
type level struct {
	cheb   *chebyshev
	b      *builder
	ps     []*panel
	iv     interval
	mirror bool // coordinates are -y
	reach  string

	rho   []float64 // stationary density at the nodes
	wq    []float64 // quadrature weights including rho
	shape shape
}

// shape is what depends on the topology: how Phi' follows from r = g - <g>.
type shape interface {
	slope(l *level, r []float64) (psi []float64, start int)
}

func (l *level) nodes() int { return len(l.ps) * l.cheb.n }

func (l *level) each(f func(i int, p *panel, lo, hi int)) {
	n := l.cheb.n
	for i, p := range l.ps {
		f(i, p, i*n, (i+1)*n)
	}
}

// normalize sets rho and the weights from the logarithm of the density.
func (l *level) normalize(logRho []float64) {
	top := math.Inf(-1)
	for _, x := range logRho {
		top = math.Max(top, x)
	}
	l.rho, l.wq = make([]float64, l.nodes()), make([]float64, l.nodes())
	l.each(func(_ int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			l.rho[j] = math.Exp(logRho[j] - top)
			l.wq[j] = l.rho[j] * l.cheb.weights[j-lo] * p.jac[j-lo]
		}
	})
	one := make([]float64, l.nodes())
	for j := range one {
		one[j] = 1
	}
	z, _ := l.integrate(one)
	for j := range l.rho {
		l.rho[j] /= z.Value
		l.wq[j] /= z.Value
	}
}

// integrate is the average of u with what lies beyond the last panels.
func (l *level) integrate(u []float64) (fast.Value, error) {
	var s, abs float64
	for j, x := range u {
		s += x * l.wq[j]
		abs += math.Abs(x * l.wq[j])
	}
	v := fast.Value{Value: s, Scale: abs, Error: 1e-15 * abs}
	for side := 0; side < 2; side++ {
		t := l.tail(u, side)
		if t.diverges(abs) {
			p := -1 - t.rate
			if l.b.ends[side] == endSingular {
				p = t.rate - 1
			}
			return v, &fast.Divergent{Where: l.endName(side), Exponent: p}
		}
		v.Value += t.value
		v.Error += t.err
		v.Scale += math.Abs(t.value)
	}
	return v, nil
}

func (l *level) endName(side int) string {
	x := l.iv.lo
	if side == 1 {
		x = l.iv.hi
	}
	return ends(x)
}

// tailValue is the integral beyond an end.
type tailValue struct {
	value, err float64
	last, rate float64 // integrand per unit of log distance at the end and its decay rate
}

func (t tailValue) diverges(scale float64) bool {
	return math.Abs(t.last) > 1e-9*scale && t.rate < 1e-7
}

// tail integrates u rho beyond the outermost panel as a power law.
func (l *level) tail(u []float64, side int) tailValue {
	if l.iv.periodic || l.b.ends[side] == endRegular {
		return tailValue{}
	}
	n, i, at := l.cheb.n, 0, -1.0
	if side == 1 {
		i, at = len(l.ps)-1, 1
	}
	p := l.ps[i]
	half := math.Abs(p.t1-p.t0) / 2
	g := make([]float64, n)
	largest := 0.0
	for j := range g {
		k := i*n + j
		g[j] = u[k] * l.rho[k] * p.jac[j] / half
		largest = math.Max(largest, math.Abs(g[j]))
	}
	end := l.cheb.at(g, at)
	if end == 0 || math.Abs(end) < 1e-13*largest {
		return tailValue{err: math.Abs(end)}
	}
	near, mid := l.cheb.at(g, at/2), l.cheb.at(g, 0)
	t := tailValue{last: end}
	t.rate = math.Log(math.Abs(near/end)) / (half / 2)
	inner := math.Log(math.Abs(mid/near)) / (half / 2)
	if math.IsNaN(t.rate) || math.IsInf(t.rate, 0) {
		return tailValue{last: end, rate: 1, err: math.Abs(end)}
	}
	if t.rate < 1e-7 {
		t.err = math.Abs(end)
		return t
	}
	t.value = end / t.rate
	t.err = math.Abs(t.value) * math.Min(1, math.Abs(inner-t.rate)/t.rate+1e-14/half)
	return t
}

// Coefficient implements fast.Level.
func (l *level) Coefficient(c *fast.Coefficient) (fast.Vector, error) {
	v, err := l.values(c)
	if err != nil {
		return nil, err
	}
	return &vec{v: v, rel: l.coefficientError(v) + l.b.left[c]}, nil
}

// coefficientError is the relative rounding error of a coefficient: its own
// and that of y through its slope.
func (l *level) coefficientError(v []float64) float64 {
	d := l.differentiate(v)
	var size, slope float64
	l.each(func(_ int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			y := p.y[j-lo]
			if p.finiteEnd != 0 {
				y = p.d[j-lo]
			}
			size += math.Abs(v[j]) * l.wq[j]
			slope += math.Abs(d[j]*y) * l.wq[j]
		}
	})
	if size == 0 {
		return unitRounding
	}
	return unitRounding * (1 + slope/size)
}

func (l *level) size(v []float64) float64 {
	var s float64
	for j, x := range v {
		s += math.Abs(x) * l.wq[j]
	}
	return s
}

func (l *level) values(c *fast.Coefficient) ([]float64, error) {
	v := make([]float64, l.nodes())
	src := c
	if l.mirror {
		src = mirrored(c)
	}
	var err error
	l.each(func(_ int, p *panel, lo, hi int) {
		if err == nil {
			err = l.b.eval.values(src, p, v[lo:hi])
		}
	})
	var u *fast.Undefined
	if errors.As(err, &u) {
		if l.mirror {
			u.At[0] = -u.At[0]
		}
		if d := l.overflow(u); d != nil {
			return nil, d
		}
	}
	return v, err
}

// overflow turns a coefficient that overflows where the density is all but
// zero, towards an end, into a divergence.
func (l *level) overflow(u *fast.Undefined) error {
	d, err := l.Density([][]float64{{u.At[0]}})
	if !math.IsInf(u.Value, 0) || err != nil || d[0] > 1e-100 || l.iv.periodic {
		return nil
	}
	side := 0
	if l.locatePanel(u.At[0]) > len(l.ps)/2 {
		side = 1
	}
	return &fast.Divergent{Where: l.endName(side), Exponent: math.Inf(1)}
}

func (l *level) locatePanel(y float64) int {
	i, _ := l.locate(l.inside(y))
	return i
}

// mirrored is c(-y).
func mirrored(c *fast.Coefficient) *fast.Coefficient {
	m := fast.Coefficient{Name: c.Name, Eval: func(dst []float64, y [][]float64) {
		z := make([]float64, len(y[0]))
		for k, v := range y[0] {
			z[k] = -v
		}
		c.Values(dst, [][]float64{z})
	}}
	for _, x := range c.Breaks {
		m.Breaks = append(m.Breaks, -x)
	}
	return &m
}

// Sum implements fast.Level.
func (l *level) Sum(factors []float64, u []fast.Vector) (fast.Vector, error) {
	out := &vec{v: make([]float64, l.nodes())}
	out.d1, out.d2 = make([]float64, l.nodes()), make([]float64, l.nodes())
	add := func(dst []float64, s float64, src []float64) []float64 {
		if dst == nil || src == nil {
			return nil
		}
		for j, x := range src {
			dst[j] += s * x
		}
		return dst
	}
	for i, w := range u {
		x := w.(*vec)
		out.rel += x.rel * math.Abs(factors[i]) * l.size(x.v)
		out.v = add(out.v, factors[i], x.v)
		out.d1 = add(out.d1, factors[i], x.d1)
		out.d2 = add(out.d2, factors[i], x.d2)
	}
	out.rel = relative(out.rel, l.size(out.v))
	return out, nil
}

func relative(err, size float64) float64 {
	if size == 0 {
		return unitRounding
	}
	return math.Max(unitRounding, err/size)
}

// differentiate is d/dy on every panel.
func (l *level) differentiate(v []float64) []float64 {
	out := make([]float64, len(v))
	l.each(func(_ int, p *panel, lo, hi int) {
		l.cheb.apply(l.cheb.diff, v[lo:hi], out[lo:hi])
		for j := lo; j < hi; j++ {
			out[j] /= p.jac[j-lo]
		}
	})
	return out
}

func (l *level) derivative(u *vec, k int) []float64 {
	switch {
	case k == 0:
		return u.v
	case k == 1 && u.d1 != nil:
		return u.d1
	case k == 2 && u.d2 != nil:
		return u.d2
	case k == 1:
		u.d1 = l.differentiate(u.v)
		return u.d1
	}
	return l.differentiate(l.derivative(u, k-1))
}

// Apply implements fast.Level.
func (l *level) Apply(op fast.Operator, w fast.Vector) (fast.Vector, error) {
	u := w.(*vec)
	out := &vec{v: make([]float64, l.nodes())}
	for i := range op {
		c, err := l.values(&op[i].Coefficient)
		if err != nil {
			return nil, err
		}
		k := op[i].Total()
		sign := 1.0
		if l.mirror && k%2 == 1 {
			sign = -1
		}
		part := 0.0
		for j, x := range l.derivative(u, k) {
			t := sign * c[j] * x
			out.v[j] += t
			part += math.Abs(t) * l.wq[j]
		}
		out.rel += part * (u.rel + l.coefficientError(c))
	}
	out.rel = relative(out.rel, l.size(out.v))
	return out, nil
}

// Product implements fast.Level.
func (l *level) Product(a, b fast.Vector) (fast.Vector, error) {
	x, y := a.(*vec), b.(*vec)
	out := &vec{v: make([]float64, l.nodes()), rel: x.rel + y.rel}
	for j := range out.v {
		out.v[j] = x.v[j] * y.v[j]
	}
	return out, nil
}

// Mean implements fast.Level.
func (l *level) Mean(w fast.Vector) (fast.Value, error) {
	u := w.(*vec)
	v, err := l.integrate(u.v)
	v.Rounding = 4*u.rel*v.Scale + 1e-15*v.Scale
	v.Error += 4 * u.rel * v.Scale
	return v, err
}

// Solve implements fast.Level.
func (l *level) Solve(u fast.Vector) (fast.Vector, error) {
	in := u.(*vec)
	g := in.v
	mean, err := l.integrate(g)
	if err != nil {
		return nil, err
	}
	r := make([]float64, len(g))
	for j := range r {
		r[j] = g[j] - mean.Value
	}
	psi, start := l.shape.slope(l, r)
	out := &vec{v: l.primitive(psi, start), d1: psi}
	out.rel = relative(in.rel*l.size(g), l.size(r))
	if !l.b.noiseless {
		out.d2 = make([]float64, len(g))
		l.each(func(_ int, p *panel, lo, hi int) {
			for j := lo; j < hi; j++ {
				out.d2[j] = 2 / p.a[j-lo] * (-r[j] - p.f[j-lo]*psi[j])
			}
		})
	}
	// A corrector without a mean is fixed at the middle of the law instead: the
	// constant drops out of every limit equation.
	if m, err := l.integrate(out.v); err == nil {
		for j := range out.v {
			out.v[j] -= m.Value
		}
	}
	return out, nil
}
