package ensemble

import (
	"context"
	"math"
	"strings"
	"testing"
)

// within checks a mean against an exact value, allowing a bias of the step.
func within(t *testing.T, what string, r TimeResult, i int, want, bias float64) {
	t.Helper()
	if math.Abs(r.Mean[i]-want) > 4*r.StdErr[i]+bias {
		t.Errorf("%s: %v +- %v, want %v", what, r.Mean[i], r.StdErr[i], want)
	}
}

func TestReflectingBrownianMotion(t *testing.T) {
	m := brownian(Domain{Kind: Reflecting, Hi: 1}, 0.3)
	m.Observables = append(m.Observables, Observable{"inside", m.Graph.Max(m.Graph.Neg(m.Graph.Input("x")), m.Graph.Sub(m.Graph.Input("x"), m.Graph.Const(1)))})
	r := run(t, m, Settings{To: 1 << 15, Time: 0.2, Step: 1e-3, Seed: 1, Histograms: []HistogramSpec{{Observables: []string{"x"}, Lo: []float64{0}, Hi: []float64{1}, Cells: []int{4}}}})
	// The eigenfunction cos(pi x) of the reflected motion decays with the rate pi^2/2.
	within(t, "cos(pi x)", r.Times[0], 1, math.Cos(0.3*math.Pi)*math.Exp(-math.Pi*math.Pi/2*0.2), 1e-3)
	if h := r.Times[0].Histograms[0]; h.Outside != 0 {
		t.Errorf("%d paths outside the domain", h.Outside)
	}
	if l := r.Leaves[0]; l.Steps == 0 || l.Of != 200<<15 {
		t.Errorf("reflections %d of %d path-steps", l.Steps, l.Of)
	}
}

func TestAbsorbedBrownianMotion(t *testing.T) {
	m := brownian(Domain{Kind: Absorbing, Lo: 0, Hi: 1}, 0.4)
	r := run(t, m, Settings{To: 1 << 15, Time: 0.15, Step: 2e-3, Seed: 1})
	// Survival and exit from the sine series of the absorbed motion (W. Feller, An
	// Introduction to Probability Theory, vol. 2, X.5; from memory).
	survival := 0.0
	for k := 1.0; k < 60; k += 2 {
		survival += 4 / (math.Pi * k) * math.Sin(k*math.Pi*0.4) * math.Exp(-k*k*math.Pi*math.Pi*0.15/2)
	}
	e := r.Exits[0]
	n := float64(e.Lower + e.Upper + e.Alive)
	if got, s := float64(e.Alive)/n, math.Sqrt(survival*(1-survival)/n); n != 1<<15 || math.Abs(got-survival) > 4*s+2e-3 {
		t.Errorf("survival %v +- %v, want %v", got, s, survival)
	}
	// The stopped motion is a martingale.
	within(t, "stopped x", r.Times[0], 0, 0.4, 1e-3)

	long := run(t, m, Settings{To: 1 << 14, Time: 6, Step: 2e-3, Seed: 2}).Exits[0]
	if math.Abs(long.MeanTime-0.4*0.6) > 4*long.StdErrTime+1.5e-3 {
		t.Errorf("mean exit time %v +- %v, want 0.24", long.MeanTime, long.StdErrTime)
	}
	if p := float64(long.Upper) / float64(long.Upper+long.Lower); math.Abs(p-0.4) > 4*math.Sqrt(0.24/float64(1<<14)) {
		t.Errorf("exit at the upper end with frequency %v, want 0.4", p)
	}
}

