package multigrid

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"epslim/solver/volume"
)

// hierarchy is the stack of levels, finest first.
type hierarchy struct {
	levels   []*level
	shift    float64
	adjoint  bool
	singular bool
}

// newHierarchy builds all levels and, for the singular problem, a first guess
// by a full multigrid pass from the coarsest grid, left in levels[0].x.
func newHierarchy(ctx context.Context, m *volume.Operator, c volume.Coefficients, shift float64, adjoint bool, kind cycleKind) (*hierarchy, error) {
	levels, err := assembleLevels(ctx, m, c)
	if err != nil {
		return nil, err
	}
	h := &hierarchy{levels: levels, shift: shift, adjoint: adjoint, singular: shift == 0 && m.Kill == nil}
	last := len(levels) - 1
	for k := last; k >= 0; k-- {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		l := levels[k]
		l.normalise(shift, adjoint)
		if k == last {
			if err := l.invert(shift, adjoint); err != nil {
				return nil, err
			}
		} else {
			l.setWeights(levels[k+1])
			if h.singular {
				l.prolong(levels[k+1], l.x, levels[k+1].x, true)
				clear(l.b)
				h.cycle(k, l.x, l.b, kind, false)
			}
			levels[k+1].scale = nil
		}
		if k > 0 {
			l.op = geometryOnly(l.op)
		}
	}
	return h, nil
}

// geometryOnly drops the links of an operator whose level is complete.
func geometryOnly(m *volume.Operator) *volume.Operator {
	c := *m
	c.Links = nil
	return &c
}

// setWeights fills the weights with which residuals go to the coarser level.
func (l *level) setWeights(c *level) {
	ny := c.lay.Shape(1)
	l.each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			j, k := l.lay.RowCoordinates(r)
			s := l.lay.Row(r)
			cs := c.scale[c.lay.Row(int(c.up.parent[1][j])+ny*int(c.up.parent[2][k])):][:c.lay.Nx]
			w, sc, p := l.weight[s:][:l.lay.Nx], l.scale[s:][:l.lay.Nx], c.up.parent[0]
			for i := range w {
				if q := cs[p[i]]; q > 0 {
					w[i] = float32(math.Min(sc[i]/q, 1e30))
				}
			}
		}
	})
}

// invert keeps the inverse of the coarsest operator with scaled rows. In the
// singular case the right-hand side is first made consistent, and of all
// solutions the one of mass zero is taken: any other would add a multiple of
// the coarse null vector, which is not quite one of the fine operator. The null
// vector itself is left in x. Where the coarsest grid falls into several
// classes the iteration does without a coarsest solve.
func (l *level) invert(shift float64, adjoint bool) error {
	n, nx := l.grid.Cells(), l.lay.Nx
	at := func(k int) int { return l.lay.Row(k/nx) + k%nx }
	l.dense = make([]float32, n*n)
	e, err := volume.Eliminate(l.op, shift, nil)
	if err != nil {
		for k := 0; k < n; k++ {
			l.dense[k*n+k] = 1
			l.x[at(k)] = 1
		}
		return nil
	}
	if e.Singular() && adjoint {
		return errors.New("multigrid: the adjoint problem without losses has no unique solution")
	}
	null, nullMass := l.lay.Vector(), 0.0
	if e.Singular() {
		e.Stationary(null)
		nullMass = l.op.Mass(null)
		top := 0
		for k := 0; k < n; k++ {
			if null[at(k)] > null[at(top)] {
				top = k
			}
		}
		if e, err = volume.EliminateLast(l.op, shift, top); err != nil {
			return err
		}
		for k := 0; k < n; k++ {
			l.x[at(k)] = float32(null[at(k)])
		}
		for r := 0; r < l.lay.Rows; r++ {
			l.wrap(l.x, r)
		}
	}
	var total float64
	for k := 0; k < n; k++ {
		total += l.scale[at(k)]
	}
	b, x := l.lay.Vector(), l.lay.Vector()
	for k := 0; k < n; k++ {
		clear(b)
		q := l.scale[at(k)]
		b[at(k)] = q
		if e.Singular() {
			for j := 0; j < n; j++ {
				b[at(j)] -= q / total * l.scale[at(j)]
			}
		}
		excess := 0.0
		if adjoint {
			e.SolveAdjoint(x, b)
		} else {
			e.Solve(x, b)
			if e.Singular() {
				excess = l.op.Mass(x) / nullMass
			}
		}
		for j := 0; j < n; j++ {
			l.dense[j*n+k] = float32(x[at(j)] - excess*null[at(j)])
		}
	}
	return nil
}

// String lists the levels, which is the first thing to look at when a solve
// is slow.
func (h *hierarchy) String() string {
	var b strings.Builder
	for k, l := range h.levels {
		fmt.Fprintf(&b, "%2d  %-20s %9d cells\n", k, l.grid, l.grid.Cells())
	}
	return b.String()
}
