package figure

import "math"

// pathColour is the colour of a sample path on a heat map and that of the edge below it, which makes it
// stand out from every colour of the map.
func pathColour(i int) (c, edge colour) {
	light := colour{0xff, 0xff, 0xff, ""}
	dark := colour{0x10, 0x10, 0x10, ""}
	switch i % 4 {
	case 0:
		return light, dark
	case 1:
		return colour{0xd5, 0x5e, 0x00, ""}, light
	case 2:
		return dark, light
	default:
		return colour{0xcc, 0x79, 0xa7, ""}, dark
	}
}

// pathStyle is the look of path i: without a heat map below it that of a series.
func (d *drawing) pathStyle(i int) (c, edge colour, dash []float64) {
	if d.Heat == nil {
		c, dash, _ = d.lineStyle(i + len(d.Series))
		return c, white, dash
	}
	c, edge = pathColour(i)
	return c, edge, nil
}

const pathWidth = 0.85

func (d *drawing) drawPath(i int) {
	p := &d.Paths[i]
	n := len(p.X)
	if n == 0 {
		return
	}
	c, edge, dash := d.pathStyle(i)
	d.s.begin("path", p.Label)
	defer d.s.end()
	lines := d.pathLines(p)
	if d.Heat != nil {
		d.s.line(lines, false, pen{colour: edge, width: pathWidth + 0.9})
	}
	d.s.line(lines, false, pen{colour: c, width: pathWidth, dash: dash})
	if d.Heat == nil {
		return
	}
	for k, marker := range []string{"disc", "square"} {
		at := d.at(d.wrapped(p.X[k*(n-1)], d.X), d.wrapped(p.Y[k*(n-1)], d.Y))
		if !d.box.contains(at) {
			continue
		}
		d.s.polygon(markerShape(at, marker, 2.6), edge, 1)
		d.s.polygon(markerShape(at, marker, 1.8), c, 1)
	}
}

// wrapped moves a coordinate into the range of a periodic axis.
func (d *drawing) wrapped(v float64, a Axis) float64 {
	if !a.Periodic {
		return v
	}
	period := a.Max - a.Min
	w := v - period*math.Floor((v-a.Min)/period)
	return math.Min(w, a.Max)
}

// pathLines is a path as it is drawn: on periodic axes it leaves the box at one side and returns at
// the opposite one. Steps of more than half a period are taken to have gone the other way round.
func (d *drawing) pathLines(p *Path) [][]point {
	var out, pieces [][]point
	var cur []point
	for k := range p.X {
		x, y := d.wrapped(p.X[k], d.X), d.wrapped(p.Y[k], d.Y)
		if len(cur) == 0 {
			cur = []point{{x, y}}
			continue
		}
		last := cur[len(cur)-1]
		dx, dy := turnsBetween(last.x, x, d.X), turnsBetween(last.y, y, d.Y)
		if dx == 0 && dy == 0 {
			cur = append(cur, point{x, y})
			continue
		}
		// The step crosses a side: its first part leaves from last, its second arrives at (x, y).
		cur = append(cur, point{x - dx, y - dy})
		pieces = append(pieces, cur)
		cur = []point{{last.x + dx, last.y + dy}, {x, y}}
	}
	pieces = append(pieces, cur)
	for _, piece := range pieces {
		pts := make([]point, len(piece))
		for k, q := range piece {
			pts[k] = d.at(q.x, q.y)
		}
		out = append(out, clipLine(simplify(pts, 0.06), d.box)...)
	}
	return out
}

// turnsBetween is the period by which b must be moved back to be next to a, or zero.
func turnsBetween(a, b float64, ax Axis) float64 {
	if !ax.Periodic {
		return 0
	}
	period := ax.Max - ax.Min
	return period * math.Round((b-a)/period)
}
