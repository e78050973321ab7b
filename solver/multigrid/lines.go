package multigrid

import "epslim/solver/volume"

// lineFactor holds the elimination of all lines along one axis:
// inv = 1/(1 - lower*ratio of the cell before), ratio = upper*inv.
type lineFactor struct{ inv, ratio []float32 }

// factorLines eliminates the lines along every axis with more than one cell.
// Periodic lines are cut where they close; the coupling across the cut is
// lagged.
func (l *level) factorLines() {
	d := l.grid.Dim()
	l.lines = make([]lineFactor, d)
	for a := 0; a < d; a++ {
		f := lineFactor{make([]float32, l.lay.Len), make([]float32, l.lay.Len)}
		l.lines[a] = f
		up, down := l.coef[2*a], l.coef[2*a+1]
		if a == 0 {
			l.each(func(_, lo, hi int) {
				for r := lo; r < hi; r++ {
					s := l.lay.Row(r)
					prev := 0.0
					for i := s; i < s+l.lay.Nx; i++ {
						low := float64(down[i])
						if i == s {
							low = 0
						}
						inv := 1 / pivot(1-low*prev)
						prev = float64(up[i]) * inv
						f.inv[i], f.ratio[i] = float32(inv), float32(prev)
					}
				}
			})
			continue
		}
		l.eachLine(a, func(rows []int) {
			prev := make([]float64, l.lay.Nx)
			for q, r := range rows {
				s := l.lay.Row(r)
				for i := range prev {
					low := float64(down[s+i])
					if q == 0 {
						low = 0
					}
					inv := 1 / pivot(1-low*prev[i])
					prev[i] = float64(up[s+i]) * inv
					f.inv[s+i], f.ratio[s+i] = float32(inv), float32(prev[i])
				}
			}
		})
	}
}

// pivot keeps a line that is cut off from all others solvable: its correction
// is then left to the coarser grids.
func pivot(p float64) float64 {
	if p < 1e-6 {
		return 1e-6
	}
	return p
}

// eachLine calls body with the rows of every line of rows along axis a > 0.
func (l *level) eachLine(a int, body func(rows []int)) {
	ny, nz := l.lay.Shape(1), l.lay.Shape(2)
	n, other, step, stride := ny, nz, 1, ny
	if a == 2 {
		n, other, step, stride = nz, ny, ny, 1
	}
	volume.Parallel(l.workers(), other, func(_, lo, hi int) {
		rows := make([]int, n)
		for o := lo; o < hi; o++ {
			for q := range rows {
				rows[q] = o*stride + q*step
			}
			body(rows)
		}
	})
}

// lineSweep runs zebra Gauss-Seidel over the lines along all axes in turn,
// backwards with reverse.
func (l *level) lineSweep(x, b []float32, reverse bool) {
	if l.lines == nil {
		l.factorLines()
	}
	d := l.grid.Dim()
	for q := 0; q < d; q++ {
		a := q
		if reverse {
			a = d - 1 - q
		}
		if l.grid.Axis(a).Cells() == 1 {
			continue
		}
		for colour := 0; colour < 2; colour++ {
			c := colour
			if reverse {
				c = 1 - colour
			}
			if a == 0 {
				l.linesAlongRows(x, b, c)
			} else {
				l.linesAcrossRows(a, x, b, c)
			}
		}
	}
}

// linesAlongRows solves the rows of one colour.
func (l *level) linesAlongRows(x, b []float32, colour int) {
	f := l.lines[0]
	down := l.coef[1]
	n := l.lay.Nx
	periodic := l.lay.PeriodicX
	if l.full && l.grid.Dim() == 3 {
		// Links off the axes reach rows of the same colour: one goroutine.
		l.rowLines(0, l.lay.Rows, x, b, colour, f, down, n, periodic)
		return
	}
	l.each(func(_, lo, hi int) { l.rowLines(lo, hi, x, b, colour, f, down, n, periodic) })
}

const lineGroup = 4

func (l *level) rowLines(lo, hi int, x, b []float32, colour int, f lineFactor, down []float32, n int, periodic bool) {
	v := l.views()
	var rhs [lineGroup][]float32
	for q := range rhs {
		rhs[q] = make([]float32, n)
	}
	var group [lineGroup]int
	count := 0
	flush := func() {
		if count == lineGroup {
			solveFour(rhs, x, &group, f, down, n)
		} else {
			for q := 0; q < count; q++ {
				solveOne(rhs[q], x, group[q], f, down, n)
			}
		}
		count = 0
	}
	for r := lo; r < hi; r++ {
		if l.colourOf(r) != colour {
			continue
		}
		s := l.lay.Row(r)
		v.set(l, x, r)
		g := rhs[count]
		copy(g, b[s:][:n])
		for c := range v.coef {
			if c < 2 {
				continue
			}
			co, nb := v.coef[c], v.nb[c][:n]
			for i := range g {
				g[i] += float32(co[i] * nb[i])
			}
		}
		if periodic {
			g[0] += l.coef[1][s] * x[s+n-1]
			g[n-1] += l.coef[0][s+n-1] * x[s]
		}
		group[count] = s
		if count++; count == lineGroup {
			flush()
		}
	}
	flush()
	for r := lo; r < hi; r++ {
		if l.colourOf(r) == colour {
			l.wrap(x, r)
		}
	}
}

