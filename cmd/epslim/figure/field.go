package figure

import "math"

// screenField is a vector field in points: where the lattice is on the page and how far, there, the
// field points. Components are scaled like the axes, so arrows are tangent to the curves that the
// field generates in the coordinates of the plot.
type screenField struct {
	x, y []float64
	u, v []float64 // nx*ny; v is positive downwards, as y is
	max  float64   // greatest length
}

func (d *drawing) screenField() screenField {
	f := d.Field
	sx := (d.ax.to - d.ax.from) / (d.ax.hi - d.ax.lo)
	sy := (d.ay.to - d.ay.from) / (d.ay.hi - d.ay.lo)
	s := screenField{x: make([]float64, len(f.X)), y: make([]float64, len(f.Y)),
		u: make([]float64, len(f.U)), v: make([]float64, len(f.V))}
	for i, x := range f.X {
		s.x[i] = d.ax.at(x)
	}
	for j, y := range f.Y {
		s.y[j] = d.ay.at(y)
	}
	// Scaled by the greatest component first, so that no square overflows or vanishes.
	big := 0.0
	for k := range f.U {
		big = math.Max(big, math.Max(math.Abs(f.U[k]), math.Abs(f.V[k])))
	}
	if big == 0 {
		return s
	}
	for k := range f.U {
		s.u[k], s.v[k] = f.U[k]/big*sx, f.V[k]/big*sy
		s.max = math.Max(s.max, math.Hypot(s.u[k], s.v[k]))
	}
	return s
}

func (f *VectorField) count() int {
	switch {
	case f.Count > 0:
		return f.Count
	case f.Style == Streamlines:
		return 20
	}
	return 14
}

func (d *drawing) drawField() {
	d.s.begin("field", d.Field.Label)
	defer d.s.end()
	f := d.screenField()
	if f.max == 0 {
		return
	}
	if d.Field.Style == Streamlines {
		d.drawStreamlines(&f)
	} else {
		d.drawArrows(&f)
	}
}

// fieldPens are the light line of an arrow and the dark edge below it, or the reverse on paper.
func (d *drawing) fieldPens() (line, edge colour) {
	if d.Heat == nil {
		return black, white
	}
	if d.Heat.Map == Diverging {
		return colour{0, 0, 0, ""}, colour{0xff, 0xff, 0xff, ""}
	}
	return colour{0xff, 0xff, 0xff, ""}, colour{0x10, 0x10, 0x10, ""}
}

// arrowData are the arrows as drawn, in the units of the axes: tail and vector.
type arrowData struct{ x, y, u, v float64 }

// arrows are averages of the field over blocks of lattice points, centred on the blocks. The longest is
// as long as nine tenths of the distance between blocks; those below a fortieth of it are left out.
func (d *drawing) arrows(f *screenField) (tails, tips []point) {
	pitch := math.Max(d.box.width(), d.box.height()) / float64(d.Field.count())
	bx := blocks(f.x, d.box.width(), pitch)
	by := blocks(f.y, d.box.height(), pitch)
	type arrow struct{ at, v point }
	var all []arrow
	longest := 0.0
	for _, j := range by {
		for _, i := range bx {
			var a arrow
			n := float64((i[1] - i[0]) * (j[1] - j[0]))
			for l := j[0]; l < j[1]; l++ {
				for k := i[0]; k < i[1]; k++ {
					m := l*len(f.x) + k
					a.v = a.v.add(point{f.u[m] / n, f.v[m] / n})
					a.at = a.at.add(point{f.x[k] / n, f.y[l] / n})
				}
			}
			if !d.box.contains(a.at) {
				continue
			}
			longest = math.Max(longest, a.v.norm())
			all = append(all, a)
		}
	}
	if longest == 0 {
		return nil, nil
	}
	for _, a := range all {
		v := a.v.times(0.9 * pitch / longest)
		if v.norm() < pitch/40 {
			continue
		}
		tails = append(tails, a.at.sub(v.times(0.5)))
		tips = append(tips, a.at.add(v.times(0.5)))
	}
	return tails, tips
}

// blocks groups lattice coordinates (increasing or decreasing on the page) into runs of equal number,
// about one pitch long.
func blocks(at []float64, length, pitch float64) (out [][2]int) {
	n := int(math.Max(1, math.Round(length/pitch)))
	n = min(n, len(at))
	for k := range n {
		out = append(out, [2]int{k * len(at) / n, (k + 1) * len(at) / n})
	}
	return out
}

func (d *drawing) drawArrows(f *screenField) {
	line, edge := d.fieldPens()
	tails, tips := d.arrows(f)
	for _, p := range []struct {
		c    colour
		grow float64
	}{{edge, 0.55}, {line, 0}} {
		var shafts, heads [][]point
		for i := range tails {
			shaft, head := arrowShape(tails[i], tips[i], p.grow)
			shafts = append(shafts, clipLine(shaft, d.box)...)
			if h := clipPolygon(head, d.box); h != nil {
				heads = append(heads, h)
			}
		}
		d.s.line(shafts, false, pen{colour: p.c, width: 0.75 + 1.6*p.grow})
		d.s.polygon(heads, p.c, 1)
	}
}

// arrowShape is the shaft and the head of an arrow; grow widens the head on all sides.
func arrowShape(tail, tip point, grow float64) (shaft, head []point) {
	v := tip.sub(tail)
	n := v.norm()
	e := v.times(1 / n)
	side := point{-e.y, e.x}
	l := math.Min(3.8, 0.5*n)
	base := tip.sub(e.times(l))
	w := 0.40*l + 1.3*grow
	return []point{tail.sub(e.times(grow)), base},
		[]point{tip.add(e.times(2 * grow)), base.sub(e.times(grow)).add(side.times(w)), base.sub(e.times(grow)).sub(side.times(w))}
}

// sample interpolates the field bilinearly; ok is false outside the lattice.
func (f *screenField) sample(p point) (v point, ok bool) {
	i, a, ok1 := locate(f.x, p.x)
	j, b, ok2 := locate(f.y, p.y)
	if !ok1 || !ok2 {
		return point{}, false
	}
	nx := len(f.x)
	at := func(c []float64) float64 {
		return (1-b)*((1-a)*c[j*nx+i]+a*c[j*nx+i+1]) + b*((1-a)*c[(j+1)*nx+i]+a*c[(j+1)*nx+i+1])
	}
	return point{at(f.u), at(f.v)}, true
}

// locate finds the interval of a monotonic sequence that holds v, and where in it. Half an interval beyond
// the ends still counts, so that a lattice of cell centres covers its cells.
func locate(at []float64, v float64) (i int, t float64, ok bool) {
	n := len(at)
	sign := 1.0
	if at[n-1] < at[0] {
		sign = -1
	}
	lo, hi := 0, n-2
	for lo < hi {
		mid := (lo + hi + 1) / 2
		if sign*(v-at[mid]) >= 0 {
			lo = mid
		} else {
			hi = mid - 1
		}
	}
	t = (v - at[lo]) / (at[lo+1] - at[lo])
	if t < -0.5 || t > 1.5 {
		return 0, 0, false
	}
	return lo, math.Max(0, math.Min(1, t)), true
}
