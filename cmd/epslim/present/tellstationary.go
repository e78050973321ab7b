package present

import (
	"fmt"

	"epslim/fokkerplanck"
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

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
