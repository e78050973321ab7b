package figure

import (
	"bytes"
	"fmt"
	"image"
	"image/png"
	"math"
	"strconv"
	"strings"
)

// maxMatrixCells is the largest heat map that TeX draws cell by cell; it has a fixed amount of memory.
const maxMatrixCells = 10000

// TeX returns a pgfplots picture for \input into an article, base.tex, and the files that it reads: base.csv
// with the numbers, and, where they are needed, base-cells.png with the cells of a large or uneven
// heat map, base-arrows.csv or base-streamlines.csv, and base-paths.csv. The article needs
// \usepackage{pgfplots} and, for bands, \usepgfplotslibrary{fillbetween}.
func (p *Plot) TeX(base string) ([]File, error) {
	d, err := p.prepare()
	if err != nil {
		return nil, err
	}
	w := &texWriter{drawing: d, base: base}
	if err := w.write(); err != nil {
		return nil, err
	}
	return append([]File{{base + ".tex", w.b.Bytes()}}, w.files...), nil
}

type texWriter struct {
	*drawing
	base  string
	b     bytes.Buffer
	files []File
}

func (w *texWriter) printf(format string, args ...any) { fmt.Fprintf(&w.b, format, args...) }

func (w *texWriter) write() error {
	w.printf("%% %s\n", oneLine(w.s.alt))
	w.printf("%% %s\n", oneLine(metaJSON(w.Meta)))
	w.printf("%% Needs \\usepackage{pgfplots} \\pgfplotsset{compat=1.18} \\usepgfplotslibrary{fillbetween}\n")
	w.printf("\\begingroup\n")
	for i, c := range lineColours() {
		w.printf("\\definecolor{line%d}{HTML}{%s}\n", i, strings.ToUpper(c.hex()[1:]))
	}
	w.printf("\\begin{tikzpicture}\n\\begin{axis}[\n")
	w.axisOptions()
	w.printf("]\n")
	if w.Heat != nil {
		if err := w.heat(); err != nil {
			return err
		}
	}
	if w.Field != nil {
		w.field()
	}
	w.data()
	w.levels()
	w.paths()
	w.printf("\\end{axis}\n\\end{tikzpicture}\n\\endgroup\n")
	return nil
}

// oneLine keeps a comment a comment.
func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

func texNum(v float64) string { return strconv.FormatFloat(v, 'g', 10, 64) }

func cm(points float64) string { return strconv.FormatFloat(points/pointsPerCm, 'f', 3, 64) + "cm" }

func (w *texWriter) axisOptions() {
	w.printf("  scale only axis, width=%s, height=%s,\n", cm(w.box.width()), cm(w.box.height()))
	w.printf("  xmin=%s, xmax=%s, ymin=%s, ymax=%s, enlargelimits=false,\n",
		texNum(w.ax.lo), texNum(w.ax.hi), texNum(w.ay.lo), texNum(w.ay.hi))
	w.printf("  tick align=outside, tick pos=left, axis on top, unbounded coords=discard, filter discard warning=false,\n")
	w.printf("  label style={font=\\small}, tick label style={font=\\footnotesize}, xticklabel style={text height=1.6ex},\n")
	for _, a := range []struct {
		name string
		ax   *axis
	}{{"x", &w.ax}, {"y", &w.ay}} {
		if len(a.ax.label) > 0 {
			w.printf("  %slabel={%s},\n", a.name, labelTeX(a.ax.Label))
		}
		if a.ax.Log {
			w.printf("  %smode=log,\n", a.name)
		}
		if a.ax.factor == nil { // ticks with a common factor are left to pgfplots
			at, text := texTicks(a.ax)
			w.printf("  %stick={%s}, %sticklabels={%s},\n", a.name, at, a.name, text)
		}
	}
	if len(w.legend) > 0 {
		w.printf("  legend cell align=left, legend style={draw=none, fill opacity=0.85, text opacity=1, font=\\footnotesize, %s},\n",
			w.legendPlace())
	}
	if w.Heat != nil {
		w.barOptions()
	}
}

