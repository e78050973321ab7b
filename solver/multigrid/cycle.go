package multigrid

import (
	"epslim/solver/grid"
	"epslim/solver/volume"
)

// views collects the coefficient and neighbour slices of one row; every worker
// has its own.
type views struct {
	coef, nb [][]float32
	buf, acc []float32
}

func (l *level) views() *views {
	n := len(l.coef)
	return &views{make([][]float32, n), make([][]float32, n), make([]float32, l.lay.Nx+2), make([]float32, l.lay.Nx+2)}
}

func (v *views) set(l *level, x []float32, r int) {
	s, n := l.lay.Row(r), l.lay.Nx
	for c := range l.coef {
		v.coef[c] = l.coef[c][s:][:n]
		v.nb[c] = x[l.lay.Row(int(l.rows[c][r]))+l.shift[c]:][:n]
	}
}

// relaxPoint updates one colour of row r.
func (l *level) relaxPoint(v *views, x, b []float32, r, first int) {
	s, n := l.lay.Row(r), l.lay.Nx
	v.set(l, x, r)
	relaxRow(x[s:][:n], b[s:][:n], v.coef, v.nb, first)
	l.wrap(x, r)
}

// colourOf returns 0 or 1 for the colour of the first cell of row r.
func (l *level) colourOf(r int) int {
	j, k := l.lay.RowCoordinates(r)
	return (j + k) & 1
}

// half runs the first (half 0) or second (half 1) half of a point sweep on row
// r. Without links off the axes the halves are the two colours of the
// chessboard. With them the halves are the even and the odd rows, each with
// its even cells before its odd ones.
func (l *level) half(v *views, x, b []float32, r, half int) {
	c := l.colourOf(r)
	if !l.full {
		l.relaxPoint(v, x, b, r, c^half)
		return
	}
	if c == half {
		l.relaxPoint(v, x, b, r, half)
		l.relaxPoint(v, x, b, r, 1-half)
	}
}

// halfSlab runs half a sweep on slab q.
func (l *level) halfSlab(v *views, x, b []float32, q, half int) {
	for r := q * l.slab; r < (q+1)*l.slab; r++ {
		l.half(v, x, b, r, half)
	}
}

// startSlab runs the first half of a sweep that starts from zero on slab q.
func (l *level) startSlab(x, b []float32, q int) {
	n := l.lay.Nx
	for r := q * l.slab; r < (q+1)*l.slab; r++ {
		s := l.lay.Row(r)
		relaxZero(x[s:][:n], b[s:][:n], l.colourOf(r))
		l.wrap(x, r)
	}
}

// sweep is one Gauss-Seidel sweep over both halves. The second half follows
// the first one slab behind, so that both pass through the cache together; the
// slabs at the ends of a worker's piece wait until all workers are there. The
// result does not depend on the number of workers.
func (l *level) sweep(x, b []float32, reverse bool) {
	if l.full && l.grid.Dim() == 3 {
		l.sweepClasses(x, b, reverse)
		return
	}
	first := 0
	if reverse {
		first = 1
	}
	workers := l.workers()
	volume.Parallel(workers, l.slabs, func(_, a, e int) {
		v := l.views()
		for q := a; q < e; q++ {
			l.halfSlab(v, x, b, q, first)
			if q-1 > a {
				l.halfSlab(v, x, b, q-1, 1-first)
			}
		}
	})
	volume.Parallel(workers, l.slabs, func(_, a, e int) {
		v := l.views()
		l.halfSlab(v, x, b, a, 1-first)
		if e-1 > a {
			l.halfSlab(v, x, b, e-1, 1-first)
		}
	})
}

// canFuse reports whether smoothing and the transfer to the coarser level c can
// share one pass through the memory: the last axis is merged, the point smoother
// needs no more than the neighbouring slabs, and the pieces are long enough.
func (l *level) canFuse(c *level, kind cycleKind) bool {
	d := l.grid.Dim()
	return !kind.line && !l.full && d > 1 && c.up.merged[d-1] && l.slabs >= 8*l.workers() && l.slabs%2 == 0
}

// down is a sweep from zero followed by the restriction of the residual, in one
// pass: coarse slab J is formed when the fine slabs up to 2J+2 are relaxed.
// What depends on the pieces of other workers follows after they are done. The
// arithmetic is that of sweep and restrict.
func (l *level) down(c *level, x, b []float32) {
	workers := l.workers()
	piece := func(body func(v *views, a, e int)) {
		volume.Parallel(workers, c.slabs, func(_, lo, hi int) { body(l.views(), 2*lo, 2*hi) })
	}
	piece(func(v *views, a, e int) {
		for q := a; q < e; q++ {
			l.startSlab(x, b, q)
			if q-1 <= a {
				continue
			}
			l.halfSlab(v, x, b, q-1, 1)
			if J := (q - 3) / 2; q%2 == 1 && 2*J >= a+2 {
				l.restrictSlab(c, v, x, b, J)
			}
		}
	})
	piece(func(v *views, a, e int) {
		l.halfSlab(v, x, b, a, 1)
		l.halfSlab(v, x, b, e-1, 1)
	})
	piece(func(v *views, a, e int) {
		for J := a / 2; J < e/2; J++ {
			if 2*J < a+2 || 2*J+2 > e-2 {
				l.restrictSlab(c, v, x, b, J)
			}
		}
	})
}

