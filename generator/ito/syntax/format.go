package syntax

import (
	"strings"
	"unicode/utf8"
)

// Format returns the text of a model file in its canonical layout: one space
// around =, + and -, none around *, / and ^; the = of neighbouring statements of
// a kind and the comments of neighbouring lines aligned; runs of empty lines
// reduced to one; continuation lines indented. Comments, the order of
// statements, and the places where statements are broken into lines are kept.
// The result reads as the same model, and formatting it again changes nothing.
//
// A file with errors of syntax is not formatted; the errors, a diagnostic.List,
// are returned.
func Format(name string, src []byte, limits Limits) ([]byte, error) {
	f, errs := Parse(name, src, limits)
	if len(errs) > 0 {
		return nil, errs
	}
	var out strings.Builder
	var block []layoutLine
	flush := func() {
		alignEquals(block)
		alignComments(block)
		for i := range block {
			out.WriteString(strings.TrimRight(block[i].text, " "))
			out.WriteByte('\n')
		}
		block = block[:0]
	}
	blank := false
	for i := range f.items {
		it := &f.items[i]
		if len(it.tokens) == 0 && it.comment == "" {
			flush()
			blank = out.Len() > 0
			continue
		}
		if blank {
			out.WriteByte('\n')
			blank = false
		}
		if len(it.tokens) == 0 {
			flush()
			out.WriteString(it.comment + "\n")
			continue
		}
		block = append(block, layOut(it.tokens)...)
	}
	flush()
	return []byte(out.String()), nil
}

// layoutLine is a line of output before its parts are aligned.
type layoutLine struct {
	text    string
	comment string
	class   string // lines of one class have their = aligned
	equals  int    // byte offset of the = in text, or -1
}

const continuationIndent = "    "

// layOut writes one statement as lines.
func layOut(tokens []token) []layoutLine {
	class := tokens[0].text
	if len(tokens) > 1 && tokens[1].kind == tokenEquals {
		class = "="
	}
	lines := []layoutLine{{class: class, equals: -1}}
	depth := 0
	for i := range tokens {
		t, line := &tokens[i], &lines[len(lines)-1]
		if t.newLine {
			if depth == 0 {
				line.text += " \\"
			}
			for _, c := range t.above {
				lines = append(lines, layoutLine{text: continuationIndent + c, equals: -1})
			}
			lines = append(lines, layoutLine{text: continuationIndent, equals: -1})
			line = &lines[len(lines)-1]
		} else if i > 0 && spaceBetween(tokens, i) {
			line.text += " "
		}
		switch t.kind {
		case tokenOpen:
			depth++
		case tokenClose:
			depth--
		case tokenEquals:
			if depth == 0 && len(lines) == 1 && line.equals < 0 {
				line.equals = len(line.text)
			}
		}
		switch {
		case t.kind == tokenString:
			line.text += "\"" + t.text + "\""
		case t.text == "**":
			line.text += "^"
		default:
			line.text += t.text
		}
		line.comment = t.comment
	}
	return lines
}

// spaceBetween tells whether a space stands before token i on its line.
func spaceBetween(tokens []token, i int) bool {
	a, b := &tokens[i-1], &tokens[i]
	switch {
	case a.kind == tokenOpen || b.kind == tokenClose || b.kind == tokenComma:
		return false
	case a.kind == tokenComma || a.kind == tokenEquals || b.kind == tokenEquals:
		return true
	case a.kind == tokenOperator:
		return isSum(a) && !isPrefix(tokens, i-1)
	case b.kind == tokenOperator:
		return isSum(b) || i == 1 || isPrefix(tokens, i)
	case b.is(tokenOpen, "("):
		// After the name of a function; otherwise it stands apart: fast (a, b, c), claim mean (x + y).
		return a.kind != tokenName || i == 1 || startsExpression(tokens, i)
	}
	return true
}

func isSum(t *token) bool { return t.text == "+" || t.text == "-" }

// isPrefix tells whether an operator is a sign before an operand.
func isPrefix(tokens []token, i int) bool {
	if startsExpression(tokens, i) {
		return true
	}
	k := tokens[i-1].kind
	return k == tokenOperator || k == tokenOpen || k == tokenComma || k == tokenEquals
}

// startsExpression tells whether an expression starts at token i right after a
// word: that is so in claim mean EXPR = EXPR only.
func startsExpression(tokens []token, i int) bool {
	return i == 2 && tokens[0].text == "claim" && tokens[1].text == "mean"
}

// alignEquals moves the = of neighbouring statements of a class to one column.
func alignEquals(lines []layoutLine) {
	for i := 0; i < len(lines); {
		j, width := i, 0
		for ; j < len(lines) && lines[j].class == lines[i].class && lines[j].equals >= 0; j++ {
			width = max(width, utf8.RuneCountInString(lines[j].text[:lines[j].equals]))
		}
		for k := i; k < j; k++ {
			l := &lines[k]
			left := l.text[:l.equals]
			l.text = left + strings.Repeat(" ", width-utf8.RuneCountInString(left)) + l.text[l.equals:]
		}
		i = max(j, i+1)
	}
}

// commentColumnMax bounds how far comments are moved to the right; longer lines
// have theirs two spaces behind.
const commentColumnMax = 72

// alignComments appends the comments of a block at a common column.
func alignComments(lines []layoutLine) {
	column := 0
	for i := range lines {
		if n := utf8.RuneCountInString(lines[i].text); lines[i].comment != "" && n <= commentColumnMax {
			column = max(column, n)
		}
	}
	for i := range lines {
		if l := &lines[i]; l.comment != "" {
			n := utf8.RuneCountInString(l.text)
			l.text += strings.Repeat(" ", max(column-n, 0)+2) + l.comment
		}
	}
}
