package page

import (
	"bytes"
	"crypto/sha256"
	"encoding/base64"
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
)

// HTML writes the page. An error names the part that cannot be written; there is no partial result.
func (d *Document) HTML() ([]byte, error) {
	if strings.TrimSpace(d.Title) == "" {
		return nil, errors.New("page: the document has no title")
	}
	w := &writer{ids: map[string]int{}}
	w.reserve(d.Body)
	hash := sha256.Sum256([]byte(script))
	w.printf("<!DOCTYPE html>\n<html lang=\"%s\">\n<head>\n<meta charset=\"utf-8\">\n", escape(or(d.Lang, "en")))
	w.printf("<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n")
	w.printf("<meta name=\"color-scheme\" content=\"light dark\">\n")
	w.printf("<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'; img-src data:; script-src 'sha256-%s'\">\n",
		base64.StdEncoding.EncodeToString(hash[:]))
	w.printf("<title>%s</title>\n", escape(d.Title))
	for _, f := range d.Meta {
		w.printf("<meta name=\"%s\" content=\"%s\">\n", escape(f.Name), escape(f.Value))
	}
	// An icon of its own keeps a browser from asking a server for one.
	w.printf("<link rel=\"icon\" href=\"data:,\">\n<style>\n%s</style>\n</head>\n<body>\n<main>\n<header>\n<h1>%s</h1>\n", style, escape(d.Title))
	if d.Subtitle != "" {
		w.printf("<p class=\"subtitle\">%s</p>\n", escape(d.Subtitle))
	}
	w.printf("</header>\n")
	if d.Contents {
		w.contents(d.Body)
	}
	w.blocks(d.Body, 1)
	w.printf("</main>\n<script>%s</script>\n</body>\n</html>\n", script)
	if w.err != nil {
		return nil, w.err
	}
	return w.b.Bytes(), nil
}

// writer collects the page and the first error.
type writer struct {
	b   bytes.Buffer
	ids map[string]int // how often an identifier has been given out
	// sections are the identifiers of the sections in the order of the document, as given out by reserve.
	sections []string
	next     int
	where    []string // titles of the sections that are open
	err      error
}

func (w *writer) printf(format string, args ...any) { fmt.Fprintf(&w.b, format, args...) }

// fail records an error with its place.
func (w *writer) fail(what string, err error) {
	if w.err != nil {
		return
	}
	place := ""
	if len(w.where) > 0 {
		place = fmt.Sprintf(" in section %q", strings.Join(w.where, " / "))
	}
	w.err = fmt.Errorf("page: %s%s: %w", what, place, err)
}

func (w *writer) blocks(body []Block, depth int) {
	for _, b := range body {
		if b != nil {
			b.block(w, depth)
		}
	}
}

func (w *writer) inlines(parts []Inline) {
	for _, p := range parts {
		if p != nil {
			p.inline(w)
		}
	}
}

// id gives out an identifier that no other element of the page has.
func (w *writer) id(wanted string) string {
	id := slug(wanted)
	w.ids[id]++
	if n := w.ids[id]; n > 1 {
		return w.id(id + "-" + strconv.Itoa(n))
	}
	return id
}

// slug keeps letters, digits and hyphens.
func slug(s string) string {
	var b strings.Builder
	for _, c := range strings.ToLower(s) {
		switch {
		case unicode.IsLetter(c) || unicode.IsDigit(c):
			b.WriteRune(c)
		case b.Len() > 0 && !strings.HasSuffix(b.String(), "-"):
			b.WriteByte('-')
		}
	}
	return or(strings.TrimSuffix(b.String(), "-"), "part")
}

// reserve gives the sections their identifiers before anything is written, for the list of contents.
func (w *writer) reserve(body []Block) {
	for _, b := range body {
		switch s := b.(type) {
		case Section:
			w.sections = append(w.sections, w.id(or(s.ID, s.Title)))
			w.reserve(s.Body)
		case Note:
			w.reserve(s.Body)
		}
	}
}

// contents lists the sections of the first level.
func (w *writer) contents(body []Block) {
	w.printf("<nav aria-label=\"Contents\">\n<ol>\n")
	k := 0
	for _, b := range body {
		if s, ok := b.(Section); ok && k < len(w.sections) {
			w.printf("<li><a href=\"#%s\">%s</a></li>\n", w.sections[k], escape(s.Title))
			k++
			k += countSections(s.Body)
		}
		if n, ok := b.(Note); ok {
			k += countSections(n.Body)
		}
	}
	w.printf("</ol>\n</nav>\n")
}

