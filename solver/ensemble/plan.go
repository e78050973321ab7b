package ensemble

import (
	"fmt"
	"math"
	"slices"

	"epslim/solver/kernel"
)

// plan is a run compiled: what all workers share, immutable.
type plan struct {
	m        *Model
	s        *Settings
	scheme   Scheme
	step     float64 // the largest step after defaults
	segments []segment
	observe  *kernel.Program
	order    []int // inputs of observe: < d variable, d time
	steps    uint64
	burn     uint64 // steps before long-time averages begin
}

// segment is the part of a run between two observation times.
type segment struct {
	from, to float64
	steps    uint64
	stepper  *stepper
	observed bool // whether `to` is an observation time
}

// at returns the time at the start of step k, rounded in the same way on all
// processors.
func (g segment) at(k uint64) float64 { return g.from + float64(float64(k)*g.stepper.h) }

// newPlan compiles a run; multiple is a number the steps of each segment must be
// divisible by.
func newPlan(m *Model, s *Settings, multiple uint64) (*plan, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	if err := s.check(m); err != nil {
		return nil, err
	}
	p := &plan{m: m, s: s, step: s.Step}
	var err error
	if s.Scheme == "" {
		p.scheme, _, err = m.DefaultScheme()
	} else {
		p.scheme, err = SchemeByName(s.Scheme)
	}
	if err != nil {
		return nil, err
	}
	if p.step == 0 {
		advice, err := m.Advise(p.scheme, s.Time)
		if err != nil {
			return nil, err
		}
		p.step = advice.Step
	}
	if s.Time/p.step > MaxSteps {
		return nil, fmt.Errorf("ensemble: %.3g steps of %v in a time of %v; at most %d are possible", s.Time/p.step, p.step, s.Time, uint64(MaxSteps))
	}
	if err := p.cut(multiple); err != nil {
		return nil, err
	}
	return p, p.compileObservables()
}

// cut makes the segments; those with one length of step share a stepper.
func (p *plan) cut(multiple uint64) error {
	ends := slices.Clone(p.s.times())
	if last := ends[len(ends)-1]; last < p.s.Time {
		ends = append(ends, p.s.Time)
	}
	steppers := map[float64]*stepper{}
	from := 0.0
	for _, to := range ends {
		exact := (to - from) / p.step
		n := uint64(math.Ceil(exact - 1e-9*math.Max(1, exact)))
		n = max(1, (n+multiple-1)/multiple) * multiple
		h := (to - from) / float64(n)
		// Lengths that differ by the rounding of the times are one length.
		for k := range steppers {
			if math.Abs(k-h) < 1e-12*h {
				h = k
			}
		}
		st, ok := steppers[h]
		if !ok {
			var err error
			if st, err = newStepper(p.m, p.scheme, h); err != nil {
				return err
			}
			if len(steppers) < 256 {
				steppers[h] = st
			}
		}
		p.segments = append(p.segments, segment{from, to, n, st, slices.Contains(p.s.times(), to)})
		p.steps += n
		from = to
	}
	if l := p.s.LongTime; l != nil {
		for _, g := range p.segments {
			switch {
			case g.to <= l.Burn:
				p.burn += g.steps
			case g.from < l.Burn:
				p.burn += uint64(math.Ceil((l.Burn - g.from) / g.stepper.h))
			}
		}
		if p.samples() < uint64(l.batches()) {
			return fmt.Errorf("ensemble: %d samples of each path for %d batches of the long-time averages", p.samples(), l.batches())
		}
	}
	return nil
}

// samples returns the number of samples of one path for long-time averages.
func (p *plan) samples() uint64 {
	if p.burn >= p.steps {
		return 0
	}
	return (p.steps - p.burn) / uint64(p.s.LongTime.every())
}

func (p *plan) compileObservables() error {
	b, err := p.m.bind()
	if err != nil {
		return err
	}
	if p.observe, err = b.graph.Compile(b.values...); err != nil {
		return err
	}
	d := len(p.m.Variables)
	for _, name := range p.observe.Inputs() {
		i := slices.Index(p.m.names(), name)
		switch {
		case i >= 0:
			p.order = append(p.order, i)
		case name == TimeInput:
			p.order = append(p.order, d)
		default:
			return fmt.Errorf("ensemble: the parameter %q has no number", name)
		}
	}
	return nil
}

// StepSize returns the number of operations of one compiled step of the scheme
// and the number of rows of random numbers it draws.
func (m *Model) StepSize(scheme string, h float64) (operations, random int, err error) {
	s, err := SchemeByName(scheme)
	if err != nil {
		return 0, 0, err
	}
	st, err := newStepper(m, s, h)
	if err != nil {
		return 0, 0, err
	}
	return st.program.Len(), len(st.rows), nil
}
