package figure

import (
	"fmt"
	"math"
)

// axis is an axis ready to be drawn: its range, its place and its marks.
type axis struct {
	Axis
	lo, hi float64
	label  []run
	ticks  []tick
	factor []run
	from   float64 // place of lo, in points
	to     float64 // place of hi
}

// at is the place of a value in points.
func (a *axis) at(v float64) float64 {
	t := (v - a.lo) / (a.hi - a.lo)
	if a.Log {
		t = math.Log(v/a.lo) / math.Log(a.hi/a.lo)
	}
	return a.from + t*(a.to-a.from)
}

// drawing is one rendering in progress.
type drawing struct {
	*Plot
	s      *scene
	box    rect // the area between the axes
	ax, ay axis
	scale  colourScale
	bar    rect // the colour bar, if there is a heat map
	barAx  axis
	legend []legendEntry
	rows   []legendRow // of a legend above the box
	inside *rect       // place of a legend inside the box
	flow   [][]point   // streamlines or arrows
	margin rect        // distances, not places
	flat   bool        // there is nothing to draw
}

const (
	outerPad   = 3.0
	tickLength = 3.0
	tickGap    = 2.0
	capHeight  = 0.72 // of the font, in units of its size
	frameWidth = 0.6
	barGap     = 7.0
	barWidth   = 8.5
)

// scene lays the plot out and draws it.
func (p *Plot) scene() (*scene, error) {
	d, err := p.prepare()
	if err != nil {
		return nil, err
	}
	d.draw()
	return d.s, nil
}

// prepare checks the data and finds the place of everything.
func (p *Plot) prepare() (*drawing, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	face, err := newTypeface()
	if err != nil {
		return nil, err
	}
	d := &drawing{Plot: p, s: &scene{face: face, title: p.Title, meta: p.Meta, width: p.Width.points()}}
	if err := d.ranges(); err != nil {
		return nil, err
	}
	if err := d.legends(); err != nil {
		return nil, err
	}
	if err := d.place(); err != nil {
		return nil, err
	}
	if !d.placeLegendInside() {
		d.rows = d.legendRows()
		if err := d.place(); err != nil {
			return nil, err
		}
	}
	d.s.alt = p.Alt
	if d.s.alt == "" {
		d.s.alt = d.describe()
	}
	if d.s.title == "" {
		d.s.title = d.defaultTitle()
	}
	return d, nil
}

// place finds margins and the box. Margins depend on the tick labels, those on the box, and so on;
// a few rounds settle it.
func (d *drawing) place() error {
	d.guessBox()
	for range 4 {
		d.setTicks()
		d.margins()
		d.setBox()
	}
	if d.box.width() < 20 || d.box.height() < 20 {
		return &DataError{"settings", -1, fmt.Sprintf(
			"no room for the axes: the labels leave %.1f by %.1f cm", d.box.width()/pointsPerCm, d.box.height()/pointsPerCm)}
	}
	d.setTicks()
	return nil
}

func (d *drawing) guessBox() {
	h := d.Height * pointsPerCm
	if h == 0 {
		h = 0.7 * d.s.width
	}
	d.margin = rect{35, 10, 15, 30}
	d.s.height = h
	d.setBox()
}

// equal tells whether the units of both axes have the same length.
func (d *drawing) equal() bool {
	if d.X.Log || d.Y.Log || d.Aspect == AspectFree {
		return false
	}
	ratio := (d.ay.hi - d.ay.lo) / (d.ax.hi - d.ax.lo)
	return d.Aspect == AspectEqual || d.Heat != nil && ratio < 3.0001 && ratio > 0.3333 && d.X.Pi == d.Y.Pi
}

