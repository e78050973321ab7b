package spectral_test

import (
	"context"
	"testing"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

func benchmark(b *testing.B, p *fast.Problem, g fast.Coefficient) {
	ctx := context.Background()
	for b.Loop() {
		s, err := spectral.New(ctx, p, spectral.Settings{})
		if err != nil {
			b.Fatal(err)
		}
		phi, _, err := s.Solve(ctx, s.Coefficient(g))
		if err != nil {
			b.Fatal(err)
		}
		if _, err := s.Mean(ctx, s.Apply(fast.Multiply(g), phi)); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkCorrelatedTurning(b *testing.B) {
	benchmark(b, correlatedTurning(0.9, 0.6), sum("cos", tm(1, cosf(0, 1))))
}

func BenchmarkDoubleWellWithInertia(b *testing.B) {
	benchmark(b, doubleWellInertia(0.5, 0.3), coordinate(0))
}

func BenchmarkRotatedDoubleWells(b *testing.B) { benchmark(b, rotatedWells(), coordinate(0)) }

func BenchmarkMagneticRod(b *testing.B) { benchmark(b, rod(0.7, 1.2), coordinate(0)) }
