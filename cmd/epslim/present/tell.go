package present

import (
	"fmt"
	"math/big"

	"epslim/cmd/epslim/derivation"
	"epslim/fokkerplanck"
	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/perturb"
)

// Tell arranges a derivation for reading, in the order in which a person
// would write it down.
func Tell(res *derivation.Result) *Story {
	t := newTeller(res)
	s := &Story{Title: res.System.Title}
	add := func(sec Section) {
		if len(sec.Blocks) > 0 {
			s.Sections = append(s.Sections, sec)
		}
	}
	add(t.model())
	if len(res.Generator.Parts) > 0 {
		add(t.generator())
	}
	if res.Refused != nil {
		add(t.refusal())
		return s
	}
	add(t.fast())
	add(t.expansion())
	add(t.correctors())
	add(t.frame())
	add(t.limit())
	add(t.next())
	add(t.origins())
	add(t.fokkerPlanck())
	add(t.stationary())
	add(t.conditions())
	add(t.checks())
	add(t.claims())
	add(t.values())
	return s
}

// teller holds what the sections share.
type teller struct {
	*notation
	res   *derivation.Result
	eps   Math
	step  *big.Rat // spacing of the powers of the small parameter
	lead  *big.Rat
	names []string // slow
}

func newTeller(res *derivation.Result) *teller {
	n := &notation{latex: map[string]string{}}
	sys := res.System
	set := func(name, tex string) {
		if tex != "" {
			n.latex[name] = tex
		}
	}
	for _, vs := range [][]*ito.Variable{sys.Slow, sys.Fast} {
		for _, v := range vs {
			set(v.Name, v.Latex)
		}
	}
	for _, p := range sys.Parameters {
		set(p.Name, p.Latex)
	}
	for _, f := range sys.Functions {
		set(f.Name, f.Latex)
	}
	set(sys.Small, sys.Latex)
	n.taken = map[string]bool{}
	for _, vs := range [][]*ito.Variable{sys.Slow, sys.Fast} {
		for _, v := range vs {
			n.taken[n.symbol(v.Name).Text] = true
		}
	}
	for _, p := range sys.Parameters {
		n.taken[n.symbol(p.Name).Text] = true
	}
	for _, f := range sys.Functions {
		n.taken[n.symbol(f.Name).Text] = true
	}
	t := &teller{notation: n, res: res, names: slowNames(res), step: big.NewRat(1, 1), lead: new(big.Rat)}
	t.eps = n.symbol(sys.Small)
	t.spacing()
	return t
}

// spacing is the common step of the powers in the generator.
func (t *teller) spacing() {
	ps := t.res.Generator.Parts
	if len(ps) == 0 {
		return
	}
	t.lead = ps[0].Power
	if len(ps) == 1 {
		return
	}
	g := new(big.Rat)
	for _, p := range ps[1:] {
		g = gcdRat(g, new(big.Rat).Sub(p.Power, t.lead))
	}
	t.step = g
}

func gcdRat(a, b *big.Rat) *big.Rat {
	if a.Sign() == 0 {
		return b
	}
	num := new(big.Int).GCD(nil, nil, new(big.Int).Mul(a.Num(), b.Denom()), new(big.Int).Mul(b.Num(), a.Denom()))
	return new(big.Rat).SetFrac(num, new(big.Int).Mul(a.Denom(), b.Denom()))
}

// index counts orders from the lowest power.
func (t *teller) index(power *big.Rat) int {
	q := new(big.Rat).Quo(new(big.Rat).Sub(power, t.lead), t.step)
	return int(q.Num().Int64())
}

func (t *teller) opName(power *big.Rat) Math { return sub(scriptL, integer(t.index(power))) }
func (t *teller) u(j int) Math               { return sub(t.own("u"), integer(j)) }

func (t *teller) epsTo(q *big.Rat) Math {
	switch {
	case q.Sign() == 0:
		return Math{}
	case q.Cmp(big.NewRat(1, 1)) == 0:
		return t.eps
	}
	return power(t.eps, q)
}

