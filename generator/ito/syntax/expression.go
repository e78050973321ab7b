package syntax

import (
	"math/big"
	"sort"
	"strconv"
	"strings"

	"github.com/expr-lang/expr/ast"
	"github.com/expr-lang/expr/parser"

	"epslim/generator/ito/diagnostic"
)

// expression parses one expression from a range of tokens of a statement. All
// positions in the result are those of the file.
type expression struct {
	src    *Source
	limits Limits
	tokens []token // of the whole statement
	from   int     // the expression is tokens[from:to]
	to     int
	// isDifferential tells which names are differentials.
	isDifferential func(string) bool

	pieces []piece
	starts []int // starts[i] is the offset of pieces[i] in the text given to expr's parser
}

// piece is one word of the text given to expr's parser.
type piece struct {
	text     string
	token    int  // the token it stands for; for an inserted sign, the token after it
	inserted bool // a multiplication sign that was omitted
}

// parse returns the tree, or the first error. after is the place an empty
// expression is reported at.
func (p *expression) parse(after Position) (Expr, *diagnostic.Diagnostic) {
	if p.from >= p.to {
		return nil, p.fail(after, diagnostic.Syntax, "the expression is missing", "an expression")
	}
	if p.to-p.from > p.limits.Tokens {
		return nil, p.fail(p.tokens[p.from].at, diagnostic.StatementLong,
			"the expression has more than "+itoa(p.limits.Tokens)+" names, numbers and signs", "parts of it named by \"let\" statements")
	}
	if d := p.check(); d != nil {
		return nil, d
	}
	var b strings.Builder
	for _, piece := range p.pieces {
		p.starts = append(p.starts, b.Len())
		b.WriteString(piece.text)
		b.WriteByte(' ')
	}
	tree, err := parser.Parse(b.String())
	if err != nil {
		// check accepts what expr's parser accepts; this is a safeguard.
		return nil, p.fail(p.tokens[p.from].at, diagnostic.Syntax, "the expression is not understood", "")
	}
	e, _, d := p.convert(tree.Node)
	return e, d
}

func (p *expression) fail(at Position, code diagnostic.Code, message, expected string) *diagnostic.Diagnostic {
	d := p.src.Diagnostic(at, code, message)
	d.Expected = expected
	return d
}

// check walks over the tokens, inserts omitted multiplication signs, and finds
// every error in the order of operands, operators and brackets. Its two states
// are "an operand comes" and "an operator comes"; the language is small enough
// for that to be complete.
func (p *expression) check() *diagnostic.Diagnostic {
	st := checkState{operand: true}
	for i := p.from; i < p.to; i++ {
		t := &p.tokens[i]
		if !st.operand && t.kind == tokenName && p.isDifferential(t.text) {
			p.pieces = append(p.pieces, piece{text: "*", token: i, inserted: true})
			st.operand = true
		}
		var d *diagnostic.Diagnostic
		switch {
		case t.kind == tokenName || t.kind == tokenNumber:
			i, d = p.checkOperand(&st, i)
		case t.kind == tokenOperator:
			d = p.checkOperator(&st, i)
		default:
			d = p.checkPunctuation(&st, i)
		}
		if d != nil {
			return d
		}
	}
	if st.operand {
		return p.missingOperand(p.to)
	}
	if len(st.open) > 0 {
		return p.fail(p.tokens[p.from].at, diagnostic.Bracket, "a bracket is never closed", "\")\"")
	}
	return nil
}

// checkState is where check stands.
type checkState struct {
	operand bool   // an operand comes next
	open    []bool // for each open parenthesis, whether it holds arguments
	chain   int    // signs and powers since the last operator that ends their nesting
}

// checkOperand takes a name or number, and the parenthesis that opens its
// arguments; it returns the last token taken.
func (p *expression) checkOperand(st *checkState, i int) (int, *diagnostic.Diagnostic) {
	if !st.operand {
		return i, p.unexpectedOperand(i)
	}
	st.operand = false
	t := &p.tokens[i]
	// Names become letters followed by their token's number, numbers that number: so no
	// word of expr's own language is met, and no digit is lost.
	word := strconv.Itoa(i)
	if t.kind == tokenName {
		word = "n" + word
	}
	p.pieces = append(p.pieces, piece{text: word, token: i})
	if t.kind == tokenName && !p.isDifferential(t.text) && i+1 < p.to && p.tokens[i+1].is(tokenOpen, "(") {
		i++
		p.pieces = append(p.pieces, piece{text: "(", token: i})
		st.open = append(st.open, true)
		st.operand, st.chain = true, 0
	}
	return i, nil
}

