package figure

import (
	"image"
	"image/color"
	"math"
)

// draw adds all shapes to the scene, from the background to the legend.
func (d *drawing) draw() {
	s := d.s
	s.begin("background", "")
	s.polygon([][]point{rect{0, 0, s.width, s.height}.corners()}, white, 1)
	s.end()
	if d.Heat != nil {
		d.drawHeat()
	}
	if d.Field != nil {
		d.drawField()
	}
	for i := range d.Histograms {
		d.drawHistogram(i)
	}
	for i := range d.Series {
		d.drawBounds(i)
	}
	for i := range d.Slopes {
		d.drawSlope(i)
	}
	for _, l := range d.Levels {
		d.s.begin("level", l.Label)
		y := d.ay.at(l.Value)
		d.s.line(clipLine([]point{{d.box.left, y}, {d.box.right, y}}, d.box), false, levelPen())
		d.s.end()
	}
	for i := range d.Series {
		d.drawSeries(i)
	}
	for i := range d.Paths {
		d.drawPath(i)
	}
	d.drawAxes()
	if d.flat {
		s.text(point{(d.box.left + d.box.right) / 2, (d.box.top + d.box.bottom) / 2},
			[]run{{text: "no data"}}, labelSize, anchorMiddle, grey)
	}
	d.drawLegend()
}

func (d *drawing) at(x, y float64) point { return point{d.ax.at(x), d.ay.at(y)} }

// limit moves a place that is far outside the figure nearer, so that no writer meets a huge number.
func (d *drawing) limit(y float64) float64 {
	return math.Max(d.box.top-10*d.s.height, math.Min(d.box.bottom+10*d.s.height, y))
}

// atLow is the place of a lower limit: on a logarithmic axis one at or below zero is at its end.
func (d *drawing) atLow(x, y float64) point {
	if d.ay.Log && y <= 0 {
		return point{d.ax.at(x), d.box.bottom}
	}
	return point{d.ax.at(x), d.limit(d.ay.at(y))}
}

func (d *drawing) drawAxes() {
	s, b := d.s, d.box
	frame := pen{colour: black, width: frameWidth}
	s.begin("frame", "")
	s.line([][]point{b.corners()}, true, frame)
	s.end()

	s.begin("axis-x", plainText(d.ax.label))
	for _, t := range d.ax.ticks {
		x, l := d.ax.at(t.value), tickLength
		if t.label == nil {
			l *= 0.6
		}
		s.segment(point{x, b.bottom}, point{x, b.bottom + l}, frame)
		s.text(point{x, b.bottom + tickLength + tickGap + tickSize*capHeight}, t.label, tickSize, anchorMiddle, black)
	}
	base := s.height - outerPad - labelSize*0.28
	s.text(point{(b.left + b.right) / 2, base}, d.ax.label, labelSize, anchorMiddle, black)
	s.text(point{b.right, base}, d.ax.factor, tickSize, anchorEnd, black)
	s.end()

	s.begin("axis-y", plainText(d.ay.label))
	d.drawUpright(&d.ay, b.left, -1)
	s.textUpwards(point{b.left - tickLength - tickGap - d.labelWidth(&d.ay) - 1 - labelSize*0.42, (b.top + b.bottom) / 2},
		d.ay.label, labelSize, anchorMiddle, black)
	s.end()

	if d.Heat != nil {
		s.begin("colour-bar", plainText(d.barAx.label))
		d.drawBar()
		s.line([][]point{d.bar.corners()}, true, frame)
		d.drawUpright(&d.barAx, d.bar.right, 1)
		s.textUpwards(point{d.bar.right + tickLength + tickGap + d.labelWidth(&d.barAx) + labelSize*1.1,
			(b.top + b.bottom) / 2}, d.barAx.label, labelSize, anchorMiddle, black)
		s.end()
	}
}

