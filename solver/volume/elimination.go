package volume

import (
	"fmt"
	"slices"

	"epslim/solver/grid"
)

// Elimination is the factored operator M + shift V of a small or
// one-dimensional grid. Cells are eliminated one by one in the manner of
// Grassmann, Taksar and Heyman (Oper. Res. 33 (1985) 1107-1116): diagonal
// entries are never subtracted from but summed anew from the outflows, so for
// an M-matrix every entry of the stationary vector is obtained to a small
// multiple of the rounding unit relative to itself (O'Cinneide, Numer. Math. 65
// (1993) 109-120).
type Elimination struct {
	m        *Operator
	place    []int // place[k]: position of cell k in the order of elimination, -1 for cells left out
	cell     []int // inverse
	band     int
	rate     []float64 // rate[i*(2*band+1) + j-i+band]: flow from position i to j per unit density
	total    []float64 // what leaves position i for earlier ones or for good, when it is eliminated
	singular bool
}

// EliminationCost returns the multiplications that Eliminate takes on the grid
// and the bytes it needs.
func EliminationCost(m *Operator) (flops, bytes float64) {
	order := newOrder(m.Grid)
	n := float64(m.Grid.Cells())
	b := float64(order.bandwidth(m))
	return n * b * b, 8 * n * (2*b + 2)
}

// order numbers the cells for a narrow band: the shortest axis runs fastest,
// and periodic axes are folded so that their ends are neighbours.
type order struct {
	stride [grid.MaxDim]int
	fold   [grid.MaxDim][]int
}

func newOrder(g *grid.Grid) order {
	var o order
	shape := g.Shape()
	axes := []int{0, 1, 2}[:g.Dim()]
	slices.SortStableFunc(axes, func(a, b int) int { return shape[a] - shape[b] })
	s := 1
	for _, d := range axes {
		o.stride[d] = s
		s *= shape[d]
		o.fold[d] = make([]int, shape[d])
		for i := range o.fold[d] {
			o.fold[d][i] = i
			if g.Axis(d).IsPeriodic() {
				o.fold[d][i] = min(2*i, 2*(shape[d]-1-i)+1)
			}
		}
	}
	return o
}

func (o *order) bandwidth(m *Operator) int {
	b := 0
	for _, link := range m.Links {
		s := 0
		for d := 0; d < m.Grid.Dim(); d++ {
			reach := max(link.Step[d], -link.Step[d])
			if m.Grid.Axis(d).IsPeriodic() {
				reach *= 2
			}
			s += min(reach, m.Grid.Axis(d).Cells()-1) * o.stride[d]
		}
		b = max(b, s)
	}
	return b
}

// Eliminate factors M + shift V restricted to the cells with member[k] true
// (all cells when member is nil). Flows to cells left out are kept as losses.
func Eliminate(m *Operator, shift float64, member []bool) (*Elimination, error) {
	o := newOrder(m.Grid)
	byPlace := o.cells(m.Grid)
	return eliminate(m, shift, member, byPlace, o.bandwidth(m), false)
}

// EliminateClass is Eliminate for the stationary vector of a single recurrent
// class. Where all ways out of a cell have rates below the range of floating
// point numbers, the cell keeps all mass that comes to it.
func EliminateClass(m *Operator, member []bool) (*Elimination, error) {
	o := newOrder(m.Grid)
	return eliminate(m, 0, member, o.cells(m.Grid), o.bandwidth(m), true)
}

// EliminateLast is Eliminate for all cells with the given cell eliminated last,
// without regard to the bandwidth. In the singular case Solve then returns the
// solution that vanishes in this cell; when the stationary density is large
// there, that solution is well scaled.
func EliminateLast(m *Operator, shift float64, last int) (*Elimination, error) {
	o := newOrder(m.Grid)
	byPlace := o.cells(m.Grid)
	at := slices.Index(byPlace, last)
	byPlace[0], byPlace[at] = byPlace[at], byPlace[0]
	return eliminate(m, shift, nil, byPlace, len(byPlace)-1, false)
}

// cells lists the cells in the order of their places.
func (o *order) cells(g *grid.Grid) []int {
	byPlace := make([]int, g.Cells())
	for k := range byPlace {
		pos := 0
		for d, i := range g.Coordinates(k) {
			pos += o.fold[d][i] * o.stride[d]
		}
		byPlace[pos] = k
	}
	return byPlace
}

func eliminate(m *Operator, shift float64, member []bool, byPlace []int, band int, keep bool) (*Elimination, error) {
	n := len(byPlace)
	e := &Elimination{m: m, place: make([]int, n), cell: make([]int, 0, n), band: band}
	for _, k := range byPlace {
		e.place[k] = -1
		if member == nil || member[k] {
			e.place[k] = len(e.cell)
			e.cell = append(e.cell, k)
		}
	}
	e.fill(shift)
	return e, e.factor(keep)
}

