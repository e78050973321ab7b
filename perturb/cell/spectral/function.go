package spectral

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// Sum implements fast.Level.
func (l *level) Sum(factors []float64, u []fast.Vector) (fast.Vector, error) {
	out := &vector{c: make([]float64, l.n)}
	for k, w := range u {
		x := w.(*vector)
		for i, v := range x.c {
			out.c[i] += factors[k] * v
		}
		out.lost += math.Abs(factors[k]) * x.lost
	}
	return out, nil
}

// along applies one matrix to one axis of a tensor.
func (l *level) along(m sparse, u []float64, axis int) []float64 {
	inner := 1
	for _, s := range l.sizes[axis+1:] {
		inner *= s
	}
	size := l.sizes[axis]
	out := make([]float64, len(u))
	for o := 0; o < len(u); o += size * inner {
		for r, row := range m {
			dst := out[o+r*inner : o+(r+1)*inner]
			for _, e := range row {
				src := u[o+e.Col*inner : o+(e.Col+1)*inner]
				for i, x := range src {
					dst[i] += e.V * x
				}
			}
		}
	}
	return out
}

// Apply implements fast.Level.
func (l *level) Apply(op fast.Operator, w fast.Vector) (fast.Vector, error) {
	in := w.(*vector)
	u := in.c
	out := make([]float64, l.n)
	for i := range op {
		for _, s := range l.spaces {
			if s.domain.Kind == fast.Sphere && total(s.orders(op[i].Order)) > 2 {
				return nil, &fast.Unsupported{Method: "spectral", Reason: "derivatives of third order on a sphere"}
			}
		}
		terms, ok := separate(&op[i].Coefficient, l.p)
		if !ok {
			v, err := l.gridApply(&op[i], u)
			if err != nil {
				return nil, err
			}
			for j, x := range v {
				out[j] += x
			}
			continue
		}
		products := l.products(terms, op[i].Order, false)
		if err := l.defined(&op[i].Coefficient); err != nil {
			return nil, err
		}
		for _, p := range products {
			v := u
			for k, m := range p.factors {
				v = l.along(m, v, k)
			}
			for j, x := range v {
				out[j] += p.c * x
			}
		}
	}
	return &vector{c: out, lost: in.lost * ratio(out, u)}, nil
}

// ratio is |a|/|b|, the factor by which what was lost is taken to grow.
func ratio(a, b []float64) float64 {
	n := dot(b, b)
	if n == 0 {
		return 1
	}
	return math.Sqrt(dot(a, a) / n)
}

func total(order []int) int {
	s := 0
	for _, o := range order {
		s += o
	}
	return s
}

// Product implements fast.Level.
func (l *level) Product(a, b fast.Vector) (fast.Vector, error) {
	u, v := a.(*vector), b.(*vector)
	x, y := l.toGrid(u.c), l.toGrid(v.c)
	for i := range x {
		x[i] *= y[i]
	}
	return &vector{c: l.fromGrid(x), lost: u.lost*math.Sqrt(dot(v.c, v.c)) + v.lost*math.Sqrt(dot(u.c, u.c))}, nil
}

// Mean implements fast.Level. Its error is the product of what lies near the
// edge of the basis in the function and in the density, which is what the cut
// has left out of their inner product, and the part of the function known to
// be lost.
func (l *level) Mean(w fast.Vector) (fast.Value, error) {
	u := w.(*vector)
	scale := math.Hypot(math.Sqrt(dot(u.c, u.c)), u.lost)
	norm := math.Sqrt(dot(l.rho, l.rho))
	v := fast.Value{Value: dot(l.rho, u.c), Scale: scale, Rounding: 1e-15 * scale * norm}
	edge := l.edge(l.rho)
	v.Error = v.Rounding + edge*(l.edge(u.c)+u.lost)
	if scale > 0 {
		v.Error += u.lost * u.lost / scale
	}
	if share := l.unresolved(); share > maxUnresolved && !l.trusted {
		v.Error += share * scale
	}
	return v, nil
}

// maxUnresolved is the part of the density near the edge of the basis beyond
// which nothing that follows from it is believed: the density divided by the
// weight is then not square integrable, as when there is no stationary law or
// the weight has the wrong tails.
const maxUnresolved = 0.03

// unresolved is the part of the density near the edge of the basis.
func (l *level) unresolved() float64 {
	if l.share == 0 {
		l.share = l.edge(l.rho)/math.Sqrt(dot(l.rho, l.rho)) + 1e-300
	}
	return l.share
}

// edge is the norm of the coefficients in the outer tenth of the index set and
// outside it.
func (l *level) edge(u []float64) float64 {
	var s float64
	for i, x := range u {
		if l.outer[i] {
			s += x * x
		}
	}
	return math.Sqrt(s)
}

// markOuter finds the outer tenth.
func (l *level) markOuter() {
	l.outer = make([]bool, l.n)
	index := make([]int, len(l.spaces))
	for i := range l.outer {
		l.set.split(i, index)
		l.outer[i] = share(l.spaces, index) > 0.9
	}
}

// Solve implements fast.Level.
func (l *level) Solve(w fast.Vector) (fast.Vector, error) {
	in := w.(*vector)
	u := in.c
	rhs := l.set.gather(u)
	for i := range rhs {
		rhs[i] = -rhs[i]
	}
	part := l.lu.Solve(rhs)
	r := l.matrix.apply(part)
	for i := range r {
		r[i] = rhs[i] - r[i]
	}
	for i, v := range l.lu.Solve(r) {
		part[i] += v
	}
	phi := l.set.scatter(part)
	phi[0] = 0
	var mean float64
	for i, x := range phi {
		mean += l.rho[i] * x
	}
	phi[0] = -mean
	return &vector{c: phi, lost: in.lost * ratio(phi, u)}, nil
}

// At implements fast.Level.
func (l *level) At(w fast.Vector, y [][]float64) ([]float64, error) {
	return l.at(w.(*vector).c, y), nil
}

func (l *level) at(u []float64, y [][]float64) []float64 {
	out := make([]float64, len(y[0]))
	for k := range out {
		v := u
		for i := len(l.spaces) - 1; i >= 0; i-- {
			s := l.spaces[i]
			point := make([]float64, len(s.deriv))
			for c := range point {
				point[c] = y[s.first+c][k]
			}
			v = contract(v, s.values(point))
		}
		out[k] = v[0]
	}
	return out
}

// contract sums over the last axis.
func contract(v, b []float64) []float64 {
	out := make([]float64, len(v)/len(b))
	for i := range out {
		var s float64
		for j, x := range b {
			s += v[i*len(b)+j] * x
		}
		out[i] = s
	}
	return out
}

// Density implements fast.Level.
func (l *level) Density(y [][]float64) ([]float64, error) {
	out := l.at(l.rho, y)
	for k := range out {
		for _, s := range l.spaces {
			point := make([]float64, len(s.deriv))
			for c := range point {
				point[c] = y[s.first+c][k]
			}
			out[k] *= s.density(point)
		}
	}
	return out, nil
}

// String implements fast.Level.
func (l *level) String() string {
	s := ""
	for i, x := range l.spaces {
		if i > 0 {
			s += " x "
		}
		s += fmt.Sprint(x.n)
	}
	return fmt.Sprintf("%s basis, %d functions in use", s, len(l.set.keep))
}

// Unknowns implements fast.Level.
func (l *level) Unknowns() int { return len(l.set.keep) }
