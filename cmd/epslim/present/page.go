package present

import (
	"fmt"
	"strings"

	"epslim/cmd/epslim/page"
)

// Page sets the sections of a story as sections of an HTML page.
func (st *Story) Page() []page.Block {
	h := &pageWriter{tex: &latexWriter{room: 40}}
	var out []page.Block
	for _, s := range st.Sections {
		out = append(out, h.section(s))
	}
	return out
}

type pageWriter struct {
	tex    *latexWriter
	number int
}

func (h *pageWriter) section(s Section) page.Section {
	out := page.Section{Title: s.Title, ID: s.ID}
	for _, b := range s.Blocks {
		switch b := b.(type) {
		case Para:
			out.Body = append(out.Body, page.Paragraph(pageSpans(b)))
		case Equations:
			out.Body = append(out.Body, h.equations(b))
		case Hierarchy:
			out.Body = append(out.Body, h.hierarchy(b))
		case Table:
			out.Body = append(out.Body, pageTable(b))
		}
	}
	return out
}

// pageSpans sets running text.
func pageSpans(p []Span) []page.Inline {
	var out []page.Inline
	for _, s := range p {
		switch {
		case s.Math != nil:
			out = append(out, page.Math{MathML: page.MathML(s.Math.MathML), TeX: s.Math.TeX})
		case s.Kind == Strong || s.Kind == Good || s.Kind == Bad:
			out = append(out, page.Strong(s.Text))
		case s.Kind == Code:
			out = append(out, page.Code(s.Text))
		default:
			out = append(out, page.Text(s.Text))
		}
	}
	return out
}

// pageTable sets a table.
func pageTable(t Table) page.Table {
	cols := len(t.Head)
	for _, r := range t.Rows {
		cols = max(cols, len(r))
	}
	out := page.Table{}
	for i := 0; i < cols; i++ {
		h := ""
		if i < len(t.Head) {
			h = t.Head[i]
		}
		out.Head = append(out.Head, page.C(h))
	}
	for _, r := range t.Rows {
		row := make([]page.Cell, cols)
		for i := range row {
			row[i] = page.C("")
			if i < len(r) && len(r[i]) > 0 {
				row[i] = page.Cell(pageSpans(r[i]))
			}
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}

// pageRoom is the length of a line of a formula, in characters of its text.
const pageRoom = 90

// mathRows breaks a sum at its signs.
func mathRows(rel Math, ts []Term) []Math {
	var out []Math
	line := rel
	used := width(rel.Text)
	if len(ts) == 0 {
		return []Math{join(rel, integer(0))}
	}
	for i, t := range ts {
		m := t.whole()
		switch {
		case t.Neg && i == 0:
			m = join(Math{"−", "-", `<mo form="prefix">−</mo>`}, m)
		case t.Neg:
			m = join(op("−", "-"), m)
		case i > 0:
			m = join(op("+", "+"), m)
		}
		if i > 0 && used+width(m.Text) > pageRoom {
			out = append(out, line)
			line, used = Math{}, 0
		}
		line = join(line, m)
		used += width(m.Text)
	}
	return append(out, line)
}

func (h *pageWriter) equations(e Equations) page.Block {
	if hasRemarks(e) {
		l := page.List{}
		var head Math
		for _, x := range e.Lines {
			if !x.Left.Empty() {
				head = x.Left
			}
			m := join(head, x.Rel, thin, signed(x.Right))
			l.Items = append(l.Items, append([]page.Inline{page.Math{MathML: page.MathML(m.MathML), TeX: m.TeX}, page.Text(" — ")}, pageSpans(x.Note)...))
		}
		return l
	}
	var rows [][]page.MathML
	var tex []string
	for _, x := range e.Lines {
		for i, m := range mathRows(x.Rel, x.Right) {
			left := Math{}
			if i == 0 {
				left = x.Left
			}
			rows = append(rows, []page.MathML{page.MathML(left.MathML), page.MathML(m.MathML)})
			tex = append(tex, left.TeX+" &"+m.TeX)
		}
	}
	return h.formula(e.ID, rows, tex)
}

func (h *pageWriter) formula(id string, rows [][]page.MathML, tex []string) page.Block {
	h.number++
	f := page.Formula{
		MathML: page.Rows("rl", rows), Number: fmt.Sprint(h.number),
		TeX: "\\begin{aligned}\n" + strings.Join(tex, " \\\\\n") + "\n\\end{aligned}",
	}
	if id != "" {
		f.ID = "eq-" + id
	}
	return f
}

func (h *pageWriter) hierarchy(x Hierarchy) page.Block {
	var rows [][]page.MathML
	var tex []string
	add := func(left, right Math) {
		rows = append(rows, []page.MathML{page.MathML(left.MathML), page.MathML(right.MathML)})
		tex = append(tex, left.TeX+" &"+right.TeX)
	}
	wide := Math{"  ", `\qquad `, `<mspace width="2em"></mspace>`}
	implies := Math{"⇒ ", `\Rightarrow\; `, "<mo>⇒</mo>"}
	whole := func(l *Line) Math { return join(l.Left, l.Rel, signed(l.Right)) }
	for _, o := range x.Rows {
		m := whole(&o.Equation)
		if o.Condition != nil {
			m = join(m, wide, whole(o.Condition))
		}
		add(join(o.Power, Math{":", `\colon`, mo(":")}, thin), m)
		if o.Yield != nil {
			for i, r := range mathRows(o.Yield.Rel, o.Yield.Right) {
				if i == 0 {
					r = join(implies, o.Yield.Left, r)
				}
				add(Math{}, join(wide, r))
			}
		}
		if len(o.Words) > 0 {
			w := implies
			for _, s := range o.Words {
				if s.Math != nil {
					w = join(w, *s.Math)
				} else {
					w = join(w, words(s.Text))
				}
			}
			add(Math{}, join(wide, w))
		}
	}
	return h.formula(x.ID, rows, tex)
}
