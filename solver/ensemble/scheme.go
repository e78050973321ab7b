package ensemble

import (
	"fmt"
	"math"
	"strings"

	"epslim/solver/kernel"
)

// Scheme is the fact sheet of a time-stepping scheme.
type Scheme struct {
	Name           string
	Description    string
	WeakOrder      float64 // for smooth coefficients, away from boundaries
	StrongOrder    float64 // 0 where the scheme approximates laws only
	Noise          string  // the shapes of noise it takes
	Interpretation string  // of the stochastic integral
	Source         string
	build          func(c *construction, state []kernel.Node) ([]kernel.Node, error)
}

// Schemes returns all schemes.
func Schemes() []Scheme {
	return []Scheme{
		{
			Name: "euler", Description: "Euler-Maruyama",
			WeakOrder: 1, StrongOrder: 0.5, Noise: "any", Interpretation: "Ito",
			Source: "P. E. Kloeden and E. Platen, Numerical Solution of Stochastic Differential Equations (1992), sections 10.2 and 14.1",
			build:  buildEuler,
		},
		{
			Name: "platen2", Description: "explicit weak second-order scheme of Platen, without derivatives",
			WeakOrder: 2, Noise: "any", Interpretation: "Ito",
			Source: "P. E. Kloeden and E. Platen, Numerical Solution of Stochastic Differential Equations (1992), section 15.1, equations (1.1)-(1.3)",
			build:  buildPlaten,
		},
		{
			Name: "splitting", Description: "Strang splitting: half a platen2 step of the slow variables, the exact step of the linear fast ones, half a step of the slow ones",
			WeakOrder: 2, Noise: "fast noise that depends on slow variables only and shares no Wiener process with them; slow noise of any shape", Interpretation: "Ito",
			Source: "G. Strang, SIAM J. Numer. Anal. 5 (1968) 506-517; exact steps: D. T. Gillespie, Phys. Rev. E 54 (1996) 2084-2091; in several dimensions C. F. Van Loan, IEEE Trans. Autom. Control 23 (1978) 395-404",
			build:  buildSplitting,
		},
	}
}

// SchemeByName returns the scheme of that name.
func SchemeByName(name string) (Scheme, error) {
	var names []string
	for _, s := range Schemes() {
		if s.Name == name {
			return s, nil
		}
		names = append(names, s.Name)
	}
	return Scheme{}, fmt.Errorf("ensemble: no scheme is called %q; there are %s", name, strings.Join(names, ", "))
}

// DefaultScheme chooses a scheme: the splitting for fast variables it can step
// exactly, the second-order scheme for systems without fast variables whose
// boundaries do not limit the order, and Euler-Maruyama otherwise. The second
// result says why.
func (m *Model) DefaultScheme() (Scheme, string, error) {
	b, err := m.bind()
	if err != nil {
		return Scheme{}, "", err
	}
	name, why := "euler", ""
	fast := m.fastIndices()
	if len(fast) > 0 {
		if _, err := newFastPart(m, b, fast); err != nil {
			why = "plain Euler steps: " + err.Error()
		} else {
			name, why = "splitting", "the fast variables are linear and stepped exactly"
		}
	} else {
		name, why = "platen2", "no fast variables"
		for _, v := range m.Variables {
			switch v.Domain.Kind {
			case Reflecting, Absorbing, HalfLine, Sphere:
				name, why = "euler", fmt.Sprintf("variable %q is %s, where steps are of first order", v.Name, v.Domain.Kind)
			}
		}
	}
	s, err := SchemeByName(name)
	return s, why, err
}

// rowKind is the law of one row of random numbers that a step consumes.
type rowKind uint8

const (
	rowNormal  rowKind = iota
	rowUniform         // in [0, 1]
)

// noiseRow describes one row: Wiener process column >= 0 in parts per step, or
// column -1 for a row of its own.
type noiseRow struct {
	kind   rowKind
	column int
	name   string
}

// construction is the state of building one step.
type construction struct {
	m    *Model
	b    *bound
	h    float64
	time kernel.Node
	rows []noiseRow
}

func (c *construction) row(kind rowKind, column int) kernel.Node {
	name := fmt.Sprintf("#%d", len(c.rows))
	c.rows = append(c.rows, noiseRow{kind, column, name})
	return c.b.graph.Input(name)
}

// normal returns a fresh standard normal variate that belongs to column j.
func (c *construction) normal(j int) kernel.Node { return c.row(rowNormal, j) }

// sign returns a fresh variate that is -1 or 1 with equal probability.
func (c *construction) sign() kernel.Node {
	g := c.b.graph
	u := c.row(rowUniform, -1)
	return g.Add(g.Scale(2, g.Floor(g.Add(u, g.Const(0.5)))), g.Const(-1))
}

// system is a drift and a noise matrix as functions of all variables; those that
// do not move have zero rows.
type system struct {
	drift []kernel.Node
	noise [][]kernel.Node
}

// used reports whether column j moves anything.
func (s system) used(j int) bool {
	for i := range s.noise {
		if s.noise[i][j] != 0 {
			return true
		}
	}
	return false
}

func (c *construction) whole() system { return system{c.b.drift, c.b.noise} }

func (c *construction) at(nodes, state []kernel.Node) []kernel.Node {
	return c.b.at(c.m, nodes, state, c.time)
}