// model is the system as it was read.
func (t *teller) model() Section {
	sys := t.res.System
	sec := Section{ID: "model", Title: "Model"}
	for _, g := range []struct {
		word string
		vs   []*ito.Variable
	}{{"Slow: ", sys.Slow}, {"Fast: ", sys.Fast}} {
		p := Para{text(g.word)}
		for i, v := range g.vs {
			if i > 0 {
				p = append(p, text(", "))
			}
			if s := t.sphereOf(v); s >= 0 {
				if v.Name != sys.Spheres[s].Names[0] {
					p = p[:len(p)-1]
					continue
				}
				p = append(p, t.sphere(s)...)
				continue
			}
			p = append(p, t.domain(v)...)
		}
		if len(g.vs) > 0 {
			sec.Blocks = append(sec.Blocks, append(p, text(".")))
		}
	}
	sec.Blocks = append(sec.Blocks, t.declared()...)
	strat := sys.Calculus == ito.Stratonovich
	if strat {
		sec.Blocks = append(sec.Blocks, Para{text("As typed, in the Stratonovich sense:")})
		ls := []Line{}
		for _, e := range sys.Equations {
			ls = append(ls, t.sde(e.Variable, e.Typed, e.Noise, sys.Noises, true))
		}
		sec.Blocks = append(sec.Blocks, Equations{ID: "typed", Lines: ls}, t.conversion())
		sec.Blocks = append(sec.Blocks, Para{text("In the Itô sense:")})
	} else {
		sec.Blocks = append(sec.Blocks, Para{text("In the Itô sense:")})
	}
	ls := []Line{}
	for _, e := range sys.Equations {
		ls = append(ls, t.sde(e.Variable, e.Drift, e.Noise, sys.Noises, false))
	}
	sec.Blocks = append(sec.Blocks, Equations{ID: "system", Lines: ls})
	return sec
}

func (t *teller) sphereOf(v *ito.Variable) int {
	for i, s := range t.res.System.Spheres {
		for _, n := range s.Names {
			if n == v.Name {
				return i
			}
		}
	}
	return -1
}

func (t *teller) sphere(i int) []Span {
	s := t.res.System.Spheres[i].Names
	m := paren(join(t.symbol(s[0]), comma, t.symbol(s[1]), comma, t.symbol(s[2])))
	return []Span{inline(m), text(" on the unit sphere")}
}

func (t *teller) domain(v *ito.Variable) []Span {
	x, d := t.symbol(v.Name), v.Domain
	interval := func() Math {
		return join(x, elem, fenced(Math{Text: "[", TeX: "["}, join(t.expr(d.A), comma, t.expr(d.B)), Math{Text: "]", TeX: "]"}))
	}
	switch d.Kind {
	case ito.HalfLine:
		return []Span{inline(join(x, op(">", ">"), integer(0)))}
	case ito.Circle:
		return []Span{inline(x), text(" on the circle")}
	case ito.Reflecting:
		return []Span{inline(interval()), text(", reflecting")}
	case ito.Periodic:
		return []Span{inline(interval()), text(", periodic")}
	case ito.Absorbing:
		return []Span{inline(interval()), text(", absorbing")}
	}
	return []Span{inline(join(x, elem, lit("ℝ", `\mathbb{R}`)))}
}

// declared lists parameters and functions with their assumptions.
func (t *teller) declared() []Block {
	sys := t.res.System
	p := Para{text("With ")}
	add := func(spans ...Span) {
		if len(p) > 1 {
			p = append(p, text(", "))
		}
		p = append(p, spans...)
	}
	for _, q := range sys.Parameters {
		m := join(t.symbol(q.Name), relation(q.Sign))
		sp := []Span{inline(m)}
		if q.Integer {
			sp = append(sp, text(" integer"))
		}
		if q.Value != nil {
			sp = append(sp, note(" ("+number(q.Value)+")"))
		}
		add(sp...)
	}
	for _, f := range sys.Functions {
		args := make([]Math, 0, 2*len(f.Args))
		for i, a := range f.Args {
			if i > 0 {
				args = append(args, comma)
			}
			args = append(args, t.symbol(a))
		}
		m := join(t.symbol(f.Name), paren(join(args...)), relation(f.Sign))
		what := " arbitrary"
		if f.Body.Valid() {
			what = ""
		}
		add(inline(m), text(what))
	}
	if len(p) == 1 {
		return nil
	}
	return []Block{append(p, text("."))}
}

func relation(s algebra.Sign) Math {
	switch {
	case s == algebra.Positive:
		return join(op(">", ">"), integer(0))
	case s == algebra.Negative:
		return join(op("<", "<"), integer(0))
	case s.Is(algebra.NonNegative):
		return join(op("≥", `\ge`), integer(0))
	}
	return Math{}
}

// number writes a rational as a decimal where that is exact and short.
func number(q *big.Rat) string {
	if q.IsInt() {
		return q.Num().String()
	}
	for digits := 1; digits <= 12; digits++ {
		s := q.FloatString(digits)
		if r, ok := new(big.Rat).SetString(s); ok && r.Cmp(q) == 0 {
			return s
		}
	}
	return q.RatString()
}

