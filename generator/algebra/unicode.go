package algebra

import (
	"strings"
	"unicode/utf8"
)

// Text writes the form in Unicode mathematics on one line, for terminals.
func (f *Form) Text() string { return textForm(f, bindSum) }

// TextLines is Text broken at top-level signs into lines of at most width
// columns where that is possible; continuation lines are indented.
func (f *Form) TextLines(width int) []string {
	const indent = "    "
	var lines []string
	line := ""
	for i, s := range textSummands(f.summands()) {
		switch {
		case i == 0:
			line = s
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(s) > width:
			lines = append(lines, line)
			line = indent + s
		default:
			line += " " + s
		}
	}
	return append(lines, line)
}

const superDigits = "⁰¹²³⁴⁵⁶⁷⁸⁹"

// superscript writes an integer above the line.
func superscript(s string) string {
	var b strings.Builder
	for _, c := range s {
		if c == '-' {
			b.WriteRune('⁻')
			continue
		}
		b.WriteRune([]rune(superDigits)[c-'0'])
	}
	return b.String()
}

// subscripts lists the letters that Unicode has below the line.
var subscripts = map[rune]rune{
	'a': 'ₐ', 'e': 'ₑ', 'h': 'ₕ', 'i': 'ᵢ', 'j': 'ⱼ', 'k': 'ₖ', 'l': 'ₗ', 'm': 'ₘ', 'n': 'ₙ', 'o': 'ₒ', 'p': 'ₚ',
	'r': 'ᵣ', 's': 'ₛ', 't': 'ₜ', 'u': 'ᵤ', 'v': 'ᵥ', 'x': 'ₓ', 'β': 'ᵦ', 'γ': 'ᵧ', 'ρ': 'ᵨ', 'φ': 'ᵩ', 'χ': 'ᵪ',
	'0': '₀', '1': '₁', '2': '₂', '3': '₃', '4': '₄', '5': '₅', '6': '₆', '7': '₇', '8': '₈', '9': '₉',
}

// subscript writes s below the line, or after an underscore where a letter
// has no such form.
func subscript(s string) (string, bool) {
	var b strings.Builder
	for _, c := range s {
		d, ok := subscripts[c]
		if !ok {
			return "_" + s, false
		}
		b.WriteRune(d)
	}
	return b.String(), true
}

func textWord(s string) string {
	if g, ok := greekByName(s); ok {
		return string(g)
	}
	return s
}

func textName(name string) string {
	base, subs := splitName(name)
	out := textWord(base)
	for _, s := range subs {
		t, _ := subscript(textWord(s))
		out += t
	}
	return out
}

func textForm(f *Form, need int) string {
	s := textBare(f)
	if textBinding(f) < need {
		return "(" + s + ")"
	}
	return s
}

func textBinding(f *Form) int {
	switch f.Op {
	case FormDiff:
		return bindPower
	case FormIntegral:
		return bindProduct
	}
	return f.Binding()
}

func textBare(f *Form) string {
	switch f.Op {
	case FormNumber:
		return f.Num.RatString()
	case FormSymbol:
		return textName(f.Name)
	case FormImag:
		return "i"
	case FormSum:
		return strings.Join(textSummands(f.Args), " ")
	case FormNeg:
		return "-" + textForm(f.Args[0], bindProduct)
	case FormProduct:
		return textProduct(f.Args)
	case FormQuotient:
		return textForm(f.Args[0], bindProduct) + "/" + textForm(f.Args[1], bindPower)
	case FormPower:
		return textPower(f)
	case FormRoot:
		// A lone symbol or number needs no brackets under the root sign.
		if a := f.Args[0]; a.Op == FormSymbol && utf8.RuneCountInString(textBare(a)) == 1 || a.Op == FormNumber && a.Num.IsInt() {
			return "√" + textBare(a)
		}
		return "√(" + textForm(f.Args[0], bindSum) + ")"
	case FormCall:
		return textCall(f)
	case FormDiff:
		return textDiff(f)
	}
	return "∫[" + textForm(f.Args[1], bindSum) + ", " + textForm(f.Args[2], bindSum) + "] " + textForm(f.Args[0], bindProduct) + " d" + textName(f.Name)
}

