package density

import (
	"math"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Two wells of different depth behind barriers that make the exchange rate of
// the order of exp(-5) to exp(-20). Only the tiny current over the saddle decides
// the weights of the wells. Multigrid finds them for the first two and says that
// it fails for the third, where the automatic choice falls back on elimination. The potential is U = (x^2-1)^2 + 0.1 x + y^2 with a rotation of
// strength 1 that makes it irreversible, at temperature eps.
func TestMetastable(t *testing.T) {
	for _, eps := range []float64{0.2, 0.1, 0.05} {
		c := volume.Func(func(x, f, a []float64) {
			ux, uy := 4*x[0]*(x[0]*x[0]-1)+0.1, 2*x[1]
			f[0], f[1] = -ux+uy, -uy-ux
			a[0], a[2] = 2*eps, 2*eps
		})
		g := box(t, grid.Reflecting, -1.9, 1.9, 96, 96)
		direct, err := Stationary(bg, g, c, Settings{Method: Direct})
		if err != nil {
			t.Fatal(err)
		}
		multi, err := Stationary(bg, g, c, Settings{})
		if err != nil {
			t.Fatal(err)
		}
		left := func(r *Result) float64 {
			return r.Mean(func(x []float64) float64 {
				if x[0] < 0 {
					return 1
				}
				return 0
			})
		}
		a, b := left(direct), left(multi)
		t.Logf("eps %g: left well %.10f, %.10f; %v after %d by %v", eps, a, b, multi.Outcome, multi.Iterations, multi.Method)
		if want := map[bool]Method{true: Multigrid, false: Direct}[eps > 0.07]; multi.Method != want {
			t.Errorf("eps %g: solved by %v", eps, multi.Method)
		}
		if multi.Outcome != 0 || math.Abs(a-b) > 1e-6*a {
			t.Errorf("eps %g: weight of the left well %.10f by elimination, %.10f by multigrid (%v, residual %g)", eps, a, b, multi.Outcome, multi.Residual)
		}
	}
}
