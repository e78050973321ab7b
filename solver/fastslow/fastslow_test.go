package fastslow

import (
	"context"
	"errors"
	"math"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

var bg = context.Background()

func slowGrid(t testing.TB, lo, hi float64, side grid.Side, n ...int) *grid.Grid {
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

// Gauss-Hermite: moments of the standard Gaussian up to degree 2n-1.
func TestGaussHermite(t *testing.T) {
	x, w := gaussHermite(12)
	want := 1.0
	for k := 0; k < 24; k += 2 {
		var s float64
		for i := range x {
			s += w[i] * math.Pow(x[i], float64(k))
		}
		if math.Abs(s/want-1) > 1e-11 {
			t.Errorf("moment %d is %g, want %g", k, s, want)
		}
		want *= float64(k + 1)
	}
}

// Test and trial functions are biorthogonal under the quadrature, and the
// derivatives of the test functions agree with differences.
func TestBases(t *testing.T) {
	l, err := NewLine(0.5, 1.3, 8)
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range []Basis{Circle{Waves: 5}, Circle{Period: 3, Waves: 4}, l} {
		y := b.Nodes()
		for k := 0; k < b.Size(); k++ {
			for m := 0; m < b.Size(); m++ {
				var s float64
				for q := range y {
					v, _, _ := b.Test(k, y[q])
					s += v * b.Trial(m, q)
				}
				want := 0.0
				if k == m {
					want = 1
				}
				if math.Abs(s-want) > 1e-12 {
					t.Errorf("%T: <psi_%d, phi_%d> = %g", b, k, m, s)
				}
			}
			h := 1e-4
			v0, _, _ := b.Test(k, 0.3-h)
			v1, d1, d2 := b.Test(k, 0.3)
			v2, _, _ := b.Test(k, 0.3+h)
			if math.Abs((v2-v0)/(2*h)-d1) > 1e-5*(1+math.Abs(d1)) || math.Abs((v2-2*v1+v0)/(h*h)-d2) > 1e-4*(1+math.Abs(d2)) {
				t.Errorf("%T: derivatives of psi_%d", b, k)
			}
		}
	}
}

// A crawler with dx = v(x) cos(theta)/eps dt, dtheta = sqrt(2 D)/eps dW has the
// stationary density 1/v, uniform in theta, for every eps: v cos(theta) p does not
// depend on x and the turning noise does not act on a constant.
func crawler(eps float64, v func(x []float64) float64, D float64) volume.Func {
	return func(x, f, a []float64) {
		n := len(x) - 1
		sin, cos := math.Sincos(x[n])
		f[0] = v(x[:n]) * cos / eps
		if n == 2 {
			f[1] = v(x[:n]) * sin / eps
		}
		a[volume.Entry(n+1, n, n)] = 2 * D / (eps * eps)
	}
}

func TestCrawlerExact(t *testing.T) {
	tau := 2 * math.Pi
	v1 := func(x []float64) float64 { return 1 + 0.4*math.Sin(tau*x[0]) }
	v2 := func(x []float64) float64 { return 1 + 0.3*math.Sin(tau*x[0])*math.Cos(tau*x[1]) }
	for _, c := range []struct {
		sizes [][]int
		v     func(x []float64) float64
		eps   float64
	}{
		{[][]int{{20}, {40}}, v1, 0.1},
		{[][]int{{20}, {40}}, v1, 0.02},
		{[][]int{{10, 10}, {20, 20}}, v2, 0.1},
	} {
		var errs []float64
		for _, n := range c.sizes {
			g := slowGrid(t, 0, 1, grid.Periodic, n...)
			r, err := Solve(bg, g, []Basis{Circle{Waves: 3}}, crawler(c.eps, c.v, 0.8), Settings{})
			if err != nil {
				t.Fatal(err)
			}
			var mass, worst float64
			exact := make([]float64, g.Cells())
			for k, w := range g.Volumes() {
				exact[k] = 1 / c.v(g.CenterOf(k))
				mass += exact[k] * w
			}
			for k := range exact {
				worst = math.Max(worst, math.Abs(r.Marginal[k]-exact[k]/mass))
			}
			errs = append(errs, worst)
			if r.Residual > 1e-12 {
				t.Errorf("residual %g", r.Residual)
			}
		}
		t.Logf("%v eps %g: errors %.3g", c.sizes, c.eps, errs)
		if order := math.Log2(errs[0] / errs[1]); order < 2.4 {
			t.Errorf("%v eps %g: order %.2f of %v", c.sizes, c.eps, order, errs)
		}
	}
}

// The linear system dx = -x dt + y/eps dt, dy = -y/eps^2 dt + sqrt(2)/eps dW is
// Gaussian with <xx> = 1/(1+eps^2) (from the Lyapunov equation; 1 in the limit).
func linear(eps float64) volume.Func {
	return func(x, f, a []float64) {
		f[0], f[1] = -x[0]+x[1]/eps, -x[1]/(eps*eps)
		a[2] = 2 / (eps * eps)
	}
}

func TestLinearExact(t *testing.T) {
	l, err := NewLine(0, 1, 12)
	if err != nil {
		t.Fatal(err)
	}
	var off []float64
	eps := []float64{0.4, 0.2, 0.1}
	for _, e := range eps {
		g := slowGrid(t, -7, 7, grid.Reflecting, 140)
		r, err := Solve(bg, g, []Basis{l}, linear(e), Settings{})
		if err != nil {
			t.Fatal(err)
		}
		var second float64
		for k, w := range g.Volumes() {
			x := g.CenterOf(k)[0]
			second += w * x * x * r.Marginal[k]
		}
		if want := 1 / (1 + e*e); math.Abs(second-want) > 2e-4 {
			t.Errorf("eps %g: variance %.6f, want %.6f (tail %.1e, minimum %.1e)", e, second, want, r.Tail, r.Minimum)
		}
		off = append(off, 1-second)
	}
	if rate := math.Log2(off[1] / off[2]); math.Abs(rate-2) > 0.1 {
		t.Errorf("rate in eps %.2f of %v, want 2", rate, off)
	}
}

// Noise shared by the slow and the fast equation: dx = -x dt + (y/eps) dt + c dW,
// dy = -y/eps^2 dt + sqrt(2)/eps dW. The Lyapunov equation gives <yy> = 1,
// <xy>(1 + 1/eps^2) = 1/eps + c sqrt(2)/eps, <xx> = <xy>/eps + c^2/2.
func TestSharedNoise(t *testing.T) {
	l, err := NewLine(0, 1, 12)
	if err != nil {
		t.Fatal(err)
	}
	e, c := 0.25, 0.7
	f := volume.Func(func(x, f, a []float64) {
		linear(e)(x, f, a)
		a[0], a[1] = c*c, c*math.Sqrt2/e
	})
	g := slowGrid(t, -9, 9, grid.Reflecting, 160)
	r, err := Solve(bg, g, []Basis{l}, f, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	var second float64
	for k, w := range g.Volumes() {
		x := g.CenterOf(k)[0]
		second += w * x * x * r.Marginal[k]
	}
	xy := (1 + c*math.Sqrt2) / e / (1 + 1/(e*e))
	if want := xy/e + c*c/2; math.Abs(second-want) > 1e-3*want {
		t.Errorf("variance %.6f, want %.6f", second, want)
	}
}

func TestRefusals(t *testing.T) {
	if _, err := Solve(bg, slowGrid(t, 0, 1, grid.Absorbing, 8), []Basis{Circle{Waves: 2}}, linear(1), Settings{}); err == nil {
		t.Error("an absorbing axis was taken")
	}
	var se *SizeError
	if _, err := Solve(bg, slowGrid(t, 0, 1, grid.Periodic, 200, 200), []Basis{Circle{Waves: 8}}, crawler(0.1, func([]float64) float64 { return 1 }, 1), Settings{}); !errors.As(err, &se) {
		t.Errorf("size: %v", err)
	}
	ctx, cancel := context.WithCancel(bg)
	cancel()
	if _, err := Solve(ctx, slowGrid(t, 0, 1, grid.Periodic, 8), []Basis{Circle{Waves: 2}}, crawler(0.1, func([]float64) float64 { return 1 }, 1), Settings{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}
