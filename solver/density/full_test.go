package density

import (
	"math"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// ouFull is dx = -K x dt + sigma dW with constant A in two dimensions; its
// stationary density is the Gaussian whose covariance S solves
// K S + S K^T = A (Gardiner, Handbook of Stochastic Methods, section 4.4.6).
func ouFull(k, a [3]float64, k21 float64) volume.Func {
	return func(x, f, d []float64) {
		f[0] = -(k[0]*x[0] + k[1]*x[1])
		f[1] = -(k21*x[0] + k[2]*x[1])
		d[0], d[1], d[2] = a[0], a[1], a[2]
	}
}

// lyapunov2 solves K S + S K^T = A in two dimensions.
func lyapunov2(k11, k12, k21, k22 float64, a [3]float64) (s11, s12, s22 float64) {
	// 2(k11 s11 + k12 s12) = a0; k21 s11 + (k11+k22) s12 + k12 s22 = a1; 2(k21 s12 + k22 s22) = a2
	m := [3][4]float64{{2 * k11, 2 * k12, 0, a[0]}, {k21, k11 + k22, k12, a[1]}, {0, 2 * k21, 2 * k22, a[2]}}
	for i := 0; i < 3; i++ {
		for j := 0; j < 3; j++ {
			if j == i {
				continue
			}
			f := m[j][i] / m[i][i]
			for c := i; c < 4; c++ {
				m[j][c] -= f * m[i][c]
			}
		}
	}
	return m[0][3] / m[0][0], m[1][3] / m[1][1], m[2][3] / m[2][2]
}

func TestCorrelatedNoise(t *testing.T) {
	for _, c := range []struct {
		name               string
		k11, k12, k21, k22 float64
		a                  [3]float64
		maxError           float64
		order              float64
	}{
		// K = A/2: detailed balance with the standard Gaussian.
		{"reversible 0.9", 0.5, 0.45, 0.45, 0.5, [3]float64{1, 0.9, 1}, 2e-5, 0},
		{"reversible -0.9", 0.5, -0.45, -0.45, 0.5, [3]float64{1, -0.9, 1}, 2e-5, 0},
		{"reversible 0.99", 0.5, 0.495, 0.495, 0.5, [3]float64{1, 0.99, 1}, 2e-5, 0},
		{"irreversible 0.5", 1, 1, -1, 1, [3]float64{1, 0.5, 1}, 1, 1.8},
		{"irreversible -0.5", 1, 1, -1, 1, [3]float64{1, -0.5, 1}, 1, 1.8},
	} {
		s11, s12, s22 := lyapunov2(c.k11, c.k12, c.k21, c.k22, c.a)
		det := s11*s22 - s12*s12
		exact := PointFormula(func(x []float64) float64 {
			return math.Exp(-(s22*x[0]*x[0] - 2*s12*x[0]*x[1] + s11*x[1]*x[1]) / (2 * det))
		})
		var grids []*grid.Grid
		for _, n := range []int{32, 64, 128} {
			grids = append(grids, box(t, grid.Reflecting, -6, 6, n, n))
		}
		ref, err := Refine(bg, grids, ouFull([3]float64{c.k11, c.k12, c.k22}, c.a, c.k21), exact, Settings{})
		if err != nil {
			t.Fatal(err)
		}
		last := ref.Results[2]
		if !last.Operator.Report.Monotone || last.Operator.Report.Diagonal || last.Outcome != 0 {
			t.Errorf("%s: %v %v %s", c.name, last.Outcome, last.Residual, last.Operator.Report)
		}
		if min, _ := last.Minimum(); !(min >= 0) {
			t.Errorf("%s: minimum %g", c.name, min)
		}
		t.Logf("%s: L1 %.3g order %.2f iterations %d", c.name, ref.L1, ref.Order, last.Iterations)
		if ref.L1[2] > c.maxError || ref.Order[1] < c.order {
			t.Errorf("%s: L1 %v, order %v", c.name, ref.L1, ref.Order)
		}
	}
}

// A variable, correlated diffusion with the prescribed density exp(-phi): the
// drift f = (div A - A grad(phi))/2 is detailed balance for any A. Reflecting
// sides, where the cross terms meet the wall; periodic ones; and three
// dimensions.
func TestVariableFullDiffusion(t *testing.T) {
	tau := 2 * math.Pi
	phi := func(x []float64) float64 {
		s := 0.0
		for d := range x {
			s += math.Sin(tau*x[d]+float64(d)) + 0.3*math.Cos(tau*(x[d]-x[(d+1)%len(x)]))
		}
		return 0.5 * s
	}
	entry := func(a, b int, x []float64) float64 {
		if a == b {
			return 2 + 0.4*math.Sin(tau*x[(a+1)%len(x)])
		}
		return 0.4 * math.Cos(tau*(x[a]+2*x[b])+0.3)
	}
	coef := volume.Func(func(x, f, a []float64) {
		n, h := len(x), 1e-5
		at := func(d int, s float64) []float64 {
			y := append([]float64(nil), x...)
			y[d] += s
			return y
		}
		for p := 0; p < n; p++ {
			for q := 0; q < n; q++ {
				lo, hi := min(p, q), max(p, q)
				v := entry(lo, hi, x)
				a[volume.Entry(n, p, q)] = v
				div := (entry(lo, hi, at(q, h)) - entry(lo, hi, at(q, -h))) / (2 * h)
				grad := (phi(at(q, h)) - phi(at(q, -h))) / (2 * h)
				f[p] += 0.5 * (div - v*grad)
			}
		}
	})
	exact := PointFormula(func(x []float64) float64 { return math.Exp(-phi(x)) })
	for _, c := range []struct {
		side  grid.Side
		sizes [][]int
	}{
		{grid.Reflecting, [][]int{{16, 16}, {32, 32}, {64, 64}}},
		{grid.Periodic, [][]int{{16, 16}, {32, 32}, {64, 64}}},
		{grid.Periodic, [][]int{{8, 8, 8}, {16, 16, 16}}},
		{grid.Reflecting, [][]int{{8, 8, 8}, {16, 16, 16}}},
	} {
		var grids []*grid.Grid
		for _, n := range c.sizes {
			grids = append(grids, box(t, c.side, 0, 1, n...))
		}
		ref, err := Refine(bg, grids, coef, exact, Settings{Method: Multigrid})
		if err != nil {
			t.Fatal(err)
		}
		last := ref.Results[len(grids)-1]
		t.Logf("%v %v: L1 %.3g order %.2f iterations %d", c.side, c.sizes, ref.L1, ref.Order, last.Iterations)
		if ref.Order[len(ref.Order)-1] < 1.7 || last.Outcome != 0 {
			t.Errorf("%v %v: order %v of %v, %v", c.side, c.sizes, ref.Order, ref.L1, last.Outcome)
		}
	}
}

// A matrix that no nine-point M-matrix can represent on square cells is
// reported, and represented by one on cells of the right shape.
func TestMonotoneReport(t *testing.T) {
	f := ouFull([3]float64{2, 0.9, 0.5}, [3]float64{4, 1.8, 1}, 0.9)
	r, err := Stationary(bg, box(t, grid.Reflecting, -5, 5, 40, 40), f, Settings{Method: Direct})
	if err != nil {
		t.Fatal(err)
	}
	if r.Operator.Report.Monotone || r.Operator.Report.Negative == 0 || r.Operator.Report.String() == "" {
		t.Errorf("no report: %+v", r.Operator.Report)
	}
	r, err = Stationary(bg, box(t, grid.Reflecting, -5, 5, 30, 60), f, Settings{Method: Direct})
	if err != nil {
		t.Fatal(err)
	}
	if !r.Operator.Report.Monotone {
		t.Errorf("report on cells 2 by 1: %s", r.Operator.Report)
	}
}
