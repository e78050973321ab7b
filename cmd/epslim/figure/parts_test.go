package figure

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

func labels(t []tick) string {
	var out []string
	for _, k := range t {
		if k.label != nil {
			out = append(out, plainText(k.label))
		}
	}
	return strings.Join(out, " ")
}

func TestTicks(t *testing.T) {
	few := func(n int) func([]tick) bool { return func(t []tick) bool { return len(t) <= n } }
	for _, c := range []struct {
		ax     Axis
		lo, hi float64
		most   int
		labels string
		factor string
	}{
		{Axis{}, 0, 1, 6, "0.0 0.2 0.4 0.6 0.8 1.0", ""},
		{Axis{}, 0, 1, 4, "0.0 0.5 1.0", ""},
		{Axis{}, -3.2, 7, 6, "−2 0 2 4 6", ""},
		{Axis{}, 0.1234, 0.1241, 8, "0.1234 0.1235 0.1236 0.1237 0.1238 0.1239 0.1240 0.1241", ""},
		{Axis{}, 0, 3e6, 4, "0 1 2 3", "×10^6"},
		{Axis{}, -2e-7, 2e-7, 5, "−2 −1 0 1 2", "×10^−7"},
		{Axis{}, 0, 9.9e-3, 6, "0 2 4 6 8", "×10^−3"},
		{Axis{Pi: true}, 0, 2 * math.Pi, 5, "0 π/2 π 3π/2 2π", ""},
		{Axis{Pi: true}, -math.Pi, math.Pi, 3, "−π 0 π", ""},
		{Axis{Log: true}, 1e-4, 1, 9, "10^−4 10^−3 10^−2 10^−1 10^0", ""},
		{Axis{Log: true}, 0.04, 0.45, 9, "0.05 0.1 0.2", ""},
		{Axis{Log: true}, 1e-30, 1, 7, "10^−30 10^−25 10^−20 10^−15 10^−10 10^−5 10^0", ""},
		{Axis{Log: true, Ticks: []float64{16, 32, 64}}, 12, 80, 9, "16 32 64", ""},
		{Axis{Ticks: []float64{16, 32, 64}}, 0, 100, 2, "0 100", ""},
	} {
		a := axis{Axis: c.ax, lo: c.lo, hi: c.hi}
		got, factor := ticks(&a, few(c.most))
		if c.ax.Log && c.ax.Ticks == nil { // unlabelled ticks do not count
			got, factor = ticks(&a, func(t []tick) bool { return strings.Count(labels(t), " ") < c.most })
		}
		if labels(got) != c.labels || plainText(factor) != c.factor {
			t.Errorf("ticks of [%v, %v]: %q factor %q, want %q factor %q", c.lo, c.hi, labels(got), plainText(factor), c.labels, c.factor)
		}
	}
}

// TestLabelsDoNotOverlap draws many ranges and checks the labels of both axes against each other.
func TestLabelsDoNotOverlap(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for k := range 300 {
		lo := r.NormFloat64() * math.Pow(10, float64(r.IntN(14)-7))
		hi := lo + math.Abs(lo)*math.Pow(10, r.Float64()*6-4) + 1e-12
		log := r.IntN(3) == 0
		if log {
			lo = math.Abs(lo) + 1e-9
			hi = lo * math.Pow(10, r.Float64()*12+0.05)
		}
		p := &Plot{Settings: Settings{Width: Width(k % 2)}, X: Axis{Label: "$x$", Log: log, Min: lo, Max: hi},
			Y: Axis{Label: "$y$", Log: log, Min: lo, Max: hi}}
		d, err := p.prepare()
		if err != nil {
			t.Fatalf("[%v, %v]: %v", lo, hi, err)
		}
		checkAxisLabels(t, d, &d.ax, func(tk tick) float64 { return d.s.face.width(tk.label, tickSize)/2 + 1 }, d.s.width)
		checkAxisLabels(t, d, &d.ay, func(tick) float64 { return tickSize * capHeight / 2 }, d.s.height)
		if l := d.ax.from - tickLength - tickGap - d.labelWidth(&d.ay) - labelSize; l < 0 {
			t.Errorf("[%v, %v]: the labels of the y axis reach %v beyond the left side", lo, hi, -l)
		}
	}
}