// climb is the interpolation of the coarse correction followed by a sweep in
// reverse order, in one pass.
func (l *level) climb(c *level, x, b []float32) {
	workers := l.workers()
	volume.Parallel(workers, l.slabs, func(_, a, e int) {
		v, vc := l.views(), c.views()
		for q := a; q < e; q++ {
			l.prolongSlab(c, vc, x, c.x, q, false)
			if q-1 > a {
				l.halfSlab(v, x, b, q-1, 1)
			}
			if q-2 > a+1 {
				l.halfSlab(v, x, b, q-2, 0)
			}
		}
	})
	volume.Parallel(workers, l.slabs, func(_, a, e int) {
		v := l.views()
		l.halfSlab(v, x, b, a, 1)
		l.halfSlab(v, x, b, e-1, 1)
	})
	volume.Parallel(workers, l.slabs, func(_, a, e int) {
		v := l.views()
		for _, q := range [4]int{a, a + 1, e - 2, e - 1} {
			l.halfSlab(v, x, b, q, 0)
		}
	})
}

// sweepClasses runs over the four parities of rows one after another: links
// off the axes join neighbours in all three directions.
func (l *level) sweepClasses(x, b []float32, reverse bool) {
	for step := 0; step < 4; step++ {
		class := step
		if reverse {
			class = 3 - step
		}
		l.each(func(_, lo, hi int) {
			v := l.views()
			for r := lo; r < hi; r++ {
				j, k := l.lay.RowCoordinates(r)
				if j&1|(k&1)<<1 != class {
					continue
				}
				first := 0
				if reverse {
					first = 1
				}
				l.relaxPoint(v, x, b, r, first)
				l.relaxPoint(v, x, b, r, 1-first)
			}
		})
	}
}

// restrict adds the weighted residuals of the children into the right-hand
// side of the coarser level.
func (l *level) restrict(c *level, x, b []float32) {
	volume.Parallel(c.workers(), c.slabs, func(_, lo, hi int) {
		v := l.views()
		for J := lo; J < hi; J++ {
			l.restrictSlab(c, v, x, b, J)
		}
	})
}

func (l *level) restrictSlab(c *level, v *views, x, b []float32, slab int) {
	for R := slab * c.slab; R < (slab+1)*c.slab; R++ {
		l.restrictRow(c, v, x, b, R)
	}
}

func (l *level) restrictRow(c *level, v *views, x, b []float32, R int) {
	n, nc := l.lay.Nx, c.lay.Nx
	J, K := c.lay.RowCoordinates(R)
	dst := c.b[c.lay.Row(R):][:nc]
	acc, buf := v.acc[:n], v.buf[:n]
	j0, j1 := c.up.children(1, J)
	k0, k1 := c.up.children(2, K)
	rows, left := 0, (j1-j0)*(k1-k0)
	for k := k0; k < k1; k++ {
		for j := j0; j < j1; j++ {
			r := j + l.lay.Shape(1)*k
			s := l.lay.Row(r)
			v.set(l, x, r)
			into := buf
			if rows == 0 {
				into = acc
			}
			residualRow(into, x[s:][:n], b[s:][:n], l.weight[s:][:n], v.coef, v.nb)
			if rows++; rows > 1 && rows < left {
				blendRow(acc, acc, buf, 1, 1)
			}
		}
	}
	if left == 1 {
		clear(buf)
	}
	if c.up.merged[0] {
		pairSum(dst, acc, buf)
	} else {
		blendRow(dst, acc, buf, 1, 1)
	}
}

// prolong adds to x (or, with set, replaces it by) the values of the coarser
// level, interpolated linearly in every merged direction.
func (l *level) prolong(c *level, x, xc []float32, set bool) {
	volume.Parallel(l.workers(), l.slabs, func(_, lo, hi int) {
		v := c.views()
		for q := lo; q < hi; q++ {
			l.prolongSlab(c, v, x, xc, q, set)
		}
	})
}

func (l *level) prolongSlab(c *level, v *views, x, xc []float32, slab int, set bool) {
	for r := slab * l.slab; r < (slab+1)*l.slab; r++ {
		t := c.blendRows(v, xc, l, r)
		f := x[l.lay.Row(r):][:l.lay.Nx]
		if set {
			clear(f)
		}
		c.spread(f, t)
		l.wrap(x, r)
	}
}

