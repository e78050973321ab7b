package volume

import (
	"context"
	"math"
	"testing"

	"epslim/solver/grid"
)

// One aggregation step repairs the weights of two wells whose shapes are right,
// leaves the exact density alone, and keeps mass; on open and periodic grids.
func TestRebalance(t *testing.T) {
	for _, side := range []grid.Side{grid.Reflecting, grid.Periodic} {
		g := axes(t, uniform(t, "x", -math.Pi, math.Pi, 80, side), uniform(t, "y", -math.Pi, math.Pi, 50, side))
		m, err := Assemble(context.Background(), g, Func(func(x, f, a []float64) {
			f[0], f[1] = -math.Sin(2*x[0])+0.1*math.Cos(x[0]), -math.Sin(x[1])
			a[0], a[2] = 0.2, 0.2
		}), Settings{})
		if err != nil {
			t.Fatal(err)
		}
		e, err := EliminateClass(m, nil)
		if err != nil {
			t.Fatal(err)
		}
		l := &m.Layout
		exact, p := l.Vector(), l.Vector()
		e.Stationary(exact)
		copy(p, exact)
		if d, err := Rebalance(m, p); err != nil || d > 1e-10 {
			t.Errorf("%v: the exact density is changed by %g (%v)", side, d, err)
		}
		for r := 0; r < l.Rows; r++ {
			for i := 0; i < l.Nx; i++ {
				if math.Abs(g.Axis(0).Center(i)) < math.Pi/2 {
					p[l.Row(r)+i] *= 3
				}
			}
			l.Wrap(p, r)
		}
		mass := m.Mass(p)
		d, err := Rebalance(m, p)
		if err != nil || d < 0.1 || math.Abs(m.Mass(p)/mass-1) > 1e-12 {
			t.Errorf("%v: change %g (%v), mass %g of %g", side, d, err, m.Mass(p), mass)
		}
		scale := m.Mass(exact) / m.Mass(p)
		for k := 0; k < g.Cells(); k++ {
			at := l.Row(k/l.Nx) + k%l.Nx
			if exact[at] > 0.1 && math.Abs(p[at]*scale/exact[at]-1) > 1e-3 {
				t.Fatalf("%v: %g instead of %g at %s", side, p[at]*scale, exact[at], g.Describe(k))
			}
		}
	}
}
