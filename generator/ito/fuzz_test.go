package ito

import (
	"errors"
	"os"
	"path/filepath"
	"testing"
	"time"

	"epslim/generator/ito/diagnostic"
)

// fuzzBudget is far above what any input may take; see the limits in lower.go.
const fuzzBudget = 20 * time.Second

// FuzzRead looks for crashes and hangs of the whole reader, for errors of
// unknown kinds or without a place, for models that change when they are laid
// out canonically, and for expressions that do not read as themselves when they
// are printed. Run it with
//
//	go test ./generator/ito -run '^$' -fuzz FuzzRead -parallel 1 -fuzzminimizetime 10x
func FuzzRead(f *testing.F) {
	for _, pattern := range []string{"testdata/models/*.ito", "testdata/errors/*.ito", "templates/*.ito"} {
		files, _ := filepath.Glob(pattern)
		for _, file := range files {
			text, err := os.ReadFile(file)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(string(text))
		}
	}
	known := map[diagnostic.Code]bool{}
	for _, k := range diagnostic.Kinds() {
		known[k.Code] = true
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) > 3000 {
			return
		}
		begin := time.Now()
		s, err := Parse("m", []byte(text), Options{})
		if d := time.Since(begin); d > fuzzBudget {
			t.Fatalf("took %v", d)
		}
		if err != nil {
			var errs ErrorList
			if !errors.As(err, &errs) || len(errs) == 0 || s != nil {
				t.Fatalf("not a list of errors: %v", err)
			}
			for _, d := range errs {
				if !known[d.Code] || d.Line < 1 || d.Column < 1 || d.Message == "" {
					t.Fatalf("%#v", d)
				}
				_ = d.Error()
			}
			return
		}
		laidOut, err := Format("m", []byte(text))
		if err != nil {
			t.Fatal(err)
		}
		again, err := Parse("m", laidOut, Options{})
		if err != nil {
			t.Fatalf("%s\nis laid out as\n%s\n%v", text, laidOut, err)
		}
		if a, b := dump(s), dump(again); a != b {
			t.Fatalf("%s\nis laid out as another system:\n%s\nand\n%s", text, a, b)
		}
		checkReadable(t, s, text)
	})
}

// FuzzOptions does the same for the texts of --set and --at options.
func FuzzOptions(f *testing.F) {
	for _, s := range []string{"k=1.5", "v(x, z)=1+x^2, k=2", "x=0.3,z=pi/4,k=1e-3", "x=1/0,z=", "v=(", "k=1\nx=2", "x=-1,z=2"} {
		f.Add(s)
	}
	const model = "slow x in [0, k] periodic\nslow z on halfline\nfast y on line\nparam k = 2 positive\nfunction v(x, z) positive\n" +
		"dx = v*y/eps dt\ndz = 0 dt\ndy = -k*y/eps^2 dt + 1/eps dW1\n"
	plain, err := Parse("m", []byte(model), Options{})
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) > 500 {
			return
		}
		isList := func(err error) {
			var errs ErrorList
			if err != nil && (!errors.As(err, &errs) || len(errs) == 0 || err.Error() == "") {
				t.Fatalf("%q: not a list of errors: %v", text, err)
			}
		}
		s, err := Parse("m", []byte(model), Options{Set: []string{text}})
		isList(err)
		if err == nil && s.Parameter("k").Value.Sign() <= 0 {
			t.Fatalf("%q sets k = %v", text, s.Parameter("k").Value)
		}
		p, err := plain.At(text)
		isList(err)
		if err == nil && (p.Slow[0].Float < -1e-9 || p.Slow[1].Float <= 0) {
			t.Fatalf("%q is a point outside the domain: %+v", text, p)
		}
	})
}
