package spectral

import (
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

// gridMatrix is the matrix of a term of the generator whose coefficient is not
// a sum of products.
func (l *level) gridMatrix(t *fast.OperatorTerm) (sparse, error) {
	if k := l.wallOf(*t); k >= 0 {
		return nil, &fast.Unsupported{Method: "spectral", Reason: "noise of the reflected variable " + l.spaces[k].domain.Name(0) + " that is not a sum of products"}
	}
	if len(l.spaces) > 2 || l.n > 2600 {
		return nil, fast.ErrBudget
	}
	h, err := l.onGrid(&t.Coefficient)
	if err != nil {
		return nil, err
	}
	var m sparse
	if len(l.spaces) == 1 {
		m = l.spaces[0].project(h)
	} else {
		m = l.gridProduct(h)
	}
	terms := product{c: 1}
	for _, s := range l.spaces {
		d := s.derivative(s.orders(t.Order))
		if d == nil {
			d = identity(s.n)
		}
		terms.factors = append(terms.factors, d)
	}
	return m.times(kronecker(l.sizes, []product{terms})), nil
}

// gridProduct is multiplication by h in a product of two spaces: for each node
// of the first the matrix in the second, then summed with the first's basis.
func (l *level) gridProduct(h []float64) sparse {
	a, b := l.spaces[0], l.spaces[1]
	dense := make([]float64, l.n*l.n)
	for j := 0; j < a.q; j++ {
		inner := b.project(h[j*b.q : (j+1)*b.q])
		row := a.basis[j*a.n : (j+1)*a.n]
		for r1, x := range row {
			for c1, y := range row {
				w := x * y
				if w == 0 {
					continue
				}
				for r2, es := range inner {
					base := (r1*b.n+r2)*l.n + c1*b.n
					for _, e := range es {
						dense[base+e.col] += w * e.v
					}
				}
			}
		}
	}
	return fromDense(l.n, dense)
}