func texTicks(a *axis) (at, text string) {
	var ats, texts []string
	for _, t := range a.ticks {
		if t.label != nil {
			ats = append(ats, texNum(t.value))
			texts = append(texts, "{"+runsTeX(t.label)+"}")
		}
	}
	return strings.Join(ats, ","), strings.Join(texts, ",")
}

// runsTeX writes a tick label.
func runsTeX(runs []run) string {
	var b strings.Builder
	b.WriteByte('$')
	for _, r := range runs {
		t := strings.NewReplacer("−", "-", "π", `\pi `, "×", `\times `, "·", `\cdot `).Replace(r.text)
		switch r.script {
		case 1:
			t = "^{" + t + "}"
		case -1:
			t = "_{" + t + "}"
		}
		b.WriteString(t)
	}
	b.WriteByte('$')
	return b.String()
}

func (w *texWriter) legendPlace() string {
	r := w.inside
	if r == nil || w.rows != nil {
		longest := 1
		for _, row := range w.rows {
			longest = max(longest, len(row))
		}
		return fmt.Sprintf("at={(0.5,1.03)}, anchor=south, legend columns=%d, column sep=4pt", longest)
	}
	x, y, h, v := "0.02", "0.97", "west", "north"
	mid := (r.left + r.right) / 2
	switch {
	case math.Abs(mid-(w.box.left+w.box.right)/2) < 5:
		x, h = "0.5", ""
	case mid > (w.box.left+w.box.right)/2:
		x, h = "0.98", " east"
	default:
		h = " west"
	}
	if (r.top+r.bottom)/2 > (w.box.top+w.box.bottom)/2 {
		y, v = "0.03", "south"
	}
	return fmt.Sprintf("at={(%s,%s)}, anchor=%s%s", x, y, v, h)
}

func (w *texWriter) barOptions() {
	w.printf("  colorbar, colorbar style={width=%s, ylabel={%s}, font=\\footnotesize", cm(barWidth), labelTeX(w.Heat.Quantity))
	lo, hi := w.scale.min, w.scale.max
	ax := w.barAx
	if w.scale.log { // pgfplots has no logarithmic colour bar: it gets logarithms and our labels
		lo, hi = math.Log(lo), math.Log(hi)
		ax.ticks = nil
		for _, t := range w.barAx.ticks {
			ax.ticks = append(ax.ticks, tick{math.Log(t.value), t.label})
		}
	}
	if ax.factor == nil {
		at, text := texTicks(&ax)
		w.printf(", ytick={%s}, yticklabels={%s}", at, text)
	}
	w.printf("},\n  point meta min=%s, point meta max=%s,\n  colormap={cells}{", texNum(lo), texNum(hi))
	t := w.Heat.Map.table()
	for k := 0; k <= 32; k++ {
		c := t[k*(len(t)-1)/32]
		w.printf("rgb255=(%d,%d,%d) ", c.R, c.G, c.B)
	}
	w.printf("},\n")
}

func (w *texWriter) heat() error {
	t, x, y, value := w.heatTable()
	w.files = append(w.files, File{w.base + ".csv", t.csv(w.Meta)})
	h := w.Heat
	nx := len(h.XEdges) - 1
	if len(h.Values) <= maxMatrixCells && equidistant(&w.ax, h.XEdges) && equidistant(&w.ay, h.YEdges) &&
		nx > 1 && len(h.YEdges) > 2 && !w.ax.Log && !w.ay.Log {
		meta := `\thisrow{` + value + `}`
		if h.Log {
			meta = "ln(" + meta + ")"
		}
		w.printf("\\addplot[matrix plot*, mesh/cols=%d, point meta={%s}, forget plot]\n  table[x=%s, y=%s, col sep=comma] {%s.csv};\n",
			nx, meta, x, y, w.base)
		return nil
	}
	img := w.imageOfBox()
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestCompression}
	if err := e.Encode(&b, img); err != nil {
		return fmt.Errorf("figure: writing a PNG: %w", err)
	}
	w.files = append(w.files, File{w.base + "-cells.png", b.Bytes()})
	w.printf("%% The cells of %s.csv, as an image.\n", w.base)
	w.printf("\\addplot[forget plot] graphics[xmin=%s, xmax=%s, ymin=%s, ymax=%s] {%s-cells.png};\n",
		texNum(w.ax.lo), texNum(w.ax.hi), texNum(w.ay.lo), texNum(w.ay.hi), w.base)
	return nil
}

