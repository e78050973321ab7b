package ensemble

import (
	"fmt"
	"math"

	"epslim/solver/kernel"
)

// stepper is one step of a scheme, of a fixed length, as a program. Its outputs
// are the new state, then for each reflecting variable the state before
// reflection, then for each absorbing variable the variance rate of its noise.
type stepper struct {
	h       float64
	program *kernel.Program
	rows    []noiseRow
	needsT  bool
	order   []int // for each input of the program: < d variable, d time, > d noise row + d+1
	reflect []reflection
	absorb  []absorption
	wrap    []wrapping // done between windows, where coefficients allow it
}

type reflection struct {
	variable int
	lo, hi   float64
}

type absorption struct {
	variable int
	lo, hi   float64
}

type wrapping struct {
	variable   int
	lo, length float64
}

// newStepper builds the step of length h.
func newStepper(m *Model, scheme Scheme, h float64) (*stepper, error) {
	b, err := m.bind()
	if err != nil {
		return nil, err
	}
	c := &construction{m: m, b: b, h: h}
	usesTime := false
	for _, name := range b.graph.Inputs() {
		usesTime = usesTime || name == TimeInput
	}
	if usesTime {
		c.time = b.graph.Input(TimeInput)
	}
	next, err := scheme.build(c, b.state)
	if err != nil {
		return nil, err
	}
	s := &stepper{h: h, rows: c.rows}
	lazy := m.periodicCoefficients(b)
	var raw, variance []kernel.Node
	for i, v := range m.Variables {
		d := v.Domain
		switch d.Kind {
		case Circle, Periodic:
			lo, length, _ := d.period()
			if lazy[i] {
				s.wrap = append(s.wrap, wrapping{i, lo, length})
			} else {
				next[i] = wrapNode(b.graph, next[i], lo, length)
			}
		case Reflecting:
			raw = append(raw, next[i])
			s.reflect = append(s.reflect, reflection{i, d.Lo, d.Hi})
			next[i] = reflectNode(b.graph, next[i], d.Lo, d.Hi)
		case HalfLine:
			raw = append(raw, next[i])
			s.reflect = append(s.reflect, reflection{i, 0, math.Inf(1)})
			next[i] = b.graph.Abs(next[i])
		case Absorbing:
			s.absorb = append(s.absorb, absorption{i, d.Lo, d.Hi})
			sum := b.graph.Const(0)
			for j := range m.wiener() {
				sum = b.graph.FMA(b.noise[i][j], b.noise[i][j], sum)
			}
			variance = append(variance, sum)
		}
	}
	for _, i := range m.spheres() {
		normalizeNodes(b.graph, next[i:i+3])
	}
	outputs := append(append(append([]kernel.Node(nil), next...), raw...), variance...)
	if s.program, err = b.graph.Compile(outputs...); err != nil {
		return nil, err
	}
	return s, s.bindInputs(m)
}

// bindInputs notes where each input of the program comes from.
func (s *stepper) bindInputs(m *Model) error {
	d := len(m.Variables)
	where := map[string]int{TimeInput: d}
	for i, name := range m.names() {
		where[name] = i
	}
	for k, r := range s.rows {
		where[r.name] = d + 1 + k
	}
	for _, name := range s.program.Inputs() {
		i, ok := where[name]
		if !ok {
			return fmt.Errorf("ensemble: the parameter %q has no number", name)
		}
		s.order = append(s.order, i)
	}
	return nil
}

func wrapNode(g *kernel.Builder, x kernel.Node, lo, length float64) kernel.Node {
	turns := g.Floor(g.Scale(1/length, g.Add(x, g.Const(-lo))))
	return g.Add(x, g.Scale(-length, turns))
}

// reflectNode folds x into [lo, hi]; a step of more than the width of the domain
// ends on the boundary.
func reflectNode(g *kernel.Builder, x kernel.Node, lo, hi float64) kernel.Node {
	above := g.Add(g.Abs(g.Add(x, g.Const(-lo))), g.Const(lo))
	below := g.Add(g.Neg(g.Abs(g.Sub(g.Const(hi), above))), g.Const(hi))
	return g.Max(below, g.Const(lo))
}

// normalizeNodes projects a step of a unit vector back to the sphere.
func normalizeNodes(g *kernel.Builder, x []kernel.Node) {
	square := g.Const(0)
	for _, y := range x {
		square = g.FMA(y, y, square)
	}
	f := g.Div(g.Const(1), g.Sqrt(square))
	for i := range x {
		x[i] = g.Mul(f, x[i])
	}
}

// periodicCoefficients tells for each periodic variable whether all coefficients
// have its period, found by comparing values at pseudo-random states. Such a
// variable need not be wrapped at every step.
func (m *Model) periodicCoefficients(b *bound) []bool {
	var nodes []kernel.Node
	nodes = append(nodes, b.drift...)
	for _, row := range b.noise {
		nodes = append(nodes, row...)
	}
	result := make([]bool, len(m.Variables))
	p, err := b.graph.Compile(nodes...)
	if err != nil {
		return result
	}
	s := p.NewScratch()
	random := splitMix64(1)
	x := make([]float64, len(p.Inputs()))
	y, z := make([]float64, len(nodes)), make([]float64, len(nodes))
	for i, v := range m.Variables {
		_, length, ok := v.Domain.period()
		result[i] = ok
		for trial := 0; ok && trial < 48; trial++ {
			for k := range x {
				x[k] = random.float() * 3
				if k < len(m.Variables) {
					x[k] = m.Variables[k].sample(random.float())
				}
			}
			if p.EvalPoint(s, x, y) != nil {
				return make([]bool, len(m.Variables))
			}
			x[i] += length * float64(trial%7-3)
			if p.EvalPoint(s, x, z) != nil {
				return make([]bool, len(m.Variables))
			}
			for k := range y {
				if !(math.Abs(y[k]-z[k]) <= 1e-9*(math.Abs(y[k])+1e-3)) {
					result[i] = false
				}
			}
		}
	}
	return result
}

// sample maps u in [0, 1] to a state of the variable.
func (v Variable) sample(u float64) float64 {
	d := v.Domain
	switch d.Kind {
	case Periodic, Reflecting, Absorbing:
		return d.Lo + u*(d.Hi-d.Lo)
	case Circle:
		return 2 * math.Pi * u
	case HalfLine:
		return v.Start * (0.5 + u)
	}
	return v.Start + 2*u - 1
}

// splitMix64 is a small deterministic generator for choices that are not part of
// the simulation.
type splitMix64 uint64

func (s *splitMix64) next() uint64 {
	*s += 0x9e3779b97f4a7c15
	z := uint64(*s)
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}

func (s *splitMix64) float() float64 { return float64(s.next()>>11) * 0x1p-53 }
