package ito

import (
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"epslim/generator/ito/diagnostic"
)

var update = flag.Bool("update", false, "rewrite the expected errors in testdata/errors from what is reported")

// The models in testdata/errors carry the errors they have as comments: under
// the offending line, carets that mark the place and its length, the code, and
// the text in full. An error that stands on no such place is written with its
// line and column at the end of the file, and so are those of options, which are
// given in lines that start with "#set ".
//
//	dx = v*cos(thta)/eps dt
//	#          ^^^^ undeclared-name: the name "thta" is not declared; did you mean "theta"?
const (
	markPlace  = "#@ "
	markOption = "#set "
)

func isMark(line string) bool {
	rest := strings.TrimLeft(strings.TrimPrefix(line, "#"), " ")
	return strings.HasPrefix(line, "#") && strings.HasPrefix(rest, "^") || strings.HasPrefix(line, markPlace)
}

// unmark removes the expected errors from a model, and returns the options in it.
func unmark(text string) (model string, set []string) {
	var lines []string
	for _, line := range strings.Split(text, "\n") {
		if strings.HasPrefix(line, markOption) {
			set = append(set, strings.TrimPrefix(line, markOption))
		}
		if !isMark(line) {
			lines = append(lines, line)
		}
	}
	return strings.Join(lines, "\n"), set
}

// mark writes errors into a model.
func mark(model string, errs ErrorList) string {
	under := map[int][]string{}
	lines := strings.Split(model, "\n")
	var rest []string
	for _, d := range errs {
		text := fmt.Sprintf("%s: %s", d.Code, d.Summary())
		if strings.HasPrefix(d.File, "--") || d.Column < 2 || d.Length == 0 || d.Line >= len(lines) {
			rest = append(rest, fmt.Sprintf("%s%s:%d:%d+%d %s", markPlace, d.File, d.Line, d.Column, d.Length, text))
			continue
		}
		under[d.Line] = append(under[d.Line], "#"+strings.Repeat(" ", d.Column-2)+strings.Repeat("^", d.Length)+" "+text)
	}
	var out []string
	for i, line := range lines {
		out = append(out, line)
		out = append(out, under[i+1]...)
	}
	text := strings.Join(out, "\n")
	for _, r := range rest {
		text += r + "\n"
	}
	return text
}

func TestErrors(t *testing.T) {
	files, err := filepath.Glob("testdata/errors/*.ito")
	if err != nil || len(files) < 5 {
		t.Fatal(files, err)
	}
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		model, set := unmark(string(text))
		_, err = Parse("m", []byte(model), Options{Set: set})
		errs, ok := err.(ErrorList)
		if !ok {
			t.Errorf("%s: no errors (%v)", file, err)
			continue
		}
		got := mark(model, errs)
		if *update {
			if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
			continue
		}
		if got != string(text) {
			t.Errorf("%s: reported errors differ:\n%s", file, differences(string(text), got))
		}
	}
}

// differences lists the lines of two texts that the other lacks.
func differences(want, got string) string {
	var b strings.Builder
	list := func(sign, text, other string) {
		have := map[string]bool{}
		for _, line := range strings.Split(other, "\n") {
			have[line] = true
		}
		for _, line := range strings.Split(text, "\n") {
			if !have[line] {
				fmt.Fprintln(&b, sign, line)
			}
		}
	}
	list("want", want, got)
	list("got ", got, want)
	return b.String()
}

// base is the model that the examples of the table of errors are added to.
const base = "slow x on line\nfast y on line\nparam k = 2 positive\n" +
	"dx = y/eps dt\ndy = -k*y/eps^2 dt + 1/eps dW1\n"

// TestKinds checks that each example of the table of errors has the error it is
// an example of, and no other.
func TestKinds(t *testing.T) {
	for _, k := range diagnostic.Kinds() {
		var err error
		switch k.Where {
		case diagnostic.InModel:
			_, err = Parse("m", []byte(base+k.Example), Options{})
		case diagnostic.WholeModel:
			_, err = Parse("m", []byte(k.Example), Options{})
		case diagnostic.SetOption:
			_, err = Parse("m", []byte(base), Options{Set: []string{k.Example}})
		case diagnostic.AtOption:
			s := mustParse(t, base)
			_, err = s.At(k.Example)
		case diagnostic.AskNumbers:
			s := mustParse(t, base+k.Example)
			err = s.NeedNumbers(nil, s.Parameters[len(s.Parameters)-1].Expr)
		case diagnostic.OverLimit:
			continue // see TestLimits of package syntax
		}
		errs, _ := err.(ErrorList)
		if len(errs) != 1 || errs[0].Code != k.Code {
			t.Errorf("%s: the example %q gives\n%v", k.Code, k.Example, err)
		}
	}
}

// TestEveryKindIsShown checks that the models in testdata/errors and the table
// together leave no kind of error untested.
func TestEveryKindIsShown(t *testing.T) {
	files, _ := filepath.Glob("testdata/errors/*.ito")
	all := ""
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		all += string(text)
	}
	for _, k := range diagnostic.Kinds() {
		switch k.Where {
		case diagnostic.OverLimit, diagnostic.AtOption, diagnostic.AskNumbers:
			continue
		}
		if k.Code == diagnostic.NotUTF8 || k.Code == diagnostic.Empty {
			continue // not to be had in a file with expected errors; see TestKinds
		}
		if !strings.Contains(all, " "+string(k.Code)+": ") {
			t.Errorf("no model in testdata/errors shows %s", k.Code)
		}
	}
}

func mustParse(t testing.TB, text string, set ...string) *System {
	t.Helper()
	s, err := Parse("m", []byte(text), Options{Set: set})
	if err != nil {
		t.Fatalf("%s\n%v", text, err)
	}
	return s
}
