package spectral_test

import (
	"context"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

func coordinate(i int) fast.Coefficient { return sum("y", tm(1, pow(i, 1))) }

// doubleWell is <y Phi> of dy = (y - y^3) dt + dW, T = 1/2, by mpmath (see the
// table beside the quadrature tests).
const doubleWell = 2.0521477530814586016

// rotatedWells are two independent double wells seen in coordinates turned by
// 45 degrees: a coupled gradient system with the answer of one variable. V =
// (u^4 + 6 u^2 v^2 + v^4)/8 - (u^2 + v^2)/2.
func rotatedWells() *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		sum("f1", tm(1, pow(0, 1)), tm(-0.5, pow(0, 3)), tm(-1.5, pow(0, 1), pow(1, 2))),
		sum("f2", tm(1, pow(1, 1)), tm(-0.5, pow(1, 3)), tm(-1.5, pow(1, 1), pow(0, 2)))},
		Diffusion: diagonal(fast.Constant(1), fast.Constant(1))}
}

func TestSeveralVariables(t *testing.T) {
	r := math.Sqrt2 / 2
	y1 := sum("y1", tm(r, pow(0, 1)), tm(r, pow(1, 1)))
	dense := rotatedWells()
	for i := range dense.Drift {
		c := dense.Drift[i]
		dense.Drift[i] = fast.FuncN("f", func(y []float64) float64 { return c.At(y...) })
	}
	half := fast.Domain{Kind: fast.HalfLine}
	for _, c := range []struct {
		name, source string
		p            *fast.Problem
		g            fast.Coefficient
		mean, cell   float64
		tol          float64
	}{
		{"rotated double wells", "two independent wells, one-variable value", rotatedWells(), y1, 0, doubleWell, 1e-10},
		{"rotated double wells, plain functions", "the same", dense, y1, 0, doubleWell, 1e-9},
		{"van der Pol", "Phi = y2 - y1 + y1^3/3 by hand, so <y1 Phi> = <a (d2 Phi)^2>/2 = 1/2",
			&fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{coordinate(1),
				sum("f2", tm(1, pow(1, 1)), tm(-1, pow(0, 2), pow(1, 1)), tm(-1, pow(0, 1)))}, Diffusion: diagonal(fast.Constant(0), fast.Constant(1))},
			coordinate(0), 0, 0.5, 1e-10},
		{"square-root process drives a line and its noise", "second moments by hand: Phi = y2 + y1/2, <y2 Phi> = 5/4",
			&fast.Problem{Domains: []fast.Domain{half, line}, Drift: []fast.Coefficient{
				sum("f1", tm(2), tm(-1, pow(0, 1))), sum("f2", tm(-1, pow(1, 1)), tm(0.5, pow(0, 1)))},
				Diffusion: diagonal(coordinate(0), coordinate(0))}, coordinate(1), 1, 1.25, 1e-10},
		{"inertia and colour", "Kupferman, Pavliotis, Stuart 2004: A/2 = lam f^2/a^2",
			inertiaAndColour(0.7, 1.1, 0.6, 1.3), coordinate(0), 0, 0.6 * 1.69 / 1.21, 1e-12},
		{"cascade of three", "half the spectral density at zero: |1/(1*2*3)|^2",
			&fast.Problem{Domains: []fast.Domain{line, line, line}, Drift: []fast.Coefficient{
				sum("f1", tm(-1, pow(0, 1)), tm(1, pow(1, 1))), sum("f2", tm(-2, pow(1, 1)), tm(1, pow(2, 1))), sum("f3", tm(-3, pow(2, 1)))},
				Diffusion: diagonal(fast.Constant(0), fast.Constant(0), fast.Constant(2))}, coordinate(0), 0, 1. / 36, 1e-12},
	} {
		t.Run(c.name, func(t *testing.T) {
			mean, cell, s := solve(t, c.p, c.g, c.g)
			check(t, "<g>, "+c.source, mean, c.mean, c.tol)
			check(t, "<g Phi>, "+c.source, cell, c.cell, c.tol)
			t.Log(s.Report())
		})
	}
}

// inertiaAndColour is dp = (-p + f eta)/tau dt, deta = -a eta dt + sqrt(2 lam) dW.
func inertiaAndColour(tau, a, lam, f float64) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		sum("fp", tm(-1/tau, pow(0, 1)), tm(f/tau, pow(1, 1))), sum("feta", tm(-a, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2*lam))}
}

// The induced drift <p Phi_x> = f f' lam/(a^2 (1 + a tau)), neither Ito nor
// Stratonovich (Kupferman, Pavliotis, Stuart, Phys. Rev. E 70 (2004) 036120).
func TestSlowDerivative(t *testing.T) {
	ctx := context.Background()
	tau, a, lam, f, fx := 0.7, 1.1, 0.6, 1.3, 0.45
	s, err := spectral.New(ctx, inertiaAndColour(tau, a, lam, f), spectral.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	phi, _, err := s.Solve(ctx, s.Coefficient(coordinate(0)))
	if err != nil {
		t.Fatal(err)
	}
	lx := fast.Derivative(sum("f_x eta/tau", tm(fx/tau, pow(1, 1))), 1, 0)
	phix, _, err := s.Solve(ctx, s.Apply(lx, phi))
	if err != nil {
		t.Fatal(err)
	}
	v, err := s.Mean(ctx, s.Apply(fast.Multiply(coordinate(0)), phix))
	if err != nil {
		t.Fatal(err)
	}
	check(t, "<p Phi_x>", v, f*fx*lam/(a*a*(1+a*tau)), 1e-12)
}

// doubleWellInertia is dq = p, dp = (q - q^3 - g p) + sqrt(2 g T) dW.
func doubleWellInertia(g, temp float64) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{line, line},
		Drift:     []fast.Coefficient{coordinate(1), sum("F", tm(1, pow(0, 1)), tm(-1, pow(0, 3)), tm(-g, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), fast.Constant(2*g*temp))}
}

