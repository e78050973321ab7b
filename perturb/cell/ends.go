package cell

import (
	"epslim/generator/algebra"
)

func (c *Closure) hasEnds() bool { return c.p.HasEnds() }

// HasEnds reports whether some variable has walls or a seam where the
// corrector must satisfy a condition of its own.
func (p *Process) HasEnds() bool {
	for _, v := range p.Fast {
		switch v.Kind {
		case Reflecting, Circle, Periodic:
			return true
		}
	}
	return false
}

// endConditions are expressions in the corrector that must vanish: the slope
// at regular walls, the jumps of value and slope at a seam.
func (c *Closure) endConditions(phi algebra.Expr) ([]algebra.Expr, error) {
	r := c.p.Ring
	var out []algebra.Expr
	at := func(e algebra.Expr, name string, x algebra.Expr) (algebra.Expr, error) {
		return e.Subs(map[string]algebra.Expr{name: x})
	}
	for i, v := range c.p.Fast {
		switch v.Kind {
		case Reflecting:
			slope := phi.Diff(v.Name)
			for _, x := range []algebra.Expr{v.A, v.B} {
				a, err := at(c.p.Diffusion(i, i), v.Name, x)
				if err != nil {
					return nil, err
				}
				if a.IsZero() {
					continue // the noise vanishes there
				}
				s, err := at(slope, v.Name, x)
				if err != nil {
					return nil, err
				}
				if c.singularDrift(i, x) {
					continue // an entrance: the slope has to be finite only
				}
				out = append(out, s)
			}
		case Circle, Periodic:
			a, b := v.A, v.B
			if v.Kind == Circle {
				a, b = r.Int(0), r.Pi().Mul(r.Int(2))
			}
			e := phi
			for k := 0; k < 2; k++ {
				x, err := at(e, v.Name, b)
				if err != nil {
					return nil, err
				}
				y, err := at(e, v.Name, a)
				if err != nil {
					return nil, err
				}
				out = append(out, x.Sub(y))
				e = e.Diff(v.Name)
			}
		}
	}
	return out, nil
}

// singularDrift reports a drift that is infinite at x, as D/r at the axis.
func (c *Closure) singularDrift(i int, x algebra.Expr) bool {
	_, err := c.p.Drift(i).Subs(map[string]algebra.Expr{c.p.Fast[i].Name: x})
	return err != nil
}

func (c *Closure) fitsEnds(phi algebra.Expr) bool {
	conds, err := c.endConditions(phi)
	if err != nil {
		return false
	}
	for _, e := range conds {
		if !e.IsZero() {
			return false
		}
	}
	return true
}

// twoPoint solves L0 Phi = lambda - f with the end conditions over an
// enriched set of functions, which need not close: the functions at hand times
// low powers of the variables with ends, and logarithms beside reciprocals,
// supply the preimages that the set itself lacks.
func (c *Closure) twoPoint(n *fnNode, set []*fnNode, closed bool) (*Solution, error) {
	if !closed {
		set = set[:min(len(set), 6)]
	}
	for round := 0; round < 3; round++ {
		if round > 0 {
			set = c.enrich(set)
			if len(set) > 120 {
				break
			}
		}
		s, err := c.twoPointIn(n, set)
		if err != nil {
			return nil, err
		}
		if s != nil {
			return s, nil
		}
	}
	return nil, doesNotApply("no combination of the functions that the fast generator makes of %s solves the fast problem with its conditions at the ends of the domain", n.fn)
}

// enrich multiplies by the fast variables that are not angles.
func (c *Closure) enrich(set []*fnNode) []*fnNode {
	r := c.p.Ring
	seen := map[*fnNode]bool{}
	out := append([]*fnNode(nil), set...)
	for _, m := range set {
		seen[m] = true
	}
	add := func(e algebra.Expr) {
		for _, l := range c.split(e) {
			if !seen[l.to] {
				seen[l.to] = true
				out = append(out, l.to)
			}
		}
	}
	add(r.Int(1))
	if h, ok := c.homogeneous(); ok {
		add(h)
	}
	for _, m := range set {
		for _, v := range c.p.Fast {
			if v.Kind != Reflecting && v.Kind != Line && v.Kind != HalfLine {
				continue
			}
			y, _ := r.Symbol(v.Name)
			add(m.fn.Mul(y))
			if d, _, ok := m.fn.Leading(v.Name, false); ok && d.Sign() < 0 {
				if l, err := r.Call("log", y); err == nil {
					add(l)
				}
			}
		}
	}
	return out
}

