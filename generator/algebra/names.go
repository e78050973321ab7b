package algebra

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// greekLetters pairs the ASCII names of Greek letters with their characters;
// the name is also the TeX command, but for epsilon (\varepsilon) and the
// capitals that look Latin, which are not listed.
var greekLetters = []struct {
	name string
	char rune
}{
	{"alpha", 'α'}, {"beta", 'β'}, {"gamma", 'γ'}, {"delta", 'δ'}, {"epsilon", 'ε'}, {"eps", 'ε'},
	{"zeta", 'ζ'}, {"eta", 'η'}, {"theta", 'θ'}, {"iota", 'ι'}, {"kappa", 'κ'}, {"lambda", 'λ'},
	{"mu", 'μ'}, {"nu", 'ν'}, {"xi", 'ξ'}, {"pi", 'π'}, {"rho", 'ρ'}, {"sigma", 'σ'}, {"tau", 'τ'},
	{"upsilon", 'υ'}, {"phi", 'φ'}, {"chi", 'χ'}, {"psi", 'ψ'}, {"omega", 'ω'},
	{"Gamma", 'Γ'}, {"Delta", 'Δ'}, {"Theta", 'Θ'}, {"Lambda", 'Λ'}, {"Xi", 'Ξ'}, {"Pi", 'Π'},
	{"Sigma", 'Σ'}, {"Upsilon", 'Υ'}, {"Phi", 'Φ'}, {"Psi", 'Ψ'}, {"Omega", 'Ω'},
}

func greekByName(s string) (rune, bool) {
	for _, g := range greekLetters {
		if g.name == s {
			return g.char, true
		}
	}
	return 0, false
}

// greekName is the TeX command name of a Greek character.
func greekName(c rune) (string, bool) {
	switch c {
	case 'ε', 'ϵ':
		return "varepsilon", true
	case 'ϕ':
		return "phi", true
	case 'ϑ':
		return "vartheta", true
	case 'µ': // the micro sign
		return "mu", true
	}
	for _, g := range greekLetters {
		if g.char == c {
			return g.name, true
		}
	}
	return "", false
}

// splitName cuts a name into its letter part and its subscripts: D_r is D and
// r, x12 is x and 12, theta_1_a is theta, 1 and a.
func splitName(name string) (base string, subs []string) {
	parts := strings.FieldsFunc(name, func(c rune) bool { return c == '_' })
	if len(parts) == 0 {
		return name, nil
	}
	base, subs = parts[0], parts[1:]
	i := len(base)
	for i > 0 && base[i-1] >= '0' && base[i-1] <= '9' {
		i--
	}
	if i > 0 && i < len(base) {
		subs = append([]string{base[i:]}, subs...)
		base = base[:i]
	}
	return base, subs
}

func isDigits(s string) bool {
	return s != "" && strings.TrimLeft(s, "0123456789") == ""
}

// texWord is one part of a name: a letter, a Greek letter, digits, or a word
// in the given font.
func texWord(s, font string) string {
	if g, ok := greekByName(s); ok {
		n, _ := greekName(g)
		return "\\" + n
	}
	if isDigits(s) {
		return s
	}
	if utf8.RuneCountInString(s) == 1 {
		return texLetters(s)
	}
	return "\\" + font + "{" + texLetters(s) + "}"
}

// texLetters keeps ASCII letters and digits, writes Greek letters as
// commands, and spells other characters by code point, so that every name
// compiles in every TeX engine.
func texLetters(s string) string {
	var b strings.Builder
	for _, c := range s {
		if n, ok := greekName(c); ok {
			b.WriteString("{\\" + n + "}")
			continue
		}
		switch {
		case c < 128 && (unicode.IsLetter(c) || unicode.IsDigit(c)):
			b.WriteRune(c)
		case c >= 0xC0 && c <= 0x17F && unicode.IsLetter(c):
			b.WriteString("\\text{" + string(c) + "}")
		default:
			b.WriteString("\\mathrm{u")
			const hex = "0123456789ABCDEF"
			for shift := 16; shift >= 0; shift -= 4 {
				if d := c >> shift; d > 0 || shift == 0 {
					b.WriteByte(hex[d&15])
				}
			}
			b.WriteString("}")
		}
	}
	out := b.String()
	if utf8.RuneCountInString(s) == 1 && strings.HasPrefix(out, "{\\") && strings.HasSuffix(out, "}") {
		return out[1 : len(out)-1]
	}
	return out
}

// texName is a symbol's name in TeX: Greek letters, subscripts, words in
// math italics.
func texName(name string) string {
	base, subs := splitName(name)
	out := texWord(base, "mathit")
	if len(subs) == 0 {
		return out
	}
	for i, s := range subs {
		subs[i] = texWord(s, "mathrm")
	}
	return out + "_{" + strings.Join(subs, ",") + "}"
}

// latexName prefers the user's own TeX.
func (f *Form) latexName() string {
	if f.Latex != "" {
		return f.Latex
	}
	return texName(f.Name)
}

type run struct {
	name string
	n    int
}

// runs counts equal neighbours.
func runs(names []string) []run {
	var out []run
	for _, n := range names {
		if k := len(out); k > 0 && out[k-1].name == n {
			out[k-1].n++
		} else {
			out = append(out, run{n, 1})
		}
	}
	return out
}

func itoa(n int) string { return strconv.Itoa(n) }
