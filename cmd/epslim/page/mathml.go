package page

import (
	"strconv"
	"strings"
	"unicode/utf8"
)

// MathML is one or more MathML elements, as text.
type MathML string

func element(name, attrs string, children ...MathML) MathML {
	var b strings.Builder
	b.WriteString("<" + name)
	if attrs != "" {
		b.WriteString(" " + attrs)
	}
	b.WriteString(">")
	for _, c := range children {
		b.WriteString(string(c))
	}
	b.WriteString("</" + name + ">")
	return MathML(b.String())
}

func leaf(name, attrs, text string) MathML { return element(name, attrs, MathML(escape(text))) }

// Ident is an identifier: one letter in italics, a longer name upright.
func Ident(name string) MathML { return leaf("mi", "", name) }

// Upright is an identifier in upright type, such as the name of a function.
func Upright(name string) MathML {
	if utf8.RuneCountInString(name) > 1 {
		return leaf("mi", "", name)
	}
	return leaf("mi", `mathvariant="normal"`, name)
}

// Differential is the upright d of dt and dW, with the space that stands before it.
func Differential() MathML {
	return ThinSpace() + Upright("d")
}

// Partial is the sign of a partial derivative. It is an identifier: as an operator browsers put
// spaces around it.
func Partial() MathML { return Ident("∂") }

// ScriptL is the calligraphic L of a generator. It is the character U+2112, because browsers no longer know
// mathvariant="script".
func ScriptL() MathML { return Ident("ℒ") }

// Number is a number; a hyphen in front becomes a prefix minus sign.
func Number(text string) MathML {
	if rest, ok := strings.CutPrefix(text, "-"); ok {
		return Row(Minus(), leaf("mn", "", rest))
	}
	return leaf("mn", "", text)
}

// Op is an operator between two operands, such as + = × or a minus sign; a hyphen becomes a minus sign.
func Op(sign string) MathML {
	if sign == "-" {
		sign = "−"
	}
	return leaf("mo", "", sign)
}

// Minus is the sign of a negative term. It says that it is a prefix, or else inside a fraction or behind
// a parenthesis it may get the spaces of a difference.
func Minus() MathML { return MathML(`<mo form="prefix">−</mo>`) }

// Plus is a plus sign in front of a term.
func Plus() MathML { return MathML(`<mo form="prefix">+</mo>`) }

// ThinSpace stands between a factor and the name of a function: v sin x.
func ThinSpace() MathML { return MathML(`<mspace width="0.1667em"></mspace>`) }

// Times is a multiplication that is not written.
func Times() MathML { return MathML("<mo>\u2062</mo>") }

// Words is text inside a formula.
func Words(text string) MathML { return leaf("mtext", "", text) }

// Space is a horizontal space in units of the type size.
func Space(em float64) MathML {
	return element("mspace", `width="`+strconv.FormatFloat(em, 'g', 6, 64)+`em"`)
}

// Row sets its parts side by side as one.
func Row(parts ...MathML) MathML { return element("mrow", "", parts...) }

// Frac is a fraction.
func Frac(num, den MathML) MathML { return element("mfrac", "", Row(num), Row(den)) }

// Sup is a base with a superscript.
func Sup(base, script MathML) MathML { return element("msup", "", Row(base), Row(script)) }

// Sub is a base with a subscript.
func Sub(base, script MathML) MathML { return element("msub", "", Row(base), Row(script)) }

// SubSup is a base with both scripts.
func SubSup(base, sub, sup MathML) MathML {
	return element("msubsup", "", Row(base), Row(sub), Row(sup))
}

// Sqrt is a square root.
func Sqrt(parts ...MathML) MathML { return element("msqrt", "", parts...) }

// Over is a base with a mark over it, such as a bar or a tilde.
func Over(base MathML, mark string) MathML {
	return element("mover", `accent="true"`, Row(base), leaf("mo", `stretchy="false"`, mark))
}

// Sum is a large operator, such as ∑ or ∫, with what stands below and above it; either may be empty.
func Sum(sign string, below, above MathML) MathML {
	op := leaf("mo", "", sign)
	under, over := "munder", "mover"
	both := "munderover"
	if sign == "∫" {
		under, over, both = "msub", "msup", "msubsup"
	}
	switch {
	case below != "" && above != "":
		return element(both, "", op, Row(below), Row(above))
	case below != "":
		return element(under, "", op, Row(below))
	case above != "":
		return element(over, "", op, Row(above))
	}
	return op
}

// Apply is a function of an argument in parentheses. The name is MathML already.
func Apply(function MathML, args ...MathML) MathML {
	var parts []MathML
	for i, a := range args {
		if i > 0 {
			parts = append(parts, MathML(`<mo separator="true">,</mo>`))
		}
		parts = append(parts, a)
	}
	return Row(function, MathML("<mo>\u2061</mo>"), Fenced("(", Row(parts...), ")"))
}

// Fenced puts a pair of brackets around a formula. They grow with it if it is taller than a line; around
// others they are told not to, because browsers put gaps beside brackets that may grow.
func Fenced(left string, body MathML, right string) MathML {
	grow := "false"
	for _, tall := range []string{"<mfrac", "<mtable", "<munder", "<mover", "<msubsup", "<msqrt", "∫", "∑", "∏"} {
		if strings.Contains(string(body), tall) {
			grow = "true"
		}
	}
	return Row(leaf("mo", `form="prefix" fence="true" stretchy="`+grow+`"`, left), body,
		leaf("mo", `form="postfix" fence="true" stretchy="`+grow+`"`, right))
}

// Matrix is a matrix in brackets, its entries centred.
func Matrix(left string, rows [][]MathML, right string) MathML {
	return Fenced(left, table("", "", rows), right)
}

// Rows is a list of formulas one below the other, aligned in columns. The letters of align, l, c or r, are
// the alignments; the columns stand close together, so that an equation can be cut before its sign of
// equality: Rows("rl", ...). Browsers do not know columnalign; the style sheet of the page does it.
func Rows(align string, rows [][]MathML) MathML {
	return table(`class="rows" displaystyle="true"`, align, rows)
}

func table(attrs, align string, rows [][]MathML) MathML {
	var trs []MathML
	for _, row := range rows {
		var tds []MathML
		for k, cell := range row {
			attr := ""
			if k < len(align) {
				switch align[k] {
				case 'l':
					attr = `class="left"`
				case 'r':
					attr = `class="right"`
				}
			}
			tds = append(tds, element("mtd", attr, cell))
		}
		trs = append(trs, element("mtr", "", tds...))
	}
	return element("mtable", attrs, trs...)
}
