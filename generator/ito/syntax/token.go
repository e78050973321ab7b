package syntax

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"epslim/generator/ito/diagnostic"
)

// Position is a place in the text; see [diagnostic.Position].
type Position = diagnostic.Position

type tokenKind uint8

const (
	tokenName tokenKind = iota
	tokenNumber
	tokenString   // Text is the content without the quotes
	tokenOperator // + - * / ^ **
	tokenOpen     // ( [
	tokenClose    // ) ]
	tokenComma
	tokenEquals
)

// token is a lexical unit with what stood around it, so that the layout can be
// rebuilt.
type token struct {
	kind       tokenKind
	text       string
	at         Position
	start, end int      // byte offsets
	newLine    bool     // first on its line, after a continuation
	above      []string // comment lines between the previous line of the statement and this token
	comment    string   // comment that ends the line after this token; starts with #
	partner    int      // for brackets: index of the other one within the statement
}

func (t *token) is(kind tokenKind, text string) bool { return t.kind == kind && t.text == text }

// describe names a token in an error message.
func (t *token) describe() string {
	if t.kind == tokenString {
		return "the text \"" + t.text + "\""
	}
	return "\"" + t.text + "\""
}

// item is a line of the file that starts something: a statement, a comment on
// its own, or an empty line.
type item struct {
	tokens  []token // statement
	comment string  // comment line
	line    int
	bad     bool // an error was reported while the statement was cut into tokens
}

// lexer cuts a text into items.
type lexer struct {
	src    *Source
	limits Limits
	off    int
	line   int
	column int
	items  []item
	errs   *diagnostic.List

	// The statement being read.
	current item
	open    []int // indices of unclosed brackets
	above   []string
	fresh   bool // the next token is the first on a continuation line
}

func (l *lexer) report(d *diagnostic.Diagnostic) {
	*l.errs = append(*l.errs, d)
}

func (l *lexer) peek() rune {
	if l.off >= len(l.src.Text) {
		return -1
	}
	r, _ := utf8.DecodeRuneInString(l.src.Text[l.off:])
	return r
}

func (l *lexer) advance() {
	r, size := utf8.DecodeRuneInString(l.src.Text[l.off:])
	l.off += size
	if r == '\n' {
		l.line, l.column = l.line+1, 1
	} else {
		l.column++
	}
}

func (l *lexer) skipSpace() {
	for {
		switch l.peek() {
		case ' ', '\t', '\r', '\u00a0', '\v', '\f':
			l.advance()
		default:
			return
		}
	}
}

// takeComment reads from # to the end of the line.
func (l *lexer) takeComment() string {
	start := l.off
	for r := l.peek(); r != '\n' && r != -1; r = l.peek() {
		l.advance()
	}
	return strings.TrimRight(l.src.Text[start:l.off], " \t\r")
}

// run reads the whole text. It stops early, with an error, at too many
// statements.
func (l *lexer) run() {
	l.line, l.column = 1, 1
	statements := 0
	for l.off < len(l.src.Text) {
		l.skipSpace()
		line := l.line
		switch r := l.peek(); r {
		case -1:
		case '\n':
			l.advance()
			l.items = append(l.items, item{line: line})
		case '#':
			l.items = append(l.items, item{line: line, comment: l.takeComment()})
			if l.peek() == '\n' {
				l.advance()
			}
		default:
			if statements++; statements > l.limits.Statements {
				l.report(l.src.Diagnostic(Position{Line: line, Column: l.column, Length: 1}, diagnostic.TooMany,
					"the file has more than "+itoa(l.limits.Statements)+" statements"))
				return
			}
			l.statement()
		}
	}
}

// statement reads one statement with its continuation lines.
func (l *lexer) statement() {
	l.current = item{line: l.line}
	l.open = l.open[:0]
	l.above, l.fresh = nil, false
	commentLine := false
	for {
		l.skipSpace()
		switch r := l.peek(); {
		case r == -1:
			l.finish()
			return
		case r == '#':
			c := l.takeComment()
			if n := len(l.current.tokens); n > 0 && !l.fresh {
				l.current.tokens[n-1].comment = c
			} else {
				l.above = append(l.above, c)
				commentLine = true
			}
		case r == '\n':
			l.advance()
			// A comment line within a continuation does not end it.
			if len(l.open) == 0 && !commentLine || l.lineStartsStatement() {
				l.finish()
				return
			}
			l.fresh, commentLine = true, false
		case r == '\\':
			at := l.here(1)
			l.advance()
			l.skipSpace()
			switch l.peek() {
			case '#':
				c := l.takeComment()
				if n := len(l.current.tokens); n > 0 && !l.fresh {
					l.current.tokens[n-1].comment = c
				} else {
					l.above = append(l.above, c)
				}
			case '\n', -1:
			default:
				l.fail(at, diagnostic.BadCharacter, "a \\ continues a line and stands at its end", "")
				continue
			}
			if l.peek() == '\n' {
				l.advance()
			}
			if l.lineStartsStatement() && len(l.open) == 0 {
				l.fail(at, diagnostic.Syntax, "the \\ continues a line, but the next line is a statement of its own", "")
				l.finish()
				return
			}
			l.fresh = true
		default:
			l.token(r)
		}
	}
}

