package quadrature

import (
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

type panelKind uint8

const (
	panelLinear panelKind = iota // y = t
	panelLog                     // y = base + sign*exp(t)
)

// panel is a piece of the domain with values at Chebyshev nodes. Its nodes
// run in the direction of growing y.
type panel struct {
	kind       panelKind
	base, sign float64
	// t0 and t1 are the ends in the panel's coordinate; t1 < t0 when y falls as
	// t grows.
	t0, t1 float64
	// finiteEnd is +-1 where base is the upper (+1) or lower (-1) end of the
	// domain, else 0.
	finiteEnd int

	y, d, jac []float64 // place, distance from base (log panels), dy/dx
	f, a      []float64 // drift and diffusion
	h         []float64 // 2 f/a dy/dx
	cumW      []float64 // W - W(left end of the panel)
	dW        float64   // W(right end) - W(left end)
	low, high float64   // extreme values of log m + log|dy/dt| relative to W(left end)
	fixed     bool      // may not be bisected any more
	settled   bool      // known to be resolved
	stats     []coefficientStat
}

// coefficientStat is how well a panel resolves one of the coefficients in use.
type coefficientStat struct {
	known      bool
	size, tail float64 // int |g| m and the part in the last Chebyshev coefficients, relative to the highest m of the panel
	resolved   bool
}

func (p *panel) value(t float64) float64 {
	if p.kind == panelLinear {
		return t
	}
	return p.base + p.sign*math.Exp(t)
}

func (p *panel) left() float64  { return p.value(p.t0) }
func (p *panel) right() float64 { return p.value(p.t1) }

// place fills the nodes.
func (p *panel) place(c *chebyshev) {
	n := c.n
	p.y, p.d, p.jac = make([]float64, n), make([]float64, n), make([]float64, n)
	mid, half := (p.t0+p.t1)/2, (p.t1-p.t0)/2
	for j, x := range c.nodes {
		t := mid + half*x
		if p.kind == panelLinear {
			p.y[j], p.jac[j] = t, half
			continue
		}
		e := math.Exp(t)
		p.d[j], p.y[j], p.jac[j] = e, p.base+p.sign*e, p.sign*e*half
	}
}

// coordinate returns x in [-1, 1] for a place y with distance from base d (NaN
// when unknown).
func (p *panel) coordinate(y float64) float64 {
	t := y
	if p.kind == panelLog {
		t = math.Log(p.sign * (y - p.base))
	}
	return (t - (p.t0+p.t1)/2) / ((p.t1 - p.t0) / 2)
}

func (p *panel) bisect() (l, r *panel) {
	mid := (p.t0 + p.t1) / 2
	lp, rp := *p, *p
	lp.t1, rp.t0 = mid, mid
	lp.stats, rp.stats = nil, nil
	return &lp, &rp
}

// evaluator evaluates coefficients on panels with full relative accuracy at
// finite ends.
type evaluator struct {
	expansions map[expansionKey]*expansion
	lo, hi     float64
}

type expansionKey struct {
	c    *fast.Coefficient
	side int
}

func (e *evaluator) values(c *fast.Coefficient, p *panel, dst []float64) error {
	switch {
	case p.finiteEnd < 0 && c.Lower != nil:
		c.Lower(dst, p.d)
	case p.finiteEnd > 0 && c.Upper != nil:
		c.Upper(dst, p.d)
	case p.finiteEnd != 0 && p.base != 0:
		x := e.expand(c, p.finiteEnd)
		if x == nil {
			c.Values(dst, [][]float64{p.y})
			break
		}
		var far bool
		for _, d := range p.d {
			far = far || d > x.reach
		}
		if far {
			c.Values(dst, [][]float64{p.y})
		}
		for j, d := range p.d {
			if d <= x.reach {
				dst[j] = x.at(d)
			}
		}
	default:
		c.Values(dst, [][]float64{p.y})
	}
	for j, v := range dst {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return &fast.Undefined{Coefficient: c.Label(), At: []float64{p.y[j]}, Value: v}
		}
	}
	return nil
}

func (e *evaluator) expand(c *fast.Coefficient, side int) *expansion {
	key := expansionKey{c, side}
	x, ok := e.expansions[key]
	if !ok {
		end := e.lo
		if side > 0 {
			end = e.hi
		}
		width := e.hi - e.lo
		if math.IsInf(width, 0) {
			width = math.Max(1, math.Abs(end))
		}
		x = newExpansion(c, end, side, 0.1*width)
		e.expansions[key] = x
	}
	return x
}

// expansion is a function near a finite end other than 0 as d^power times a
// polynomial in d or in sqrt(d), d the distance from the end. Evaluated from
// y itself a function such as 1-y loses its digits near y = 1.
type expansion struct {
	reach  float64
	root   bool // polynomial in sqrt(d)
	power  float64
	cheb   *chebyshev
	values []float64
}

func newExpansion(c *fast.Coefficient, end float64, side int, reach float64) *expansion {
	cheb := newChebyshev(20)
	for _, form := range []struct {
		root  bool
		power float64
	}{{false, 0}, {false, -1}, {false, -2}, {true, 0}, {true, -0.5}, {true, -1}} {
		x := &expansion{reach: reach, root: form.root, power: form.power, cheb: cheb, values: make([]float64, cheb.n)}
		d, v := make([]float64, cheb.n), make([]float64, cheb.n)
		y := make([]float64, cheb.n)
		for j, u := range cheb.nodes {
			w := (u + 1) / 2
			if form.root {
				w *= w
			}
			y[j] = end - float64(side)*reach*w
			// The distance that was really used: the subtraction is exact.
			d[j] = math.Abs(end - y[j])
		}
		c.Values(v, [][]float64{y})
		for j := range v {
			x.values[j] = v[j] * math.Pow(d[j], -form.power)
		}
		tail, largest := cheb.tail(x.values)
		if !(tail <= 1e-11*largest) || math.IsInf(largest, 0) {
			continue
		}
		x.strip(d, 1e-12+100*unitRounding*math.Abs(end)/reach)
		return x
	}
	return nil
}

// strip divides by the power of d with which the function vanishes at the end.
func (x *expansion) strip(d []float64, zero float64) {
	step := 1.0
	if x.root {
		step = 0.5
	}
	for k := 0; k < 6; k++ {
		_, largest := x.cheb.tail(x.values)
		if largest == 0 || math.Abs(x.cheb.at(x.values, -1)) > zero*largest {
			return
		}
		for j := range x.values {
			x.values[j] *= math.Pow(d[j], -step)
		}
		x.power += step
	}
}

func (x *expansion) at(d float64) float64 {
	u := d / x.reach
	if x.root {
		u = math.Sqrt(u)
	}
	v := x.cheb.at(x.values, 2*u-1)
	if x.power != 0 {
		v *= math.Pow(d, x.power)
	}
	return v
}
