package ensemble

import (
	"fmt"
	"math"

	"epslim/solver/kernel"
)

// Advice is a recommended step and what it was derived from.
type Advice struct {
	Step     float64 // the recommendation
	Rate     float64 // the largest rate of change found, per unit of time
	Variable string  // whose rate it is
	Stable   float64 // steps longer than this do not resolve the system; 0 when there is no rate
}

// Warning returns a message when a step h is longer than the scheme resolves,
// and an empty string when it is not.
func (a Advice) Warning(h float64) string {
	if a.Rate <= 0 || h <= a.Stable*(1+1e-9) {
		return ""
	}
	return fmt.Sprintf("the step %.3g is longer than %.3g, beyond which the motion of %q (rate %.3g) is not resolved; the recommended step is %.3g", h, a.Stable, a.Variable, a.Rate, a.Step)
}

// Advise recommends a step for a run of length time. The rates of the system are
// estimated at pseudo-random states around the start: the slope of each drift in
// its own variable, and for variables on bounded or periodic domains the drift
// and the squared noise against the length of the domain. Euler steps resolve
// the fastest of them twenty times, second-order steps ten times.
func (m *Model) Advise(scheme Scheme, time float64) (Advice, error) {
	b, err := m.bind()
	if err != nil {
		return Advice{}, err
	}
	if !(time > 0) || math.IsInf(time, 0) {
		return Advice{}, fmt.Errorf("ensemble: the time is %v; it must be positive and finite", time)
	}
	a := Advice{}
	if err := m.rates(b, &a); err != nil {
		return Advice{}, err
	}
	fraction := 0.05
	if scheme.WeakOrder >= 2 {
		fraction = 0.1
	}
	a.Step = time / 100
	if a.Rate > 0 {
		a.Step = math.Min(a.Step, fraction/a.Rate)
		a.Stable = 0.5 / a.Rate
	}
	return a, nil
}

// length returns the scale of a variable's domain over which coefficients vary.
func (v Variable) length() float64 {
	d := v.Domain
	switch d.Kind {
	case Circle, Sphere:
		return 1
	case Periodic:
		return (d.Hi - d.Lo) / (2 * math.Pi)
	case Reflecting, Absorbing:
		return (d.Hi - d.Lo) / 4
	case HalfLine:
		return v.Start
	}
	return math.Inf(1)
}

func (m *Model) rates(b *bound, a *Advice) error {
	var nodes []kernel.Node
	nodes = append(nodes, b.drift...)
	for _, row := range b.noise {
		nodes = append(nodes, row...)
	}
	p, err := b.graph.Compile(nodes...)
	if err != nil {
		return err
	}
	d, w := len(m.Variables), m.wiener()
	s := p.NewScratch()
	random := splitMix64(2)
	x := make([]float64, len(p.Inputs()))
	y, z := make([]float64, len(nodes)), make([]float64, len(nodes))
	note := func(i int, rate float64) {
		if rate > a.Rate && !math.IsInf(rate, 0) {
			a.Rate, a.Variable = rate, m.Variables[i].Name
		}
	}
	for trial := range 32 {
		for k := range m.Variables {
			x[k] = m.Variables[k].Start
			if trial > 0 {
				x[k] = m.Variables[k].sample(random.float())
			}
		}
		if err := p.EvalPoint(s, x, y); err != nil {
			return err
		}
		for i, v := range m.Variables {
			var variance float64
			for j := range w {
				q := y[d+i*w+j]
				variance += q * q
			}
			// A domain many lengths wide is crossed slowly by diffusion; a slow
			// variable moves by its drift and noise over its own length.
			l := v.length()
			note(i, variance/(2*l*l))
			note(i, math.Abs(y[i])/l)
			keep, delta := x[i], 1e-6*math.Max(1e-3, math.Min(l, math.Max(1, math.Abs(x[i]))))
			x[i] = keep + delta
			if err := p.EvalPoint(s, x, z); err != nil {
				return err
			}
			x[i] = keep
			note(i, math.Abs(z[i]-y[i])/delta)
		}
	}
	return nil
}
