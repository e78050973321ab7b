package density

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

var bg = context.Background()

func box(t testing.TB, side grid.Side, lo, hi float64, n ...int) *grid.Grid {
	t.Helper()
	var ax []grid.Axis
	for d, k := range n {
		a, err := grid.Uniform(string(rune('x'+d)), lo, hi, k, side)
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

// speed is 1 + 0.5 sin(2 pi x) cos(2 pi y) cos(2 pi z) with its gradient.
func speed(x []float64) (v float64, grad [3]float64) {
	s, c := [3]float64{0, 1, 1}, [3]float64{1, 0, 0}
	for d := range x {
		s[d], c[d] = math.Sincos(2 * math.Pi * x[d])
	}
	s[0], c[0] = c[0], s[0] // the first factor is a sine
	f := [3]float64{c[0], 1, 1}
	g := [3]float64{s[0], 0, 0}
	for d := 1; d < len(x); d++ {
		f[d], g[d] = c[d], -s[d]
	}
	v = 1 + 0.5*f[0]*f[1]*f[2]
	for d := range x {
		p := math.Pi * g[d]
		for e := range f {
			if e != d {
				p *= f[e]
			}
		}
		grad[d] = p
	}
	return v, grad
}

// crawler has A = v^2 and drift v grad(v)/2: the density is 1/v without current.
func crawler(x, f, a []float64) {
	v, g := speed(x)
	for d := range f {
		f[d] = 0.5 * v * g[d]
		a[volume.Entry(len(x), d, d)] = v * v
	}
}

// Reversible crawlers in one, two and three dimensions, reflecting and
// periodic: second order, current at the level of rounding against its scale,
// positive, mass one.
func TestReversible(t *testing.T) {
	for _, c := range []struct {
		side  grid.Side
		sizes [][]int
		m     Method
	}{
		{grid.Reflecting, [][]int{{32}, {64}, {128}}, Auto},
		{grid.Periodic, [][]int{{32}, {64}, {128}}, Auto},
		{grid.Reflecting, [][]int{{16, 16}, {32, 32}}, Direct},
		{grid.Periodic, [][]int{{16, 16}, {32, 32}, {64, 64}}, Multigrid},
		{grid.Reflecting, [][]int{{24, 48}, {48, 96}, {96, 192}}, Multigrid},
		{grid.Reflecting, [][]int{{8, 8, 8}, {16, 16, 16}, {32, 32, 32}}, Multigrid},
		{grid.Periodic, [][]int{{8, 8, 8}, {16, 16, 16}, {32, 32, 32}}, Multigrid},
	} {
		var grids []*grid.Grid
		for _, n := range c.sizes {
			grids = append(grids, box(t, c.side, 0, 1, n...))
		}
		ref, err := Refine(bg, grids, volume.Func(crawler), PointFormula(func(x []float64) float64 { v, _ := speed(x); return 1 / v }), Settings{Method: c.m})
		if err != nil {
			t.Fatal(err)
		}
		last := ref.Results[len(grids)-1]
		if o := ref.Order[len(ref.Order)-1]; o < 1.9 || o > 2.2 {
			t.Errorf("%v %v: order %v of %v", c.side, c.sizes, ref.Order, ref.L1)
		}
		min, _ := last.Minimum()
		if math.Abs(last.Mass()-1) > 1e-13 || !(min > 0) || last.Outcome != 0 {
			t.Errorf("%v %v: mass %g, minimum %g, %v", c.side, c.sizes, last.Mass(), min, last.Outcome)
		}
		cur := last.Current()
		if cur.Divergence > 1e-12*cur.Scale {
			t.Errorf("%v %v: divergence %g of %g", c.side, c.sizes, cur.Divergence, cur.Scale)
		}
	}
}

// A linear drift with rotation, dx = -x + w y, dy = -w x - y, A = 2 I, has the
// standard Gaussian as its density for every w, with the current
// w (y, -x) p. (The stationary covariance solves the Lyapunov equation
// B S + S B^T = A: Gardiner, Handbook of Stochastic Methods, section 4.4.6.) Its
// entropy production is the integral of 2 J.A^-1.J/p = 2 w^2.
func TestRotatingGaussian(t *testing.T) {
	w := 2.0
	c := volume.Func(func(x, f, a []float64) {
		f[0], f[1] = -x[0]+w*x[1], -w*x[0]-x[1]
		a[0], a[2] = 2, 2
	})
	exact := PointFormula(func(x []float64) float64 { return math.Exp(-(x[0]*x[0] + x[1]*x[1]) / 2) })
	var grids []*grid.Grid
	for _, n := range []int{64, 128, 256} {
		grids = append(grids, box(t, grid.Reflecting, -6, 6, n, n))
	}
	ref, err := Refine(bg, grids, c, exact, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	if o := ref.Order[1]; o < 1.9 || o > 2.2 {
		t.Errorf("order %v of %v", ref.Order, ref.L1)
	}
	r := ref.Results[2]
	cur := r.Current()
	k := r.Grid.CellAt(1.01, 0.01)
	x := r.Grid.CenterOf(k)
	if got, want := cur.Cells[1][k], -w*x[0]*r.P[k]; math.Abs(got-want) > 2e-3*math.Abs(want) {
		t.Errorf("current %g, want %g", got, want)
	}
	if e := r.EntropyProduction(); math.Abs(e-2*w*w) > 0.02 {
		t.Errorf("entropy production %g, want %g", e, 2*w*w)
	}
	mean, cov := r.Moments()
	if math.Abs(mean[0]) > 1e-9 || math.Abs(cov[0][0]-1) > 2e-3 || math.Abs(cov[0][1]) > 1e-9 {
		t.Errorf("mean %v covariance %v", mean, cov)
	}
	var one float64
	for i, v := range r.Marginal(1) {
		one += v * r.Grid.Axis(1).Width(i)
	}
	if math.Abs(one-1) > 1e-12 {
		t.Errorf("marginal has mass %g", one)
	}
}

// Direct elimination and multigrid agree, with any number of workers to the bit.
func TestMethodsAgree(t *testing.T) {
	c := volume.Func(func(x, f, a []float64) {
		crawler(x, f, a)
		f[0] += 10 * math.Sin(math.Pi*x[0]) * math.Cos(math.Pi*x[1])
		f[1] -= 10 * math.Cos(math.Pi*x[0]) * math.Sin(math.Pi*x[1])
	})
	for _, side := range []grid.Side{grid.Reflecting, grid.Periodic} {
		for _, n := range [][]int{{48, 48}, {40, 61}, {33, 70}} {
			g := box(t, side, 0, 1, n...)
			a, err := Stationary(bg, g, c, Settings{Method: Direct})
			if err != nil {
				t.Fatal(err)
			}
			b, err := Stationary(bg, g, c, Settings{Method: Multigrid})
			if err != nil {
				t.Fatal(err)
			}
			for k := range a.P {
				if math.Abs(a.P[k]-b.P[k]) > 1e-11*a.P[k] {
					t.Fatalf("%v %v: %g and %g at %s (%v, residual %g)", side, n, a.P[k], b.P[k], g.Describe(k), b.Outcome, b.Residual)
				}
			}
		}
		g := box(t, side, 0, 1, 200, 150)
		one, err := Stationary(bg, g, c, Settings{Method: Multigrid, Workers: 1})
		if err != nil {
			t.Fatal(err)
		}
		for _, w := range []int{2, 3, 7} {
			r, err := Stationary(bg, g, c, Settings{Method: Multigrid, Workers: w})
			if err != nil {
				t.Fatal(err)
			}
			for k := range one.P {
				if one.P[k] != r.P[k] {
					t.Fatalf("%v: %d workers give %v, one gives %v at %s", side, w, r.P[k], one.P[k], g.Describe(k))
				}
			}
		}
	}
}

func TestErrors(t *testing.T) {
	g := box(t, grid.Reflecting, 0, 1, 16, 16)
	for _, c := range []struct {
		name string
		g    *grid.Grid
		f    volume.Func
		s    Settings
		want []string
	}{
		{"negative diffusion", g, func(x, f, a []float64) { a[0], a[2] = 1, x[1]-0.5 }, Settings{}, []string{"diffusion y,y", "y=0.03125", "negative"}},
		{"not finite", g, func(x, f, a []float64) { a[0], a[2] = 1, 1; f[0] = math.Log(x[0] - 0.5) }, Settings{}, []string{"drift x is NaN", "x=0.03125"}},
		{"memory", box(t, grid.Reflecting, 0, 1, 2048, 2048), crawler, Settings{MemoryLimit: 1 << 20}, []string{"4194304 cells", "MiB", "1 MiB"}},
		{"absorbing", box(t, grid.Absorbing, 0, 1, 8), crawler, Settings{}, []string{"absorbing side at x=0 and x=1"}},
		{"window", box(t, grid.Reflecting, -2, 2, 64), func(x, f, a []float64) { f[0] = -x[0]; a[0] = 2 },
			Settings{Window: [3][2]bool{{false, true}}}, []string{"upper side x=2", "widen"}},
		{"two classes", box(t, grid.Reflecting, -1, 1, 64), func(x, f, a []float64) { f[0] = x[0] - 8*x[0]*x[0]*x[0] }, Settings{}, []string{"2 recurrent classes"}},
	} {
		_, err := Stationary(bg, c.g, c.f, c.s)
		if err == nil {
			t.Errorf("%s: no error", c.name)
			continue
		}
		for _, w := range c.want {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", c.name, err, w)
			}
		}
	}
	var ce *volume.CoefficientError
	_, err := Stationary(bg, g, volume.Func(func(x, f, a []float64) { a[0], a[2] = -1, 1 }), Settings{})
	if !errors.As(err, &ce) || ce.Value != -1 {
		t.Errorf("no CoefficientError in %v", err)
	}
	ctx, cancel := context.WithCancel(bg)
	cancel()
	if _, err := Stationary(ctx, g, volume.Func(crawler), Settings{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// A cancelled solve keeps its last iterate.
func TestCancelKeepsIterate(t *testing.T) {
	ctx, cancel := context.WithCancel(bg)
	r, err := Stationary(ctx, box(t, grid.Reflecting, 0, 1, 128, 128), volume.Func(crawler), Settings{Method: Multigrid, Progress: func(p Progress) {
		if p.Stage == "solve" && p.Iteration == 2 {
			cancel()
		}
	}})
	if err != nil || r.Iterations != 2 || math.Abs(r.Mass()-1) > 1e-13 || !strings.Contains(r.Outcome.String(), "interrupted") {
		t.Errorf("error %v, result %+v", err, r)
	}
}