// imageOfBox is the heat map as an image of the whole box, each cell several pixels wide so that no viewer
// can smooth it visibly.
func (w *texWriter) imageOfBox() *image.Paletted {
	src := w.cells()
	nx, ny := src.Rect.Dx(), src.Rect.Dy()
	width, height := int(math.Round(w.box.width()*600/72)), int(math.Round(w.box.height()*600/72))
	width, height = ((width+nx-1)/nx)*nx, ((height+ny-1)/ny)*ny
	img := image.NewPaletted(image.Rect(0, 0, width, height), src.Palette)
	column := lookup(&w.ax, w.Heat.XEdges, width, w.box.left, w.box.right)
	row := lookup(&w.ay, w.Heat.YEdges, height, w.box.bottom, w.box.top)
	for j := range height {
		for i := range width {
			if r, c := row[height-1-j], column[i]; r >= 0 && c >= 0 {
				img.Pix[j*img.Stride+i] = src.Pix[(ny-1-r)*src.Stride+c]
			}
		}
	}
	return img
}

// lookup finds the cell below the centre of each pixel between two places, or -1.
func lookup(a *axis, edges []float64, n int, from, to float64) []int {
	out := make([]int, n)
	sign := 1.0
	if to < from {
		sign = -1
	}
	k := 0
	for i := range out {
		at := from + (to-from)*(float64(i)+0.5)/float64(n)
		for k < len(edges)-2 && sign*(at-a.at(edges[k+1])) >= 0 {
			k++
		}
		out[i] = k
		if sign*(at-a.at(edges[0])) < 0 || sign*(at-a.at(edges[len(edges)-1])) > 0 {
			out[i] = -1
		}
	}
	return out
}

// back is the value at a place of an axis, the inverse of at.
func (a *axis) back(at float64) float64 {
	if a.Log {
		return a.lo * math.Pow(a.hi/a.lo, (at-a.from)/(a.to-a.from))
	}
	return a.lo + (at-a.from)/(a.to-a.from)*(a.hi-a.lo)
}

