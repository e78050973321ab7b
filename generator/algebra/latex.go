package algebra

import (
	"strings"
)

// LatexOptions selects between the ways to set a formula.
type LatexOptions struct {
	// Inline sets all fractions with a slash, for running text.
	Inline bool
}

// LaTeX sets the form in TeX mathematics that needs amsmath only: stacked
// fractions in display, slashes inside exponents and nested fractions,
// brackets that grow only around tall contents.
func (f *Form) LaTeX(o LatexOptions) string {
	return texPrinter{slash: o.Inline}.form(f, bindSum)
}

// LatexSummands is LaTeX cut at the top-level signs, for line breaks: every
// piece but a positive first one begins with its sign.
func (f *Form) LatexSummands(o LatexOptions) []string {
	p := texPrinter{slash: o.Inline}
	var out []string
	for i, t := range f.summands() {
		g, sign := t, "+ "
		if t.Op == FormNeg {
			g, sign = t.Args[0], "-"
			if i > 0 {
				sign = "- "
			}
		} else if i == 0 {
			sign = ""
		}
		out = append(out, sign+p.form(g, bindProduct))
	}
	return out
}

// summands lists the top-level summands; a minus sign before a sum is
// distributed.
func (f *Form) summands() []*Form {
	switch {
	case f.Op == FormSum:
		return f.Args
	case f.Op == FormNeg && f.Args[0].Op == FormSum:
		out := make([]*Form, len(f.Args[0].Args))
		for i, t := range f.Args[0].Args {
			out[i] = negForm(t)
		}
		return out
	}
	return []*Form{f}
}

// texPrinter holds the context: slash is set in exponents, inside fractions
// and in running text.
type texPrinter struct{ slash bool }

// binding is Form.Binding for TeX, where a stacked fraction closes itself.
func (p texPrinter) binding(f *Form) int {
	switch f.Op {
	case FormQuotient, FormNumber:
		if !p.slash && f.Binding() == bindProduct {
			return bindPower
		}
	case FormDiff:
		return bindPower
	case FormCall:
		if f.Name == "exp" || f.Name == "cis" {
			return bindPower
		}
	case FormRoot:
		return bindPower
	case FormIntegral:
		return bindProduct
	}
	return f.Binding()
}

// form sets f, in brackets where it binds less tightly than need.
func (p texPrinter) form(f *Form, need int) string {
	s := p.bare(f)
	if p.binding(f) < need {
		return brackets("(", s, ")")
	}
	return s
}

// brackets grow only around contents that are taller than a line.
func brackets(open, s, shut string) string {
	for _, tall := range []string{"\\frac", "\\int", "\\sqrt", "\\left"} {
		if strings.Contains(s, tall) {
			return "\\left" + open + s + "\\right" + shut
		}
	}
	return open + s + shut
}

func (p texPrinter) bare(f *Form) string {
	switch f.Op {
	case FormNumber:
		if f.Num.IsInt() {
			return f.Num.Num().String()
		}
		return p.fraction(f.Num.Num().String(), f.Num.Denom().String())
	case FormSymbol:
		return f.latexName()
	case FormImag:
		return "\\mathrm{i}"
	case FormSum:
		return p.sum(f)
	case FormNeg:
		return "-" + p.form(f.Args[0], bindProduct)
	case FormProduct:
		return p.product(f.Args)
	case FormQuotient:
		if p.slash {
			return p.form(f.Args[0], bindProduct) + "/" + p.form(f.Args[1], bindPower)
		}
		q := texPrinter{slash: true}
		return p.fraction(q.form(f.Args[0], bindSum), q.form(f.Args[1], bindSum))
	case FormPower:
		return p.power(f)
	case FormRoot:
		return "\\sqrt{" + texPrinter{slash: p.slash || !simpleRadicand(f.Args[0])}.form(f.Args[0], bindSum) + "}"
	case FormCall:
		return p.call(f, "")
	case FormDiff:
		return p.diff(f)
	}
	return "\\int_{" + texPrinter{slash: true}.form(f.Args[1], bindSum) + "}^{" + texPrinter{slash: true}.form(f.Args[2], bindSum) + "} " +
		p.form(f.Args[0], bindProduct) + " \\,\\mathrm{d}" + texName(f.Name)
}

// simpleRadicand tells whether a stacked fraction under the root stays small.
func simpleRadicand(f *Form) bool { return len(f.String()) < 24 }

func (p texPrinter) fraction(n, d string) string {
	if p.slash {
		return n + "/" + d
	}
	return "\\frac{" + n + "}{" + d + "}"
}

func (p texPrinter) sum(f *Form) string {
	var b strings.Builder
	for i, t := range f.Args {
		switch {
		case t.Op == FormNeg && i == 0:
			b.WriteString("-" + p.form(t.Args[0], bindProduct))
		case t.Op == FormNeg:
			b.WriteString(" - " + p.form(t.Args[0], bindProduct))
		case i == 0:
			b.WriteString(p.form(t, bindProduct))
		default:
			b.WriteString(" + " + p.form(t, bindProduct))
		}
	}
	return b.String()
}

// derivativesLast moves derivatives behind the other factors, so that no
// operator seems to act on what follows it.
func derivativesLast(fs []*Form) []*Form {
	var out, last []*Form
	for _, f := range fs {
		if f.Op == FormDiff && len(f.Args) == 0 {
			last = append(last, f)
		} else {
			out = append(out, f)
		}
	}
	return append(out, last...)
}

