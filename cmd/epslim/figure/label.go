package figure

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// run is a piece of a label set in one style.
type run struct {
	text   string
	italic bool
	script int // +1 superscript, -1 subscript, 0 on the line
}

// named maps the commands that labels may use to their characters. Letters among them are set in
// italics if lower case.
var named = []struct {
	name string
	char rune
}{
	{"alpha", 'α'}, {"beta", 'β'}, {"gamma", 'γ'}, {"delta", 'δ'}, {"varepsilon", 'ε'},
	{"epsilon", 'ε'}, {"zeta", 'ζ'}, {"eta", 'η'}, {"theta", 'θ'}, {"vartheta", 'ϑ'},
	{"iota", 'ι'}, {"kappa", 'κ'}, {"lambda", 'λ'}, {"mu", 'μ'}, {"nu", 'ν'}, {"xi", 'ξ'},
	{"pi", 'π'}, {"rho", 'ρ'}, {"sigma", 'σ'}, {"tau", 'τ'}, {"upsilon", 'υ'},
	{"varphi", 'φ'}, {"phi", 'φ'}, {"chi", 'χ'}, {"psi", 'ψ'}, {"omega", 'ω'},
	{"Gamma", 'Γ'}, {"Delta", 'Δ'}, {"Theta", 'Θ'}, {"Lambda", 'Λ'}, {"Xi", 'Ξ'}, {"Pi", 'Π'},
	{"Sigma", 'Σ'}, {"Upsilon", 'Υ'}, {"Phi", 'Φ'}, {"Psi", 'Ψ'}, {"Omega", 'Ω'},
	{"partial", '∂'}, {"nabla", '∇'}, {"infty", '∞'}, {"pm", '±'}, {"times", '×'}, {"cdot", '·'},
	{"le", '≤'}, {"leq", '≤'}, {"ge", '≥'}, {"geq", '≥'}, {"approx", '≈'}, {"ne", '≠'},
	{"sim", '∼'}, {"propto", '∝'}, {"langle", '⟨'}, {"rangle", '⟩'}, {"in", '∈'},
	{"to", '→'}, {"rightarrow", '→'}, {"leftarrow", '←'}, {"int", '∫'}, {"sum", '∑'},
	{"prod", '∏'}, {"|", '‖'}, {"ell", 'ℓ'}, {"dots", '…'}, {"ldots", '…'}, {"prime", '′'},
	{"epsilon", 'ϵ'}, {"phi", 'ϕ'}, {"varsigma", 'ς'}, {"star", '*'}, {"ast", '*'}, {"sqrt", '√'}, {"equiv", '≡'},
	{",", '\u2009'}, {";", '\u2005'}, {" ", ' '}, {"{", '{'}, {"}", '}'}, {"$", '$'}, {"_", '_'}, {"%", '%'}, {"#", '#'}, {"&", '&'},
}

func charOf(name string) (rune, bool) {
	for _, n := range named {
		if n.name == name {
			return n.char, true
		}
	}
	return 0, false
}

// nameOf returns the command for a character that TeX does not accept as it is.
func nameOf(c rune) (string, bool) {
	if c < utf8.RuneSelf {
		return "", false
	}
	for _, n := range named {
		if n.char == c {
			return n.name, true
		}
	}
	return "", false
}

// Plain escapes a text so that it stands for itself as a label.
func Plain(text string) string {
	return strings.NewReplacer(`\`, `\\`, `$`, `\$`).Replace(text)
}

// Symbol returns a label for the name of a variable, parameter or function: theta becomes
// $\theta$, x becomes $x$, v0 and v_0 become $v_{0}$, and names of several letters are set upright.
func Symbol(name string) string { return "$" + SymbolMath(name) + "$" }

// SymbolMath is [Symbol] without the dollar signs, for use inside a formula.
func SymbolMath(name string) string {
	base, sub, found := strings.Cut(name, "_")
	if !found {
		base = strings.TrimRight(name, "0123456789")
		sub = name[len(base):]
	}
	if base == "" {
		base, sub = name, ""
	}
	out := symbolBase(base)
	if sub != "" {
		out += "_{" + symbolBase(strings.ReplaceAll(sub, "_", " ")) + "}"
	}
	return out
}

func symbolBase(s string) string {
	if s == "eps" || s == "epsilon" {
		return `\varepsilon`
	}
	if c, ok := charOf(s); ok && unicode.IsLetter(c) {
		return `\` + s
	}
	if utf8.RuneCountInString(s) <= 1 {
		return mathEscape(s)
	}
	return `\mathrm{` + mathEscape(s) + `}`
}

// mathEscape keeps the characters that have a meaning in formulas from having it.
func mathEscape(s string) string {
	var b strings.Builder
	for _, c := range s {
		if strings.ContainsRune(`{}$_%#&`, c) {
			b.WriteByte('\\')
		}
		if c != '\\' && c != '^' {
			b.WriteRune(c)
		}
	}
	return b.String()
}

// maxLabel is the length in bytes beyond which a label cannot be meant to stand in a figure.
const maxLabel = 1000

