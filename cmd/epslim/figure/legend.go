package figure

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

const (
	legendLine   = tickSize * 1.45 // distance of lines
	legendSample = 20.0            // length of the sample of a line
	legendGap    = 4.0             // between the sample and its text
	legendColumn = 10.0            // between entries side by side
	fontSlack    = 1.12            // room for a viewer of SVG that has none of the fonts of our metrics
)

// legendEntry is one line of the legend.
type legendEntry struct {
	label []run
	text  string
	width float64
	kind  string // histogram, series, slope, field, path
	index int
}

type legendRow []legendEntry

func (d *drawing) addEntry(kind string, index int, label string) error {
	if label == "" {
		return nil
	}
	runs, err := parseLabel(label)
	if err != nil {
		return err
	}
	d.legend = append(d.legend, legendEntry{runs, label, legendSample + legendGap + fontSlack*d.s.face.width(runs, tickSize), kind, index})
	return nil
}

// legends reads the labels of everything that has one.
func (d *drawing) legends() error {
	for i := range d.Histograms {
		if err := d.addEntry("histogram", i, d.Histograms[i].Label); err != nil {
			return err
		}
	}
	for i := range d.Series {
		label := d.Series[i].Label
		if label != "" && len(d.Series[i].X) == 0 {
			label += " (no data)"
		}
		if err := d.addEntry("series", i, label); err != nil {
			return err
		}
	}
	for i := range d.Slopes {
		if d.slopeLine(i) == nil {
			continue
		}
		if err := d.addEntry("slope", i, d.Slopes[i].text()); err != nil {
			return err
		}
	}
	for i := range d.Levels {
		if err := d.addEntry("level", i, d.Levels[i].Label); err != nil {
			return err
		}
	}
	if d.Field != nil {
		label := d.Field.Label
		if f := d.Field; label != "" && allZero(f.U) && allZero(f.V) {
			label += " (zero everywhere)"
		}
		if err := d.addEntry("field", 0, label); err != nil {
			return err
		}
	}
	for i := range d.Paths {
		if err := d.addEntry("path", i, d.Paths[i].Label); err != nil {
			return err
		}
	}
	return nil
}

func (s Slope) text() string {
	if s.Label != "" {
		return s.Label
	}
	return "slope " + minusSign(strconv.FormatFloat(s.Order, 'g', 4, 64))
}

func allZero(v []float64) bool {
	for _, a := range v {
		if a != 0 {
			return false
		}
	}
	return true
}

// legendRows arranges the legend above the axes, in as few rows as possible and those of like length.
func (d *drawing) legendRows() []legendRow {
	rows := wrapLegend(d.legend, d.s.width-2*outerPad, len(d.legend))
	if n := len(rows); n > 1 {
		if even := wrapLegend(d.legend, d.s.width-2*outerPad, (len(d.legend)+n-1)/n); len(even) == n {
			return even
		}
	}
	return rows
}

// wrapLegend breaks the legend into rows of a greatest width and number of entries.
func wrapLegend(entries []legendEntry, room float64, most int) (rows []legendRow) {
	var row legendRow
	used := 0.0
	for _, e := range entries {
		if len(row) > 0 && (used+e.width > room || len(row) == most) {
			rows, row, used = append(rows, row), nil, 0
		}
		row = append(row, e)
		used += e.width + legendColumn
	}
	if len(row) > 0 {
		rows = append(rows, row)
	}
	return rows
}

// placeLegendInside looks for a corner of the box that is free of data.
func (d *drawing) placeLegendInside() bool {
	if len(d.legend) == 0 {
		return true
	}
	if d.Heat != nil || d.Field != nil {
		return false
	}
	w := 0.0
	for _, e := range d.legend {
		w = math.Max(w, e.width)
	}
	w += 8
	h := float64(len(d.legend))*legendLine + 5
	const inset = 4
	b := d.box.grow(-inset)
	if w > 0.75*b.width() || h > 0.8*b.height() {
		return false
	}
	lines := d.obstacles()
	for _, r := range []rect{
		{b.right - w, b.top, b.right, b.top + h}, {b.left, b.top, b.left + w, b.top + h},
		{b.right - w, b.bottom - h, b.right, b.bottom}, {b.left, b.bottom - h, b.left + w, b.bottom},
		{b.left + (b.width()-w)/2, b.top, b.left + (b.width()+w)/2, b.top + h},
	} {
		if !meets(lines, r.grow(2)) {
			d.inside = &r
			return true
		}
	}
	return false
}

// obstacles are the lines that a legend must not cover; a single point is a line of length zero.
func (d *drawing) obstacles() (lines [][]point) {
	for i := range d.Histograms {
		h := &d.Histograms[i]
		heights, errs := h.density()
		for k, y := range heights {
			lines = append(lines, []point{d.at(h.Edges[k], y+errs[k]), d.at(h.Edges[k+1], y+errs[k])})
			x := (h.Edges[k] + h.Edges[k+1]) / 2
			lines = append(lines, []point{d.at(x, y+errs[k]), d.atLow(x, 0)})
		}
	}
	for i := range d.Series {
		s := &d.Series[i]
		var mid, low, high []point
		for k, x := range s.X {
			mid = append(mid, d.at(x, s.Y[k]))
			if len(s.Low) > 0 {
				low, high = append(low, d.atLow(x, s.Low[k])), append(high, d.atLow(x, s.High[k]))
				lines = append(lines, []point{low[k], high[k]})
			}
		}
		lines = append(lines, mid, low, high)
	}
	for i := range d.Slopes {
		if l := d.slopeLine(i); l != nil {
			lines = append(lines, []point{d.at(l[0].x, l[0].y), d.at(l[1].x, l[1].y)})
		}
	}
	for _, l := range d.Levels {
		y := d.ay.at(l.Value)
		lines = append(lines, []point{{d.box.left, y}, {d.box.right, y}})
	}
	for i := range d.Paths {
		lines = append(lines, d.pathLines(&d.Paths[i])...)
	}
	return lines
}