// blendRows interpolates the coarse rows around fine row r across the rows. The
// result has one more value at either end.
func (c *level) blendRows(v *views, xc []float32, l *level, r int) []float32 {
	j, k := l.lay.RowCoordinates(r)
	n := c.lay.Nx
	ext := v.acc[:n+2]
	t := ext[1 : n+1]
	ny := c.lay.Shape(1)
	row := func(J, K int32) []float32 { return xc[c.lay.Row(int(J)+ny*int(K)):][:n] }
	p1, o1, w1 := c.up.parent[1][j], c.up.other[1][j], c.up.share[1][j]
	p2, o2, w2 := c.up.parent[2][k], c.up.other[2][k], c.up.share[2][k]
	blendRow(t, row(p1, p2), row(o1, p2), 1-w1, w1)
	if w2 != 0 {
		buf := v.buf[:n]
		blendRow(buf, row(p1, o2), row(o1, o2), 1-w1, w1)
		blendRow(t, t, buf, 1-w2, w2)
	}
	ext[0], ext[n+1] = t[0], t[n-1]
	if c.lay.PeriodicX {
		ext[0], ext[n+1] = t[n-1], t[0]
	}
	return ext
}

// spread interpolates along the row.
func (c *level) spread(f, ext []float32) {
	t := ext[1 : len(ext)-1]
	switch {
	case !c.up.merged[0]:
		blendRow(f, f, t, 1, 1)
	case c.up.even:
		spreadRow(f, ext)
	default:
		p, o, w := c.up.parent[0], c.up.other[0], c.up.share[0]
		for i := range f {
			f[i] += float32((1-w[i])*t[p[i]]) + float32(w[i]*t[o[i]])
		}
	}
}

// cycleKind says how a cycle smooths and how often it visits the coarse levels.
type cycleKind struct {
	line  bool
	twice int // levels from this one on visit the next coarser one twice
}

// pointCycle visits the first coarse grid once in two dimensions, where a
// second visit costs as much as half a cycle, and all others twice.
func pointCycle(g *grid.Grid) cycleKind {
	if g.Dim() == 3 {
		return cycleKind{twice: 0}
	}
	return cycleKind{twice: 1}
}

// lineCycle is the W-cycle for strong advection and anisotropy.
var lineCycle = cycleKind{line: true}

// smooth is one sweep of the chosen smoother.
func (l *level) smooth(kind cycleKind, x, b []float32, reverse bool) {
	if kind.line {
		l.lineSweep(x, b, reverse)
		return
	}
	l.sweep(x, b, reverse)
}

// solveDense multiplies by the inverse kept for the coarsest level.
func (l *level) solveDense(x, b []float32) {
	nx, n := l.lay.Nx, l.lay.Nx*l.lay.Rows
	for k := 0; k < n; k++ {
		row := l.dense[k*n:][:n]
		var s float32
		for r := 0; r < l.lay.Rows; r++ {
			bb, g := b[l.lay.Row(r):][:nx], row[r*nx:][:nx]
			var part [4]float32
			for i := range g {
				part[i&3] += float32(g[i] * bb[i])
			}
			s += (part[0] + part[1]) + (part[2] + part[3])
		}
		x[l.lay.Row(k/nx)+k%nx] = s
	}
	for r := 0; r < l.lay.Rows; r++ {
		l.wrap(x, r)
	}
}

// cycle improves x for the right-hand side b of level k. With zero the
// iteration starts from nothing and x need not be cleared.
func (h *hierarchy) cycle(k int, x, b []float32, kind cycleKind, zero bool) {
	l := h.levels[k]
	if l.dense != nil {
		l.solveDense(x, b)
		return
	}
	c := h.levels[k+1]
	fuse := l.canFuse(c, kind)
	if fuse && zero {
		l.down(c, x, b)
	} else {
		if zero {
			clear(x)
		}
		l.smooth(kind, x, b, false)
		l.restrict(c, x, b)
	}
	h.cycle(k+1, c.x, c.b, kind, true)
	if k >= kind.twice && c.dense == nil {
		if c.xs == nil {
			c.xs, c.bs = make([]float32, len(c.x)), make([]float32, len(c.b))
		}
		c.residual(c.bs, c.x, c.b)
		copy(c.xs, c.x)
		h.cycleAgain(k+1, kind)
	}
	if fuse {
		l.climb(c, x, b)
		return
	}
	l.prolong(c, x, c.x, false)
	l.smooth(kind, x, b, true)
}

// cycleAgain adds a second cycle on the residual kept in bs.
func (h *hierarchy) cycleAgain(k int, kind cycleKind) {
	c := h.levels[k]
	h.cycle(k, c.x, c.bs, kind, true)
	for i, v := range c.xs {
		c.x[i] += v
	}
}

// residual writes b - A x row by row.
func (l *level) residual(r, x, b []float32) {
	l.each(func(_, lo, hi int) {
		v := l.views()
		n := l.lay.Nx
		one := v.buf[:n]
		for i := range one {
			one[i] = 1
		}
		for q := lo; q < hi; q++ {
			s := l.lay.Row(q)
			v.set(l, x, q)
			residualRow(r[s:][:n], x[s:][:n], b[s:][:n], one, v.coef, v.nb)
		}
	})
}