func countSections(body []Block) (n int) {
	for _, b := range body {
		switch s := b.(type) {
		case Section:
			n += 1 + countSections(s.Body)
		case Note:
			n += countSections(s.Body)
		}
	}
	return n
}

func (s Section) block(w *writer, depth int) {
	if depth > 5 {
		w.fail("section "+strconv.Quote(s.Title), errors.New("sections nest at most five deep"))
		return
	}
	if strings.TrimSpace(s.Title) == "" {
		w.fail("section", errors.New("it has no title"))
		return
	}
	id := w.sections[w.next]
	w.next++
	w.where = append(w.where, s.Title)
	w.printf("<section aria-labelledby=\"%s\">\n<h%d id=\"%s\">%s</h%d>\n", id, depth+1, id, escape(s.Title), depth+1)
	w.blocks(s.Body, depth+1)
	w.printf("</section>\n")
	w.where = w.where[:len(w.where)-1]
}

func (p Paragraph) block(w *writer, _ int) {
	w.printf("<p>")
	w.inlines(p)
	w.printf("</p>\n")
}

func (t Text) inline(w *writer)   { w.printf("%s", escape(string(t))) }
func (t Code) inline(w *writer)   { w.printf("<code>%s</code>", escape(string(t))) }
func (t Emph) inline(w *writer)   { w.printf("<em>%s</em>", escape(string(t))) }
func (t Strong) inline(w *writer) { w.printf("<strong>%s</strong>", escape(string(t))) }

func (l Link) inline(w *writer) {
	if !strings.HasPrefix(l.URL, "#") && !strings.HasPrefix(l.URL, "https://") {
		w.fail("link "+strconv.Quote(l.Text), fmt.Errorf("%q begins neither with # nor with https://", l.URL))
		return
	}
	w.printf("<a href=\"%s\">%s</a>", escape(l.URL), escape(l.Text))
}

// math writes a formula with its TeX.
func (w *writer) math(m MathML, tex, attrs string) {
	if err := checkMathML(m); err != nil {
		w.fail(fmt.Sprintf("formula %.60q", tex), err)
		return
	}
	w.printf("<math%s><semantics><mrow>%s</mrow>", attrs, m)
	if tex != "" {
		w.printf("<annotation encoding=\"application/x-tex\">%s</annotation>", escape(tex))
	}
	w.printf("</semantics></math>")
}

// longInline is the length of the TeX from which a formula within a line gets a box that scrolls: browsers
// do not break formulas, and a narrow page would grow wider than the screen.
const longInline = 40

func (m Math) inline(w *writer) {
	if len(m.TeX) < longInline {
		w.math(m.MathML, m.TeX, "")
		return
	}
	w.printf("<span class=\"scroll wide\">")
	w.math(m.MathML, m.TeX, "")
	w.printf("</span>")
}

func (f Formula) block(w *writer, _ int) {
	id, label := "", "Formula"
	if f.ID != "" {
		id = fmt.Sprintf(" id=\"%s\"", w.id(f.ID))
	}
	if f.Number != "" {
		label += " " + f.Number
	}
	attrs := ` display="block"`
	if f.Alt != "" {
		attrs += fmt.Sprintf(` alttext="%s" aria-label="%s"`, escape(f.Alt), escape(f.Alt))
	}
	// The box can be reached with the keyboard, or else what it hides could not be scrolled to.
	w.printf("<div class=\"formula\"%s><div class=\"scroll\" role=\"group\" tabindex=\"0\" aria-label=\"%s\">", id, escape(label))
	w.math(f.MathML, f.TeX, attrs)
	w.printf("</div>")
	if f.Number != "" {
		w.printf("<span class=\"number\">(%s)</span>", escape(f.Number))
	}
	w.printf("</div>\n")
}

