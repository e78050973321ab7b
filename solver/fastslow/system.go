package fastslow

import (
	"context"
	"errors"
	"fmt"
	"math"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Settings bounds the work. The zero value is usable.
type Settings struct {
	MemoryLimit int64 // bytes for the factored matrix; 0 means 4 GiB
}

// Result is the stationary density of the full system.
type Result struct {
	Slow     *grid.Grid
	Size     int         // functions in the product of the fast bases
	Modes    [][]float64 // Modes[m][cell]: coefficient of trial function m
	Marginal []float64   // slow marginal density, Modes[0], of mass one
	Residual float64     // largest residual of an equation over the largest sum of its terms
	Tail     float64     // largest coefficient of the last function of any basis over the largest of all: truncation
	Minimum  float64     // of the slow marginal
}

// SizeError reports a system that does not fit.
type SizeError struct {
	Unknowns, Band int
	Need, Limit    int64
}

func (e *SizeError) Error() string {
	return fmt.Sprintf("a full system of %d unknowns with half bandwidth %d needs %.2g GiB, more than the limit of %.2g GiB; take fewer cells or modes",
		e.Unknowns, e.Band, float64(e.Need)/(1<<30), float64(e.Limit)/(1<<30))
}

// Solve computes the stationary density. The slow grid has one or two uniform
// axes, periodic, or reflecting where they stand for a window at whose ends the
// density is negligible. The coefficients are those of the full system at the
// chosen small parameter, slow variables first.
func Solve(ctx context.Context, slow *grid.Grid, fast []Basis, c volume.Coefficients, s Settings) (*Result, error) {
	sys, err := newSystem(slow, fast, c)
	if err != nil {
		return nil, err
	}
	limit := s.MemoryLimit
	if limit == 0 {
		limit = 4 << 30
	}
	n, band := slow.Cells()*sys.size, sys.bandwidth()
	if need := int64(8) * int64(n) * int64(3*band+1); need > limit {
		return nil, &SizeError{n, band, need, limit}
	}
	if err := sys.matrices(ctx); err != nil {
		return nil, err
	}
	m := newBanded(n, band)
	sys.assemble(m.add)
	// The balance of mode 0 in one cell follows from the others; there the value
	// is prescribed instead.
	pin := sys.unknown(sys.pinCell(), 0)
	m.pin(pin)
	rhs := make([]float64, n)
	rhs[pin] = 1
	if err := m.solve(ctx, rhs); err != nil {
		return nil, err
	}
	return sys.result(rhs), nil
}

type system struct {
	slow        *grid.Grid
	dim         int
	size, nodes int
	points      [][]float64    // fast quadrature points, one slice a variable
	test        [][][3]float64 // test[k][node]: value; the derivatives are in grad, hess
	grad        [][][]float64  // grad[k][a][node]
	hess        [][][]float64  // hess[k][entry][node]
	trial       [][]float64    // trial[m][node]
	last        []bool         // functions of highest degree in some variable
	place       []int          // cell -> place in the ordering
	c           volume.Coefficients
	nfast       int
	flux        [][]float64 // flux[axis]: per cell the matrix B + C, row-major
	diff        [][]float64 // X
	fast        []float64   // F
	speed       [][]float64 // largest |f_x| in a cell
	anyDiff     []bool
}

func newSystem(slow *grid.Grid, fast []Basis, c volume.Coefficients) (*system, error) {
	if slow.Dim() > 2 || len(fast) == 0 || slow.Dim()+len(fast) > 4 {
		return nil, fmt.Errorf("full system: %d slow and %d fast variables; one or two slow ones and four together are supported", slow.Dim(), len(fast))
	}
	for _, a := range slow.Axes() {
		if a.Lower == grid.Absorbing || a.Upper == grid.Absorbing {
			return nil, fmt.Errorf("full system: axis %s absorbs; only periodic axes and windows are supported", a.Name)
		}
		h := (a.Hi() - a.Lo()) / float64(a.Cells())
		for i := 0; i < a.Cells(); i++ {
			if math.Abs(a.Width(i)-h) > 1e-9*h {
				return nil, fmt.Errorf("full system: axis %s is not uniform", a.Name)
			}
		}
		if a.Cells() < 5 {
			return nil, fmt.Errorf("full system: axis %s has %d cells; five are needed", a.Name, a.Cells())
		}
	}
	s := &system{slow: slow, dim: slow.Dim(), nfast: len(fast), c: c, size: 1, nodes: 1}
	for _, b := range fast {
		s.size *= b.Size()
		s.nodes *= len(b.Nodes())
	}
	s.tabulate(fast)
	s.order()
	return s, nil
}

// tabulate evaluates the products of the fast bases at the product nodes.
func (s *system) tabulate(fast []Basis) {
	s.points = make([][]float64, s.nfast)
	node := make([]int, s.nfast)
	for q := 0; q < s.nodes; q++ {
		split(q, node, func(a int) int { return len(fast[a].Nodes()) })
		for a, b := range fast {
			s.points[a] = append(s.points[a], b.Nodes()[node[a]])
		}
	}
	deg := make([]int, s.nfast)
	for k := 0; k < s.size; k++ {
		split(k, deg, func(a int) int { return fast[a].Size() })
		val := make([]float64, s.nodes)
		trial := make([]float64, s.nodes)
		grad := make([][]float64, s.nfast)
		hess := make([][]float64, s.nfast*(s.nfast+1)/2)
		for a := range grad {
			grad[a] = make([]float64, s.nodes)
		}
		for e := range hess {
			hess[e] = make([]float64, s.nodes)
		}
		isLast := false
		for a, b := range fast {
			isLast = isLast || deg[a] >= b.Size()-1 && b.Size() > 1
		}
		var v [4][3]float64
		for q := 0; q < s.nodes; q++ {
			split(q, node, func(a int) int { return len(fast[a].Nodes()) })
			val[q], trial[q] = 1, 1
			for a, b := range fast {
				v[a][0], v[a][1], v[a][2] = b.Test(deg[a], s.points[a][q])
				val[q] *= v[a][0]
				trial[q] *= b.Trial(deg[a], node[a])
			}
			derivative := func(order [4]int) float64 {
				p := 1.0
				for a := range fast {
					p *= v[a][order[a]]
				}
				return p
			}
			for a := range fast {
				var o [4]int
				o[a] = 1
				grad[a][q] = derivative(o)
				for b := a; b < s.nfast; b++ {
					o := o
					o[b]++
					hess[volume.Entry(s.nfast, a, b)][q] = derivative(o)
				}
			}
		}
		three := make([][3]float64, s.nodes)
		for q := range three {
			three[q][0] = val[q]
		}
		s.test, s.trial, s.grad, s.hess, s.last = append(s.test, three), append(s.trial, trial), append(s.grad, grad), append(s.hess, hess), append(s.last, isLast)
	}
}

// split writes the digits of k in mixed radix.
func split(k int, digits []int, radix func(a int) int) {
	for a := range digits {
		digits[a] = k % radix(a)
		k /= radix(a)
	}
}

// matrices evaluates the coefficients at all cells and forms their matrices.
func (s *system) matrices(ctx context.Context) error {
	n, sq := s.slow.Cells(), s.size*s.size
	s.fast = make([]float64, n*sq)
	for d := 0; d < s.dim; d++ {
		s.flux, s.diff = append(s.flux, make([]float64, n*sq)), append(s.diff, make([]float64, n*sq))
		s.speed = append(s.speed, make([]float64, n))
	}
	s.anyDiff = make([]bool, s.dim)
	total := s.dim + s.nfast
	block := func(k int) [][]float64 {
		b := make([][]float64, k)
		for i := range b {
			b[i] = make([]float64, s.nodes)
		}
		return b
	}
	points, drift, diffusion := block(total), block(total), block(total*(total+1)/2)
	for cell := 0; cell < n; cell++ {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		x := s.slow.CenterOf(cell)
		for d := range points {
			for q := range points[d] {
				if d < s.dim {
					points[d][q] = x[d]
				} else {
					points[d][q] = s.points[d-s.dim][q]
				}
			}
		}
		if err := s.c.Eval(points, drift, diffusion); err != nil {
			return fmt.Errorf("coefficients at %s: %w", s.slow.PointText(x), err)
		}
		for _, col := range append(append([][]float64{}, drift...), diffusion...) {
			for _, v := range col {
				if v-v != 0 {
					return &volume.CoefficientError{Quantity: "a coefficient of the full system", Place: s.slow.PointText(x), Value: v, Reason: "it must be finite"}
				}
			}
		}
		if err := s.cellMatrices(cell, drift, diffusion); err != nil {
			return err
		}
	}
	return nil
}

func (s *system) cellMatrices(cell int, drift, diffusion [][]float64) error {
	total := s.dim + s.nfast
	if s.dim == 2 {
		for _, v := range diffusion[volume.Entry(total, 0, 1)] {
			if v != 0 {
				return errors.New("full system: mixed diffusion of two slow variables is not supported")
			}
		}
	}
	base := cell * s.size * s.size
	weight := make([]float64, s.nodes)
	for k := 0; k < s.size; k++ {
		// What multiplies the trial functions: one weight a node and matrix.
		row := func(dst []float64) {
			for m := 0; m < s.size; m++ {
				var t float64
				for q, w := range weight {
					t += w * s.trial[m][q]
				}
				dst[base+k*s.size+m] = t
			}
		}
		for d := 0; d < s.dim; d++ {
			for q := range weight {
				w := s.test[k][q][0] * drift[d][q]
				for a := 0; a < s.nfast; a++ {
					w += s.grad[k][a][q] * diffusion[volume.Entry(total, d, s.dim+a)][q]
				}
				weight[q] = w
				s.speed[d][cell] = math.Max(s.speed[d][cell], math.Abs(drift[d][q]))
			}
			row(s.flux[d])
			for q := range weight {
				v := diffusion[volume.Entry(total, d, d)][q]
				s.anyDiff[d] = s.anyDiff[d] || v != 0
				weight[q] = s.test[k][q][0] * v
			}
			row(s.diff[d])
		}
		for q := range weight {
			var w float64
			for a := 0; a < s.nfast; a++ {
				w += s.grad[k][a][q] * drift[s.dim+a][q]
				for b := a; b < s.nfast; b++ {
					h := s.hess[k][volume.Entry(s.nfast, a, b)][q] * diffusion[volume.Entry(total, s.dim+a, s.dim+b)][q]
					if a == b {
						h *= 0.5
					}
					w += h
				}
			}
			weight[q] = w
		}
		row(s.fast)
	}
	return nil
}

// order numbers the cells for a narrow band: periodic axes folded, the shorter
// axis fastest.
func (s *system) order() {
	shape := s.slow.Shape()
	stride := []int{1, shape[0]}
	if s.dim == 2 && shape[1] < shape[0] {
		stride = []int{shape[1], 1}
	}
	s.place = make([]int, s.slow.Cells())
	for k := range s.place {
		for d, i := range s.slow.Coordinates(k) {
			if n := shape[d]; s.slow.Axis(d).IsPeriodic() {
				i = min(2*i, 2*(n-1-i)+1)
			}
			s.place[k] += i * stride[d]
		}
	}
}

func (s *system) unknown(cell, mode int) int { return s.place[cell]*s.size + mode }

// pinCell is a cell in the middle of the window.
func (s *system) pinCell() int {
	c := s.slow.Shape()
	for d := range c {
		c[d] /= 2
	}
	return s.slow.Index(c...)
}

// bandwidth returns the largest distance of two coupled unknowns.
func (s *system) bandwidth() int {
	band := 0
	for k := range s.place {
		c := s.slow.Coordinates(k)
		for d := 0; d < s.dim; d++ {
			for o := 1; o <= 2; o++ {
				if j := s.neighbour(c, d, o); j >= 0 {
					dist := s.place[j] - s.place[k]
					band = max(band, max(dist, -dist))
				}
			}
		}
	}
	return (band+1)*s.size - 1
}

// neighbour returns the cell o steps along axis d, or -1.
func (s *system) neighbour(c []int, d, o int) int {
	a := s.slow.Axis(d)
	i := c[d] + o
	if i < 0 || i >= a.Cells() {
		if !a.IsPeriodic() {
			return -1
		}
		i = (i + a.Cells()) % a.Cells()
	}
	n := append([]int(nil), c...)
	n[d] = i
	return s.slow.Index(n...)
}

// The face value of a flux from the four cells around it, fourth order; its
// derivative; and the third difference of the dissipation.
var (
	faceValue      = [4]float64{-1. / 12, 7. / 12, 7. / 12, -1. / 12}
	faceDerivative = [4]float64{1. / 12, -15. / 12, 15. / 12, -1. / 12}
	thirdDiff      = [4]float64{1, -3, 3, -1}
)

// assemble writes the equations: for every face the flow out of the cell below
// into the cell above, for every cell the fast operator.
func (s *system) assemble(add func(row, col int, v float64)) {
	n := s.size
	for cell := range s.place {
		c := s.slow.Coordinates(cell)
		for k := 0; k < n; k++ {
			for m := 0; m < n; m++ {
				add(s.unknown(cell, k), s.unknown(cell, m), -s.fast[cell*n*n+k*n+m])
			}
		}
		for d := 0; d < s.dim; d++ {
			up := s.neighbour(c, d, 1)
			if up < 0 {
				continue // the end of a window: nothing flows
			}
			s.face(add, d, [4]int{s.neighbour(c, d, -1), cell, up, s.neighbour(c, d, 2)})
		}
	}
}

func (s *system) face(add func(row, col int, v float64), d int, cells [4]int) {
	n := s.size
	h := s.slow.Axis(d).Width(0)
	alpha := math.Max(s.speed[d][cells[1]], s.speed[d][cells[2]]) / 12
	value, slope, third := faceValue, faceDerivative, thirdDiff
	if cells[0] < 0 || cells[3] < 0 { // next to the end of a window: central with first-order dissipation max|f_x| h/2
		value, slope, third = [4]float64{0, 0.5, 0.5, 0}, [4]float64{0, -1, 1, 0}, [4]float64{0, -6, 6, 0}
	}
	for q, cell := range cells {
		if cell < 0 {
			continue
		}
		for k := 0; k < n; k++ {
			for m := 0; m < n; m++ {
				at := cell*n*n + k*n + m
				v := value[q] * s.flux[d][at]
				if s.anyDiff[d] {
					v -= 0.5 / h * slope[q] * s.diff[d][at]
				}
				if k == m {
					v += -alpha * third[q]
				}
				if v != 0 {
					add(s.unknown(cells[1], k), s.unknown(cell, m), v/h)
					add(s.unknown(cells[2], k), s.unknown(cell, m), -v/h)
				}
			}
		}
	}
}

func (s *system) result(x []float64) *Result {
	r := &Result{Slow: s.slow, Size: s.size, Minimum: math.Inf(1)}
	vol := s.slow.Volumes()
	var mass float64
	for cell := range s.place {
		mass += vol[cell] * x[s.unknown(cell, 0)]
	}
	var top, tail float64
	for m := 0; m < s.size; m++ {
		col := make([]float64, len(s.place))
		for cell := range col {
			col[cell] = x[s.unknown(cell, m)] / mass
			top = math.Max(top, math.Abs(col[cell]))
			if s.last[m] {
				tail = math.Max(tail, math.Abs(col[cell]))
			}
		}
		r.Modes = append(r.Modes, col)
	}
	r.Marginal, r.Tail = r.Modes[0], tail/top
	for _, v := range r.Marginal {
		r.Minimum = math.Min(r.Minimum, v)
	}
	sum, size := make([]float64, len(x)), make([]float64, len(x))
	s.assemble(func(row, col int, v float64) {
		sum[row] += v * x[col]
		size[row] += math.Abs(v * x[col])
	})
	var worst, scale float64
	for i := range sum {
		worst, scale = math.Max(worst, math.Abs(sum[i])), math.Max(scale, size[i])
	}
	r.Residual = worst / scale
	return r
}
