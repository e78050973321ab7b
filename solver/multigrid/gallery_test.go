package multigrid

import (
	"context"
	"math"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// The two-dimensional test problems on the unit square with reflecting sides:
// v = 1 + 0.5 sin(2 pi x) cos(2 pi y), A = v^2 (1, aniso), drift v grad(v)/2
// (so that p ~ 1/v) plus a rotation of strength swirl.
type swirlProblem struct{ swirl, aniso float64 }

func (c swirlProblem) IsDiagonal() bool { return true }

func (c swirlProblem) Eval(pt, f, a [][]float64) error {
	if len(pt) == 3 {
		return c.eval3(pt, f, a)
	}
	xs, ys := pt[0], pt[1]
	for i, x := range xs {
		y := ys[i]
		sx, cx := math.Sincos(2 * math.Pi * x)
		sy, cy := math.Sincos(2 * math.Pi * y)
		v := 1 + .5*sx*cy
		f[0][i] = 0.5 * v * math.Pi * cx * cy
		f[1][i] = -0.5 * v * math.Pi * sx * sy * c.aniso
		if c.swirl != 0 {
			s1, c1 := math.Sincos(math.Pi * x)
			s2, c2 := math.Sincos(math.Pi * y)
			f[0][i] += c.swirl * s1 * c2
			f[1][i] -= c.swirl * c1 * s2
		}
		a[0][i], a[1][i], a[2][i] = v*v, 0, v*v*c.aniso
	}
	return nil
}

func (c swirlProblem) eval3(pt, f, a [][]float64) error {
	for i, x := range pt[0] {
		y, z := pt[1][i], pt[2][i]
		sx, cx := math.Sincos(2 * math.Pi * x)
		sy, cy := math.Sincos(2 * math.Pi * y)
		sz, cz := math.Sincos(2 * math.Pi * z)
		v := 1 + .5*sx*cy*cz
		g := 0.5 * v * math.Pi
		f[0][i], f[1][i], f[2][i] = g*cx*cy*cz, -g*sx*sy*cz, -g*sx*cy*sz
		if c.swirl != 0 {
			s1, c1 := math.Sincos(math.Pi * x)
			s2, c2 := math.Sincos(math.Pi * y)
			f[0][i] += c.swirl * s1 * c2
			f[1][i] -= c.swirl * c1 * s2
		}
		a[0][i], a[3][i], a[5][i] = v*v, v*v, v*v
		a[1][i], a[2][i], a[4][i] = 0, 0, 0
	}
	return nil
}

func square(t testing.TB, dim, n int, side grid.Side) *grid.Grid {
	t.Helper()
	var ax []grid.Axis
	for d := 0; d < dim; d++ {
		a, err := grid.Uniform(string(rune('x'+d)), 0, 1, n, side)
		if err != nil {
			t.Fatal(err)
		}
		ax = append(ax, a)
	}
	g, err := grid.New(ax...)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func stationary(t testing.TB, g *grid.Grid, c volume.Coefficients, workers int, s Settings) (*volume.Operator, []float64, Stats) {
	t.Helper()
	m, err := volume.Assemble(context.Background(), g, c, volume.Settings{Workers: workers})
	if err != nil {
		t.Fatal(err)
	}
	sv, err := New(context.Background(), m, c, 0, false, s)
	if err != nil {
		t.Fatal(err)
	}
	p, st := sv.Stationary(context.Background())
	return m, p, st
}
