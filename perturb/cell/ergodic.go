package cell

import (
	"fmt"

	"strings"

	"epslim/generator/algebra"
)

// Condition is a quantity with the relation to zero that a result needs.
type Condition struct {
	Quantity algebra.Expr
	Relation string // ">", ">=", "!="
	For      string // what it is needed for
}

// String writes the condition as the user would: "k > D" for k - D > 0.
func (c Condition) String() string {
	if f := c.Quantity.Form(); c.Relation != "!=" && f.Op == algebra.FormSum && len(f.Args) == 2 && f.Args[0].Op == algebra.FormNumber && f.Args[1].Op == algebra.FormNeg {
		return fmt.Sprintf("%s %s %s", f.Args[1].Args[0], strings.Replace(c.Relation, ">", "<", 1), f.Args[0])
	} else if c.Relation != "!=" && f.Op == algebra.FormSum && len(f.Args) == 2 && f.Args[1].Op == algebra.FormNeg && f.Args[0].Op != algebra.FormNeg {
		return fmt.Sprintf("%s %s %s", f.Args[0], c.Relation, f.Args[1].Args[0])
	}
	return fmt.Sprintf("%s %s 0", c.Quantity, c.Relation)
}

// NotErgodic is the outcome for a fast process without a unique stationary
// law, or for averages that diverge.
type NotErgodic struct {
	Text   string
	Mend   string
	Detail map[string]algebra.Expr
}

func (n *NotErgodic) Error() string { return n.Text }

// Existence is what was found about the stationary law of a fast process.
type Existence struct {
	Name       string       // of the process, where it has one
	Density    algebra.Expr // invariant density up to a factor; not Valid if not in closed form
	Conditions []Condition
	Unchecked  []string // what could not be checked, in words
}

// Numbers gives formulas and values for what is left undecided by signs.
type Numbers struct {
	Formulas map[string]algebra.FuncDef
	Values   map[string]algebra.Expr
}

// sign is the sign of e by declared signs or, failing that, by the given
// numbers where e is free of variables then.
func (n Numbers) sign(e algebra.Expr) algebra.Sign {
	if s := e.Sign(); s == algebra.Positive || s == algebra.Negative || s == algebra.Zero {
		return s
	}
	v, err := n.number(e)
	if err != nil {
		return e.Sign()
	}
	switch {
	case v > 0:
		return algebra.Positive
	case v < 0:
		return algebra.Negative
	}
	return e.Sign()
}

func (n Numbers) number(e algebra.Expr) (float64, error) {
	e, err := e.SubsFunc(n.Formulas)
	if err != nil {
		return 0, err
	}
	if e, err = e.Subs(n.Values); err != nil {
		return 0, err
	}
	return e.EvalFloat(map[string]float64{})
}

// require adds the condition quantity > 0 unless it is known to hold; a
// quantity known to fail is a refusal.
func (x *Existence) require(n Numbers, quantity algebra.Expr, relation, what string, fail func() *NotErgodic) error {
	want := algebra.Positive
	switch relation {
	case ">=":
		want = algebra.NonNegative
	case "!=":
		want = algebra.NonZero
	}
	s := quantity.Sign()
	if s.Is(want) {
		return nil
	}
	if t := n.sign(quantity); t != 0 && t&want == 0 {
		return fail()
	}
	for _, c := range simplify(Condition{quantity, relation, what}) {
		x.add(c)
	}
	return nil
}

// Divides notes that a result divides by the quantity.
func (x *Existence) Divides(quantity algebra.Expr, what string) {
	if quantity.Sign()&algebra.Zero == 0 {
		return
	}
	for _, c := range simplify(Condition{quantity, "!=", what}) {
		x.add(c)
	}
}

// simplify reduces a condition to factors that can fail: positive factors go,
// even powers only have to differ from zero.
func simplify(c Condition) []Condition {
	content, fs, ok := c.Quantity.FactorPowers()
	if !ok {
		return []Condition{c}
	}
	r := c.Quantity.Ring()
	var out []Condition
	rest := r.Int(1)
	negative := content.Sign() < 0
	left := 0
	for _, f := range fs {
		s := f.Base.Sign()
		odd := f.Exp.Num().Bit(0) == 1
		switch {
		case s == algebra.Positive:
		case s == algebra.Negative:
			negative = negative != odd
		case c.Relation == "!=" || !odd:
			if s&algebra.Zero != 0 && f.Exp.Sign() > 0 && c.Relation != ">=" {
				out = append(out, Condition{f.Base, "!=", c.For})
			}
		default:
			rest = rest.Mul(f.Base)
			left++
		}
	}
	if left > 0 {
		if negative {
			rest = rest.Neg()
		}
		out = append(out, Condition{rest.Primitive(), c.Relation, c.For})
	}
	return out
}

// add keeps a condition unless another one implies it, and drops those that
// it implies.
func (x *Existence) add(c Condition) {
	for _, o := range x.Conditions {
		if o.implies(c) {
			return
		}
	}
	kept := x.Conditions[:0]
	for _, o := range x.Conditions {
		if !c.implies(o) {
			kept = append(kept, o)
		}
	}
	x.Conditions = append(kept, c)
}