// sde is the stochastic differential of one variable.
func (t *teller) sde(name string, drift algebra.Expr, noise []algebra.Expr, noises []string, strat bool) Line {
	d := func(m Math) Math {
		return Math{"d" + m.Text, `\mathrm{d}` + m.TeX, upright("d") + m.MathML}
	}
	var ts []Term
	ts = append(ts, t.scaled(drift, d(t.own("t")))...)
	for k, s := range noise {
		w := d(sub(t.own("W"), wiener(noises, k)))
		if strat {
			w = join(Math{"∘ ", `\circ `, mo("∘")}, w)
		}
		if strat && s.IsOne() {
			w = join(integer(1), thin, w)
		}
		ts = append(ts, t.scaled(s, w)...)
	}
	return line(d(t.symbol(name)), equals, ts...)
}

// wiener is the index of a Wiener process: the part of its name behind W.
func wiener(noises []string, k int) Math {
	if k >= len(noises) {
		return integer(k + 1)
	}
	s := noises[k]
	if len(s) > 1 && s[0] == 'W' {
		s = s[1:]
	}
	if isNumber(s) {
		return Math{s, s, "<mn>" + s + "</mn>"}
	}
	return Math{s, `\mathrm{` + texEscape(s) + `}`, "<mi>" + s + "</mi>"}
}

// conversion shows the terms that a Stratonovich system gains.
func (t *teller) conversion() Block {
	var ls []Line
	for _, e := range t.res.System.Equations {
		sum := t.res.System.Ring.Int(0)
		for _, c := range e.Corrections {
			sum = sum.Add(c.Term)
		}
		v := t.symbol(e.Variable)
		left := join(half, thin, bare("Σ", `\textstyle\sum_{j,k}`), thin, sub(t.own("σ"), join(lit("j", "j"), lit("k", "k"))), thin,
			Math{"∂_j", `\partial_{j}`, "<msub><mi>∂</mi><mi>j</mi></msub>"}, thin, sub(t.own("σ"), join(v, lit("k", "k"))))
		ls = append(ls, line(left, equals, t.terms(sum)...))
	}
	return Equations{ID: "conversion", Lines: ls}
}

// generator is the graded generator.
func (t *teller) generator() Section {
	sec := Section{ID: "generator", Title: "Generator"}
	var sum []Term
	var ls []Line
	for _, p := range t.res.Generator.Parts {
		sum = append(sum, Term{Pre: t.epsTo(p.Power), Post: t.opName(p.Power)})
		ls = append(ls, line(t.opName(p.Power), equals, t.operator(p.Op)...))
	}
	sec.Blocks = append(sec.Blocks, Equations{ID: "generator", Lines: append([]Line{line(scriptL, equals, sum...)}, ls...)})
	return sec
}

// operator is a differential operator as a sum.
func (t *teller) operator(o *generator.Operator) []Term {
	var out []Term
	for _, x := range o.Terms() {
		out = append(out, t.scaled(x.Coef, t.derivative(o.Vars(), x.Index))...)
	}
	return out
}

// fast is the fast process with its invariant density.
func (t *teller) fast() Section {
	sec := Section{ID: "fast", Title: "Fast process"}
	x := t.res.Limit.Existence
	if x == nil {
		return sec
	}
	var args []Math
	for i, v := range t.res.System.Fast {
		if i > 0 {
			args = append(args, comma)
		}
		args = append(args, t.symbol(v.Name))
	}
	l0 := sub(scriptL, integer(0))
	p := Para{inline(l0), text(" generates "), text(article(x.Name)), text(". Its invariant density")}
	if !x.Density.Valid() {
		return t.withBlocks(sec, append(p, text(" has no closed form here; averages come from the solvability of the fast problem itself.")))
	}
	l := line(join(t.own("ρ"), paren(join(args...))), propto, t.terms(x.Density)...)
	if _, isConst := x.Density.IsConstant(); isConst {
		l = line(join(t.own("ρ"), paren(join(args...))), propto, Term{Pre: integer(1)})
		l.Note = cell(text("uniform"))
	}
	return t.withBlocks(sec, append(p, text(", up to a factor, is")), Equations{ID: "invariant", Lines: []Line{l}})
}

func (t *teller) withBlocks(s Section, bs ...Block) Section {
	s.Blocks = append(s.Blocks, bs...)
	return s
}

func article(s string) string {
	if s == "" {
		return "the fast process"
	}
	return s
}

