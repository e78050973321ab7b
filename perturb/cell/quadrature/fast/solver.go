package fast

import "context"

// Value is a number with what is known about it.
type Value struct {
	// Value is the number.
	Value float64
	// Error is an estimate of its absolute error: the change between two
	// resolutions plus an estimate of rounding.
	Error float64
	// Rounding is the part of Error that comes from rounding and that no
	// resolution can lower.
	Rounding float64
	// Scale is the size of what was averaged, <|g|> or a norm of g. Tolerances
	// are relative to it, so that a mean that vanishes by symmetry can settle.
	Scale float64
}

// Function is a handle to a function of the fast variables that lives in the
// solver that made it.
type Function struct {
	owner *Engine
	id    int
}

// Scaled is a term of a linear combination.
type Scaled struct {
	Factor   float64
	Function Function
}

// Solver is a fast problem ready to be averaged over and solved. A solver is
// not safe for concurrent use.
type Solver interface {
	// Coefficient makes a coefficient a function.
	Coefficient(c Coefficient) Function
	// Sum is a linear combination.
	Sum(terms ...Scaled) Function
	// Apply applies an operator.
	Apply(op Operator, u Function) Function
	// Product multiplies two functions. The spectral route multiplies by
	// quadrature, so prefer Apply(Multiply(c), u) where one is a coefficient.
	Product(u, v Function) Function
	// Mean is the average of g over the stationary law.
	Mean(ctx context.Context, g Function) (Value, error)
	// Solve returns Phi with L0 Phi = -(g - <g>), <Phi> = 0, and <g>. The mean
	// is settled (its change is below the tolerance or below rounding) when Solve returns; Phi is recomputed at whatever resolution
	// later averages need.
	Solve(ctx context.Context, g Function) (Function, Value, error)
	// At evaluates a function at a block of points, y[i][k] being coordinate i
	// of point k.
	At(ctx context.Context, u Function, y [][]float64) ([]float64, error)
	// Density is the stationary density at a block of points, with respect to
	// Lebesgue measure (surface measure, of total mass 4 pi, on a sphere).
	Density(ctx context.Context, y [][]float64) ([]float64, error)
	// Report says what was done.
	Report() Report
}

// Report says how a solver worked, for the reader of a result.
type Report struct {
	// Method is "quadrature", "spectral" or "grid".
	Method string
	// Resolution describes the finest discretisation used.
	Resolution string
	// Unknowns is its size.
	Unknowns int
	// Notes are remarks: how ends were classified, which basis was fitted.
	Notes []string
}
