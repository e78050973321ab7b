package validation

import (
	"bytes"
	"flag"
	"fmt"
	"os"
	"strings"
	"sync"
	"testing"
)

var update = flag.Bool("update", false, "write docs/validation.md anew")

const tableFile = "../validation.md"

// row is one line of the table of checks.
type row struct{ quantity, expected, obtained, agreement string }

func code(s string) string {
	if s == "" {
		return ""
	}
	return "`" + s + "`"
}

const tableHead = `# Checks against values from outside the program

This page is written by ` + "`go test ./docs/validation -update`" + ` and verified by
` + "`go test ./docs/validation`" + `, which runs the program again; do not edit it by hand.

* **Expected** is the value of the source, typed as the source has it (where it gives a diffusivity
  D_eff, as ` + "`2*(D_eff)`" + `, since A = sigma sigma^T). **Obtained** is the formula that the program prints;
  it is empty where the program has a number but no formula.
* **proven**: the two are equal by exact algebra. **agrees**: equal in extended precision at random points, or
  within the tolerance that is stated. **refuted** would be a disagreement.
* "From memory" marks a source that was not at hand when the check was written.

`

// table is the whole page.
func table(cases []*refCase, outcomes map[string]*outcome, pub map[string][]row) []byte {
	var b bytes.Buffer
	b.WriteString(tableHead)
	b.WriteString("## Published results\n")
	for _, p := range publishedResults {
		fmt.Fprintf(&b, "\n### %s\n\nSource: %s.\n\n", p.title, p.source)
		writeRows(&b, pub[p.title])
	}
	b.WriteString("\n## Reference cases\n\n")
	b.WriteString("Models with limits that were derived by hand or taken from the literature, and computed a second time\n" +
		"from the model text by an independent Galerkin program in another language. The files are in\n" +
		"`docs/validation/cases` and `generator/ito/testdata/models`.\n")
	for _, c := range cases {
		o := outcomes[c.ID]
		fmt.Fprintf(&b, "\n### %s: %s\n\nSource: %s.\n\n", c.ID, o.title, strings.TrimSuffix(c.Source, "."))
		writeRows(&b, o.rows)
	}
	writeOpen(&b)
	return b.Bytes()
}

func writeRows(b *bytes.Buffer, rows []row) {
	if len(rows) == 0 {
		b.WriteString("Not covered, see the end of the page.\n")
		return
	}
	b.WriteString("| quantity | expected | obtained | agreement |\n| --- | --- | --- | --- |\n")
	for _, r := range rows {
		fmt.Fprintf(b, "| %s | %s | %s | %s |\n", r.quantity, r.expected, r.obtained, r.agreement)
	}
}

func writeOpen(b *bytes.Buffer) {
	b.WriteString("\n## Not covered\n\n")
	if len(notCovered)+len(openPublished) == 0 {
		b.WriteString("Every check above agrees.\n")
		return
	}
	for _, k := range keys(notCovered) {
		fmt.Fprintf(b, "* %s: %s.\n", k, notCovered[k])
	}
	for _, k := range keys(openPublished) {
		fmt.Fprintf(b, "* %s: %s.\n", k, openPublished[k])
	}
}

// all is what the tests of this package share: every case and every published
// result is run once.
var all struct {
	once     sync.Once
	err      error
	cases    []*refCase
	outcomes map[string]*outcome
	pub      map[string][]row
}

// runAll runs everything once, two at a time.
func runAll(t *testing.T) {
	t.Helper()
	all.once.Do(func() {
		all.outcomes, all.pub = map[string]*outcome{}, map[string][]row{}
		if all.cases, all.err = loadCases(); all.err != nil {
			return
		}
		var wait sync.WaitGroup
		var lock sync.Mutex
		slots := make(chan struct{}, 2)
		do := func(f func()) {
			slots <- struct{}{}
			wait.Go(func() {
				defer func() { <-slots }()
				f()
			})
		}
		for _, c := range all.cases {
			do(func() {
				o := c.check()
				lock.Lock()
				defer lock.Unlock()
				all.outcomes[c.ID] = o
			})
		}
		for i := range publishedResults {
			p := &publishedResults[i]
			do(func() {
				rows := p.run()
				lock.Lock()
				defer lock.Unlock()
				all.pub[p.title] = rows
			})
		}
		wait.Wait()
	})
	if all.err != nil {
		t.Fatal(all.err)
	}
}

// TestTable compares docs/validation.md with what the program finds.
func TestTable(t *testing.T) {
	runAll(t)
	got := table(all.cases, all.outcomes, all.pub)
	if *update {
		if err := os.WriteFile(tableFile, got, 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(tableFile)
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Equal(got, want) {
		return
	}
	g, w := strings.Split(string(got), "\n"), strings.Split(string(want), "\n")
	for i := range g {
		if i >= len(w) || g[i] != w[i] {
			t.Fatalf("docs/validation.md is out of date from line %d on; write it anew with\n\tgo test ./docs/validation -update\nthe program finds: %s", i+1, g[i])
		}
	}
	t.Fatal("docs/validation.md has lines too many; write it anew with go test ./docs/validation -update")
}
