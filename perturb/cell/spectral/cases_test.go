package spectral_test

import (
	"context"
	"errors"
	"math"
	"testing"
	"time"

	"gonum.org/v1/gonum/mathext"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

// term builders: constant times powers, cosines and sines.
func pow(i, p int) fast.Factor {
	return fast.Factor{Coordinate: i, Kind: fast.Power, P: float64(p)}
}
func cosf(i int, k float64) fast.Factor { return fast.Factor{Coordinate: i, Kind: fast.Cos, P: k} }
func sinf(i int, k float64) fast.Factor { return fast.Factor{Coordinate: i, Kind: fast.Sin, P: k} }
func tm(c float64, f ...fast.Factor) fast.Term {
	return fast.Term{Constant: c, Factors: f}
}
func sum(name string, t ...fast.Term) fast.Coefficient { return fast.SumOf(name, t...) }

func diagonal(a ...fast.Coefficient) [][]fast.Coefficient {
	out := make([][]fast.Coefficient, len(a))
	for i := range out {
		out[i] = make([]fast.Coefficient, len(a))
		for j := range out[i] {
			out[i][j] = fast.Constant(0)
		}
		out[i][i] = a[i]
	}
	return out
}

var (
	line   = fast.Domain{Kind: fast.Line}
	circle = fast.Domain{Kind: fast.Circle}
	ball   = fast.Domain{Kind: fast.Sphere}
)

// correlatedTurning is d theta = w dt, dw = -w/tau dt + sqrt(2s)/tau dW.
func correlatedTurning(s, tau float64) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{circle, line},
		Drift:     []fast.Coefficient{sum("w", tm(1, pow(1, 1))), sum("-w/tau", tm(-1/tau, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2*s/(tau*tau)))}
}

// rod is rotational diffusion D with a field kappa along the third axis.
func rod(d, kappa float64) *fast.Problem {
	a, b, c := pow(0, 1), pow(1, 1), pow(2, 1)
	p := &fast.Problem{Domains: []fast.Domain{ball}, Drift: []fast.Coefficient{
		sum("fa", tm(-2*d, a), tm(-kappa, a, c)), sum("fb", tm(-2*d, b), tm(-kappa, b, c)),
		sum("fc", tm(-2*d, c), tm(kappa), tm(-kappa, pow(2, 2)))}}
	// a = 2D (I - y y').
	for i := 0; i < 3; i++ {
		var row []fast.Coefficient
		for j := 0; j < 3; j++ {
			t := []fast.Term{tm(-2*d, pow(i, 1), pow(j, 1))}
			if i == j {
				t = []fast.Term{tm(2 * d), tm(-2*d, pow(i, 2))}
			}
			row = append(row, sum("a", t...))
		}
		p.Diffusion = append(p.Diffusion, row)
	}
	return p
}

func solve(t *testing.T, p *fast.Problem, g, h fast.Coefficient) (mean, cell fast.Value, s *fast.Engine) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 60*time.Second)
	defer cancel()
	s, err := spectral.New(ctx, p, spectral.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	phi, mean, err := s.Solve(ctx, s.Coefficient(g))
	if err != nil {
		t.Fatal(err)
	}
	cell, err = s.Mean(ctx, s.Apply(fast.Multiply(h), phi))
	if err != nil {
		t.Fatal(err)
	}
	return mean, cell, s
}

func check(t *testing.T, what string, got fast.Value, want, tol float64) {
	t.Helper()
	diff := math.Abs(got.Value - want)
	if diff > 3*got.Error+1e-13*math.Max(1, got.Scale) {
		t.Errorf("%s = %.15g is off by %.2g but claims an error of %.2g", what, got.Value, diff, got.Error)
	}
	if !(diff <= tol*math.Max(1, math.Abs(want))) {
		t.Errorf("%s = %.15g, want %.15g (off by %.2g, claimed %.2g)", what, got.Value, want, diff, got.Error)
	}
}

