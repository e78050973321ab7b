package fokkerplanck

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// solveBudget bounds the search for a closed form, in term operations.
const solveBudget = 80_000_000

// Solve looks for the stationary law: with functions left as names first,
// then with their formulas, then with the values of the parameters.
func (d *Diffusion) Solve(ctx context.Context) (*Stationary, error) {
	for _, v := range d.Slow {
		if v.Kind == ito.Absorbing {
			return &Stationary{
				Why:    "mass leaves through the absorbing sides of " + v.Name + ": there is no stationary density",
				Normal: No, NormalWhy: "all mass is absorbed in the end",
			}, nil
		}
	}
	var out *Stationary
	err := d.Ring.WithBudget(solveBudget, func() error {
		var err error
		out, err = d.solve(ctx)
		return err
	})
	if errors.Is(err, algebra.ErrTooLarge) {
		return &Stationary{Why: "the expressions outgrew the budget; the density is left to the grid"}, nil
	}
	return out, err
}

func (d *Diffusion) solve(ctx context.Context) (*Stationary, error) {
	first, err := d.attempt(ctx)
	if err != nil {
		return nil, err
	}
	best := first
	for _, level := range []struct{ formulas, values bool }{{true, false}, {true, true}} {
		if best.Density.Valid() && !best.integral() && best.Reversible == Yes {
			break
		}
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if len(d.Formulas) == 0 && !level.values || len(d.Values) == 0 && level.values {
			continue
		}
		e, err := d.with(level.formulas, level.values)
		if err != nil {
			continue // the values lie where the limit is not defined
		}
		s, err := e.attempt(ctx)
		if err != nil {
			return nil, err
		}
		s.WithFormulas, s.WithValues = level.formulas, level.values
		best = better(best, s)
	}
	d.finish(best)
	return best, nil
}

// better prefers what is known in general over what is known for particular
// formulas and values, and takes the rest from the particular.
func better(a, b *Stationary) *Stationary {
	switch {
	case b.Reversible == Yes && a.Reversible != Yes:
		which := "for the formulas given"
		if b.WithValues {
			which = "for the values of the parameters given"
		}
		b.Why += " " + which + ", not in general"
		if a.Density.Valid() {
			a.Reversible, a.Why = Yes, b.Why
			return a
		}
		return b
	case a.Reversible == Unknown && b.Reversible != Unknown:
		if a.Density.Valid() && b.Reversible != No {
			a.Reversible, a.Why = b.Reversible, b.Why
			return a
		}
		return b
	case a.integral() && b.Density.Valid() && !b.integral():
		return b
	case !a.Density.Valid() && b.Density.Valid():
		b.Reversible, b.Curl, b.CurlAt, b.Why, b.H = a.Reversible, a.Curl, a.CurlAt, a.Why, a.H
		return b
	}
	return a
}

// integral reports a density that keeps an integral by name; a closed form for
// particular formulas is preferred to it.
func (s *Stationary) integral() bool { return s.How == howIntegral }

const howIntegral = "integrating factor, with an integral left"

// attempt works with the coefficients as they are.
func (d *Diffusion) attempt(ctx context.Context) (*Stationary, error) {
	s := &Stationary{}
	zeroA := true
	for _, row := range d.A {
		for _, a := range row {
			zeroA = zeroA && a.IsZero()
		}
	}
	if zeroA {
		s.Why = "the limit is deterministic"
		return s, nil
	}
	h, ok, err := d.force()
	if err != nil {
		return nil, err
	}
	if !ok {
		s.Why = "sigma sigma^T is singular: the potential condition does not apply"
		d.irreversible(s)
		return s, nil
	}
	s.H = h
	s.Curl, s.CurlAt = d.curl(ctx, h)
	if !s.Curl.IsZero() {
		s.Reversible = No
		s.Why = fmt.Sprintf("h = A^-1 (2 f - div A) is no gradient: its curl in (%s, %s) does not vanish", s.CurlAt[0], s.CurlAt[1])
		d.irreversible(s)
		return s, nil
	}
	d.reversible(ctx, s)
	return s, nil
}