// column returns column j of the noise at the given state.
func (c *construction) column(s system, j int, state []kernel.Node) []kernel.Node {
	col := make([]kernel.Node, len(s.noise))
	for i := range s.noise {
		col[i] = s.noise[i][j]
	}
	return c.at(col, state)
}

// move returns x + sum_k f_k*d_k, term by term.
func (c *construction) move(x []kernel.Node, terms ...[]kernel.Node) []kernel.Node {
	r := make([]kernel.Node, len(x))
	for i := range x {
		r[i] = x[i]
		for _, t := range terms {
			r[i] = c.b.graph.Add(r[i], t[i])
		}
	}
	return r
}

func (c *construction) scale(f float64, x []kernel.Node) []kernel.Node {
	r := make([]kernel.Node, len(x))
	for i := range x {
		r[i] = c.b.graph.Scale(f, x[i])
	}
	return r
}

func (c *construction) times(f kernel.Node, x []kernel.Node) []kernel.Node {
	r := make([]kernel.Node, len(x))
	for i := range x {
		r[i] = c.b.graph.Mul(f, x[i])
	}
	return r
}

func buildEuler(c *construction, x []kernel.Node) ([]kernel.Node, error) {
	s := c.whole()
	next := c.move(x, c.scale(c.h, c.at(s.drift, x)))
	for j := range c.m.wiener() {
		if s.used(j) {
			z := c.normal(j)
			next = c.move(next, c.scale(math.Sqrt(c.h), c.times(z, c.column(s, j, x))))
		}
	}
	return next, nil
}

func buildPlaten(c *construction, x []kernel.Node) ([]kernel.Node, error) {
	return c.platen(c.whole(), c.h, x), nil
}

// platen is one step of length h of the scheme of Kloeden and Platen (15.1.3).
// Terms that cancel do so in the graph: additive noise needs no supporting
// values, and noise whose columns do not feel each other no mixed terms.
func (c *construction) platen(s system, h float64, x []kernel.Node) []kernel.Node {
	g := c.b.graph
	root := math.Sqrt(h)
	a := c.at(s.drift, x)
	var columns []int
	for j := range c.m.wiener() {
		if s.used(j) {
			columns = append(columns, j)
		}
	}
	b := make([][]kernel.Node, len(columns))
	dw := make([]kernel.Node, len(columns))
	drifted := c.move(x, c.scale(h, a))
	upsilon := drifted
	for k, j := range columns {
		b[k] = c.column(s, j, x)
		dw[k] = g.Scale(root, c.normal(j))
		upsilon = c.move(upsilon, c.times(dw[k], b[k]))
	}
	next := c.move(x, c.scale(h/2, a), c.scale(h/2, c.at(s.drift, upsilon)))
	signs := map[[2]int]kernel.Node{}
	for k, j := range columns {
		plus := c.column(s, j, c.move(drifted, c.scale(root, b[k])))
		minus := c.column(s, j, c.move(drifted, c.scale(-root, b[k])))
		next = c.move(next, c.times(g.Scale(0.25, dw[k]), c.move(plus, minus, c.scale(2, b[k]))))
		if d := c.move(plus, c.scale(-1, minus)); !allZero(d) {
			square := g.Sub(g.Mul(dw[k], dw[k]), g.Const(h))
			next = c.move(next, c.times(g.Scale(0.25/root, square), d))
		}
		for r := range columns {
			if r == k {
				continue
			}
			up := c.column(s, j, c.move(x, c.scale(root, b[r])))
			down := c.column(s, j, c.move(x, c.scale(-root, b[r])))
			if q := c.move(up, down, c.scale(-2, b[k])); !allZero(q) {
				next = c.move(next, c.times(g.Scale(0.25, dw[k]), q))
			}
			if d := c.move(up, c.scale(-1, down)); !allZero(d) {
				mixed := g.Add(g.Mul(dw[k], dw[r]), g.Scale(h, c.mixedSign(signs, r, k)))
				next = c.move(next, c.times(g.Scale(0.25/root, mixed), d))
			}
		}
	}
	return next
}

// mixedSign returns V_{r,k}/h: a two-point variate for k < r, antisymmetric.
func (c *construction) mixedSign(signs map[[2]int]kernel.Node, r, k int) kernel.Node {
	key, flip := [2]int{r, k}, false
	if k > r {
		key, flip = [2]int{k, r}, true
	}
	v, ok := signs[key]
	if !ok {
		v = c.sign()
		signs[key] = v
	}
	if flip {
		return c.b.graph.Neg(v)
	}
	return v
}

func allZero(x []kernel.Node) bool {
	for _, y := range x {
		if y != 0 {
			return false
		}
	}
	return true
}

func buildSplitting(c *construction, x []kernel.Node) ([]kernel.Node, error) {
	fast := c.m.fastIndices()
	part, err := newFastPart(c.m, c.b, fast)
	if err != nil {
		return nil, fmt.Errorf("ensemble: the splitting scheme does not apply: %w", err)
	}
	slow := system{append([]kernel.Node(nil), c.b.drift...), make([][]kernel.Node, len(c.b.noise))}
	for i := range slow.noise {
		slow.noise[i] = append([]kernel.Node(nil), c.b.noise[i]...)
	}
	for _, i := range fast {
		slow.drift[i] = 0
		slow.noise[i] = make([]kernel.Node, c.m.wiener())
	}
	x = c.platen(slow, c.h/2, x)
	if x, err = part.step(c, x); err != nil {
		return nil, err
	}
	return c.platen(slow, c.h/2, x), nil
}
