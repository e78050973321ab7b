package ensemble

import (
	"context"
	"math"
	"testing"

	"epslim/solver/kernel"
)

func run(t *testing.T, m *Model, s Settings) *Result {
	t.Helper()
	r, err := Run(context.Background(), m, s)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// biasOrder measures the bias of an observable at steps h and h/2 and returns
// the observed order with its standard error.
func biasOrder(t *testing.T, m *Model, scheme string, observable int, exact, time, h float64, paths uint64) (order, stderr, bias float64) {
	t.Helper()
	var e, s [2]float64
	for i := range e {
		r := run(t, m, Settings{To: paths, Time: time, Step: h / float64(1+i), Scheme: scheme, Seed: 11 + uint64(i)})
		last := r.Times[len(r.Times)-1]
		e[i], s[i] = last.Mean[observable]-exact, last.StdErr[observable]
	}
	return math.Log2(math.Abs(e[0] / e[1])), math.Hypot(s[0]/e[0], s[1]/e[1]) / math.Ln2, e[0]
}

// Each scheme reaches the weak order of its fact sheet on problems with known
// moments, at steps whose bias stands clear of the statistical error.
func TestSchemesReachTheirWeakOrder(t *testing.T) {
	gbm := geometric(1.2, 0.3)
	relaxedSquare := 4*math.Exp(-6) + 1.5*1.5/6*(1-math.Exp(-6))
	for _, c := range []struct {
		name       string
		m          *Model
		scheme     string
		observable int
		exact      float64
		time, h    float64
		paths      uint64
	}{
		{"geometric mean", gbm, "euler", 0, math.Exp(1.2), 1, 1.0 / 8, 1 << 16},
		{"geometric square", gbm, "euler", 1, math.Exp(2.4 + 0.09), 1, 1.0 / 8, 1 << 16},
		{"geometric mean", gbm, "platen2", 0, math.Exp(1.2), 1, 1.0 / 3, 1 << 18},
		{"geometric square", gbm, "platen2", 1, math.Exp(2.4 + 0.09), 1, 1.0 / 3, 1 << 19},
		{"area", area(), "euler", 0, 0.5, 1, 1.0 / 2, 1 << 18},
		{"relaxing square", relaxing(3, 1.5, 2, true), "euler", 1, relaxedSquare, 1, 1.0 / 16, 1 << 17},
		{"coloured", coloured(0.3), "splitting", 0, colouredSquare(0.3, 0.5), 0.5, 0.125, 1 << 20},
	} {
		sheet, err := SchemeByName(c.scheme)
		if err != nil {
			t.Fatal(err)
		}
		order, stderr, bias := biasOrder(t, c.m, c.scheme, c.observable, c.exact, c.time, c.h, c.paths)
		t.Logf("%s %s: order %.2f +- %.2f, bias %.2g", c.name, c.scheme, order, stderr, bias)
		if stderr > 0.2 || math.Abs(order-sheet.WeakOrder) > 0.35+3*stderr {
			t.Errorf("%s %s: observed order %.2f +- %.2f, the fact sheet says %v", c.name, c.scheme, order, stderr, sheet.WeakOrder)
		}
	}
}

// Second-order schemes get the second moment of an iterated integral exactly.
func TestMixedTermsOfThePlatenScheme(t *testing.T) {
	r := run(t, area(), Settings{To: 1 << 17, Time: 1, Step: 0.5, Scheme: "platen2", Seed: 5})
	x := r.Times[0]
	if z := (x.Mean[0] - 0.5) / x.StdErr[0]; math.Abs(z) > 4 {
		t.Errorf("E y^2 = %v +- %v, want 1/2", x.Mean[0], x.StdErr[0])
	}
}

// The exact step of linear fast variables has no bias at any step, coupled or not.
func TestExactFastSteps(t *testing.T) {
	single := relaxing(3, 1.5, 2, true)
	r := run(t, single, Settings{To: 1 << 16, Time: 1, Step: 1, Scheme: "splitting", Seed: 3})
	variance := 1.5 * 1.5 / 6 * (1 - math.Exp(-6))
	for i, want := range []float64{2 * math.Exp(-3), 4*math.Exp(-6) + variance} {
		if z := (r.Times[0].Mean[i] - want) / r.Times[0].StdErr[i]; math.Abs(z) > 4 {
			t.Errorf("observable %d: %v +- %v, want %v", i, r.Times[0].Mean[i], r.Times[0].StdErr[i], want)
		}
	}

	swirl := rotating()
	one := run(t, swirl, Settings{To: 1 << 16, Time: 1, Step: 1, Scheme: "splitting", Seed: 3}).Times[0]
	many := run(t, swirl, Settings{To: 1 << 16, Time: 1, Step: 1.0 / 64, Scheme: "platen2", Seed: 4}).Times[0]
	for i := range one.Mean {
		if z := (one.Mean[i] - many.Mean[i]) / math.Hypot(one.StdErr[i], many.StdErr[i]); math.Abs(z) > 4 {
			t.Errorf("coupled system, observable %d: one exact step %v +- %v, 64 small steps %v +- %v", i, one.Mean[i], one.StdErr[i], many.Mean[i], many.StdErr[i])
		}
	}
}

// Two fast variables of different rates on one Wiener process: E y1 y2 =
// s1 s2 (1 - e^{-(k1+k2)t})/(k1+k2) from 0, which is not the product of the spreads.
func TestExactStepOfFastVariablesThatShareNoise(t *testing.T) {
	g := kernel.NewBuilder("p", "q")
	p, q := g.Input("p"), g.Input("q")
	m := &Model{
		Graph:       g,
		Variables:   []Variable{{Name: "p", Fast: true}, {Name: "q", Fast: true}},
		Drift:       []kernel.Node{g.Scale(-1, p), g.Scale(-9, q)},
		Noise:       [][]kernel.Node{{g.Const(1)}, {g.Const(2)}},
		Observables: []Observable{{"pq", g.Mul(p, q)}, {"p^2", g.Mul(p, p)}, {"q^2", g.Mul(q, q)}},
	}
	r := run(t, m, Settings{To: 1 << 16, Time: 0.7, Step: 0.7, Scheme: "splitting", Seed: 6}).Times[0]
	for i, want := range []float64{2 * (1 - math.Exp(-7)) / 10, (1 - math.Exp(-1.4)) / 2, 4 * (1 - math.Exp(-12.6)) / 18} {
		if z := (r.Mean[i] - want) / r.StdErr[i]; math.Abs(z) > 4 {
			t.Errorf("observable %d: %v +- %v, want %v", i, r.Mean[i], r.StdErr[i], want)
		}
	}
}

func TestDefaultSchemeAndItsReason(t *testing.T) {
	for _, c := range []struct {
		m    *Model
		want string
	}{
		{crawler(0.1), "splitting"},
		{crawlerLimit(), "platen2"},
		{relaxing(1, 1, 0, true), "splitting"},
		{rotating(), "splitting"},
		{brownian(Domain{Kind: Reflecting, Hi: 1}, 0.5), "euler"},
		{sharedNoise(), "euler"},
		{nonlinearFast(), "euler"},
	} {
		s, why, err := c.m.DefaultScheme()
		if err != nil {
			t.Fatal(err)
		}
		if s.Name != c.want {
			t.Errorf("scheme %s (%s), want %s", s.Name, why, c.want)
		}
		if why == "" {
			t.Errorf("scheme %s without a reason", s.Name)
		}
	}
	if _, err := Run(context.Background(), sharedNoise(), Settings{To: 1, Time: 1, Scheme: "splitting"}); err == nil {
		t.Error("splitting of shared noise is not refused")
	}
	if _, err := SchemeByName("eulre"); err == nil {
		t.Error("an unknown scheme is not refused")
	}
}

// Steps of the splitting agree with Euler steps forty times as short, also where
// the coefficients of the fast variables depend on slow ones.
func TestSplittingAgreesWithShortEulerSteps(t *testing.T) {
	turning := crawler(0.2)
	turning.Observables = []Observable{{"x", turning.Graph.Sin(turning.Graph.Scale(2*math.Pi, turning.Graph.Input("x")))}, {"cos", turning.Graph.Cos(turning.Graph.Input("theta"))}}
	for _, m := range []*Model{patchy(0.2), turning} {
		a := run(t, m, Settings{To: 1 << 15, Time: 0.2, Step: 0.008, Scheme: "splitting", Seed: 1}).Times[0]
		b := run(t, m, Settings{To: 1 << 15, Time: 0.2, Step: 0.0002, Scheme: "euler", Seed: 2}).Times[0]
		for i := range a.Mean {
			if z := (a.Mean[i] - b.Mean[i]) / math.Hypot(a.StdErr[i], b.StdErr[i]); math.Abs(z) > 4 {
				t.Errorf("observable %d: %v +- %v by splitting, %v +- %v by Euler steps", i, a.Mean[i], a.StdErr[i], b.Mean[i], b.StdErr[i])
			}
		}
	}
}