// reversible handles a curl-free h: the density is the exponential of its
// potential, provided that this is single-valued.
func (d *Diffusion) reversible(ctx context.Context, s *Stationary) {
	u, err := d.Ring.PotentialIn(s.H, d.names(), d.inside())
	how := "potential of h in closed form"
	if err != nil && len(d.Slow) == 1 {
		u, how, err = d.integrate(s.H[0])
	}
	if err != nil {
		// A gradient by its curl; with periodic variables it may still be
		// multivalued.
		if len(d.periods()) == 0 {
			s.Reversible, s.Why = Yes, "h is a gradient; its potential was not found in closed form"
		} else {
			s.Why = "h is curl-free; whether its potential is single-valued is not decided in closed form"
		}
		return
	}
	truth, v, jump := d.singleValued(u)
	switch truth {
	case Yes:
		s.Reversible, s.Why = Yes, "h is the gradient of a single-valued potential"
	case No:
		d.multivalued(ctx, s, v, jump)
		if s.Reversible != Yes {
			return
		}
	default:
		s.Why = "whether the potential is single-valued is not decided"
		return
	}
	p, err := d.Ring.Call("exp", u)
	if err != nil {
		return
	}
	s.Density, s.How = p, how
}

// inside is a point in the domain, as far as that has ends.
func (d *Diffusion) inside() map[string]algebra.Expr {
	out := map[string]algebra.Expr{}
	for _, v := range d.Slow {
		if v.A.Valid() && v.B.Valid() {
			out[v.Name] = v.A.Add(v.B).Mul(d.Ring.Frac(1, 2))
		} else if v.Kind == ito.HalfLine {
			out[v.Name] = d.Ring.Int(1)
		}
	}
	return out
}

// multivalued decides by numbers when the jump of the potential over a
// period is no closed zero.
func (d *Diffusion) multivalued(ctx context.Context, s *Stationary, v string, jump algebra.Expr) {
	s.Why = fmt.Sprintf("the potential of h changes by %s over a period of %s: the density is not exp of it unless that vanishes", jump, v)
	x, err := d.jump(ctx, s.H, jump)
	switch {
	case err != nil:
		s.Reversible = Unknown
	case x != 0 && math.Abs(x) > 1e-9:
		s.Reversible = No
		s.Why = fmt.Sprintf("the potential of h changes by %.10g over a period of %s, so it is not single-valued: a current runs around", x, v)
	default:
		s.Reversible = Yes
		s.Why = fmt.Sprintf("the potential of h returns to its value over a period of %s (numerically, to %.1g)", v, x)
	}
}

// jump is the change of the potential over a period, as a number: from the
// closed form where that has a value, else in one dimension as the integral of
// h over the period by the trapezoidal rule, which converges geometrically for
// smooth periodic h.
func (d *Diffusion) jump(ctx context.Context, h []algebra.Expr, closed algebra.Expr) (float64, error) {
	if x, err := numeric(closed); err == nil {
		return x, nil
	}
	if len(d.Slow) != 1 {
		return 0, errors.New("no numbers")
	}
	number := d.Number
	if number == nil {
		number = func(_ context.Context, e algebra.Expr, at map[string]float64) (float64, error) {
			return e.EvalFloat(at)
		}
	}
	v := d.Slow[0]
	period, err := number(ctx, d.periods()[v.Name], nil)
	if err != nil {
		return 0, err
	}
	start := 0.0
	if v.A.Valid() {
		if start, err = number(ctx, v.A, nil); err != nil {
			return 0, err
		}
	}
	sum := func(n int) (s, size float64, err error) {
		for k := 0; k < n; k++ {
			y, err := number(ctx, h[0], map[string]float64{v.Name: start + period*(float64(k)+0.5)/float64(n)})
			if err != nil {
				return 0, 0, err
			}
			s += y * period / float64(n)
			size += math.Abs(y) * period / float64(n)
		}
		return s, size, nil
	}
	old, _, err := sum(16)
	if err != nil {
		return 0, err
	}
	for n := 32; n <= 512; n *= 2 {
		s, size, err := sum(n)
		if err != nil {
			return 0, err
		}
		if math.Abs(s-old) <= 1e-11*size+1e-13 {
			if math.Abs(s) <= 1e-10*size {
				return 0, nil
			}
			return s, nil
		}
		old = s
	}
	return 0, errors.New("the integral over the period has not settled")
}