func (p *expression) checkOperator(st *checkState, i int) *diagnostic.Diagnostic {
	t := &p.tokens[i]
	if st.operand && t.text != "-" && t.text != "+" {
		return p.missingOperand(i)
	}
	if st.operand || t.text == "^" || t.text == "**" {
		if st.chain++; st.chain > p.limits.Depth {
			return p.fail(t.at, diagnostic.NestedTooDeep, "signs and powers nest more than "+itoa(p.limits.Depth)+" deep", "")
		}
	} else {
		st.chain = 0
	}
	st.operand = true
	p.pieces = append(p.pieces, piece{text: t.text, token: i})
	return nil
}

// checkPunctuation takes parentheses and commas, and refuses everything else.
func (p *expression) checkPunctuation(st *checkState, i int) *diagnostic.Diagnostic {
	t := &p.tokens[i]
	switch {
	case t.is(tokenOpen, "("):
		if !st.operand {
			return p.unexpectedOperand(i)
		}
		st.open = append(st.open, false)
	case t.is(tokenClose, ")"):
		if st.operand {
			return p.missingOperand(i)
		}
		if len(st.open) == 0 {
			return p.fail(t.at, diagnostic.Bracket, "the bracket \")\" closes nothing", "")
		}
		st.open = st.open[:len(st.open)-1]
	case t.kind == tokenComma:
		if st.operand {
			return p.missingOperand(i)
		}
		if len(st.open) == 0 || !st.open[len(st.open)-1] {
			return p.fail(t.at, diagnostic.Syntax, "a comma separates the arguments of a function, and there is none here", "an operator, or a point in place of a decimal comma")
		}
		st.operand = true
	default:
		return p.fail(t.at, diagnostic.Syntax, "unexpected "+t.describe()+" in an expression", expectation(st.operand))
	}
	st.chain = 0
	p.pieces = append(p.pieces, piece{text: t.text, token: i})
	return nil
}

func expectation(operand bool) string {
	if operand {
		return "a number, a name or \"(\""
	}
	return "an operator"
}

// unexpectedOperand reports an operand where an operator was expected, with what
// was probably meant.
func (p *expression) unexpectedOperand(i int) *diagnostic.Diagnostic {
	t, before := &p.tokens[i], &p.tokens[i-1]
	d := p.fail(t.at, diagnostic.Syntax, "unexpected "+t.describe()+" after "+before.describe(), "an operator")
	switch {
	case before.kind == tokenName && p.isDifferential(before.text):
		d.Expected = "the end of the term, which a differential makes, or an operator"
	case before.kind == tokenNumber || before.kind == tokenName && t.kind != tokenOpen:
		d.Expected = "an operator, such as " + before.text + "*" + t.text
	case before.kind == tokenClose:
		d.Expected = "an operator, such as )*" + t.text
	}
	return d
}

// missingOperand reports that token i, or the end of the expression, stands where
// an operand was expected.
func (p *expression) missingOperand(i int) *diagnostic.Diagnostic {
	if i < p.to {
		t := &p.tokens[i]
		message := "unexpected " + t.describe()
		if i > p.from {
			message += " after " + p.tokens[i-1].describe()
		}
		return p.fail(t.at, diagnostic.Syntax, message, expectation(true))
	}
	last := &p.tokens[p.to-1]
	at := last.at
	at.Column += at.Length
	at.Length = 1
	return p.fail(at, diagnostic.Syntax, "the expression ends after "+last.describe(), expectation(true))
}

// pieceOf returns the piece that a node of expr's tree starts at.
func (p *expression) pieceOf(n ast.Node) *piece {
	from := n.Location().From
	i := sort.SearchInts(p.starts, from+1) - 1
	return &p.pieces[max(i, 0)]
}

// reach is the range of tokens an expression covers, without parentheses around it.
type reach struct{ first, last int }

