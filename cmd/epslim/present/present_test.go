package present

import (
	"context"
	"encoding/xml"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/page"
	"epslim/generator/ito"
)

// examples are the derivations of the shipped models.
func examples(t *testing.T) map[string]*derivation.Result {
	t.Helper()
	files, err := filepath.Glob("../../../docs/examples/*.ito")
	if err != nil || len(files) == 0 {
		t.Fatalf("no examples: %v", err)
	}
	out := map[string]*derivation.Result{}
	for _, f := range files {
		src, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		sys, err := ito.Parse(f, src, ito.Options{})
		if err != nil {
			t.Fatal(err)
		}
		res, err := derivation.Run(context.Background(), sys, derivation.Options{})
		if err != nil {
			t.Fatalf("%s: %v", f, err)
		}
		out[filepath.Base(f)] = res
	}
	return out
}

// Every output of every example is well formed: lines of at most 100 columns,
// balanced TeX, MathML that parses, pages that pass the checks of package
// page; and the outputs are the same on a second rendering.
func TestExamplesWellFormed(t *testing.T) {
	for name, res := range examples(t) {
		text := string(Text(res, TextSettings{}))
		for i, l := range strings.Split(text, "\n") {
			if width(l) > 100 {
				t.Errorf("%s: line %d has %d columns: %s", name, i+1, width(l), l)
			}
			if strings.HasSuffix(l, " ") {
				t.Errorf("%s: line %d ends in a space", name, i+1)
			}
		}
		if strings.Contains(text, "\x1b") {
			t.Errorf("%s: colours without being asked", name)
		}
		if again := string(Text(res, TextSettings{})); again != text {
			t.Errorf("%s: a second rendering differs", name)
		}
		tex := string(LaTeX(res, Provenance{Version: "test"}, LatexSettings{}))
		if why := unbalanced(tex); why != "" {
			t.Errorf("%s: TeX: %s", name, why)
		}
		for i, l := range strings.Split(tex, "\n") {
			if strings.HasPrefix(l, "  ") && strings.Contains(l, "&") && !strings.Contains(l, `\text{`) {
				l = strings.NewReplacer("&", "", `\notag`, "", `\\`, "").Replace(l)
				if w := texWidth(l); w > 36 {
					t.Errorf("%s: TeX line %d is about %.1f em wide", name, i+1, w)
				}
			}
		}
		doc := page.Document{Title: name, Body: Tell(res).Page()}
		if _, err := doc.HTML(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if md := string(Markdown(res, Provenance{})); strings.Count(md, "$$")%2 != 0 {
			t.Errorf("%s: Markdown: odd number of $$", name)
		}
	}
}

// unbalanced tells what is wrong with the groups of a TeX text.
func unbalanced(s string) string {
	depth := 0
	for i := 0; i < len(s); i++ {
		switch {
		case s[i] == '\\':
			i++
		case s[i] == '{':
			depth++
		case s[i] == '}':
			if depth--; depth < 0 {
				return "a brace too many before " + s[max(0, i-60):i]
			}
		}
	}
	if depth != 0 {
		return "braces left open"
	}
	for _, e := range []string{"align", "subequations", "itemize", "tabular", "center"} {
		if a, b := strings.Count(s, `\begin{`+e+`}`), strings.Count(s, `\end{`+e+`}`); a != b {
			return "environment " + e + " not closed"
		}
	}
	if strings.Count(s, `\left`)-strings.Count(s, `\leftarrow`) != strings.Count(s, `\right`)-strings.Count(s, `\rightarrow`) {
		return "left and right brackets differ in number"
	}
	return ""
}

// Widths against those that pdflatex reports for Computer Modern at 10 pt
// (\settowidth of the displayed formula, divided by 10 pt).
func TestTexWidth(t *testing.T) {
	for _, c := range []struct {
		tex  string
		want float64
	}{
		{`c_{x} = \frac{s \, (\mathit{fric} \, \partial_{x} s - s \, \partial_{x} \mathit{fric})}{2 \mathit{fric}^{3}}`, 11.59},
		{`\mathrm{d}y = \sin(\theta) v\,\mathrm{d}t`, 6.5},
		{`A_{yy} = \frac{D v^{2}}{D^{2} + \mathit{om}^{2}}`, 7.6},
		{`J_{x} = ((2 D M_{3} + h M_{5} - h M_{6} - M_{7}) \, \partial_{x} h + h \, (2 D M_{2} + h M_{4}))\,p`, 27.0},
		{`p_{s} \propto \frac{1}{v}`, 3.6},
	} {
		if got := texWidth(c.tex); math.Abs(got-c.want) > 0.16*c.want {
			t.Errorf("%s: %.1f em, want %.1f", c.tex, got, c.want)
		}
	}
}

func TestBreakMath(t *testing.T) {
	for _, c := range []struct {
		in   string
		room int
		want string
	}{
		{"a + b", 10, "a + b"},
		{"aaaa + bbbb − cccc", 12, "aaaa + bbbb|− cccc"},
		{"x·(aaaa + bbbb)/c", 12, "x·(aaaa|+ bbbb)/c"},
		{"a + (bbbbbbbb + cccccccc)·d + e", 14, "a|+ (bbbbbbbb|+ cccccccc)·d|+ e"},
	} {
		if got := strings.Join(breakMath(c.in, c.room), "|"); got != c.want {
			t.Errorf("%q in %d: %q, want %q", c.in, c.room, got, c.want)
		}
	}
}

func TestEscapes(t *testing.T) {
	if got, want := texEscape(`50% of $x_1 & {y}^2 \ ~ #`), `50\% of \$x\_1 \& \{y\}\textasciicircum{}2 \textbackslash{} \textasciitilde{} \#`; got != want {
		t.Errorf("TeX: %s, want %s", got, want)
	}
	if got, want := texEscape("θ − 漢"), `$\theta$ $-$ (U+6F22)`; got != want {
		t.Errorf("TeX: %s, want %s", got, want)
	}
	if got, want := markdownEscape("a_b*<c>|$"), `a\_b\*\<c\>\|\$`; got != want {
		t.Errorf("Markdown: %s, want %s", got, want)
	}
}

// Every formula of the literals parses as XML.
func TestMathMLParses(t *testing.T) {
	n := &notation{}
	for _, f := range n.fragments() {
		d := xml.NewDecoder(strings.NewReader("<math>" + f.m.MathML + "</math>"))
		for {
			_, err := d.Token()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Errorf("%s: %v in %s", f.plain, err, f.m.MathML)
				break
			}
		}
	}
}
