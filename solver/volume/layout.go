package volume

import "epslim/solver/grid"

// Layout places the cells of a grid in memory: rows along the first axis,
// padded by Ghost cells at either end (copies of the other end when the axis
// is periodic, zero otherwise), after one row of zeros that stands in for the
// rows beyond a side. A vector on the grid is a slice of length Len.
type Layout struct {
	Nx, Rows, Stride, Ghost, Len int
	PeriodicX                    bool
	shape                        [grid.MaxDim]int
	periodic                     [grid.MaxDim]bool
}

const rowAlign = 16

// NewLayout returns the layout for a grid and stencils that reach up to ghost
// cells along the first axis.
func NewLayout(g *grid.Grid, ghost int) Layout {
	l := Layout{Nx: g.Axis(0).Cells(), Rows: 1, Ghost: ghost, PeriodicX: g.Axis(0).IsPeriodic()}
	for d := 0; d < grid.MaxDim; d++ {
		l.shape[d] = 1
		if d < g.Dim() {
			l.shape[d], l.periodic[d] = g.Axis(d).Cells(), g.Axis(d).IsPeriodic()
		}
		if d > 0 {
			l.Rows *= l.shape[d]
		}
	}
	l.Stride = l.Nx + 2*ghost
	if l.Nx >= 4*rowAlign {
		l.Stride = (l.Stride + rowAlign - 1) / rowAlign * rowAlign
		if l.Stride%512 == 0 { // rows a power of two apart would share cache sets
			l.Stride += rowAlign
		}
	}
	l.Len = (l.Rows+1)*l.Stride + rowAlign
	return l
}

// Row returns the place of the first cell of row r; r = -1 is the row of zeros.
func (l *Layout) Row(r int) int { return (r+1)*l.Stride + l.Ghost }

// RowCoordinates returns the second and third coordinate of row r.
func (l *Layout) RowCoordinates(r int) (j, k int) { return r % l.shape[1], r / l.shape[1] }

// Neighbour returns the row dj and dk steps away from row r, or -1 when it
// lies beyond a side.
func (l *Layout) Neighbour(r, dj, dk int) int {
	j, k := l.RowCoordinates(r)
	j, k = l.step(j, dj, 1), l.step(k, dk, 2)
	if j < 0 || k < 0 {
		return -1
	}
	return j + l.shape[1]*k
}

func (l *Layout) step(i, di, d int) int {
	i += di
	n := l.shape[d]
	switch {
	case i >= 0 && i < n:
		return i
	case l.periodic[d] && n > 0:
		return ((i % n) + n) % n
	}
	return -1
}

// Vector allocates a zero vector.
func (l *Layout) Vector() []float64 { return Float64s(l.Len) }

// Wrap copies the ends of row r of v into its ghost cells when the first axis
// is periodic.
func (l *Layout) Wrap(v []float64, r int) {
	if !l.PeriodicX {
		return
	}
	s := l.Row(r)
	for g := 1; g <= l.Ghost; g++ {
		v[s-g] = v[s+l.Nx-1-(g-1)%l.Nx]
		v[s+l.Nx+g-1] = v[s+(g-1)%l.Nx]
	}
}

// Pack copies cell values in grid order into a padded vector.
func (l *Layout) Pack(dst, cells []float64) {
	for r := 0; r < l.Rows; r++ {
		copy(dst[l.Row(r):][:l.Nx], cells[r*l.Nx:][:l.Nx])
		l.Wrap(dst, r)
	}
}

// Unpack copies a padded vector into cell values in grid order.
func (l *Layout) Unpack(cells, src []float64) {
	for r := 0; r < l.Rows; r++ {
		copy(cells[r*l.Nx:][:l.Nx], src[l.Row(r):][:l.Nx])
	}
}

// Shape returns the number of cells along axis d, one beyond the dimension.
func (l *Layout) Shape(d int) int { return l.shape[d] }
