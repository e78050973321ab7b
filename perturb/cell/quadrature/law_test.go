package quadrature_test

import (
	"context"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature"
)

func TestLaw(t *testing.T) {
	for _, c := range []struct {
		name   string
		f, a   func(float64) float64
		power  bool
		fourth float64 // fourth moment, 0 where it is not checked
	}{
		{"normal", func(y float64) float64 { return -y }, constant(2), false, 3},
		{"double exponential", func(y float64) float64 { return -math.Copysign(1, y) }, constant(2), false, 24},
		{"quartic well", func(y float64) float64 { return -y * y * y }, constant(2), false, 1},
		{"narrow normal", func(y float64) float64 { return -1e6 * y }, constant(2), false, 3e-12},
		{"Student", func(y float64) float64 { return -2.5 * y }, func(y float64) float64 { return 1.4 * (1 + y*y) }, true, 0},
		{"steep Student", func(y float64) float64 { return -25 * y }, func(y float64) float64 { return 1.4 * (1 + y*y) }, true, 0},
	} {
		l, err := quadrature.NewLaw(context.Background(), one(line, c.f, c.a))
		if err != nil {
			t.Fatal(err)
		}
		if l.PowerTail != c.power {
			t.Errorf("%s: power tail %v", c.name, l.PowerTail)
		}
		var mass, fourth float64
		for i, w := range l.Weight {
			mass += w
			fourth += w * math.Pow(l.Y[i], 4)
		}
		if math.Abs(mass-1) > 1e-13 || (c.fourth > 0 && math.Abs(fourth/c.fourth-1) > 1e-11) {
			t.Errorf("%s: mass %.15g, fourth moment %.15g, want %g", c.name, mass, fourth, c.fourth)
		}
	}
}
