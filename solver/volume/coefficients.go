package volume

import (
	"fmt"
	"math"

	"epslim/solver/grid"
)

// Coefficients evaluates drift and diffusion over a block of points.
//
// points[d][i] is coordinate d of point i. Eval writes drift[d][i] = f_d and
// diffusion[e][i] = A_ab with A = sigma sigma^T, where e runs over the upper
// triangle row by row: in two dimensions xx, xy, yy; in three xx, xy, xz, yy,
// yz, zz. All slices have the length of the block. Eval is called from several
// goroutines at once; an implementation with scratch of its own either guards
// it or implements Cloner.
type Coefficients interface {
	Eval(points, drift, diffusion [][]float64) error
}

// Cloner is implemented by coefficients that are not safe for concurrent use:
// every worker evaluates its own clone.
type Cloner interface {
	Clone() Coefficients
}

// DiagonalDiffusion is implemented by coefficients that know whether the
// off-diagonal entries of A vanish everywhere. Others are probed at the cell
// centres.
type DiagonalDiffusion interface {
	IsDiagonal() bool
}

// Func makes Coefficients of a function of one point. It writes the drift and
// the upper triangle of A; both are zero on entry.
type Func func(x, drift, diffusion []float64)

// Eval implements Coefficients.
func (f Func) Eval(points, drift, diffusion [][]float64) error {
	d, m := len(drift), len(diffusion)
	buf := make([]float64, 2*d+m)
	x, b, a := buf[:d], buf[d:2*d], buf[2*d:]
	for i := range points[0] {
		clear(buf)
		for k := range x {
			x[k] = points[k][i]
		}
		f(x, b, a)
		for k := range b {
			drift[k][i] = b[k]
		}
		for k := range a {
			diffusion[k][i] = a[k]
		}
	}
	return nil
}

// Entry returns the place of A_ab, a <= b, in the upper triangle of a matrix
// of the given dimension.
func Entry(dim, a, b int) int {
	if a > b {
		a, b = b, a
	}
	return a*dim - a*(a-1)/2 + b - a
}

// entries returns the size of the upper triangle.
func entries(dim int) int { return dim * (dim + 1) / 2 }

// Tabulated interpolates coefficients linearly in each coordinate between
// values at the nodes of a tensor grid.
type Tabulated struct {
	nodes            [][]float64
	drift, diffusion [][]float64
}

// NewTabulated takes the nodes of every axis, increasing, and the values of
// the drift and of the upper triangle of A at all nodes with the first axis
// fastest. The slices are kept. Outside the nodes the nearest value holds.
func NewTabulated(nodes, drift, diffusion [][]float64) (*Tabulated, error) {
	dim := len(nodes)
	if dim < 1 || dim > grid.MaxDim {
		return nil, fmt.Errorf("tabulated coefficients: %d axes; between 1 and %d are supported", dim, grid.MaxDim)
	}
	n := 1
	for d, x := range nodes {
		if len(x) < 2 {
			return nil, fmt.Errorf("tabulated coefficients: axis %d has %d nodes; at least two are needed", d+1, len(x))
		}
		for i := 1; i < len(x); i++ {
			if !(x[i-1] < x[i]) {
				return nil, fmt.Errorf("tabulated coefficients: nodes of axis %d do not increase at %d", d+1, i)
			}
		}
		n *= len(x)
	}
	if len(drift) != dim || len(diffusion) != entries(dim) {
		return nil, fmt.Errorf("tabulated coefficients: %d drift and %d diffusion columns; %d and %d are needed", len(drift), len(diffusion), dim, entries(dim))
	}
	for _, col := range append(append([][]float64{}, drift...), diffusion...) {
		if len(col) != n {
			return nil, fmt.Errorf("tabulated coefficients: a column of %d values for %d nodes", len(col), n)
		}
	}
	return &Tabulated{nodes, drift, diffusion}, nil
}

// Eval implements Coefficients.
func (t *Tabulated) Eval(points, drift, diffusion [][]float64) error {
	dim := len(t.nodes)
	var at [1 << grid.MaxDim]int
	var weight [1 << grid.MaxDim]float64
	for i := range points[0] {
		at[0], weight[0] = 0, 1
		corners, stride := 1, 1
		for d := 0; d < dim; d++ {
			x := t.nodes[d]
			j, s := locate(x, points[d][i])
			for c := 0; c < corners; c++ {
				at[corners+c], weight[corners+c] = at[c]+(j+1)*stride, weight[c]*s
				at[c], weight[c] = at[c]+j*stride, weight[c]*(1-s)
			}
			corners *= 2
			stride *= len(x)
		}
		for k, col := range t.drift {
			drift[k][i] = blend(col, at[:corners], weight[:corners])
		}
		for k, col := range t.diffusion {
			diffusion[k][i] = blend(col, at[:corners], weight[:corners])
		}
	}
	return nil
}

// locate returns the interval of x that holds v and the place in it, 0 to 1.
func locate(x []float64, v float64) (int, float64) {
	lo, hi := 0, len(x)-1
	for hi-lo > 1 {
		if m := (lo + hi) / 2; x[m] <= v {
			lo = m
		} else {
			hi = m
		}
	}
	return lo, math.Max(0, math.Min(1, (v-x[lo])/(x[lo+1]-x[lo])))
}

func blend(col []float64, at []int, weight []float64) float64 {
	var s float64
	for c, k := range at {
		s += weight[c] * col[k]
	}
	return s
}
