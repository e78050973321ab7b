package spectral

import (
	"context"
	"math"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral/internal/band"
)

// vector is a function: its coefficients, the last space varying fastest.
type vector struct {
	c []float64
	// lost is the norm of the part that the basis cannot hold, as far as it is
	// known.
	lost float64
}

// level is the fast problem in one tensor basis.
type level struct {
	p      *fast.Problem
	spaces []*space
	sizes  []int
	n      int // functions of the full tensor; vectors have that length
	set    *indexSet
	matrix sparse // on the index set
	lu     band.Factors
	rho    []float64
	outer  []bool // functions near the edge of the basis
	share  float64
	// trusted says that the stationary law is known to exist with all moments
	// (linear drift), so that polynomials need no proof from the density.
	trusted bool
}

func newLevel(ctx context.Context, p *fast.Problem, spaces []*space) (*level, error) {
	l := &level{p: p, spaces: spaces, n: 1}
	for _, s := range spaces {
		l.sizes = append(l.sizes, s.n)
		l.n *= s.n
	}
	if l.n > 400000 {
		return nil, fast.ErrBudget
	}
	l.set = newIndexSet(spaces)
	l.markOuter()
	m, err := l.generator(ctx)
	if err != nil {
		return nil, err
	}
	// Column 0 of L0 is zero (L0 1 = 0); it carries the unknown average.
	for i, row := range m {
		k := 0
		for _, e := range row {
			if e.Col != 0 {
				row[k] = e
				k++
			}
		}
		m[i] = row[:k]
	}
	m[0] = append([]entry{{Col: 0, V: -1}}, m[0]...)
	l.matrix = m
	if l.lu, err = band.Factorize(ctx, band.Matrix(m), l.set.orders()...); err != nil {
		if err == band.ErrSingular {
			return nil, l.reducible()
		}
		return nil, err
	}
	if l.lu.Condition() > 1e16 {
		return nil, l.reducible()
	}
	rhs := make([]float64, len(m))
	rhs[0] = -1
	rho := l.lu.SolveTransposed(rhs)
	// One step of iterative refinement.
	for i, row := range m {
		for _, e := range row {
			rhs[e.Col] -= e.V * rho[i]
		}
	}
	for i, v := range l.lu.SolveTransposed(rhs) {
		rho[i] += v
	}
	l.rho = l.set.scatter(rho)
	return l, nil
}

func (l *level) reducible() error {
	return &fast.NotErgodic{Reason: "the generator has more than one null function (in " + l.String() + ")",
		Mend: "noise or drift that connects all parts of the fast domain"}
}

// generator assembles L0, by parts at walls.
func (l *level) generator(ctx context.Context) (sparse, error) {
	op := l.p.Generator()
	var terms []product
	var dense sparse
	for i := range op {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if k := l.wallOf(op[i]); k >= 0 {
			if op[i].Order[l.spaces[k].first] != 2 {
				return nil, &fast.Unsupported{Method: "spectral", Reason: "noise shared between a reflected variable and another one"}
			}
		}
		parts, ok := separate(&op[i].Coefficient, l.p)
		if !ok {
			more, ok, err := l.expanded(&op[i])
			if err != nil {
				return nil, err
			}
			if ok {
				terms = append(terms, more...)
				continue
			}
			m, err := l.gridMatrix(&op[i])
			if err != nil {
				return nil, err
			}
			if dense == nil {
				dense = m
			} else {
				dense = dense.plus(1, m)
			}
			continue
		}
		terms = append(terms, l.products(parts, op[i].Order, true)...)
		if err := l.defined(&op[i].Coefficient); err != nil {
			return nil, err
		}
	}
	m := kronecker(l.set, terms)
	if dense != nil {
		m = m.plus(1, dense)
	}
	return m, nil
}

// defined reports a factor without a finite value that was met since the last
// call.
func (l *level) defined(c *fast.Coefficient) error {
	for _, s := range l.spaces {
		if bad := s.bad; bad != nil {
			s.bad = nil
			clear(s.cache) // matrices made from it are no good
			bad.Coefficient = c.Label()
			return bad
		}
	}
	return nil
}

// wallOf returns the space with a wall in which a term has two derivatives, -1
// for none.
func (l *level) wallOf(t fast.OperatorTerm) int {
	if t.Total() != 2 {
		return -1
	}
	for k, s := range l.spaces {
		if s.wall && t.Order[s.first] > 0 {
			return k
		}
	}
	return -1
}

