package present

import "strings"

// texEscape makes text stand for itself in TeX.
func texEscape(s string) string {
	var b strings.Builder
	for _, c := range s {
		switch c {
		case '\\':
			b.WriteString(`\textbackslash{}`)
		case '{', '}', '$', '&', '#', '_', '%':
			b.WriteString(`\` + string(c))
		case '~':
			b.WriteString(`\textasciitilde{}`)
		case '^':
			b.WriteString(`\textasciicircum{}`)
		default:
			if t, ok := texChars[c]; ok {
				b.WriteString(t)
				continue
			}
			b.WriteRune(c)
		}
	}
	return b.String()
}

// texChars are characters of our own sentences that plain LaTeX fonts lack.
var texChars = map[rune]string{
	'→': `$\to$`, '–': `--`, '…': `\dots{}`, 'σ': `$\sigma$`, '<': `\textless{}`, '>': `\textgreater{}`, '|': `\textbar{}`,
}
