package multigrid

import (
	"context"
	"math"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// level is one grid of the hierarchy: the operator with unit diagonal,
// e_k = b_k + sum over neighbours of coef * e_neighbour.
type level struct {
	grid   *grid.Grid
	op     *volume.Operator // links are dropped once the level is built, geometry stays
	lay    volume.Layout
	coef   [][]float32 // coef[2*link]: from the upper neighbour, coef[2*link+1]: from the lower one
	shift  []int       // displacement along the first axis of each neighbour
	rows   [][]int32   // row of each neighbour, -1 beyond a side
	scale  []float64   // diagonal of the operator; dropped when the level is complete
	weight []float32   // scale of a cell over scale of its parent: residuals add up with these weights
	x, b   []float32
	xs, bs []float32 // second visit of a W-cycle
	lines  []lineFactor
	dense  []float32 // coarsest level: inverse, row by row
	slabs  int       // pieces along the last axis
	slab   int       // rows in one of them
	full   bool      // links off the axes: four colours
	serial bool      // odd periodic axis: two neighbours of one colour, kept on one goroutine
	up     *transfer // to the next finer level
}

// newLevel allocates a level for an operator.
func newLevel(m *volume.Operator) *level {
	l := &level{grid: m.Grid, op: m, lay: m.Layout}
	n := 2 * len(m.Links)
	block := volume.Block32(n+3, m.Layout.Len)
	l.x, l.b, l.weight = block[n], block[n+1], block[n+2]
	for c := 0; c < n; c++ {
		l.coef = append(l.coef, block[c])
		li := c / 2
		rows := make([]int32, m.Layout.Rows)
		s := m.Links[li].Step[0]
		for r := range rows {
			if c%2 == 0 {
				rows[r] = int32(m.UpperRow(li, r))
			} else {
				rows[r] = int32(m.LowerRow(li, r))
			}
		}
		if c%2 == 1 {
			s = -s
		}
		l.shift, l.rows = append(l.shift, s), append(l.rows, rows)
	}
	d := m.Grid.Dim()
	l.slabs = m.Grid.Axis(d - 1).Cells()
	if d == 1 {
		l.slabs = 1
	}
	l.slab = m.Layout.Rows / l.slabs
	l.full = len(m.Links) > d
	for a := 1; a < d; a++ {
		if ax := m.Grid.Axis(a); ax.IsPeriodic() && ax.Cells()%2 == 1 {
			l.serial = true
		}
	}
	return l
}

func (l *level) workers() int {
	if l.serial || l.lay.Rows*l.lay.Nx < 1<<14 || l.slabs < 8 {
		return 1
	}
	return l.op.Workers()
}

// each runs body over pieces of whole slabs, given as rows.
func (l *level) each(body func(worker, lo, hi int)) {
	volume.Parallel(l.workers(), l.slabs, func(w, a, e int) { body(w, a*l.slab, e*l.slab) })
}

// normalise fills the coefficients from the operator.
func (l *level) normalise(shift float64, adjoint bool) {
	l.scale = l.op.Layout.Vector()
	l.each(func(_, lo, hi int) {
		n := l.lay.Nx
		inv := make([]float64, n)
		for r := lo; r < hi; r++ {
			s := l.lay.Row(r)
			sc := l.scale[s:][:n]
			l.op.DiagonalRow(sc, r, shift)
			for i, d := range sc {
				inv[i] = 0
				if d > 0 {
					inv[i] = 1 / d
				}
			}
			for c := range l.coef {
				link := &l.op.Links[c/2]
				at := s // where the link is stored, and which of its sides feeds this row
				rate := link.Back
				if c%2 == 1 {
					at, rate = l.lay.Row(int(l.rows[c][r]))+l.shift[c], link.Out
				}
				if adjoint {
					rate = link.Out
					if c%2 == 1 {
						rate = link.Back
					}
				}
				normaliseRow(l.coef[c][s:][:n], rate[at:][:n], inv)
			}
		}
	})
}

func (l *level) wrap(v []float32, r int) {
	if !l.lay.PeriodicX {
		return
	}
	s, n := l.lay.Row(r), l.lay.Nx
	for g := 1; g <= l.lay.Ghost; g++ {
		v[s-g] = v[s+n-1-(g-1)%n]
		v[s+n+g-1] = v[s+(g-1)%n]
	}
}

// transfer holds the geometry between a level and the next finer one.
type transfer struct {
	merged [grid.MaxDim]bool
	parent [grid.MaxDim][]int32   // parent[d][i]: coarse cell of fine cell i along axis d
	other  [grid.MaxDim][]int32   // the second coarse cell that is interpolated from
	share  [grid.MaxDim][]float32 // its weight
	even   bool                   // first axis merged in pairs of equal width throughout
}

func newTransfer(fine, coarse *grid.Grid, merged []bool) *transfer {
	t := &transfer{}
	for d := 0; d < grid.MaxDim; d++ {
		if d >= fine.Dim() {
			t.parent[d], t.other[d], t.share[d] = []int32{0}, []int32{0}, []float32{0}
			continue
		}
		t.merged[d] = merged[d]
		f, c := fine.Axis(d), coarse.Axis(d)
		n, nc := f.Cells(), c.Cells()
		even := merged[d] && n%2 == 0
		for i := 0; i < n; i++ {
			p, o, w := i, i, 0.0
			if merged[d] {
				p, o = i/2, i/2-1+2*(i%2)
				if i == n-1 && n%2 == 1 {
					o = p - 1
				}
				delta := math.Abs(f.Center(i) - c.Center(p))
				switch {
				case o >= 0 && o < nc:
					w = delta / math.Abs(c.Center(o)-c.Center(p))
				case c.IsPeriodic():
					o = (o + nc) % nc
					w = delta / (0.5 * (c.Width(o) + c.Width(p)))
				default:
					o = p
				}
				if o != p && math.Abs(w-0.25) > 1e-6 {
					even = false
				}
			}
			t.parent[d] = append(t.parent[d], int32(p))
			t.other[d] = append(t.other[d], int32(o))
			t.share[d] = append(t.share[d], float32(w))
		}
		if d == 0 {
			t.even = even
		}
	}
	return t
}

// children returns the fine indices of coarse index c along axis d.
func (t *transfer) children(d, c int) (lo, hi int) {
	if !t.merged[d] {
		return c, c + 1
	}
	return 2 * c, min(2*c+2, len(t.parent[d]))
}

// coarsen picks the axes to merge: those with at least half as many cells as
// the longest, never below four.
func coarsen(g *grid.Grid) []bool {
	longest := 0
	for _, n := range g.Shape() {
		longest = max(longest, n)
	}
	merge := make([]bool, g.Dim())
	for d, n := range g.Shape() {
		merge[d] = n > 4 && 2*n > longest
	}
	return merge
}

const coarsestCells = 100

// assembleLevels builds the operators of all grids from the given one down to
// the coarsest: by merging links, or from the coefficients where there are
// links off the axes.
func assembleLevels(ctx context.Context, m *volume.Operator, c volume.Coefficients) ([]*level, error) {
	levels := []*level{newLevel(m)}
	for g := m.Grid; g.Cells() > coarsestCells; {
		merge := coarsen(g)
		cg := g.Coarsen(merge)
		if cg.Cells() == g.Cells() {
			break
		}
		fine := levels[len(levels)-1].op
		var cm *volume.Operator
		var err error
		if len(m.Links) == m.Grid.Dim() {
			cm, err = volume.Coarsen(fine, merge)
		} else {
			cm, err = volume.Assemble(ctx, cg, c, volume.Settings{Workers: m.Workers()})
		}
		if err != nil {
			return nil, err
		}
		l := newLevel(cm)
		l.up = newTransfer(g, cg, merge)
		levels = append(levels, l)
		g = cg
	}
	return levels, nil
}
