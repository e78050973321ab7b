package spectral

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// Coefficients that are not sums of products are handled on the tensor grid of
// quadrature nodes.

func (l *level) gridSize() int {
	q := 1
	for _, s := range l.spaces {
		s.ready()
		q *= s.q
	}
	return q
}

// toGrid evaluates a function at the grid nodes.
func (l *level) toGrid(u []float64) []float64 {
	outerSize, v := 1, u
	for k, s := range l.spaces {
		s.ready()
		inner := 1
		for _, m := range l.sizes[k+1:] {
			inner *= m
		}
		next := make([]float64, outerSize*s.q*inner)
		for o := 0; o < outerSize; o++ {
			for j := 0; j < s.q; j++ {
				dst := next[(o*s.q+j)*inner : (o*s.q+j+1)*inner]
				inv := 1 / s.root[j]
				for m, b := range s.basis[j*s.n : (j+1)*s.n] {
					b *= inv
					src := v[(o*s.n+m)*inner : (o*s.n+m+1)*inner]
					for i, x := range src {
						dst[i] += b * x
					}
				}
			}
		}
		v = next
		outerSize *= s.q
	}
	return v
}

// fromGrid projects values at the grid nodes on the basis.
func (l *level) fromGrid(h []float64) []float64 {
	inner, v := 1, h
	for k := len(l.spaces) - 1; k >= 0; k-- {
		s := l.spaces[k]
		outerSize := len(v) / (s.q * inner)
		next := make([]float64, outerSize*s.n*inner)
		for o := 0; o < outerSize; o++ {
			for j := 0; j < s.q; j++ {
				src := v[(o*s.q+j)*inner : (o*s.q+j+1)*inner]
				for m, b := range s.basis[j*s.n : (j+1)*s.n] {
					b *= s.root[j]
					dst := next[(o*s.n+m)*inner : (o*s.n+m+1)*inner]
					for i, x := range src {
						dst[i] += b * x
					}
				}
			}
		}
		v = next
		inner *= s.n
	}
	return v
}

// onGrid evaluates a coefficient at the grid nodes.
func (l *level) onGrid(c *fast.Coefficient) ([]float64, error) {
	size := l.gridSize()
	if size > 4_000_000 {
		return nil, fast.ErrBudget
	}
	y := make([][]float64, l.p.Coordinates())
	for i := range y {
		y[i] = make([]float64, size)
	}
	stride := size
	for _, s := range l.spaces {
		stride /= s.q
		for j := 0; j < size; j++ {
			node := j / stride % s.q
			for c := range s.nodes {
				y[s.first+c][j] = s.nodes[c][node]
			}
		}
	}
	h := make([]float64, size)
	c.Values(h, y)
	for j, v := range h {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			at := make([]float64, len(y))
			for i := range y {
				at[i] = y[i][j]
			}
			return nil, &fast.Undefined{Coefficient: c.Label(), At: at, Value: v}
		}
	}
	return h, nil
}

// gridNorm is the square of the norm of a function given at the nodes.
func (l *level) gridNorm(h []float64) float64 {
	w := []float64{1}
	for _, s := range l.spaces {
		r := make([]float64, s.q)
		for j, x := range s.root {
			r[j] = x * x
		}
		w = outer(w, r)
	}
	var n float64
	for j, v := range h {
		n += w[j] * v * v
	}
	return n
}

// gridApply is coefficient times derivative of u, projected.
func (l *level) gridApply(t *fast.OperatorTerm, u []float64) ([]float64, error) {
	h, err := l.onGrid(&t.Coefficient)
	if err != nil {
		return nil, err
	}
	v := u
	for k, s := range l.spaces {
		if d := s.derivative(s.orders(t.Order)); d != nil {
			v = l.along(d, v, k)
		}
	}
	g := l.toGrid(v)
	for j := range g {
		g[j] *= h[j]
	}
	return l.fromGrid(g), nil
}

// expanded writes a term of the generator whose coefficient is a plain function
// as Kronecker products, by expanding the coefficient in the basis itself; ok
// is false when that takes too many functions.
func (l *level) expanded(t *fast.OperatorTerm) (out []product, ok bool, err error) {
	if l.wallOf(*t) >= 0 {
		return nil, false, nil
	}
	h, err := l.onGrid(&t.Coefficient)
	if err != nil {
		return nil, false, err
	}
	c := l.fromGrid(h)
	full := l.gridNorm(h)
	if full-dot(c, c) > 1e-14*full {
		return nil, false, nil
	}
	index := make([]int, len(l.spaces))
	for i, v := range c {
		if math.Abs(v) < 1e-14*math.Sqrt(full) {
			continue
		}
		if len(out) == 150 {
			return nil, false, nil
		}
		l.set.split(i, index)
		p := product{c: v}
		for k, s := range l.spaces {
			m := s.timesBasis(index[k])
			if d := s.derivative(s.orders(t.Order)); d != nil {
				m = m.times(d)
			}
			p.factors = append(p.factors, m)
		}
		out = append(out, p)
	}
	return out, true, nil
}

// timesBasis is multiplication by a basis function.
func (s *space) timesBasis(i int) sparse {
	key := fmt.Sprint("basis ", i)
	if m, ok := s.cache[key]; ok {
		return m
	}
	s.ready()
	h := make([]float64, s.q)
	for j := range h {
		h[j] = s.basis[j*s.n+i] / s.root[j]
	}
	m := s.project(h)
	s.cache[key] = m
	return m
}

// gridMatrix is the matrix of a term of the generator whose coefficient is not
// a sum of products.
func (l *level) gridMatrix(t *fast.OperatorTerm) (sparse, error) {
	if k := l.wallOf(*t); k >= 0 {
		return nil, &fast.Unsupported{Method: "spectral", Reason: "noise of the reflected variable " + l.spaces[k].domain.Name(0) + " that is not a sum of products"}
	}
	if len(l.spaces) > 2 || l.n > 3600 || len(l.set.keep) > 2600 {
		return nil, fast.ErrBudget
	}
	h, err := l.onGrid(&t.Coefficient)
	if err != nil {
		return nil, err
	}
	if len(l.spaces) == 1 {
		s := l.spaces[0]
		return fromDense(s.n, s.pair(h, s.atNodes(s.orders(t.Order)))), nil
	}
	return l.gridProduct(h, t.Order), nil
}

// gridProduct is <phi_m, h d phi_n> in a product of two spaces: for each node
// of the first the matrix in the second, then summed with the first's basis.
func (l *level) gridProduct(h []float64, order []int) sparse {
	a, b := l.spaces[0], l.spaces[1]
	da, db := a.atNodes(a.orders(order)), b.atNodes(b.orders(order))
	n := len(l.set.keep)
	dense := make([]float64, n*n)
	for j := 0; j < a.q; j++ {
		inner := b.pair(h[j*b.q:(j+1)*b.q], db)
		left, right := a.basis[j*a.n:(j+1)*a.n], da[j*a.n:(j+1)*a.n]
		for r, full := range l.set.keep {
			x := left[full/b.n]
			if x == 0 {
				continue
			}
			row, in := dense[r*n:(r+1)*n], inner[full%b.n*b.n:]
			for c, other := range l.set.keep {
				row[c] += x * right[other/b.n] * in[other%b.n]
			}
		}
	}
	return fromDense(n, dense)
}
