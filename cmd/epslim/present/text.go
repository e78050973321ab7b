package present

import (
	"strings"
	"unicode/utf8"

	"epslim/cmd/epslim/derivation"
)

// TextSettings steers the text for terminals. The zero value is plain text of
// 100 columns.
type TextSettings struct {
	Width  int  // columns; 0 means 100
	Colour bool // headings and verdicts in colour
}

// Text is the derivation for a terminal or a mail, in Unicode mathematics.
func Text(res *derivation.Result, s TextSettings) []byte {
	return StoryText(Tell(res), s)
}

// StoryText lays a story out as text.
func StoryText(st *Story, s TextSettings) []byte {
	if s.Width == 0 {
		s.Width = 100
	}
	w := &textWriter{TextSettings: s}
	if st.Title != "" {
		for _, l := range wrap(st.Title, s.Width) {
			w.line(w.paint(l, Strong))
		}
		w.line(strings.Repeat("═", min(width(st.Title), s.Width)))
	}
	for _, sec := range st.Sections {
		w.section(sec)
	}
	return []byte(w.b.String())
}

const (
	textIndent = "  "
	mathIndent = "      "
)

type textWriter struct {
	TextSettings
	b     strings.Builder
	blank bool // the last line is blank
}

func (w *textWriter) line(s string) {
	s = strings.TrimRight(s, " ")
	w.b.WriteString(s + "\n")
	w.blank = s == ""
}

// gap leaves one blank line.
func (w *textWriter) gap() {
	if w.b.Len() > 0 && !w.blank {
		w.line("")
	}
}

func (w *textWriter) paint(s string, k SpanKind) string {
	if !w.Colour {
		return s
	}
	code := ""
	switch k {
	case Strong:
		code = "1"
	case Good:
		code = "32"
	case Bad:
		code = "1;31"
	case Note:
		code = "2"
	default:
		return s
	}
	return "\x1b[" + code + "m" + s + "\x1b[0m"
}

func (w *textWriter) section(s Section) {
	w.gap()
	w.line(w.paint(s.Title, Strong))
	for i, b := range s.Blocks {
		switch b := b.(type) {
		case Para:
			if i > 0 {
				if _, ok := s.Blocks[i-1].(Para); !ok {
					w.gap()
				}
			}
			w.para(b)
		case Equations:
			if i > 0 {
				if _, ok := s.Blocks[i-1].(Para); !ok {
					w.gap()
				}
			}
			w.equations(b)
		case Hierarchy:
			w.gap()
			w.hierarchy(b)
		case Table:
			w.table(b)
		}
	}
}

// width is the number of columns; the program prints no wide characters of
// its own, and combining marks of a title are not worth a table.
func width(s string) int { return utf8.RuneCountInString(s) }

// piece is a word of running text with its style.
type piece struct {
	text string
	kind SpanKind
}

// pieces cuts running text into words; a formula is broken at its signs when
// it is long only.
func pieces(p []Span, room int) []piece {
	var out []piece
	joined := false
	add := func(s string, k SpanKind) {
		if joined && len(out) > 0 {
			out[len(out)-1].text += s
			return
		}
		out = append(out, piece{s, k})
	}
	for _, s := range p {
		if s.Math != nil {
			parts := []string{s.Math.Text}
			if width(s.Math.Text) > room*2/3 {
				parts = breakMath(s.Math.Text, room)
			}
			for i, q := range parts {
				if i > 0 {
					joined = false
				}
				add(q, Plain)
			}
			joined = true
			continue
		}
		if s.Text == "" {
			continue
		}
		if strings.HasPrefix(s.Text, " ") {
			joined = false
		}
		for i, f := range strings.Fields(s.Text) {
			if i > 0 {
				joined = false
			}
			if s.Kind != Plain && joined {
				out = append(out, piece{"\x00", Plain})
				joined = false
			}
			add(f, s.Kind)
			joined = true
		}
		joined = !strings.HasSuffix(s.Text, " ")
	}
	return out
}