func (t Table) block(w *writer, _ int) {
	name := plain(t.Caption)
	w.printf("<div class=\"scroll table\" role=\"group\" tabindex=\"0\" aria-label=\"%s\"><table>\n", escape(or(name, "Table")))
	if len(t.Caption) > 0 {
		w.printf("<caption>")
		w.inlines(t.Caption)
		w.printf("</caption>\n")
	}
	row := func(tag, scope string, cells []Cell) {
		w.printf("<tr>")
		for k, c := range cells {
			class := ""
			if k < len(t.Align) {
				class = [...]string{"", ` class="right"`, ` class="centre"`}[min(max(t.Align[k], 0), 2)]
			}
			w.printf("<%s%s%s>", tag, scope, class)
			w.inlines(c)
			w.printf("</%s>", tag)
		}
		w.printf("</tr>\n")
	}
	w.printf("<thead>\n")
	row("th", ` scope="col"`, t.Head)
	w.printf("</thead>\n<tbody>\n")
	for k, cells := range t.Rows {
		if len(cells) != len(t.Head) {
			w.fail(fmt.Sprintf("table %q", name), fmt.Errorf("row %d has %d cells, the heading has %d", k+1, len(cells), len(t.Head)))
		}
		row("td", "", cells)
	}
	w.printf("</tbody>\n</table></div>\n")
}

func (c CodeBlock) block(w *writer, _ int) {
	// HTML drops a line break right after <pre>, so one is given to it.
	w.printf("<pre role=\"group\" tabindex=\"0\" aria-label=\"%s\">\n<code>%s</code></pre>\n", escape(or(c.Label, "code")), escape(c.Text))
}

func (f Figure) block(w *writer, _ int) {
	label, width, height, err := checkSVG(f.SVG)
	if err != nil {
		w.fail("figure "+strconv.Quote(plain(f.Caption)), err)
		return
	}
	if label == "" && f.Alt == "" {
		w.fail("figure "+strconv.Quote(plain(f.Caption)), errors.New("it has no alternative text"))
		return
	}
	id := ""
	if f.ID != "" {
		id = fmt.Sprintf(" id=\"%s\"", w.id(f.ID))
	}
	w.printf("<figure%s>\n<div class=\"drawing\" style=\"--w:%s;--h:%s\"", id, number(width), number(height))
	if f.Alt != "" {
		w.printf(" role=\"img\" aria-label=\"%s\"", escape(f.Alt))
	}
	w.printf(">%s</div>\n", withoutProlog(f.SVG))
	if len(f.Caption) > 0 {
		w.printf("<figcaption>")
		w.inlines(f.Caption)
		w.printf("</figcaption>\n")
	}
	w.printf("</figure>\n")
}

func number(v float64) string {
	return strconv.FormatFloat(math.Round(v*100)/100, 'f', -1, 64)
}

func (l List) block(w *writer, _ int) {
	tag := "ul"
	if l.Ordered {
		tag = "ol"
	}
	w.printf("<%s>\n", tag)
	for _, item := range l.Items {
		w.printf("<li>")
		w.inlines(item)
		w.printf("</li>\n")
	}
	w.printf("</%s>\n", tag)
}

func (n Note) block(w *writer, depth int) {
	class := [...]string{"remark", "good", "warning"}[min(max(n.Kind, 0), 2)]
	w.printf("<div class=\"note %s\" role=\"note\">\n", class)
	if n.Title != "" {
		w.printf("<p class=\"title\">%s</p>\n", escape(n.Title))
	}
	w.blocks(n.Body, depth)
	w.printf("</div>\n")
}

// plain is the text of a line without its formulas.
func plain(parts []Inline) string {
	var b strings.Builder
	for _, p := range parts {
		switch t := p.(type) {
		case Text:
			b.WriteString(string(t))
		case Code:
			b.WriteString(string(t))
		case Emph:
			b.WriteString(string(t))
		case Strong:
			b.WriteString(string(t))
		case Link:
			b.WriteString(t.Text)
		case Math:
			b.WriteString(t.TeX)
		}
	}
	return b.String()
}

// escape makes a text safe as content and within double quotes. Control characters other than tabs and line
// breaks, which HTML forbids, become the replacement character.
func escape(s string) string {
	var b strings.Builder
	for _, c := range s {
		switch {
		case c == '&':
			b.WriteString("&amp;")
		case c == '<':
			b.WriteString("&lt;")
		case c == '>':
			b.WriteString("&gt;")
		case c == '"':
			b.WriteString("&quot;")
		case c == '\'':
			b.WriteString("&#39;")
		case c == '\n' || c == '\t':
			b.WriteRune(c)
		case c == '\r':
		case c < ' ' || c >= 0x7f && c <= 0x9f || c == 0xfffe || c == 0xffff:
			b.WriteRune('\uFFFD')
		default:
			b.WriteRune(c)
		}
	}
	return b.String()
}

func or(a, b string) string {
	if a != "" {
		return a
	}
	return b
}
