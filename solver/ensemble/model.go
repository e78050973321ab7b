package ensemble

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"epslim/solver/kernel"
)

// DomainKind says where a variable lives and what happens at its ends.
type DomainKind uint8

const (
	Line       DomainKind = iota // (-inf, inf)
	HalfLine                     // (0, inf); a step below 0 is reflected
	Circle                       // period 2*pi
	Periodic                     // [Lo, Hi], the ends identified
	Reflecting                   // [Lo, Hi], a step beyond an end is reflected
	Absorbing                    // [Lo, Hi], the path stops at an end
	Sphere                       // one of three consecutive components of a unit vector
)

func (k DomainKind) String() string {
	names := [...]string{"line", "halfline", "circle", "periodic", "reflecting", "absorbing", "sphere"}
	if int(k) < len(names) {
		return names[k]
	}
	return fmt.Sprintf("DomainKind(%d)", uint8(k))
}

// Domain is the domain of one variable. Lo and Hi are used by Periodic,
// Reflecting and Absorbing only.
type Domain struct {
	Kind   DomainKind
	Lo, Hi float64
}

// period returns the length of a periodic domain and its lower end.
func (d Domain) period() (lo, length float64, ok bool) {
	switch d.Kind {
	case Circle:
		return 0, 2 * math.Pi, true
	case Periodic:
		return d.Lo, d.Hi - d.Lo, true
	}
	return 0, 0, false
}

// Variable is one component of the state.
type Variable struct {
	Name   string
	Domain Domain
	Fast   bool    // decides which variables the splitting scheme steps exactly
	Start  float64 // the value at time 0
}

// Observable is a function of the state whose law is wanted.
type Observable struct {
	Name  string
	Value kernel.Node
}

// Model is a system of Ito equations dX_i = Drift[i] dt + sum_j Noise[i][j] dW_j
// with independent standard Wiener processes W_j. The nodes belong to Graph; the
// inputs of Graph are names of Variables, TimeInput, or keys of Parameters.
type Model struct {
	Title      string
	Graph      *kernel.Builder
	Variables  []Variable
	Drift      []kernel.Node   // one for each variable
	Noise      [][]kernel.Node // Noise[i][j], all rows of one length
	Wiener     []string        // names of the columns, for common noise; optional
	Parameters map[string]float64
	// Observables are evaluated at the observation times; when there are none,
	// the variables that are not fast are observed.
	Observables []Observable
	// Eps is the value of the scale parameter, 0 for a limit. It serves the
	// choice of the step: fast variables relax in times of order Eps^2 or Eps,
	// whatever the coefficients show.
	Eps float64
}

// TimeInput is the name of the input that stands for time. Coefficients that
// contain it are evaluated at the start of each step.
const TimeInput = "t"

// maxVariables and maxWiener bound what is accepted as a model.
const (
	maxVariables = 256
	maxWiener    = 256
)

// wiener returns the number of Wiener processes.
func (m *Model) wiener() int {
	if len(m.Noise) == 0 {
		return 0
	}
	return len(m.Noise[0])
}

// names returns the names of the variables.
func (m *Model) names() []string {
	s := make([]string, len(m.Variables))
	for i, v := range m.Variables {
		s[i] = v.Name
	}
	return s
}

// observables returns the observables after the default.
func (m *Model) observables() []Observable {
	if len(m.Observables) > 0 {
		return m.Observables
	}
	var list []Observable
	for _, v := range m.Variables {
		if !v.Fast {
			list = append(list, Observable{v.Name, m.Graph.Input(v.Name)})
		}
	}
	if len(list) == 0 {
		for _, v := range m.Variables {
			list = append(list, Observable{v.Name, m.Graph.Input(v.Name)})
		}
	}
	return list
}

// ObservableNames returns the names of what is observed, after the default.
func (m *Model) ObservableNames() []string {
	var s []string
	for _, o := range m.observables() {
		s = append(s, o.Name)
	}
	return s
}

// Check reports everything that is wrong with the model.
func (m *Model) Check() error {
	if m.Graph == nil {
		return errors.New("ensemble: the model has no graph")
	}
	n := len(m.Variables)
	if n == 0 || n > maxVariables {
		return fmt.Errorf("ensemble: %d variables; between 1 and %d are possible", n, maxVariables)
	}
	if len(m.Drift) != n || len(m.Noise) != n {
		return fmt.Errorf("ensemble: %d variables but %d drifts and %d rows of noise", n, len(m.Drift), len(m.Noise))
	}
	if m.wiener() > maxWiener {
		return fmt.Errorf("ensemble: %d Wiener processes; at most %d are possible", m.wiener(), maxWiener)
	}
	var errs []error
	for i, v := range m.Variables {
		if len(m.Noise[i]) != m.wiener() {
			errs = append(errs, fmt.Errorf("ensemble: the noise of %q has %d columns, that of %q has %d", v.Name, len(m.Noise[i]), m.Variables[0].Name, m.wiener()))
		}
		errs = append(errs, v.check())
		for j := range i {
			if m.Variables[j].Name == v.Name {
				errs = append(errs, fmt.Errorf("ensemble: two variables are called %q", v.Name))
			}
		}
	}
	if len(m.Wiener) != 0 && len(m.Wiener) != m.wiener() {
		errs = append(errs, fmt.Errorf("ensemble: %d names for %d Wiener processes", len(m.Wiener), m.wiener()))
	}
	if math.IsNaN(m.Eps) || m.Eps < 0 || math.IsInf(m.Eps, 0) {
		errs = append(errs, fmt.Errorf("ensemble: the scale parameter is %v; it must be positive, or 0 for a limit", m.Eps))
	}
	errs = append(errs, m.checkSpheres(), m.checkInputs())
	return errors.Join(errs...)
}

