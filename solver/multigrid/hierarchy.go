package multigrid

import (
	"context"
	"fmt"
	"math"
	"strings"

	"epslim/solver/volume"
)

// hierarchy is the stack of levels, finest first.
type hierarchy struct {
	levels  []*level
	shift   float64
	adjoint bool
	source  bool // the reference solves a problem with uniform source instead of the null problem
}

// newHierarchy builds all levels. For the forward operator the reference
// density of each level is found by a full multigrid pass from the coarsest
// grid; for the adjoint one it is one everywhere.
func newHierarchy(ctx context.Context, m *volume.Operator, c volume.Coefficients, shift float64, adjoint bool, kind cycleKind) (*hierarchy, error) {
	levels, err := assembleLevels(ctx, m, c, adjoint)
	if err != nil {
		return nil, err
	}
	h := &hierarchy{levels: levels, shift: shift, adjoint: adjoint, source: shift != 0 || m.Kill != nil}
	last := len(levels) - 1
	for k := last; k >= 0; k-- {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		l := levels[k]
		l.ref = l.lay.Vector()
		switch {
		case adjoint:
			for i := range l.ref {
				l.ref[i] = 1
			}
			l.normalise(shift, true)
		case k == last:
			if err := l.referenceDirect(shift, h.source); err != nil {
				return nil, err
			}
			l.normalise(shift, false)
		default:
			l.referenceFrom(levels[k+1])
			l.normalise(shift, false)
		}
		if k == last {
			if err := l.invert(shift, adjoint); err != nil {
				return nil, err
			}
			l.op = geometryOnly(l.op)
			continue
		}
		l.setWeights(levels[k+1])
		if !adjoint {
			h.improve(k, kind)
			l.absorb()
			l.setWeights(levels[k+1])
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

// referenceDirect finds the reference density of the coarsest level.
func (l *level) referenceDirect(shift float64, source bool) error {
	if !source {
		recurrent, err := volume.SingleClass(l.op)
		if err != nil {
			return err
		}
		e, err := volume.Eliminate(l.op, 0, recurrent)
		if err != nil {
			return err
		}
		e.Stationary(l.ref)
	} else {
		e, err := volume.Eliminate(l.op, shift, nil)
		if err != nil {
			return err
		}
		b := l.lay.Vector()
		for r := 0; r < l.lay.Rows; r++ {
			for i := 0; i < l.lay.Nx; i++ {
				b[l.lay.Row(r)+i] = l.op.RowVolume(r) * l.op.Width(i)
			}
		}
		e.Solve(l.ref, b)
	}
	l.floorReference()
	return nil
}

// floorReference keeps the reference density positive.
func (l *level) floorReference() {
	big := 0.0
	for r := 0; r < l.lay.Rows; r++ {
		for _, v := range l.ref[l.lay.Row(r):][:l.lay.Nx] {
			big = math.Max(big, v)
		}
	}
	for r := 0; r < l.lay.Rows; r++ {
		row := l.ref[l.lay.Row(r):][:l.lay.Nx]
		for i, v := range row {
			if !(v > big*1e-250) {
				row[i] = big * 1e-250
			}
		}
		l.lay.Wrap(l.ref, r)
	}
}

// referenceFrom interpolates the logarithm of the coarser reference density.
func (l *level) referenceFrom(c *level) {
	logs := make([]float64, c.lay.Len)
	c.each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			s := c.lay.Row(r)
			for i, v := range c.ref[s:][:c.lay.Nx] {
				logs[s+i] = math.Log(v)
			}
		}
	})
	t := c.up
	ny := c.lay.Shape(1)
	l.each(func(_, lo, hi int) {
		row := make([]float64, c.lay.Nx)
		for r := lo; r < hi; r++ {
			j, k := l.lay.RowCoordinates(r)
			clear(row)
			for _, y := range [2]struct {
				at int32
				w  float32
			}{{t.parent[1][j], 1 - t.share[1][j]}, {t.other[1][j], t.share[1][j]}} {
				for _, z := range [2]struct {
					at int32
					w  float32
				}{{t.parent[2][k], 1 - t.share[2][k]}, {t.other[2][k], t.share[2][k]}} {
					w := float64(y.w) * float64(z.w)
					if w == 0 {
						continue
					}
					for i, v := range logs[c.lay.Row(int(y.at)+ny*int(z.at)):][:c.lay.Nx] {
						row[i] += w * v
					}
				}
			}
			dst := l.ref[l.lay.Row(r):][:l.lay.Nx]
			p, o, w := t.parent[0], t.other[0], t.share[0]
			for i := range dst {
				u := float64(w[i])
				dst[i] = math.Exp((1-u)*row[p[i]] + u*row[o[i]])
			}
		}
	})
}

// setWeights fills the weights with which residuals go to the coarser level.
func (l *level) setWeights(c *level) {
	if l.weight == nil {
		l.weight = make([]float32, l.lay.Len)
	}
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

// improve runs a cycle on the problem that defines the reference density,
// starting from one.
func (h *hierarchy) improve(k int, kind cycleKind) {
	l := h.levels[k]
	clear(l.b)
	for r := 0; r < l.lay.Rows; r++ {
		s := l.lay.Row(r)
		for i := range l.x[s:][:l.lay.Nx] {
			l.x[s+i] = 1
			if h.source {
				if q := l.scale[s+i]; q > 0 {
					l.b[s+i] = float32(l.op.RowVolume(r) * l.op.Width(i) / q)
				}
			}
		}
		l.wrap(l.x, r)
	}
	h.cycle(k, l.x, l.b, kind, false)
}

// invert keeps the inverse of the coarsest operator with scaled rows and
// columns; in the singular case the right-hand side is first made consistent
// and the solution has mean zero.
func (l *level) invert(shift float64, adjoint bool) error {
	e, err := volume.Eliminate(l.op, shift, nil)
	if err != nil {
		// Transient cells: the smoother alone acts on the coarsest level.
		l.dense = make([]float32, l.grid.Cells()*l.grid.Cells())
		for k, n := 0, l.grid.Cells(); k < n; k++ {
			l.dense[k*n+k] = 1
		}
		return nil
	}
	n, nx := l.grid.Cells(), l.lay.Nx
	l.dense = make([]float32, n*n)
	b, x := l.lay.Vector(), l.lay.Vector()
	at := func(k int) int { return l.lay.Row(k/nx) + k%nx }
	var total float64
	for k := 0; k < n; k++ {
		total += l.scale[at(k)]
	}
	if e.Singular() && adjoint {
		return fmt.Errorf("multigrid: the adjoint problem without losses has no unique solution")
	}
	for k := 0; k < n; k++ {
		clear(b)
		q := l.scale[at(k)]
		b[at(k)] = q
		if e.Singular() {
			for j := 0; j < n; j++ {
				b[at(j)] -= q / total * l.scale[at(j)]
			}
		}
		if adjoint {
			e.SolveAdjoint(x, b)
		} else {
			e.Solve(x, b)
		}
		mean := 0.0
		if e.Singular() {
			for j := 0; j < n; j++ {
				mean += x[at(j)] / l.ref[at(j)] / float64(n)
			}
		}
		for j := 0; j < n; j++ {
			l.dense[j*n+k] = float32(x[at(j)]/l.ref[at(j)] - mean)
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
