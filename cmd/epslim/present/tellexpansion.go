package present

import (
	"context"
	"math"
	"math/big"
	"strconv"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/perturb"
)

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
	return append([]Block{Para{text("These have no closed form and are known by numbers (" + t.res.Route.Name() + "); a name stands for the solution of its fast problem:")},
		Equations{ID: "named", Lines: ls}}, t.averageValues()...)
}

// averageValues gives the numbers behind the names, where they are constants
// for the declared values of the parameters.
func (t *teller) averageValues() []Block {
	var ls []Line
	for _, a := range t.res.Averages(context.Background()) {
		if !a.Known || a.Zero {
			continue
		}
		m, ok := t.res.System.Ring.Symbol(a.Name)
		if !ok {
			continue
		}
		value := strconv.FormatFloat(a.Value, 'g', 12, 64)
		l := line(t.expr(m), equals, Term{Pre: decimalMath(value)})
		l.Note = cell(text("to " + strconv.FormatFloat(math.Max(a.Error, 1e-16), 'e', 0, 64)))
		ls = append(ls, l)
	}
	if len(ls) == 0 {
		return nil
	}
	return []Block{Para{text("For the declared values of the parameters:")}, Equations{ID: "averages", Lines: ls}}
}

func negated(ts []Term) []Term {
	for i := range ts {
		ts[i].Neg = !ts[i].Neg
	}
	return ts
}
