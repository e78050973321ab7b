package ensemble

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// Study compares a full system at several values of its scale parameter with its
// limit.
type Study struct {
	Limit *Model
	Full  []*Model // each with its Eps, all with the observables of the limit
	// LimitStep and Steps are the largest steps; 0, or a missing entry, takes the
	// recommended one.
	LimitStep float64
	Steps     []float64
	// LimitScheme and FullScheme are names of schemes; empty takes the default.
	LimitScheme, FullScheme string
	// Bias estimates the bias of each step with two steps on common noise, on a
	// quarter of the paths.
	Bias bool
}

// Convergence is the outcome of a Study.
type Convergence struct {
	Limit     *Result
	LimitBias *StepBias
	Full      []*Result
	FullBias  []*StepBias
	// Points[i] are the differences of the means of observable i from the limit at
	// the last time, and Rates[i] is the power law through them.
	Points [][]Point
	Rates  []Rate
}

// Run simulates the limit and the full systems. The seeds of the systems are
// derived from s.Seed; s.Step and s.Scheme are not used. When ctx ends early the
// finished systems are returned with the error.
func (st *Study) Run(ctx context.Context, s Settings) (*Convergence, error) {
	if st.Limit == nil || len(st.Full) == 0 {
		return nil, errors.New("ensemble: a study needs a limit and at least one full system")
	}
	for _, m := range st.Full {
		if m.Eps <= 0 {
			return nil, errors.New("ensemble: a full system without a value of the scale parameter")
		}
		if a, b := m.ObservableNames(), st.Limit.ObservableNames(); fmt.Sprint(a) != fmt.Sprint(b) {
			return nil, fmt.Errorf("ensemble: the observables at eps = %v are %v, those of the limit %v", m.Eps, a, b)
		}
	}
	c := &Convergence{}
	var err error
	if c.Limit, c.LimitBias, err = st.one(ctx, st.Limit, s, 0, st.LimitStep, st.LimitScheme); err != nil {
		return c, err
	}
	for i, m := range st.Full {
		step := 0.0
		if i < len(st.Steps) {
			step = st.Steps[i]
		}
		r, b, err := st.one(ctx, m, s, uint64(i)+1, step, st.FullScheme)
		if err != nil {
			return c, err
		}
		c.Full = append(c.Full, r)
		c.FullBias = append(c.FullBias, b)
	}
	c.rates(st)
	return c, nil
}

// one simulates a system with the seed that belongs to its number.
func (st *Study) one(ctx context.Context, m *Model, s Settings, number uint64, step float64, scheme string) (*Result, *StepBias, error) {
	s.Step, s.Scheme = step, scheme
	s.Seed = SystemSeed(s.Seed, number)
	if s.Checkpoint != "" {
		s.Checkpoint = fmt.Sprintf("%s.%d", s.Checkpoint, number)
	}
	r, err := Run(ctx, m, s)
	if err != nil || !st.Bias {
		return r, nil, err
	}
	b := s
	b.Times, b.Histograms, b.LongTime, b.Checkpoint, b.Progress = nil, nil, nil, "", nil
	b.To = b.From + max(1, (b.To-b.From)/4)
	for _, v := range m.Variables {
		if v.Domain.Kind == Absorbing {
			return r, nil, nil
		}
	}
	bias, err := EstimateStepBias(ctx, m, b)
	return r, bias, err
}

// SystemSeed derives the seed of system number of a study: 0 is the limit, 1 the
// first full system.
func SystemSeed(seed, number uint64) uint64 {
	mix := splitMix64(seed + number*0xd1342543de82ef95)
	return mix.next()
}

func (c *Convergence) rates(st *Study) {
	limit := c.Limit.Times[len(c.Limit.Times)-1]
	for i := range c.Limit.Observables {
		var points []Point
		for k, r := range c.Full {
			last := r.Times[len(r.Times)-1]
			p := Point{Eps: st.Full[k].Eps, Value: last.Mean[i] - limit.Mean[i], StdErr: last.StdErr[i]}
			if b := c.FullBias[k]; b != nil {
				// A bias of the step counts as an error of unknown sign.
				p.StdErr = math.Hypot(p.StdErr, math.Hypot(b.Bias[i], b.StdErr[i]))
			}
			points = append(points, p)
		}
		common := limit.StdErr[i]
		if b := c.LimitBias; b != nil {
			common = math.Hypot(common, math.Hypot(b.Bias[i], b.StdErr[i]))
		}
		c.Points = append(c.Points, points)
		c.Rates = append(c.Rates, FitRate(points, common))
	}
}