func (l *lexer) here(length int) Position {
	return Position{Line: l.line, Column: l.column, Length: length}
}

// fail reports an error inside the current statement, once: what follows the
// first error of a statement is guesswork.
func (l *lexer) fail(at Position, code diagnostic.Code, message, expected string) {
	if !l.current.bad {
		d := l.src.Diagnostic(at, code, message)
		d.Expected = expected
		l.report(d)
	}
	l.current.bad = true
}

func (l *lexer) finish() {
	for _, i := range l.open {
		t := &l.current.tokens[i]
		l.fail(t.at, diagnostic.Bracket, "the bracket "+t.describe()+" is never closed", "\""+closing(t.text)+"\" before the next statement")
	}
	l.open = l.open[:0]
	if len(l.current.tokens) > 0 || l.current.bad {
		l.items = append(l.items, l.current)
	}
	for _, c := range l.above {
		l.items = append(l.items, item{line: l.line, comment: c})
	}
	l.above = nil
}

func closing(open string) string {
	if open == "[" {
		return "]"
	}
	return ")"
}

// lineStartsStatement looks ahead: does the coming line start a statement? It
// decides where an unclosed bracket ends, so that one slip does not swallow the
// rest of the file.
func (l *lexer) lineStartsStatement() bool {
	rest := strings.TrimLeft(l.src.Text[l.off:], " \t\r\u00a0")
	n := nameLength(rest)
	if n == 0 {
		return false
	}
	word := rest[:n]
	rest = strings.TrimLeft(rest[n:], " \t\r\u00a0")
	if strings.HasPrefix(rest, "=") {
		return true
	}
	if !isKeyword(word) {
		return false
	}
	next, _ := utf8.DecodeRuneInString(rest)
	switch {
	case isNameStart(next):
		second := rest[:nameLength(rest)]
		return !isDifferentialWord(second)
	case next == '"':
		return true
	}
	return word == "fast" && next == '('
}

// token reads one token.
func (l *lexer) token(r rune) {
	start, at := l.off, l.here(1)
	add := func(kind tokenKind, text string) {
		at.Length = utf8.RuneCountInString(l.src.Text[start:l.off])
		l.current.tokens = append(l.current.tokens, token{kind: kind, text: text, at: at, start: start, end: l.off,
			newLine: l.fresh, above: l.above, partner: -1})
		l.fresh, l.above = false, nil
	}
	switch {
	case isNameStart(r):
		n := nameLength(l.src.Text[l.off:])
		for l.off < start+n {
			l.advance()
		}
		add(tokenName, l.src.Text[start:l.off])
	case r >= '0' && r <= '9' || r == '.':
		l.number(at)
		add(tokenNumber, l.src.Text[start:l.off])
	case r == '"':
		l.advance()
		for c := l.peek(); c != '"' && c != '\n' && c != -1; c = l.peek() {
			l.advance()
		}
		text := l.src.Text[start+1 : l.off]
		if l.peek() != '"' {
			at.Length = utf8.RuneCountInString(text) + 1
			l.fail(at, diagnostic.OpenString, "the quoted text does not end on its line", "a closing \"")
		} else {
			l.advance()
		}
		add(tokenString, text)
	case r == '(' || r == '[':
		l.advance()
		add(tokenOpen, string(r))
		l.open = append(l.open, len(l.current.tokens)-1)
		if len(l.open) == l.limits.Depth+1 {
			l.fail(at, diagnostic.NestedTooDeep, "brackets nest more than "+itoa(l.limits.Depth)+" deep", "")
		}
	case r == ')' || r == ']':
		l.advance()
		add(tokenClose, string(r))
		l.closeBracket(at)
	case r == ',':
		l.advance()
		add(tokenComma, ",")
	case r == '=':
		l.advance()
		add(tokenEquals, "=")
	case r == '*':
		l.advance()
		if l.peek() == '*' {
			l.advance()
			add(tokenOperator, "**")
		} else {
			add(tokenOperator, "*")
		}
	case r == '+' || r == '-' || r == '/' || r == '^':
		l.advance()
		add(tokenOperator, string(r))
	default:
		l.advance()
		l.fail(at, diagnostic.BadCharacter, "the character "+quoteRune(r)+" has no meaning here", characterHint(r))
	}
}

