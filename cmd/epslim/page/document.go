package page

// Field is a piece of information in the head of the page, out of sight.
type Field struct{ Name, Value string }

// Document is a page. Its zero value is an empty one without a title, which is an error.
type Document struct {
	Title    string
	Subtitle string
	Lang     string  // language of the text; "en" when empty
	Meta     []Field // as <meta> elements, in this order
	Contents bool    // a list of the sections behind the title
	Body     []Block
}

// Block is a part of a page that stands on lines of its own: [Section], [Paragraph], [Formula], [Table],
// [CodeBlock], [Figure], [List], [Note].
type Block interface {
	block(w *writer, depth int)
}

// Inline is a part of a line: [Text], [Code], [Emph], [Strong], [Link], [Math].
type Inline interface {
	inline(w *writer)
}

// Section is a heading with what follows it. Sections nest at most five deep; the depth is the level
// of the heading, so headings are always in order.
type Section struct {
	Title string
	ID    string // for links; made from the title when empty
	Body  []Block
}

// Paragraph is a line of text that is broken as needed.
type Paragraph []Inline

// P makes a paragraph.
func P(parts ...Inline) Paragraph { return Paragraph(parts) }

// Text is plain text.
type Text string

// Code is a piece of program or model text within a line.
type Code string

// Emph is text in italics.
type Emph string

// Strong is text in bold type.
type Strong string

// Link is a link to a place of this page ("#id") or to a public page ("https://...").
type Link struct{ Text, URL string }

// Math is a formula within a line.
type Math struct {
	MathML MathML
	TeX    string
}

// Formula is a formula on a line of its own. Its TeX is in the page as an annotation and can be copied.
type Formula struct {
	MathML MathML
	TeX    string
	Number string // shown behind it in parentheses; none when empty
	ID     string // for links
	Alt    string // plain words, for readers whose software does not speak MathML; optional
}

// Align is the alignment of a column.
type Align int

// The alignments.
const (
	Left Align = iota
	Right
	Centre
)

// Cell is an entry of a table.
type Cell []Inline

// C makes a cell of plain text.
func C(text string) Cell { return Cell{Text(text)} }

// Table is a table with one row of headings. Each row has as many cells as the heading.
type Table struct {
	Caption []Inline
	Align   []Align // of the columns; Left for those that are missing
	Head    []Cell
	Rows    [][]Cell
}

// CodeBlock is text in a fixed-width font with its line breaks.
type CodeBlock struct {
	Text  string
	Label string // what it is, for screen readers; "code" when empty
}

// Figure is an SVG drawing. On a dark page, shapes whose class is ink, paper, soft or blue followed by -line or -fill
// change their colour, so that they can be seen there.
type Figure struct {
	SVG     []byte
	Alt     string // states the finding; may be empty if the SVG has an aria-label
	Caption []Inline
	ID      string
}

// List is a list of lines.
type List struct {
	Ordered bool
	Items   [][]Inline
}

// NoteKind is the kind of a note.
type NoteKind int

// The kinds of notes.
const (
	Remark NoteKind = iota
	Good
	Warning
)

// Note is a remark set apart from the text. Its title says what its colour says.
type Note struct {
	Kind  NoteKind
	Title string
	Body  []Block
}
