package spectral

import (
	"fmt"
	"math"
	"strings"

	"epslim/perturb/cell/quadrature/fast"
)

// own returns the factors that concern this space, with coordinates counted
// from its first, and a key for the cache.
func (s *space) own(factors []fast.Factor) (mine []fast.Factor, key string, cacheable bool) {
	var b strings.Builder
	cacheable = true
	for _, f := range factors {
		c := f.Coordinate - s.first
		if c < 0 || c >= len(s.deriv) {
			continue
		}
		f.Coordinate = c
		mine = append(mine, f)
		if f.Kind == fast.Other {
			cacheable = false
		}
		fmt.Fprintf(&b, "%d,%d,%g;", c, f.Kind, f.P)
	}
	return mine, b.String(), cacheable
}

// sample evaluates a product of factors at the nodes.
func (s *space) sample(factors []fast.Factor) []float64 {
	s.ready()
	h := make([]float64, s.q)
	for j := range h {
		h[j] = 1
		for _, f := range factors {
			h[j] *= f.Value(s.nodes[f.Coordinate][j])
		}
		if s.bad == nil && (math.IsNaN(h[j]) || math.IsInf(h[j], 0)) {
			s.bad = &fast.Undefined{Value: h[j]}
			for _, c := range s.nodes {
				s.bad.At = append(s.bad.At, c[j])
			}
		}
	}
	return h
}

// operator is the matrix <phi_m, h d^order phi_n>; order counts this space's
// coordinates.
func (s *space) operator(factors []fast.Factor, order []int) sparse {
	mine, key, cacheable := s.own(factors)
	key += fmt.Sprint("|", order)
	if m, ok := s.cache[key]; ok && cacheable {
		return m
	}
	var m sparse
	if k := order[0]; s.slopes[0] != nil && (k == 1 || k == 2) {
		m = fromDense(s.n, s.pair(s.sample(mine), s.slopes[k-1]))
		if cacheable {
			s.cache[key] = m
		}
		return m
	}
	if len(mine) == 0 {
		m = identity(s.n)
	} else if p, ok := powers(mine, len(s.deriv)); ok && s.multiply != nil {
		m = s.multiply(p)
	} else {
		m = s.project(s.sample(mine))
	}
	if d := s.derivative(order); d != nil {
		m = m.times(d)
	}
	if cacheable {
		s.cache[key] = m
	}
	return m
}

// project is the matrix of multiplication by h, given at the nodes.
func (s *space) project(h []float64) sparse { return fromDense(s.n, s.pair(h, s.basis)) }

// pair is <phi_m, h psi_n> for functions psi given at the nodes.
func (s *space) pair(h, psi []float64) []float64 {
	n := s.n
	a := make([]float64, n*n)
	for j, v := range h {
		right := psi[j*n : (j+1)*n]
		for r, x := range s.basis[j*n : (j+1)*n] {
			x *= v
			if x == 0 {
				continue
			}
			out := a[r*n : (r+1)*n]
			for c, y := range right {
				out[c] += x * y
			}
		}
	}
	return a
}

// atNodes are the derivatives of the basis at the nodes.
func (s *space) atNodes(order []int) []float64 {
	s.ready()
	if k := order[0]; s.slopes[0] != nil && (k == 1 || k == 2) {
		return s.slopes[k-1]
	}
	d := s.derivative(order)
	if d == nil {
		return s.basis
	}
	out := make([]float64, len(s.basis))
	for j := 0; j < s.q; j++ {
		row, dst := s.basis[j*s.n:(j+1)*s.n], out[j*s.n:(j+1)*s.n]
		for m, es := range d {
			for _, e := range es {
				dst[e.Col] += row[m] * e.V
			}
		}
	}
	return out
}

// derivative is the matrix of a derivative; nil for none. On a sphere
// functions are extended with degree 0, for which d_i d_j = D_i D_j - y_i D_j
// with the tangential derivatives D.
func (s *space) derivative(order []int) sparse {
	if s.domain.Kind != fast.Sphere {
		if order[0] == 0 {
			return nil
		}
		d := s.deriv[0]
		for k := 1; k < order[0]; k++ {
			d = d.times(s.deriv[0])
		}
		return d
	}
	var which []int
	for c, o := range order {
		for k := 0; k < o; k++ {
			which = append(which, c)
		}
	}
	switch len(which) {
	case 0:
		return nil
	case 1:
		return s.deriv[which[0]]
	}
	return s.deriv2[[2]int{which[0], which[1]}]
}

