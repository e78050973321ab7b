// Package cell solves the fast problem: for a generator L0 that acts on the
// fast variables alone and a function f it finds the corrector Phi and the
// average <f> with L0 Phi = <f> - f.
//
// It owns the exact route (closure), the checks that a fast process has one
// stationary law, and the interface behind which other routes stand. It
// imports generator and generator/algebra.
package cell

import (
	"context"
	"errors"
	"fmt"

	"epslim/generator"
	"epslim/generator/algebra"
)

// DomainKind is the kind of domain of a fast variable.
type DomainKind uint8

// The domains of fast variables.
const (
	Line DomainKind = iota
	HalfLine
	Circle     // period 2 pi
	Periodic   // interval [A, B] with its ends identified
	Reflecting // interval [A, B]
	SpherePart // a component of a unit vector in R^3
)

// Variable is a fast variable with its domain; A and B are used by intervals.
type Variable struct {
	Name   string
	Kind   DomainKind
	A, B   algebra.Expr
	Sphere int // index of the sphere for SpherePart
}

// Process is a fast process: L0 in all variables of the system (it must
// differentiate in the fast ones only) and the domains.
type Process struct {
	Ring *algebra.Ring
	L0   *generator.Operator
	Fast []Variable
}

// Names of the fast variables.
func (p *Process) Names() []string {
	out := make([]string, len(p.Fast))
	for i, v := range p.Fast {
		out[i] = v.Name
	}
	return out
}

// Spheres lists the triples of components of unit vectors.
func (p *Process) Spheres() [][3]string {
	var out [][3]string
	for i := 0; i+2 < len(p.Fast); i++ {
		if p.Fast[i].Kind == SpherePart {
			out = append(out, [3]string{p.Fast[i].Name, p.Fast[i+1].Name, p.Fast[i+2].Name})
			i += 2
		}
	}
	return out
}

// Reduce brings an expression to the canonical representative on spheres:
// the third component occurs at most to the first power.
func (p *Process) Reduce(e algebra.Expr) algebra.Expr {
	for _, s := range p.Spheres() {
		a, _ := p.Ring.Symbol(s[0])
		b, _ := p.Ring.Symbol(s[1])
		e = e.ReduceSquare(s[2], p.Ring.Int(1).Sub(a.Mul(a)).Sub(b.Mul(b)))
	}
	return e
}

// Drift and Diffusion are the coefficients of L0 = f.grad + 1/2 a:Hess in the
// fast variables, i and j counting fast variables.
func (p *Process) Drift(i int) algebra.Expr {
	return p.L0.Coef(p.index(i)...)
}

// Diffusion is a_ij (see Drift).
func (p *Process) Diffusion(i, j int) algebra.Expr {
	c := p.L0.Coef(p.index(i, j)...)
	if i == j {
		return c.Mul(p.Ring.Int(2))
	}
	return c
}

func (p *Process) index(which ...int) []int {
	idx := make([]int, len(p.L0.Vars()))
	for _, i := range which {
		for k, v := range p.L0.Vars() {
			if v == p.Fast[i].Name {
				idx[k]++
			}
		}
	}
	return idx
}

// Solution is a corrector and an average: L0 Phi = Mean - f.
type Solution struct {
	Phi  algebra.Expr
	Mean algebra.Expr
}

// Route solves fast problems in one way.
type Route interface {
	// Name is "closure", "quadrature", "spectral" or "grid".
	Name() string
	// Solve returns the corrector and the average of f, or ErrDoesNotApply
	// (wrapped, with the reason) where the route is of no use for f.
	Solve(ctx context.Context, f algebra.Expr) (Solution, error)
	// Mean is the average alone, which needs no sum of correctors.
	Mean(ctx context.Context, f algebra.Expr) (algebra.Expr, error)
	// Conditions lists what the solutions so far need beyond the declared
	// assumptions, as quantities that must not vanish.
	Conditions() []algebra.Expr
}

// ErrDoesNotApply reports that a route cannot solve the problem at hand.
var ErrDoesNotApply = errors.New("the route does not apply")

func doesNotApply(format string, args ...any) error {
	return fmt.Errorf("%w: %s", ErrDoesNotApply, fmt.Sprintf(format, args...))
}

// Residual is L0 Phi + f - <f>, reduced on spheres: identically zero for a
// correct solution.
func (p *Process) Residual(f algebra.Expr, s Solution) algebra.Expr {
	return p.Reduce(p.L0.Apply(s.Phi).Add(f).Sub(s.Mean))
}
