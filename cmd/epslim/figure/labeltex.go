package figure

import (
	"fmt"
	"strings"
	"unicode"
)

// labelTeX writes a label in LaTeX: plain text is escaped, formulas are nearly LaTeX as they are.
func labelTeX(label string) string {
	var b strings.Builder
	math := false
	rs := []rune(label)
	for i := 0; i < len(rs); i++ {
		c := rs[i]
		switch {
		case !math && c == '\\' && i+1 < len(rs) && (rs[i+1] == '\\' || rs[i+1] == '$'):
			i++
			b.WriteString(textTeX(rs[i]))
		case c == '\\' && math:
			n := commandLength(rs[i+1:])
			b.WriteString(commandTeX(string(rs[i+1 : i+1+n])))
			i += n
		case c == '$':
			math = !math
			b.WriteRune(c)
		case math:
			if name, ok := nameOf(c); ok {
				b.WriteString(commandTeX(name) + " ")
			} else if c == '−' {
				b.WriteByte('-')
			} else if c > unicode.MaxASCII {
				b.WriteString(`\mbox{` + textTeX(c) + "}")
			} else {
				b.WriteRune(c)
			}
		default:
			b.WriteString(textTeX(c))
		}
	}
	return b.String()
}

// commandLength is the number of characters of a command's name.
func commandLength(rs []rune) int {
	n := 0
	for n < len(rs) && rs[n] < unicode.MaxASCII && unicode.IsLetter(rs[n]) {
		n++
	}
	return max(n, min(1, len(rs)))
}

// commandTeX is a command in LaTeX. pgfplots takes \to for the end of an argument of its own.
func commandTeX(name string) string {
	switch name {
	case "to":
		name = "rightarrow"
	case "text":
		name = "mathrm"
	}
	return `\` + name
}

// textTeX writes one character of plain text.
func textTeX(c rune) string {
	switch c {
	case '\\':
		return `\textbackslash{}`
	case '{', '}', '$', '&', '#', '_', '%':
		return `\` + string(c)
	case '^':
		return `\textasciicircum{}`
	case '~':
		return `\textasciitilde{}`
	case '<', '>', '|':
		return "$" + string(c) + "$"
	case '−':
		return "$-$"
	case '²':
		return "$^2$"
	case '³':
		return "$^3$"
	case '°':
		return `$^\circ$`
	case '–', '—', '‘', '’', '“', '”':
		return string(c)
	}
	if name, ok := nameOf(c); ok {
		return "$" + commandTeX(name) + "$"
	}
	if c < unicode.MaxASCII && !unicode.IsControl(c) || c >= 0xc0 && c <= 0x17f {
		return string(c)
	}
	if unicode.IsSpace(c) || unicode.IsControl(c) {
		return " "
	}
	return fmt.Sprintf(`\texttt{U+%04X}`, c) // a character that pdflatex does not have
}