func (l *lexer) closeBracket(at Position) {
	tokens := l.current.tokens
	self := len(tokens) - 1
	if len(l.open) == 0 {
		l.fail(at, diagnostic.Bracket, "the bracket "+tokens[self].describe()+" closes nothing", "")
		return
	}
	opener := l.open[len(l.open)-1]
	l.open = l.open[:len(l.open)-1]
	tokens[self].partner, tokens[opener].partner = opener, self
	if want := closing(tokens[opener].text); want != tokens[self].text {
		l.fail(at, diagnostic.Bracket, "the bracket "+tokens[self].describe()+" does not match the "+tokens[opener].describe()+
			" in line "+itoa(tokens[opener].at.Line)+", column "+itoa(tokens[opener].at.Column), "\""+want+"\"")
	}
}

// number reads digits, an optional point, and an optional exponent.
func (l *lexer) number(at Position) {
	start := l.off
	digits := func() (n int) {
		for r := l.peek(); r >= '0' && r <= '9'; r = l.peek() {
			l.advance()
			n++
		}
		return n
	}
	mantissa := digits()
	if l.peek() == '.' {
		l.advance()
		mantissa += digits()
	}
	exponent := ""
	if r := l.peek(); r == 'e' || r == 'E' {
		// Only digits make it an exponent: in 2*eps nothing is glued, and 2e is an error below.
		rest := l.src.Text[l.off+1:]
		rest = strings.TrimLeft(rest[:min(1, len(rest))], "+-") + rest[min(1, len(rest)):]
		if rest != "" && rest[0] >= '0' && rest[0] <= '9' {
			l.advance()
			mark := l.off
			if r := l.peek(); r == '+' || r == '-' {
				l.advance()
			}
			digits()
			exponent = l.src.Text[mark:l.off]
		}
	}
	at.Length = l.column - at.Column
	switch r := l.peek(); {
	case mantissa == 0:
		l.fail(at, diagnostic.BadNumber, "a number needs a digit", "")
	case isNameStart(r):
		text := l.src.Text[start:l.off]
		name := l.src.Text[l.off : l.off+nameLength(l.src.Text[l.off:])]
		if isDifferentialWord(name) {
			return // 2dt: a factor before a differential may omit the sign, and the space
		}
		at.Length += utf8.RuneCountInString(name)
		l.fail(at, diagnostic.BadNumber, "the number "+text+" runs into the name "+name, "an operator between them, such as "+text+"*"+name)
	case r == '.':
		at.Length++
		l.fail(at, diagnostic.BadNumber, "the number has a second point", "")
	}
	if e, err := strconv.Atoi(exponent); exponent != "" && (err != nil || e > maxExponent || e < -maxExponent) || l.off-start > maxDigits {
		l.fail(at, diagnostic.BadNumber, "the number is out of bounds", "at most "+itoa(maxDigits)+" digits and exponents from -"+itoa(maxExponent)+" to "+itoa(maxExponent))
	}
}

// Exact decimals of any size would let a short text exhaust memory.
const (
	maxExponent = 400
	maxDigits   = 1000
)

func isNameStart(r rune) bool { return r == '_' || unicode.IsLetter(r) }

func isNamePart(r rune) bool {
	return isNameStart(r) || unicode.IsDigit(r) || unicode.IsMark(r) || r >= '₀' && r <= '₉'
}

// IsName tells whether s can be the name of something in a model file.
func IsName(s string) bool { return s != "" && nameLength(s) == len(s) }

// nameLength returns the length in bytes of the name at the start of s.
func nameLength(s string) int {
	for i, r := range s {
		if i == 0 && !isNameStart(r) {
			return 0
		}
		if !isNamePart(r) {
			return i
		}
	}
	return len(s)
}

// isDifferentialWord tells whether a word is a differential whatever has been
// declared: dt, or dW with the name of a Wiener process.
func isDifferentialWord(s string) bool {
	return s == "dt" || strings.HasPrefix(s, "dW")
}

func itoa(n int) string { return strconv.Itoa(n) }

func quoteRune(r rune) string {
	if unicode.IsPrint(r) {
		return "\"" + string(r) + "\""
	}
	return fmt.Sprintf("%U", r)
}

// characterHint says what to write for a character that looks like one of ours.
func characterHint(r rune) string {
	switch r {
	case '−', '–', '—':
		return "the sign - of the keyboard"
	case '·', '×', '∙', '⋅', '∗':
		return "* for a product"
	case '÷', '∕', '⁄':
		return "/ for a quotient"
	case '²', '³', '¹':
		return "^ for a power, such as x^2"
	case '“', '”', '„', '«', '»', '‘', '’', '`':
		return "the straight quotes \"...\""
	case '\'', '′':
		return "\"...\" around a text, or diff(f, x) for a derivative"
	case '{', '}':
		return "parentheses ( )"
	case '√':
		return "sqrt(...)"
	case '∂':
		return "diff(f, x)"
	case '%', ';', ':':
		return "# to start a comment"
	}
	return ""
}