func TestSquareRootProcessStaysOnItsHalfLine(t *testing.T) {
	m := squareRoot(1, 0.5, 1, 0.2) // 2 k m = s^2: the end is just not reached
	r := run(t, m, Settings{To: 1 << 15, Time: 1, Step: 1.0 / 256, Seed: 1, Histograms: []HistogramSpec{{Observables: []string{"y"}, Lo: []float64{0}, Hi: []float64{1e6}, Cells: []int{1}}}})
	within(t, "mean", r.Times[0], 0, 0.5-0.3*math.Exp(-1), 0.01)
	if r.Times[0].Histograms[0].Outside != 0 || r.BlowUp != 0 {
		t.Errorf("%d paths outside the half-line, %d blown up", r.Times[0].Histograms[0].Outside, r.BlowUp)
	}
	if r.Leaves[0].Steps == 0 {
		t.Error("no reflection was counted")
	}
}

func TestUnitVectorStaysOnTheSphere(t *testing.T) {
	r := run(t, compass(0.5), Settings{To: 1 << 15, Time: 0.5, Step: 1.0 / 128, Seed: 1})
	f := math.Exp(-0.5)
	within(t, "a", r.Times[0], 0, 0.6*f, 4e-3)
	within(t, "c", r.Times[0], 1, 0.8*f, 4e-3)
	if v := r.Times[0]; math.Abs(v.Mean[2]-1) > 1e-14 || v.Variance(2) > 1e-28 {
		t.Errorf("length^2 has mean %v and variance %v", v.Mean[2], v.Variance(2))
	}
}

// Periodic variables come back to their domain whether or not the coefficients
// allow the wrapping to be put off.
func TestPeriodicVariablesAreWrapped(t *testing.T) {
	lazy := crawler(0.2)
	x := lazy.Graph.Input("x")
	saw := crawler(0.2)
	saw.Drift[0] = saw.Graph.Add(saw.Drift[0], saw.Graph.Input("x")) // not periodic
	for _, c := range []struct {
		m    *Model
		lazy int
	}{{lazy, 3}, {saw, 2}} {
		st, err := newStepper(c.m, Schemes()[0], 1e-3)
		if err != nil {
			t.Fatal(err)
		}
		if len(st.wrap) != c.lazy {
			t.Errorf("%d variables are wrapped late, want %d", len(st.wrap), c.lazy)
		}
		c.m.Observables = []Observable{{"x", x}, {"theta", c.m.Graph.Input("theta")}}
		r := run(t, c.m, Settings{To: 2000, Time: 1, Step: 1e-3, Scheme: "euler", Histograms: []HistogramSpec{
			{Observables: []string{"x"}, Lo: []float64{0}, Hi: []float64{1}, Cells: []int{5}},
			{Observables: []string{"theta"}, Lo: []float64{0}, Hi: []float64{2 * math.Pi}, Cells: []int{5}},
		}})
		for _, h := range r.Times[0].Histograms {
			if h.Outside != 0 || h.Total() != 2000 {
				t.Errorf("%v: %d values outside the domain", h.Spec.Observables, h.Outside)
			}
		}
	}
}

func TestBlowUpStopsThePathAndSaysWhen(t *testing.T) {
	s := Settings{To: 3000, Time: 1.5, Step: 0.01, Scheme: "euler", Seed: 9}
	r := run(t, exploding(), s)
	if r.BlowUp == 0 || r.BlowUp == 3000 {
		t.Fatalf("%d of 3000 paths blew up", r.BlowUp)
	}
	if n := r.Times[0].N; n+r.BlowUp != 3000 {
		t.Errorf("%d paths counted and %d blown up of 3000", n, r.BlowUp)
	}
	if math.IsNaN(r.Times[0].Mean[0]) {
		t.Error("a blown-up path entered the mean")
	}
	e := r.Events[0]
	if e.Seed != 9 || !(e.Time > 0 && e.Time < 1.5) || !finite(e.State) || math.Abs(e.State[0]) < 1 {
		t.Errorf("event %v", e)
	}
	// The event is that of the path alone: running it by itself gives it again.
	s.From, s.To = e.Path, e.Path+1
	if alone := run(t, exploding(), s); alone.BlowUp != 1 || alone.Events[0].String() != e.String() {
		t.Errorf("alone: %v, in the ensemble: %v", alone.Events, e)
	}
	if !strings.Contains(strings.Join(r.Warnings, "\n"), "left the finite numbers") {
		t.Errorf("warnings %q", r.Warnings)
	}
}