// timeVariable is the time on which the limit lives.
func (t *teller) timeVariable() Math {
	if t.res.Limit.Power.Sign() == 0 {
		return t.own("t")
	}
	return t.own("T")
}

// expansion is the hierarchy, one order a row.
func (t *teller) expansion() Section {
	sec := Section{ID: "expansion", Title: "Expansion"}
	lim := t.res.Limit
	q := new(big.Rat).Set(t.step)
	series := []Term{{Post: t.u(0)}, {Pre: t.epsTo(q), Post: t.u(1)}, {Pre: t.epsTo(new(big.Rat).Add(q, q)), Post: t.u(2)}, {Post: ellipsis}}
	p := Para{text("Insert "), inline(join(t.own("u"), equals, signed(series))), text(" into "),
		inline(join(t.dt(t.own("t")), t.own("u"), equals, scriptL, t.own("u"))), text(". Each order is solvable when its right-hand side averages to zero over the fast process")}
	if lim.Power.Sign() != 0 {
		p = append(p, text("; the limit appears on the time "), inline(join(t.own("T"), equals, t.epsTo(lim.Power), thin, t.own("t"))))
	}
	sec.Blocks = append(sec.Blocks, append(p, text(".")))
	h := Hierarchy{ID: "hierarchy"}
	h.Rows = append(h.Rows, Order{
		Power:    t.orderName(t.lead),
		Equation: line(join(sub(scriptL, integer(0)), t.u(0)), equals, Term{Pre: integer(0)}),
		Words:    cell(inline(t.u(0)), text(" does not depend on the fast variables")),
	})
	for _, o := range lim.Orders {
		h.Rows = append(h.Rows, t.order(o))
	}
	sec.Blocks = append(sec.Blocks, h)
	return sec
}

func (t *teller) orderName(p *big.Rat) Math { return power(t.eps, p) }

func (t *teller) dt(time Math) Math {
	if time.Text == "t" {
		return Math{"∂ₜ", `\partial_{t}`, "<msub><mi>∂</mi><mi>t</mi></msub>"}
	}
	return Math{"∂_" + time.Text + " ", `\partial_{` + time.TeX + `}`, "<msub><mi>∂</mi>" + time.MathML + "</msub>"}
}

func (t *teller) order(o perturb.Order) Order {
	var src []Term
	var all []Math
	for i, c := range o.Source {
		m := join(t.opName(c.Power), t.u(c.Index))
		src = append(src, Term{Neg: true, Post: m})
		if i > 0 {
			all = append(all, op("+", "+"))
		}
		all = append(all, m)
	}
	row := Order{Power: t.orderName(o.Power)}
	left := join(sub(scriptL, integer(0)), t.u(o.J))
	averaged := mean(join(all...))
	if !o.Limit {
		row.Equation = line(left, equals, src...)
		c := line(averaged, equals, Term{Pre: integer(0)})
		row.Condition = &c
		y := line(t.u(o.J), equals, t.acting(o.Corrector)...)
		row.Yield = &y
		return row
	}
	du := join(t.dt(t.timeVariable()), t.u(0))
	row.Equation = line(left, equals, append([]Term{{Post: du}}, src...)...)
	c := line(du, equals, Term{Post: averaged})
	row.Condition = &c
	y := line(du, equals, t.acting(o.Mean)...)
	row.Yield = &y
	return row
}

// acting writes an expression linear in the derivatives of u0 as an operator
// that acts on it, lower order first.
func (t *teller) acting(e algebra.Expr) []Term {
	ds, err := e.Derivatives(t.res.Limit.U0)
	if err != nil || len(ds) == 0 {
		return t.terms(e)
	}
	o := generator.New(e.Ring(), t.names)
	for _, d := range ds {
		o.Add(d.Index, d.Coef)
	}
	u0 := t.u(0)
	var out []Term
	for _, x := range o.Terms() {
		d := u0
		if p := t.derivative(t.names, x.Index); !p.Empty() {
			d = join(p, Math{Text: " "}, u0)
		}
		out = append(out, t.scaled(x.Coef, d)...)
	}
	return out
}