// drawUpright draws the marks of a vertical axis at x; side is -1 for labels on the left.
func (d *drawing) drawUpright(a *axis, x, side float64) {
	frame := pen{colour: black, width: frameWidth}
	anchor := anchorEnd
	if side > 0 {
		anchor = anchorStart
	}
	for _, t := range a.ticks {
		y, l := a.at(t.value), tickLength
		if t.label == nil {
			l *= 0.6
		}
		d.s.segment(point{x, y}, point{x + side*l, y}, frame)
		d.s.text(point{x + side*(tickLength+tickGap), y + tickSize*capHeight/2}, t.label, tickSize, anchor, black)
	}
	at := point{x, d.box.top - tickSize*0.45}
	if side > 0 {
		at.x = d.bar.left
	}
	d.s.text(at, a.factor, tickSize, anchorStart, black)
}

// drawBar draws the colours of the colour bar, one pixel an entry.
func (d *drawing) drawBar() {
	t := d.Heat.Map.table()
	img := image.NewPaletted(image.Rect(0, 0, 1, len(t)), palette(t))
	for i := range t {
		img.Pix[i*img.Stride] = uint8(len(t) - 1 - i)
	}
	d.s.shapes = append(d.s.shapes, shape{kind: shapeImage, box: d.bar, image: img})
}

func palette(t []color.RGBA) color.Palette {
	p := make(color.Palette, len(t))
	for i, c := range t {
		p[i] = c
	}
	return p
}

// cells is the heat map as an image of one pixel a cell, the first row on top.
func (d *drawing) cells() *image.Paletted {
	h := d.Heat
	nx, ny := len(h.XEdges)-1, len(h.YEdges)-1
	img := image.NewPaletted(image.Rect(0, 0, nx, ny), palette(h.Map.table()))
	for j := range ny {
		row := img.Pix[(ny-1-j)*img.Stride:]
		for i := range nx {
			row[i] = d.scale.index(h.Values[j*nx+i])
		}
	}
	return img
}

// equidistant tells whether the edges, as drawn, are at equal distances.
func equidistant(a *axis, edges []float64) bool {
	n := len(edges) - 1
	from, to := a.at(edges[0]), a.at(edges[n])
	for i, e := range edges {
		if math.Abs(a.at(e)-(from+(to-from)*float64(i)/float64(n))) > 1e-6*math.Abs(to-from)/float64(n)+1e-9 {
			return false
		}
	}
	return true
}

func (d *drawing) drawHeat() {
	h, s := d.Heat, d.s
	nx, ny := len(h.XEdges)-1, len(h.YEdges)-1
	area := rect{d.ax.at(h.XEdges[0]), d.ay.at(h.YEdges[ny]), d.ax.at(h.XEdges[nx]), d.ay.at(h.YEdges[0])}
	s.begin("heat-map", plainText(d.barAx.label))
	defer s.end()
	within := d.box.grow(1e-6)
	if within.contains(area.corners()[0]) && within.contains(area.corners()[2]) &&
		equidistant(&d.ax, h.XEdges) && equidistant(&d.ay, h.YEdges) {
		s.rasterColumns, s.rasterBox = nx, area
		s.shapes = append(s.shapes, shape{kind: shapeImage, box: area, image: d.cells()})
		return
	}
	d.drawUnevenCells()
}