func (w *texWriter) field() {
	f := w.screenField()
	if f.max == 0 {
		return
	}
	colour := "white, legend image post style={gray}"
	if w.Heat == nil || w.Heat.Map == Diverging {
		colour = "black"
	}
	var t table
	if w.Field.Style == Streamlines {
		var xs, ys, hx, hy, hu, hv []float64
		for _, l := range w.streamlines(&f) {
			for _, k := range headPlaces(l) {
				hx, hy = append(hx, w.ax.back(l[k].x)), append(hy, w.ay.back(l[k].y))
				hu, hv = append(hu, w.ax.back(l[k+1].x)-hx[len(hx)-1]), append(hv, w.ay.back(l[k+1].y)-hy[len(hy)-1])
			}
			for _, p := range simplify(l, 0.1) {
				xs, ys = append(xs, w.ax.back(p.x)), append(ys, w.ay.back(p.y))
			}
			xs, ys = append(xs, math.NaN()), append(ys, math.NaN())
		}
		t.columns = []column{{"x", xs}, {"y", ys}, {"head_x", hx}, {"head_y", hy}, {"head_u", hu}, {"head_v", hv}}
		w.files = append(w.files, File{w.base + "-streamlines.csv", t.csv(w.Meta)})
		w.printf("\\addplot[%s, semithick, unbounded coords=jump%s] table[x=x, y=y, col sep=comma] {%s-streamlines.csv};\n",
			colour, forget(w.Field.Label), w.base)
		w.legendText(w.Field.Label)
		w.printf("\\addplot[%s, semithick, -stealth, forget plot, quiver={u=\\thisrow{head_u}, v=\\thisrow{head_v}}]\n  table[x=head_x, y=head_y, col sep=comma] {%s-streamlines.csv};\n",
			colour, w.base)
	} else {
		tails, tips := w.arrows(&f)
		xs, ys, us, vs := make([]float64, len(tails)), make([]float64, len(tails)), make([]float64, len(tails)), make([]float64, len(tails))
		for i := range tails {
			xs[i], ys[i] = w.ax.back(tails[i].x), w.ay.back(tails[i].y)
			us[i], vs[i] = w.ax.back(tips[i].x)-xs[i], w.ay.back(tips[i].y)-ys[i]
		}
		t.columns = []column{{"x", xs}, {"y", ys}, {"u", us}, {"v", vs}}
		w.files = append(w.files, File{w.base + "-arrows.csv", t.csv(w.Meta)})
		w.printf("\\addplot[%s, semithick, -stealth, quiver={u=\\thisrow{u}, v=\\thisrow{v}}%s]\n  table[x=x, y=y, col sep=comma] {%s-arrows.csv};\n",
			colour, forget(w.Field.Label), w.base)
		w.legendText(w.Field.Label)
	}
}

// data writes histograms, bands, series and slopes.
func (w *texWriter) data() {
	t, hists, series := w.dataTable()
	if w.Heat == nil {
		w.files = append(w.files, File{w.base + ".csv", t.csv(w.Meta)})
	} else if len(t.columns) > 0 {
		w.files = append(w.files, File{w.base + "-series.csv", t.csv(w.Meta)})
	}
	name := w.base + ".csv"
	if w.Heat != nil {
		name = w.base + "-series.csv"
	}
	for i, c := range hists {
		if len(w.Histograms[i].Counts) == 0 {
			continue
		}
		w.printf("\\addplot[const plot, line%d, fill=line%d, fill opacity=0.25, draw opacity=1, area legend%s] table[x=%s, y=%s, col sep=comma] {%s} \\closedcycle;\n",
			i%8, i%8, forget(w.Histograms[i].Label), c.x, c.y, name)
		w.legendText(w.Histograms[i].Label)
		if c.low != "" {
			w.printf("\\addplot[draw=none, mark=none, forget plot, error bars/.cd, y dir=both, y explicit, error bar style={line%d}] table[x=%s, y=%s, y error=%s, col sep=comma] {%s};\n",
				i%8, c.low, c.y, c.high, name)
		}
	}
	for i, c := range series {
		w.series(i, c, name)
	}
	for i, s := range w.Slopes {
		if l := w.slopeLine(i); l != nil {
			w.printf("\\addplot[gray, %s, semithick] coordinates {(%s,%s) (%s,%s)};\n", []string{"dashed", "dotted", "dash dot"}[i%3],
				texNum(l[0].x), texNum(l[0].y), texNum(l[1].x), texNum(l[1].y))
			w.legendText(s.text())
		}
	}
}

func (w *texWriter) levels() {
	for _, l := range w.Levels {
		w.printf("\\addplot[gray, densely dotted, semithick%s] coordinates {(%s,%s) (%s,%s)};\n", forget(l.Label),
			texNum(w.ax.lo), texNum(l.Value), texNum(w.ax.hi), texNum(l.Value))
		w.legendText(l.Label)
	}
}

func forget(label string) string {
	if label == "" {
		return ", forget plot"
	}
	return ""
}

func (w *texWriter) legendText(label string) {
	if label != "" {
		w.printf("\\addlegendentry{%s}\n", labelTeX(label))
	}
}