// correctors are the solutions of the fast problems.
func (t *teller) correctors() Section {
	sec := Section{ID: "correctors", Title: "Correctors"}
	var ls []Line
	for i, c := range t.res.Limit.Cell {
		if c.Valid() && !c.IsZero() {
			ls = append(ls, line(sub(t.own("Φ"), t.symbol(t.names[i])), equals, t.terms(c)...))
		}
	}
	if len(ls) == 0 {
		return sec
	}
	b := t.own("b")
	eq := join(sub(scriptL, integer(0)), thin, t.own("Φ"), equals, Math{"−", "-", `<mo form="prefix">−</mo>`}, paren(join(b, op("−", "-"), mean(b))))
	p := Para{text("The corrector of each slow drift "), inline(b), text(" at the first order, with "), inline(eq), text(":")}
	return t.withBlocks(sec, append([]Block{p, Equations{ID: "correctors", Lines: ls}}, t.named()...)...)
}

// named explains the averages and correctors that have no closed form.
func (t *teller) named() []Block {
	if t.res.Route == nil {
		return nil
	}
	var ls []Line
	l0 := sub(scriptL, integer(0))
	for _, n := range t.res.Route.Names() {
		phi, avg := t.symbol(n.Phi), t.symbol(n.Mean)
		right := []Term{{Post: avg}}
		if n.Zero {
			right = nil
		}
		l := line(join(l0, phi), equals, append(right, negated(t.terms(n.Of))...)...)
		l.Note = cell(inline(join(avg, equals, mean(t.expr(n.Of)))))
		if n.Zero {
			l.Note = cell(inline(join(mean(t.expr(n.Of)), equals, integer(0))), text(" by symmetry"))
		}
		ls = append(ls, l)
	}
	if len(ls) == 0 {
		return nil
	}
	return []Block{Para{text("These have no closed form and are known by numbers (" + t.res.Route.Name() + "); a name stands for the solution of its fast problem:")},
		Equations{ID: "named", Lines: ls}}
}

func negated(ts []Term) []Term {
	for i := range ts {
		ts[i].Neg = !ts[i].Neg
	}
	return ts
}

// limit is the limiting SDE.
func (t *teller) limit() Section {
	res, lim := t.res, t.res.Limit
	sec := Section{ID: "limit", Title: "Limit"}
	p := Para{text("As "), inline(join(t.eps, op("→", `\to`), integer(0))), text(" on times "), inline(join(t.own("t"), equals, glue(t.epsTo(new(big.Rat).Neg(lim.Power)), t.own("T")))), text(" (" + lim.Regime + ")")}
	if lim.Power.Sign() == 0 {
		p = Para{text("As "), inline(join(t.eps, op("→", `\to`), integer(0))), text(" (" + lim.Regime + ")")}
	}
	noise := res.Noise
	if noise == nil {
		noise = make([][]algebra.Expr, len(t.names))
	}
	random := len(noise) > 0 && len(noise[0]) > 0
	if random {
		p = append(p, text(", in the Itô sense"))
	}
	sec.Blocks = append(sec.Blocks, append(p, text(":")))
	var ls []Line
	for i, v := range t.names {
		ls = append(ls, t.timed(t.sde(v, lim.Drift[i], noise[i], nil, false)))
	}
	sec.Blocks = append(sec.Blocks, Equations{ID: "ito", Lines: ls})
	if res.NoiseError != nil {
		sec.Blocks = append(sec.Blocks, Para{text("A factor of the diffusion matrix was not found in closed form (" + res.NoiseError.Error() + "); its entries are below.")})
	}
	if random && res.Stratonovich != nil {
		sec.Blocks = append(sec.Blocks, t.stratonovich(noise)...)
	}
	sec.Blocks = append(sec.Blocks, t.diffusion()...)
	return sec
}

// frame tells that a large mean drift was subtracted.
func (t *teller) frame() Section {
	f := t.res.Limit.Frame
	sec := Section{ID: "frame", Title: "Moving frame"}
	if f == nil {
		return sec
	}
	var ls []Line
	for i, v := range f.Velocity {
		ls = append(ls, line(sub(t.own("c"), t.symbol(t.names[i])), equals, t.terms(v)...))
	}
	p := Para{text("The large drift has the mean "), inline(glue(t.epsTo(f.Power), t.own("c"))), text(", which was subtracted: the limit below is that of the deviation from the point that moves with it. With")}
	if f.Short {
		p = Para{text("The large drift has the mean "), inline(glue(t.epsTo(f.Power), t.own("c"))), text(", and no frame can move with it, because the model varies along the way: the limit below is the averaging limit on the shorter time scale. With")}
	}
	return t.withBlocks(sec, p, Equations{ID: "frame", Lines: ls})
}