func (v Variable) check() error {
	d := v.Domain
	switch d.Kind {
	case Periodic, Reflecting, Absorbing:
		if !(d.Lo < d.Hi) || math.IsInf(d.Hi-d.Lo, 0) {
			return fmt.Errorf("ensemble: variable %q: the domain [%v, %v] is empty or unbounded", v.Name, d.Lo, d.Hi)
		}
		if !(v.Start >= d.Lo && v.Start <= d.Hi) {
			return fmt.Errorf("ensemble: variable %q starts at %v, outside [%v, %v]", v.Name, v.Start, d.Lo, d.Hi)
		}
		if d.Kind == Absorbing && (v.Start == d.Lo || v.Start == d.Hi) {
			return fmt.Errorf("ensemble: variable %q starts at its absorbing end %v", v.Name, v.Start)
		}
	case HalfLine:
		if !(v.Start > 0) {
			return fmt.Errorf("ensemble: variable %q lives on (0, inf) and starts at %v", v.Name, v.Start)
		}
	case Line, Circle, Sphere:
	default:
		return fmt.Errorf("ensemble: variable %q: unknown domain %v", v.Name, d.Kind)
	}
	if math.IsNaN(v.Start) || math.IsInf(v.Start, 0) {
		return fmt.Errorf("ensemble: variable %q starts at %v", v.Name, v.Start)
	}
	return nil
}

// spheres returns the index of the first component of each unit vector.
func (m *Model) spheres() []int {
	var first []int
	for i := 0; i < len(m.Variables); i++ {
		if m.Variables[i].Domain.Kind == Sphere {
			first = append(first, i)
			i += 2
		}
	}
	return first
}

func (m *Model) checkSpheres() error {
	for _, i := range m.spheres() {
		if i+2 >= len(m.Variables) || m.Variables[i+1].Domain.Kind != Sphere || m.Variables[i+2].Domain.Kind != Sphere {
			return fmt.Errorf("ensemble: variable %q is on a sphere without two further components after it", m.Variables[i].Name)
		}
		a, b, c := m.Variables[i].Start, m.Variables[i+1].Start, m.Variables[i+2].Start
		if r := math.Sqrt(a*a + b*b + c*c); math.Abs(r-1) > 1e-9 {
			return fmt.Errorf("ensemble: the start of the unit vector that begins with %q has length %v", m.Variables[i].Name, r)
		}
	}
	return nil
}

// checkInputs finds parameters without numbers.
func (m *Model) checkInputs() error {
	var nodes []kernel.Node
	nodes = append(nodes, m.Drift...)
	for _, row := range m.Noise {
		nodes = append(nodes, row...)
	}
	for _, o := range m.Observables {
		nodes = append(nodes, o.Value)
	}
	var errs []error
	for _, name := range m.Graph.Inputs() {
		if slices.Contains(m.names(), name) || name == TimeInput {
			continue
		}
		x, ok := m.Parameters[name]
		used := slices.ContainsFunc(nodes, func(y kernel.Node) bool { return m.Graph.DependsOn(y, name) })
		switch {
		case !ok && used:
			errs = append(errs, fmt.Errorf("ensemble: the parameter %q has no number", name))
		case ok && (math.IsNaN(x) || math.IsInf(x, 0)):
			errs = append(errs, fmt.Errorf("ensemble: the parameter %q is %v", name, x))
		}
	}
	return errors.Join(append(errs, m.Graph.Err())...)
}

// bound is a Model with numbers for its parameters, in a graph of its own.
type bound struct {
	graph  *kernel.Builder
	state  []kernel.Node
	drift  []kernel.Node
	noise  [][]kernel.Node
	values []kernel.Node // of the observables
}

// bind copies the model into a fresh graph.
func (m *Model) bind() (*bound, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	b := &bound{graph: kernel.NewBuilder(m.names()...)}
	for _, name := range m.names() {
		b.state = append(b.state, b.graph.Input(name))
	}
	bindings := map[string]kernel.Node{}
	for name, x := range m.Parameters {
		if !slices.Contains(m.names(), name) {
			bindings[name] = b.graph.Const(x)
		}
	}
	b.drift = b.graph.Import(m.Graph, m.Drift, bindings)
	for _, row := range m.Noise {
		b.noise = append(b.noise, b.graph.Import(m.Graph, row, bindings))
	}
	for _, o := range m.observables() {
		b.values = append(b.values, b.graph.Import(m.Graph, []kernel.Node{o.Value}, bindings)...)
	}
	return b, b.graph.Err()
}

// at returns the nodes with the variables, and time, replaced.
func (b *bound) at(m *Model, nodes, state []kernel.Node, time kernel.Node) []kernel.Node {
	bindings := map[string]kernel.Node{TimeInput: time}
	for i, v := range m.Variables {
		bindings[v.Name] = state[i]
	}
	return b.graph.Import(b.graph, nodes, bindings)
}
