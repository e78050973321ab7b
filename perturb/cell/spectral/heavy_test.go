package spectral_test

import (
	"context"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

// dy = -k y dt + sqrt(2 D (1+y^2)) dW has power-law tails; <y Phi> = D/(k(k-D))
// (Pearson diffusion, J.L. Forman, M. Sorensen 2008). An oscillating forcing
// has an essential singularity at infinity and converges slowly: what counts is
// that the claimed error holds.
func TestHeavyTails(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct{ k, d float64 }{{2.5, 0.7}, {1.3, 0.45}, {4, 0.9}} {
		p := single(line, sum("f", tm(-c.k, pow(0, 1))), sum("a", tm(2*c.d), tm(2*c.d, pow(0, 2))))
		_, cell, s := solve(t, p, coordinate(0), coordinate(0))
		check(t, "<y Phi>", cell, c.d/(c.k*(c.k-c.d)), 1e-9)
		q, err := quadrature.New(ctx, p, quadrature.Settings{})
		if err != nil {
			t.Fatal(err)
		}
		g := sum("cos", tm(1, cosf(0, 1)))
		want, err := q.Mean(ctx, q.Coefficient(g))
		if err != nil {
			t.Fatal(err)
		}
		got, err := s.Mean(ctx, s.Coefficient(g))
		if diff := math.Abs(got.Value - want.Value); diff > got.Error || diff > 1e-4 {
			t.Errorf("<cos y> = %.10g, quadrature %.10g, claimed error %.2g (%v)", got.Value, want.Value, got.Error, err)
		}
	}
}

// The same process as a turning rate next to an angle: <w Phi_w> as before, now
// in two variables.
func TestHeavyTailedTurning(t *testing.T) {
	const k, d = 2.5, 0.7
	p := &fast.Problem{Domains: []fast.Domain{circle, line}, Drift: []fast.Coefficient{coordinate(1), sum("f", tm(-k, pow(1, 1)))},
		Diffusion: diagonal(fast.Constant(0), sum("a", tm(2*d), tm(2*d, pow(1, 2))))}
	ctx := context.Background()
	s, err := spectral.New(ctx, p, spectral.Settings{Levels: 3})
	if err != nil {
		t.Fatal(err)
	}
	phi, _, err := s.Solve(ctx, s.Coefficient(coordinate(1)))
	if err != nil {
		t.Fatal(err)
	}
	v, err := s.Mean(ctx, s.Apply(fast.Multiply(coordinate(1)), phi))
	if err != nil {
		t.Fatal(err)
	}
	check(t, "<w Phi>", v, d/(k*(k-d)), 1e-9)
}
