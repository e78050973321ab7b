package ensemble

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"testing"
	"time"
)

func TestMomentsAgainstTwoPasses(t *testing.T) {
	m := crawlerLimit()
	// A large common part is where a careless variance loses its digits.
	x := m.Graph.Input("x")
	m.Observables = []Observable{{"x", x}, {"shifted", m.Graph.Add(m.Graph.Scale(1e-3, x), m.Graph.Const(1e6))}, {"y", m.Graph.Input("y")}}
	r := run(t, m, Settings{To: 5000, Time: 0.1, Step: 0.01, Seed: 3}).Times[0]
	if q := r.Variance(1) / r.Variance(0) * 1e6; math.Abs(q-1) > 1e-5 {
		t.Errorf("variances of x and 1e6 + x/1000: ratio %v", q)
	}
	if c := r.Covariance[0][1] / r.Variance(0) * 1e3; math.Abs(c-1) > 1e-5 {
		t.Errorf("covariance of x and 1e6 + x/1000: ratio %v", c)
	}
	if s := math.Sqrt(r.Variance(0) / 5000); math.Abs(s/r.StdErr[0]-1) > 1e-15 {
		t.Errorf("standard error %v, want %v", r.StdErr[0], s)
	}
}

// The interval of the rate covers the true exponent as often as it says, and
// noise alone gives no rate.
func TestRateAndItsInterval(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	hits, trials := 0, 2000
	for range trials {
		var points []Point
		common := 0.001 * r.NormFloat64()
		for _, eps := range []float64{0.4, 0.2, 0.1, 0.05} {
			s := 0.002
			points = append(points, Point{eps, 0.5*eps + s*r.NormFloat64() - common, s})
		}
		q := FitRate(points, 0.001)
		if q.Status == RateOK && q.Lower <= 1 && 1 <= q.Upper {
			hits++
		}
	}
	if f := float64(hits) / float64(trials); f < 0.92 || f > 0.985 {
		t.Errorf("the 95 %% interval covers the exponent in %.1f %% of the cases", 100*f)
	}
	rates := 0
	for range trials {
		var points []Point
		for _, eps := range []float64{0.4, 0.2, 0.1, 0.05} {
			points = append(points, Point{eps, 0.01 * r.NormFloat64(), 0.01})
		}
		if FitRate(points, 0).Status == RateOK {
			rates++
		}
	}
	if rates > trials/100 {
		t.Errorf("pure noise gave a rate in %d of %d cases", rates, trials)
	}
	if s := FitRate([]Point{{0.1, 1, 0.01}}, 0); s.Status != RateFewPoints || !math.IsNaN(s.Exponent) {
		t.Errorf("one point: %v", s)
	}
	exact := FitRate([]Point{{0.4, 0.16, 1e-9}, {0.2, 0.04, 1e-9}, {0.1, 0.01, 1e-9}}, 0)
	if math.Abs(exact.Exponent-2) > 1e-6 || math.Abs(exact.Constant-1) > 1e-6 {
		t.Errorf("eps^2: %v, constant %v", exact, exact.Constant)
	}
}

// Critical values of the Kolmogorov distribution from N. Smirnov, Ann. Math.
// Statist. 19 (1948) 279-281; from memory.
func TestKolmogorovProbability(t *testing.T) {
	for _, c := range [][2]float64{{0.5, 1 - 0.036055}, {0.83, 1 - 0.503809}, {1, 1 - 0.730000}, {1.22, 0.101896}, {1.36, 0.049488}, {1.63, 0.009846}} {
		if p := KolmogorovProbability(c[0]); math.Abs(p-c[1]) > 1e-5 {
			t.Errorf("K(%v): %v, want %v", c[0], p, c[1])
		}
	}
}

func TestDistanceSeesTheRightLawAndTheWrongOne(t *testing.T) {
	m := relaxing(1, 1, 0, true)
	s := Settings{To: 20000, Time: 3, Step: 3, Scheme: "splitting", Seed: 2, Histograms: []HistogramSpec{{Observables: []string{"y"}, Lo: []float64{-3}, Hi: []float64{3}, Cells: []int{60}}}}
	h := run(t, m, s).Times[0].Histograms[0]
	variance := (1 - math.Exp(-6)) / 2
	gauss := func(v float64) func(float64) float64 {
		return func(x float64) float64 { return math.Erfc(-x/math.Sqrt(2*v)) / 2 }
	}
	right, err := h.Compare(h.CellProbabilities(gauss(variance)))
	if err != nil {
		t.Fatal(err)
	}
	if right.KSProb < 1e-3 || right.L1 > 2*right.L1Noise || right.Chi2 > float64(right.Degrees)+5*math.Sqrt(2*float64(right.Degrees)) {
		t.Errorf("the true law: %+v", right)
	}
	wrong, err := h.Compare(h.CellProbabilities(gauss(1.15 * variance)))
	if err != nil {
		t.Fatal(err)
	}
	if wrong.KSProb > 1e-3 || wrong.L1 < 2*wrong.L1Noise {
		t.Errorf("a law 15 %% too wide: %+v", wrong)
	}
	if _, err := h.Compare([]float64{1}); err == nil {
		t.Error("a wrong number of cells is not refused")
	}
}