func checkAxisLabels(t *testing.T, d *drawing, a *axis, half func(tick) float64, size float64) {
	t.Helper()
	n := 0
	type span struct{ from, to float64 }
	var spans []span
	for _, k := range a.ticks {
		if k.value < a.lo-1e-9*math.Abs(a.lo) || k.value > a.hi+1e-9*math.Abs(a.hi) {
			t.Errorf("[%v, %v]: a tick at %v", a.lo, a.hi, k.value)
		}
		if k.label == nil {
			continue
		}
		n++
		s := span{a.at(k.value) - half(k), a.at(k.value) + half(k)}
		for _, o := range spans {
			if s.from < o.to && s.to > o.from {
				t.Errorf("[%v, %v]: labels overlap: %s", a.lo, a.hi, labels(a.ticks))
			}
		}
		if s.from < 0 || s.to > size {
			t.Errorf("[%v, %v]: the label %s leaves the figure", a.lo, a.hi, plainText(k.label))
		}
		spans = append(spans, s)
	}
	if n < 2 {
		t.Errorf("[%v, %v] log=%v: labels %q, want at least two", a.lo, a.hi, a.Log, labels(a.ticks))
	}
}

func TestNamedErrors(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	heat := func(change func(*HeatMap)) *Plot {
		h := &HeatMap{XEdges: []float64{0, 1, 2}, YEdges: []float64{0, 1}, Values: []float64{1, 2}}
		change(h)
		return &Plot{Heat: h}
	}
	for _, c := range []struct {
		plot *Plot
		want string
	}{
		{&Plot{Series: []Series{{Label: "grid", X: []float64{0, 1}, Y: []float64{1, nan}}}}, `series "grid" y[1]: the value is NaN`},
		{&Plot{Series: []Series{{Label: "grid", X: []float64{inf}, Y: []float64{1}}}}, `series "grid" x[0]: the value is +Inf`},
		{&Plot{Series: []Series{{Label: "grid", X: []float64{1}}}}, "has 1 x values and 0 y values"},
		{&Plot{Series: []Series{{X: []float64{1}, Y: []float64{1}, Low: []float64{0}}}}, "high: has 0 values, want 1"},
		{&Plot{Series: []Series{{X: []float64{1}, Y: []float64{1}, Low: []float64{2}, High: []float64{1}}}}, "lower limit 2 exceeds"},
		{&Plot{Y: Axis{Log: true}, Series: []Series{{X: []float64{1}, Y: []float64{0}}}}, "y[0]: 0 has no logarithm"},
		{&Plot{X: Axis{Min: 2, Max: 1}}, "x axis: [2, 1] is not a range"},
		{&Plot{X: Axis{Min: nan, Max: 1}}, "x axis range[0]: the value is NaN"},
		{&Plot{Series: []Series{{X: []float64{-1.7e308, 1.7e308}, Y: []float64{0, 1}}}}, "is not a range"},
		{&Plot{Slopes: []Slope{{Order: 2}}}, "two logarithmic axes"},
		{&Plot{X: Axis{Periodic: true}}, "periodic axis"},
		{&Plot{X: Axis{Label: "$x"}}, `label "$x"`},
		{heat(func(h *HeatMap) { h.Values[1] = nan }), "heat map values[1]: the value is NaN"},
		{heat(func(h *HeatMap) { h.Values = h.Values[:1] }), "heat map values: has 1 values, want 2"},
		{heat(func(h *HeatMap) { h.XEdges[1] = 0 }), "heat map x edges[1]: 0 does not exceed"},
		{heat(func(h *HeatMap) { h.YEdges = nil }), "heat map y edges: has 0 values"},
		{heat(func(h *HeatMap) { h.Log, h.Values[0] = true, 0 }), "heat map values[0]: 0 has no logarithm"},
		{heat(func(h *HeatMap) { h.Map, h.Max = Diverging, 1 }), "centred at zero"},
		{&Plot{Field: &VectorField{X: []float64{0, 1}, Y: []float64{0, 1}, U: make([]float64, 4), V: make([]float64, 3)}}, "field v: has 3 values, want 4"},
		{&Plot{Histograms: []Histogram{{Label: "h", Edges: []float64{0, 1}, Counts: []float64{-1}}}}, `histogram "h" counts[0]: -1 is not a count`},
		{&Plot{Settings: Settings{Height: 0.5}}, "no room for the axes"},
		{&Plot{Settings: Settings{Height: -1}}, "not a height"},
		{&Plot{Settings: Settings{DPI: 1e6}}, "dots an inch"},
	} {
		_, err := c.plot.SVG()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
		var de *DataError
		var le *LabelError
		if !errors.As(err, &de) && !errors.As(err, &le) {
			t.Errorf("%v is not one of the package's errors", err)
		}
	}
}

