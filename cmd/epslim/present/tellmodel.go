package present

import (
	"math/big"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

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