// The autocorrelation time and the error of long averages of the
// Ornstein-Uhlenbeck process: tau = 1/k, variance s^2/(2k), and for its square
// 1/(2k).
func TestLongTimeAverages(t *testing.T) {
	m := relaxing(2, 2, 1, true)
	r := run(t, m, Settings{To: 512, Time: 200, Step: 0.05, Scheme: "splitting", Seed: 4, LongTime: &LongTime{Burn: 5, Every: 2, Batches: 8,
		Histograms: []HistogramSpec{{Observables: []string{"y"}, Lo: []float64{-5}, Hi: []float64{5}, Cells: []int{40}}}}}).Long
	for i, want := range []struct{ mean, variance, tau float64 }{{0, 1, 0.5}, {1, 2, 0.25}} {
		if z := (r.Mean[i] - want.mean) / r.StdErr[i]; math.Abs(z) > 4 {
			t.Errorf("observable %d: mean %v +- %v, want %v", i, r.Mean[i], r.StdErr[i], want.mean)
		}
		if math.Abs(r.Stationary[i]/want.variance-1) > 0.03 {
			t.Errorf("observable %d: stationary variance %v, want %v", i, r.Stationary[i], want.variance)
		}
		if math.Abs(r.Correlation[i]/want.tau-1) > 0.1 {
			t.Errorf("observable %d: autocorrelation time %v, want %v", i, r.Correlation[i], want.tau)
		}
		// The two ways to the error bar agree: between paths and from tau.
		if q := r.StdErr[i] / math.Sqrt(r.Stationary[i]/r.Effective[i]); math.Abs(q-1) > 0.15 {
			t.Errorf("observable %d: error between paths over error from tau is %v", i, q)
		}
	}
	d, err := r.Histograms[0].Compare(r.Histograms[0].CellProbabilities(func(x float64) float64 { return math.Erfc(-x/math.Sqrt2) / 2 }))
	if err != nil || d.L1 > 0.03 {
		t.Errorf("occupation histogram: %+v, %v", d, err)
	}
}