func TestExtremeButValidData(t *testing.T) {
	for _, y := range [][]float64{{0, 0}, {5, 5}, {-3e300, 1e300}, {1e-200, 3e-200}, {1, 1 + 1e-9}, {0, 5e-324}} {
		p := &Plot{Series: []Series{{X: []float64{0, 1}, Y: y}}}
		svg, err := p.SVG()
		if err != nil {
			var de *DataError
			if !errors.As(err, &de) {
				t.Errorf("%v: %v", y, err)
			}
			continue
		}
		if s := string(svg); strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
			t.Errorf("%v: the figure has a coordinate that is not finite", y)
		}
	}
}

func TestColourTables(t *testing.T) {
	for _, m := range []ColourMap{Viridis, Cividis, Diverging} {
		tab := m.table()
		if n := len(tab); n != 256 && !(m == Diverging && n == 255) {
			t.Fatalf("map %d has %d entries", m, n)
		}
	}
	// First, middle and last entries as published with matplotlib (from memory: #440154, #21918c, #fde725, and
	// #00224e, #fee838 for cividis).
	for _, c := range []struct {
		m    ColourMap
		i    int
		want string
	}{{Viridis, 0, "440154"}, {Viridis, 128, "21918c"}, {Viridis, 255, "fde725"}, {Cividis, 0, "00224e"}, {Cividis, 255, "fee838"}} {
		k := c.m.table()[c.i]
		if got := fmt.Sprintf("%02x%02x%02x", k.R, k.G, k.B); got != c.want {
			t.Errorf("entry %d of map %d is %s, want %s", c.i, c.m, got, c.want)
		}
	}
	for _, m := range []ColourMap{Viridis, Cividis} {
		last := -1.0
		for i, k := range m.table() {
			l, _, _ := lab(k.R, k.G, k.B)
			if l < last-0.35 { // rounding to bytes
				t.Errorf("map %d: lightness falls at entry %d", m, i)
			}
			last = math.Max(last, l)
		}
	}
	d := Diverging.table()
	for i := range 127 {
		a, _, _ := lab(d[i].R, d[i].G, d[i].B)
		b, _, _ := lab(d[254-i].R, d[254-i].G, d[254-i].B)
		want := 97 - (97-35)*float64(127-i)/127
		if math.Abs(a-want) > 0.6 || math.Abs(b-want) > 0.6 {
			t.Errorf("entry %d of the diverging map has lightness %v and %v, want %v", i, a, b, want)
		}
	}
	if l, a, b := lab(d[127].R, d[127].G, d[127].B); l < 96 || math.Hypot(a, b) > 0.5 {
		t.Errorf("the centre of the diverging map is (%v, %v, %v), want near white", l, a, b)
	}
}

// lab converts sRGB to CIELAB for the white point D65 (IEC 61966-2-1; CIE 15).
func lab(r, g, b uint8) (l, aa, bb float64) {
	lin := func(v uint8) float64 {
		c := float64(v) / 255
		if c <= 0.04045 {
			return c / 12.92
		}
		return math.Pow((c+0.055)/1.055, 2.4)
	}
	f := func(t float64) float64 {
		if t > 216./24389 {
			return math.Cbrt(t)
		}
		return (24389./27*t + 16) / 116
	}
	x := f((0.4124564*lin(r) + 0.3575761*lin(g) + 0.1804375*lin(b)) / 0.95047)
	y := f(0.2126729*lin(r) + 0.7151522*lin(g) + 0.0721750*lin(b))
	z := f((0.0193339*lin(r) + 0.1191920*lin(g) + 0.9503041*lin(b)) / 1.08883)
	return 116*y - 16, 500 * (x - y), 200 * (y - z)
}

func TestDifferenceIsWhiteAtZero(t *testing.T) {
	xe := UniformEdges(0, 1, 3)
	p := DifferenceMap(DensityMapData{XEdges: xe, YEdges: xe, Density: []float64{0, 0, 0, -0.2, 0, 0.1, 0, 0, 0}}, Settings{})
	d, err := p.prepare()
	if err != nil {
		t.Fatal(err)
	}
	img := d.cells()
	if img.Pix[0] != 127 || img.Pix[3] != 0 || img.Pix[5] <= 127 || d.scale.max != 0.2 {
		t.Errorf("entries %v in the range ±%v: zero is not in the middle", img.Pix, d.scale.max)
	}
}