// convert translates expr's tree; it admits the node types of the language only.
func (p *expression) convert(n ast.Node) (Expr, reach, *diagnostic.Diagnostic) {
	switch n := n.(type) {
	case *ast.IdentifierNode:
		i := p.pieceOf(n).token
		r := reach{i, i}
		name := p.tokens[i].text
		if p.isDifferential(name) {
			return &Differential{Span: p.span(r), Name: name}, r, nil
		}
		return &Name{Span: p.span(r), Name: name}, r, nil
	case *ast.IntegerNode:
		i := p.pieceOf(n).token
		r := reach{i, i}
		value, ok := new(big.Rat).SetString(p.tokens[i].text)
		if !ok {
			return nil, r, p.fail(p.tokens[i].at, diagnostic.BadNumber, "the number is not understood", "")
		}
		return &Number{Span: p.span(r), Text: p.tokens[i].text, Value: value}, r, nil
	case *ast.UnaryNode:
		x, r, d := p.convert(n.Node)
		if d != nil {
			return nil, r, d
		}
		i := p.pieceOf(n).token
		r = p.widenRight(r, i+1)
		r.first = i
		return &Unary{Span: p.span(r), Op: n.Operator, X: x}, r, nil
	case *ast.BinaryNode:
		return p.convertBinary(n)
	case *ast.CallNode:
		return p.convertCall(n)
	}
	return nil, reach{p.from, p.from}, p.fail(p.tokens[p.from].at, diagnostic.Syntax, "the expression is not understood", "")
}

func (p *expression) convertBinary(n *ast.BinaryNode) (Expr, reach, *diagnostic.Diagnostic) {
	x, rx, d := p.convert(n.Left)
	if d != nil {
		return nil, rx, d
	}
	y, ry, d := p.convert(n.Right)
	if d != nil {
		return nil, ry, d
	}
	op := p.pieceOf(n)
	e := &Binary{Op: n.Operator, OpAt: p.tokens[op.token].at, Implicit: op.inserted, X: x, Y: y}
	if e.Op == "**" {
		e.Op = "^"
	}
	next := op.token + 1
	if op.inserted {
		next = op.token
	}
	rx = p.widenLeft(rx, op.token-1)
	ry = p.widenRight(ry, next)
	r := reach{rx.first, ry.last}
	e.Span = p.span(r)
	return e, r, nil
}

func (p *expression) convertCall(n *ast.CallNode) (Expr, reach, *diagnostic.Diagnostic) {
	fun, r, d := p.convert(n.Callee)
	if d != nil {
		return nil, r, d
	}
	name, ok := fun.(*Name)
	if !ok {
		return nil, r, p.fail(p.tokens[r.first].at, diagnostic.Syntax, "only a named function takes arguments", "")
	}
	e := &Call{Fun: name}
	for _, a := range n.Arguments {
		arg, ra, d := p.convert(a)
		if d != nil {
			return nil, ra, d
		}
		e.Args = append(e.Args, arg)
	}
	if partner := p.tokens[r.first+1].partner; partner > r.first {
		r.last = partner
	}
	e.Span = p.span(r)
	return e, r, nil
}

// widenLeft extends the range of a left operand over the parentheses around it:
// the operand ends at token last.
func (p *expression) widenLeft(r reach, last int) reach {
	for r.last < last && r.first > p.from {
		r.first, r.last = r.first-1, r.last+1
	}
	return r
}

// widenRight does the same for a right operand, which starts at token first.
func (p *expression) widenRight(r reach, first int) reach {
	for r.first > first && r.last < p.to-1 {
		r.first, r.last = r.first-1, r.last+1
	}
	return r
}

func (p *expression) span(r reach) Span { return spanOf(p.src, p.tokens, r.first, r.last) }

// spanOf returns the extent of tokens first to last. The length is that on the
// first line.
func spanOf(src *Source, tokens []token, first, last int) Span {
	a, b := &tokens[first], &tokens[last]
	s := Span{At: a.at, Start: a.start, End: b.end}
	if b.at.Line == a.at.Line {
		s.At.Length = b.at.Column + b.at.Length - a.at.Column
		return s
	}
	for i := last; i >= first; i-- {
		if t := &tokens[i]; t.at.Line == a.at.Line {
			s.At.Length = t.at.Column + t.at.Length - a.at.Column
			break
		}
	}
	return s
}
