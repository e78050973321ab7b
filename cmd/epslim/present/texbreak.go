package present

import (
	"fmt"
	"math/big"

	"epslim/generator/algebra"
)

// texPiece is a part of a displayed formula before which a line may end.
type texPiece struct {
	tex   string
	width float64
}

// pieces cuts a sum at its signs. Summands wider than room are opened up: a
// factor that is a sum is cut at its own signs, inside brackets of a fixed
// size, which TeX can break.
func (l *latexWriter) pieces(ts []Term, room float64) []texPiece {
	var out []texPiece
	for i, t := range ts {
		lead := ""
		switch {
		case t.Neg && i == 0:
			lead = "-"
		case t.Neg:
			lead = "- "
		case i > 0:
			lead = "+ "
		}
		out = append(out, l.term(lead, t, room, 0)...)
	}
	return out
}

func (l *latexWriter) term(lead string, t Term, room float64, depth int) []texPiece {
	m := lead + t.whole().TeX
	w := texWidth("x" + m)
	if w <= room || t.F == nil || depth > 4 {
		return []texPiece{{m, w}}
	}
	if pre, inner, post, ok := l.open(t); ok {
		out := []texPiece{}
		ahead := texWidth("x" + lead + pre + "(")
		for k, s := range formTerms(inner) {
			sl := ""
			switch {
			case s.Neg && k == 0:
				sl = "-"
			case s.Neg:
				sl = "- "
			case k > 0:
				sl = "+ "
			}
			have := room - 2
			if k == 0 {
				have = max(room-ahead-1, room*0.3)
			}
			out = append(out, l.term(sl, s, have, depth+1)...)
		}
		first, last := &out[0], &out[len(out)-1]
		first.tex = lead + pre + `\Bigl(` + first.tex
		first.width += ahead
		last.tex += `\Bigr)` + post
		last.width += texWidth(")" + post)
		return out
	}
	if g := l.abbreviate(t.F, room); g != t.F {
		t.F = g
		return l.term(lead, t, room, depth+1)
	}
	return []texPiece{{m, w}}
}

// open finds the widest factor of a term that is a sum, with what stands
// before and behind it.
func (l *latexWriter) open(t Term) (pre string, inner *algebra.Form, post string, ok bool) {
	f := t.F
	behind := t.Post
	if !behind.Empty() {
		post = `\,` + behind.TeX
	}
	front := t.Pre
	num, den := f, (*algebra.Form)(nil)
	if f.Op == algebra.FormQuotient {
		num, den = f.Args[0], f.Args[1]
	}
	if num.Op == algebra.FormCall && num.Name == "exp" && den == nil && num.Args[0].Op == algebra.FormSum {
		return front.TeX + `\exp`, num.Args[0], post, true
	}
	var rest []*algebra.Form
	switch num.Op {
	case algebra.FormSum:
		inner = num
	case algebra.FormProduct:
		best := 0.0
		at := -1
		for i, g := range num.Args {
			if g.Op != algebra.FormSum {
				continue
			}
			if w := texWidth(g.LaTeX(algebra.LatexOptions{Inline: true})); w > best {
				best, at = w, i
			}
		}
		if at < 0 {
			return "", nil, "", false
		}
		inner = num.Args[at]
		rest = append(append(rest, num.Args[:at]...), num.Args[at+1:]...)
	default:
		return "", nil, "", false
	}
	// A derivative goes behind, so that it does not seem to act on the sum.
	var kept []*algebra.Form
	for _, g := range rest {
		if g.Op == algebra.FormDiff && len(g.Args) == 0 {
			post = `\,` + g.LaTeX(algebra.LatexOptions{}) + post
			continue
		}
		kept = append(kept, g)
	}
	before := product(kept)
	if den != nil {
		if before == nil {
			before = one()
		}
		before = &algebra.Form{Op: algebra.FormQuotient, Args: []*algebra.Form{before, den}}
	}
	pre = front.TeX
	if before != nil {
		tex := before.LaTeX(algebra.LatexOptions{})
		if texWidth(tex) > l.room*0.6 {
			before = l.abbreviate(before, l.room*0.5)
			tex = before.LaTeX(algebra.LatexOptions{})
		}
		if pre != "" {
			pre += `\,`
		}
		pre += tex
	}
	return pre, inner, post, true
}

func one() *algebra.Form { return &algebra.Form{Op: algebra.FormNumber, Num: big.NewRat(1, 1)} }

func product(fs []*algebra.Form) *algebra.Form {
	switch len(fs) {
	case 0:
		return nil
	case 1:
		return fs[0]
	}
	return &algebra.Form{Op: algebra.FormProduct, Args: fs}
}

// abbreviate gives names to sums inside a form that cannot be broken. The
// same sum gets the same name.
func (l *latexWriter) abbreviate(f *algebra.Form, room float64) *algebra.Form {
	var walk func(g *algebra.Form, top bool) *algebra.Form
	walk = func(g *algebra.Form, top bool) *algebra.Form {
		if !top && g.Op == algebra.FormSum && texWidth(g.LaTeX(algebra.LatexOptions{Inline: true})) > min(room*0.35, 8) {
			return l.name(g)
		}
		if g.Op == algebra.FormDiff || g.Op == algebra.FormIntegral {
			return g
		}
		var args []*algebra.Form
		changed := false
		for _, a := range g.Args {
			b := walk(a, false)
			changed = changed || b != a
			args = append(args, b)
		}
		if !changed {
			return g
		}
		return &algebra.Form{Op: g.Op, Num: g.Num, Name: g.Name, Latex: g.Latex, Args: args, Vars: g.Vars}
	}
	return walk(f, true)
}

func (l *latexWriter) name(g *algebra.Form) *algebra.Form {
	key := g.String()
	for _, a := range l.abbreviations {
		if a.key == key {
			return a.symbol
		}
	}
	l.count++
	tex := fmt.Sprintf("q_{%d}", l.count)
	s := &algebra.Form{Op: algebra.FormSymbol, Name: fmt.Sprintf("q_%d", l.count), Latex: tex}
	l.abbreviations = append(l.abbreviations, abbreviation{key, s, g})
	return s
}

// abbreviation is a name for a sum.
type abbreviation struct {
	key    string
	symbol *algebra.Form
	value  *algebra.Form
}

// fill lays pieces out in lines: the first of them first em wide, the others
// rest.
func fill(ps []texPiece, first, rest float64) []string {
	var out []string
	line, used, room := "", 0.0, first
	for _, p := range ps {
		if line != "" && used+p.width > room {
			out = append(out, line)
			line, used, room = "", 0, rest
		}
		if line != "" {
			line += " "
		}
		line += p.tex
		used += p.width
	}
	return append(out, line)
}
