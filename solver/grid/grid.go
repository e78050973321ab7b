package grid

import (
	"fmt"
	"math"
	"strings"
)

// MaxDim is the largest number of axes.
const MaxDim = 3

// Grid is the tensor product of its axes. Cells are numbered with the first
// axis fastest: cell (i, j, k) has index i + nx*(j + ny*k).
type Grid struct {
	axes  []Axis
	cells int
}

// New checks the axes and returns their product.
func New(axes ...Axis) (*Grid, error) {
	if len(axes) < 1 || len(axes) > MaxDim {
		return nil, fmt.Errorf("grid: %d axes; between 1 and %d are supported", len(axes), MaxDim)
	}
	g := &Grid{axes: append([]Axis(nil), axes...), cells: 1}
	for _, a := range axes {
		if err := a.check(); err != nil {
			return nil, fmt.Errorf("grid: %w", err)
		}
		if g.cells > math.MaxInt32*64/a.Cells() {
			return nil, fmt.Errorf("grid: %s cells cannot be numbered", shapeText(axes))
		}
		g.cells *= a.Cells()
	}
	return g, nil
}

func shapeText(axes []Axis) string {
	var b strings.Builder
	for i, a := range axes {
		if i > 0 {
			b.WriteString(" x ")
		}
		fmt.Fprintf(&b, "%d", a.Cells())
	}
	return b.String()
}

// String returns the shape, as "64 x 64".
func (g *Grid) String() string { return shapeText(g.axes) }

// Dim returns the number of axes.
func (g *Grid) Dim() int { return len(g.axes) }

// Axis returns axis d.
func (g *Grid) Axis(d int) Axis { return g.axes[d] }

// Axes returns the axes; the slice is a copy.
func (g *Grid) Axes() []Axis { return append([]Axis(nil), g.axes...) }

// Cells returns the number of cells.
func (g *Grid) Cells() int { return g.cells }

// Shape returns the number of cells of each axis.
func (g *Grid) Shape() []int {
	s := make([]int, len(g.axes))
	for d, a := range g.axes {
		s[d] = a.Cells()
	}
	return s
}

// Index returns the number of the cell with the given coordinates.
func (g *Grid) Index(cell ...int) int {
	k := 0
	for d := len(g.axes) - 1; d >= 0; d-- {
		k = k*g.axes[d].Cells() + cell[d]
	}
	return k
}

// Coordinates is the inverse of Index.
func (g *Grid) Coordinates(k int) []int {
	c := make([]int, len(g.axes))
	for d, a := range g.axes {
		c[d] = k % a.Cells()
		k /= a.Cells()
	}
	return c
}

// CenterOf returns the midpoint of cell k.
func (g *Grid) CenterOf(k int) []float64 {
	x := make([]float64, len(g.axes))
	for d, i := range g.Coordinates(k) {
		x[d] = g.axes[d].Center(i)
	}
	return x
}

// CellAt returns the cell that contains the point, or -1 when it lies outside.
// Points on periodic axes are taken modulo the period.
func (g *Grid) CellAt(x ...float64) int {
	cell := make([]int, len(g.axes))
	for d, a := range g.axes {
		v := x[d]
		if a.IsPeriodic() {
			l := a.Hi() - a.Lo()
			v -= l * math.Floor((v-a.Lo())/l)
		}
		if !(v >= a.Lo() && v <= a.Hi()) {
			return -1
		}
		lo, hi := 0, a.Cells()
		for hi-lo > 1 {
			if m := (lo + hi) / 2; a.Edges[m] <= v {
				lo = m
			} else {
				hi = m
			}
		}
		cell[d] = lo
	}
	return g.Index(cell...)
}

// Volumes returns the volume of every cell.
func (g *Grid) Volumes() []float64 {
	v := make([]float64, g.cells)
	v[0] = 1
	n := 1
	for _, a := range g.axes {
		for i := a.Cells() - 1; i >= 0; i-- {
			w := a.Width(i)
			for k := 0; k < n; k++ {
				v[i*n+k] = v[k] * w
			}
		}
		n *= a.Cells()
	}
	return v
}

// HasAbsorbing reports whether any side is absorbing.
func (g *Grid) HasAbsorbing() bool {
	for _, a := range g.axes {
		if a.Lower == Absorbing || a.Upper == Absorbing {
			return true
		}
	}
	return false
}

// Describe names a cell for messages: "x=0.5, y=0.25 (cell 3, 1)".
func (g *Grid) Describe(k int) string {
	c, x := g.Coordinates(k), g.CenterOf(k)
	return fmt.Sprintf("%s (cell %s)", g.PointText(x), strings.Trim(strings.Join(strings.Fields(fmt.Sprint(c)), ", "), "[]"))
}

// PointText writes a point with the names of the axes: "x=0.5, y=0.25".
func (g *Grid) PointText(x []float64) string {
	var b strings.Builder
	for d, a := range g.axes {
		if d > 0 {
			b.WriteString(", ")
		}
		fmt.Fprintf(&b, "%s=%.6g", a.Name, x[d])
	}
	return b.String()
}

// Coarsen returns the grid in which the axes with merge[d] true have their
// cells merged in pairs.
func (g *Grid) Coarsen(merge []bool) *Grid {
	c := &Grid{axes: make([]Axis, len(g.axes)), cells: 1}
	for d, a := range g.axes {
		if merge[d] {
			a = a.Coarsen()
		}
		c.axes[d] = a
		c.cells *= a.Cells()
	}
	return c
}
