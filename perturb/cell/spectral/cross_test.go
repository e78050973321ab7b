package spectral_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

func single(d fast.Domain, f, a fast.Coefficient) *fast.Problem {
	return &fast.Problem{Domains: []fast.Domain{d}, Drift: []fast.Coefficient{f}, Diffusion: [][]fast.Coefficient{{a}}}
}

func other(name string, f func(float64) float64) fast.Coefficient {
	return sum(name, fast.Term{Constant: 1, Factors: []fast.Factor{{Kind: fast.Other, Func: f}}})
}

type pair struct {
	name    string
	problem *fast.Problem
	g, h    fast.Coefficient
}

// oneVariable are problems that both routes hold.
func oneVariable() []pair {
	y, y2 := sum("y", tm(1, pow(0, 1))), sum("y^2", tm(1, pow(0, 2)))
	cos, sin := sum("cos", tm(1, cosf(0, 1))), sum("sin", tm(1, sinf(0, 1)))
	unit := fast.Domain{Kind: fast.Reflecting, A: 0, B: 1}
	half := fast.Domain{Kind: fast.HalfLine}
	return []pair{
		{"Ornstein-Uhlenbeck", single(line, sum("f", tm(0.4), tm(-1.3, pow(0, 1))), fast.Constant(1.4)), y, y2},
		{"log-normal", single(line, sum("f", tm(-1.2, pow(0, 1))), fast.Constant(1.2)), other("exp", math.Exp), y},
		{"double well", single(line, sum("f", tm(1, pow(0, 1)), tm(-1, pow(0, 3))), fast.Constant(1)), y, y},
		{"tilted double well, multiplicative noise", single(line, sum("f", tm(0.2), tm(1, pow(0, 1)), tm(-1, pow(0, 3))), sum("a", tm(0.6), tm(0.2, pow(0, 2)))), y, y2},
		{"tilted cosine", single(circle, sum("f", tm(0.6), tm(1.1, sinf(0, 1))), fast.Constant(1)), sin, cos},
		{"rotor with uneven friction", single(circle, sum("f", tm(-0.48, sinf(0, 1)), tm(-0.144, sinf(0, 2))), sum("a", tm(1.6*1.18), tm(1.92, cosf(0, 1)), tm(0.288, cosf(0, 2)))), sin, sin},
		{"reflected with force", single(unit, sum("f", tm(1), tm(-3, pow(0, 1))), sum("a", tm(0.5), tm(0.3, pow(0, 1)))), y, y2},
		{"plane Poiseuille", single(fast.Domain{Kind: fast.Reflecting, A: -1, B: 1}, fast.Constant(0), fast.Constant(1)), y2, y2},
		{"round tube", single(unit, sum("f", tm(0.5, pow(0, -1))), fast.Constant(1)), y2, y2},
		{"Jacobi", single(unit, sum("f", tm(0.7), tm(-2, pow(0, 1))), sum("a", tm(1.21, pow(0, 1)), tm(-1.21, pow(0, 2)))), y, y2},
		{"square root", single(half, sum("f", tm(1.65), tm(-1.5, pow(0, 1))), sum("a", tm(0.64, pow(0, 1)))), y, y2},
		{"half-line with a wall", single(half, sum("f", tm(-1), tm(-0.5, pow(0, 1))), fast.Constant(2)), y, y},
		{"periodic interval", single(fast.Domain{Kind: fast.Periodic, A: -1, B: 2}, sum("f", tm(0.5), tm(1, sinf(0, 2*math.Pi/3))), fast.Constant(0.8)), sum("c", tm(1, cosf(0, 2*math.Pi/3))), sum("c", tm(1, cosf(0, 2*math.Pi/3)))},
		{"rotation without noise", single(circle, sum("f", tm(1.7), tm(0.9, sinf(0, 1))), fast.Constant(0)), sin, cos},
	}
}

func TestAgainstQuadrature(t *testing.T) {
	ctx := context.Background()
	for _, c := range oneVariable() {
		t.Run(c.name, func(t *testing.T) {
			q, err := quadrature.New(ctx, c.problem, quadrature.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			s, err := spectral.New(ctx, c.problem, spectral.Settings{})
			if err != nil {
				t.Fatal(err)
			}
			var mean, cell, slope [2]fast.Value
			for i, e := range []fast.Solver{q, s} {
				phi, m, err := e.Solve(ctx, e.Coefficient(c.g))
				if err != nil {
					t.Fatal(i, err)
				}
				mean[i] = m
				if cell[i], err = e.Mean(ctx, e.Apply(fast.Multiply(c.h), phi)); err != nil {
					t.Fatal(i, err)
				}
				// A second solve with derivatives of the first on the right.
				op := fast.Operator{{Coefficient: c.h, Order: []int{1}}, {Coefficient: c.g, Order: []int{2}}}
				psi, _, err := e.Solve(ctx, e.Apply(op, phi))
				if err != nil {
					t.Fatal(i, err)
				}
				if slope[i], err = e.Mean(ctx, e.Apply(fast.Multiply(c.g), psi)); err != nil {
					t.Fatal(i, err)
				}
			}
			agree(t, "<g>", mean)
			agree(t, "<h Phi>", cell)
			agree(t, "<g Psi>", slope)
			at := [][]float64{{0.17, 0.63, 0.9}}
			dq, err1 := q.Density(ctx, at)
			ds, err2 := s.Density(ctx, at)
			if err := errors.Join(err1, err2); err != nil {
				t.Fatal(err)
			}
			for k := range dq {
				if math.Abs(dq[k]-ds[k]) > 1e-7*dq[k] {
					t.Errorf("density at %g: %.12g and %.12g", at[0][k], dq[k], ds[k])
				}
			}
			t.Log(q.Report().Resolution, "/", s.Report().Resolution, slope)
		})
	}
}

func agree(t *testing.T, what string, v [2]fast.Value) {
	t.Helper()
	diff := math.Abs(v[0].Value - v[1].Value)
	scale := math.Max(v[0].Scale, v[1].Scale)
	if diff > 5*(v[0].Error+v[1].Error)+2e-13*scale {
		t.Errorf("%s: quadrature %.15g (%.1g), spectral %.15g (%.1g), difference %.2g", what, v[0].Value, v[0].Error, v[1].Value, v[1].Error, diff)
	}
}