func (w *texWriter) series(i int, c seriesColumns, name string) {
	s := &w.Series[i]
	if len(s.X) == 0 {
		return
	}
	k := (i + len(w.Histograms)) % len(lineColours())
	_, dash, marker := w.lineStyle(i)
	errors, errorColumns := "", ""
	low := `\thisrow{` + c.low + "}"
	if w.ay.Log { // a limit at or below zero reaches down to the end of the axis
		low = fmt.Sprintf("max(%s,%s)", low, texNum(w.ay.lo/2))
	}
	if c.low != "" && (s.Bounds == ErrorBars || len(s.X) == 1) {
		errors = ", error bars/.cd, y dir=both, y explicit"
		errorColumns = fmt.Sprintf(", y error plus expr=\\thisrow{%s}-\\thisrow{%s}, y error minus expr={\\thisrow{%s}-%s}",
			c.high, c.y, c.y, low)
	} else if c.low != "" {
		for _, e := range [][2]string{{c.low, low}, {c.high, `\thisrow{` + c.high + "}"}} {
			w.printf("\\addplot[draw=none, name path=%s, forget plot] table[x=%s, y expr={%s}, col sep=comma] {%s};\n", e[0], c.x, e[1], name)
		}
		w.printf("\\addplot[line%d, fill opacity=0.22, draw=none, forget plot] fill between[of=%s and %s];\n", k, c.low, c.high)
	}
	style := "line width=0.9pt"
	if len(dash) > 0 {
		style += ", dash pattern="
		for j, v := range dash {
			style += []string{"on ", "off "}[j%2] + texNum(v) + "pt "
		}
	}
	mark := map[string]string{"disc": "*", "square": "square*", "triangle": "triangle*", "diamond": "diamond*",
		"cross": "x", "inverted": "triangle*, mark options={solid, rotate=180}", "plus": "+"}[marker]
	switch {
	case s.Marks == LineOnly, s.Marks == MarksAuto && !s.few() && len(w.Series) == 1 && len(w.Histograms) == 0:
		mark = "none"
	case s.Marks == PointsOnly:
		style = "only marks"
	case !s.few():
		n := max(1, len(s.X)/8)
		mark += fmt.Sprintf(", mark repeat=%d, mark phase=%d", n, 1+n*(i%4)/4)
	}
	w.printf("\\addplot[line%d, %s, mark=%s, mark size=1.6pt, mark options={solid}%s%s]\n  table[x=%s, y=%s%s, col sep=comma] {%s};\n",
		k, style, mark, forget(s.Label), errors, c.x, c.y, errorColumns, name)
	w.legendText(s.Label)
}

func (w *texWriter) paths() {
	var t table
	for i := range w.Paths {
		if len(w.Paths[i].X) == 0 {
			continue
		}
		var xs, ys []float64
		for _, l := range w.pathLines(&w.Paths[i]) {
			for _, p := range l {
				xs, ys = append(xs, w.ax.back(p.x)), append(ys, w.ay.back(p.y))
			}
			xs, ys = append(xs, math.NaN()), append(ys, math.NaN())
		}
		c, _, _ := w.pathStyle(i)
		x, y := t.add(fmt.Sprintf("x%d", i+1), xs), t.add(fmt.Sprintf("y%d", i+1), ys)
		w.printf("\\definecolor{path%d}{HTML}{%s}\n", i, strings.ToUpper(c.hex()[1:]))
		post := ""
		if c.r == 0xff && c.g == 0xff && c.b == 0xff { // white on paper
			post = ", legend image post style={gray}"
		}
		w.printf("\\addplot[path%d, line width=0.7pt, unbounded coords=jump%s] table[x=%s, y=%s, col sep=comma] {%s-paths.csv};\n",
			i, forget(w.Paths[i].Label)+post, x, y, w.base)
		w.legendText(w.Paths[i].Label)
	}
	if len(t.columns) > 0 {
		w.files = append(w.files, File{w.base + "-paths.csv", t.csv(w.Meta)})
	}
}
