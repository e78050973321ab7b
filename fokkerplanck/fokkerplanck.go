// Package fokkerplanck owns the forward side of a limiting diffusion: the
// Fokker-Planck operator, the probability current, the test of reversibility,
// and the stationary density in closed form where there is one. It imports
// generator, generator/ito (for the kinds of domains) and generator/algebra.
//
// Conventions: dX = f dt + sigma dW in the Ito sense, A = sigma sigma^T,
// current J_i = f_i p - 1/2 sum_j d_j (A_ij p), d_t p = -div J.
//
// Literature: H. Risken, The Fokker-Planck Equation (1989), sections 4.7, 5.2
// and 6.2-6.5; C. Gardiner, Stochastic Methods (2009), sections 5.2 and 6.2;
// G.A. Pavliotis, Stochastic Processes and Applications (2014), ch. 4;
// citations from memory.
package fokkerplanck

import (
	"context"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// Variable is a slow variable with its domain.
type Variable struct {
	Name string
	Kind ito.DomainKind
	A, B algebra.Expr // ends of intervals
}

// Diffusion is a limiting SDE with what is known to evaluate it.
type Diffusion struct {
	Ring  *algebra.Ring
	Slow  []Variable
	Drift []algebra.Expr
	A     [][]algebra.Expr
	// Formulas of named functions and values of parameters, for what cannot
	// be decided with names alone.
	Formulas map[string]algebra.FuncDef
	Values   map[string]algebra.Expr
	// Number evaluates an expression at slow values, with formulas and values
	// put in; it must know averages that are known by name only. Nil leaves
	// everything numerical undecided.
	Number func(ctx context.Context, e algebra.Expr, at map[string]float64) (float64, error)
	// Vanishes decides whether an expression with such names is zero
	// everywhere; nil takes the canonical form.
	Vanishes func(ctx context.Context, e algebra.Expr) bool
}

func (d *Diffusion) vanishes(ctx context.Context, e algebra.Expr) bool {
	if e.IsZero() {
		return true
	}
	return d.Vanishes != nil && d.Vanishes(ctx, e)
}

func (d *Diffusion) names() []string {
	out := make([]string, len(d.Slow))
	for i, v := range d.Slow {
		out[i] = v.Name
	}
	return out
}

// Truth is yes, no or not known.
type Truth uint8

// The truth values.
const (
	Unknown Truth = iota
	Yes
	No
)

// Stationary is what was found of the stationary law.
type Stationary struct {
	Reversible Truth
	Why        string // for reversibility: the reason in a sentence
	Curl       algebra.Expr
	CurlAt     [2]string // the two variables of the curl component shown
	H          []algebra.Expr
	Density    algebra.Expr // up to a constant factor; not Valid if unknown
	How        string       // how the density was found
	Normal     Truth        // can the density be normalised on the domain?
	NormalWhy  string
	Current    []algebra.Expr // of Density; all zero when reversible
	// WithFormulas and WithValues tell that the named functions were replaced
	// by their formulas, and the parameters by their values.
	WithFormulas, WithValues bool
	Conditions               []string // what the density needs, in words
}

// Current is J_i for a density p.
func (d *Diffusion) Current(p algebra.Expr) []algebra.Expr {
	half := d.Ring.Frac(1, 2)
	out := make([]algebra.Expr, len(d.Slow))
	for i := range d.Slow {
		out[i] = d.Drift[i].Mul(p)
		for j, v := range d.Slow {
			if !d.A[i][j].IsZero() {
				out[i] = out[i].Sub(half.Mul(d.A[i][j].Mul(p).Diff(v.Name)))
			}
		}
	}
	return out
}

// Residual is div J for a density p: zero when p is stationary.
func (d *Diffusion) Residual(p algebra.Expr) algebra.Expr {
	out := d.Ring.Int(0)
	for i, j := range d.Current(p) {
		out = out.Add(j.Diff(d.Slow[i].Name))
	}
	return out
}

// with replaces functions by formulas, and parameters by values.
func (d *Diffusion) with(formulas, values bool) (*Diffusion, error) {
	out := &Diffusion{Ring: d.Ring, Slow: append([]Variable(nil), d.Slow...), Formulas: d.Formulas, Values: d.Values, Number: d.Number, Vanishes: d.Vanishes}
	sub := func(e algebra.Expr) (algebra.Expr, error) {
		var err error
		if formulas {
			if e, err = e.SubsFunc(d.Formulas); err != nil {
				return e, err
			}
		}
		if values {
			e, err = e.Subs(d.Values)
		}
		return e, err
	}
	for _, f := range d.Drift {
		g, err := sub(f)
		if err != nil {
			return nil, err
		}
		out.Drift = append(out.Drift, g)
	}
	for _, row := range d.A {
		var r []algebra.Expr
		for _, a := range row {
			b, err := sub(a)
			if err != nil {
				return nil, err
			}
			r = append(r, b)
		}
		out.A = append(out.A, r)
	}
	for i, v := range out.Slow {
		if !v.A.Valid() || !values {
			continue
		}
		var err error
		if out.Slow[i].A, err = v.A.Subs(d.Values); err != nil {
			return nil, err
		}
		if out.Slow[i].B, err = v.B.Subs(d.Values); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// symbolsLeft reports whether formulas or values are still missing in e.
func symbolsLeft(e algebra.Expr, names []string) bool {
	for _, s := range e.Symbols() {
		if s == "pi" {
			continue
		}
		known := false
		for _, n := range names {
			known = known || n == s
		}
		if !known {
			return true
		}
	}
	return false
}

// force is h = A^-1 (2 f - div A), whose being a gradient is the potential
// condition (Risken 1989, section 6.2). ok is false for singular A.
func (d *Diffusion) force() (h []algebra.Expr, ok bool, err error) {
	n := len(d.Slow)
	rhs := make([]algebra.Expr, n)
	for i := range rhs {
		rhs[i] = d.Drift[i].Mul(d.Ring.Int(2))
		for j, v := range d.Slow {
			rhs[i] = rhs[i].Sub(d.A[i][j].Diff(v.Name))
		}
	}
	sol, err := algebra.SolveLinear(d.A, rhs)
	if err != nil || len(sol.Free) > 0 {
		return nil, false, nil
	}
	return sol.X, true, nil
}

// curl returns a non-zero component of the curl of h, or zero.
func (d *Diffusion) curl(ctx context.Context, h []algebra.Expr) (algebra.Expr, [2]string) {
	for i := range h {
		for j := i + 1; j < len(h); j++ {
			c := h[j].Diff(d.Slow[i].Name).Sub(h[i].Diff(d.Slow[j].Name))
			if !d.vanishes(ctx, c) {
				return c, [2]string{d.Slow[i].Name, d.Slow[j].Name}
			}
		}
	}
	return d.Ring.Int(0), [2]string{}
}

// periods are the periodic variables with their periods.
func (d *Diffusion) periods() map[string]algebra.Expr {
	out := map[string]algebra.Expr{}
	for _, v := range d.Slow {
		switch v.Kind {
		case ito.Periodic:
			out[v.Name] = v.B.Sub(v.A)
		case ito.Circle:
			out[v.Name] = d.Ring.Pi().Mul(d.Ring.Int(2))
		}
	}
	return out
}

// singleValued tells whether u takes the same value after each period.
func (d *Diffusion) singleValued(u algebra.Expr) (Truth, string, algebra.Expr) {
	for _, v := range d.Slow {
		period, ok := d.periods()[v.Name]
		if !ok || !u.DependsOn(v.Name) {
			continue
		}
		s, err := u.ShiftedBy(v.Name, period)
		if err != nil {
			return Unknown, v.Name, algebra.Expr{}
		}
		if jump := s.Sub(u); !jump.IsZero() {
			return No, v.Name, jump
		}
	}
	return Yes, "", algebra.Expr{}
}