// wrapSpans lays running text out in lines.
func (w *textWriter) wrapSpans(p []Span, room int) []string {
	var lines []string
	var line strings.Builder
	used, tight := 0, true
	for _, q := range pieces(p, room) {
		if q.text == "\x00" {
			tight = true
			continue
		}
		n := width(q.text)
		gap := 1
		if tight || used == 0 {
			gap = 0
		}
		if used > 0 && used+gap+n > room {
			lines = append(lines, line.String())
			line.Reset()
			used, gap = 0, 0
		}
		if gap > 0 {
			line.WriteByte(' ')
		}
		line.WriteString(w.paint(q.text, q.kind))
		used += gap + n
		tight = false
	}
	if used > 0 {
		lines = append(lines, line.String())
	}
	return lines
}

func wrap(s string, room int) []string {
	w := &textWriter{}
	return w.wrapSpans([]Span{{Text: s}}, room)
}

func (w *textWriter) para(p Para) {
	for _, l := range w.wrapSpans(p, w.Width-width(textIndent)) {
		w.line(textIndent + l)
	}
}

// pad fills up with spaces.
func pad(s string, n int) string {
	if k := n - width(s); k > 0 {
		return s + strings.Repeat(" ", k)
	}
	return s
}

func padLeft(s string, n int) string {
	if k := n - width(s); k > 0 {
		return strings.Repeat(" ", k) + s
	}
	return s
}

// equations aligns the relations of a group and the remarks behind it.
func (w *textWriter) equations(e Equations) {
	left, longest := 0, 0
	for _, l := range e.Lines {
		left = max(left, width(l.Left.Text))
	}
	if left > 40 {
		left = 0
	}
	for _, l := range e.Lines {
		longest = max(longest, max(left, width(l.Left.Text))+width(l.Rel.Text)+width(signed(l.Right).Text))
	}
	for _, l := range e.Lines {
		head := mathIndent + padLeft(l.Left.Text, left) + l.Rel.Text
		if l.Rel.Empty() {
			head += " "
		}
		w.equation(head, signed(l.Right).Text, l.Note, width(mathIndent)+longest)
	}
}

// equation prints one formula behind its head, broken where it must be, and
// the remark in the column noteAt when there is room.
func (w *textWriter) equation(head, right string, remark []Span, noteAt int) {
	room := w.Width - width(head)
	hang := width(head)
	if room < 40 {
		// A left-hand side that long stands on its own line.
		w.line(head)
		head = mathIndent + "  "
		hang, room = width(head), w.Width-width(head)
	}
	lines := breakMath(right, room)
	for i, l := range lines {
		if i > 0 {
			head = strings.Repeat(" ", hang)
		}
		full := head + l
		if i == len(lines)-1 && len(remark) > 0 {
			col := max(width(full)+3, min(noteAt+3, w.Width/2))
			if rest := w.wrapSpans(remark, w.Width-col); len(rest) == 1 {
				w.line(pad(full, col) + rest[0])
				return
			}
			w.line(full)
			for _, r := range w.wrapSpans(remark, w.Width-hang-2) {
				w.line(strings.Repeat(" ", hang+2) + r)
			}
			return
		}
		w.line(full)
	}
}

// hierarchy prints one order a line when all lines fit, else each order with
// what it yielded below.
func (w *textWriter) hierarchy(h Hierarchy) {
	type row struct{ power, equation, condition, yield string }
	rows := make([]row, len(h.Rows))
	var c [4]int
	flat := func(l *Line) string {
		if l == nil {
			return ""
		}
		return l.Left.Text + l.Rel.Text + signed(l.Right).Text
	}
	for i, o := range h.Rows {
		r := row{o.Power.Text, flat(&o.Equation), flat(o.Condition), flat(o.Yield)}
		if len(o.Words) > 0 {
			r.yield = strings.Join(w.wrapSpans(o.Words, 1<<20), " ")
		}
		rows[i] = r
		for k, s := range []string{r.power, r.equation, r.condition} {
			c[k] = max(c[k], width(s))
		}
	}
	in := textIndent + "  "
	fits := func(r row) bool {
		return width(in)+c[0]+2+c[1]+3+c[2]+3+width(r.yield) <= w.Width
	}
	all := true
	for _, r := range rows {
		all = all && fits(r)
	}
	for _, r := range rows {
		head := in + pad(r.power, c[0]) + "  "
		if all {
			w.line(head + pad(r.equation, c[1]) + "   " + pad(r.condition, c[2]) + "   " + r.yield)
			continue
		}
		hang := strings.Repeat(" ", width(head))
		if width(head)+c[1]+3+width(r.condition) <= w.Width && r.condition != "" {
			w.line(head + pad(r.equation, c[1]) + "   " + r.condition)
		} else {
			w.broken(head, hang+"   ", r.equation)
			if r.condition != "" {
				w.broken(hang+"   ", hang+"      ", r.condition)
			}
		}
		if r.yield != "" {
			w.broken(hang+"⇒  ", hang+"      ", r.yield)
		}
	}
}

