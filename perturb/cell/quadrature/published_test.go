package quadrature_test

import (
	"context"
	"encoding/json"
	"math"
	"os"
	"strconv"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
)

type oracle struct {
	DoubleWell []struct {
		T     float64
		Value string
	} `json:"double_well"`
	Tilted []struct {
		F, V, D             float64
		Velocity, Diffusion string
	}
}

func readOracle(t *testing.T) oracle {
	t.Helper()
	text, err := os.ReadFile("testdata/oracle.json")
	if err != nil {
		t.Fatal(err)
	}
	var o oracle
	if err := json.Unmarshal(text, &o); err != nil {
		t.Fatal(err)
	}
	return o
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func TestDoubleWell(t *testing.T) {
	ctx := context.Background()
	y := fast.Func1("y", func(y float64) float64 { return y })
	for _, c := range readOracle(t).DoubleWell {
		s, err := quadrature.New(ctx, one(line, func(y float64) float64 { return y - y*y*y }, constant(2*c.T)), quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		phi, _, err := s.Solve(ctx, s.Coefficient(y))
		if err != nil {
			t.Fatal(err)
		}
		v, err := s.Mean(ctx, s.Apply(fast.Multiply(y), phi))
		if err != nil {
			t.Fatal(err)
		}
		check(t, "double well", v, number(t, c.Value), 1e-13)
	}
}

// tiltedChain returns the mean velocity and the effective diffusion D_eff of
// dy = (F + V sin y) dt + sqrt(2D) dW unrolled on the line, the second in two
// ways that share little: <D (1+Phi')^2> and D + <f Phi> + 2 D <Phi'>.
func tiltedChain(t *testing.T, s fast.Solver, f fast.Coefficient, d float64) (vel, first, second fast.Value) {
	t.Helper()
	ctx := context.Background()
	must := func(v fast.Value, err error) fast.Value {
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	phi, vel, err := s.Solve(ctx, s.Coefficient(f))
	if err != nil {
		t.Fatal(err)
	}
	slope := s.Apply(fast.Derivative(fast.Constant(1), 1), phi)
	one := s.Coefficient(fast.Constant(1))
	stretch := s.Sum(fast.Scaled{Factor: 1, Function: one}, fast.Scaled{Factor: 1, Function: slope})
	first = must(s.Mean(ctx, s.Sum(fast.Scaled{Factor: d, Function: s.Product(stretch, stretch)})))
	second = must(s.Mean(ctx, s.Sum(fast.Scaled{Factor: d, Function: one}, fast.Scaled{Factor: 2 * d, Function: slope}, fast.Scaled{Factor: 1, Function: s.Apply(fast.Multiply(f), phi)})))
	return vel, first, second
}

func TestTiltedPotential(t *testing.T) {
	ctx := context.Background()
	for _, c := range readOracle(t).Tilted {
		force := func(y float64) float64 { return c.F + c.V*math.Sin(y) }
		s, err := quadrature.New(ctx, one(circle, force, constant(2*c.D)), quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		vel, first, second := tiltedChain(t, s, fast.Func1("f", force), c.D)
		check(t, "velocity", vel, number(t, c.Velocity), 1e-12)
		check(t, "diffusion <D(1+Phi')^2>", first, number(t, c.Diffusion), 1e-12)
		check(t, "diffusion D+2D<Phi'>+<f Phi>", second, number(t, c.Diffusion), 1e-12)
	}
}

// Lifson and Jackson (J. Chem. Phys. 36 (1962) 2410): D_eff = D/I0(V/D)^2 for a
// cosine, up to barriers of 60 times D.
func TestLifsonJackson(t *testing.T) {
	ctx := context.Background()
	for _, v := range []float64{0.1, 1.4, 6, 30} {
		force := func(y float64) float64 { return v * math.Sin(y) }
		s, err := quadrature.New(ctx, one(circle, force, constant(2)), quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		_, first, _ := tiltedChain(t, s, fast.Func1("f", force), 1)
		want := 1 / (besselI(0, v) * besselI(0, v))
		// 1+Phi' cancels almost everywhere behind a high barrier.
		tol := 1e-11
		if v > 20 {
			tol = 1e-5
		}
		if math.Abs(first.Value/want-1) > tol || math.Abs(first.Value-want) > first.Error {
			t.Errorf("V = %g: %.15g, want %.15g, claimed error %.2g", v, first.Value, want, first.Error)
		}
	}
}

// The slow derivative of a mean and of a corrector against central
// differences of the same solver: dy = (k sin(x - y) + w) dt + sqrt(2D(1+x/3 cos y)) dW.
func TestSlowDerivative(t *testing.T) {
	ctx := context.Background()
	f := func(x, y float64) float64 { return 1.1*math.Sin(x-y) + 0.4*x }
	a := func(x, y float64) float64 { return 0.9 * (1 + x/3*math.Cos(y)) }
	g := func(x, y float64) float64 { return math.Exp(x*math.Sin(y)) + math.Cos(2*y) }
	at := func(x float64) (mean, cell float64) {
		s, err := quadrature.New(ctx, one(circle, func(y float64) float64 { return f(x, y) }, func(y float64) float64 { return a(x, y) }), quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		phi, m, err := s.Solve(ctx, s.Coefficient(fast.Func1("g", func(y float64) float64 { return g(x, y) })))
		if err != nil {
			t.Fatal(err)
		}
		// A fixed function of y, so that the derivative is <h_fixed Phi>_x only
		// through the law and the corrector.
		v, err := s.Mean(ctx, s.Apply(fast.Multiply(fast.Func1("h", math.Sin)), phi))
		if err != nil {
			t.Fatal(err)
		}
		return m.Value, v.Value
	}
	const x, h = 0.7, 1e-3
	diff := func(k int) float64 {
		pick := func(x float64) float64 { m, c := at(x); return []float64{m, c}[k] }
		return (8*(pick(x+h)-pick(x-h)) - (pick(x+2*h) - pick(x-2*h))) / (12 * h)
	}
	s, err := quadrature.New(ctx, one(circle, func(y float64) float64 { return f(x, y) }, func(y float64) float64 { return a(x, y) }), quadrature.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	lx := fast.Operator{
		{Coefficient: fast.Func1("f_x", func(y float64) float64 { return 1.1*math.Cos(x-y) + 0.4 }), Order: []int{1}},
		{Coefficient: fast.Func1("a_x/2", func(y float64) float64 { return 0.15 * math.Cos(y) }), Order: []int{2}},
	}
	phi, _, err := s.Solve(ctx, s.Coefficient(fast.Func1("g", func(y float64) float64 { return g(x, y) })))
	if err != nil {
		t.Fatal(err)
	}
	gx := s.Coefficient(fast.Func1("g_x", func(y float64) float64 { return math.Sin(y) * math.Exp(x*math.Sin(y)) }))
	phix, dmean, err := s.Solve(ctx, s.Sum(fast.Scaled{Factor: 1, Function: gx}, fast.Scaled{Factor: 1, Function: s.Apply(lx, phi)}))
	if err != nil {
		t.Fatal(err)
	}
	if want := diff(0); math.Abs(dmean.Value-want) > 1e-10 {
		t.Errorf("d<g>/dx = %.12g, differences give %.12g", dmean.Value, want)
	}
	// d<h Phi>/dx = <h Phi_x> + <L_x Psi> with Psi the corrector of h Phi.
	hphi := s.Apply(fast.Multiply(fast.Func1("h", math.Sin)), phi)
	psi, _, err := s.Solve(ctx, hphi)
	if err != nil {
		t.Fatal(err)
	}
	total, err := s.Mean(ctx, s.Sum(
		fast.Scaled{Factor: 1, Function: s.Apply(fast.Multiply(fast.Func1("h", math.Sin)), phix)},
		fast.Scaled{Factor: 1, Function: s.Apply(lx, psi)}))
	if err != nil {
		t.Fatal(err)
	}
	// The centred corrector has the derivative Phi_x - <L_x Xi>, Xi the
	// corrector of Phi; <h> times it.
	xi, _, err := s.Solve(ctx, phi)
	if err != nil {
		t.Fatal(err)
	}
	shift, err := s.Mean(ctx, s.Apply(lx, xi))
	if err != nil {
		t.Fatal(err)
	}
	hm, err := s.Mean(ctx, s.Coefficient(fast.Func1("h", math.Sin)))
	if err != nil {
		t.Fatal(err)
	}
	got := total.Value - hm.Value*shift.Value
	if want := diff(1); math.Abs(got-want) > 1e-10 {
		t.Errorf("d<h Phi>/dx = %.12g, differences give %.12g", got, want)
	}
}
