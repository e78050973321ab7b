package fast

import (
	"errors"
	"fmt"
	"strings"
)

// ErrBudget is returned by a route when the next level would not fit the
// budget of memory.
var ErrBudget = errors.New("the next resolution does not fit the budget")

// NotErgodic says that the fast process has no stationary law or more than
// one.
type NotErgodic struct {
	// Reason is a sentence.
	Reason string
	// Components names the stationary laws where there are several.
	Components []string
	// Mend says what would help, when that is known.
	Mend string
}

func (e *NotErgodic) Error() string {
	s := "fast process is not ergodic: " + e.Reason
	if len(e.Components) > 0 {
		s += "; stationary laws: " + strings.Join(e.Components, "; ")
	}
	if e.Mend != "" {
		s += " (" + e.Mend + ")"
	}
	return s
}

// Divergent says that an average over the stationary law is infinite.
type Divergent struct {
	// Quantity is what was averaged.
	Quantity string
	// Where is the end at which the integral diverges.
	Where string
	// Exponent is p where the integrand behaves as d^p near a finite end (d the
	// distance; divergent for p <= -1) or as |y|^p at infinity (divergent for
	// p >= -1).
	Exponent float64
}

func (e *Divergent) Error() string {
	return fmt.Sprintf("average of %s diverges at %s: the integrand there is like a power with exponent %.6g", e.Quantity, e.Where, e.Exponent)
}

// Undefined says that a coefficient has no finite value at a place of the
// domain.
type Undefined struct {
	Coefficient string
	At          []float64
	Value       float64
}

func (e *Undefined) Error() string {
	return fmt.Sprintf("%s is %v at y = %v, inside the fast domain", e.Coefficient, e.Value, e.At)
}

// NotSettled says that the budget ended before the answer stopped changing.
// Value is the best that was found, with its honest error.
type NotSettled struct {
	Quantity   string
	Value      Value
	Tolerance  float64
	Resolution string
}

func (e *NotSettled) Error() string {
	return fmt.Sprintf("%s has not settled at %s: %.10g with error %.2g, relative tolerance %.2g", e.Quantity, e.Resolution, e.Value.Value, e.Value.Error, e.Tolerance)
}

// Unsupported says that a route does not apply to a problem.
type Unsupported struct {
	Method, Reason string
}

func (e *Unsupported) Error() string { return e.Method + " does not apply: " + e.Reason }
