package fast

import (
	"fmt"
	"math"
)

// Kind is the kind of a domain.
type Kind uint8

const (
	// Line is the whole real line.
	Line Kind = iota
	// HalfLine is (0, inf). An end that can be reached reflects.
	HalfLine
	// Circle is [0, 2 pi) with ends identified.
	Circle
	// Periodic is [A, B) with ends identified.
	Periodic
	// Reflecting is [A, B] with reflection at ends that can be reached.
	Reflecting
	// Sphere is the unit sphere in R^3: three consecutive coordinates.
	Sphere
)

var kindNames = [...]string{"line", "half-line", "circle", "periodic interval", "reflecting interval", "sphere"}

func (k Kind) String() string {
	if int(k) < len(kindNames) {
		return kindNames[k]
	}
	return fmt.Sprintf("Kind(%d)", uint8(k))
}

// Domain is the domain of one fast variable, or of the three components of a
// unit vector.
type Domain struct {
	Kind Kind
	// A and B are the ends of a Periodic or Reflecting interval; not used by
	// the other kinds.
	A, B float64
	// Names are the names of the coordinates, for messages only.
	Names []string
}

// Coordinates returns how many coordinates the domain takes: 3 for a sphere,
// else 1.
func (d Domain) Coordinates() int {
	if d.Kind == Sphere {
		return 3
	}
	return 1
}

// Ends returns the ends of a one-dimensional domain, infinite where there are
// none. Those of a circle are 0 and 2 pi.
func (d Domain) Ends() (a, b float64) {
	switch d.Kind {
	case Line:
		return math.Inf(-1), math.Inf(1)
	case HalfLine:
		return 0, math.Inf(1)
	case Circle:
		return 0, 2 * math.Pi
	default:
		return d.A, d.B
	}
}

// IsPeriodic reports whether the ends of the domain are identified.
func (d Domain) IsPeriodic() bool { return d.Kind == Circle || d.Kind == Periodic }

// Name returns the name of coordinate i of the domain, "y" when none is given.
func (d Domain) Name(i int) string {
	if i < len(d.Names) && d.Names[i] != "" {
		return d.Names[i]
	}
	return "y"
}

// Problem is a fast generator at one fixed point of the slow variables. The
// coefficients are indexed by coordinate, domains in order.
type Problem struct {
	Domains []Domain
	// Drift has one entry a coordinate: f_i.
	Drift []Coefficient
	// Diffusion is the full symmetric matrix a = sigma sigma^T, one row a
	// coordinate. The generator contains 1/2 a_ij d_i d_j.
	Diffusion [][]Coefficient
}

// Coordinates returns the number of coordinates.
func (p *Problem) Coordinates() int {
	n := 0
	for _, d := range p.Domains {
		n += d.Coordinates()
	}
	return n
}

// Check verifies the shapes.
func (p *Problem) Check() error {
	n := p.Coordinates()
	if n == 0 {
		return fmt.Errorf("fast: a problem without variables")
	}
	if len(p.Drift) != n {
		return fmt.Errorf("fast: %d drift coefficients for %d coordinates", len(p.Drift), n)
	}
	if len(p.Diffusion) != n {
		return fmt.Errorf("fast: diffusion matrix has %d rows for %d coordinates", len(p.Diffusion), n)
	}
	for i, row := range p.Diffusion {
		if len(row) != n {
			return fmt.Errorf("fast: row %d of the diffusion matrix has %d entries for %d coordinates", i, len(row), n)
		}
	}
	for _, d := range p.Domains {
		if (d.Kind == Periodic || d.Kind == Reflecting) && !(d.A < d.B) {
			return fmt.Errorf("fast: interval [%g, %g] of %s is empty", d.A, d.B, d.Name(0))
		}
	}
	return nil
}

// Generator returns L0 itself as an operator.
func (p *Problem) Generator() Operator {
	n := p.Coordinates()
	var op Operator
	for i := 0; i < n; i++ {
		if !p.Drift[i].IsZero() {
			op = append(op, OperatorTerm{Coefficient: p.Drift[i], Order: unitOrder(n, i, -1)})
		}
	}
	for i := 0; i < n; i++ {
		for j := 0; j <= i; j++ {
			c := p.Diffusion[i][j]
			if c.IsZero() {
				continue
			}
			factor := 1.0
			if i == j {
				factor = 0.5
			}
			op = append(op, OperatorTerm{Coefficient: c.Times(factor), Order: unitOrder(n, i, j)})
		}
	}
	return op
}

func unitOrder(n, i, j int) []int {
	o := make([]int, n)
	o[i]++
	if j >= 0 {
		o[j]++
	}
	return o
}

// OperatorTerm is Coefficient(y) times a derivative; Order[i] is the number of
// derivatives in coordinate i (nil for none).
type OperatorTerm struct {
	Coefficient Coefficient
	Order       []int
}

// Total returns the order of the derivative.
func (t OperatorTerm) Total() int {
	s := 0
	for _, o := range t.Order {
		s += o
	}
	return s
}

// Operator is a sum of coefficient times derivative.
type Operator []OperatorTerm

// Multiply is the operator that multiplies by c.
func Multiply(c Coefficient) Operator { return Operator{{Coefficient: c}} }

// Derivative is the operator c(y) d^order.
func Derivative(c Coefficient, order ...int) Operator {
	return Operator{{Coefficient: c, Order: order}}
}
