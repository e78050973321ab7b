package figure

import "math"

// streamlines traces evenly spaced lines along the field: a candidate is kept away from lines already
// drawn by one pitch, and a line ends where it comes closer than half of that to another one, closes on
// itself, leaves the box, or meets a place where the field nearly vanishes. The idea is that of B.
// Jobard and W. Lefer, "Creating evenly-spaced streamlines of arbitrary density" (1997); seeds are
// taken from a fixed lattice, so the result is the same on every run.
func (d *drawing) streamlines(f *screenField) [][]point {
	pitch := math.Max(d.box.width(), d.box.height()) / float64(d.Field.count())
	grid := newNeighbours(d.box, pitch/2)
	var out [][]point
	nx, ny := int(2*d.box.width()/pitch), int(2*d.box.height()/pitch)
	for _, k := range latticeOrder(nx, ny) {
		seed := point{d.box.left + (float64(k[0])+0.5)/float64(nx)*d.box.width(),
			d.box.bottom - (float64(k[1])+0.5)/float64(ny)*d.box.height()}
		if grid.closeTo(seed, pitch*0.9) {
			continue
		}
		line := d.trace(f, grid, seed, pitch)
		if length(line) < 1.2*pitch {
			continue
		}
		for _, p := range line {
			grid.add(p)
		}
		out = append(out, line)
	}
	return out
}

// latticeOrder visits a lattice coarsely first, so that long lines are found before the gaps are filled.
func latticeOrder(nx, ny int) (out [][2]int) {
	for _, phase := range [][3]int{{4, 2, 2}, {4, 0, 0}, {2, 1, 1}, {2, 0, 1}, {1, 0, 0}} {
		for j := phase[2]; j < ny; j += phase[0] {
			for i := phase[1]; i < nx; i += phase[0] {
				out = append(out, [2]int{i, j})
			}
		}
	}
	return out
}

// trace follows the field from a seed both ways.
func (d *drawing) trace(f *screenField, grid *neighbours, seed point, pitch float64) []point {
	back, _ := d.traceOneWay(f, grid, seed, -1, pitch)
	forward, closed := d.traceOneWay(f, grid, seed, 1, pitch)
	if closed {
		return append([]point{seed}, forward...)
	}
	line := make([]point, 0, len(back)+len(forward)+1)
	for i := len(back) - 1; i >= 0; i-- {
		line = append(line, back[i])
	}
	return append(append(line, seed), forward...)
}

// traceOneWay steps along the direction of the field with the classical Runge-Kutta method, a
// fixed length a step.
func (d *drawing) traceOneWay(f *screenField, grid *neighbours, p point, sign, pitch float64) (line []point, closed bool) {
	const step = 0.8
	seed := p
	direction := func(q point) (point, bool) {
		v, ok := f.sample(q)
		n := v.norm()
		if !ok || n < 0.01*f.max {
			return point{}, false
		}
		return v.times(sign / n), true
	}
	for k := 0; k < 4000; k++ {
		k1, ok1 := direction(p)
		k2, ok2 := direction(p.add(k1.times(step / 2)))
		k3, ok3 := direction(p.add(k2.times(step / 2)))
		k4, ok4 := direction(p.add(k3.times(step)))
		if !ok1 || !ok2 || !ok3 || !ok4 {
			return line, false
		}
		p = p.add(k1.add(k2.times(2)).add(k3.times(2)).add(k4).times(step / 6))
		if !d.box.contains(p) || grid.closeTo(p, pitch/2) {
			return line, false
		}
		line = append(line, p)
		if k > 10 && p.near(seed, step) {
			return append(line, seed), true
		}
	}
	return line, false
}

func length(line []point) float64 {
	n := 0.0
	for i := 1; i < len(line); i++ {
		n += line[i].sub(line[i-1]).norm()
	}
	return n
}

func (d *drawing) drawStreamlines(f *screenField) {
	line, edge := d.fieldPens()
	var lines, heads, edges [][]point
	for _, l := range d.streamlines(f) {
		lines = append(lines, simplify(l, 0.05))
		for _, at := range headPlaces(l) {
			v := l[at+1].sub(l[at])
			v = v.times(1 / v.norm())
			_, h := arrowShape(l[at].sub(v.times(8)), l[at].add(v.times(2)), 0)
			_, e := arrowShape(l[at].sub(v.times(8)), l[at].add(v.times(2)), 0.5)
			if d.box.contains(h[0]) && d.box.contains(h[1]) && d.box.contains(h[2]) {
				heads = append(heads, h)
				edges = append(edges, e)
			}
		}
	}
	d.s.line(lines, false, pen{colour: edge, width: 1.7})
	d.s.polygon(edges, edge, 1)
	d.s.line(lines, false, pen{colour: line, width: 0.75})
	d.s.polygon(heads, line, 1)
}

// headPlaces are the indices along a line where an arrow head sits: the middle, or thirds of a long line.
func headPlaces(l []point) []int {
	n := len(l)
	if length(l) > 150 {
		return []int{n / 6, n / 2, 5 * n / 6}
	}
	return []int{n / 2}
}

// neighbours finds points that are near a place.
type neighbours struct {
	box    rect
	size   float64
	nx, ny int
	cells  [][]point
}

func newNeighbours(box rect, size float64) *neighbours {
	n := &neighbours{box: box, size: size, nx: int(box.width()/size) + 1, ny: int(box.height()/size) + 1}
	n.cells = make([][]point, n.nx*n.ny)
	return n
}

func (n *neighbours) cell(p point) (i, j int) {
	i = int((p.x - n.box.left) / n.size)
	j = int((p.y - n.box.top) / n.size)
	return max(0, min(n.nx-1, i)), max(0, min(n.ny-1, j))
}

func (n *neighbours) add(p point) {
	i, j := n.cell(p)
	n.cells[j*n.nx+i] = append(n.cells[j*n.nx+i], p)
}

func (n *neighbours) closeTo(p point, dist float64) bool {
	reach := int(math.Ceil(dist / n.size))
	ci, cj := n.cell(p)
	for j := max(0, cj-reach); j <= min(n.ny-1, cj+reach); j++ {
		for i := max(0, ci-reach); i <= min(n.nx-1, ci+reach); i++ {
			for _, q := range n.cells[j*n.nx+i] {
				if p.near(q, dist) {
					return true
				}
			}
		}
	}
	return false
}
