package present

import (
	"fmt"
	"strings"

	"epslim/generator/algebra"
)

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
			b.WriteString(texRune(c))
		}
	}
	return b.String()
}

// texRune writes a character that LaTeX's standard fonts have, Greek letters
// as mathematics, and others by their code point.
func texRune(c rune) string {
	switch {
	case c >= '₀' && c <= '₉':
		return fmt.Sprintf("$_%d$", c-'₀')
	case c < 0x80, c >= 0xA1 && c <= 0x17F && c != 0xAD:
		return string(c)
	case c >= 0x370 && c < 0x400:
		return "$" + (&algebra.Form{Op: algebra.FormSymbol, Name: string(c)}).LaTeX(algebra.LatexOptions{}) + "$"
	}
	return fmt.Sprintf("(U+%04X)", c)
}

// texChars are characters of our own sentences that plain LaTeX fonts lack.
var texChars = map[rune]string{
	'→': `$\to$`, '–': `--`, '…': `\dots{}`, 'σ': `$\sigma$`, '<': `\textless{}`, '>': `\textgreater{}`, '|': `\textbar{}`,
	'−': `$-$`, '·': `$\cdot$`, '≥': `$\ge$`, '∞': `$\infty$`, '½': `$\tfrac12$`, '’': `'`, '“': "``", '”': `''`, '—': `---`, '"': `''`,
	'²': `\textsuperscript{2}`, '³': `\textsuperscript{3}`, '°': `$^\circ$`, '±': `$\pm$`, '×': `$\times$`, 'µ': `$\mu$`,
	'\t': " ", '\u00a0': "~",
}

// texBreakable is texEscape with places where a long run of program text may
// be broken.
func texBreakable(s string) string {
	var b strings.Builder
	for i, w := range strings.Split(s, " ") {
		if i > 0 {
			b.WriteByte(' ')
		}
		if len(w) < 16 {
			b.WriteString(texEscape(w))
			continue
		}
		for _, c := range w {
			b.WriteString(texEscape(string(c)))
			if strings.ContainsRune("*/+-,^()=", c) {
				b.WriteString(`\allowbreak{}`)
			}
		}
	}
	return b.String()
}

// TeXText makes text stand for itself in TeX.
func TeXText(s string) string { return texBreakable(oneLine(s)) }