// int_0^inf exp(-s(t - tau(1-exp(-t/tau)))) dt = tau e^(s tau) (s tau)^(-s tau)
// gamma(s tau, s tau): correlated turning, Ornstein-Fuerth type integral (from
// memory; also Taylor-Kubo: the integral of the cosine of a Gaussian angle).
func TestCorrelatedTurning(t *testing.T) {
	for _, c := range []struct{ s, tau float64 }{{0.9, 0.6}, {0.3, 4}, {2.2, 0.05}} {
		x := c.s * c.tau
		want := c.tau * math.Exp(x) * math.Pow(x, -x) * math.Gamma(x) * mathext.GammaIncReg(x, x) / 2
		begin := time.Now()
		mean, cell, s := solve(t, correlatedTurning(c.s, c.tau), sum("cos", tm(1, cosf(0, 1))), sum("cos", tm(1, cosf(0, 1))))
		check(t, "<cos>", mean, 0, 1e-12)
		check(t, "<cos Phi>", cell, want, 1e-9)
		t.Log(s.Report(), cell.Error, time.Since(begin))
	}
}

// Langevin function coth u - 1/u (P. Langevin 1905), and for the transverse
// corrector the value of a 40-digit collocation of the reduced equation.
func TestMagneticRod(t *testing.T) {
	v := func(x, z float64) float64 { return 1 + 0.4*math.Sin(2*math.Pi*x)*math.Cos(2*math.Pi*z) }
	for _, c := range []struct{ d, kappa, x, z, axx float64 }{
		{0.7, 1.2, 0.31, 0.12, 0.5266895829819142}, {0.3, -1.5, 0.8, 0.4, 0.35578209896215485}} {
		u := c.kappa / c.d
		begin := time.Now()
		mean, _, s := solve(t, rod(c.d, c.kappa), sum("c", tm(1, pow(2, 1))), sum("c", tm(1, pow(2, 1))))
		check(t, "<c>", mean, 1/math.Tanh(u)-1/u, 1e-10)
		_, cell, _ := solve(t, rod(c.d, c.kappa), sum("a", tm(1, pow(0, 1))), sum("a", tm(1, pow(0, 1))))
		check(t, "<a Phi>", cell, c.axx/2/math.Pow(v(c.x, c.z), 2), 1e-10)
		t.Log(s.Report(), cell.Error, time.Since(begin))
	}
}

// dq = p, dp = (-k q - g p) + sqrt(2 g T) dW: <q Phi> = g T/k^2.
func TestLangevinOscillator(t *testing.T) {
	k, g, temp := 1.7, 0.7, 0.9
	p := &fast.Problem{Domains: []fast.Domain{line, line},
		Drift:     []fast.Coefficient{sum("p", tm(1, pow(1, 1))), sum("F", tm(-k, pow(0, 1)), tm(-g, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2*g*temp))}
	_, cell, _ := solve(t, p, sum("q", tm(1, pow(0, 1))), sum("q", tm(1, pow(0, 1))))
	check(t, "<q Phi>", cell, g*temp/(k*k), 1e-12)
}

func TestRefusals(t *testing.T) {
	free := &fast.Problem{Domains: []fast.Domain{line, line},
		Drift:     []fast.Coefficient{sum("p", tm(1, pow(1, 1))), sum("-p", tm(-0.7, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(1))}
	undamped := &fast.Problem{Domains: []fast.Domain{line, line},
		Drift:     []fast.Coefficient{sum("p", tm(1, pow(1, 1))), sum("-4q", tm(-4, pow(0, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(0))}
	stuck := &fast.Problem{Domains: []fast.Domain{circle, line},
		Drift:     []fast.Coefficient{fast.Constant(0), sum("-y", tm(-1, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2))}
	locked := &fast.Problem{Domains: []fast.Domain{circle, line},
		Drift:     []fast.Coefficient{sum("f", tm(0.5), tm(1, sinf(0, 1))), sum("-y", tm(-1, pow(1, 1)), tm(1, cosf(0, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2))}
	halves := &fast.Problem{Domains: []fast.Domain{line, line},
		Drift:     []fast.Coefficient{sum("f", tm(1, pow(0, 1)), tm(-1, pow(0, 3))), sum("-y", tm(-1, pow(1, 1)), tm(1, pow(0, 1)))},
		Diffusion: diagonal(sum("a", tm(0.5, pow(0, 2))), fast.Constant(2))}
	for name, p := range map[string]*fast.Problem{"locked angle": locked, "two half-planes": halves, "free particle": free, "undamped": undamped, "angle at rest": stuck} {
		s, err := spectral.New(context.Background(), p, spectral.Settings{})
		if err == nil {
			_, err = s.Mean(context.Background(), s.Coefficient(sum("q", tm(1, pow(0, 1)))))
		}
		var ne *fast.NotErgodic
		if !errors.As(err, &ne) {
			t.Errorf("%s: %v", name, err)
		} else {
			t.Logf("%s: %v", name, err)
		}
	}
}
