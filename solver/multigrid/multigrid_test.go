package multigrid

import (
	"math"
	"testing"

	"epslim/solver/grid"
)

func TestIterationCounts(t *testing.T) {
	for _, c := range []struct {
		name string
		p    swirlProblem
	}{{"A1", swirlProblem{0, 1}}, {"A2", swirlProblem{20, 1}}} {
		for _, n := range []int{64, 128, 256, 512} {
			g := square(t, 2, n, grid.Reflecting)
			_, _, st := stationary(t, g, c.p, 1, Settings{})
			t.Logf("%s %d: %d its, start %.1e residual %.1e %v setup %v solve %v %.1e", c.name, n, st.Iterations, st.Start, st.Residual, st.Outcome, st.Setup, st.Solve, st.History)
		}
	}
	_ = math.Pi
}
