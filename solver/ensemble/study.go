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
	// Target, when set, adds paths to each system until its error bars are there.
	Target *Target
	// Progress is called like Settings.Progress with the number of the system, 0
	// for the limit.
	Progress func(system int, p Progress)
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

// systems returns the limit and the full systems in the order of their numbers.
func (st *Study) systems() []*Model { return append([]*Model{st.Limit}, st.Full...) }

func (st *Study) check() error {
	if st.Limit == nil || len(st.Full) == 0 {
		return errors.New("ensemble: a study needs a limit and at least one full system")
	}
	for _, m := range st.Full {
		if m.Eps <= 0 {
			return errors.New("ensemble: a full system without a value of the scale parameter")
		}
		if a, b := m.ObservableNames(), st.Limit.ObservableNames(); fmt.Sprint(a) != fmt.Sprint(b) {
			return fmt.Errorf("ensemble: the observables at eps = %v are %v, those of the limit %v", m.Eps, a, b)
		}
	}
	return nil
}

// SystemSettings returns the settings with which system number of the study is
// run: its step, scheme, seed and checkpoint (the name with the number added).
func (st *Study) SystemSettings(s Settings, number int) Settings {
	s.Step, s.Scheme = st.LimitStep, st.LimitScheme
	if number > 0 {
		s.Step, s.Scheme = 0, st.FullScheme
		if number <= len(st.Steps) {
			s.Step = st.Steps[number-1]
		}
	}
	s.Seed = SystemSeed(s.Seed, uint64(number))
	if s.Checkpoint != "" {
		s.Checkpoint = fmt.Sprintf("%s.%d", s.Checkpoint, number)
	}
	if st.Progress != nil {
		s.Progress = func(p Progress) { st.Progress(number, p) }
	}
	return s
}

// Run simulates the limit and the full systems. The seeds of the systems are
// derived from s.Seed; s.Step and s.Scheme are not used. When ctx ends early the
// systems that were begun are returned, without rates, with the error.
func (st *Study) Run(ctx context.Context, s Settings) (*Convergence, error) {
	if err := st.check(); err != nil {
		return nil, err
	}
	c := &Convergence{}
	for number, m := range st.systems() {
		r, b, err := st.one(ctx, m, st.SystemSettings(s, number))
		c.add(number, r, b)
		if err != nil {
			return c, err
		}
	}
	c.rates(st)
	return c, nil
}

// Evaluate is Run for parts that were simulated before: parts[number] is the
// merged part of system number, run with SystemSettings(s, number). Biases of the
// steps are not estimated.
func (st *Study) Evaluate(s Settings, parts []*Part) (*Convergence, error) {
	if err := st.check(); err != nil {
		return nil, err
	}
	models := st.systems()
	if len(parts) != len(models) {
		return nil, fmt.Errorf("ensemble: %d parts for %d systems", len(parts), len(models))
	}
	c := &Convergence{}
	for number, m := range models {
		r, err := ResultOf(m, st.SystemSettings(s, number), parts[number])
		if err != nil {
			return nil, fmt.Errorf("system %d: %w", number, err)
		}
		c.add(number, r, nil)
	}
	c.rates(st)
	return c, nil
}

func (c *Convergence) add(number int, r *Result, b *StepBias) {
	switch {
	case r == nil:
	case number == 0:
		c.Limit, c.LimitBias = r, b
	default:
		c.Full, c.FullBias = append(c.Full, r), append(c.FullBias, b)
	}
}

// one simulates a system and estimates the bias of its step.
func (st *Study) one(ctx context.Context, m *Model, s Settings) (*Result, *StepBias, error) {
	var r *Result
	var err error
	if st.Target != nil {
		r, _, err = RunToTarget(ctx, m, s, *st.Target)
	} else {
		r, err = Run(ctx, m, s)
	}
	if err != nil || !st.Bias {
		return r, nil, err
	}
	for _, v := range m.Variables {
		if v.Domain.Kind == Absorbing {
			return r, nil, nil
		}
	}
	s.Times, s.Histograms, s.LongTime, s.Checkpoint, s.Progress = nil, nil, nil, "", nil
	s.To = s.From + max(1, r.Paths/4)
	bias, err := EstimateStepBias(ctx, m, s)
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
