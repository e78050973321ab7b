package algebra

import (
	"errors"
	"fmt"
	"math/big"
	"testing"
)

// agree fails when two expressions that must be equal are seen to differ.
func agree(what string, a, b Expr) error {
	for _, e := range []Expr{a, b} {
		if err := checkCanonical(e); err != nil {
			return fmt.Errorf("%s: %w", what, err)
		}
	}
	if v := a.Sub(b).ZeroTest(); v == VerdictNonZero {
		return fmt.Errorf("%s: %s and %s differ", what, a, b)
	}
	return nil
}

func checkOperations(r *Ring, e, s Expr) error {
	x, _ := r.Symbol("x")
	sum, prod := r.Int(0), r.Int(0)
	for _, t := range e.Summands() {
		sum = sum.Add(t)
	}
	num, den := e.NumDen()
	for _, f := range e.SplitBy("x") {
		if f.Coef.DependsOn("x") {
			return fmt.Errorf("SplitBy: coefficient %s of %s", f.Coef, f.Fn)
		}
		prod = prod.Add(f.Coef.Mul(f.Fn))
	}
	errs := []error{
		agree("Summands", sum, e),
		agree("SplitBy", prod, e),
		agree("NumDen", e.Mul(den), num),
	}
	if parts, err := e.SplitReal("x"); err == nil {
		sum := r.Int(0)
		for _, p := range parts {
			sum = sum.Add(p.Coef.Mul(p.Fn))
		}
		errs = append(errs, agree("SplitReal", sum, e))
	}
	if ts, err := e.Laurent("x"); err == nil {
		sum := r.Int(0)
		for _, t := range ts {
			sum = sum.Add(t.Coef.Mul(x.mustPow(mkExpo(t.Power.Num().Int64(), t.Power.Denom().Int64()))))
		}
		errs = append(errs, agree("Laurent", sum, e))
	}
	if cs, ok := e.Coefficients("x"); ok {
		sum := r.Int(0)
		for i, c := range cs {
			sum = sum.Add(c.Mul(x.powNat(i)))
		}
		errs = append(errs, agree("Coefficients", sum, e))
	}
	if c, fs, ok := e.FactorPowers(); ok && !e.IsZero() {
		prod := r.Rat(c)
		for _, f := range fs {
			p, err := f.Base.powRational(fromBig(f.Exp))
			if err != nil {
				return fmt.Errorf("FactorPowers: (%s)^%s: %w", f.Base, f.Exp, err)
			}
			prod = prod.Mul(p)
		}
		errs = append(errs, agree("FactorPowers", prod, e))
	}
	if q, err := e.Mul(e).Sqrt(); err == nil && e.IsReal() {
		errs = append(errs, agree("sqrt of a square", q.Mul(q), e.Mul(e)))
		if a, err := r.Call("abs", e); err == nil {
			errs = append(errs, agree("sqrt of a square is the absolute value", q, a), agree("square of the absolute value", a.Mul(a), e.Mul(e)))
			if g, err := r.Call("sign", e); err == nil {
				errs = append(errs, agree("sign times absolute value", g.Mul(a), e))
			}
		}
	}
	errs = append(errs, checkSubs(r, e, s))
	return errors.Join(errs...)
}

// checkSubs: the value after substitution is the value at the substituted
// point.
func checkSubs(r *Ring, e, s Expr) error {
	sub, err := e.Subs(map[string]Expr{"x": s})
	if err != nil {
		return nil
	}
	if err := checkCanonical(sub); err != nil {
		return fmt.Errorf("Subs: %w", err)
	}
	err = compareValues(r, sub, 3, func(at Binding, prec uint) (*big.Float, error) {
		v, err := s.EvalBig(at, prec+100)
		if err != nil {
			return nil, err
		}
		b := at
		b.Values = map[string]*big.Float{}
		for n, y := range at.Values {
			b.Values[n] = y
		}
		b.Values["x"] = v
		return e.EvalBig(b, prec)
	})
	if err != nil {
		return fmt.Errorf("x = %s in %s: %w", s, e, err)
	}
	return nil
}

// TestOperations takes random expressions apart and puts them together.
func TestOperations(t *testing.T) {
	for i := range uint64(max(100, *campaign)) {
		c := seeded(*campaignStart + i + 2<<32)
		te, ts := c.generate(1+int(i%4)), c.generate(1)
		r := testRing(t)
		err := r.WithBudget(testSteps, func() error {
			e, err := te.build(r)
			if err != nil {
				return nil
			}
			s, err := ts.build(r)
			if err != nil {
				return nil
			}
			return checkOperations(r, e, s)
		})
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("seed %d: %s, x = %s:\n  %v", *campaignStart+i, te, ts, err)
		}
	}
}

// TestLinearRandom solves systems with a known solution and checks
// determinants by their multiplicativity.
func TestLinearRandom(t *testing.T) {
	for i := range uint64(30) {
		c := seeded(i + 3<<32)
		r := testRing(t)
		n := 2 + c(2)
		mat := func() [][]Expr {
			m := make([][]Expr, n)
			for i := range m {
				m[i] = make([]Expr, n)
				for j := range m[i] {
					e, err := c.generate(c(2)).build(r)
					if err != nil {
						e = r.Int(int64(c(3)))
					}
					m[i][j] = e
				}
			}
			return m
		}
		a, b := mat(), mat()
		ab := make([][]Expr, n)
		rhs := make([]Expr, n)
		for i := range ab {
			ab[i] = make([]Expr, n)
			rhs[i] = r.Int(0)
			for j := range ab[i] {
				ab[i][j] = r.Int(0)
				for k := range b {
					ab[i][j] = ab[i][j].Add(a[i][k].Mul(b[k][j]))
				}
				rhs[i] = rhs[i].Add(a[i][j].Mul(b[j][0]))
			}
		}
		err := r.WithBudget(testSteps, func() error {
			if err := agree("det(ab)", Determinant(ab), Determinant(a).Mul(Determinant(b))); err != nil {
				return err
			}
			sol, err := SolveLinear(a, rhs)
			if err != nil {
				return err
			}
			for i := range a {
				sum := r.Int(0)
				for j := range a[i] {
					sum = sum.Add(a[i][j].Mul(sol.X[j]))
				}
				if err := agree("solution put back", sum, rhs[i]); err != nil {
					return err
				}
			}
			return nil
		})
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("seed %d: %v: %v", i, a, err)
		}
	}
}

// TestPotentialRandom: what is found for a gradient is its potential up to a
// constant; for a field that is no gradient nothing is found.
func TestPotentialRandom(t *testing.T) {
	found := 0
	for i := range uint64(40) {
		c := seeded(i + 4<<32)
		r := testRing(t)
		err := r.WithBudget(testSteps, func() error {
			u, err := c.generate(2).build(r)
			if err != nil || !u.IsReal() {
				return nil
			}
			h := []Expr{u.Diff("x"), u.Diff("y")}
			w, err := r.Potential(h, []string{"x", "y"})
			if errors.Is(err, ErrNoPotential) {
				return nil
			}
			if err != nil {
				return err
			}
			found++
			if err := errors.Join(agree("x", w.Diff("x"), h[0]), agree("y", w.Diff("y"), h[1])); err != nil {
				return err
			}
			y, _ := r.Symbol("y")
			if w, err := r.Potential([]Expr{h[0].Add(y), h[1]}, []string{"x", "y"}); err == nil {
				return fmt.Errorf("a potential %s of a field with curl", w)
			}
			return nil
		})
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("seed %d: %v", i, err)
		}
	}
	if found < 10 {
		t.Errorf("only %d potentials found", found)
	}
}