// products turns separable terms into Kronecker products.
func (l *level) products(terms []fast.Term, order []int, generator bool) []product {
	var out []product
	for _, t := range terms {
		if t.Constant == 0 {
			continue
		}
		p := product{c: t.Constant}
		for _, s := range l.spaces {
			o := s.orders(order)
			if generator && (s.wall || s.parts) && o[0] == 2 {
				p.factors = append(p.factors, s.byParts(t.Factors))
			} else {
				p.factors = append(p.factors, s.operator(t.Factors, o))
			}
		}
		out = append(out, p)
	}
	return out
}

// orders is the part of a multi-index that concerns a space.
func (s *space) orders(order []int) []int {
	if order == nil {
		return make([]int, len(s.deriv))
	}
	return order[s.first : s.first+len(s.deriv)]
}

// separate writes a coefficient as a sum of products, when it is given so or
// depends on one coordinate only.
func separate(c *fast.Coefficient, p *fast.Problem) ([]fast.Term, bool) {
	if c.Terms != nil {
		return c.Terms, true
	}
	if c.IsZero() {
		return nil, true
	}
	n := p.Coordinates()
	if n == 1 {
		return []fast.Term{{Constant: 1, Factors: []fast.Factor{{Kind: fast.Other, Func: func(y float64) float64 { return c.At(y) }}}}}, true
	}
	base := probe(p, 0)
	depends := -1
	for i := 0; i < n; i++ {
		for t := 1; t < 6; t++ {
			y, z := probe(p, t), probe(p, t+7)
			w := append([]float64{}, y...)
			w[i] = z[i]
			if c.At(y...) != c.At(w...) {
				if depends >= 0 && depends != i {
					return nil, false
				}
				depends = i
				break
			}
		}
	}
	if depends < 0 {
		return []fast.Term{{Constant: c.At(base...)}}, true
	}
	k := depends
	for _, d := range p.Domains {
		if d.Kind == fast.Sphere {
			return nil, false // a component cannot vary alone
		}
	}
	return []fast.Term{{Constant: 1, Factors: []fast.Factor{{Coordinate: k, Kind: fast.Other, Func: func(v float64) float64 {
		y := append([]float64{}, base...)
		y[k] = v
		return c.At(y...)
	}}}}}, true
}

// probe is the t-th of a sequence of scattered points of the domain.
func probe(p *fast.Problem, t int) []float64 {
	var y []float64
	for k, d := range p.Domains {
		u := math.Mod(0.61803398875*float64(t+1)+0.414*float64(k), 1)
		a, b := d.Ends()
		switch d.Kind {
		case fast.Line:
			y = append(y, 4*u-2)
		case fast.HalfLine:
			y = append(y, 0.2+2*u)
		case fast.Sphere:
			s, c := math.Sincos(7 * u)
			z := 1.8*u - 0.9
			r := math.Sqrt(1 - z*z)
			y = append(y, r*c, r*s, z)
		default:
			y = append(y, a+(b-a)*(0.05+0.9*u))
		}
	}
	return y
}

// Coefficient implements fast.Level.
func (l *level) Coefficient(c *fast.Coefficient) (fast.Vector, error) {
	terms, ok := separate(c, l.p)
	if !ok {
		h, err := l.onGrid(c)
		if err != nil {
			return nil, err
		}
		v := &vector{c: l.fromGrid(h)}
		if full, kept := l.gridNorm(h), dot(v.c, v.c); full-kept > 1e-14*full {
			v.lost = math.Sqrt(full - kept)
		}
		return v, nil
	}
	out := &vector{c: make([]float64, l.n)}
	for _, t := range terms {
		v := []float64{t.Constant}
		kept, full := 1.0, 1.0
		for _, s := range l.spaces {
			e, norm := s.expand(t.Factors)
			v = outer(v, e)
			kept *= dot(e, e)
			full *= norm
		}
		for i, x := range v {
			out.c[i] += x
		}
		// Squares below rounding are no loss.
		if loss := full - kept; loss > 1e-14*full {
			out.lost += math.Abs(t.Constant) * math.Sqrt(loss)
		}
	}
	if err := l.defined(c); err != nil {
		return nil, err
	}
	return out, finite(out.c, c)
}

func dot(a, b []float64) float64 {
	var s float64
	for i, x := range a {
		s += x * b[i]
	}
	return s
}

func finite(v []float64, c *fast.Coefficient) error {
	for _, x := range v {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return &fast.Undefined{Coefficient: c.Label(), Value: x}
		}
	}
	return nil
}

func outer(a, b []float64) []float64 {
	out := make([]float64, 0, len(a)*len(b))
	for _, x := range a {
		for _, y := range b {
			out = append(out, x*y)
		}
	}
	return out
}