// next is the corrections beyond the limit, where they were asked for.
func (t *teller) next() Section {
	sec := Section{ID: "next", Title: "Beyond the limit"}
	for _, c := range t.res.Limit.Corrections {
		var ls []Line
		for i, n := range t.names {
			ls = append(ls, line(sub(t.own("f"), t.symbol(n)), equals, t.atMost(c.Drift[i])...))
		}
		for i := range t.names {
			for j := i; j < len(t.names); j++ {
				ls = append(ls, line(t.entry(i, j), equals, t.atMost(c.Diffusion[i][j])...))
			}
		}
		p := Para{text("At the relative order "), inline(power(t.eps, c.Power)), text(" the generator gains the drift "), inline(t.own("f")), text(" and the diffusion matrix "), inline(t.own("A")), text(":")}
		sec.Blocks = append(sec.Blocks, p, Equations{Lines: ls})
		if c.Higher.Valid() && !c.Higher.IsZero() {
			sec.Blocks = append(sec.Blocks, Para{text("It also gains derivatives of third or higher order, so that the corrected equation is not that of a diffusion.")})
		}
	}
	return sec
}

// timed replaces t by T where the limit lives on a longer time.
func (t *teller) timed(l Line) Line {
	if t.res.Limit.Power.Sign() == 0 {
		return l
	}
	tv := t.timeVariable()
	for i, x := range l.Right {
		if x.Post.Text == "dt" {
			l.Right[i].Post = Math{"d" + tv.Text, `\mathrm{d}` + tv.TeX, upright("d") + tv.MathML}
		}
	}
	return l
}

func (t *teller) stratonovich(noise [][]algebra.Expr) []Block {
	res := t.res
	var corr, ls []Line
	for i, v := range t.names {
		c := res.Limit.Drift[i].Sub(res.Stratonovich[i])
		x := t.symbol(v)
		left := join(sub(t.own("c"), x))
		corr = append(corr, line(left, equals, t.terms(c)...))
		ls = append(ls, t.timed(t.sde(v, res.Stratonovich[i], noise[i], nil, true)))
	}
	def := join(sub(t.own("c"), lit("i", "i")), equals, half, thin, bare("Σ", `\textstyle\sum_{j,k}`), thin, sub(t.own("σ"), join(lit("j", "j"), lit("k", "k"))), thin,
		Math{"∂_j", `\partial_{j}`, "<msub><mi>∂</mi><mi>j</mi></msub>"}, thin, sub(t.own("σ"), join(lit("i", "i"), lit("k", "k"))))
	return []Block{
		Para{text("The Stratonovich drift is smaller by the correction "), inline(def), text(":")},
		Equations{ID: "correction", Lines: corr},
		Para{text("In the Stratonovich sense:")},
		Equations{ID: "stratonovich", Lines: ls},
	}
}

// diffusion lists A = sigma sigma^T.
func (t *teller) diffusion() []Block {
	var ls []Line
	zero := true
	a := t.res.Limit.Diffusion
	for i := range t.names {
		for j := i; j < len(t.names); j++ {
			zero = zero && a[i][j].IsZero()
			ls = append(ls, line(sub(t.own("A"), join(t.symbol(t.names[i]), t.symbol(t.names[j]))), equals, t.terms(a[i][j])...))
		}
	}
	if zero {
		return []Block{Para{text("The limit is deterministic.")}}
	}
	p := Para{text("The diffusion matrix "), inline(join(t.own("A"), equals, t.own("σ"), transposed(t.own("σ"))))}
	if t.res.Noise != nil {
		p = append(p, note(" (the sign of a column of σ and a rotation of its columns do not change the law)"))
	}
	return []Block{append(p, text(":")), Equations{ID: "diffusion", Lines: ls}}
}

// originWords explains the origins of drift terms.
var originWords = map[string]string{
	perturb.OriginAveraged:    "the slow drift, averaged over the fast process",
	perturb.OriginFluctuation: "induced by the fluctuations of the large drift",
	perturb.OriginFastLaw:     "the fast process itself varies with the slow variables",
	perturb.OriginShared:      "the slow and the fast equations share noise",
	perturb.OriginFastDrift:   "a weaker drift or noise of the fast variables",
	perturb.OriginHigher:      "second-order slow terms acting on the correctors",
}

func (t *teller) origins() Section {
	sec := Section{ID: "origins", Title: "Where each drift term comes from"}
	var ls []Line
	for i, ts := range t.res.Limit.Terms {
		for k, x := range ts {
			left, rel := join(t.symbol(t.names[i]), Math{":", ":", mo(":")}), Math{}
			if k > 0 {
				left = Math{}
			}
			l := line(left, rel, t.terms(x.Value)...)
			w, ok := originWords[x.Origin]
			if !ok {
				w = x.Origin
			}
			l.Note = cell(text(w))
			ls = append(ls, l)
		}
	}
	if len(ls) == 0 {
		return sec
	}
	return t.withBlocks(sec, Equations{ID: "origins", Lines: ls})
}

