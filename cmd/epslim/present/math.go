package present

import (
	"html"
	"math/big"
	"strings"

	"epslim/generator/algebra"
)

// Math is a piece of a formula in every notation: Unicode text, TeX, and
// MathML.
type Math struct{ Text, TeX, MathML string }

// Empty reports whether nothing would be printed.
func (m Math) Empty() bool { return m.Text == "" && m.TeX == "" }

// join sets pieces side by side.
func join(ms ...Math) Math {
	var out Math
	for _, m := range ms {
		out.Text += m.Text
		switch {
		case out.TeX == "" || m.TeX == "":
		case endsInCommand(out.TeX) && isLetter(m.TeX[0]):
			out.TeX += " "
		}
		out.TeX += m.TeX
		out.MathML += m.MathML
	}
	return out
}

func isLetter(c byte) bool { return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' }

// endsInCommand: a letter that follows would be read as part of the command.
func endsInCommand(s string) bool {
	i := len(s)
	for i > 0 && isLetter(s[i-1]) {
		i--
	}
	return i > 0 && i < len(s) && s[i-1] == '\\'
}

func mi(s string) string { return "<mi>" + html.EscapeString(s) + "</mi>" }
func mo(s string) string { return "<mo>" + html.EscapeString(s) + "</mo>" }

func upright(s string) string {
	return `<mi mathvariant="normal">` + html.EscapeString(s) + "</mi>"
}

// lit is an identifier with its TeX.
func lit(text, tex string) Math { return Math{text, tex, mi(text)} }

// op is an operator or relation, with spaces around it in text.
func op(text, tex string) Math { return Math{" " + text + " ", " " + tex + " ", mo(text)} }

// bare is an operator without spaces in text.
func bare(text, tex string) Math { return Math{text, tex, mo(text)} }

var (
	thin     = Math{" ", `\,`, `<mspace width="0.17em"></mspace>`}
	equals   = op("=", "=")
	propto   = op("∝", `\propto`)
	comma    = Math{", ", `,\; `, `<mo separator="true">,</mo>`}
	elem     = op("∈", `\in`)
	circ     = op("∘", `\circ`)
	scriptL  = lit("ℒ", `\mathcal{L}`)
	bigPhi   = lit("Φ", `\Phi`)
	rho      = lit("ρ", `\rho`)
	prob     = lit("p", "p")
	sigma    = lit("σ", `\sigma`)
	half     = Math{"½", `\tfrac12`, "<mfrac><mn>1</mn><mn>2</mn></mfrac>"}
	ellipsis = bare("…", `\cdots`)
)

func words(s string) Math {
	return Math{s, `\text{` + texEscape(s) + `}`, "<mtext>" + html.EscapeString(s) + "</mtext>"}
}

// sub is base with an index written on the line after an underscore in text,
// or below it when it is a number.
func sub(base, index Math) Math {
	t := base.Text + "_" + index.Text
	if isNumber(index.Text) {
		t = base.Text + lowered(index.Text)
	}
	return Math{t, base.TeX + "_{" + index.TeX + "}", "<msub><mrow>" + base.MathML + "</mrow><mrow>" + index.MathML + "</mrow></msub>"}
}

func isNumber(s string) bool { return s != "" && strings.Trim(s, "0123456789") == "" }

const (
	lowDigits  = "₀₁₂₃₄₅₆₇₈₉"
	highDigits = "⁰¹²³⁴⁵⁶⁷⁸⁹"
)

func digits(s, set string) string {
	r := []rune(set)
	var b strings.Builder
	for _, c := range s {
		b.WriteRune(r[c-'0'])
	}
	return b.String()
}

func lowered(s string) string { return digits(s, lowDigits) }

// decimalMath is a decimal number as it is written.
func decimalMath(s string) Math {
	return Math{minus(s), s, "<mn>" + minus(s) + "</mn>"}
}

func integer(n int) Math {
	s := big.NewInt(int64(n)).String()
	return Math{s, s, "<mn>" + s + "</mn>"}
}

// power is base^q.
func power(base Math, q *big.Rat) Math {
	s := q.RatString()
	t := base.Text + "^(" + s + ")"
	if q.IsInt() {
		t = base.Text + digits(strings.TrimPrefix(s, "-"), highDigits)
		if q.Sign() < 0 {
			t = base.Text + "⁻" + digits(s[1:], highDigits)
		}
	}
	ml := "<mn>" + strings.TrimPrefix(s, "-") + "</mn>"
	if q.Sign() < 0 {
		ml = `<mo form="prefix">−</mo>` + ml
	}
	return Math{t, base.TeX + "^{" + s + "}", "<msup><mrow>" + base.MathML + "</mrow><mrow>" + ml + "</mrow></msup>"}
}

func fenced(open Math, m Math, shut Math) Math {
	return Math{
		open.Text + m.Text + shut.Text, open.TeX + m.TeX + shut.TeX,
		`<mrow><mo form="prefix" fence="true">` + html.EscapeString(open.Text) + "</mo>" + m.MathML + `<mo form="postfix" fence="true">` + html.EscapeString(shut.Text) + "</mo></mrow>",
	}
}

func paren(m Math) Math {
	if tall(m.TeX) {
		return fenced(Math{Text: "(", TeX: `\left(`}, m, Math{Text: ")", TeX: `\right)`})
	}
	return fenced(Math{Text: "(", TeX: "("}, m, Math{Text: ")", TeX: ")"})
}

func tall(tex string) bool {
	for _, s := range []string{`\frac`, `\int`, `\sqrt`, `\left`} {
		if strings.Contains(tex, s) {
			return true
		}
	}
	return false
}

// mean is the average over the fast process.
func mean(m Math) Math {
	return fenced(Math{Text: "⟨", TeX: `\langle `}, m, Math{Text: "⟩", TeX: `\rangle`})
}

// notation prints expressions of one system with the user's own symbols.
type notation struct {
	latex map[string]string // the user's TeX of declared names
	taken map[string]bool   // the printed names of the model, which ours must avoid
	forms map[algebra.Expr]*algebra.Form
}

// spare are the letters that step in for ours where the model has taken them.
var spare = map[string][]Math{
	"u": {lit("u", "u"), lit("w", "w"), lit("ψ", `\psi`), lit("U", "U")},
	"p": {prob, lit("P", "P"), lit("q", "q")},
	"h": {lit("h", "h"), lit("H", "H"), lit("g", "g")},
	"f": {lit("f", "f"), lit("F", "F"), lit("g", "g")},
	"b": {lit("b", "b"), lit("B", "B"), lit("β", `\beta`)},
	"c": {lit("c", "c"), lit("C", "C"), lit("γ", `\gamma`)},
	"A": {lit("A", "A"), lit("𝒜", `\mathcal{A}`)},
	"J": {lit("J", "J"), lit("𝒥", `\mathcal{J}`)},
	"Φ": {bigPhi, lit("χ", `\chi`), lit("Ψ", `\Psi`)},
	"ρ": {rho, lit("π", `\varpi`), lit("μ", `\mu`)},
	"σ": {sigma, lit("S", "S"), lit("Σ", `\Sigma`)},
	"T": {lit("T", "T"), lit("τ", `\tau`), lit("s", "s")},
	"t": {lit("t", "t")},
	"W": {lit("W", "W"), lit("B", "B")},
}

// own is one of our letters, or its deputy where the model uses it.
func (n *notation) own(name string) Math {
	for _, m := range spare[name] {
		if !n.taken[m.Text] {
			return m
		}
	}
	return spare[name][0]
}

// symbol prints a declared name.
func (n *notation) symbol(name string) Math {
	return formMath(&algebra.Form{Op: algebra.FormSymbol, Name: name, Latex: n.latex[name]})
}

// form arranges an expression; the same expression is arranged once.
func (n *notation) form(e algebra.Expr) *algebra.Form {
	if f, ok := n.forms[e]; ok {
		return f
	}
	if n.forms == nil {
		n.forms = map[algebra.Expr]*algebra.Form{}
	}
	f := e.Form()
	n.forms[e] = f
	return f
}

// expr prints an expression in one piece.
func (n *notation) expr(e algebra.Expr) Math {
	if !e.Valid() {
		return words("no closed form")
	}
	return formMath(n.form(e))
}

// formMath prints a form in all notations.
func formMath(f *algebra.Form) Math {
	f = lowIndices(f)
	return Math{minus(f.Text()), f.LaTeX(algebra.LatexOptions{}), f.MathML()}
}

// lowIndices gives names that end in small digits, such as those of averages
// without a closed form, an index in TeX.
func lowIndices(f *algebra.Form) *algebra.Form {
	if f.Latex == "" && f.Name != "" {
		base := strings.TrimRight(f.Name, lowDigits)
		if base != f.Name && base != "" {
			g := *f
			n := []rune(f.Name)[len([]rune(base)):]
			for i, c := range n {
				n[i] = c - '₀' + '0'
			}
			b := algebra.Form{Op: algebra.FormSymbol, Name: base}
			g.Latex = b.LaTeX(algebra.LatexOptions{}) + "_{" + string(n) + "}"
			f = &g
		}
	}
	for i, a := range f.Args {
		if b := lowIndices(a); b != a {
			g := *f
			g.Args = append(append([]*algebra.Form(nil), f.Args[:i]...), b)
			for _, c := range f.Args[i+1:] {
				g.Args = append(g.Args, lowIndices(c))
			}
			return &g
		}
	}
	return f
}

// minus writes the sign of the printed mathematics.
func minus(s string) string { return strings.ReplaceAll(s, "-", "−") }

// terms are the signed summands of an expression.
func (n *notation) terms(e algebra.Expr) []Term {
	if !e.Valid() {
		return []Term{{Pre: words("no closed form")}}
	}
	return formTerms(n.form(e))
}

func formTerms(f *algebra.Form) []Term {
	neg := false
	if f.Op == algebra.FormNeg {
		neg, f = true, f.Args[0]
	}
	fs := []*algebra.Form{f}
	if f.Op == algebra.FormSum {
		fs = f.Args
	}
	out := make([]Term, len(fs))
	for i, g := range fs {
		t := Term{Neg: neg, F: g}
		if g.Op == algebra.FormNeg {
			t.Neg, t.F = !neg, g.Args[0]
		}
		out[i] = t
	}
	return out
}

// scaled is e times a symbol behind it, as one summand; nothing for zero.
func (n *notation) scaled(e algebra.Expr, post Math) []Term {
	if e.IsZero() {
		return nil
	}
	f := n.form(e)
	t := Term{F: f, Post: post}
	if f.Op == algebra.FormNeg {
		t.Neg, t.F = true, f.Args[0]
	}
	if isOne(t.F) {
		t.F = nil
	}
	return []Term{t}
}

func isOne(f *algebra.Form) bool {
	return f.Op == algebra.FormNumber && f.Num.IsInt() && f.Num.Num().IsInt64() && f.Num.Num().Int64() == 1
}

// partial is the derivative in a variable.
func (n *notation) partial(name string, times int) Math {
	v := n.symbol(name)
	// The printer writes derivatives of functions; the function is cut off.
	t := algebra.Form{Op: algebra.FormDiff, Name: "u", Vars: repeat(name, times)}
	m := Math{
		Text:   strings.TrimSpace(strings.TrimSuffix(t.Text(), "u")),
		TeX:    `\partial_{` + v.TeX + "}",
		MathML: "<msub>" + mi("∂") + "<mrow>" + v.MathML + "</mrow></msub>",
	}
	if times > 1 {
		k := integer(times)
		m.TeX += "^{" + k.TeX + "}"
		m.MathML = "<msubsup>" + mi("∂") + "<mrow>" + v.MathML + "</mrow>" + k.MathML + "</msubsup>"
	}
	return m
}

func repeat(s string, n int) []string {
	out := make([]string, n)
	for i := range out {
		out[i] = s
	}
	return out
}

// derivative is the product of the partial derivatives of a multi-index.
func (n *notation) derivative(vars []string, index []int) Math {
	var out Math
	for i, k := range index {
		if k > 0 {
			p := n.partial(vars[i], k)
			if !out.Empty() {
				out = join(out, Math{"", `\,`, ""}, p)
				continue
			}
			out = p
		}
	}
	return out
}

// whole prints a term without its sign, on one line.
func (t Term) whole() Math {
	if t.F == nil {
		return glue(t.Pre, t.Post)
	}
	m := formMath(t.F)
	if t.F.Op == algebra.FormNumber && t.F.Num.Cmp(big.NewRat(1, 2)) == 0 && !t.Post.Empty() {
		m = half
	}
	if t.F.Op == algebra.FormSum && !(t.Pre.Empty() && t.Post.Empty()) || t.F.Op == algebra.FormIntegral && !t.Post.Empty() {
		m = paren(m)
	}
	return glue(glue(t.Pre, m), t.Post)
}

// glue puts a thin space between factors that are both there.
func glue(a, b Math) Math {
	switch {
	case a.Empty():
		return b
	case b.Empty():
		return a
	}
	return join(a, thin, b)
}

// signed prints terms as a sum.
func signed(ts []Term) Math {
	if len(ts) == 0 {
		return Math{"0", "0", "<mn>0</mn>"}
	}
	var out Math
	for i, t := range ts {
		m := t.whole()
		switch {
		case i == 0 && t.Neg:
			out = join(Math{"−", "-", `<mo form="prefix">−</mo>`}, m)
		case i == 0:
			out = m
		case t.Neg:
			out = join(out, op("−", "-"), m)
		default:
			out = join(out, op("+", "+"), m)
		}
	}
	return out
}
