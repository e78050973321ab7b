// Package diagnostic describes what can be wrong with a model file: where, of
// which kind, what was expected, and what was probably meant.
//
// It owns the table of error kinds ([Kinds]), the list type that carries all
// errors of a file at once ([List]), their printed form with a caret, and the
// search for a near name ([Nearest]). It knows nothing of the grammar and
// imports the standard library only.
package diagnostic

import (
	"fmt"
	"sort"
	"strings"
)

// Position is a place in a text. Line and Column start at 1; Column and Length
// count code points, not bytes. Length is at least 1 for a place that has an
// extent on its line, and 0 for the end of a line.
type Position struct {
	Line, Column, Length int
}

// Before tells whether p stands before q in the text.
func (p Position) Before(q Position) bool {
	if p.Line != q.Line {
		return p.Line < q.Line
	}
	return p.Column < q.Column
}

// Diagnostic is one error of a model file or of an option that is read in the
// same language. It implements error.
type Diagnostic struct {
	File string // name of the file, or the option such as "--set"
	Position
	Code     Code
	Message  string // what is wrong, naming the object
	Expected string // what would have been right here; may be empty
	Nearest  string // the declared name or word that was probably meant; may be empty
	Text     string // the line of text the position refers to
}

// Headline returns the error without the quoted line: file, line, column,
// message and code.
func (d *Diagnostic) Headline() string {
	return fmt.Sprintf("%s:%d:%d: %s [%s]", d.File, d.Line, d.Column, d.Message, d.Code)
}

// Summary returns message, expectation and suggestion as one line, without
// place and code.
func (d *Diagnostic) Summary() string {
	var b strings.Builder
	b.WriteString(d.Message)
	if d.Expected != "" {
		b.WriteString("; expected ")
		b.WriteString(d.Expected)
	}
	if d.Nearest != "" {
		fmt.Fprintf(&b, "; did you mean %q?", d.Nearest)
	}
	return b.String()
}

// Error returns the full form of the error: the headline, the line with a
// caret under the place, what was expected, and the near name.
func (d *Diagnostic) Error() string {
	var b strings.Builder
	b.WriteString(d.Headline())
	if line, caret := d.excerpt(); line != "" {
		fmt.Fprintf(&b, "\n    %s\n    %s", line, caret)
	}
	if d.Expected != "" {
		fmt.Fprintf(&b, "\n    expected %s", d.Expected)
	}
	if d.Nearest != "" {
		fmt.Fprintf(&b, "\n    did you mean %q?", d.Nearest)
	}
	return b.String()
}

// excerptWidth is the longest quoted line; longer ones are cut around the caret
// so that an error always fits a terminal.
const excerptWidth = 96

// excerpt returns the quoted line, cut to excerptWidth, and the caret line.
func (d *Diagnostic) excerpt() (line, caret string) {
	text := []rune(strings.TrimRight(d.Text, " \t\r\n"))
	for i, r := range text {
		if r < ' ' || r == 0x7f {
			text[i] = ' '
		}
	}
	at := min(max(d.Column-1, 0), len(text))
	length := max(d.Length, 1)
	if strings.TrimSpace(string(text)) == "" {
		return "", ""
	}
	cutLeft, cutRight := 0, len(text)
	if len(text) > excerptWidth {
		cutLeft = max(0, min(at-excerptWidth/3, len(text)-excerptWidth))
		cutRight = min(len(text), cutLeft+excerptWidth)
	}
	shown := string(text[cutLeft:cutRight])
	pad := at - cutLeft
	if cutLeft > 0 {
		shown = "… " + shown
		pad += 2
	}
	if cutRight < len(text) {
		shown += " …"
	}
	length = min(length, max(1, cutRight-at))
	return shown, strings.Repeat(" ", pad) + strings.Repeat("^", length)
}

// List is all errors that were found in one reading, in the order of their
// places. It implements error; a List is returned as an error only when it is
// not empty.
type List []*Diagnostic

// listShown bounds how many errors are printed; the rest is counted.
const listShown = 60

// Error returns all errors in full, one after the other.
func (l List) Error() string {
	if len(l) == 0 {
		return "no errors"
	}
	var b strings.Builder
	for i, d := range l {
		if i == listShown {
			fmt.Fprintf(&b, "\n... and %d more errors", len(l)-listShown)
			break
		}
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(d.Error())
	}
	return b.String()
}

// Unwrap lets errors.As and errors.Is look at each error of the list.
func (l List) Unwrap() []error {
	errs := make([]error, len(l))
	for i, d := range l {
		errs[i] = d
	}
	return errs
}

// origin tells texts apart: a file by its name, an option by what it says, since
// one option may be given several times.
func (d *Diagnostic) origin() string {
	if strings.HasPrefix(d.File, "--") {
		return d.File + " " + d.Text
	}
	return d.File
}

// Sort orders the list: files before options, each text by line and column.
// Options keep the order in which their errors were found. Repeated errors at
// one place are dropped.
func (l *List) Sort() {
	order := map[string]int{}
	for _, d := range *l {
		if _, ok := order[d.origin()]; !ok {
			order[d.origin()] = len(order)
		}
	}
	sort.SliceStable(*l, func(i, j int) bool {
		a, b := (*l)[i], (*l)[j]
		if x, y := strings.HasPrefix(a.File, "--"), strings.HasPrefix(b.File, "--"); x != y {
			return y
		}
		if a.origin() != b.origin() {
			return order[a.origin()] < order[b.origin()]
		}
		return a.Position.Before(b.Position)
	})
	out := (*l)[:0]
	for i, d := range *l {
		if i > 0 {
			p := out[len(out)-1]
			if p.File == d.File && p.Line == d.Line && p.Column == d.Column && p.Code == d.Code && p.Message == d.Message && p.Text == d.Text {
				continue
			}
		}
		out = append(out, d)
	}
	*l = out
}

// Err returns the list as an error, or nil when it is empty.
func (l List) Err() error {
	if len(l) == 0 {
		return nil
	}
	return l
}