func (w *textWriter) broken(head, hang, s string) {
	for i, l := range breakMath(s, w.Width-width(hang)) {
		if i > 0 {
			head = hang
		}
		w.line(head + l)
	}
}

// table aligns all columns but the last, which is wrapped.
func (w *textWriter) table(t Table) {
	cols := 0
	for _, r := range t.Rows {
		cols = max(cols, len(r))
	}
	cols = max(cols, len(t.Head))
	wide := make([]int, cols)
	for k := range wide[:max(cols-1, 0)] {
		if k < len(t.Head) {
			wide[k] = width(t.Head[k])
		}
		for _, r := range t.Rows {
			if k < len(r) {
				wide[k] = max(wide[k], width(plain(r[k])))
			}
		}
	}
	if len(t.Head) > 0 {
		s := textIndent
		for k, h := range t.Head {
			s += pad(h, wide[k]) + "  "
		}
		w.line(w.paint(strings.TrimRight(s, " "), Note))
	}
	for _, r := range t.Rows {
		head, at := textIndent, width(textIndent)
		for k := 0; k < cols-1; k++ {
			s, n := "", 0
			if k < len(r) && len(r[k]) > 0 {
				s = strings.Join(w.wrapSpans(r[k], 1<<20), " ")
				n = width(plain(r[k]))
			}
			head += s + strings.Repeat(" ", wide[k]-n+2)
			at += wide[k] + 2
		}
		var last []string
		if len(r) == cols && cols > 0 {
			last = w.wrapSpans(r[cols-1], max(w.Width-at, 30))
		}
		if len(last) == 0 {
			last = []string{""}
		}
		for i, l := range last {
			if i > 0 {
				head = strings.Repeat(" ", at)
			}
			w.line(head + l)
		}
	}
}

// plain is the text of spans without style.
func plain(p []Span) string {
	w := &textWriter{}
	return strings.Join(w.wrapSpans(p, 1<<20), " ")
}

// breakMath breaks a formula before signs, the outermost ones first, into
// lines of at most room columns where that is possible.
func breakMath(s string, room int) []string {
	if width(s) <= room {
		return []string{s}
	}
	return breakAt(s, room, 0)
}

func breakAt(s string, room, depth int) []string {
	parts := cutSigns(s, depth)
	if len(parts) == 1 && depth < 6 {
		return breakAt(s, room, depth+1)
	}
	var lines []string
	line := ""
	for _, p := range parts {
		switch {
		case line == "":
			line = p
		case width(line)+1+width(p) <= room:
			line += " " + p
		default:
			lines = append(lines, line)
			line = p
		}
		if width(line) > room && depth < 6 {
			sub := breakAt(line, room, depth+1)
			lines = append(lines, sub[:len(sub)-1]...)
			line = sub[len(sub)-1]
		}
	}
	return append(lines, line)
}

// cutSigns cuts before the binary signs (and after the commas) at most the
// given number of brackets deep.
func cutSigns(s string, depth int) []string {
	var out []string
	r := []rune(s)
	level, from := 0, 0
	for i := 0; i < len(r); i++ {
		switch r[i] {
		case '(', '[', '⟨':
			level++
		case ')', ']', '⟩':
			level--
		case '+', '−':
			if level <= depth && i > 0 && i+1 < len(r) && r[i-1] == ' ' && r[i+1] == ' ' {
				out = append(out, string(r[from:i-1]))
				from = i
			}
		case '=':
			if level == 0 && i > 0 && r[i-1] == ' ' && depth > 0 {
				out = append(out, string(r[from:i-1]))
				from = i
			}
		}
	}
	return append(out, string(r[from:]))
}