func TestArrowsPointAlongTheField(t *testing.T) {
	for _, turn := range []float64{1, -1} {
		m := gaussMap(30)
		m.Current = rotation(m.XEdges, m.YEdges, Arrows)
		for k := range m.Current.U {
			m.Current.U[k] *= turn
			m.Current.V[k] *= turn
		}
		d, err := DensityMap(m, Settings{}).prepare()
		if err != nil {
			t.Fatal(err)
		}
		f := d.screenField()
		tails, tips := d.arrows(&f)
		if len(tails) < 40 {
			t.Fatalf("only %d arrows", len(tails))
		}
		for i := range tails {
			a, b := tails[i], tips[i]
			x, y := d.ax.back((a.x+b.x)/2), d.ay.back((a.y+b.y)/2)
			u, v := d.ax.back(b.x)-d.ax.back(a.x), d.ay.back(b.y)-d.ay.back(a.y)
			if cos := turn * (-y*u + x*v) / math.Hypot(x, y) / math.Hypot(u, v); cos < 0.99 {
				t.Errorf("the arrow at (%.2f, %.2f) makes an angle of cosine %.3f with the field", x, y, cos)
			}
		}
	}
}

func TestStreamlinesOfARotationAreCircles(t *testing.T) {
	m := gaussMap(60)
	m.Current = rotation(m.XEdges, m.YEdges, Streamlines)
	d, err := DensityMap(m, Settings{}).prepare()
	if err != nil {
		t.Fatal(err)
	}
	f := d.screenField()
	lines := d.streamlines(&f)
	if len(lines) < 6 {
		t.Fatalf("only %d lines", len(lines))
	}
	for _, l := range lines {
		lo, hi := math.Inf(1), 0.0
		for _, p := range l {
			r := math.Hypot(d.ax.back(p.x), d.ay.back(p.y))
			lo, hi = math.Min(lo, r), math.Max(hi, r)
		}
		if hi-lo > 0.03 {
			t.Errorf("a line goes from radius %.3f to %.3f", lo, hi)
		}
	}
}

// TestPeriodicPathKeepsItsLength cuts a path at the sides of a periodic box; no part may be lost.
func TestPeriodicPathKeepsItsLength(t *testing.T) {
	xe := UniformEdges(0, 1, 4)
	w := walk(400, 0.5, 0.5, 0.05, 9)
	p := DensityMap(DensityMapData{XEdges: xe, YEdges: xe, X: Axis{Periodic: true}, Y: Axis{Periodic: true},
		Density: make([]float64, 16), Paths: []Path{w}}, Settings{})
	d, err := p.prepare()
	if err != nil {
		t.Fatal(err)
	}
	var want, got float64
	for i := 1; i < len(w.X); i++ {
		want += math.Hypot((w.X[i]-w.X[i-1])*d.box.width(), (w.Y[i]-w.Y[i-1])*d.box.height())
	}
	for _, l := range d.pathLines(&w) {
		got += length(l)
	}
	if math.Abs(got-want) > 2e-3*want { // corners below the resolution are dropped
		t.Errorf("the drawn path has length %v, want %v", got, want)
	}
}

func TestHistogramIsADensity(t *testing.T) {
	h := Histogram{Edges: []float64{0, 1, 3, 4}, Counts: []float64{2, 4, 2}}
	y, e := h.density()
	sum := y[0]*1 + y[1]*2 + y[2]*1
	if math.Abs(sum-1) > 1e-15 || math.Abs(y[1]-0.25) > 1e-15 {
		t.Errorf("heights %v, area %v", y, sum)
	}
	// Binomial variance n q (1-q) with n = 8, q = 1/2, over (n w)^2 = 256.
	if want := math.Sqrt(8*0.5*0.5) / 16; math.Abs(e[1]-want) > 1e-15 {
		t.Errorf("standard error %v, want %v", e[1], want)
	}
	empty := Histogram{Edges: []float64{0, 1}, Counts: []float64{0}}
	if y, e := empty.density(); y[0] != 0 || e[0] != 0 {
		t.Errorf("an empty histogram has heights %v and errors %v", y, e)
	}
}