// textSummands writes summands with their signs.
func textSummands(ts []*Form) []string {
	out := make([]string, len(ts))
	for i, t := range ts {
		switch {
		case t.Op == FormNeg && i == 0:
			out[i] = "-" + textForm(t.Args[0], bindProduct)
		case t.Op == FormNeg:
			out[i] = "- " + textForm(t.Args[0], bindProduct)
		case i == 0:
			out[i] = textForm(t, bindProduct)
		default:
			out[i] = "+ " + textForm(t, bindProduct)
		}
	}
	return out
}

func textProduct(fs []*Form) string {
	fs = derivativesLast(fs)
	var b strings.Builder
	for i, f := range fs {
		s := textForm(f, bindPower)
		if f.Op == FormIntegral && i+1 == len(fs) {
			s = textBare(f) // closed by its differential
		}
		if i > 0 && !(fs[i-1].Op == FormNumber && joins(s)) {
			b.WriteString("·")
		}
		b.WriteString(s)
	}
	return b.String()
}

// joins: after a number no dot is needed before a letter, a root or a
// bracket.
func joins(s string) bool {
	c, _ := utf8.DecodeRuneInString(s)
	return c < '0' || c > '9'
}

func textPower(f *Form) string {
	b, e := f.Args[0], f.Args[1]
	if b.Op == FormRoot || b.Op == FormDiff {
		return "(" + textBare(b) + ")" + textExponent(e)
	}
	return textForm(b, bindAtom) + textExponent(e)
}

func textExponent(e *Form) string {
	neg := e.Op == FormNeg
	g := e
	if neg {
		g = e.Args[0]
	}
	if g.Op == FormNumber && g.Num.IsInt() {
		s := g.Num.Num().String()
		if neg {
			s = "-" + s
		}
		return superscript(s)
	}
	return "^" + textForm(e, bindAtom)
}

func textCall(f *Form) string {
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = textForm(a, bindSum)
	}
	in := func(args ...string) string { return "(" + strings.Join(args, ", ") + ")" }
	switch f.Name {
	case "abs":
		if !strings.Contains(args[0], "|") {
			return "|" + args[0] + "|"
		}
		return "abs" + in(args...)
	case "exp":
		if f.Args[0].isOne() {
			return "e"
		}
		return f.Name + in(args...)
	case "gamma":
		return "Γ" + in(args...)
	case "besseli":
		if s, ok := subscript(args[0]); ok {
			return "I" + s + in(args[1])
		}
		return "I_(" + args[0] + ")" + in(args[1])
	case "polygamma":
		if f.Args[0].isZero() {
			return "ψ" + in(args[1])
		}
		return "ψ^(" + args[0] + ")" + in(args[1])
	case "cis":
		return "exp(i·" + textForm(f.Args[0], bindPower) + ")"
	case "log", "sin", "cos", "tan", "sinh", "cosh", "tanh", "sign", "erf":
		return f.Name + in(args...)
	}
	return textName(f.Name) + in(args...)
}

func textDiff(f *Form) string {
	vars, _ := f.DiffVars()
	var b strings.Builder
	for _, g := range runs(vars) {
		b.WriteString("∂")
		s, ok := subscript(textName(g.name))
		if g.n > 1 && !ok {
			b.WriteString(superscript(itoa(g.n)))
		}
		b.WriteString(s)
		if g.n > 1 && ok {
			b.WriteString(superscript(itoa(g.n)))
		}
		if !ok {
			b.WriteByte(' ')
		}
	}
	if f.Name == "" {
		return b.String() + "(" + textForm(f.Args[0], bindSum) + ")"
	}
	b.WriteString(textName(f.Name))
	if len(f.Args) == 0 {
		return b.String()
	}
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = textForm(a, bindSum)
	}
	return "(" + b.String() + ")(" + strings.Join(args, ", ") + ")"
}