// byParts is <phi_m, h phi_n”> with the boundary terms dropped:
// -<(h phi_m)' + h phi_m (log w)', phi_n'>.
func (s *space) byParts(factors []fast.Factor) sparse {
	mine, key, cacheable := s.own(factors)
	key += "|parts"
	if m, ok := s.cache[key]; ok && cacheable {
		return m
	}
	h, dh := s.sample(mine), s.slope(mine)
	if s.logSlope != nil {
		for j := range dh {
			dh[j] += h[j] * s.logSlope[j]
		}
	}
	var m sparse
	if d := s.slopes[0]; d != nil {
		a := s.pair(dh, d)
		for j, v := range h {
			right := d[j*s.n : (j+1)*s.n]
			for r, x := range right {
				x *= v
				out := a[r*s.n : (r+1)*s.n]
				for c, y := range right {
					out[c] += x * y
				}
			}
		}
		for i := range a {
			a[i] = -a[i]
		}
		m = fromDense(s.n, a)
	} else {
		first := s.project(dh).times(s.deriv[0])
		second := transpose(s.deriv[0]).times(s.project(h)).times(s.deriv[0])
		m = newSparse(s.n).plus(-1, first).plus(-1, second)
	}
	if cacheable {
		s.cache[key] = m
	}
	return m
}

func transpose(a sparse) sparse {
	out := newSparse(len(a))
	for i, row := range a {
		for _, e := range row {
			out[e.Col] = append(out[e.Col], entry{Col: i, V: e.V})
		}
	}
	return out
}

// slope is the derivative of a product of factors of one coordinate.
func (s *space) slope(factors []fast.Factor) []float64 {
	out := make([]float64, s.q)
	for j, y := range s.nodes[0] {
		for i, f := range factors {
			v := factorSlope(f, y, s.domain)
			for k, g := range factors {
				if k != i {
					v *= g.Value(y)
				}
			}
			out[j] += v
		}
	}
	return out
}

func factorSlope(f fast.Factor, y float64, d fast.Domain) float64 {
	switch f.Kind {
	case fast.Power:
		if f.P == 0 {
			return 0
		}
		return f.P * fast.Factor{Kind: fast.Power, P: f.P - 1}.Value(y)
	case fast.Cos:
		return -f.P * math.Sin(f.P*y)
	case fast.Sin:
		return f.P * math.Cos(f.P*y)
	}
	return slopeOf(f.Func, y, d)
}

// slopeOf is a sixth-order central difference that stays inside the domain.
func slopeOf(f func(float64) float64, y float64, d fast.Domain) float64 {
	h := 2e-3 * math.Max(1e-3, math.Abs(y))
	if !d.IsPeriodic() {
		a, b := d.Ends()
		h = math.Min(h, 0.3*math.Min(y-a, b-y))
	}
	return (45*(f(y+h)-f(y-h)) - 9*(f(y+2*h)-f(y-2*h)) + (f(y+3*h) - f(y-3*h))) / (60 * h)
}

// powers returns the exponents when all factors are non-negative integer
// powers.
func powers(factors []fast.Factor, n int) ([]int, bool) {
	p := make([]int, n)
	for _, f := range factors {
		if f.Kind != fast.Power || f.P < 0 || f.P != math.Trunc(f.P) {
			return nil, false
		}
		p[f.Coordinate] += int(f.P)
	}
	return p, true
}

// expand is the coefficient vector of a product of factors and the square of
// the norm of the product itself.
func (s *space) expand(factors []fast.Factor) (c []float64, norm float64) {
	mine, _, _ := s.own(factors)
	out := make([]float64, s.n)
	if len(mine) == 0 {
		out[0] = 1
		return out, 1
	}
	if p, ok := powers(mine, len(s.deriv)); ok && s.multiply != nil {
		for i, row := range s.multiply(p) {
			if len(row) > 0 && row[0].Col == 0 {
				out[i] = row[0].V
			}
		}
		if d := total(p); d < int(math.Sqrt(float64(s.n))) {
			return out, dot(out, out)
		}
	}
	clear(out)
	for j, h := range s.sample(mine) {
		h *= s.root[j]
		norm += h * h
		for m, v := range s.basis[j*s.n : (j+1)*s.n] {
			out[m] += h * v
		}
	}
	return out, norm
}