func (p texPrinter) product(fs []*Form) string {
	fs = derivativesLast(fs)
	var b strings.Builder
	for i, f := range fs {
		var s string
		switch {
		case f.Op == FormIntegral && i+1 == len(fs):
			s = p.bare(f) // closed by its differential
		case f.Op == FormCall && bareArgument(f) && i+1 < len(fs) && !startsFunction(fs[i+1]):
			s = p.callParen(f, "")
		default:
			s = p.form(f, bindPower)
		}
		if i > 0 {
			b.WriteString(texGlue(fs[i-1], f, s))
		}
		b.WriteString(s)
	}
	return b.String()
}

// texGlue separates factors: a dot between numbers, a thin space where a
// bracket would read as a function's argument and around words.
func texGlue(left, right *Form, s string) string {
	if c := s[0]; c >= '0' && c <= '9' {
		return " \\cdot "
	}
	word := func(f *Form) bool {
		if f.Op != FormSymbol {
			return false
		}
		n := f.latexName()
		return strings.HasPrefix(n, "\\mathit{")
	}
	open := strings.HasPrefix(s, "(") || strings.HasPrefix(s, "\\left(")
	switch {
	case open && left.Op != FormNumber && left.Op != FormSum, word(left), word(right):
		return " \\, "
	case left.Op == FormDiff, right.Op == FormDiff && left.Op != FormNumber:
		return " \\, "
	}
	return " "
}

// startsFunction: after sin theta only another function may follow without
// seeming to belong to the argument.
func startsFunction(f *Form) bool {
	return f.Op == FormCall && f.Name != "abs" || f.Op == FormRoot || f.Op == FormPower && f.Args[0].Op == FormCall
}

// bareArgument: the elementary functions take a single symbol without
// brackets.
func bareArgument(f *Form) bool {
	switch f.Name {
	case "sin", "cos", "tan", "sinh", "cosh", "tanh", "log":
		return len(f.Args) == 1 && f.Args[0].Op == FormSymbol
	}
	return false
}

func (p texPrinter) power(f *Form) string {
	b, e := f.Args[0], f.Args[1]
	x := texPrinter{slash: true}.form(e, bindSum)
	switch b.Op {
	case FormCall:
		switch b.Name {
		case "sin", "cos", "tan", "sinh", "cosh", "tanh":
			if e.Op == FormNumber && e.Num.IsInt() {
				return p.call(b, "^{"+x+"}")
			}
			return p.callParen(b, "") + "^{" + x + "}"
		case "log":
			return p.callParen(b, "") + "^{" + x + "}"
		}
	case FormSymbol:
		if s := b.latexName(); strings.ContainsAny(s, "^'") {
			return "{" + s + "}^{" + x + "}"
		}
	}
	return p.form(b, bindAtom) + "^{" + x + "}"
}

// call sets a function; sup goes between name and argument.
func (p texPrinter) call(f *Form, sup string) string {
	if bareArgument(f) {
		return "\\" + f.Name + sup + " " + p.form(f.Args[0], bindAtom)
	}
	return p.callParen(f, sup)
}

func (p texPrinter) callParen(f *Form, sup string) string {
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = p.form(a, bindSum)
	}
	in := func(args ...string) string { return brackets("(", strings.Join(args, ", "), ")") }
	switch f.Name {
	case "sin", "cos", "tan", "sinh", "cosh", "tanh", "log":
		return "\\" + f.Name + sup + in(args...)
	case "exp":
		if f.Args[0].isOne() {
			return "\\mathrm{e}"
		}
		x := texPrinter{slash: true}.form(f.Args[0], bindSum)
		if len(f.Args[0].String()) > 32 {
			return "\\exp" + in(args...)
		}
		return "\\mathrm{e}^{" + x + "}"
	case "cis":
		return "\\mathrm{e}^{\\mathrm{i} " + texPrinter{slash: true}.form(f.Args[0], bindProduct) + "}"
	case "abs":
		return brackets("|", args[0], "|")
	case "sign":
		return "\\operatorname{sgn}" + in(args...)
	case "erf":
		return "\\operatorname{erf}" + in(args...)
	case "gamma":
		return "\\Gamma" + in(args...)
	case "besseli":
		return "I_{" + texPrinter{slash: true}.form(f.Args[0], bindSum) + "}" + in(args[1])
	case "polygamma":
		if f.Args[0].isZero() {
			return "\\psi" + in(args[1])
		}
		return "\\psi^{(" + texPrinter{slash: true}.form(f.Args[0], bindSum) + ")}" + in(args[1])
	}
	return f.latexName() + in(args...)
}

// diff sets \partial_{x}^{2} v, and (\partial_{x} v)(...) at other arguments.
func (p texPrinter) diff(f *Form) string {
	vars, _ := f.DiffVars()
	var b strings.Builder
	for _, g := range runs(vars) {
		b.WriteString("\\partial_{" + texName(g.name) + "}")
		if g.n > 1 {
			b.WriteString("^{" + itoa(g.n) + "}")
		}
		b.WriteString(" ")
	}
	if f.Name == "" {
		return b.String() + brackets("(", p.form(f.Args[0], bindSum), ")")
	}
	b.WriteString(f.latexName())
	if len(f.Args) == 0 {
		return b.String()
	}
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = p.form(a, bindSum)
	}
	return brackets("(", b.String(), ")") + brackets("(", strings.Join(args, ", "), ")")
}
