package algebra

import (
	"html"
	"strings"
	"unicode/utf8"
)

// MathML writes the form as presentation MathML elements, to stand inside a
// math element: one mrow. It uses MathML Core only: a unary minus is a prefix
// operator, the partial sign an identifier, products are written with the
// invisible operators that readers aloud need.
func (f *Form) MathML() string { return mrow(mathForm(f, bindSum)) }

// MathMLSummands is MathML cut at the top-level signs, for line breaks and
// alignment: every piece but a positive first one begins with its sign.
func (f *Form) MathMLSummands() []string {
	var out []string
	for _, s := range mathSummands(f.summands()) {
		out = append(out, mrow(s))
	}
	return out
}

const (
	mmlTimes = "<mo>&#x2062;</mo>" // invisible times
	mmlApply = "<mo>&#x2061;</mo>" // function application
	mmlMinus = "<mo>&#x2212;</mo>"
	mmlNeg   = `<mo form="prefix">&#x2212;</mo>`
	mmlOpen  = `<mo form="prefix">(</mo>`
	mmlShut  = `<mo form="postfix">)</mo>`
	mmlComma = `<mo separator="true">,</mo>`
	mmlPart  = `<mi>&#x2202;</mi>`
)

func mrow(s string) string { return "<mrow>" + s + "</mrow>" }

func mmlBrackets(s string) string { return mrow(mmlOpen + s + mmlShut) }

func mmlNumber(s string) string { return "<mn>" + s + "</mn>" }

func mmlUpright(s string) string { return `<mi mathvariant="normal">` + s + "</mi>" }

func mmlWord(s string) string {
	switch {
	case isDigits(s):
		return mmlNumber(s)
	default:
		return "<mi>" + html.EscapeString(textWord(s)) + "</mi>"
	}
}

// mmlName is a symbol's name; the user's own TeX is followed as far as it is
// a letter or Greek command with a subscript.
func (f *Form) mmlName() string {
	if f.Latex != "" {
		if s, ok := mmlFromTeX(f.Latex); ok {
			return s
		}
	}
	return mmlSymbol(f.Name)
}

func mmlSymbol(name string) string {
	base, subs := splitName(name)
	if len(subs) == 0 {
		return mmlWord(base)
	}
	out := make([]string, len(subs))
	for i, s := range subs {
		out[i] = mmlWord(s)
	}
	return "<msub>" + mmlWord(base) + mrow(strings.Join(out, mmlComma)) + "</msub>"
}

// mmlFromTeX reads LETTER or \greek, with an optional _x or _{...} of the
// same kind.
func mmlFromTeX(s string) (string, bool) {
	atom := func(s string) (string, bool) {
		s = strings.TrimSpace(s)
		if strings.HasPrefix(s, "{") && strings.HasSuffix(s, "}") {
			s = s[1 : len(s)-1]
		}
		switch {
		case strings.HasPrefix(s, "\\"):
			n := strings.TrimPrefix(s[1:], "var")
			if c, ok := greekByName(n); ok {
				return "<mi>" + string(c) + "</mi>", true
			}
			return "", false
		case isDigits(s):
			return mmlNumber(s), true
		case utf8.RuneCountInString(s) == 1 && !strings.ContainsAny(s, "^_{}<>&$%#~\\"):
			return "<mi>" + s + "</mi>", true
		}
		return "", false
	}
	base, sub, has := strings.Cut(s, "_")
	b, ok := atom(base)
	if !ok || !has {
		return b, ok
	}
	x, ok := atom(sub)
	return "<msub>" + b + x + "</msub>", ok
}

func mathBinding(f *Form) int {
	switch f.Op {
	case FormQuotient, FormDiff:
		return bindPower
	case FormNumber:
		if !f.Num.IsInt() {
			return bindPower
		}
	case FormCall:
		if f.Name == "exp" || f.Name == "cis" {
			return bindPower
		}
	case FormIntegral:
		return bindProduct
	}
	return f.Binding()
}

func mathForm(f *Form, need int) string {
	s := mathBare(f)
	if mathBinding(f) < need {
		return mmlBrackets(s)
	}
	return s
}

