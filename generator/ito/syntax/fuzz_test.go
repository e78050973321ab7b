package syntax

import (
	"os"
	"path/filepath"
	"testing"
)

// FuzzParse looks for crashes, for errors without a place in the text, and for
// files that change when they are formatted. Run it with
//
//	go test ./generator/ito/syntax -run '^$' -fuzz FuzzParse -parallel 1
func FuzzParse(f *testing.F) {
	files, _ := filepath.Glob("testdata/format/*.ito")
	for _, file := range files {
		src, err := os.ReadFile(file)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(src)
	}
	for _, s := range []string{
		"dx = sqrt(2*D)/eps*(b dW3 - c dW2) \\\n + (a\n# c\n) dt\n",
		"claim mean -(x)^2 = 1 # c\nclaim noise x 2=-1e-3",
		"title \"a # b\nslow x in [0, 1] periodic\nlet q = ((x\ndx = 1 dt",
		"fast (a,b,c) on sphere \\ # c\n# d\n\nlatex a = \"\\alpha\"",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, src []byte) {
		if len(src) > 4000 {
			return
		}
		file, errs := Parse("model", src, Limits{})
		for _, d := range errs {
			if d.Line < 1 || d.Column < 1 || d.Message == "" || d.Code == "" || d.Error() == "" {
				t.Fatalf("error without a place: %#v", d)
			}
		}
		if file == nil {
			return
		}
		for _, s := range file.Statements {
			if s.Bad() != (len(errs) > 0) && s.Bad() {
				t.Fatalf("a bad statement without an error: %q", s.Source())
			}
			if e, ok := s.(*Let); ok && e.Value != nil {
				checkPrinted(t, e.Value)
			}
		}
		checkFormat(t, src)
	})
}

// checkPrinted asserts that an expression reads as itself when it is printed.
func checkPrinted(t *testing.T, e Expr) {
	t.Helper()
	declared := false // a differential of a variable, which is a name of its own in the text below
	Walk(e, func(n Expr) bool {
		d, ok := n.(*Differential)
		declared = declared || ok && !isDifferentialWord(d.Name)
		return true
	})
	if declared {
		return
	}
	text := "let q = " + e.String()
	f, errs := Parse("model", []byte(text), Limits{})
	if len(errs) > 0 {
		for _, d := range errs {
			if d.Code == "nested-too-deep" || d.Code == "statement-too-long" || d.Code == "line-too-long" {
				return // printing may add brackets
			}
		}
		t.Fatalf("%s: %v", text, errs)
	}
	if again := f.Statements[0].(*Let).Value; !Same(e, again) {
		t.Fatalf("%s reads as %s", text, again)
	}
}
