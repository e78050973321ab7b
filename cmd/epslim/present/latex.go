package present

import (
	"fmt"
	"strings"

	"epslim/cmd/epslim/derivation"
)

// LatexSettings steers LaTeX output. The zero value fits the text width of a
// standard article.
type LatexSettings struct {
	Room   float64 // width of a displayed line in units of the type size; 0 means 30
	Prefix string  // of labels; "epslim" when empty
}

// LaTeX is the derivation as a fragment for \input into an article that
// loads amsmath and amssymb.
func LaTeX(res *derivation.Result, p Provenance, s LatexSettings) []byte {
	return StoryLaTeX(Tell(res), p, s)
}

// StoryLaTeX sets a story in LaTeX.
func StoryLaTeX(st *Story, p Provenance, s LatexSettings) []byte {
	if s.Room == 0 {
		s.Room = 30
	}
	if s.Prefix == "" {
		s.Prefix = "epslim"
	}
	l := &latexWriter{room: s.Room, prefix: s.Prefix}
	for _, c := range p.lines() {
		l.printf("%% %s\n", oneLine(c))
	}
	l.printf("%% needs \\usepackage{amsmath,amssymb}\n")
	l.printf("\\begingroup\\allowdisplaybreaks\\sloppy\n")
	if st.Title != "" {
		l.printf("\\subsection*{\\raggedright %s}\\label{%s:top}\n", texBreakable(st.Title), l.prefix)
	}
	for _, sec := range st.Sections {
		l.section(sec)
	}
	l.printf("\\par\\endgroup\n")
	return []byte(l.b.String())
}

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

type latexWriter struct {
	b             strings.Builder
	room          float64
	prefix        string
	count         int // abbreviations so far
	abbreviations []abbreviation
	shown         int // abbreviations already introduced
}

func (l *latexWriter) printf(format string, args ...any) { fmt.Fprintf(&l.b, format, args...) }

func (l *latexWriter) section(s Section) {
	l.printf("\n\\paragraph{%s.}\\label{%s:%s}\n", texEscape(s.Title), l.prefix, s.ID)
	for _, b := range s.Blocks {
		switch b := b.(type) {
		case Para:
			l.printf("%s\n", l.spans(b))
		case Equations:
			l.equations(b)
		case Hierarchy:
			l.hierarchy(b)
		case Table:
			l.table(b)
		}
		l.where()
	}
}

// spans sets running text.
func (l *latexWriter) spans(p []Span) string {
	var b strings.Builder
	for _, s := range p {
		switch {
		case s.Math != nil:
			b.WriteString("$" + s.Math.TeX + "$")
		case s.Kind == Strong || s.Kind == Good || s.Kind == Bad:
			b.WriteString(`\emph{` + texBreakable(s.Text) + "}")
		case s.Kind == Code:
			b.WriteString(`\texttt{` + texBreakable(s.Text) + "}")
		default:
			b.WriteString(texBreakable(s.Text))
		}
	}
	return b.String()
}

// body is the right-hand side of a line, with breaks; left is the width of
// what stands before it.
func (l *latexWriter) body(ts []Term, left float64) []string {
	if len(ts) == 0 {
		return []string{"0"}
	}
	first := l.room - left
	rest := l.room - left - 1
	return fill(l.pieces(ts, min(first, rest)), first, rest)
}

// tooLong is a left-hand side that takes a line of its own.
const tooLong = 14

// equations is a numbered group; every formula has a number, groups share
// one with letters.
func (l *latexWriter) equations(e Equations) {
	if hasRemarks(e) {
		l.remarked(e)
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
		rows = append(rows, l.row(x, left))
	}
	l.align(e.ID, rows)
}

// row is one formula of an align environment.
func (l *latexWriter) row(x Line, left float64) string {
	own := texWidth(x.Left.TeX) + texWidth(x.Rel.TeX)
	var b strings.Builder
	if own >= tooLong {
		lines := l.body(x.Right, left+2)
		fmt.Fprintf(&b, "  &%s%s \\notag\\\\\n", x.Left.TeX, strings.TrimSpace(x.Rel.TeX))
		b.WriteString("  &\\qquad " + strings.Join(lines, " \\notag\\\\\n  &\\qquad\\quad "))
		return b.String()
	}
	lines := l.body(x.Right, left)
	fmt.Fprintf(&b, "  %s &%s %s", x.Left.TeX, strings.TrimSpace(x.Rel.TeX), strings.Join(lines, " \\notag\\\\\n  &\\quad "))
	return b.String()
}

func (l *latexWriter) align(id string, rows []string) {
	label := ""
	if id != "" {
		label = fmt.Sprintf("\\label{eq:%s:%s}", l.prefix, id)
	}
	if len(rows) == 1 {
		l.printf("\\begin{align}%s\n%s\n\\end{align}\n", label, rows[0])
		return
	}
	if len(rows) > 26 { // the letters of a group end at z
		l.printf("\\begin{align}%s\n%s\n\\end{align}\n", label, strings.Join(rows, " \\notag\\\\\n"))
		return
	}
	l.printf("\\begin{subequations}%s\n\\begin{align}\n%s\n\\end{align}\n\\end{subequations}\n", label, strings.Join(rows, " \\\\\n"))
}

func hasRemarks(e Equations) bool {
	for _, x := range e.Lines {
		if len(x.Note) > 0 {
			return true
		}
	}
	return false
}