func (d *drawing) setBox() {
	w := d.s.width - d.margin.left - d.margin.right
	var h float64
	switch {
	case d.Height > 0:
		d.s.height = d.Height * pointsPerCm
		h = d.s.height - d.margin.top - d.margin.bottom
	case d.Width == FullWidth:
		h = 0.5 * w
	default:
		h = 0.72 * w
	}
	left := d.margin.left
	if d.equal() {
		ratio := (d.ay.hi - d.ay.lo) / (d.ax.hi - d.ax.lo)
		tallest := 1.5 * d.s.width
		if d.Width == FullWidth {
			tallest = 0.75 * d.s.width
		}
		if d.Height > 0 {
			tallest = h
		}
		h = math.Min(w*ratio, tallest)
		left += (w - h/ratio) / 2
		w = h / ratio
		if d.Height > 0 {
			d.margin.top = math.Max(d.margin.top, d.s.height-d.margin.bottom-h)
		}
	}
	if d.Height <= 0 {
		d.s.height = h + d.margin.top + d.margin.bottom
	}
	round := func(v float64) float64 { return math.Round(v*100) / 100 }
	d.box = rect{round(left), round(d.margin.top), round(left + w), round(d.margin.top + h)}
	d.s.height = round(d.s.height)
	d.s.width = round(d.s.width)
	d.ax.from, d.ax.to = d.box.left, d.box.right
	d.ay.from, d.ay.to = d.box.bottom, d.box.top
	d.bar = rect{d.box.right + barGap, d.box.top, d.box.right + barGap + barWidth, d.box.bottom}
	d.barAx.from, d.barAx.to = d.bar.bottom, d.bar.top
}

// fitsAcross tells whether labels can stand beside each other below an axis.
func (d *drawing) fitsAcross(a *axis) func([]tick) bool {
	return func(t []tick) bool {
		end := math.Inf(-1)
		for _, k := range t {
			w := d.s.face.width(k.label, tickSize)
			at := a.at(k.value)
			if at-w/2 < end+7 {
				return false
			}
			end = at + w/2
		}
		return true
	}
}

// fitsAbove tells whether labels can stand above each other beside an axis.
func fitsAbove(a *axis) func([]tick) bool {
	return func(t []tick) bool {
		for i := 1; i < len(t); i++ {
			if math.Abs(a.at(t[i].value)-a.at(t[i-1].value)) < 2*tickSize {
				return false
			}
		}
		return true
	}
}

func (d *drawing) setTicks() {
	d.ax.ticks, d.ax.factor = ticks(&d.ax, d.fitsAcross(&d.ax))
	d.ay.ticks, d.ay.factor = ticks(&d.ay, fitsAbove(&d.ay))
	if d.Heat != nil {
		d.barAx.ticks, d.barAx.factor = ticks(&d.barAx, fitsAbove(&d.barAx))
	}
}

// labelWidth is the width of the widest tick label of an axis, with some slack for other fonts.
func (d *drawing) labelWidth(a *axis) float64 {
	w := 0.0
	for _, t := range a.ticks {
		w = math.Max(w, d.s.face.width(t.label, tickSize))
	}
	return fontSlack * w
}

func (d *drawing) margins() {
	m := rect{left: outerPad + tickLength + tickGap + d.labelWidth(&d.ay), right: outerPad + 1,
		top: outerPad + tickSize*capHeight/2, bottom: outerPad + tickLength + tickGap + tickSize*capHeight + 1}
	if len(d.ay.label) > 0 {
		m.left += labelSize*1.3 + 1
	}
	if len(d.ax.label) > 0 || len(d.ax.factor) > 0 {
		m.bottom += labelSize*1.35 + 1
	}
	if len(d.ay.factor) > 0 || len(d.barAx.factor) > 0 {
		m.top = outerPad + tickSize*1.35
	}
	for _, t := range d.ax.ticks { // a label near the end of the axis sticks out
		w := d.s.face.width(t.label, tickSize) / 2
		m.right = math.Max(m.right, outerPad+w-(d.box.right-d.ax.at(t.value)))
		m.left = math.Max(m.left, outerPad+w-(d.ax.at(t.value)-d.box.left))
	}
	if d.Heat != nil {
		r := barGap + barWidth + tickLength + tickGap + d.labelWidth(&d.barAx) + outerPad
		if len(d.barAx.label) > 0 {
			r += labelSize*1.3 + 1
		}
		r = math.Max(r, barGap+d.s.face.width(d.barAx.factor, tickSize)+outerPad)
		m.right = math.Max(m.right, r)
	}
	m.top += float64(len(d.rows)) * legendLine
	if len(d.rows) > 0 {
		m.top += 2
	}
	d.margin = m
}