// drawUnevenCells draws each cell as a rectangle, those of one colour together.
func (d *drawing) drawUnevenCells() {
	img := d.cells()
	nx, ny := img.Rect.Dx(), img.Rect.Dy()
	byColour := make([][][]point, len(img.Palette))
	for j := range ny {
		bottom, top := d.ay.at(d.Heat.YEdges[j]), d.ay.at(d.Heat.YEdges[j+1])
		for i := 0; i < nx; {
			k := img.Pix[(ny-1-j)*img.Stride+i]
			first := i
			for i < nx && img.Pix[(ny-1-j)*img.Stride+i] == k { // neighbours of one colour in one piece
				i++
			}
			r := rect{d.ax.at(d.Heat.XEdges[first]), top, d.ax.at(d.Heat.XEdges[i]), bottom}
			r = rect{math.Max(r.left, d.box.left), math.Max(r.top, d.box.top), math.Min(r.right, d.box.right), math.Min(r.bottom, d.box.bottom)}
			if r.left < r.right && r.top < r.bottom {
				byColour[k] = append(byColour[k], r.corners())
			}
		}
	}
	for k, cells := range byColour {
		if len(cells) > 0 {
			c, _ := img.Palette[k].(color.RGBA)
			d.s.shapes = append(d.s.shapes, shape{kind: shapeCells, lines: cells, fill: colour{c.R, c.G, c.B, ""}, alpha: 1})
		}
	}
}

// lineStyle is the look of series i; histograms come first in the order of colours.
func (d *drawing) lineStyle(i int) (colour, []float64, string) {
	return seriesStyle(i + len(d.Histograms))
}

func (d *drawing) drawHistogram(i int) {
	h := &d.Histograms[i]
	heights, errs := h.density()
	if len(heights) == 0 {
		return
	}
	c, _, _ := seriesStyle(i)
	base := d.ay.at(math.Max(0, d.ay.lo))
	outline := []point{{d.ax.at(h.Edges[0]), base}}
	for k, y := range heights {
		outline = append(outline, d.at(h.Edges[k], y), d.at(h.Edges[k+1], y))
	}
	outline = append(outline, point{d.ax.at(h.Edges[len(heights)]), base})
	d.s.begin("histogram", h.Label)
	if p := clipPolygon(outline, d.box); p != nil {
		d.s.polygon([][]point{p}, c, 0.25)
	}
	d.s.line(clipLine(outline, d.box), false, pen{colour: c, width: 0.8})
	if h.ErrorBars {
		for k, y := range heights {
			x := (h.Edges[k] + h.Edges[k+1]) / 2
			if errs[k] > 0 {
				d.errorBar(d.at(x, y-errs[k]), d.at(x, y+errs[k]), c)
			}
		}
	}
	d.s.end()
}

func (d *drawing) errorBar(low, high point, c colour) {
	const cap = 1.8
	p := pen{colour: c, width: 0.8}
	d.s.line(clipLine([]point{low, high}, d.box), false, p)
	for _, q := range []point{low, high} {
		if d.box.grow(-0.01).contains(q) {
			d.s.segment(point{q.x - cap, q.y}, point{q.x + cap, q.y}, p)
		}
	}
}

func (d *drawing) drawBounds(i int) {
	s := &d.Series[i]
	if len(s.Low) == 0 {
		return
	}
	c, _, _ := d.lineStyle(i)
	var high, low []point
	for k, x := range s.X {
		high = append(high, d.atLow(x, s.High[k]))
		low = append(low, d.atLow(x, s.Low[k]))
	}
	d.s.begin("bounds", s.Label)
	defer d.s.end()
	if s.Bounds == ErrorBars || len(s.X) == 1 {
		for k := range high {
			d.errorBar(low[k], high[k], c)
		}
		return
	}
	const tolerance = 0.03
	high, low = simplify(high, tolerance), simplify(low, tolerance)
	for k := len(low) - 1; k >= 0; k-- {
		high = append(high, low[k])
	}
	if p := clipPolygon(high, d.box); p != nil {
		d.s.polygon([][]point{p}, c, 0.22)
	}
}

func (d *drawing) drawSlope(i int) {
	l := d.slopeLine(i)
	if l == nil {
		return
	}
	d.s.begin("slope", d.Slopes[i].Label)
	d.s.line(clipLine([]point{d.at(l[0].x, l[0].y), d.at(l[1].x, l[1].y)}, d.box), false, slopePen(i))
	d.s.end()
}