// implies recognises the same quantity under a stronger relation, and a
// quantity that is larger by something of known sign.
func (c Condition) implies(o Condition) bool {
	if c.Quantity.Equal(o.Quantity) || c.Quantity.Neg().Equal(o.Quantity) && o.Relation == "!=" {
		return c.Relation == o.Relation || c.Relation == ">"
	}
	if c.Relation != ">" && c.Relation != ">=" {
		return false
	}
	if o.Relation == "!=" && c.Relation == ">" {
		// a divisor of a positive quantity does not vanish
		if q, err := c.Quantity.Div(o.Quantity); err == nil {
			if _, den := q.NumDen(); den.IsOne() {
				return true
			}
		}
	}
	s := o.Quantity.Sub(c.Quantity).Sign()
	switch {
	case s == algebra.Positive:
		return true
	case s.Is(algebra.NonNegative):
		return c.Relation == ">" || o.Relation == ">="
	}
	return false
}

// Check examines the existence of one stationary law. Integrands lists
// functions of the fast variables whose averages the limit uses; their
// convergence is checked too, where the fast process is one-dimensional or a
// product of one-dimensional ones.
func (p *Process) Check(n Numbers, integrands []algebra.Expr) (*Existence, error) {
	x := &Existence{}
	groups := p.groups()
	density := p.Ring.Int(1)
	var names []string
	for _, g := range groups {
		if err := p.checkMoves(g); err != nil {
			return nil, err
		}
		d, name, err := p.checkGroup(x, n, g, integrands)
		if err != nil {
			return nil, err
		}
		names = append(names, name)
		if density.Valid() && d.Valid() {
			density = density.Mul(d)
		} else {
			density = algebra.Expr{}
		}
	}
	if d, ok := p.gaussian(); ok {
		x.Density = d
		names = []string{"Ornstein-Uhlenbeck process"}
	} else if density.Valid() && p.independent(groups) && p.IsInvariant(density) {
		x.Density = density
	}
	x.Name = strings.Join(dedupe(names), " and ")
	if err := p.checkRank(x, n); err != nil {
		return nil, err
	}
	return x, nil
}

func dedupe(in []string) []string {
	var out []string
	for _, s := range in {
		if s == "" || len(out) > 0 && out[len(out)-1] == s {
			continue
		}
		out = append(out, s)
	}
	return out
}

// depends reports whether the law of motion of fast variable i contains
// fast variable j.
func (p *Process) depends(i, j int) bool {
	if p.Drift(i).DependsOn(p.Fast[j].Name) {
		return true
	}
	for k := range p.Fast {
		if p.Diffusion(i, k).DependsOn(p.Fast[j].Name) {
			return true
		}
	}
	return false
}

// groups are the strongly connected components of the dependence between
// fast variables, drivers first; the components of a sphere stay together.
func (p *Process) groups() [][]int {
	n := len(p.Fast)
	reach := make([][]bool, n)
	for i := range reach {
		reach[i] = make([]bool, n)
		for j := range reach[i] {
			reach[i][j] = i == j || p.depends(i, j)
			if p.Fast[i].Kind == SpherePart && p.Fast[j].Kind == SpherePart && p.Fast[i].Sphere == p.Fast[j].Sphere {
				reach[i][j] = true
			}
		}
	}
	for k := range reach {
		for i := range reach {
			for j := range reach {
				reach[i][j] = reach[i][j] || reach[i][k] && reach[k][j]
			}
		}
	}
	done := make([]bool, n)
	var out [][]int
	for len(done) > 0 {
		progress := false
		for i := range done {
			if done[i] {
				continue
			}
			var g []int
			ready := true
			for j := range done {
				if reach[i][j] && reach[j][i] {
					g = append(g, j)
				} else if reach[i][j] && !done[j] {
					ready = false
				}
			}
			if !ready {
				continue
			}
			for _, j := range g {
				done[j] = true
			}
			out = append(out, g)
			progress = true
		}
		if !progress {
			break
		}
	}
	return out
}

// independent reports whether no group drives another and no noise is shared.
func (p *Process) independent(groups [][]int) bool {
	at := map[int]int{}
	for k, g := range groups {
		for _, i := range g {
			at[i] = k
		}
	}
	for i := range p.Fast {
		for j := range p.Fast {
			if at[i] != at[j] && (p.depends(i, j) || !p.Diffusion(i, j).IsZero()) {
				return false
			}
		}
	}
	return true
}

// AdjointOn is the adjoint of the fast generator on a density (in the fast
// variables, which must not lie on a sphere).
func (p *Process) AdjointOn(d algebra.Expr) algebra.Expr {
	sum := p.Ring.Int(0)
	half := p.Ring.Frac(1, 2)
	for i, v := range p.Fast {
		flux := p.Drift(i).Mul(d)
		for j, w := range p.Fast {
			flux = flux.Sub(half.Mul(p.Diffusion(i, j).Mul(d).Diff(w.Name)))
		}
		sum = sum.Sub(flux.Diff(v.Name))
	}
	return sum
}