func mathBare(f *Form) string {
	switch f.Op {
	case FormNumber:
		if f.Num.IsInt() {
			return mmlNumber(f.Num.Num().String())
		}
		return "<mfrac>" + mmlNumber(f.Num.Num().String()) + mmlNumber(f.Num.Denom().String()) + "</mfrac>"
	case FormSymbol:
		return f.mmlName()
	case FormImag:
		return mmlUpright("i")
	case FormSum:
		return strings.Join(mathSummands(f.Args), "")
	case FormNeg:
		return mmlNeg + mathForm(f.Args[0], bindProduct)
	case FormProduct:
		return mathProduct(f.Args)
	case FormQuotient:
		return "<mfrac>" + mrow(mathForm(f.Args[0], bindSum)) + mrow(mathForm(f.Args[1], bindSum)) + "</mfrac>"
	case FormPower:
		b := f.Args[0]
		need := bindAtom
		if b.Op == FormRoot || b.Op == FormCall && b.Name != "abs" {
			return "<msup>" + mmlBrackets(mathForm(b, bindSum)) + mrow(mathForm(f.Args[1], bindSum)) + "</msup>"
		}
		return "<msup>" + mrow(mathForm(b, need)) + mrow(mathForm(f.Args[1], bindSum)) + "</msup>"
	case FormRoot:
		return "<msqrt>" + mathForm(f.Args[0], bindSum) + "</msqrt>"
	case FormCall:
		return mathCall(f)
	case FormDiff:
		return mathDiff(f)
	}
	return "<msubsup><mo>&#x222B;</mo>" + mrow(mathForm(f.Args[1], bindSum)) + mrow(mathForm(f.Args[2], bindSum)) + "</msubsup>" +
		mathForm(f.Args[0], bindProduct) + `<mspace width="0.17em"/>` + mmlUpright("d") + mmlSymbol(f.Name)
}

func mathSummands(ts []*Form) []string {
	out := make([]string, len(ts))
	for i, t := range ts {
		switch {
		case t.Op == FormNeg && i == 0:
			out[i] = mmlNeg + mathForm(t.Args[0], bindProduct)
		case t.Op == FormNeg:
			out[i] = mmlMinus + mathForm(t.Args[0], bindProduct)
		case i == 0:
			out[i] = mathForm(t, bindProduct)
		default:
			out[i] = "<mo>+</mo>" + mathForm(t, bindProduct)
		}
	}
	return out
}

func mathProduct(fs []*Form) string {
	fs = derivativesLast(fs)
	var b strings.Builder
	for i, f := range fs {
		s := mathForm(f, bindPower)
		if f.Op == FormIntegral && i+1 == len(fs) {
			s = mathBare(f) // closed by its differential
		}
		if i > 0 {
			if strings.HasPrefix(strings.TrimPrefix(strings.TrimPrefix(s, "<msup>"), "<mrow>"), "<mn>") {
				b.WriteString("<mo>&#x22C5;</mo>")
			} else {
				b.WriteString(mmlTimes)
			}
		}
		b.WriteString(s)
	}
	return b.String()
}

func mathCall(f *Form) string {
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = mathForm(a, bindSum)
	}
	apply := func(head string, args ...string) string {
		return head + mmlApply + mmlBrackets(strings.Join(args, mmlComma))
	}
	switch f.Name {
	case "exp":
		if f.Args[0].isOne() {
			return mmlUpright("e")
		}
		return "<msup>" + mmlUpright("e") + mrow(args[0]) + "</msup>"
	case "cis":
		return "<msup>" + mmlUpright("e") + mrow(mmlUpright("i")+mmlTimes+mathForm(f.Args[0], bindPower)) + "</msup>"
	case "abs":
		return mrow(`<mo form="prefix" stretchy="true">|</mo>` + args[0] + `<mo form="postfix" stretchy="true">|</mo>`)
	case "sign":
		return apply("<mi>sgn</mi>", args...)
	case "gamma":
		return apply(mmlUpright("&#x393;"), args...)
	case "besseli":
		return apply("<msub><mi>I</mi>"+mrow(args[0])+"</msub>", args[1])
	case "polygamma":
		if f.Args[0].isZero() {
			return apply("<mi>&#x3C8;</mi>", args[1])
		}
		return apply("<msup><mi>&#x3C8;</mi>"+mmlBrackets(args[0])+"</msup>", args[1])
	case "sin", "cos", "tan", "sinh", "cosh", "tanh", "log", "erf":
		return apply("<mi>"+f.Name+"</mi>", args...)
	}
	return apply(f.mmlName(), args...)
}

func mathDiff(f *Form) string {
	vars, _ := f.DiffVars()
	var b strings.Builder
	for _, g := range runs(vars) {
		if g.n > 1 {
			b.WriteString("<msubsup>" + mmlPart + mmlSymbol(g.name) + mmlNumber(itoa(g.n)) + "</msubsup>")
		} else {
			b.WriteString("<msub>" + mmlPart + mmlSymbol(g.name) + "</msub>")
		}
	}
	if f.Name == "" {
		return mrow(b.String() + mmlBrackets(mathForm(f.Args[0], bindSum)))
	}
	b.WriteString(f.mmlName())
	if len(f.Args) == 0 {
		return mrow(b.String())
	}
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = mathForm(a, bindSum)
	}
	return mmlBrackets(b.String()) + mmlBrackets(strings.Join(args, mmlComma))
}
