package page

import (
	"bytes"
	"encoding/xml"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"epslim/cmd/epslim/figure"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// generator is eps^{-2} L_0 + eps^{-1} L_1 in MathML.
func generatorFormula() Formula {
	power := func(k MathML) MathML { return Sup(Ident("ε"), k) }
	return Formula{Number: "1", ID: "eq-generator", Alt: "the generator, graded in epsilon",
		TeX: `\mathcal{L} = \varepsilon^{-2} \mathcal{L}_{0} + \varepsilon^{-1} \mathcal{L}_{1}`,
		MathML: Row(ScriptL(), Op("="), power(Number("-2")), Sub(ScriptL(), Number("0")), Op("+"),
			power(Number("-1")), Sub(ScriptL(), Number("1")))}
}

// hierarchy has three aligned rows, the last of them far wider than a phone.
func hierarchyFormula() Formula {
	term := func(k string) MathML { return Row(Sub(ScriptL(), Number(k)), Sub(Ident("u"), Number("0"))) }
	long := []MathML{Minus(), term("0")}
	for range 24 {
		long = append(long, Op("+"), Frac(Row(Partial(), Ident("v")), Row(Partial(), Ident("x"))), Apply(Upright("sin"), Ident("θ")))
	}
	return Formula{TeX: `\begin{aligned} ... \end{aligned}`, Number: "2", MathML: Rows("rl", [][]MathML{
		{term("0"), Row(Op("="), Number("0"))},
		{Row(term("0"), Op("+"), term("1")), Row(Op("="), Number("0"))},
		{term("2"), Row(append([]MathML{Op("=")}, long...)...)}})}
}

func exampleFigure(t testing.TB) []byte {
	t.Helper()
	xe := figure.UniformEdges(0, 1, 12)
	density := make([]float64, 144)
	for k := range density {
		density[k] = float64(k%12) + float64(k/12)
	}
	svg, err := figure.DensityMap(figure.DensityMapData{XLabel: "$x$", YLabel: "$y$", Quantity: "$p_s(x, y)$",
		XEdges: xe, YEdges: xe, Density: density}, figure.Settings{Alt: "The density grows towards the upper right corner."}).SVG()
	if err != nil {
		t.Fatal(err)
	}
	return svg
}

func exampleDocument(t testing.TB) *Document {
	sde := Math{Row(Differential(), Sub(Ident("X"), Ident("t")), Op("="), Ident("f"), Differential(), Ident("t"), Op("+"), Ident("σ"),
		Differential(), Sub(Ident("W"), Ident("t"))), `\mathrm{d}X_t = f\,\mathrm{d}t + \sigma\,\mathrm{d}W_t`}
	wide := []Cell{C("quantity")}
	row := []Cell{C("mean of x")}
	for range 12 {
		wide = append(wide, C("theory"))
		row = append(row, C("0.123456789"))
	}
	return &Document{
		Title: "Gel crawlers on a stiffness gradient", Subtitle: "The limit of fast headings", Contents: true,
		Meta: []Field{{"epslim:version", "0.1"}, {"epslim:command", `epslim report "<a> & b.ito"`}},
		Body: []Block{
			Section{Title: "The model", Body: []Block{
				P(Text("The walkers obey "), sde, Text(", with the parameter "), Code("D = 0.8"), Text(" and "), Emph("fast"), Text(" headings. See "),
					Link{"the generator", "#eq-generator"}, Text(".")),
				CodeBlock{Text: "title \"Gel crawler\"\nslow x in [0, 1] periodic\n\ndx = v*cos(theta)/eps dt   # " + strings.Repeat("a long comment ", 20) + "\n", Label: "model file"},
				Note{Kind: Warning, Title: "Condition", Body: []Block{P(Text("The limit needs "), Math{Row(Ident("D"), Op(">"), Number("0")), "D > 0"}, Text("."))}},
			}},
			Section{Title: "The expansion", Body: []Block{
				generatorFormula(), hierarchyFormula(),
				Section{Title: "The corrector", Body: []Block{P(Text("A long formula within a line: "),
					Math{Row(Ident("a"), Op("="), Sqrt(Frac(Number("1"), Ident("b"))), Op("+"), Sum("∫", Number("0"), Ident("T")), Apply(Ident("g"), Ident("s"), Ident("x")),
						Differential(), Ident("s"), Op("+"), Sum("∑", Ident("k"), ""), SubSup(Ident("c"), Ident("k"), Number("2")), Op("+"), Over(Ident("x"), "¯"), Op("+"),
						Matrix("[", [][]MathML{{Number("1"), Number("-1")}, {Ident("x"), Words("if any")}}, "]")), `a = \sqrt{\frac{1}{b}} + \int_0^T g(s,x)\,\mathrm{d}s + \sum_k c_k^2`}, Text("."))}},
			}},
			Section{Title: "Stationary density", Body: []Block{
				Figure{SVG: exampleFigure(t), Caption: []Inline{Text("The stationary density "), Math{Sub(Ident("p"), Ident("s")), "p_{s}"}, Text(".")}, ID: "fig-density"},
				Figure{SVG: exampleFigure(t), Alt: "The same again, smaller than \"<1>\".", Caption: []Inline{Text("Again.")}},
			}},
			Section{Title: "Checks", Body: []Block{
				Table{Caption: []Inline{Text("Theory and numbers.")}, Align: []Align{Left, Right, Centre}, Head: wide, Rows: [][]Cell{row, row}},
				List{Items: [][]Inline{{Text("one")}, {Text("two")}}}, List{Ordered: true, Items: [][]Inline{{Text("first")}}},
				Note{Kind: Good, Title: "All checks hold", Body: []Block{P(Text("Nothing is left to say."))}},
				Note{Body: []Block{P(Text("A remark without a title, with averylongwordthatdoesnotfit" + strings.Repeat("onanarrowscreen", 8)))}},
			}},
		},
	}
}

func TestGolden(t *testing.T) {
	got, err := exampleDocument(t).HTML()
	if err != nil {
		t.Fatal(err)
	}
	again, err := exampleDocument(t).HTML()
	if err != nil || !bytes.Equal(got, again) {
		t.Errorf("the second page differs from the first: %v", err)
	}
	// The drawing has its own golden files.
	for {
		i := bytes.Index(got, []byte("<svg"))
		j := bytes.Index(got, []byte("</svg>"))
		if i < 0 {
			break
		}
		got = append(append(append([]byte{}, got[:i]...), "[drawing]"...), got[j+len("</svg>"):]...)
	}
	path := filepath.Join("testdata", "example.html")
	if *update {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		g, w := strings.Split(string(got), "\n"), strings.Split(string(want), "\n")
		for k := range min(len(g), len(w)) {
			if g[k] != w[k] {
				t.Fatalf("line %d differs:\n got %.300s\nwant %.300s", k+1, g[k], w[k])
			}
		}
		t.Fatalf("%d lines, want %d", len(g), len(w))
	}
}

func TestEverythingIsEscaped(t *testing.T) {
	evil := `</title></code></annotation><script>alert(1)</script>" onload="x' & ]]>` + "\x00\x1b"
	d := &Document{Title: evil, Subtitle: evil, Lang: evil, Meta: []Field{{evil, evil}}, Contents: true, Body: []Block{
		Section{Title: evil, ID: evil, Body: []Block{
			P(Text(evil), Code(evil), Emph(evil), Strong(evil), Link{evil, "#" + evil}, Math{Row(Ident(evil), Op(evil), Number(evil), Words(evil), Upright(evil)), evil}),
			Formula{MathML: Ident(evil), TeX: evil, Number: evil, ID: evil, Alt: evil},
			CodeBlock{Text: evil, Label: evil},
			Table{Caption: []Inline{Text(evil)}, Head: []Cell{C(evil)}, Rows: [][]Cell{{C(evil)}}},
			Figure{SVG: []byte(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 1 1"></svg>`), Alt: evil, Caption: []Inline{Text(evil)}, ID: evil},
			List{Items: [][]Inline{{Text(evil)}}},
			Note{Title: evil, Body: []Block{P(Text(evil))}},
		}},
	}}
	html, err := d.HTML()
	if err != nil {
		t.Fatal(err)
	}
	s := string(html)
	if n := strings.Count(s, "<script"); n != 1 {
		t.Errorf("%d scripts, want only the page's own", n)
	}
	if strings.Contains(s, "alert(1)</script>") || strings.Contains(s, ` onload="x`) || strings.ContainsAny(s, "\x00\x1b") {
		t.Error("a text got out of its place")
	}
	for _, part := range strings.SplitAfter(s, "<main>")[1:] {
		body := part[:strings.Index(part, "</main>")]
		if err := xml.Unmarshal([]byte("<x>"+body+"</x>"), new(struct{})); err != nil {
			t.Errorf("the elements are not closed in order: %v", err)
		}
	}
}

func TestNoNetwork(t *testing.T) {
	html, err := exampleDocument(t).HTML()
	if err != nil {
		t.Fatal(err)
	}
	for _, bad := range []string{`src="http`, `href="http`, "url(http", "@import", "//cdn"} {
		if bytes.Contains(html, []byte(bad)) {
			t.Errorf("the page contains %q", bad)
		}
	}
	if len(html) > 100_000 {
		t.Errorf("the page weighs %d bytes", len(html))
	}
}

func TestNamedErrors(t *testing.T) {
	svg := func(inside, attrs string) []byte {
		return []byte(`<svg xmlns="http://www.w3.org/2000/svg" aria-label="a" viewBox="0 0 10 10"` + attrs + `>` + inside + `</svg>`)
	}
	deep := Block(Section{Title: "6"})
	for _, name := range []string{"5", "4", "3", "2", "1"} {
		deep = Section{Title: name, Body: []Block{deep}}
	}
	for _, c := range []struct {
		block Block
		want  string
	}{
		{Formula{TeX: "x", MathML: "<mi>x</mo>"}, "not well-formed"},
		{Formula{TeX: "x", MathML: "<mi>x"}, "not well-formed"},
		{Formula{TeX: "x", MathML: "</mrow></semantics></math><mrow>"}, "well-formed"},
		{Formula{TeX: "x"}, "the formula is empty"},
		{Formula{TeX: "x", MathML: "x"}, "outside of an element"},
		{Formula{TeX: "x", MathML: "<script>x</script>"}, "<script> does not belong in a formula"},
		{Formula{TeX: "x", MathML: `<mi onclick="x">x</mi>`}, "onclick does not belong"},
		{Formula{TeX: "x", MathML: `<mi href="x">x</mi>`}, "href does not belong"},
		{Formula{TeX: "x", MathML: `<mtext><![CDATA[<img>]]></mtext>`}, "CDATA"},
		{P(Math{"<mi>&nbsp;</mi>", "x"}), "not well-formed"},
		{P(Link{"a", "javascript:alert(1)"}), "neither with # nor with https://"},
		{Figure{SVG: []byte("<p>"), Alt: "a"}, "begins with <p>"},
		{Figure{SVG: svg("<script>1</script>", "")}, "<script> does not belong"},
		{Figure{SVG: svg("", ` onload="x"`)}, "could run a script"},
		{Figure{SVG: svg(`<image href="https://example.org/a.png"/>`, "")}, "would load something"},
		{Figure{SVG: svg(`<image xlink:href="a.png"/>`, "")}, "would load something"},
		{Figure{SVG: svg(`<path fill="url(https://example.org)"/>`, "")}, "would load something"},
		{Figure{SVG: []byte(`<svg viewBox="0 0 1 1"></svg>`)}, "no alternative text"},
		{Figure{SVG: []byte(`<svg aria-label="a"></svg>`)}, "no viewBox"},
		{Table{Head: []Cell{C("a"), C("b")}, Rows: [][]Cell{{C("1")}}}, "row 1 has 1 cells, the heading has 2"},
		{Section{}, "no title"},
		{deep, "five deep"},
	} {
		_, err := (&Document{Title: "t", Body: []Block{Section{Title: "here", Body: nil}, c.block}}).HTML()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
	}
	if _, err := (&Document{}).HTML(); err == nil {
		t.Error("a document without a title is accepted")
	}
}

func TestIdentifiersAreUnique(t *testing.T) {
	d := &Document{Title: "t", Contents: true, Body: []Block{
		Section{Title: "A", Body: []Block{Section{Title: "A"}, Note{Body: []Block{Section{Title: "A"}}}}},
		Section{Title: "A!"}, Section{Title: "a-2"}, Section{Title: "日本"}, Section{Title: "?"},
		Formula{MathML: Ident("x"), ID: "a"}}}
	html, err := d.HTML()
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, part := range strings.Split(string(html), ` id="`)[1:] {
		id := part[:strings.IndexByte(part, '"')]
		if seen[id] {
			t.Errorf("the identifier %q occurs twice", id)
		}
		seen[id] = true
	}
	nav := string(html[bytes.Index(html, []byte("<nav")):bytes.Index(html, []byte("</nav>"))])
	links := strings.Split(nav, `href="#`)[1:]
	if len(links) != 5 {
		t.Errorf("%d entries in the contents, want the 5 sections of the first level", len(links))
	}
	for _, l := range links {
		if id := l[:strings.IndexByte(l, '"')]; !seen[id] {
			t.Errorf("the contents link to %q, which is nowhere", id)
		}
	}
}

func TestMathML(t *testing.T) {
	for _, c := range []struct {
		got  MathML
		want string
	}{
		{Number("-2"), `<mrow><mo form="prefix">−</mo><mn>2</mn></mrow>`},
		{Op("-"), `<mo>−</mo>`},
		{Partial(), `<mi>∂</mi>`},
		{ScriptL(), `<mi>ℒ</mi>`},
		{Upright("d"), `<mi mathvariant="normal">d</mi>`},
		{Frac(Number("1"), Ident("x")), `<mfrac><mrow><mn>1</mn></mrow><mrow><mi>x</mi></mrow></mfrac>`},
		{Fenced("(", Ident("x"), ")"), `<mrow><mo form="prefix" fence="true" stretchy="false">(</mo><mi>x</mi><mo form="postfix" fence="true" stretchy="false">)</mo></mrow>`},
		{Fenced("[", Frac(Ident("x"), Number("2")), "]"), `<mrow><mo form="prefix" fence="true" stretchy="true">[</mo><mfrac><mrow><mi>x</mi></mrow><mrow><mn>2</mn></mrow></mfrac><mo form="postfix" fence="true" stretchy="true">]</mo></mrow>`},
		{Ident("<"), `<mi>&lt;</mi>`},
		{Rows("rl", [][]MathML{{Ident("a"), Ident("b")}}), `<mtable class="rows" displaystyle="true"><mtr><mtd class="right"><mi>a</mi></mtd><mtd class="left"><mi>b</mi></mtd></mtr></mtable>`},
	} {
		if string(c.got) != c.want {
			t.Errorf("got %s, want %s", c.got, c.want)
		}
		if err := checkMathML(c.got); err != nil {
			t.Errorf("%s: %v", c.got, err)
		}
	}
}

func BenchmarkHTML(b *testing.B) {
	d := exampleDocument(b)
	for b.Loop() {
		if _, err := d.HTML(); err != nil {
			b.Fatal(err)
		}
	}
}