func (e *Elimination) fill(shift float64) {
	m, l := e.m, &e.m.Layout
	n, w := len(e.cell), 2*e.band+1
	e.rate, e.total = make([]float64, n*w), make([]float64, n)
	add := func(from, to int, v float64) {
		p, q := e.place[from], e.place[to]
		switch {
		case p < 0:
		case q < 0:
			e.total[p] += v
		case p != q:
			e.rate[p*w+q-p+e.band] += v
		}
	}
	for k := 0; k < m.Grid.Cells(); k++ {
		r, i := k/l.Nx, k%l.Nx
		at := l.Row(r) + i
		if p := e.place[k]; p >= 0 {
			e.total[p] += shift * m.rowVolume[r] * m.width[i]
			if m.Kill != nil {
				e.total[p] += m.Kill[at]
			}
		}
		for li := range m.Links {
			u := m.UpperRow(li, r)
			if u < 0 {
				continue
			}
			j := i + m.Links[li].Step[0]
			if j < 0 || j >= l.Nx {
				if !l.PeriodicX {
					continue
				}
				j = (j + l.Nx) % l.Nx
			}
			add(k, u*l.Nx+j, m.Links[li].Out[at])
			add(u*l.Nx+j, k, m.Links[li].Back[at])
		}
	}
}

// factor eliminates the positions from the last to the first. rate[p][j] with
// j < p then holds the outflow fractions, rate[j][p] the inflows.
func (e *Elimination) factor(keep bool) error {
	n, b, w := len(e.cell), e.band, 2*e.band+1
	for p := n - 1; p > 0; p-- {
		lo := max(0, p-b)
		out := e.rate[p*w+lo-p+b:][:p-lo]
		lost := e.total[p]
		s := lost
		for _, v := range out {
			s += v
		}
		if s < 1e-280 && keep {
			clear(out)
			s = 1e-280
		}
		if !(s > 0) {
			return fmt.Errorf("elimination: nothing leaves the cell at %s", e.m.Grid.Describe(e.cell[p]))
		}
		e.total[p] = s
		for i := lo; i < p; i++ {
			f := e.rate[i*w+p-i+b] / s
			if f == 0 {
				continue
			}
			e.total[i] += f * lost
			row := e.rate[i*w+lo-i+b:][:p-lo]
			for j, v := range out {
				row[j] += f * v
			}
			row[i-lo] = 0
		}
	}
	e.singular = n > 0 && e.total[0] == 0
	return nil
}

// Singular reports whether nothing is lost from the cells, so that a stationary
// vector exists.
func (e *Elimination) Singular() bool { return e.singular }

// Stationary writes the null vector into the padded vector p, zero in the cells
// left out, positive in the others, scaled so that its largest entry is one.
func (e *Elimination) Stationary(p []float64) {
	n, b, w := len(e.cell), e.band, 2*e.band+1
	x := make([]float64, n)
	x[0] = 1
	big := 1.0
	inflow := func(q int) (s float64) {
		for i := max(0, q-b); i < q; i++ {
			s += e.rate[i*w+q-i+b] * x[i]
		}
		return s
	}
	for q := 1; q < n; q++ {
		v := inflow(q) / e.total[q]
		for tries := 0; v > 1e200 && tries < 4; tries++ {
			for i := range x[:q] {
				x[i] *= 1e-200
			}
			big *= 1e-200
			v = inflow(q) / e.total[q]
		}
		x[q] = min(v, 1e300)
		big = max(big, x[q])
	}
	l := &e.m.Layout
	clear(p)
	for q, k := range e.cell {
		p[l.Row(k/l.Nx)+k%l.Nx] = x[q] / big
	}
}

// Solve writes a solution of (M + shift V) x = b into x. In the singular case b
// must add up to zero and the solution is the one that vanishes in the cell
// eliminated last.
func (e *Elimination) Solve(x, b []float64) { e.solve(x, b, false) }

// SolveAdjoint solves the transposed system.
func (e *Elimination) SolveAdjoint(x, b []float64) { e.solve(x, b, true) }

func (e *Elimination) solve(x, b []float64, adjoint bool) {
	l := &e.m.Layout
	n, bw, w := len(e.cell), e.band, 2*e.band+1
	y := make([]float64, n)
	for q, k := range e.cell {
		y[q] = b[l.Row(k/l.Nx)+k%l.Nx]
	}
	at := func(i, j int) int {
		if adjoint {
			return j*w + i - j + bw
		}
		return i*w + j - i + bw
	}
	for p := n - 1; p > 0; p-- {
		f := y[p] / e.total[p]
		for i := max(0, p-bw); i < p; i++ {
			y[i] += f * e.rate[at(p, i)]
		}
	}
	if e.singular {
		y[0] = 0
	} else if n > 0 {
		y[0] /= e.total[0]
	}
	for p := 1; p < n; p++ {
		s := y[p]
		for i := max(0, p-bw); i < p; i++ {
			s += e.rate[at(i, p)] * y[i]
		}
		y[p] = s / e.total[p]
	}
	clear(x)
	for q, k := range e.cell {
		x[l.Row(k/l.Nx)+k%l.Nx] = y[q]
	}
}
