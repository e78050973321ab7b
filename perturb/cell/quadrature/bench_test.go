package quadrature_test

import (
	"context"
	"testing"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
)

// BenchmarkGallery prepares each problem, solves it and takes both averages.
func BenchmarkGallery(b *testing.B) {
	ctx := context.Background()
	for _, c := range cases() {
		b.Run(c.name, func(b *testing.B) {
			for b.Loop() {
				s, err := quadrature.New(ctx, c.problem, quadrature.Settings{})
				if err != nil {
					b.Fatal(err)
				}
				phi, _, err := s.Solve(ctx, s.Coefficient(fast.Func1("g", c.g)))
				if err != nil {
					b.Fatal(err)
				}
				if _, err := s.Mean(ctx, s.Apply(fast.Multiply(fast.Func1("h", c.h)), phi)); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
