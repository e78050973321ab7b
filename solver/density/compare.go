package density

import (
	"context"
	"fmt"
	"math"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Formula evaluates a density, up to a constant factor, over a block of points:
// points[d][i] is coordinate d of point i.
type Formula func(points [][]float64, out []float64) error

// PointFormula makes a Formula of a function of one point.
func PointFormula(f func(x []float64) float64) Formula {
	return func(points [][]float64, out []float64) error {
		x := make([]float64, len(points))
		for i := range out {
			for d := range x {
				x[d] = points[d][i]
			}
			out[i] = f(x)
		}
		return nil
	}
}

// Difference is the distance of a numerical density from a formula that was
// scaled to mass one on the same grid.
type Difference struct {
	L1    float64   // integral of |p - exact|
	Max   float64   // largest |p - exact| over the largest value of exact
	MaxAt int       // cell where it occurs
	Map   []float64 // p - exact in every cell
	Exact []float64
}

// Compare evaluates the formula at the cell centres.
func (r *Result) Compare(exact Formula) (*Difference, error) {
	l := &r.Operator.Layout
	d := &Difference{Map: make([]float64, len(r.P)), Exact: make([]float64, len(r.P))}
	points := make([][]float64, r.Grid.Dim())
	for a := range points {
		points[a] = make([]float64, l.Nx)
	}
	var mass float64
	for q := 0; q < l.Rows; q++ {
		j, k := l.RowCoordinates(q)
		for a := range points {
			for i := range points[a] {
				points[a][i] = r.Grid.Axis(a).Center([]int{i, j, k}[a])
			}
		}
		out := d.Exact[q*l.Nx:][:l.Nx]
		if err := exact(points, out); err != nil {
			return nil, fmt.Errorf("closed-form density: %w", err)
		}
		var t float64
		for i, v := range out {
			if !(v >= 0) || math.IsInf(v, 1) {
				return nil, fmt.Errorf("closed-form density is %g at %s", v, r.Grid.Describe(q*l.Nx+i))
			}
			t += v * r.Operator.Width(i)
		}
		mass += t * r.Operator.RowVolume(q)
	}
	if !(mass > 0) || math.IsInf(mass, 1) {
		return nil, fmt.Errorf("closed-form density has mass %g on the grid", mass)
	}
	big := 0.0
	for k := range d.Exact {
		d.Exact[k] /= mass
		big = math.Max(big, d.Exact[k])
		d.Map[k] = r.P[k] - d.Exact[k]
		q := k / l.Nx
		d.L1 += math.Abs(d.Map[k]) * r.Operator.Width(k%l.Nx) * r.Operator.RowVolume(q)
		if e := math.Abs(d.Map[k]); e > d.Max {
			d.Max, d.MaxAt = e, k
		}
	}
	d.Max /= big
	return d, nil
}

// Refinement is a comparison on a sequence of grids.
type Refinement struct {
	Grids   []*grid.Grid
	Results []*Result
	L1, Max []float64 // distances from the formula
	// Order[i] is the observed order between grids i and i+1,
	// log(L1[i]/L1[i+1]) / log(h[i]/h[i+1]) with h = cells^(-1/dim). It is NaN
	// when both errors are at the level of rounding.
	Order []float64
}

// roundingLevel is the L1 distance below which no order can be observed.
const roundingLevel = 1e-12

// Refine solves on all grids, coarse to fine, and compares with the formula.
func Refine(ctx context.Context, grids []*grid.Grid, c volume.Coefficients, exact Formula, s Settings) (*Refinement, error) {
	ref := &Refinement{Grids: grids}
	for i, g := range grids {
		r, err := Stationary(ctx, g, c, s)
		if err != nil {
			return ref, fmt.Errorf("grid %s: %w", g, err)
		}
		d, err := r.Compare(exact)
		if err != nil {
			return ref, err
		}
		ref.Results = append(ref.Results, r)
		ref.L1, ref.Max = append(ref.L1, d.L1), append(ref.Max, d.Max)
		if i > 0 {
			order := math.NaN()
			if ref.L1[i-1] > roundingLevel || d.L1 > roundingLevel {
				ratio := float64(g.Cells()) / float64(grids[i-1].Cells())
				order = math.Log(ref.L1[i-1]/d.L1) / math.Log(ratio) * float64(g.Dim())
			}
			ref.Order = append(ref.Order, order)
		}
	}
	return ref, nil
}