// The double well with inertia: <q^2> of the Gibbs law, and the overdamped
// limit <q Phi>/g -> the one-variable value, with a correction of order 1/g^2
// (Pavliotis, Stuart, Multiscale Methods, ch. 6 and 11).
func TestDoubleWellWithInertia(t *testing.T) {
	ctx := context.Background()
	const temp = 0.5
	q, err := quadrature.New(ctx, single(line, sum("f", tm(1, pow(0, 1)), tm(-1, pow(0, 3))), fast.Constant(2*temp)), quadrature.Settings{})
	if err != nil {
		t.Fatal(err)
	}
	q2 := sum("q^2", tm(1, pow(0, 2)))
	want, err := q.Mean(ctx, q.Coefficient(q2))
	if err != nil {
		t.Fatal(err)
	}
	mean, _, _ := solve(t, doubleWellInertia(0.6, temp), q2, q2)
	check(t, "<q^2>", mean, want.Value, 1e-11)
	var ratio [3]float64
	for i, g := range []float64{10, 20, 40} {
		_, cell, _ := solve(t, doubleWellInertia(g, temp), coordinate(0), coordinate(0))
		ratio[i] = cell.Value / g / doubleWell
	}
	first, second := ratio[1]+(ratio[1]-ratio[0])/3, ratio[2]+(ratio[2]-ratio[1])/3
	if limit := second + (second-first)/15; math.Abs(limit-1) > 1e-7 {
		t.Errorf("overdamped limit %.10g from %v", limit, ratio)
	}
}

// A forcing that the first levels cannot see must not settle at zero: cos(kx)
// under an Ornstein-Uhlenbeck process, <g Phi> = exp(-k^2) sum k^(2n)/(n! n)
// over even n (Hermite series by hand), and cos(40 theta) on the circle,
// 1/(2*1600 D).
func TestHighFrequency(t *testing.T) {
	k := 5.0
	want := 0.0
	for n := 2; n < 200; n += 2 {
		lg, _ := math.Lgamma(float64(n) + 1)
		want += math.Exp(2*float64(n)*math.Log(k)-lg-k*k) / float64(n)
	}
	g := sum("cos", tm(1, cosf(0, k)))
	_, cell, _ := solve(t, single(line, sum("f", tm(-1, pow(0, 1))), fast.Constant(2)), g, g)
	check(t, "cos(5y)", cell, want, 1e-9)
	g = sum("cos", tm(1, cosf(0, 40)))
	_, cell, _ = solve(t, single(circle, fast.Constant(0), fast.Constant(2)), g, g)
	check(t, "cos(40 theta)", cell, 1./3200, 1e-12)
}

// Processes without a stationary law that no simple test finds, and
// coefficients that are not defined: no number may come back as settled.
func TestNoNumberWithoutLaw(t *testing.T) {
	pendulum := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		coordinate(1), sum("F", tm(-1, sinf(0, 1)), tm(-1, pow(1, 1)))}, Diffusion: diagonal(fast.Constant(0), fast.Constant(2))}
	weak := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		fast.FuncN("f", func(y []float64) float64 { return -0.3*y[0]/(1+y[0]*y[0]) + 0.1*y[1] }), sum("-y", tm(-1, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(2), fast.Constant(2))}
	escaping := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		sum("f", tm(1, pow(0, 3)), tm(1, pow(1, 1))), sum("-y", tm(-1, pow(1, 1)))}, Diffusion: diagonal(fast.Constant(2), fast.Constant(2))}
	undamped := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		coordinate(1), sum("F", tm(-1, pow(0, 3)))}, Diffusion: diagonal(fast.Constant(0), fast.Constant(0))}
	wall := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		sum("f", tm(1, pow(0, 1)), tm(-1, pow(0, 3)), tm(0.3, pow(0, 1), pow(1, 1))), sum("-y", tm(-1, pow(1, 1)))},
		Diffusion: diagonal(sum("a", tm(0.5, pow(0, 2))), fast.Constant(2))}
	log := &fast.Problem{Domains: []fast.Domain{line, line}, Drift: []fast.Coefficient{
		sum("f", tm(-1, pow(0, 1)), fast.Term{Constant: 1, Factors: []fast.Factor{{Coordinate: 1, Kind: fast.Other, Func: math.Log}}}), sum("-y", tm(-1, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(2), fast.Constant(2))}
	for name, p := range map[string]*fast.Problem{"pendulum unrolled on a line": pendulum, "weak confinement": weak, "escape": escaping,
		"undamped quartic oscillator": undamped, "surface without noise and drift": wall, "logarithm of a negative number": log} {
		ctx := context.Background()
		s, err := spectral.New(ctx, p, spectral.Settings{Levels: 4})
		var v fast.Value
		if err == nil {
			v, err = s.Mean(ctx, s.Coefficient(sum("y^2", tm(1, pow(0, 2)))))
		}
		if err == nil {
			t.Errorf("%s: settled at %v", name, v)
		}
		t.Logf("%s: %v", name, err)
	}
}