func TestStepBiasOnCommonNoise(t *testing.T) {
	m := geometric(1.2, 0.3)
	b, err := EstimateStepBias(context.Background(), m, Settings{To: 1 << 15, Time: 1, Step: 1.0 / 64, Scheme: "euler", Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	want := math.Pow(1+1.2/64, 64) - math.Exp(1.2) // the mean of Euler's scheme is known
	if math.Abs(b.Bias[0]-want) > 4*b.StdErr[0]+0.1*math.Abs(want) {
		t.Errorf("bias %v +- %v, want %v", b.Bias[0], b.StdErr[0], want)
	}
	if b.Correlation[0] < 0.99 {
		t.Errorf("correlation of the two simulations %v", b.Correlation[0])
	}
	// Independent simulations could not see it with so few paths.
	if free := run(t, m, Settings{To: 1 << 15, Time: 1, Step: 1.0 / 64, Scheme: "euler", Seed: 1}).Times[0].StdErr[0]; b.StdErr[0] > free/5 {
		t.Errorf("standard error %v on common noise, %v without", b.StdErr[0], free)
	}
}

func TestControlVariate(t *testing.T) {
	fine, coarse := geometric(1, 0.3), geometric(0.9, 0.3)
	d, err := RunPair(context.Background(), Coupled{fine, "platen2"}, Coupled{coarse, "platen2"}, 1, Settings{To: 1 << 14, Time: 1, Step: 1.0 / 64, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	mean, stderr, _ := d.Controlled(0, math.Exp(0.9), 0)
	if math.Abs(mean-math.E) > 4*stderr+2e-3 || stderr > d.Fine.StdErr[0]/20 {
		t.Errorf("controlled mean %v +- %v (plain +- %v), want e", mean, stderr, d.Fine.StdErr[0])
	}
}

func TestTargetIsReachedOrTheBudgetSpent(t *testing.T) {
	m := geometric(0.5, 0.5)
	s := Settings{Time: 1, Step: 0.05, Seed: 2, Scheme: "platen2"}
	goal := Target{StdErr: 4e-3, Observables: []string{"x"}}
	r, outcome, err := RunToTarget(context.Background(), m, s, goal)
	if err != nil || outcome != TargetReached {
		t.Fatalf("%v, %v", outcome, err)
	}
	if r.Times[0].StdErr[0] > goal.StdErr || r.Times[0].StdErr[0] < goal.StdErr/2.5 {
		t.Errorf("standard error %v, wanted %v", r.Times[0].StdErr[0], goal.StdErr)
	}
	s.Workers = 3
	if again, _, err := RunToTarget(context.Background(), m, s, goal); err != nil || again.Paths != r.Paths || again.Times[0].Mean[0] != r.Times[0].Mean[0] {
		t.Errorf("3 workers: %d paths, 1 worker: %d", again.Paths, r.Paths)
	}
	goal.StdErr, goal.MaxPaths = 1e-9, 5000
	if r, outcome, err = RunToTarget(context.Background(), m, s, goal); err != nil || outcome != TargetPathsSpent || r.Paths != 5000 {
		t.Errorf("%v after %d paths, %v", outcome, r.Paths, err)
	}
	goal.MaxPaths, goal.MaxTime = 0, 30*time.Millisecond
	if r, outcome, err = RunToTarget(context.Background(), m, s, goal); err != nil || outcome != TargetTimeSpent || r.Paths == 0 {
		t.Errorf("%v, %v", outcome, err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, outcome, err = RunToTarget(ctx, m, s, goal); outcome != TargetInterrupted || !errors.Is(err, context.Canceled) {
		t.Errorf("%v, %v", outcome, err)
	}
}

func TestMultilevelEstimate(t *testing.T) {
	m := geometric(0.5, 0.4)
	r, err := Multilevel(context.Background(), m, MultilevelSettings{Target: 2e-3, Time: 1, Coarsest: 0.25, Scheme: "euler", Seed: 3})
	if err != nil {
		t.Fatal(err)
	}
	if !r.Converged || r.StdErr > 2e-3/math.Sqrt2*1.01 {
		t.Errorf("converged %v, standard error %v", r.Converged, r.StdErr)
	}
	if math.Abs(r.Mean-math.Exp(0.5)) > 4*r.StdErr+2*r.Bias {
		t.Errorf("mean %v +- %v, bias %v, want %v", r.Mean, r.StdErr, r.Bias, math.Exp(0.5))
	}
	if r.Cost > r.SingleCost/3 {
		t.Errorf("%g steps, %g with the finest step alone", r.Cost, r.SingleCost)
	}
}

// The differences of the crawler from its limit vanish with eps: that of the
// initial heading is of first order.
func TestStudyOfTheCrawler(t *testing.T) {
	observe := func(m *Model) *Model {
		m.Observables = []Observable{{"s", m.Graph.Sin(m.Graph.Scale(2*math.Pi, m.Graph.Input("x")))}}
		return m
	}
	st := Study{Limit: observe(crawlerLimit()), LimitStep: 2e-3}
	for _, eps := range []float64{0.1, 0.05, 0.025} {
		st.Full = append(st.Full, observe(crawler(eps)))
	}
	c, err := st.Run(context.Background(), Settings{To: 1 << 14, Time: 0.05, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	q := c.Rates[0]
	t.Logf("\n%s", q.Table(c.Points[0]))
	if q.Status != RateOK || math.Abs(q.Exponent-1) > 0.2+q.StdErr {
		t.Errorf("rate %v from %v", q, c.Points[0])
	}
	// The same study from parts, in two slices, gives the same rates.
	settings := Settings{To: 1 << 14, Time: 0.05, Seed: 1}
	var parts []*Part
	for number, m := range st.systems() {
		var slices []*Part
		for _, cut := range []Interval{{0, 5000}, {5000, 1 << 14}} {
			s := st.SystemSettings(settings, number)
			s.From, s.To = cut.From, cut.To
			slices = append(slices, parse(t, part(t, m, s)))
		}
		whole, err := MergeParts(slices...)
		if err != nil {
			t.Fatal(err)
		}
		parts = append(parts, whole)
	}
	if again, err := st.Evaluate(settings, parts); err != nil || again.Rates[0].String() != q.String() || again.Limit.Times[0].Mean[0] != c.Limit.Times[0].Mean[0] {
		t.Errorf("from parts: %v, %v; want %v", again.Rates[0], err, q)
	}
	// Observing nothing that changes gives no rate.
	same := Study{Bias: true, Limit: observe(crawlerLimit()), LimitStep: 2e-3, LimitScheme: "euler", FullScheme: "euler", Steps: []float64{2e-3, 2e-3}}
	for _, eps := range []float64{0.2, 0.1} {
		m := observe(crawlerLimit())
		m.Eps = eps
		same.Full = append(same.Full, m)
	}
	if c, err = same.Run(context.Background(), Settings{To: 1 << 12, Time: 0.1, Seed: 1}); err != nil || c.Rates[0].Status != RateNoiseFloor {
		t.Errorf("equal laws: %v, %v", c.Rates[0], err)
	}
}

// A traced path is the path of the ensemble.
func TestTracesAreThePathsOfTheEnsemble(t *testing.T) {
	m, s := everything()
	s.LongTime, s.Histograms = nil, nil
	paths := []uint64{5, 700, 6, 1699}
	tr, err := Trace(context.Background(), m, s, paths)
	if err != nil {
		t.Fatal(err)
	}
	for i, k := range paths {
		s.From, s.To = k, k+1
		r := run(t, m, s)
		for at := range r.Times {
			for o, want := range r.Times[at].Mean {
				if got := tr.Values[i][at][o]; got != want {
					t.Errorf("path %d time %v: %v, want %v", k, tr.Times[at], got, want)
				}
			}
		}
	}
	if _, err := Trace(context.Background(), m, s, nil); err == nil {
		t.Error("no paths: no error")
	}
}
