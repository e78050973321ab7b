package quadrature_test

import (
	"context"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
)

func one(d fast.Domain, f, a func(float64) float64) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{d}, Drift: []fast.Coefficient{fast.Func1("f", f)},
		Diffusion: [][]fast.Coefficient{{fast.Func1("a", a)}}}
}

func constant(c float64) func(float64) float64 { return func(float64) float64 { return c } }

func besselI(n int, x float64) float64 {
	// Power series; enough for the arguments of the tests.
	s, t := 0.0, math.Pow(x/2, float64(n))/math.Gamma(float64(n)+1)
	for k := 1; k < 200; k++ {
		s += t
		t *= x * x / 4 / (float64(k) * float64(k+n))
	}
	return s
}

var (
	line   = fast.Domain{Kind: fast.Line}
	half   = fast.Domain{Kind: fast.HalfLine}
	circle = fast.Domain{Kind: fast.Circle}
)

func wall(a, b float64) fast.Domain { return fast.Domain{Kind: fast.Reflecting, A: a, B: b} }

func dilog(x float64) float64 {
	s, p := 0.0, 1.0
	for k := 1; k < 4000; k++ {
		p *= x
		s += p / float64(k*k)
	}
	return s
}

type gallery struct {
	name, source string
	problem      *fast.Problem
	g, h         func(float64) float64 // wants <g> and <h Phi[g]>
	mean, cell   float64
	tol          float64
}