// parseLabel splits a label into runs; neighbouring runs of one style are merged.
func parseLabel(s string) ([]run, error) {
	if !utf8.ValidString(s) {
		return nil, &LabelError{s, "is not UTF-8"}
	}
	if len(s) > maxLabel {
		return nil, &LabelError{s[:40] + "...", fmt.Sprintf("has %d bytes, more than %d", len(s), maxLabel)}
	}
	p := &labelParser{label: s, rest: s}
	for p.rest != "" {
		c := p.next()
		switch {
		case c == '\\' && (strings.HasPrefix(p.rest, `\`) || strings.HasPrefix(p.rest, `$`)):
			p.add(string(p.next()), false, 0)
		case c == '$':
			if err := p.formula(); err != nil {
				return nil, err
			}
		case unicode.IsControl(c):
			p.add(" ", false, 0)
		default:
			p.add(string(c), false, 0)
		}
	}
	return p.runs, nil
}

type labelParser struct {
	label, rest string
	runs        []run
}

func (p *labelParser) next() rune {
	c, n := utf8.DecodeRuneInString(p.rest)
	p.rest = p.rest[n:]
	return c
}

func (p *labelParser) add(text string, italic bool, script int) {
	if n := len(p.runs); n > 0 && p.runs[n-1].italic == italic && p.runs[n-1].script == script {
		p.runs[n-1].text += text
		return
	}
	p.runs = append(p.runs, run{text, italic, script})
}

func (p *labelParser) fail(reason string) error { return &LabelError{p.label, reason} }

// formula reads up to the closing dollar sign.
func (p *labelParser) formula() error {
	for p.rest != "" {
		if p.rest[0] == '$' {
			p.rest = p.rest[1:]
			return nil
		}
		if err := p.atom(0, false); err != nil {
			return err
		}
	}
	return p.fail("a formula begins with $ and does not end")
}

// atom reads one character, command, script or group of a formula.
func (p *labelParser) atom(script int, upright bool) error {
	if p.rest == "" || p.rest[0] == '$' {
		return p.fail("a formula ends too early")
	}
	switch c := p.next(); c {
	case '_', '^':
		if script != 0 {
			return p.fail("a script on a script cannot be drawn")
		}
		if c == '_' {
			return p.atom(-1, upright)
		}
		return p.atom(1, upright)
	case '{':
		return p.group(script, upright)
	case '}':
		return p.fail("a closing brace without an opening one")
	case '\\':
		return p.command(script, upright)
	case ' ', '\t', '\n', '\r':
		if upright {
			p.add(" ", false, script)
		}
		return nil
	default:
		p.char(c, script, upright)
		return nil
	}
}

func (p *labelParser) group(script int, upright bool) error {
	for {
		if p.rest == "" {
			return p.fail("an opening brace without a closing one")
		}
		if p.rest[0] == '}' {
			p.rest = p.rest[1:]
			return nil
		}
		if err := p.atom(script, upright); err != nil {
			return err
		}
	}
}

func (p *labelParser) command(script int, upright bool) error {
	n := strings.IndexFunc(p.rest, func(c rune) bool { return c >= utf8.RuneSelf || !unicode.IsLetter(c) })
	if n < 0 {
		n = len(p.rest)
	}
	if n == 0 && p.rest != "" {
		_, n = utf8.DecodeRuneInString(p.rest)
	}
	name := p.rest[:n]
	p.rest = p.rest[n:]
	switch name {
	case "mathrm", "text", "mathcal":
		if !strings.HasPrefix(p.rest, "{") {
			return p.fail(`\` + name + " wants a group in braces")
		}
		if name == "mathcal" && strings.HasPrefix(p.rest, "{L}") {
			p.rest = p.rest[3:]
			p.add("ℒ", false, script)
			return nil
		}
		p.next()
		return p.group(script, true)
	}
	c, ok := charOf(name)
	if !ok {
		return p.fail(`\` + name + " is not known")
	}
	p.char(c, script, upright)
	return nil
}

// char adds a character of a formula: letters in italics, a hyphen as a minus sign, and relations
// with thin spaces around them.
func (p *labelParser) char(c rune, script int, upright bool) {
	if upright {
		p.add(string(c), false, script)
		return
	}
	switch {
	case c == '-':
		p.add("−", false, script)
	case strings.ContainsRune("=<>≤≥≈≠∼∝∈→≡", c) && script == 0:
		p.add("\u2009"+string(c)+"\u2009", false, script)
	case c == ',' && script == 0:
		p.add(",\u2009", false, script)
	case unicode.IsLetter(c) && !(unicode.Is(unicode.Greek, c) && unicode.IsUpper(c)):
		p.add(string(c), true, script)
	default:
		p.add(string(c), false, script)
	}
}

// plainText is the label as one would read it aloud: scripts after _ and ^, no dollar signs.
func plainText(runs []run) string {
	var b strings.Builder
	for _, r := range runs {
		switch r.script {
		case -1:
			b.WriteByte('_')
		case 1:
			b.WriteByte('^')
		}
		b.WriteString(strings.ReplaceAll(r.text, "\u2009", " "))
	}
	return strings.Join(strings.Fields(b.String()), " ")
}