func slopePen(i int) pen {
	dash := [][]float64{{4, 2}, {1, 1.6}, {7, 2, 1, 2}}[i%3]
	return pen{colour: grey, width: 0.8, dash: dash}
}

func levelPen() pen { return pen{colour: grey, width: 0.9, dash: []float64{1, 1.2}} }

const lineWidth = 1.1

func (d *drawing) drawSeries(i int) {
	s := &d.Series[i]
	c, dash, marker := d.lineStyle(i)
	pts := make([]point, len(s.X))
	for k := range s.X {
		p := d.at(s.X[k], s.Y[k])
		pts[k] = point{p.x, d.limit(p.y)}
	}
	d.s.begin("series", s.Label)
	defer d.s.end()
	if s.Marks != PointsOnly {
		for _, piece := range clipLine(simplify(pts, 0.02), d.box) {
			d.s.line([][]point{piece}, false, pen{colour: c, width: lineWidth, dash: dash})
		}
	}
	for _, p := range d.markedPoints(i, pts) {
		d.mark(p, marker, c)
	}
}

// markedPoints are the points of a series that get a marker: all of a few, or about eight spread
// evenly along the line and, between series, shifted against each other.
func (d *drawing) markedPoints(i int, pts []point) (out []point) {
	s := &d.Series[i]
	in := d.box.grow(0.01)
	switch {
	case s.Marks == LineOnly && len(pts) > 1:
		return nil
	case s.Marks == PointsOnly || s.few() || len(pts) == 1:
		for _, p := range pts {
			if in.contains(p) {
				out = append(out, p)
			}
		}
		return out
	case len(d.Series) == 1 && len(d.Histograms) == 0:
		return nil
	}
	const count = 8
	total := 0.0
	for k := 1; k < len(pts); k++ {
		total += pts[k].sub(pts[k-1]).norm()
	}
	step := total / count
	next := step * (0.25 + 0.5*float64(i%4)/4 + 0.25*float64(i%2))
	for k := 1; k < len(pts); k++ {
		next -= pts[k].sub(pts[k-1]).norm()
		if next <= 0 && step > 0 {
			if in.contains(pts[k]) {
				out = append(out, pts[k])
			}
			next += step * math.Ceil(-next/step+1e-9)
		}
	}
	return out
}

// mark draws a marker. Filled ones have a thin light edge that separates them from their line.
func (d *drawing) mark(p point, marker string, c colour) {
	shape := markerShape(p, marker, 2.1)
	if marker == "cross" || marker == "plus" {
		d.s.line(shape, false, pen{colour: white, width: 2.2})
		d.s.line(shape, false, pen{colour: c, width: 1.2})
		return
	}
	d.s.polygon(shape, c, 1)
	d.s.line(shape, true, pen{colour: white, width: 0.5})
}

// markerShape is a marker of about the given radius: polygons, or strokes for cross and plus.
func markerShape(p point, marker string, r float64) [][]point {
	v := func(x, y float64) point { return point{p.x + r*x, p.y + r*y} }
	switch marker {
	case "square":
		return [][]point{{v(-0.9, -0.9), v(0.9, -0.9), v(0.9, 0.9), v(-0.9, 0.9)}}
	case "triangle":
		return [][]point{{v(0, -1.2), v(1.1, 0.75), v(-1.1, 0.75)}}
	case "inverted":
		return [][]point{{v(0, 1.2), v(1.1, -0.75), v(-1.1, -0.75)}}
	case "diamond":
		return [][]point{{v(0, -1.3), v(1.1, 0), v(0, 1.3), v(-1.1, 0)}}
	case "cross":
		return [][]point{{v(-0.9, -0.9), v(0.9, 0.9)}, {v(-0.9, 0.9), v(0.9, -0.9)}}
	case "plus":
		return [][]point{{v(-1.2, 0), v(1.2, 0)}, {v(0, -1.2), v(0, 1.2)}}
	}
	return [][]point{disc(p, r)}
}
