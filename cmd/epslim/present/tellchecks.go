package present

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"epslim/cmd/epslim/derivation"
)

func capital(s string) string {
	r, n := utf8.DecodeRuneInString(s)
	if n == 0 {
		return s
	}
	return string(unicode.ToUpper(r)) + s[n:]
}

// refusal tells what is wrong, the quantity that shows it, and what would
// mend it.
func (t *teller) refusal() Section {
	r := t.res.Refused
	sec := Section{ID: "refusal", Title: "There is no limit"}
	sec.Blocks = append(sec.Blocks, append(Para{{Text: capital(string(r.Reason)), Kind: Bad}, text(": ")}, t.rich(r.Text+".")...))
	var ls []Line
	for _, k := range r.DetailNames() {
		ls = append(ls, line(t.detailName(k), equals, t.terms(r.Detail[k])...))
	}
	if len(ls) > 0 {
		sec.Blocks = append(sec.Blocks, Equations{ID: "refusal", Lines: ls})
	}
	if r.Mend != "" {
		sec.Blocks = append(sec.Blocks, append(Para{text("What would mend it: ")}, t.rich(r.Mend+".")...))
	}
	return sec
}

// detailName is the name of a quantity in a refusal: of a slow variable, its
// mean drift or diffusion.
func (t *teller) detailName(k string) Math {
	for _, n := range t.names {
		if n == k {
			switch t.res.Refused.Reason {
			case "uncentred":
				return mean(sub(t.own("b"), t.symbol(n)))
			case "singular-noise":
				return sub(t.own("A"), join(t.symbol(n), t.symbol(n)))
			}
			return t.symbol(n)
		}
	}
	if t.res.System.Variable(k) != nil || t.res.System.Parameter(k) != nil {
		return t.symbol(k)
	}
	return words(k)
}

func (t *teller) conditions() Section {
	sec := Section{ID: "conditions", Title: "Conditions"}
	if len(t.res.Conditions) == 0 {
		sec.Blocks = append(sec.Blocks, Para{text("The declared assumptions are enough.")})
		return sec
	}
	p := Para{text("The result needs, beyond what was declared: ")}
	for i, c := range t.res.Conditions {
		if i > 0 {
			p = append(p, text(", "))
		}
		p = append(p, Span{Text: c, Kind: Code})
	}
	return t.withBlocks(sec, append(p, text(".")))
}

func (t *teller) checks() Section {
	sec := Section{ID: "certificates", Title: "Certificates"}
	tab := Table{}
	for _, c := range t.res.Certificates {
		k := Good
		switch c.Status {
		case derivation.Failed:
			k = Bad
		case derivation.Numerical:
			k = Strong
		}
		tab.Rows = append(tab.Rows, [][]Span{cell(Span{Text: string(c.Status), Kind: k}), t.rich(c.What), t.rich(c.Detail)})
	}
	if len(tab.Rows) == 0 {
		return sec
	}
	return t.withBlocks(sec, tab)
}

func (t *teller) claims() Section {
	sec := Section{ID: "claims", Title: "Claims"}
	tab := Table{}
	for _, v := range t.res.Claims {
		k := Good
		switch v.Verdict {
		case derivation.Refuted:
			k = Bad
		case derivation.Undecided:
			k = Strong
		}
		tab.Rows = append(tab.Rows, [][]Span{cell(Span{Text: v.Verdict, Kind: k}), cell(text(v.Claim.Label())), t.rich(v.Reason)})
		for _, w := range t.witness(v.Witness) {
			tab.Rows = append(tab.Rows, [][]Span{nil, nil, w})
		}
	}
	if len(tab.Rows) == 0 {
		return sec
	}
	return t.withBlocks(sec, tab)
}

// witness shows the point, both values, their difference and the likely slip.
func (t *teller) witness(w *derivation.Witness) [][]Span {
	if w == nil {
		return nil
	}
	var out [][]Span
	if w.Claimed != "" {
		var at []string
		for _, k := range sortedKeys(w.At) {
			at = append(at, k+" = "+w.At[k])
		}
		s := "claimed " + w.Claimed + ", derived " + w.Derived
		if len(at) > 0 {
			s = "at " + strings.Join(at, ", ") + ": " + s
		}
		out = append(out, cell(text(s)))
	}
	if w.Difference.Valid() && !w.Difference.IsZero() {
		out = append(out, cell(text("difference "), inline(t.expr(w.Difference))))
	}
	if w.Slip != "" {
		out = append(out, append(cell(text("likely slip: ")), t.rich(w.Slip)...))
	}
	return out
}

func (t *teller) values() Section {
	sec := Section{ID: "values", Title: "Values"}
	for _, v := range t.res.Values {
		var at []string
		for i, n := range t.names {
			at = append(at, n+" = "+v.At.Slow[i].Text)
		}
		for _, k := range sortedKeys(v.At.Parameters) {
			at = append(at, k+" = "+v.At.Parameters[k].Text)
		}
		tab := Table{}
		for i, n := range t.names {
			tab.Rows = append(tab.Rows, [][]Span{cell(text("drift " + n)), cell(text(float(v.Drift[i])))})
		}
		for i := range t.names {
			for j := i; j < len(t.names); j++ {
				tab.Rows = append(tab.Rows, [][]Span{cell(text("A " + t.names[i] + "," + t.names[j])), cell(text(float(v.Diffusion[i][j])))})
			}
		}
		sec.Blocks = append(sec.Blocks, Para{text("At " + strings.Join(at, ", ") + " (to " + strconv.FormatFloat(v.Error, 'e', 0, 64) + "):")}, tab)
		if v.SmallEnough > 0 {
			sec.Blocks = append(sec.Blocks, Para{text("There the first correction changes drift and diffusion by less than one per cent of their size for "), inline(join(t.eps, op("<", "<"))), text(strconv.FormatFloat(v.SmallEnough, 'g', 2, 64) + ".")})
		}
	}
	return sec
}

func float(x float64) string { return minus(strconv.FormatFloat(x, 'g', 15, 64)) }
