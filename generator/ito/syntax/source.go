package syntax

import (
	"strings"
	"unicode/utf8"

	"epslim/generator/ito/diagnostic"
)

// Limits bounds what is read, so that no input exhausts time or memory. A zero
// field means its default.
type Limits struct {
	Bytes      int // size of the text; default 1 MiB
	Line       int // code points on a line; default 20000
	Statements int // statements in the file; default 2000
	Tokens     int // tokens of one expression; default (and at most) 6000
	Depth      int // nesting of brackets, signs and powers; default (and at most) 100
}

func (l Limits) withDefaults() Limits {
	set := func(v *int, def int) {
		if *v <= 0 {
			*v = def
		}
	}
	set(&l.Bytes, 1<<20)
	set(&l.Line, 20000)
	set(&l.Statements, 2000)
	set(&l.Tokens, 6000)
	set(&l.Depth, 100)
	// expr's parser stops at 10000 nodes; each token makes at most 1.5.
	l.Tokens = min(l.Tokens, 6000)
	l.Depth = min(l.Depth, 100)
	return l
}

// Source is the text of a file with its lines.
type Source struct {
	Name string // the name that errors carry
	Text string // the text, without a byte-order mark, lines ended by \n
	// lineStart[i] is the byte offset of line i+1.
	lineStart []int
}

// newSource normalizes line ends and drops a byte-order mark.
func newSource(name string, text string) *Source {
	text = strings.TrimPrefix(text, "\ufeff")
	text = strings.ReplaceAll(text, "\r\n", "\n")
	s := &Source{Name: name, Text: text, lineStart: []int{0}}
	for i := 0; i < len(text); i++ {
		if text[i] == '\n' {
			s.lineStart = append(s.lineStart, i+1)
		}
	}
	return s
}

// Line returns the text of line n, which starts at 1, or "" when there is none.
func (s *Source) Line(n int) string {
	if n < 1 || n > len(s.lineStart) {
		return ""
	}
	text := s.Text[s.lineStart[n-1]:]
	if i := strings.IndexByte(text, '\n'); i >= 0 {
		text = text[:i]
	}
	return text
}

// Diagnostic returns an error at a place of this text.
func (s *Source) Diagnostic(at diagnostic.Position, code diagnostic.Code, message string) *diagnostic.Diagnostic {
	return &diagnostic.Diagnostic{File: s.Name, Position: at, Code: code, Message: message, Text: s.Line(at.Line)}
}

// checkText reports what is wrong with the text as a whole; after such an error
// nothing else is read.
func checkText(name string, src []byte, limits Limits) *diagnostic.Diagnostic {
	first := diagnostic.Position{Line: 1, Column: 1}
	if len(src) > limits.Bytes {
		return &diagnostic.Diagnostic{File: name, Position: first, Code: diagnostic.TooLarge,
			Message: "the file has " + sizeText(len(src)) + "; a model file has at most " + sizeText(limits.Bytes)}
	}
	line, column, lineStart := 1, 1, 0
	for i := 0; i < len(src); {
		r, size := utf8.DecodeRune(src[i:])
		if r == utf8.RuneError && size <= 1 {
			end := i
			for end > lineStart && src[end-1] != '\n' {
				end--
			}
			d := &diagnostic.Diagnostic{File: name, Position: diagnostic.Position{Line: line, Column: column, Length: 1},
				Code: diagnostic.NotUTF8, Message: "the text is not UTF-8: byte " + hexByte(src[i]) + " is no character",
				Expected: "a file saved in the encoding UTF-8"}
			d.Text = strings.ToValidUTF8(string(src[lineStart:i]), "\ufffd") + "\ufffd"
			return d
		}
		i += size
		column++
		if r == '\n' {
			line, column, lineStart = line+1, 1, i
		} else if column > limits.Line+1 {
			return &diagnostic.Diagnostic{File: name, Position: diagnostic.Position{Line: line, Column: limits.Line + 1, Length: 1},
				Code: diagnostic.LineTooLong, Message: "the line has more than " + itoa(limits.Line) + " characters",
				Expected: "a statement continued over several lines: a final \\ or an open bracket continues it",
				Text:     string(src[lineStart:i])}
		}
	}
	return nil
}

func hexByte(b byte) string {
	const digits = "0123456789abcdef"
	return "0x" + string(digits[b>>4]) + string(digits[b&15])
}

func sizeText(n int) string {
	switch {
	case n >= 1<<20:
		return itoa((n+1<<19)>>20) + " MiB"
	case n >= 1<<10:
		return itoa((n+1<<9)>>10) + " KiB"
	}
	return itoa(n) + " bytes"
}
