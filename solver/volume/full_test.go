package volume

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"epslim/solver/grid"
)

// Elimination, product and adjoint agree for links off the axes of either sign.
func TestFullOperatorIdentities(t *testing.T) {
	for _, rho := range []float64{0.5, -0.5} {
		for _, side := range []grid.Side{grid.Reflecting, grid.Periodic} {
			for _, dim := range []int{2, 3} {
				var ax []grid.Axis
				for d := 0; d < dim; d++ {
					ax = append(ax, uniform(t, string(rune('x'+d)), -1, 1, 6+d, side))
				}
				g := axes(t, ax...)
				m, err := Assemble(context.Background(), g, Func(func(x, f, a []float64) {
					for d := range x {
						f[d] = math.Sin(math.Pi * x[(d+1)%dim])
						a[Entry(dim, d, d)] = 1 + 0.1*math.Sin(math.Pi*x[d])
					}
					a[Entry(dim, 0, 1)] = rho
					if dim == 3 {
						a[Entry(dim, 0, 2)] = -rho / 2
						a[Entry(dim, 1, 2)] = rho / 2
					}
				}), Settings{Workers: 2})
				if err != nil {
					t.Fatal(err)
				}
				l := &m.Layout
				rng := rand.New(rand.NewPCG(9, 9))
				x, mx, sol, ones := l.Vector(), l.Vector(), l.Vector(), l.Vector()
				for r := 0; r < l.Rows; r++ {
					for i := 0; i < l.Nx; i++ {
						x[l.Row(r)+i] = rng.Float64() - 0.5
						ones[l.Row(r)+i] = 1
					}
				}
				m.Apply(mx, x, 0)
				var sum float64
				for r := 0; r < l.Rows; r++ {
					for i := 0; i < l.Nx; i++ {
						sum += mx[l.Row(r)+i]
					}
				}
				if math.Abs(sum) > 1e-12 {
					t.Errorf("rho=%g %v %dD: outflows add up to %g", rho, side, dim, sum)
				}
				m.ApplyAdjoint(sol, ones, 0)
				for r := 0; r < l.Rows; r++ {
					for i := 0; i < l.Nx; i++ {
						if math.Abs(sol[l.Row(r)+i]) > 1e-12 {
							t.Fatalf("rho=%g %v %dD: M^T 1 = %g", rho, side, dim, sol[l.Row(r)+i])
						}
					}
				}
				e, err := Eliminate(m, 0.3, nil)
				if err != nil {
					t.Fatal(err)
				}
				m.Apply(mx, x, 0.3)
				e.Solve(sol, mx)
				for r := 0; r < l.Rows; r++ {
					for i := 0; i < l.Nx; i++ {
						if k := l.Row(r) + i; math.Abs(sol[k]-x[k]) > 1e-11 {
							t.Fatalf("rho=%g %v %dD: elimination is off by %g", rho, side, dim, sol[k]-x[k])
						}
					}
				}
			}
		}
	}
}