// remarked is a list of formulas with a remark each.
func (l *latexWriter) remarked(e Equations) {
	l.printf("\\begin{itemize}\n")
	var head Math
	for _, x := range e.Lines {
		if !x.Left.Empty() {
			head = x.Left
		}
		lines := l.body(x.Right, texWidth(head.TeX)+texWidth(x.Rel.TeX)+2)
		remark := l.spans(x.Note)
		switch {
		case len(lines) == 1 && x.Rel.Empty():
			l.printf("\\item $%s\\;$ $\\displaystyle %s$\\quad %s.\n", head.TeX, lines[0], remark)
		case len(lines) == 1:
			l.printf("\\item $\\displaystyle %s%s%s$\\quad %s.\n", head.TeX, x.Rel.TeX, lines[0], remark)
		default:
			l.printf("\\item %s:\n\\begin{align*}\n  %s &%s %s\n\\end{align*}\n", remark, head.TeX, strings.TrimSpace(x.Rel.TeX), strings.Join(lines, " \\\\\n  &\\quad "))
		}
	}
	l.printf("\\end{itemize}\n")
}

// hierarchy is one order a line with its solvability condition, and what it
// yielded.
func (l *latexWriter) hierarchy(h Hierarchy) {
	left := 0.0
	for _, o := range h.Rows {
		left = max(left, texWidth(o.Power.TeX)+0.5)
	}
	var rows []string
	for _, o := range h.Rows {
		rows = append(rows, l.order(o, left))
	}
	l.align(h.ID, rows)
}

func (l *latexWriter) order(o Order, left float64) string {
	var b strings.Builder
	side := func(x *Line) (string, float64) {
		s := x.Left.TeX + x.Rel.TeX + signed(x.Right).TeX
		return s, texWidth(s)
	}
	eq, used := side(&o.Equation)
	fmt.Fprintf(&b, "  %s\\colon\\quad& %s", o.Power.TeX, eq)
	used += left + 2
	if o.Condition != nil {
		c, w := side(o.Condition)
		if used+2+w > l.room {
			b.WriteString(",\\notag\\\\\n  &\\qquad ")
		} else {
			b.WriteString(", \\qquad ")
		}
		b.WriteString(c)
	}
	if len(o.Words) > 0 {
		w := l.spans(o.Words)
		if used+2+0.47*float64(width(plain(o.Words))) > l.room {
			b.WriteString(" \\notag\\\\\n  &\\qquad\\Rightarrow\\; \\text{" + w + "}")
		} else {
			b.WriteString(" \\quad\\Rightarrow\\quad \\text{" + w + "}")
		}
	}
	if o.Yield != nil {
		head := o.Yield.Left.TeX + o.Yield.Rel.TeX
		lines := l.body(o.Yield.Right, left+2+3.5+texWidth(head))
		b.WriteString(" \\notag\\\\\n  &\\qquad\\Rightarrow\\; " + head + strings.Join(lines, " \\notag\\\\\n  &\\qquad\\qquad\\quad "))
	}
	return b.String()
}

// table sets rows in columns of text.
func (l *latexWriter) table(t Table) {
	cols := len(t.Head)
	for _, r := range t.Rows {
		cols = max(cols, len(r))
	}
	if cols == 0 {
		return
	}
	spec, wide := columns(t, cols)
	l.printf("\\begin{center}\\small\\raggedright\n\\begin{tabular}{@{}%s@{}}\n", spec)
	row := func(cells []string) {
		for i := range cells {
			if wide[i] {
				cells[i] = "\\raggedright " + cells[i]
			}
		}
		l.printf("%s \\tabularnewline\n", strings.Join(cells, " & "))
	}
	if len(t.Head) > 0 {
		row(append([]string(nil), t.Head...))
		l.printf("\\hline\n")
	}
	for _, r := range t.Rows {
		cells := make([]string, cols)
		for i, c := range r {
			cells[i] = l.cellSpans(c)
		}
		row(cells)
	}
	l.printf("\\end{tabular}\n\\end{center}\n")
}

// columns chooses the columns of a table: natural ones where they fit, and
// paragraphs for the last, and then for the one before, where not. Characters
// are taken to be 0.0135 of the line in small type.
func columns(t Table, cols int) (spec string, wide []bool) {
	const char, line = 0.0135, 0.98
	natural := make([]float64, cols)
	sum := 0.0
	for k := range natural {
		if k < len(t.Head) {
			natural[k] = float64(width(t.Head[k]))
		}
		for _, r := range t.Rows {
			if k < len(r) {
				natural[k] = max(natural[k], float64(width(plain(r[k]))))
			}
		}
		natural[k] = natural[k]*char + 0.035
		sum += natural[k]
	}
	wide = make([]bool, cols)
	for k := cols - 1; k >= 0 && k >= cols-2 && sum > line; k-- {
		room := max(line-(sum-natural[k]), 0.3)
		if k == cols-1 && room <= 0.3 {
			room = 0.45
		}
		if room < natural[k] {
			sum += room - natural[k]
			natural[k], wide[k] = room, true
		}
	}
	for k := range natural {
		if wide[k] {
			spec += fmt.Sprintf("p{%.2f\\linewidth}", natural[k]-0.035)
		} else {
			spec += "l"
		}
	}
	return spec, wide
}

// cellSpans sets a cell; formulas in it may break at signs.
func (l *latexWriter) cellSpans(c []Span) string { return l.spans(c) }

// where introduces the abbreviations used since the last time.
func (l *latexWriter) where() {
	if l.shown == len(l.abbreviations) {
		return
	}
	l.printf("with\n")
	var rows []string
	for ; l.shown < len(l.abbreviations); l.shown++ {
		a := l.abbreviations[l.shown]
		m := formMath(a.symbol)
		rows = append(rows, l.row(Line{Left: m, Rel: equals, Right: formTerms(a.value)}, texWidth(m.TeX)+1.33))
	}
	l.align("", rows)
}