// fokkerPlanck is the forward equation in conservative form.
func (t *teller) fokkerPlanck() Section {
	sec := Section{ID: "fokker-planck", Title: "Fokker–Planck equation"}
	var div []Term
	var ls []Line
	for i, v := range t.names {
		j := sub(t.own("J"), t.symbol(v))
		div = append(div, Term{Neg: true, Pre: t.partial(v, 1), Post: j})
		ls = append(ls, line(j, equals, t.current(i)...))
	}
	head := line(join(t.dt(t.timeVariable()), t.own("p")), equals, div...)
	sec.Blocks = append(sec.Blocks, Equations{ID: "fokker-planck", Lines: append([]Line{head}, ls...)})
	if t.anyLong() {
		sec.Blocks = append(sec.Blocks, Para{text("Here "), inline(t.own("f")), text(" is the Itô drift and "), inline(t.own("A")), text(" the diffusion matrix above.")})
	}
	if b := t.boundaries(); len(b) > 0 {
		sec.Blocks = append(sec.Blocks, b)
	}
	return sec
}

// current is f_i p - 1/2 sum_j d_j (A_ij p). Long coefficients stand there by
// their names.
func (t *teller) current(i int) []Term {
	lim := t.res.Limit
	p := t.own("p")
	ts := t.scaled(lim.Drift[i], p)
	if t.long(lim.Drift[i]) {
		ts = []Term{{Pre: sub(t.own("f"), t.symbol(t.names[i])), Post: p}}
	}
	for j, v := range t.names {
		a := lim.Diffusion[i][j]
		if a.IsZero() {
			continue
		}
		if !dependsOn(a, t.names) && !t.long(a) {
			k := a.Mul(a.Ring().Frac(1, 2)).Neg()
			ts = append(ts, t.scaled(k, join(t.partial(v, 1), thin, p))...)
			continue
		}
		body := glue(t.entry(i, j), p)
		if !t.long(a) {
			body = signed(t.scaled(a, p))
		}
		ts = append(ts, Term{Neg: true, Pre: join(half, thin, t.partial(v, 1)), Post: paren(body)})
	}
	return ts
}

func (t *teller) anyLong() bool {
	for i, f := range t.res.Limit.Drift {
		if t.long(f) {
			return true
		}
		for _, a := range t.res.Limit.Diffusion[i] {
			if t.long(a) {
				return true
			}
		}
	}
	return false
}

// entry is the name of an entry of A, in the order in which it was listed.
func (t *teller) entry(i, j int) Math {
	return sub(t.own("A"), join(t.symbol(t.names[min(i, j)]), t.symbol(t.names[max(i, j)])))
}

// long tells coefficients that are better called by their names.
func (t *teller) long(e algebra.Expr) bool { return len(t.form(e).String()) > 60 }

func dependsOn(e algebra.Expr, names []string) bool {
	for _, n := range names {
		if e.DependsOn(n) {
			return true
		}
	}
	return false
}

// boundaries states what holds at the ends of the domains.
func (t *teller) boundaries() Para {
	var p Para
	add := func(spans ...Span) {
		if len(p) > 0 {
			p = append(p, text("; "))
		}
		p = append(p, spans...)
	}
	var whole []string
	for _, v := range t.res.System.Slow {
		x := t.symbol(v.Name)
		j := sub(t.own("J"), x)
		switch v.Domain.Kind {
		case ito.Reflecting:
			add(inline(join(j, equals, integer(0))), text(" at the walls "), inline(join(x, equals, t.expr(v.Domain.A), comma, t.expr(v.Domain.B))))
		case ito.Absorbing:
			add(inline(join(t.own("p"), equals, integer(0))), text(" at the absorbing ends "), inline(join(x, equals, t.expr(v.Domain.A), comma, t.expr(v.Domain.B))))
		case ito.Periodic, ito.Circle:
			add(inline(t.own("p")), text(" and "), inline(j), text(" are periodic in "), inline(x))
		case ito.HalfLine:
			add(inline(join(j, equals, integer(0))), text(" at "), inline(join(x, equals, integer(0))), text(" and at infinity"))
		case ito.Line:
			whole = append(whole, v.Name)
		}
	}
	for _, n := range whole {
		x := t.symbol(n)
		add(inline(sub(t.own("J"), x)), text(" vanishes as "), inline(join(fenced(Math{Text: "|", TeX: "|"}, x, Math{Text: "|", TeX: "|"}), op("→", `\to`), lit("∞", `\infty`))))
	}
	if len(p) > 0 {
		p = append(p, text("."))
		p[0].Text = capital(p[0].Text)
	}
	return p
}

