package volume

import (
	"fmt"

	"epslim/solver/grid"
)

// evaluator calls the coefficients for one row of points and checks what comes
// back. Every worker has its own.
type evaluator struct {
	a                        *assembly
	c                        Coefficients
	points, drift, diffusion [][]float64
	views                    [3][][]float64
	calls                    int
}

func (a *assembly) evaluator() *evaluator {
	ev := &evaluator{a: a, c: a.c}
	if cl, ok := a.c.(Cloner); ok {
		ev.c = cl.Clone()
	}
	n := a.g.Axis(0).Cells() + 1
	block := func(k int) [][]float64 {
		b := make([][]float64, k)
		for i := range b {
			b[i] = make([]float64, n)
		}
		return b
	}
	ev.points, ev.drift, ev.diffusion = block(a.dim), block(a.dim), block(entries(a.dim))
	ev.views = [3][][]float64{make([][]float64, a.dim), make([][]float64, a.dim), make([][]float64, entries(a.dim))}
	return ev
}

// row evaluates at the first n points of row r: at cell centres along the axes
// whose bit in stagger is clear, at the upper edges along those where it is set.
func (ev *evaluator) row(stagger, r, n int) error {
	ev.fillPoints(stagger, r, n)
	return ev.eval(n)
}

func (ev *evaluator) fillPoints(stagger, r, n int) {
	g := ev.a.g
	shape := g.Shape()
	cell := [grid.MaxDim]int{}
	if ev.a.dim > 1 {
		cell[1] = r % shape[1]
		cell[2] = r / shape[1]
	}
	for d := 0; d < ev.a.dim; d++ {
		axis := g.Axis(d)
		x := ev.points[d][:n]
		if d == 0 {
			if stagger&1 != 0 {
				copy(x, axis.Edges[1:])
			} else {
				for i := range x {
					x[i] = axis.Center(i)
				}
			}
			continue
		}
		v := axis.Center(cell[d])
		if stagger&(1<<d) != 0 {
			v = axis.Edges[cell[d]+1]
		}
		for i := range x {
			x[i] = v
		}
	}
}

// eval evaluates at the first n points and checks the values.
func (ev *evaluator) eval(n int) error {
	if n == 0 {
		return nil
	}
	for k, src := range [3][][]float64{ev.points, ev.drift, ev.diffusion} {
		for i := range src {
			ev.views[k][i] = src[i][:n]
		}
	}
	if err := ev.c.Eval(ev.views[0], ev.views[1], ev.views[2]); err != nil {
		return fmt.Errorf("coefficients near %s: %w", ev.place(0), err)
	}
	ev.calls += n
	for d, col := range ev.views[1] {
		for i, v := range col {
			if v-v != 0 {
				return ev.fail("drift "+ev.a.g.Axis(d).Name, i, v, "it must be finite")
			}
		}
	}
	e := 0
	for p := 0; p < ev.a.dim; p++ {
		for q := p; q < ev.a.dim; q++ {
			for i, v := range ev.views[2][e] {
				if v-v != 0 {
					return ev.fail(ev.entryName(p, q), i, v, "it must be finite")
				}
				if p == q && v < 0 {
					return ev.fail(ev.entryName(p, q), i, v, "a diffusion cannot be negative")
				}
			}
			e++
		}
	}
	return nil
}

func (ev *evaluator) entryName(p, q int) string {
	return "diffusion " + ev.a.g.Axis(p).Name + "," + ev.a.g.Axis(q).Name
}

func (ev *evaluator) place(i int) string {
	x := make([]float64, ev.a.dim)
	for d := range x {
		x[d] = ev.points[d][i]
	}
	return ev.a.g.PointText(x)
}

func (ev *evaluator) fail(quantity string, i int, v float64, reason string) error {
	return &CoefficientError{Quantity: quantity, Place: ev.place(i), Value: v, Reason: reason}
}
