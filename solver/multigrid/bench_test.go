package multigrid

import (
	"context"
	"fmt"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// BenchmarkStationary times the solution on an assembled operator: coarse grids,
// first guess and iteration. Metrics: seconds of the iteration alone, its
// number, and the residual.
func BenchmarkStationary(b *testing.B) {
	for _, c := range []struct {
		name string
		dim  int
		p    swirlProblem
		n    []int
	}{
		{"A1", 2, swirlProblem{0, 1}, []int{256, 512, 1024, 2048}},
		{"A2", 2, swirlProblem{20, 1}, []int{256, 512, 1024, 2048}},
		{"A1-3D", 3, swirlProblem{0, 1}, []int{64, 96}},
		{"A2-3D", 3, swirlProblem{20, 1}, []int{64, 96}},
	} {
		for _, n := range c.n {
			for _, w := range []int{1, 2} {
				b.Run(fmt.Sprintf("%s/%d/workers=%d", c.name, n, w), func(b *testing.B) {
					m, err := volume.Assemble(context.Background(), square(b, c.dim, n, grid.Reflecting), c.p, volume.Settings{Workers: w})
					if err != nil {
						b.Fatal(err)
					}
					b.ResetTimer()
					var st Stats
					var solve float64
					for i := 0; i < b.N; i++ {
						sv, err := New(context.Background(), m, c.p, 0, false, Settings{})
						if err != nil {
							b.Fatal(err)
						}
						_, st = sv.Stationary(context.Background())
						solve += st.Solve.Seconds()
					}
					b.ReportMetric(solve/float64(b.N)*1e3, "solve-ms")
					b.ReportMetric(float64(st.Iterations), "iterations")
					b.ReportMetric(st.Residual, "residual")
				})
			}
		}
	}
}
