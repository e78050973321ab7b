package present

import (
	"fmt"
	"strings"

	"epslim/cmd/epslim/derivation"
)

// Markdown is the derivation in Markdown with TeX mathematics between dollar
// signs, as common viewers read it.
func Markdown(res *derivation.Result, p Provenance) []byte {
	return StoryMarkdown(Tell(res), p)
}

// StoryMarkdown sets a story in Markdown.
func StoryMarkdown(st *Story, p Provenance) []byte {
	m := &markdownWriter{tex: &latexWriter{room: 40}}
	if st.Title != "" {
		m.printf("# %s\n", markdownEscape(oneLine(st.Title)))
	}
	for _, s := range st.Sections {
		m.printf("\n## %s\n", markdownEscape(s.Title))
		for _, b := range s.Blocks {
			m.block(b)
		}
	}
	m.printf("\n---\n")
	for _, l := range p.lines() {
		m.printf("%s  \n", markdownEscape(oneLine(l)))
	}
	return []byte(m.b.String())
}

type markdownWriter struct {
	b   strings.Builder
	tex *latexWriter
}

func (m *markdownWriter) printf(format string, args ...any) { fmt.Fprintf(&m.b, format, args...) }

func (m *markdownWriter) block(b Block) {
	m.printf("\n")
	switch b := b.(type) {
	case Para:
		m.printf("%s\n", m.spans(b))
	case Equations:
		m.equations(b)
	case Hierarchy:
		m.hierarchy(b)
	case Table:
		m.table(b)
	}
	for ; m.tex.shown < len(m.tex.abbreviations); m.tex.shown++ {
		a := m.tex.abbreviations[m.tex.shown]
		m.printf("\nwith\n\n")
		m.display([]string{m.tex.row(Line{Left: formMath(a.symbol), Rel: equals, Right: formTerms(a.value)}, 3)})
	}
}

func (m *markdownWriter) spans(p []Span) string {
	var b strings.Builder
	for _, s := range p {
		switch {
		case s.Math != nil:
			b.WriteString("$" + s.Math.TeX + "$")
		case s.Kind == Strong || s.Kind == Good || s.Kind == Bad:
			b.WriteString("**" + markdownEscape(s.Text) + "**")
		case s.Kind == Code:
			b.WriteString("`" + strings.ReplaceAll(s.Text, "`", "'") + "`")
		default:
			b.WriteString(markdownEscape(s.Text))
		}
	}
	return b.String()
}

// display puts rows into one displayed formula.
func (m *markdownWriter) display(rows []string) {
	body := strings.ReplaceAll(strings.Join(rows, " \\\\\n"), " \\notag", " ")
	m.printf("$$\n\\begin{aligned}\n%s\n\\end{aligned}\n$$\n", body)
}

func (m *markdownWriter) equations(e Equations) {
	if hasRemarks(e) {
		var head Math
		for _, x := range e.Lines {
			if !x.Left.Empty() {
				head = x.Left
			}
			m.printf("- $%s%s %s$ — %s\n", head.TeX, x.Rel.TeX, signed(x.Right).TeX, m.spans(x.Note))
		}
		return
	}
	left := 0.0
	for _, x := range e.Lines {
		if w := texWidth(x.Left.TeX) + texWidth(x.Rel.TeX); w < tooLong {
			left = max(left, w)
		}
	}
	var rows []string
	for _, x := range e.Lines {
		rows = append(rows, m.tex.row(x, left))
	}
	m.display(rows)
}

func (m *markdownWriter) hierarchy(h Hierarchy) {
	var rows []string
	for _, o := range h.Rows {
		rows = append(rows, m.tex.order(o, texWidth(o.Power.TeX)))
	}
	m.display(rows)
}

func (m *markdownWriter) table(t Table) {
	cols := len(t.Head)
	for _, r := range t.Rows {
		cols = max(cols, len(r))
	}
	head := t.Head
	for len(head) < cols {
		head = append(head, "")
	}
	m.printf("| %s |\n|%s\n", strings.Join(head, " | "), strings.Repeat(" --- |", cols))
	for _, r := range t.Rows {
		cells := make([]string, cols)
		for i, c := range r {
			cells[i] = strings.ReplaceAll(m.spans(c), "|", `\|`)
		}
		m.printf("| %s |\n", strings.Join(cells, " | "))
	}
}

// markdownEscape makes text stand for itself.
func markdownEscape(s string) string {
	var b strings.Builder
	for _, c := range s {
		if strings.ContainsRune("\\`*_{}[]<>#|$~", c) {
			b.WriteByte('\\')
		}
		b.WriteRune(c)
	}
	return b.String()
}