// integrate is the one-dimensional integrating factor: what has a closed
// antiderivative is taken in closed form, the rest is kept as one named
// integral.
func (d *Diffusion) integrate(h algebra.Expr) (algebra.Expr, string, error) {
	r := d.Ring
	v := d.Slow[0]
	u, rest := r.Int(0), r.Int(0)
	parts, err := h.SplitReal(v.Name)
	if err != nil {
		return u, "", err
	}
	for _, t := range parts {
		g := t.Coef.Mul(t.Fn)
		w, err := r.Potential([]algebra.Expr{g}, []string{v.Name})
		if err != nil {
			rest = rest.Add(g)
			continue
		}
		u = u.Add(w)
	}
	if rest.IsZero() {
		return u, "integrating factor", nil
	}
	lo := r.Int(0)
	if v.A.Valid() {
		lo = v.A
	} else if v.Kind == ito.HalfLine {
		lo = r.Int(1)
	}
	x, _ := r.Symbol(v.Name)
	name := "s"
	for _, ok := r.Symbol(name); ok; _, ok = r.Symbol(name) {
		name += "_"
	}
	dummy := r.Declare(name, algebra.Attr{})
	f, err := rest.Subs(map[string]algebra.Expr{v.Name: dummy})
	if err != nil {
		return u, "", err
	}
	return u.Add(r.Integral(f, name, lo, x)), howIntegral, nil
}

// irreversible tries closed forms for a density with a current.
func (d *Diffusion) irreversible(s *Stationary) {
	if p, ok := d.gaussian(); ok {
		s.Density, s.How = p, "Gaussian from the Lyapunov equation"
		return
	}
	try := func(p algebra.Expr, how string) bool {
		if s.Density.Valid() || !d.Residual(p).IsZero() {
			return false
		}
		if t, _, _ := d.singleValued(p); t == Yes {
			s.Density, s.How = p, how
			return true
		}
		return false
	}
	if try(d.Ring.Int(1), "the constant solves the stationary equation") {
		return
	}
	if s.H == nil {
		return
	}
	us, err := d.Ring.MatchGradient(s.H, d.names())
	if err != nil || len(us) == 0 {
		return
	}
	sum := d.Ring.Int(0)
	for _, u := range us {
		sum = sum.Add(u)
	}
	for _, u := range append([]algebra.Expr{sum}, us...) {
		if p, err := d.Ring.Call("exp", u); err == nil && try(p, "the gradient part of h; the rest drives a current without divergence") {
			return
		}
	}
}

// finish adds the current and the question of normalisation.
func (d *Diffusion) finish(s *Stationary) {
	if !s.Density.Valid() {
		return
	}
	e := d
	if s.WithFormulas || s.WithValues {
		if f, err := d.with(s.WithFormulas, s.WithValues); err == nil {
			e = f
		}
	}
	s.Current = e.Current(s.Density)
	positive, why, conds := d.positive(s.Density)
	s.Conditions = conds
	if positive == No {
		s.Normal, s.NormalWhy = No, why
	} else if s.Normal, s.NormalWhy = d.normalisable(s.Density); s.Normal == Yes && positive == Unknown && len(conds) > 0 {
		s.Normal, s.NormalWhy = Unknown, "it needs "+strings.Join(conds, ", ")
	}
	if s.Normal == No && s.How == "the constant solves the stationary equation" && s.Reversible == No {
		// On an unbounded domain the constant says nothing then.
		s.Density, s.How, s.Current = algebra.Expr{}, "", nil
		s.Normal, s.NormalWhy = Unknown, ""
	}
}