// stationary is the stationary law, or what forbids a closed form.
func (t *teller) stationary() Section {
	s := t.res.Stationary
	sec := Section{ID: "stationary", Title: "Stationary density"}
	if s.H != nil {
		sec.Blocks = append(sec.Blocks, t.force(s.H)...)
	}
	if s.Density.Valid() {
		l := line(sub(t.own("p"), lit("s", "s")), propto, t.terms(s.Density)...)
		sec.Blocks = append(sec.Blocks, Equations{ID: "density", Lines: []Line{l}})
		how := s.How
		switch {
		case s.WithValues:
			how += "; with the formulas and values given"
		case s.WithFormulas:
			how += "; with the formulas given"
		}
		if how != "" {
			sec.Blocks = append(sec.Blocks, append(Para{text("Found from: ")}, t.rich(how+".")...))
		}
	} else {
		sec.Blocks = append(sec.Blocks, Para{text("There is no closed form here; the density is numerical.")})
	}
	var p Para
	why := t.rich(s.Why + ".")
	switch s.Reversible {
	case fokkerplanck.Yes:
		p = append(Para{strong("Reversible"), text(": ")}, why...)
	case fokkerplanck.No:
		p = append(Para{strong("Irreversible"), text(": ")}, why...)
	default:
		p = append(Para{text("Reversibility is open: ")}, why...)
	}
	sec.Blocks = append(sec.Blocks, p)
	if s.Curl.Valid() && !s.Curl.IsZero() {
		a, b := t.symbol(s.CurlAt[0]), t.symbol(s.CurlAt[1])
		h := t.own("h")
		left := join(t.partial(s.CurlAt[0], 1), thin, sub(h, b), op("−", "-"), t.partial(s.CurlAt[1], 1), thin, sub(h, a))
		sec.Blocks = append(sec.Blocks, Equations{ID: "curl", Lines: []Line{line(left, equals, t.atMost(s.Curl)...)}})
	}
	if s.Current != nil && !allZero(s.Current) {
		var ls []Line
		for i, j := range s.Current {
			ls = append(ls, line(sub(t.own("J"), t.symbol(t.names[i])), equals, t.atMost(j)...))
		}
		sec.Blocks = append(sec.Blocks, Para{text("The stationary current, in units of the factor before the density:")}, Equations{ID: "current", Lines: ls})
	}
	if s.Density.Valid() {
		sec.Blocks = append(sec.Blocks, t.normal(s))
	}
	return sec
}

// force is the field whose being a gradient decides about reversibility.
func (t *teller) force(h []algebra.Expr) []Block {
	var ls []Line
	for i, e := range h {
		ls = append(ls, line(sub(t.own("h"), t.symbol(t.names[i])), equals, t.atMost(e)...))
	}
	p := append(Para{text("A density without current is the exponential of a potential of ")}, t.rich("h = A^-1 (2 f - div A)")...)
	p = append(p, text(", with "), inline(t.own("f")), text(" the Itô drift:"))
	return []Block{p, Equations{ID: "force", Lines: ls}}
}

// tooMuch is the length of a formula beyond which nobody reads it.
const tooMuch = 2000

// atMost is terms for side results, which are left out when they are very
// long.
func (t *teller) atMost(e algebra.Expr) []Term {
	if e.Valid() {
		if n := len(t.form(e).String()); n > tooMuch {
			return []Term{{Pre: words(fmt.Sprintf("(%d characters; in full with --format json)", n))}}
		}
	}
	return t.terms(e)
}

func allZero(es []algebra.Expr) bool {
	for _, e := range es {
		if !e.IsZero() {
			return false
		}
	}
	return true
}

func (t *teller) normal(s *fokkerplanck.Stationary) Para {
	why := t.rich(": " + s.NormalWhy + ".")
	if s.NormalWhy == "" {
		why = []Span{text(".")}
	}
	switch s.Normal {
	case fokkerplanck.Yes:
		return append(Para{text("It can be normalised")}, why...)
	case fokkerplanck.No:
		return append(Para{text("It "), strong("cannot be normalised")}, why...)
	}
	return append(Para{text("Whether it can be normalised is open")}, why...)
}
