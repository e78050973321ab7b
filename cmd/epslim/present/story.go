package present

import "epslim/generator/algebra"

// Story is a derivation arranged for reading: what every readable output
// (text, Markdown, LaTeX, the report) is made of. It holds no layout.
type Story struct {
	Title    string
	Sections []Section
}

// Section is a heading with its blocks. ID is a short name for labels.
type Section struct {
	ID, Title string
	Blocks    []Block
}

// Block is a Para, Equations, Hierarchy, Table or Code.
type Block interface{ block() }

// Para is running text.
type Para []Span

// Span is a piece of running text, or a formula within it.
type Span struct {
	Text string
	Math *Math
	Kind SpanKind
}

// SpanKind tells how a piece of text is meant.
type SpanKind uint8

// The kinds of spans.
const (
	Plain SpanKind = iota
	Strong
	Good // a success
	Bad  // a failure
	Note // a remark that may recede
	Code // program or model text
)

// Equations is a group of displayed lines, aligned at their relations.
type Equations struct {
	ID    string // for labels; empty for none
	Lines []Line
}

// Line is Left Rel Right, with a remark behind it.
type Line struct {
	Left  Math
	Rel   Math
	Right []Term
	Note  []Span
}

// Hierarchy is the orders of the expansion, one a row.
type Hierarchy struct {
	ID   string
	Rows []Order
}

// Order is one order of the expansion: its power of the small parameter, its
// equation, the solvability condition, and what it yielded.
type Order struct {
	Power     Math
	Equation  Line
	Condition *Line
	Yield     *Line
	Words     []Span // instead of a yield
}

// Table is rows of cells under a heading.
type Table struct {
	Head []string
	Rows [][][]Span
}

func (Para) block()      {}
func (Equations) block() {}
func (Hierarchy) block() {}
func (Table) block()     {}

// Term is a summand: Pre F Post with its sign. F may be nil.
type Term struct {
	Neg  bool
	Pre  Math
	F    *algebra.Form
	Post Math
}

func text(s string) Span               { return Span{Text: s} }
func strong(s string) Span             { return Span{Text: s, Kind: Strong} }
func note(s string) Span               { return Span{Text: s, Kind: Note} }
func inline(m Math) Span               { return Span{Math: &m} }
func cell(spans ...Span) []Span        { return spans }
func para(spans ...Span) Para          { return spans }
func equations(ls ...Line) Block       { return Equations{Lines: ls} }
func line(l, rel Math, r ...Term) Line { return Line{Left: l, Rel: rel, Right: r} }
