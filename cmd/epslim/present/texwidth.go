package present

import "strings"

// texWidth estimates the width of a displayed formula in units of the type
// size, from the widths of Computer Modern (common practice: a rough sum of
// character widths and the spaces that TeX puts around operators). It need
// not be exact; it decides where lines break.
func texWidth(s string) float64 {
	m := &texMeasure{s: s}
	return m.run(0)
}

type texMeasure struct {
	s string
	i int
}

// Widths of commands; what is missing counts as a Greek letter.
var commandWidth = map[string]float64{
	",": 0.17, ";": 0.28, "!": -0.17, ":": 0.22, " ": 0.33, "quad": 1, "qquad": 2, "displaystyle": 0, "textstyle": 0,
	"cdot": 0.72, "to": 1.56, "circ": 0.94, "infty": 1, "partial": 0.56, "int": 0.95, "in": 1.22, "ge": 1.33, "le": 1.33, "propto": 1.33,
	"langle": 0.39, "rangle": 0.39, "nabla": 0.83, "cdots": 1.5, "Rightarrow": 1.56, "sum": 1.2,
	"sin": 1.4, "cos": 1.5, "tan": 1.6, "sinh": 1.9, "cosh": 2, "tanh": 2.1, "log": 1.5, "exp": 1.7, "Gamma": 0.63,
	"left": 0.25, "right": 0.25, "bigl": 0.1, "bigr": 0.1, "Bigl": 0.2, "Bigr": 0.2, "{": 0.5, "}": 0.5, "|": 0.5, "notag": 0,
	"tfrac12": 0.6,
}

// run measures up to a closing brace (depth > 0) or the end.
func (m *texMeasure) run(depth int) float64 {
	w := 0.0
	start := true
	for m.i < len(m.s) {
		c := m.s[m.i]
		if c == '}' {
			if depth > 0 {
				m.i++
			}
			if depth > 0 {
				return w
			}
			m.i++
			continue
		}
		x, sign := m.one(start)
		w += x
		start = sign
	}
	return w
}

// arg measures a braced group or one token.
func (m *texMeasure) arg() float64 {
	for m.i < len(m.s) && m.s[m.i] == ' ' {
		m.i++
	}
	if m.i < len(m.s) && m.s[m.i] == '{' {
		m.i++
		return m.run(1)
	}
	w, _ := m.one(true)
	return w
}

// one measures a token; sign tells that a sign behind it would be a prefix.
func (m *texMeasure) one(start bool) (w float64, sign bool) {
	if m.i >= len(m.s) {
		return 0, false
	}
	c := m.s[m.i]
	m.i++
	switch {
	case c == '\\':
		return m.command()
	case c == '{':
		return m.run(1), false
	case c == '^' || c == '_':
		a := 0.7 * m.arg()
		// Both scripts stand above each other.
		if m.i < len(m.s) && (m.s[m.i] == '^' || m.s[m.i] == '_') && m.s[m.i] != c {
			m.i++
			a = max(a, 0.7*m.arg())
		}
		return a + 0.05, false
	case c == ' ' || c == '&':
		return 0, start
	case c == '+' || c == '-':
		if start {
			return 0.78, false
		}
		return 1.22, true
	case c == '=' || c == '<' || c == '>':
		return 1.33, true
	case c == '(' || c == '[':
		return 0.39, true
	case c == ')' || c == ']' || c == '|':
		return 0.39, false
	case c == ',':
		return 0.45, true
	case c == '/' || c >= '0' && c <= '9':
		return 0.5, false
	}
	if c >= 0x80 && c < 0xC0 { // inside a character of several bytes
		return 0, false
	}
	switch {
	case c == 'M' || c == 'W':
		return 1, false
	case c >= 'A' && c <= 'Z':
		return 0.78, false
	}
	return 0.56, false
}

func (m *texMeasure) command() (float64, bool) {
	from := m.i
	for m.i < len(m.s) && isLetter(m.s[m.i]) {
		m.i++
	}
	if m.i == from && m.i < len(m.s) {
		m.i++
	}
	name := m.s[from:m.i]
	switch name {
	case "frac", "tfrac", "dfrac":
		if name == "tfrac" && strings.HasPrefix(m.s[m.i:], "12") {
			m.i += 2
			return 0.6, false
		}
		a := m.arg()
		return max(a, m.arg()) + 0.24, false
	case "sqrt":
		return m.arg() + 0.9, false
	case "mathrm", "mathit", "text", "texttt", "operatorname":
		return 0.95 * m.arg(), false
	case "mathcal", "mathbb", "mathsf":
		return 0.75, m.skip()
	}
	if w, ok := commandWidth[name]; ok {
		return w, name == "cdot" || name == "propto" || name == "to" || name == "in" || name == "left"
	}
	return 0.6, false
}

// skip reads over an argument.
func (m *texMeasure) skip() bool {
	m.arg()
	return false
}