func cases() []gallery {
	id := func(y float64) float64 { return y }
	b := (1 - math.Sqrt(1-0.36)) / 0.6
	var ei float64 // sum m^n/(n n!)
	for n, t := 1, 1.0; n < 60; n++ {
		t *= 1.3 / float64(n)
		ei += t / float64(n)
	}
	x := 1.5 / 0.7
	return []gallery{
		{"ornstein-uhlenbeck", "<y Phi> = D/a^2 (textbook)", one(line, func(y float64) float64 { return -1.3 * y }, constant(2*0.7)), id, id, 0, 0.7 / 1.69, 2e-14},
		{"narrow off-centre well", "Ornstein-Uhlenbeck process of mean 3.7 and variance 1e-8", one(line, func(y float64) float64 { return -1e8 * (y - 3.7) }, constant(2)), id, func(y float64) float64 { return (y - 3.7) * 1e8 }, 3.7, 1e-8, 1e-10},
		{"von Mises", "mean resultant I1/I0 (textbook)", one(circle, func(t float64) float64 { return -1.5 * math.Sin(t) }, constant(1.4)), math.Cos, constant(0), besselI(1, x) / besselI(0, x), 0, 2e-14},
		{"von Mises, transverse", "<sin Phi> = D/k^2 (1 - 1/I0(k/D)^2), integrating factor by hand", one(circle, func(t float64) float64 { return -1.5 * math.Sin(t) }, constant(1.4)), math.Sin, math.Sin, 0, 0.7 / 2.25 * (1 - 1/(besselI(0, x)*besselI(0, x))), 2e-14},
		{"rotor with uneven friction", "Var log(1+a cos)/(D a^2) = 2 Li2(b^2)/(D a^2), by hand", one(circle, func(t float64) float64 { return 0.8 * (1 + 0.6*math.Cos(t)) * -0.6 * math.Sin(t) }, func(t float64) float64 { u := 1 + 0.6*math.Cos(t); return 1.6 * u * u }), math.Sin, math.Sin, 0, 2 * dilog(b*b) / (0.8 * 0.36), 5e-14},
		{"log-normal", "(1/a) sum m^n/(n n!) exp(m), Hermite series by hand", one(line, func(y float64) float64 { return -0.6 * y }, constant(2*0.6*1.3)), math.Exp, math.Exp, math.Exp(0.65), math.Exp(1.3) * ei / 0.6, 1e-12},
		{"heavy tail", "Student law: <y Phi> = D/(k(k-D)) (Forman, Sorensen 2008)", one(line, func(y float64) float64 { return -2.5 * y }, func(y float64) float64 { return 1.4 * (1 + y*y) }), id, id, 0, 0.7 / (2.5 * 1.8), 1e-12},
		{"very heavy tail", "the same, exponent of the second moment 0.18", one(line, func(y float64) float64 { return -1.1 * y }, func(y float64) float64 { return 2 * (1 + y*y) }), id, id, 0, 1 / (1.1 * 0.1), 1e-11},
		{"square root", "CIR: <(y-m) Phi> = g^2 m/(2 k^2) (Cox, Ingersoll, Ross 1985)", one(half, func(y float64) float64 { return 1.5 * (1.1 - y) }, func(y float64) float64 { return 0.64 * y }), id, id, 1.1, 0.64 * 1.1 / (2 * 2.25), 1e-12},
		{"square root, end reached", "the same with 2 k m < g^2: y = 0 is reached and reflects", one(half, func(y float64) float64 { return 1.5 * (0.02 - y) }, func(y float64) float64 { return 0.64 * y }), id, id, 0.02, 0.64 * 0.02 / (2 * 2.25), 1e-11},
		{"inverse of a square-root process", "<1/y> = 2k/(2 k m - g^2) of the Gamma law (textbook)", one(half, func(y float64) float64 { return 2 * (1.2 - y) }, func(y float64) float64 { return 0.25 * y }), func(y float64) float64 { return 1 / y }, constant(0), 4 / (4*1.2 - 0.25), 0, 1e-12},
		{"Jacobi", "Beta law: <(y-mu) Phi> = g^2 mu (1-mu)/(k (g^2+2k)) (Forman, Sorensen 2008)", one(wall(0, 1), func(y float64) float64 { return 2 * (0.35 - y) }, func(y float64) float64 { return 1.21 * y * (1 - y) }), id, id, 0.35, 1.21 * 0.35 * 0.65 / (2 * (1.21 + 4)), 1e-12},
		{"Jacobi, steep ends", "the same with both ends reached, exponents 0.04 and 0.06", one(wall(0, 1), func(y float64) float64 { return 0.05 * (0.4 - y) }, func(y float64) float64 { return y * (1 - y) }), id, id, 0.4, 0.4 * 0.6 / (0.05 * 1.1), 1e-10},
		{"Couette", "Taylor-Aris, plane Couette: <u Phi> = U^2 H^2/(120 D) (Aris 1956)", one(wall(0, 1.25), constant(0), constant(0.8)), func(y float64) float64 { return 3 * (y/1.25 - 0.5) }, func(y float64) float64 { return 3 * (y/1.25 - 0.5) }, 0, 9 * 1.25 * 1.25 / (120 * 0.4), 1e-14},
		{"Poiseuille", "Taylor-Aris, plane Poiseuille: 8/945 U^2 H^2/D (Aris 1956)", one(wall(-0.8, 0.8), constant(0), constant(0.6)), func(y float64) float64 { return 2.5 * (1./3 - y*y/0.64) }, func(y float64) float64 { return 2.5 * (1./3 - y*y/0.64) }, 0, 8. / 945 * 6.25 * 0.64 / 0.3, 1e-14},
		{"round tube", "Taylor 1953: U^2 R^2/(48 D)", one(wall(0, 1), func(r float64) float64 { return 0.5 / r }, constant(1)), func(r float64) float64 { return 2 * (1 - 2*r*r) }, func(r float64) float64 { return 2 * (1 - 2*r*r) }, 0, 4 / (48 * 0.5), 1e-13},
		{"reflected Brownian motion with drift", "exponential law, Phi = y^2/2 - 1 by hand", one(half, constant(-1), constant(2)), id, id, 1, 2, 1e-13},
		{"noise-free rotor", "1/|f| law: mean velocity sqrt(w^2-b^2) (Adler)", one(circle, func(t float64) float64 { return 1.7 + 0.9*math.Sin(t) }, constant(0)), func(t float64) float64 { return 1.7 + 0.9*math.Sin(t) }, constant(0), math.Sqrt(1.7*1.7 - 0.81), 0, 1e-13},
	}
}

func TestGallery(t *testing.T) {
	ctx := context.Background()
	for _, c := range cases() {
		t.Run(c.name, func(t *testing.T) {
			s, err := quadrature.New(ctx, c.problem, quadrature.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			phi, mean, err := s.Solve(ctx, s.Coefficient(fast.Func1("g", c.g)))
			if err != nil {
				t.Fatal(err)
			}
			check(t, "mean", mean, c.mean, c.tol)
			cell, err := s.Mean(ctx, s.Apply(fast.Multiply(fast.Func1("h", c.h)), phi))
			if err != nil {
				t.Fatal(err)
			}
			check(t, "<h Phi>", cell, c.cell, c.tol)
			t.Log(s.Report(), mean.Error, cell.Error)
		})
	}
}

func check(t *testing.T, what string, got fast.Value, want, tol float64) {
	t.Helper()
	diff := math.Abs(got.Value - want)
	if diff > 3*got.Error+1e-15*got.Scale {
		t.Errorf("%s = %.16g is off by %.2g but claims an error of %.2g", what, got.Value, diff, got.Error)
	}
	if !(diff <= tol*math.Max(1e-300, math.Max(got.Scale, math.Abs(want)))) {
		t.Errorf("%s = %.16g, want %.16g (off by %.2g, claimed error %.2g, scale %.2g)", what, got.Value, want, diff, got.Error, got.Scale)
	}
}