// homogeneous is the non-constant solution of L0 Phi = 0 between walls, whose
// slope is exp(-int 2f/a), where that has a closed form.
func (c *Closure) homogeneous() (algebra.Expr, bool) {
	if len(c.p.Fast) != 1 || c.p.Fast[0].Kind != Reflecting || c.p.Drift(0).IsZero() {
		return algebra.Expr{}, false
	}
	m := c.p.speedDensity(0)
	if !m.Valid() {
		return algebra.Expr{}, false
	}
	slope, err := c.p.Ring.Int(1).Div(c.p.Diffusion(0, 0).Mul(m))
	if err != nil {
		return algebra.Expr{}, false
	}
	h, err := c.p.Ring.Potential([]algebra.Expr{slope}, []string{c.p.Fast[0].Name})
	return h, err == nil
}

// twoPointIn returns nil without an error when the set is too small.
func (c *Closure) twoPointIn(n *fnNode, set []*fnNode) (*Solution, error) {
	r := c.p.Ring
	var unknowns []*fnNode
	for _, m := range set {
		if !m.fn.IsOne() {
			unknowns = append(unknowns, m)
		}
	}
	lambda := len(unknowns)
	rows := map[string][]algebra.Expr{}
	var order []string
	put := func(key string, j int, v algebra.Expr) {
		row, ok := rows[key]
		if !ok {
			row = make([]algebra.Expr, lambda+2)
			for i := range row {
				row[i] = r.Int(0)
			}
			rows[key] = row
			order = append(order, key)
		}
		row[j] = row[j].Add(v)
	}
	for j, m := range unknowns {
		for _, l := range c.expand(m) {
			put("L "+l.to.key, j, l.coef)
		}
		conds, err := c.endConditions(m.fn)
		if err != nil {
			// This function is singular at an end: the corrector may not
			// contain it.
			put("S "+m.key, j, r.Int(1))
			continue
		}
		for i, e := range conds {
			for _, t := range c.p.Reduce(e).SplitBy(c.names...) {
				put(string(rune('A'+i))+" "+t.Fn.String(), j, t.Coef)
			}
		}
	}
	for _, l := range c.split(r.Int(1)) {
		put("L "+l.to.key, lambda, l.coef.Neg())
	}
	put("L "+n.key, lambda+1, r.Int(-1))
	a := make([][]algebra.Expr, 0, len(order))
	b := make([]algebra.Expr, 0, len(order))
	for _, k := range order {
		a = append(a, rows[k][:lambda+1])
		b = append(b, rows[k][lambda+1])
	}
	sol, err := algebra.SolveLinear(a, b)
	if err != nil {
		return nil, nil
	}
	for _, j := range sol.Free {
		if j == lambda {
			return nil, nil // the average is not determined yet
		}
	}
	if !c.averageDetermined(a, lambda) {
		return nil, nil
	}
	phi := r.Int(0)
	for j, m := range unknowns {
		phi = phi.Add(sol.X[j].Mul(m.fn))
	}
	return &Solution{phi, sol.X[lambda]}, nil
}

// averageDetermined reports whether the homogeneous system forces the average
// to zero, that is, whether no other average would do as well.
func (c *Closure) averageDetermined(a [][]algebra.Expr, lambda int) bool {
	m := make([][]algebra.Expr, len(a))
	b := make([]algebra.Expr, len(a))
	for i := range a {
		m[i] = a[i][:lambda]
		b[i] = a[i][lambda].Neg()
	}
	_, err := algebra.SolveLinear(m, b)
	return err != nil
}