func meets(lines [][]point, r rect) bool {
	for _, l := range lines {
		if len(l) == 1 && r.contains(l[0]) || len(clipLine(l, r)) > 0 {
			return true
		}
	}
	return false
}

func (d *drawing) drawLegend() {
	if len(d.legend) == 0 {
		return
	}
	d.s.begin("legend", "")
	defer d.s.end()
	if r := d.inside; r != nil && d.rows == nil {
		d.s.polygon([][]point{r.corners()}, white, 0.85)
		for i, e := range d.legend {
			d.drawEntry(e, point{r.left + 4, r.top + 2.5 + (float64(i)+0.5)*legendLine})
		}
		return
	}
	for i, row := range d.rows {
		x := outerPad
		total := -legendColumn
		for _, e := range row {
			total += e.width + legendColumn
		}
		x = math.Max(x, (d.box.left+d.box.right)/2-total/2)
		x = math.Max(outerPad, math.Min(x, d.s.width-outerPad-total))
		for _, e := range row {
			d.drawEntry(e, point{x, outerPad + (float64(i)+0.5)*legendLine})
			x += e.width + legendColumn
		}
	}
}

// drawEntry draws a sample and its text; at is the left end of the sample, at half height.
func (d *drawing) drawEntry(e legendEntry, at point) {
	s := d.s
	to := point{at.x + legendSample, at.y}
	mid := point{at.x + legendSample/2, at.y}
	swatch := rect{at.x, at.y - 2.8, to.x, at.y + 2.8}
	switch e.kind {
	case "histogram":
		c, _, _ := seriesStyle(e.index)
		s.polygon([][]point{swatch.corners()}, c, 0.25)
		s.line([][]point{swatch.corners()}, true, pen{colour: c, width: 0.8})
	case "series":
		d.drawSeriesSample(e.index, at, mid, to, swatch)
	case "slope":
		s.segment(at, to, slopePen(e.index))
	case "level":
		s.segment(at, to, levelPen())
	case "field":
		line, edge := d.fieldPens()
		if d.Heat != nil && line.r == 0xff { // on paper the light line needs a dark ground
			s.polygon([][]point{swatch.grow(0.8).corners()}, colour{0x31, 0x68, 0x8e, ""}, 1)
		}
		for _, p := range []struct {
			c    colour
			grow float64
		}{{edge, 0.5}, {line, 0}} {
			shaft, head := arrowShape(point{at.x + 3, at.y}, point{to.x - 3, at.y}, p.grow)
			s.line([][]point{shaft}, false, pen{colour: p.c, width: 0.8 + 2*p.grow})
			s.polygon([][]point{head}, p.c, 1)
		}
	case "path":
		c, edge, dash := d.pathStyle(e.index)
		if d.Heat != nil {
			s.polygon([][]point{swatch.grow(0.8).corners()}, colour{0x31, 0x68, 0x8e, ""}, 1)
			s.segment(at, to, pen{colour: edge, width: pathWidth + 0.9})
		}
		s.segment(at, to, pen{colour: c, width: pathWidth, dash: dash})
	}
	s.text(point{to.x + legendGap, at.y + tickSize*capHeight/2}, e.label, tickSize, anchorStart, black)
}

func (d *drawing) drawSeriesSample(i int, at, mid, to point, swatch rect) {
	c, dash, marker := d.lineStyle(i)
	ser := &d.Series[i]
	if len(ser.Low) > 0 {
		if ser.Bounds == Band {
			d.s.polygon([][]point{swatch.corners()}, c, 0.22)
		} else {
			d.s.segment(point{mid.x, swatch.top - 1}, point{mid.x, swatch.bottom + 1}, pen{colour: c, width: 0.8})
		}
	}
	if ser.Marks != PointsOnly {
		d.s.segment(at, to, pen{colour: c, width: lineWidth, dash: dash})
	}
	single := len(d.Series) == 1 && len(d.Histograms) == 0 && len(ser.X) > 12
	if ser.Marks == PointsOnly || ser.Marks == MarksAuto && !single {
		d.mark(mid, marker, c)
	}
}

func (d *drawing) defaultTitle() string {
	y := plainText(d.ay.label)
	if d.Heat != nil {
		y = plainText(d.barAx.label)
	}
	if y == "" {
		return "Figure"
	}
	return y
}

// describe says in a sentence what is plotted, for those who do not see it.
func (d *drawing) describe() string {
	var b strings.Builder
	name := func(a *axis, other string) string {
		if s := plainText(a.label); s != "" {
			return s
		}
		return other
	}
	span := func(a *axis) string { return fmt.Sprintf("from %.4g to %.4g", a.lo, a.hi) }
	x, y := name(&d.ax, "the horizontal axis"), name(&d.ay, "the vertical axis")
	if h := d.Heat; h != nil {
		lo, hi := bounds(h.Values)
		fmt.Fprintf(&b, "Heat map of %s, between %.4g and %.4g, over %s %s and %s %s.",
			name(&d.barAx, "a quantity"), lo, hi, x, span(&d.ax), y, span(&d.ay))
	} else {
		fmt.Fprintf(&b, "Plot of %s %s against %s %s.", y, span(&d.ay), x, span(&d.ax))
	}
	for i, e := range d.legend {
		sep := ", "
		if i == 0 {
			sep = " Shown: "
		}
		b.WriteString(sep + plainText(e.label))
	}
	if len(d.legend) > 0 {
		b.WriteString(".")
	}
	if d.flat {
		b.WriteString(" There are no data.")
	}
	return b.String()
}
