// Package grid describes the tensor-product grids on which the finite-volume
// operators live: one Axis a variable, cells in between edges, and a boundary
// rule for either side.
//
// The package owns geometry alone. It imports the standard library only and
// knows nothing of equations or of linear algebra.
package grid

import (
	"fmt"
	"math"
)

// Side is the rule at one end of an axis.
type Side int

// The boundary rules.
const (
	Reflecting Side = iota // no probability current through the side
	Periodic               // the two ends are the same point; both sides must say so
	Absorbing              // the density vanishes; what arrives leaves the domain
)

// String returns the name used in model files and reports.
func (s Side) String() string {
	switch s {
	case Reflecting:
		return "reflecting"
	case Periodic:
		return "periodic"
	case Absorbing:
		return "absorbing"
	}
	return fmt.Sprintf("Side(%d)", int(s))
}

// Axis is one direction of a grid: len(Edges)-1 cells between strictly
// increasing edges.
type Axis struct {
	Name         string
	Edges        []float64
	Lower, Upper Side
}

// Uniform returns an axis of n equal cells on [lo, hi] with the same rule at
// both ends.
func Uniform(name string, lo, hi float64, n int, side Side) (Axis, error) {
	if n < 1 {
		return Axis{}, fmt.Errorf("axis %s: %d cells; at least one is needed", name, n)
	}
	if !(lo < hi) || math.IsInf(lo, 0) || math.IsInf(hi, 0) {
		return Axis{}, fmt.Errorf("axis %s: [%g, %g] is not a finite interval with its lower end first", name, lo, hi)
	}
	edges := make([]float64, n+1)
	for i := range edges {
		t := float64(i) / float64(n)
		edges[i] = lo*(1-t) + hi*t
	}
	edges[0], edges[n] = lo, hi
	return NonUniform(name, edges, side, side)
}

// NonUniform returns an axis with the given edges, which are kept and not
// copied.
func NonUniform(name string, edges []float64, lower, upper Side) (Axis, error) {
	a := Axis{Name: name, Edges: edges, Lower: lower, Upper: upper}
	return a, a.check()
}

// Graded returns an axis of n cells on [lo, hi] whose widths fall linearly
// towards the points where density(x) is large: the edges are equally spaced
// in the integral of density. density must be positive and finite; it is
// sampled at 16 points a cell.
func Graded(name string, lo, hi float64, n int, lower, upper Side, density func(float64) float64) (Axis, error) {
	u, err := Uniform(name, lo, hi, n, Reflecting)
	if err != nil {
		return Axis{}, err
	}
	m := 16 * n
	cum := make([]float64, m+1)
	h := (hi - lo) / float64(m)
	for i := 0; i < m; i++ {
		d := density(lo + (float64(i)+0.5)*h)
		if !(d > 0) || math.IsInf(d, 0) {
			return Axis{}, fmt.Errorf("axis %s: the cell density is %g at %g; it must be positive and finite", name, d, lo+(float64(i)+0.5)*h)
		}
		cum[i+1] = cum[i] + d
	}
	for i, j := 1, 0; i < n; i++ {
		want := cum[m] * float64(i) / float64(n)
		for cum[j+1] < want {
			j++
		}
		u.Edges[i] = lo + h*(float64(j)+(want-cum[j])/(cum[j+1]-cum[j]))
	}
	return NonUniform(name, u.Edges, lower, upper)
}

func (a Axis) check() error {
	if len(a.Edges) < 2 {
		return fmt.Errorf("axis %s: %d edges; at least two are needed", a.Name, len(a.Edges))
	}
	for i, e := range a.Edges {
		if math.IsNaN(e) || math.IsInf(e, 0) {
			return fmt.Errorf("axis %s: edge %d is %g", a.Name, i, e)
		}
		if i > 0 && !(a.Edges[i-1] < e) {
			return fmt.Errorf("axis %s: edge %d (%g) does not lie above edge %d (%g)", a.Name, i, e, i-1, a.Edges[i-1])
		}
	}
	for _, s := range []Side{a.Lower, a.Upper} {
		if s < Reflecting || s > Absorbing {
			return fmt.Errorf("axis %s: unknown boundary rule %d", a.Name, int(s))
		}
	}
	if (a.Lower == Periodic) != (a.Upper == Periodic) {
		return fmt.Errorf("axis %s: %v below and %v above; a periodic axis is periodic at both ends", a.Name, a.Lower, a.Upper)
	}
	return nil
}

// Cells returns the number of cells.
func (a Axis) Cells() int { return len(a.Edges) - 1 }

// Lo returns the lower end.
func (a Axis) Lo() float64 { return a.Edges[0] }

// Hi returns the upper end.
func (a Axis) Hi() float64 { return a.Edges[len(a.Edges)-1] }

// IsPeriodic reports whether the ends are joined.
func (a Axis) IsPeriodic() bool { return a.Lower == Periodic }

// Width returns the width of cell i.
func (a Axis) Width(i int) float64 { return a.Edges[i+1] - a.Edges[i] }

// Center returns the midpoint of cell i.
func (a Axis) Center(i int) float64 { return 0.5 * (a.Edges[i] + a.Edges[i+1]) }

// Centers returns the midpoints of all cells.
func (a Axis) Centers() []float64 {
	c := make([]float64, a.Cells())
	for i := range c {
		c[i] = a.Center(i)
	}
	return c
}

// Widths returns the widths of all cells.
func (a Axis) Widths() []float64 {
	w := make([]float64, a.Cells())
	for i := range w {
		w[i] = a.Width(i)
	}
	return w
}

// Distance returns the distance from the centre of cell i to the centre of the
// next one upwards, around the period for the last cell of a periodic axis.
// For the last cell of another axis it is the distance to the side itself.
func (a Axis) Distance(i int) float64 {
	n := a.Cells()
	switch {
	case i+1 < n:
		return 0.5 * (a.Edges[i+2] - a.Edges[i])
	case a.IsPeriodic():
		return 0.5 * (a.Width(n-1) + a.Width(0))
	}
	return 0.5 * a.Width(n-1)
}

// Coarsen returns the axis with neighbouring cells merged in pairs; an odd last
// cell is kept as it is.
func (a Axis) Coarsen() Axis {
	n := a.Cells()
	edges := make([]float64, 0, n/2+2)
	for i := 0; i < n; i += 2 {
		edges = append(edges, a.Edges[i])
	}
	edges = append(edges, a.Edges[n])
	return Axis{Name: a.Name, Edges: edges, Lower: a.Lower, Upper: a.Upper}
}