// IsInvariant puts a density back into the adjoint equation; on spheres only
// the uniform density is recognised.
func (p *Process) IsInvariant(d algebra.Expr) bool {
	for k, v := range p.Fast {
		if v.Kind == SpherePart {
			return len(p.Fast) == 3 && k == 0 && !dependsOnFast(p, d) && p.uniformOnSphere([]int{0, 1, 2})
		}
	}
	return p.AdjointOn(d).IsZero()
}

func dependsOnFast(p *Process, e algebra.Expr) bool {
	for _, v := range p.Fast {
		if e.DependsOn(v.Name) {
			return true
		}
	}
	return false
}

func (p *Process) checkMoves(g []int) error {
	for _, i := range g {
		if p.Drift(i).IsZero() && p.Diffusion(i, i).IsZero() {
			return &NotErgodic{
				Text: fmt.Sprintf("the fast variable %s does not move at the leading order, so it has no stationary law of its own there", p.Fast[i].Name),
				Mend: fmt.Sprintf("give its drift or noise the leading power of the small parameter, or declare %s slow", p.Fast[i].Name),
			}
		}
	}
	return nil
}

func (p *Process) checkGroup(x *Existence, n Numbers, g []int, integrands []algebra.Expr) (algebra.Expr, string, error) {
	switch {
	case p.Fast[g[0]].Kind == SpherePart:
		return p.checkSphere(x, n, g)
	case len(g) == 1 && !p.driven(g[0]):
		return p.checkOne(x, n, g[0], integrands)
	default:
		return p.checkLinear(x, n, g)
	}
}

// driven reports whether variable i depends on other fast variables.
func (p *Process) driven(i int) bool {
	for j := range p.Fast {
		if j != i && p.depends(i, j) {
			return true
		}
	}
	return false
}

func (p *Process) checkSphere(x *Existence, n Numbers, g []int) (algebra.Expr, string, error) {
	trace := p.Ring.Int(0)
	for _, i := range g {
		trace = trace.Add(p.Diffusion(i, i))
	}
	trace = p.Reduce(trace)
	if trace.IsZero() {
		return algebra.Expr{}, "", &NotErgodic{
			Text: "the fast unit vector moves without noise: every rotation of it is kept apart, there are many stationary laws",
			Mend: "give its equations noise tangent to the sphere",
		}
	}
	// The uniform law is invariant when the tangential drift has no divergence
	// and the noise is isotropic; test it on polynomials of low degree.
	if p.uniformOnSphere(g) {
		return p.Ring.Int(1), "isotropic diffusion on the sphere", nil
	}
	return algebra.Expr{}, "diffusion on the sphere", nil
}

func (p *Process) uniformOnSphere(g []int) bool {
	// <L0 q> over the uniform law must vanish for q of degree one and two.
	s := [3]algebra.Expr{}
	for k, i := range g {
		s[k], _ = p.Ring.Symbol(p.Fast[i].Name)
	}
	mean := func(e algebra.Expr) (algebra.Expr, bool) { return uniformMean(p, g, e) }
	for a := 0; a < 3; a++ {
		for b := a; b <= 3; b++ {
			q := s[a]
			if b < 3 {
				q = q.Mul(s[b])
			}
			m, ok := mean(p.L0.Apply(q))
			if !ok || !m.IsZero() {
				return false
			}
		}
	}
	return true
}

// uniformMean averages a polynomial in the components over the unit sphere:
// <a^2i b^2j c^2k> = (2i-1)!! (2j-1)!! (2k-1)!! / (2(i+j+k)+1)!!.
func uniformMean(p *Process, g []int, e algebra.Expr) (algebra.Expr, bool) {
	out := p.Ring.Int(0)
	type item struct {
		coef algebra.Expr
		exps []int64
	}
	items := []item{{e, nil}}
	for _, i := range g {
		var next []item
		for _, it := range items {
			ts, err := it.coef.Laurent(p.Fast[i].Name)
			if err != nil {
				return out, false
			}
			for _, t := range ts {
				if !t.Power.IsInt() || t.Power.Sign() < 0 {
					return out, false
				}
				next = append(next, item{t.Coef, append(append([]int64(nil), it.exps...), t.Power.Num().Int64())})
			}
		}
		items = next
	}
	for _, it := range items {
		num, total, odd := int64(1), int64(0), false
		for _, k := range it.exps {
			odd = odd || k%2 != 0
			num *= doubleFactorial(k - 1)
			total += k
		}
		if odd {
			continue
		}
		out = out.Add(it.coef.Mul(p.Ring.Frac(num, doubleFactorial(total+1))))
	}
	return out, true
}

func doubleFactorial(n int64) int64 {
	out := int64(1)
	for ; n > 1; n -= 2 {
		out *= n
	}
	return out
}
