package syntax

import (
	"math/big"
	"strings"
)

// Span is the extent of a part of the text. At gives line, column and the
// length on the first line; Start and End are byte offsets into [Source.Text].
type Span struct {
	At         Position
	Start, End int
}

// Where returns the place of the part.
func (s Span) Where() Position { return s.At }

// Expr is a node of an expression: *Number, *Name, *Differential, *Unary,
// *Binary or *Call. Parentheses are not nodes; String writes those that are
// needed.
type Expr interface {
	// Where returns the place of the whole expression, without parentheses around it.
	Where() Position
	// String returns the expression in the language it was read from.
	// Reading it again gives an equal expression.
	String() string
	extent() Span
}

func (s Span) extent() Span { return s }

// Number is a literal. It is never negative.
type Number struct {
	Span
	Text  string   // as it was typed
	Value *big.Rat // exactly
}

// Name is a name that stands for a value, or the name of a called function.
type Name struct {
	Span
	Name string
}

// Differential is dt, a Wiener increment such as dW1, or the differential of a
// declared variable (which has no place on a right-hand side, and is kept to
// say so).
type Differential struct {
	Span
	Name string // with the d
}

// Unary is a sign before an operand.
type Unary struct {
	Span
	Op string // - or +
	X  Expr
}

// Binary is an operation on two operands.
type Binary struct {
	Span
	Op       string // + - * / ^
	OpAt     Position
	Implicit bool // a product whose sign was omitted before a differential
	X, Y     Expr
}

// Call is a function with its arguments.
type Call struct {
	Span
	Fun  *Name
	Args []Expr
}

// precedence is the one table of the language: of the operators as they are
// read (it mirrors the order in which expr's parser binds them) and as they are
// printed. A sign binds looser than a power: -x^2 is -(x^2).
var precedence = map[string]int{"+": 1, "-": 1, "*": 2, "/": 2, "sign": 3, "^": 4}

const precedenceAtom = 5

func precedenceOf(e Expr) int {
	switch e := e.(type) {
	case *Unary:
		return precedence["sign"]
	case *Binary:
		return precedence[e.Op]
	}
	return precedenceAtom
}

func (e *Number) String() string       { return e.Text }
func (e *Name) String() string         { return e.Name }
func (e *Differential) String() string { return e.Name }
func (e *Unary) String() string        { return write(e) }
func (e *Binary) String() string       { return write(e) }
func (e *Call) String() string         { return write(e) }

func write(e Expr) string {
	var b strings.Builder
	writeExpr(&b, e)
	return b.String()
}

func writeExpr(b *strings.Builder, e Expr) {
	switch e := e.(type) {
	case *Unary:
		b.WriteString(e.Op)
		writeOperand(b, e.X, precedence["sign"]+1)
	case *Binary:
		writeBinary(b, e)
	case *Call:
		b.WriteString(e.Fun.Name)
		b.WriteByte('(')
		for i, a := range e.Args {
			if i > 0 {
				b.WriteString(", ")
			}
			writeExpr(b, a)
		}
		b.WriteByte(')')
	default:
		b.WriteString(e.String())
	}
}

func writeBinary(b *strings.Builder, e *Binary) {
	p := precedence[e.Op]
	left, right := p, p+1
	if e.Op == "^" {
		left, right = p+1, p
	}
	writeOperand(b, e.X, left)
	switch {
	case e.Implicit:
		b.WriteByte(' ')
	case p == precedence["+"]:
		b.WriteString(" " + e.Op + " ")
	default:
		b.WriteString(e.Op)
	}
	writeOperand(b, e.Y, right)
}

// writeOperand writes e, in parentheses when it binds looser than least.
func writeOperand(b *strings.Builder, e Expr, least int) {
	if precedenceOf(e) >= least {
		writeExpr(b, e)
		return
	}
	b.WriteByte('(')
	writeExpr(b, e)
	b.WriteByte(')')
}

// Same tells whether two expressions have the same structure, whatever their
// places and the way their numbers were typed. A product with an omitted sign is
// a product.
func Same(a, b Expr) bool {
	switch a := a.(type) {
	case *Number:
		b, ok := b.(*Number)
		return ok && a.Value.Cmp(b.Value) == 0
	case *Name:
		b, ok := b.(*Name)
		return ok && a.Name == b.Name
	case *Differential:
		b, ok := b.(*Differential)
		return ok && a.Name == b.Name
	case *Unary:
		b, ok := b.(*Unary)
		return ok && a.Op == b.Op && Same(a.X, b.X)
	case *Binary:
		b, ok := b.(*Binary)
		return ok && a.Op == b.Op && Same(a.X, b.X) && Same(a.Y, b.Y)
	case *Call:
		b, ok := b.(*Call)
		if !ok || a.Fun.Name != b.Fun.Name || len(a.Args) != len(b.Args) {
			return false
		}
		for i := range a.Args {
			if !Same(a.Args[i], b.Args[i]) {
				return false
			}
		}
		return true
	}
	return a == nil && b == nil
}

// Walk calls visit for e and everything in it, outermost first, until visit
// returns false, which leaves out what is inside that node.
func Walk(e Expr, visit func(Expr) bool) {
	if e == nil || !visit(e) {
		return
	}
	switch e := e.(type) {
	case *Unary:
		Walk(e.X, visit)
	case *Binary:
		Walk(e.X, visit)
		Walk(e.Y, visit)
	case *Call:
		Walk(e.Fun, visit)
		for _, a := range e.Args {
			Walk(a, visit)
		}
	}
}