func TestAbsurdSettingsAreRefusedWithTheLimit(t *testing.T) {
	m := geometric(1, 1)
	for _, c := range []struct {
		s    Settings
		want string
	}{
		{Settings{Time: 1}, "at least one path"},
		{Settings{From: 5, To: 5, Time: 1}, "at least one path"},
		{Settings{To: 1 << 60, Time: 1}, "1099511627776"},
		{Settings{To: 1}, "must be positive and finite"},
		{Settings{To: 1, Time: math.Inf(1)}, "must be positive and finite"},
		{Settings{To: 1, Time: math.NaN()}, "must be positive and finite"},
		{Settings{To: 1, Time: 1, Step: -1}, "must be positive"},
		{Settings{To: 1, Time: 1, Step: 2}, "longer than the time"},
		{Settings{To: 1, Time: 1, Step: 1e-300}, "1099511627776"},
		{Settings{To: 1, Time: 1, Times: []float64{0.5, 0.4}}, "must ascend"},
		{Settings{To: 1, Time: 1, Times: []float64{2}}, "must ascend"},
		{Settings{To: 1, Time: 1, Workers: -1}, "4096"},
		{Settings{To: 1, Time: 1, Histograms: []HistogramSpec{{Observables: []string{"z"}, Lo: []float64{0}, Hi: []float64{1}, Cells: []int{1}}}}, "not observed"},
		{Settings{To: 1, Time: 1, Histograms: []HistogramSpec{{Observables: []string{"x"}, Lo: []float64{0}, Hi: []float64{1}, Cells: []int{0}}}}, "between 1 and"},
		{Settings{To: 1, Time: 1, LongTime: &LongTime{Burn: 2}}, "discarded"},
	} {
		if _, err := Run(context.Background(), m, c.s); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%+v: error %v, want %q", c.s, err, c.want)
		}
	}
	unbound := crawler(0.1)
	delete(unbound.Parameters, "eps")
	if _, err := Run(context.Background(), unbound, Settings{To: 1, Time: 1}); err == nil || !strings.Contains(err.Error(), `"eps" has no number`) {
		t.Errorf("a parameter without a number: %v", err)
	}
	outside := brownian(Domain{Kind: Absorbing, Hi: 1}, 1)
	if _, err := Run(context.Background(), outside, Settings{To: 1, Time: 1}); err == nil || !strings.Contains(err.Error(), "absorbing end") {
		t.Errorf("a start on an absorbing end: %v", err)
	}
}

func TestStepIsChosenFromEpsAndAWarningGivenWhenTooLong(t *testing.T) {
	for _, eps := range []float64{0.2, 0.05} {
		m := crawler(eps)
		a, err := m.Advise(Schemes()[0], 1)
		if err != nil {
			t.Fatal(err)
		}
		// The heading turns with the rate 1/eps^2.
		if math.Abs(a.Rate*eps*eps-1) > 0.7 || a.Step > 0.06*eps*eps {
			t.Errorf("eps %v: rate %v (%s), step %v", eps, a.Rate, a.Variable, a.Step)
		}
		if a.Warning(a.Step) != "" || a.Warning(eps*eps*2) == "" {
			t.Errorf("eps %v: warnings %q, %q", eps, a.Warning(a.Step), a.Warning(2*eps*eps))
		}
	}
	r := run(t, crawler(0.05), Settings{To: 10, Time: 1, Step: 0.01, Scheme: "euler"})
	if len(r.Warnings) == 0 || !strings.Contains(r.Warnings[0], "not resolved") {
		t.Errorf("warnings %q", r.Warnings)
	}
}