func TestStrokesTurnTheSameWay(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	line := make([]point, 30)
	for i := range line {
		line[i] = point{r.Float64() * 100, r.Float64() * 100}
	}
	for _, dash := range [][]float64{nil, {5, 2}} {
		for _, p := range strokePolygons([][]point{line}, true, 2, dash) {
			area := 0.0
			for i := range p {
				area += p[i].cross(p[(i+1)%len(p)]) / 2
			}
			if area <= 0 {
				t.Fatalf("a part of a stroke has area %v", area)
			}
		}
	}
	total := 0.0
	for _, d := range dashes([]point{{0, 0}, {10, 0}, {10, 11}}, []float64{5, 2}) {
		total += length(d)
	}
	if total != 15 { // 21 = 3*(5+2)
		t.Errorf("dashes carry %v of ink, want 15", total)
	}
}

func TestMetadataTravels(t *testing.T) {
	p := lineExample()
	files, err := p.Files("f")
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range files {
		data := string(f.Data)
		want := testMeta[1].Value
		if strings.HasSuffix(f.Name, ".pdf") {
			want = strings.Trim(pdfText(want), "<>")[4:]
		}
		if !strings.Contains(data, want) {
			t.Errorf("%s does not carry the hash of the model", f.Name)
		}
	}
}

func TestFormat(t *testing.T) {
	p := lineExample()
	p.DPI = 72
	for name, begin := range map[string]string{"a.svg": "<svg", "out/B.PNG": "\x89PNG", ".pdf": "%PDF", "png": "\x89PNG"} {
		b, err := p.Format(name)
		if err != nil || !strings.HasPrefix(string(b), begin) {
			t.Errorf("%s: begins with %.8q, error %v", name, b, err)
		}
	}
	for _, name := range []string{"", "a", "a.jpg", "svg.txt"} {
		if _, err := p.Format(name); err == nil {
			t.Errorf("the name %q is accepted", name)
		}
	}
}

// TestOddGrids draws the smallest grids, a grid of which only a part is in view, and logarithmic axes.
func TestOddGrids(t *testing.T) {
	one := DensityMap(DensityMapData{XEdges: []float64{0, 1}, YEdges: []float64{0, 1}, Density: []float64{3}}, Settings{})
	part := gaussMap(12)
	part.Current = rotation(part.XEdges, part.YEdges, Arrows)
	zoom := DensityMap(part, Settings{})
	zoom.X.Min, zoom.X.Max, zoom.Y.Min, zoom.Y.Max = -1, 1.3, -0.4, 3
	logs := DensityMap(DensityMapData{XEdges: []float64{1, 10, 100}, YEdges: []float64{1, 2, 4, 8}, Density: make([]float64, 6)}, Settings{})
	logs.X.Log, logs.Y.Log = true, true
	strip := DensityMap(DensityMapData{XEdges: UniformEdges(0, 10, 40), YEdges: []float64{0, 0.5, 1}, Density: make([]float64, 80),
		Current: &VectorField{X: CellCentres(UniformEdges(0, 10, 40)), Y: []float64{0.25, 0.75}, U: make([]float64, 80), V: append(make([]float64, 79), 1e-320), Style: Streamlines}}, Settings{})
	for name, p := range map[string]*Plot{"one cell": one, "part": zoom, "log": logs, "strip": strip} {
		p.DPI = 72
		files, err := p.Files("f")
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		for _, f := range files {
			if strings.HasSuffix(f.Name, ".svg") && strings.Contains(string(f.Data), "NaN") {
				t.Errorf("%s: a coordinate is not a number", name)
			}
		}
		n := parseSVG(t, p)
		frame := frameOf(t, n).grow(0.02)
		n.group(t, "heat-map", "").walk(func(m *node) {
			if m.XMLName.Local == "path" {
				for _, q := range pathPoints(t, m.attr("d")) {
					if !frame.contains(q) {
						t.Errorf("%s: a cell reaches to %v, outside of the frame %v", name, q, frame)
					}
				}
			}
		})
	}
}

func BenchmarkSVG(b *testing.B) {
	p := pathsExample()
	for b.Loop() {
		if _, err := p.SVG(); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkPNG(b *testing.B) {
	p := arrowsExample()
	for b.Loop() {
		if _, err := p.PNG(); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkHeatMap1024(b *testing.B) {
	xe := UniformEdges(0, 1, 1024)
	p := DensityMap(DensityMapData{XEdges: xe, YEdges: xe, Density: onGrid(xe, xe, speed)}, Settings{})
	for b.Loop() {
		if _, err := p.SVG(); err != nil {
			b.Fatal(err)
		}
	}
}
