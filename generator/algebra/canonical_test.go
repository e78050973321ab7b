package algebra

import (
	"fmt"
)

// checkCanonical states the canonical form as a predicate.
func checkCanonical(e Expr) error {
	return checkCanonicalIn(e, map[*kernel]bool{})
}

func checkCanonicalIn(e Expr, seen map[*kernel]bool) error {
	r := e.n.r
	if err := checkPoly(e.n.num); err != nil {
		return fmt.Errorf("numerator of %s: %w", e, err)
	}
	if len(e.n.num) == 0 && len(e.n.den) > 0 {
		return fmt.Errorf("zero over a denominator")
	}
	for i, f := range e.n.den {
		if err := checkFactor(r, f); err != nil {
			return fmt.Errorf("denominator of %s: %w", e, err)
		}
		if i > 0 && e.n.den[i-1].f.key >= f.f.key {
			return fmt.Errorf("denominator of %s is not sorted", e)
		}
		for _, g := range e.n.den[:i] {
			if d := r.gcdPoly(f.f.p, g.f.p); len(d) > 1 {
				return fmt.Errorf("denominator factors of %s share %s", e, r.fromPoly(d))
			}
		}
		if d := r.gcdPoly(r.divMono(e.n.num, r.monoContent(e.n.num)), f.f.p); len(d) > 1 {
			return fmt.Errorf("numerator and denominator of %s share %s", e, r.fromPoly(d))
		}
	}
	var err error
	e.eachKernel(func(k *kernel) {
		if seen[k] || err != nil {
			return
		}
		seen[k] = true
		if k.kind == kindTrig {
			err = fmt.Errorf("%s holds a kernel of printed forms", e)
		}
		for _, a := range k.args {
			if err == nil {
				err = checkCanonicalIn(a, seen)
			}
		}
	})
	return err
}

func checkPoly(p poly) error {
	for i, t := range p {
		if t.c.isZero() {
			return fmt.Errorf("zero coefficient")
		}
		if t.m.needs {
			return fmt.Errorf("algebraic kernel out of range")
		}
		if i > 0 && compareMono(p[i-1].m, t.m) <= 0 {
			return fmt.Errorf("terms out of order")
		}
		for j, q := range t.m.p {
			if q.e.isZero() || q.e.d < 1 || gcd64(int64(q.e.n), int64(q.e.d)) != 1 {
				return fmt.Errorf("exponent %d/%d", q.e.n, q.e.d)
			}
			if j > 0 && compareKernels(t.m.p[j-1].k, q.k) >= 0 {
				return fmt.Errorf("kernels out of order")
			}
		}
	}
	return nil
}

func checkFactor(r *Ring, f denFactor) error {
	p := f.f.p
	if err := checkPoly(p); err != nil {
		return err
	}
	if f.e < 1 || len(p) < 2 {
		return fmt.Errorf("factor %s to the power %d", r.fromPoly(p), f.e)
	}
	if !r.monoContent(p).isOne() {
		return fmt.Errorf("monomial content in %s", r.fromPoly(p))
	}
	if !numContent(p).isOne() {
		return fmt.Errorf("numerical content in %s", r.fromPoly(p))
	}
	if f.f.key != p.key() || r.factors[f.f.key] != f.f {
		return fmt.Errorf("factor %s is not interned", r.fromPoly(p))
	}
	return nil
}
