package grid

import (
	"math"
	"strings"
	"testing"
)

func TestAxisErrors(t *testing.T) {
	for _, c := range []struct {
		name string
		make func() (Axis, error)
		want string
	}{
		{"reversed", func() (Axis, error) { return Uniform("x", 1, 0, 4, Reflecting) }, "lower end first"},
		{"infinite", func() (Axis, error) { return Uniform("x", 0, math.Inf(1), 4, Reflecting) }, "finite"},
		{"no cells", func() (Axis, error) { return Uniform("x", 0, 1, 0, Reflecting) }, "at least one"},
		{"not increasing", func() (Axis, error) { return NonUniform("y", []float64{0, 1, 1}, Reflecting, Reflecting) }, "edge 2"},
		{"half periodic", func() (Axis, error) { return NonUniform("y", []float64{0, 1}, Periodic, Reflecting) }, "both ends"},
		{"nan", func() (Axis, error) { return NonUniform("y", []float64{0, math.NaN()}, Reflecting, Reflecting) }, "NaN"},
		{"graded", func() (Axis, error) {
			return Graded("y", -1, 1, 4, Reflecting, Reflecting, func(x float64) float64 { return x })
		}, "positive"},
	} {
		if _, err := c.make(); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: got %v, want a message with %q", c.name, err, c.want)
		}
	}
}

func TestIndexRoundTrip(t *testing.T) {
	x, _ := Uniform("x", 0, 1, 5, Reflecting)
	y, _ := NonUniform("y", []float64{0, 0.1, 0.5, 2}, Periodic, Periodic)
	z, _ := Uniform("z", -1, 1, 4, Absorbing)
	g, err := New(x, y, z)
	if err != nil {
		t.Fatal(err)
	}
	var total float64
	for k, v := range g.Volumes() {
		if g.Index(g.Coordinates(k)...) != k {
			t.Fatalf("index of coordinates of %d", k)
		}
		if c := g.CellAt(g.CenterOf(k)...); c != k {
			t.Fatalf("centre of cell %d lies in %d", k, c)
		}
		total += v
	}
	if math.Abs(total-4) > 1e-14 {
		t.Errorf("volumes add up to %g, want 4", total)
	}
	if g.CellAt(0.5, 2.05, 0) != g.CellAt(0.5, 0.05, 0) {
		t.Error("a periodic point was not wrapped")
	}
	if g.CellAt(1.5, 0, 0) != -1 {
		t.Error("a point outside was given a cell")
	}
	if !g.HasAbsorbing() || g.String() != "5 x 3 x 4" {
		t.Errorf("absorbing %v, shape %s", g.HasAbsorbing(), g)
	}
	c := g.Coarsen([]bool{true, true, false})
	if c.String() != "3 x 2 x 4" || c.Axis(0).Hi() != 1 || c.Axis(1).Edges[1] != 0.5 {
		t.Errorf("coarse grid %s %v", c, c.Axis(1).Edges)
	}
}

// Distances between centres add up to the period, and for open axes to the
// interval less the first half cell.
func TestDistances(t *testing.T) {
	for _, side := range []Side{Periodic, Reflecting} {
		a, err := NonUniform("x", []float64{0, 0.3, 0.4, 1, 1.5}, side, side)
		if err != nil {
			t.Fatal(err)
		}
		var s float64
		for i := 0; i < a.Cells(); i++ {
			s += a.Distance(i)
		}
		want := 1.5
		if side != Periodic {
			want -= a.Width(0) / 2
		}
		if math.Abs(s-want) > 1e-15 {
			t.Errorf("%v: distances add up to %g, want %g", side, s, want)
		}
	}
}

// Edges graded by the density 1/x on [1, 16] are the powers of two.
func TestGraded(t *testing.T) {
	a, err := Graded("x", 1, 16, 4, Reflecting, Reflecting, func(x float64) float64 { return 1 / x })
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{1, 2, 4, 8, 16} {
		if math.Abs(a.Edges[i]-want) > 0.01*want {
			t.Errorf("edge %d is %g, want about %g", i, a.Edges[i], want)
		}
	}
}
