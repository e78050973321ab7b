package multigrid

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// The number of iterations does not grow with the grid; strong rotation and
// anisotropy converge by lines.
func TestIterationCounts(t *testing.T) {
	for _, c := range []struct {
		name     string
		p        swirlProblem
		dim      int
		n        []int
		most     int
		smoother Smoother
	}{
		{"reversible", swirlProblem{0, 1}, 2, []int{64, 128, 256}, 6, Point},
		{"irreversible", swirlProblem{20, 1}, 2, []int{64, 128, 256}, 9, Point},
		{"three dimensions", swirlProblem{20, 1}, 3, []int{16, 32}, 12, Point},
		{"strong rotation", swirlProblem{20000, 1}, 2, []int{64, 128}, 24, Line},
		{"Peclet number 1e6", swirlProblem{1e6, 1}, 2, []int{64, 128}, 24, Line},
		{"diffusion ratio 1e-4", swirlProblem{20, 1e-4}, 2, []int{64, 128}, 24, Line},
		{"diffusion ratio 1e4", swirlProblem{20, 1e4}, 2, []int{64, 128}, 24, Line},
	} {
		for _, n := range c.n {
			m, p, st := stationary(t, square(t, c.dim, n, grid.Reflecting), c.p, 2, Settings{})
			if st.Outcome != Converged || st.Iterations > c.most || st.Smoother != c.smoother {
				t.Errorf("%s, %d cells: %v after %d iterations by %v, residual %.1e", c.name, n, st.Outcome, st.Iterations, st.Smoother, st.Residual)
			}
			if mass := m.Mass(p); math.Abs(mass-1) > 1e-13 {
				t.Errorf("%s: mass %g", c.name, mass)
			}
			for r := 0; r < m.Layout.Rows; r++ {
				for i, v := range p[m.Layout.Row(r):][:m.Layout.Nx] {
					if !(v > 0) {
						t.Fatalf("%s: density %g in row %d, cell %d", c.name, v, r, i)
					}
				}
			}
		}
	}
}

// Regular systems, forward and transposed, with shift and with absorbing sides:
// the solution that made the right-hand side comes back.
func TestRegularSystems(t *testing.T) {
	ctx := context.Background()
	for _, side := range []grid.Side{grid.Reflecting, grid.Periodic, grid.Absorbing} {
		for _, adjoint := range []bool{false, true} {
			for _, shift := range []float64{0, 0.5, 1e4} {
				if shift == 0 && side != grid.Absorbing {
					continue
				}
				p := swirlProblem{20, 1}
				m, err := volume.Assemble(ctx, square(t, 2, 96, side), p, volume.Settings{Workers: 2})
				if err != nil {
					t.Fatal(err)
				}
				sv, err := New(ctx, m, p, shift, adjoint, Settings{})
				if err != nil {
					t.Fatal(err)
				}
				l := &m.Layout
				want, b, x := l.Vector(), l.Vector(), l.Vector()
				for r := 0; r < l.Rows; r++ {
					for i := 0; i < l.Nx; i++ {
						want[l.Row(r)+i] = 1 + math.Sin(0.1*float64(i+r))
					}
				}
				if adjoint {
					m.ApplyAdjoint(b, want, shift)
				} else {
					m.Apply(b, want, shift)
				}
				st := sv.Solve(ctx, x, b)
				var worst float64
				for r := 0; r < l.Rows; r++ {
					for i := l.Row(r); i < l.Row(r)+l.Nx; i++ {
						worst = math.Max(worst, math.Abs(x[i]-want[i]))
					}
				}
				if st.Outcome != Converged || worst > 1e-7 || st.Iterations > 15 {
					t.Errorf("%v adjoint=%v shift=%g: %v after %d, residual %.1e, error %.1e", side, adjoint, shift, st.Outcome, st.Iterations, st.Residual, worst)
				}
			}
		}
	}
}

func TestSolverErrors(t *testing.T) {
	ctx := context.Background()
	p := swirlProblem{0, 1}
	m, err := volume.Assemble(ctx, square(t, 2, 32, grid.Reflecting), p, volume.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := New(ctx, m, p, -1, false, Settings{}); err == nil {
		t.Error("a negative shift was taken")
	}
	if _, err := New(ctx, m, p, 0, true, Settings{}); err == nil || !strings.Contains(err.Error(), "singular") {
		t.Errorf("singular transposed problem: %v", err)
	}
	// Two wells without noise between them.
	split := volume.Func(func(x, f, a []float64) {
		f[0] = math.Copysign(1, x[0]-0.5)
		a[2] = 1
		if math.Abs(x[0]-0.5) > 0.25 {
			a[0] = 1
		}
	})
	if m, err = volume.Assemble(ctx, square(t, 2, 32, grid.Reflecting), split, volume.Settings{}); err != nil {
		t.Fatal(err)
	}
	var re *volume.ReducibleError
	if _, err := New(ctx, m, split, 0, false, Settings{}); !errors.As(err, &re) || len(re.Classes.Recurrent) != 2 {
		t.Errorf("two wells: %v", err)
	}
	sv, err := New(ctx, mustAssemble(t, p), p, 0, false, Settings{MaxIterations: 1})
	if err != nil {
		t.Fatal(err)
	}
	if _, st := sv.Stationary(ctx); st.Outcome != IterationLimit || st.Iterations != 1 {
		t.Errorf("one iteration: %v after %d", st.Outcome, st.Iterations)
	}
}

func mustAssemble(t *testing.T, p swirlProblem) *volume.Operator {
	t.Helper()
	m, err := volume.Assemble(context.Background(), square(t, 2, 64, grid.Reflecting), p, volume.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	return m
}
