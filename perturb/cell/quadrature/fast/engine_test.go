package fast_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"epslim/perturb/cell/quadrature/fast"
)

// toy is a level whose functions are numbers and whose error halves to the
// fourth with every level: enough to see what the engine does.
type toy struct {
	k     int
	err   float64
	noise float64
}

func (l *toy) Coefficient(c *fast.Coefficient) (fast.Vector, error) {
	if c.Name == "infinite" {
		return nil, &fast.Divergent{Where: "+Inf", Exponent: -1}
	}
	return c.At(2), nil
}

func (l *toy) Sum(f []float64, u []fast.Vector) (fast.Vector, error) {
	var s float64
	for i, x := range u {
		s += f[i] * x.(float64)
	}
	return s, nil
}

func (l *toy) Apply(op fast.Operator, u fast.Vector) (fast.Vector, error) {
	var s float64
	for _, t := range op {
		s += t.Coefficient.At(2) * u.(float64)
	}
	return s, nil
}

func (l *toy) Product(u, v fast.Vector) (fast.Vector, error) { return u.(float64) * v.(float64), nil }

func (l *toy) Mean(u fast.Vector) (fast.Value, error) {
	x := u.(float64)
	return fast.Value{Value: x * (1 + l.err*math.Pow(16, -float64(l.k))), Scale: math.Abs(x), Error: l.noise, Rounding: l.noise}, nil
}

func (l *toy) Solve(u fast.Vector) (fast.Vector, error)           { return u.(float64) / 2, nil }
func (l *toy) At(u fast.Vector, y [][]float64) ([]float64, error) { return []float64{u.(float64)}, nil }
func (l *toy) Density(y [][]float64) ([]float64, error)           { return []float64{1}, nil }
func (l *toy) String() string                                     { return fmt.Sprint("level ", l.k) }
func (l *toy) Unknowns() int                                      { return l.k }

func engine(levels, budget int, err, noise float64) *fast.Engine {
	return fast.NewEngine(fast.Route{Method: "toy", Levels: levels, Tolerance: 1e-9,
		Make: func(_ context.Context, k int, _ []*fast.Coefficient) (fast.Level, error) {
			if k >= budget {
				return nil, fast.ErrBudget
			}
			return &toy{k: k, err: err, noise: noise}, nil
		}})
}

func TestEngine(t *testing.T) {
	ctx := context.Background()
	y := fast.SumOf("y", fast.Monomial(1, 1))
	for _, c := range []struct {
		name           string
		levels, budget int
		err, noise     float64
		settled        bool
		unknowns       int // the level reached
	}{
		{"settles at once", 12, 12, 0, 0, true, 1},
		{"raises the level until it settles", 12, 12, 1, 0, true, 9},
		{"runs out of levels", 4, 12, 1, 0, false, 3},
		{"runs out of memory", 12, 5, 1, 0, false, 4},
		{"rounding does not go away", 12, 12, 0, 1e-3, true, 1},
	} {
		e := engine(c.levels, c.budget, c.err, c.noise)
		phi, mean, err := e.Solve(ctx, e.Coefficient(y))
		var ns *fast.NotSettled
		if c.settled == errors.As(err, &ns) {
			t.Errorf("%s: %v, %v", c.name, mean, err)
		}
		if got := e.Report().Unknowns; got != c.unknowns {
			t.Errorf("%s: level %d, want %d", c.name, got, c.unknowns)
		}
		if diff := math.Abs(mean.Value - 2); diff > mean.Error+1e-15 {
			t.Errorf("%s: off by %g, claimed %g", c.name, diff, mean.Error)
		}
		// y*Phi + 3 Phi = 2*1 + 3*1 at y = 2.
		g := e.Sum(fast.Scaled{Factor: 1, Function: e.Apply(fast.Multiply(y), phi)}, fast.Scaled{Factor: 3, Function: phi})
		if v, err := e.Mean(ctx, g); math.Abs(v.Value-5) > 1e-2 {
			t.Errorf("%s: %v, %v", c.name, v, err)
		}
	}
}

func TestEngineErrors(t *testing.T) {
	ctx := context.Background()
	e := engine(3, 3, 0, 0)
	bad := e.Coefficient(fast.Coefficient{Name: "infinite"})
	_, err := e.Mean(ctx, e.Product(bad, e.Coefficient(fast.Constant(1))))
	var d *fast.Divergent
	if !errors.As(err, &d) || d.Quantity != "infinite" {
		t.Errorf("the divergent function is not named: %v", err)
	}
	if _, err := engine(3, 3, 0, 0).Mean(ctx, bad); err == nil {
		t.Error("a function of another solver was accepted")
	}
	stopped, cancel := context.WithCancel(ctx)
	cancel()
	if _, err := e.Mean(stopped, e.Coefficient(fast.Constant(1))); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

func TestGenerator(t *testing.T) {
	p := &fast.Problem{Domains: []fast.Domain{{}, {}},
		Drift:     []fast.Coefficient{fast.SumOf("f", fast.Monomial(-1, 1)), fast.Constant(0)},
		Diffusion: [][]fast.Coefficient{{fast.Constant(2), fast.Constant(3)}, {fast.Constant(3), fast.Constant(5)}}}
	if err := p.Check(); err != nil {
		t.Fatal(err)
	}
	want := map[string]float64{"[1 0]": -2, "[2 0]": 1, "[1 1]": 3, "[0 2]": 2.5}
	op := p.Generator()
	if len(op) != len(want) {
		t.Fatalf("%d terms", len(op))
	}
	for _, term := range op {
		if got := term.Coefficient.At(2, 0); got != want[fmt.Sprint(term.Order)] {
			t.Errorf("coefficient of %v at y = 2 is %g", term.Order, got)
		}
	}
	p.Drift = p.Drift[:1]
	if p.Check() == nil {
		t.Error("a missing drift was accepted")
	}
}
