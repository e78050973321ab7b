package numbers

import (
	"context"
	"math"
	"testing"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/ito"
)

func derive(t *testing.T, model string) *derivation.Result {
	t.Helper()
	sys, err := ito.Parse("model.ito", []byte(model), ito.Options{})
	if err != nil {
		t.Fatal(err)
	}
	res, err := derivation.Run(context.Background(), sys, derivation.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return res
}

// Walkers driven by a filtered noise in a harmonic trap: the limit is dx = -k x
// dt + (s/a) dW, whose stationary law is normal with the variance
// s^2/(2 a^2 k) (C. Gardiner, Handbook of Stochastic Methods, section 4.4.4,
// from memory).
func TestWindowHoldsTheLaw(t *testing.T) {
	for _, c := range []struct{ k, s string }{{"1", "1"}, {"100", "1"}, {"0.0001", "1"}, {"1", "0.001"}} {
		res := derive(t, "slow x\nfast y\nparam k = "+c.k+" positive\nparam s = "+c.s+" positive\ndx = (y/eps - k*x) dt\ndy = -y/eps^2 dt + s/eps dW1\n")
		d, err := StationaryDensity(context.Background(), res, DensityOptions{Cells: []int{400}})
		if err != nil {
			t.Fatalf("k = %s, s = %s: %v", c.k, c.s, err)
		}
		k, s := res.System.Parameter("k"), res.System.Parameter("s")
		kf, _ := k.Value.Float64()
		sf, _ := s.Value.Float64()
		want := sf / math.Sqrt(2*kf)
		_, cov := d.Result.Moments()
		if got := math.Sqrt(cov[0][0]); math.Abs(got-want) > 2e-3*want {
			t.Errorf("k = %s, s = %s: standard deviation %g, want %g, window [%g, %g]", c.k, c.s, got, want, d.Window.Lo[0], d.Window.Hi[0])
		}
		if ok, why := d.Verdict(); !ok {
			t.Errorf("k = %s, s = %s: %s", c.k, c.s, why)
		}
	}
}

// A density that is known up to an integral agrees with the same density
// evaluated point by point.
func TestIntegratingFactor(t *testing.T) {
	res := derive(t, "slow x on line window [-3, 3]\nfast y\nfunction g(x) = 1 + 0.4*cos(x) positive\ndx = (g*y/eps - x/2) dt\ndy = -y/eps^2 dt + 1/eps dW1\n")
	w, err := Domain(res)
	if err != nil {
		t.Fatal(err)
	}
	g, err := w.Grid(res.System, []int{60})
	if err != nil {
		t.Fatal(err)
	}
	fast, ok, err := integratingFactor(context.Background(), res, g)
	if err != nil || !ok {
		t.Fatalf("not compiled: %v", err)
	}
	slow, err := pointwise(context.Background(), res, res.Stationary.Density)
	if err != nil {
		t.Fatal(err)
	}
	x := []float64{-2.9, -1, 0, 0.3, 2.5}
	a, b := make([]float64, len(x)), make([]float64, len(x))
	if err := fast([][]float64{x}, a); err != nil {
		t.Fatal(err)
	}
	if err := slow([][]float64{x}, b); err != nil {
		t.Fatal(err)
	}
	for i := range x {
		if got, want := a[i]-a[2], b[i]-b[2]; math.Abs(got-want) > 1e-11 {
			t.Errorf("x = %g: %g, want %g", x[i], got, want)
		}
	}
}
