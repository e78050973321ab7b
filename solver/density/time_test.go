package density

import (
	"context"
	"errors"
	"math"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

func line(t testing.TB, lo, hi float64, n int, lower, upper grid.Side) *grid.Grid {
	t.Helper()
	a, err := grid.Uniform("x", lo, hi, n, grid.Reflecting)
	if err != nil {
		t.Fatal(err)
	}
	if a, err = grid.NonUniform("x", a.Edges, lower, upper); err != nil {
		t.Fatal(err)
	}
	g, err := grid.New(a)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func ou(x, f, a []float64) {
	for d := range x {
		f[d] = -x[d]
		a[volume.Entry(len(x), d, d)] = 2
	}
}

// The spectrum of the Ornstein-Uhlenbeck process dx = -x dt + sqrt(2) dW is
// 0, 1, 2, ... (Risken, The Fokker-Planck Equation, section 5.5.1); for two
// independent ones 1 and 2 are double and triple; with rotation w the first pair is
// 1 +- i w.
func TestDecayRates(t *testing.T) {
	r, err := DecayRates(bg, line(t, -8, 8, 400, grid.Reflecting, grid.Reflecting), volume.Func(ou), 4, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	for i, q := range r {
		if want := float64(i + 1); math.Abs(real(q.Value)-want) > 2e-3*want || math.Abs(imag(q.Value)) > 1e-9 || q.Residual > 1e-8 {
			t.Errorf("rate %d is %v", i, q)
		}
	}
	w := 1.5
	turn := volume.Func(func(x, f, a []float64) {
		f[0], f[1] = -x[0]+w*x[1], -w*x[0]-x[1]
		a[0], a[2] = 2, 2
	})
	for _, m := range []Method{Direct, Multigrid} {
		r, err = DecayRates(bg, box(t, grid.Reflecting, -6, 6, 60, 60), turn, 2, Settings{Method: m})
		if err != nil {
			t.Fatal(err)
		}
		for i, q := range r {
			if math.Abs(real(q.Value)-1) > 0.02 || math.Abs(math.Abs(imag(q.Value))-w) > 0.02 {
				t.Errorf("%v: rate %d is %v", m, i, q)
			}
		}
	}
}

// Mean exit times in one dimension against closed forms: Brownian motion on
// [0, 1], T = x(1-x)/(2D) with A = 2D; the same with one reflecting end,
// T = (1-x^2)/(2D) (Gardiner, Handbook of Stochastic Methods, section 5.2.7);
// splitting probabilities x, and with constant drift
// (1-exp(-vx/D))/(1-exp(-v/D)) (section 5.2.8).
func TestExit(t *testing.T) {
	D, v := 0.7, 3.0
	free := volume.Func(func(x, f, a []float64) { a[0] = 2 * D })
	drift := volume.Func(func(x, f, a []float64) { f[0], a[0] = v, 2*D })
	n := 100
	both := line(t, 0, 1, n, grid.Absorbing, grid.Absorbing)
	check := func(name string, e *Exit, err error, want func(x float64) float64, tol float64) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		for k, got := range e.Values {
			if x := e.Grid.CenterOf(k)[0]; math.Abs(got-want(x)) > tol {
				t.Fatalf("%s at %g: %g, want %g", name, x, got, want(x))
			}
		}
	}
	e, err := MeanExitTime(bg, both, free, Settings{})
	check("both ends", e, err, func(x float64) float64 { return x * (1 - x) / (2 * D) }, 3e-5)
	e, err = MeanExitTime(bg, line(t, 0, 1, n, grid.Reflecting, grid.Absorbing), free, Settings{})
	check("one end", e, err, func(x float64) float64 { return (1 - x*x) / (2 * D) }, 3e-5)
	upper := [3][2]bool{{false, true}}
	e, err = SplittingProbability(bg, both, free, upper, Settings{})
	check("splitting", e, err, func(x float64) float64 { return x }, 1e-12)
	e, err = SplittingProbability(bg, both, drift, upper, Settings{})
	check("splitting with drift", e, err, func(x float64) float64 { return math.Expm1(-v*x/D) / math.Expm1(-v/D) }, 1e-12)
	if _, err = MeanExitTime(bg, line(t, 0, 1, n, grid.Reflecting, grid.Reflecting), free, Settings{}); !errors.Is(err, errNoExit) {
		t.Errorf("no exit: %v", err)
	}
}

// With A = 2 on the unit square the mean exit
// time at the centre is the torsion function, 0.0736713... (Timoshenko and
// Goodier, Theory of Elasticity, section 109: the series
// 1/8 - (4/pi^3) sum (-1)^((n-1)/2)/(n^3 cosh(n pi/2)), n odd).
func TestExitSquare(t *testing.T) {
	want := 0.125
	for n := 1; n < 40; n += 2 {
		sign := 1.0
		if n/2%2 == 1 {
			sign = -1
		}
		want -= 4 / math.Pow(math.Pi, 3) * sign / (math.Pow(float64(n), 3) * math.Cosh(float64(n)*math.Pi/2))
	}
	two := volume.Func(func(x, f, a []float64) { a[0], a[2] = 2, 2 })
	var errs []float64
	for _, n := range []int{31, 63, 127} {
		for _, m := range []Method{Direct, Multigrid} {
			e, err := MeanExitTime(bg, box(t, grid.Absorbing, 0, 1, n, n), two, Settings{Method: m})
			if err != nil {
				t.Fatal(err)
			}
			if e.Outcome != 0 {
				t.Errorf("%v: %v, residual %g", m, e.Outcome, e.Residual)
			}
			if m == Multigrid {
				errs = append(errs, math.Abs(e.Values[e.Grid.CellAt(0.5, 0.5)]-want))
			}
		}
	}
	if order := math.Log2(errs[1] / errs[2]); order < 1.9 || order > 2.1 {
		t.Errorf("order %g of %v (exact %.7f)", order, errs, want)
	}
}

// Escape from a well, dx = -U' dt + sqrt(2 eps) dW, U = x^4/4 - x^2/2: the mean
// time from the bottom to the top of the barrier approaches half of Kramers'
// 2 pi/sqrt(U”(a)|U”(b)|) exp(dU/eps) = 2 pi/sqrt(2) exp(1/(4 eps)) as eps falls
// (Gardiner, section 5.2.7), and equals the double integral for every eps.
func TestKramers(t *testing.T) {
	u := func(x float64) float64 { return x*x*x*x/4 - x*x/2 }
	var last float64
	for _, eps := range []float64{0.1, 0.05, 0.025} {
		well := volume.Func(func(x, f, a []float64) { f[0], a[0] = x[0]-x[0]*x[0]*x[0], 2*eps })
		e, err := MeanExitTime(bg, line(t, -2.5, 0, 1000, grid.Reflecting, grid.Absorbing), well, Settings{})
		if err != nil {
			t.Fatal(err)
		}
		k := e.Grid.CellAt(-0.99875)
		x0 := e.Grid.CenterOf(k)[0]
		// (1/eps) int_x0^0 dy exp(U(y)/eps) int_-2.5^y dz exp(-U(z)/eps), midpoint rule.
		const steps = 20000
		h := 2.5 / steps
		var inner, integral float64
		for i := 0; i < steps; i++ {
			z := -2.5 + (float64(i)+0.5)*h
			w := math.Exp(-(u(z) + 0.25) / eps)
			if z > x0 {
				integral += math.Exp((u(z)+0.25)/eps) * (inner + 0.5*w*h) * h
			}
			inner += w * h
		}
		integral /= eps
		if got := e.Values[k]; math.Abs(got/integral-1) > 2e-3 {
			t.Errorf("eps %g: %g, integral %g", eps, got, integral)
		}
		last = e.Values[k] / (math.Pi / math.Sqrt2 * math.Exp(0.25/eps))
	}
	if math.Abs(last-1) > 0.06 {
		t.Errorf("ratio to Kramers' formula %g", last)
	}
}

// The Ornstein-Uhlenbeck process from a narrow Gaussian stays Gaussian with mean
// m exp(-t) and variance 1 + (s-1) exp(-2t) (Gardiner, section 3.8.4): moments,
// mass and positivity; direct and multigrid in two dimensions.
func TestEvolve(t *testing.T) {
	for _, c := range []struct {
		g *grid.Grid
		m Method
	}{{box(t, grid.Reflecting, -6, 6, 200), Auto}, {box(t, grid.Reflecting, -6, 6, 48, 48), Multigrid}} {
		start := make([]float64, c.g.Cells())
		for k := range start {
			var r float64
			for d, x := range c.g.CenterOf(k) {
				r += (x - 1 + float64(d)) * (x - 1 + float64(d)) / (2 * 0.25)
			}
			start[k] = math.Exp(-r)
		}
		ev, err := Evolve(bg, c.g, volume.Func(ou), start, []float64{0, 0.5, 1}, Settings{Method: c.m}, TimeSettings{Tolerance: 1e-4})
		if err != nil {
			t.Fatal(err)
		}
		if len(ev.Snapshots) != 3 || ev.Outcome != 0 {
			t.Fatalf("%d snapshots, %v", len(ev.Snapshots), ev.Outcome)
		}
		for _, s := range ev.Snapshots {
			if math.Abs(s.Mass/ev.Snapshots[0].Mass-1) > 1e-9 {
				t.Errorf("mass %g at %g", s.Mass, s.Time)
			}
			var mean, sq float64
			for k, v := range c.g.Volumes() {
				if s.P[k] < 0 {
					t.Fatalf("negative density %g", s.P[k])
				}
				x := c.g.CenterOf(k)[0]
				mean += v * s.P[k] * x / s.Mass
				sq += v * s.P[k] * x * x / s.Mass
			}
			wantMean, wantVar := math.Exp(-s.Time), 1-0.75*math.Exp(-2*s.Time)
			if math.Abs(mean-wantMean) > 0.01 || math.Abs(sq-mean*mean-wantVar) > 0.02 {
				t.Errorf("%s t=%g: mean %g variance %g, want %g %g", c.g, s.Time, mean, sq-mean*mean, wantMean, wantVar)
			}
		}
		t.Logf("%s: %d steps, %d rejected", c.g, ev.Steps, ev.Rejected)
	}
}

// Interrupting keeps the snapshots reached.
func TestEvolveCancel(t *testing.T) {
	g := box(t, grid.Reflecting, -6, 6, 100)
	start := make([]float64, 100)
	start[70] = 1
	ctx, cancel := context.WithCancel(bg)
	ev, err := Evolve(ctx, g, volume.Func(ou), start, []float64{0.1, 50}, Settings{Progress: func(p Progress) {
		if p.Stage == "time step" && p.Residual > 0.2 {
			cancel()
		}
	}}, TimeSettings{})
	if err != nil || len(ev.Snapshots) != 1 || ev.Outcome.String() == "converged" {
		t.Errorf("%v: %+v", err, ev)
	}
}