func solveOne(t, x []float32, s int, f lineFactor, down []float32, n int) {
	inv, ratio, low := f.inv[s:][:n], f.ratio[s:][:n], down[s:][:n]
	var p float32
	for i := range t {
		if i > 0 {
			p = float32(low[i] * p)
		}
		p = float32((t[i] + p) * inv[i])
		t[i] = p
	}
	y := x[s:][:n]
	p = 0
	for i := n - 1; i >= 0; i-- {
		if i == n-1 {
			p = t[i]
		} else {
			p = t[i] + float32(ratio[i]*p)
		}
		y[i] = p
	}
}

// solveFour interleaves four independent lines to hide the latency of the
// recurrences; the arithmetic is that of solveOne.
func solveFour(t [lineGroup][]float32, x []float32, at *[lineGroup]int, f lineFactor, down []float32, n int) {
	t0, t1, t2, t3 := t[0][:n], t[1][:n], t[2][:n], t[3][:n]
	i0, i1, i2, i3 := f.inv[at[0]:][:n], f.inv[at[1]:][:n], f.inv[at[2]:][:n], f.inv[at[3]:][:n]
	d0, d1, d2, d3 := down[at[0]:][:n], down[at[1]:][:n], down[at[2]:][:n], down[at[3]:][:n]
	p0, p1, p2, p3 := float32(t0[0]*i0[0]), float32(t1[0]*i1[0]), float32(t2[0]*i2[0]), float32(t3[0]*i3[0])
	t0[0], t1[0], t2[0], t3[0] = p0, p1, p2, p3
	for i := 1; i < n; i++ {
		p0 = float32((t0[i] + float32(d0[i]*p0)) * i0[i])
		p1 = float32((t1[i] + float32(d1[i]*p1)) * i1[i])
		p2 = float32((t2[i] + float32(d2[i]*p2)) * i2[i])
		p3 = float32((t3[i] + float32(d3[i]*p3)) * i3[i])
		t0[i], t1[i], t2[i], t3[i] = p0, p1, p2, p3
	}
	r0, r1, r2, r3 := f.ratio[at[0]:][:n], f.ratio[at[1]:][:n], f.ratio[at[2]:][:n], f.ratio[at[3]:][:n]
	y0, y1, y2, y3 := x[at[0]:][:n], x[at[1]:][:n], x[at[2]:][:n], x[at[3]:][:n]
	y0[n-1], y1[n-1], y2[n-1], y3[n-1] = p0, p1, p2, p3
	for i := n - 2; i >= 0; i-- {
		p0 = t0[i] + float32(r0[i]*p0)
		p1 = t1[i] + float32(r1[i]*p1)
		p2 = t2[i] + float32(r2[i]*p2)
		p3 = t3[i] + float32(r3[i]*p3)
		y0[i], y1[i], y2[i], y3[i] = p0, p1, p2, p3
	}
}

const columnBlock = 64

// linesAcrossRows solves the lines of one colour along axis a > 0. The colour
// of a line is the parity of its column plus that of its place along the
// remaining axis. Columns are taken in blocks that stay in the cache between
// the two passes.
func (l *level) linesAcrossRows(a int, x, b []float32, colour int) {
	n := l.lay.Nx
	blocks := (n + columnBlock - 1) / columnBlock
	ny, nz := l.lay.Shape(1), l.lay.Shape(2)
	length, other, step, stride := ny, nz, 1, ny
	if a == 2 {
		length, other, step, stride = nz, ny, ny, 1
	}
	workers := l.workers()
	if l.lay.PeriodicX && n%2 == 1 || l.full {
		workers = 1
	}
	body := func(_, lo, hi int) {
		v := l.views()
		for t := lo; t < hi; t++ {
			o, i0 := t/blocks, t%blocks*columnBlock
			first := i0 + (colour+o)&1
			l.solveColumns(v, a, x, b, o*stride, step, length, first, min(i0+columnBlock, n))
		}
	}
	volume.Parallel(workers, other*blocks, body)
	if l.lay.PeriodicX {
		for r := 0; r < l.lay.Rows; r++ {
			l.wrap(x, r)
		}
	}
}

// solveColumns solves every second column from first to end along the rows
// row0, row0+step, ...
func (l *level) solveColumns(v *views, a int, x, b []float32, row0, step, length, first, end int) {
	f := l.lines[a]
	m := end - first
	if m <= 0 {
		return
	}
	periodic := l.grid.Axis(a).IsPeriodic()
	for q := 0; q < length; q++ {
		r := row0 + q*step
		s := l.lay.Row(r) + first
		t := v.buf[:m]
		bb := b[s:][:m]
		for i := 0; i < m; i += 2 {
			t[i] = bb[i]
		}
		for c := range l.coef {
			if c/2 == a {
				upper := c%2 == 0
				atCut := upper && q == length-1 || !upper && q == 0
				if upper && !atCut || atCut && !periodic {
					continue // eliminated, or beyond a side
				}
			}
			co, nb := l.coef[c][s:][:m], x[l.lay.Row(int(l.rows[c][r]))+l.shift[c]+first:][:m]
			for i := 0; i < m; i += 2 {
				t[i] += float32(co[i] * nb[i])
			}
		}
		y, inv := x[s:][:m], f.inv[s:][:m]
		for i := 0; i < m; i += 2 {
			y[i] = t[i] * inv[i]
		}
	}
	for q := length - 2; q >= 0; q-- {
		s := l.lay.Row(row0+q*step) + first
		y, next, ratio := x[s:][:m], x[l.lay.Row(row0+(q+1)*step)+first:][:m], f.ratio[s:][:m]
		for i := 0; i < m; i += 2 {
			y[i] += float32(ratio[i] * next[i])
		}
	}
}
