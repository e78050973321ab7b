package ito

import (
	"embed"
	"fmt"
	"strings"

	"epslim/generator/ito/diagnostic"
)

//go:embed templates/*.ito
var templateFiles embed.FS

// Template is a commented starting point for a kind of problem.
type Template struct {
	Kind    string // the word it is chosen by
	Summary string // one line
}

// Templates returns the starting points, the most common one first.
func Templates() []Template {
	return []Template{
		{"mover", "a mover with a heading that diffuses, in a plane"},
		{"noise", "a variable driven by coloured noise"},
		{"mass", "an inertial particle with a small mass and a friction that varies"},
		{"channel", "a tracer in a flow between reflecting walls"},
		{"cell", "a particle in a fine periodic medium"},
		{"sphere", "a mover in space, with a heading on the unit sphere"},
	}
}

// NewModel returns the text of a starting point with a title of its own. The
// error names the kinds there are.
func NewModel(kind, title string) ([]byte, error) {
	var kinds []string
	for _, t := range Templates() {
		kinds = append(kinds, t.Kind)
		if t.Kind != kind {
			continue
		}
		text, err := templateFiles.ReadFile("templates/" + kind + ".ito")
		if err != nil {
			return nil, fmt.Errorf("starting point %s: %w", kind, err)
		}
		return []byte(strings.Replace(string(text), "@TITLE@", quotable(title), 1)), nil
	}
	err := fmt.Errorf("there is no starting point %q; there are: %s", kind, strings.Join(kinds, ", "))
	if near := diagnostic.Nearest(kind, kinds); near != "" {
		err = fmt.Errorf("%w; did you mean %q?", err, near)
	}
	return nil, err
}

// quotable makes a text fit between the quotes of a model file.
func quotable(s string) string {
	s = strings.ToValidUTF8(s, "")
	return strings.Map(func(r rune) rune {
		switch {
		case r == '"':
			return '\''
		case r < ' ' || r == 0x7f:
			return ' '
		}
		return r
	}, s)
}
