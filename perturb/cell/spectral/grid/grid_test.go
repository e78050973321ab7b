package grid_test

import (
	"context"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
	"epslim/perturb/cell/spectral/grid"
)

var (
	line   = fast.Domain{Kind: fast.Line}
	circle = fast.Domain{Kind: fast.Circle}
)

func poly(name string, t ...fast.Term) fast.Coefficient { return fast.SumOf(name, t...) }
func mono(c float64, p ...int) fast.Term                { return fast.Monomial(c, p...) }

func trig(k fast.FactorKind, c float64, i int, w float64) fast.Term {
	return fast.Term{Constant: c, Factors: []fast.Factor{{Coordinate: i, Kind: k, P: w}}}
}

func one(d fast.Domain, f, a fast.Coefficient) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{d}, Drift: []fast.Coefficient{f}, Diffusion: [][]fast.Coefficient{{a}}}
}

func two(d1, d2 fast.Domain, f1, f2, a1, a2 fast.Coefficient) *fast.Problem {
	z := fast.Constant(0)
	return &fast.Problem{Domains: []fast.Domain{d1, d2}, Drift: []fast.Coefficient{f1, f2}, Diffusion: [][]fast.Coefficient{{a1, z}, {z, a2}}}
}

// The grid against quadrature in one variable and against the spectral route in
// two: <g>, <g Phi> and, with a second solve, <g Psi>, L0 Psi = -(g Phi' - mean).
func TestAgainstOtherRoutes(t *testing.T) {
	unit := fast.Domain{Kind: fast.Reflecting, A: 0, B: 1}
	y, y2 := poly("y", mono(1, 1)), poly("y2", mono(1, 0, 1))
	cos := poly("cos", trig(fast.Cos, 1, 0, 1))
	for _, c := range []struct {
		name string
		p    *fast.Problem
		g    fast.Coefficient
	}{
		{"double well", one(line, poly("f", mono(1, 1), mono(-1, 3)), fast.Constant(1)), y},
		{"tilted cosine", one(circle, poly("f", mono(0.6), trig(fast.Sin, 1.1, 0, 1)), fast.Constant(1)), cos},
		{"reflected with force", one(unit, poly("f", mono(1), mono(-3, 1)), poly("a", mono(0.5), mono(0.3, 1))), y},
		{"heavy tail", one(line, poly("f", mono(-2.5, 1)), poly("a", mono(1.4), mono(1.4, 2))), poly("y/(1+y^2)", fast.Term{Constant: 1, Factors: []fast.Factor{{Kind: fast.Other, Func: func(y float64) float64 { return y / (1 + y*y) }}}})},
		{"kink in the drift", one(line, fast.Func1("-sign", func(y float64) float64 { return -math.Copysign(1, y) }), fast.Constant(2)), y},
		{"correlated turning", two(circle, line, poly("w", mono(1, 0, 1)), poly("fw", mono(-1/0.6, 0, 1)), fast.Constant(0), fast.Constant(1.8/0.36)), cos},
		{"coupled wells", two(line, line, poly("f1", mono(1, 1), mono(-1, 3), mono(-0.5, 0, 1)), poly("f2", mono(-1, 0, 1), mono(-0.5, 1)), fast.Constant(1), fast.Constant(1)), y},
		{"double well with inertia", two(line, line, y2, poly("F", mono(1, 1), mono(-1, 3), mono(-1, 0, 1)), fast.Constant(0), fast.Constant(1)), y},
	} {
		t.Run(c.name, func(t *testing.T) {
			ctx := context.Background()
			var other fast.Solver
			var err error
			if len(c.p.Domains) == 1 {
				other, err = quadrature.New(ctx, c.p, quadrature.Settings{})
			} else {
				other, err = spectral.New(ctx, c.p, spectral.Settings{})
			}
			if err != nil {
				t.Fatal(err)
			}
			tol := 2e-5
			if len(c.p.Domains) == 2 {
				tol = 4e-4 // a finer one takes long
			}
			s, err := grid.New(ctx, c.p, grid.Settings{Tolerance: tol})
			if err != nil {
				t.Fatal(err)
			}
			want, got := run(t, other, c.g), run(t, s, c.g)
			for i, what := range []string{"<g>", "<g Phi>", "<g Psi>"} {
				diff := math.Abs(want[i].Value - got[i].Value)
				if diff > 2*got[i].Error+want[i].Error || diff > 5*tol*math.Max(1e-3, want[i].Scale) {
					t.Errorf("%s = %.10g on %v (claimed error %.2g), other route %.10g: off by %.2g", what, got[i].Value, s.Report().Resolution, got[i].Error, want[i].Value, diff)
				}
			}
			t.Log(got, s.Report().Resolution)
		})
	}
}

func run(t *testing.T, s fast.Solver, g fast.Coefficient) (out [3]fast.Value) {
	t.Helper()
	ctx := context.Background()
	phi, mean, err := s.Solve(ctx, s.Coefficient(g))
	if err != nil {
		t.Fatal(err)
	}
	cell, err := s.Mean(ctx, s.Apply(fast.Multiply(g), phi))
	if err != nil {
		t.Fatal(err)
	}
	return [3]fast.Value{mean, cell, second(t, s, g, phi)}
}

func second(t *testing.T, s fast.Solver, g fast.Coefficient, phi fast.Function) fast.Value {
	t.Helper()
	ctx := context.Background()
	psi, _, err := s.Solve(ctx, s.Apply(fast.Operator{{Coefficient: g, Order: []int{1, 0}}}, phi))
	if err != nil {
		t.Fatal(err)
	}
	v, err := s.Mean(ctx, s.Apply(fast.Multiply(g), psi))
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func BenchmarkDoubleWellWithInertia(b *testing.B) {
	p := two(line, line, poly("p", mono(1, 0, 1)), poly("F", mono(1, 1), mono(-1, 3), mono(-1, 0, 1)), fast.Constant(0), fast.Constant(1))
	ctx := context.Background()
	for b.Loop() {
		s, err := grid.New(ctx, p, grid.Settings{Tolerance: 1e-3})
		if err != nil {
			b.Fatal(err)
		}
		if _, err := s.Mean(ctx, s.Coefficient(poly("q^2", mono(1, 2)))); err != nil {
			b.Fatal(err)
		}
	}
}
