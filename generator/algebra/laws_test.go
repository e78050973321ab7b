package algebra

import (
	"errors"
	"fmt"
	"testing"

	"pgregory.net/rapid"
)

// TestRingLaws: what must be equal is canonically equal, and equal things
// have equal keys and equal text. Between algebraic kernels (roots, absolute
// values) there are relations the form does not see: there the difference
// may be undecided, but never non-zero.
func TestRingLaws(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		c := drawn(rt)
		ta, tb, tc := c.generate(2), c.generate(2), c.generate(2)
		r := testRing(t)
		err := r.WithBudget(testSteps, func() error { return checkLaws(r, ta, tb, tc) })
		if err != nil && !errors.Is(err, ErrTooLarge) {
			rt.Fatalf("a = %s, b = %s, c = %s: %v", ta, tb, tc, err)
		}
	})
}

// TestSeededLaws is the same on larger expressions.
func TestSeededLaws(t *testing.T) {
	for i := range uint64(max(60, *campaign)) {
		c := seeded(*campaignStart + i + 1<<32)
		d := 1 + int(i%4)
		ta, tb, tc := c.generate(d), c.generate(d), c.generate(d)
		r := testRing(t)
		err := r.WithBudget(testSteps, func() error { return checkLaws(r, ta, tb, tc) })
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("seed %d: a = %s, b = %s, c = %s: %v", *campaignStart+i, ta, tb, tc, err)
		}
	}
}

func checkLaws(r *Ring, ta, tb, tc *ast) error {
	var es [3]Expr
	for i, t := range []*ast{ta, tb, tc} {
		e, err := t.build(r)
		if err != nil {
			return nil
		}
		es[i] = e
	}
	a, b, c := es[0], es[1], es[2]
	ab, err := a.Div(b)
	if err != nil {
		ab = r.unit
	}
	pairs := []struct {
		name string
		l, r Expr
	}{
		{"(a+b)+c = a+(b+c)", a.Add(b).Add(c), a.Add(b.Add(c))},
		{"a+b = b+a", a.Add(b), b.Add(a)},
		{"(ab)c = a(bc)", a.Mul(b).Mul(c), a.Mul(b.Mul(c))},
		{"ab = ba", a.Mul(b), b.Mul(a)},
		{"a(b+c) = ab+ac", a.Mul(b.Add(c)), a.Mul(b).Add(a.Mul(c))},
		{"(a+b)-b = a", a.Add(b).Sub(b), a},
		{"(a/b) b = a", ab.Mul(b), a},
		{"(a+b)^2", a.Add(b).powNat(2), a.Mul(a).Add(a.Mul(b).Mul(r.Int(2))).Add(b.Mul(b))},
		{"(ab)' = a'b + ab'", a.Mul(b).Diff("x"), a.Diff("x").Mul(b).Add(a.Mul(b.Diff("x")))},
		{"a_xy = a_yx", a.Diff("x").Diff("y"), a.Diff("y").Diff("x")},
	}
	algebraic := hasAlgebraicKernel(a) || hasAlgebraicKernel(b) || hasAlgebraicKernel(c)
	for _, p := range pairs {
		if p.name == "(a/b) b = a" && err != nil {
			continue
		}
		for _, e := range []Expr{p.l, p.r} {
			if err := checkCanonical(e); err != nil {
				return fmt.Errorf("%s: %w", p.name, err)
			}
		}
		v := p.l.Sub(p.r).ZeroTest()
		if v == VerdictNonZero || v == VerdictUndecided && !algebraic {
			return fmt.Errorf("%s: %s and %s differ, %s", p.name, p.l, p.r, v)
		}
		if v == VerdictZero && !algebraic && p.l.key() != p.r.key() {
			return fmt.Errorf("%s: %s and %s are equal but not the same", p.name, p.l, p.r)
		}
	}
	return nil
}

// hasAlgebraicKernel looks inside arguments, too. Roots of unity other than
// the tabulated ones count, and so do functions of trigonometric quotients:
// the form does not know all their relations.
func hasAlgebraicKernel(e Expr) bool {
	found := false
	e.eachKernel(func(k *kernel) {
		found = found || k.algebraic && k.kind != kindPrime || k.kind == kindCis && k.args[0].Equal(e.n.r.Pi())
		for _, a := range k.args {
			found = found || hasAlgebraicKernel(a) || trigDenominator(a)
		}
	})
	return found
}

func trigDenominator(e Expr) bool {
	for _, f := range e.n.den {
		if hasCis(f.f.p) {
			return true
		}
	}
	return false
}

// genPoly draws a polynomial in a few symbols.
func (c chooser) genPoly(r *Ring, terms, degree int) Expr {
	out := r.Int(0)
	for i := 0; i <= c(terms); i++ {
		t := r.Frac(int64(c(19)-9), int64(1+c(4)))
		for _, n := range []string{"x", "y", "z", "a"} {
			s, _ := r.Symbol(n)
			t = t.Mul(s.powNat(c(degree + 1)))
		}
		out = out.Add(t)
	}
	return out
}

// TestGCD: the gcd of two multiples is a multiple of the common factor, and
// what is left is coprime.
func TestGCD(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		c := drawn(rt)
		r := testRing(t)
		g, a, b := c.genPoly(r, 4, 2), c.genPoly(r, 4, 2), c.genPoly(r, 4, 2)
		if g.IsZero() || a.IsZero() || b.IsZero() {
			return
		}
		pa, pb := r.prim(g.Mul(a).n.num), r.prim(g.Mul(b).n.num)
		pg := r.prim(g.n.num)
		d := r.gcdPoly(pa, pb)
		if _, ok := r.divExact(d, pg); !ok && len(pg) > 1 {
			rt.Fatalf("gcd %s of multiples of %s", r.fromPoly(d), g)
		}
		qa, ok1 := r.divExact(pa, d)
		qb, ok2 := r.divExact(pb, d)
		if !ok1 || !ok2 {
			rt.Fatalf("gcd %s does not divide", r.fromPoly(d))
		}
		if e := r.gcdPoly(r.prim(qa), r.prim(qb)); len(e) > 1 {
			rt.Fatalf("cofactors of the gcd %s share %s", r.fromPoly(d), r.fromPoly(e))
		}
	})
}

// TestDivExact: a product divides back, and anything added to it does not.
func TestDivExact(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		c := drawn(rt)
		r := testRing(t)
		a, b := c.genPoly(r, 6, 2).n.num, c.genPoly(r, 6, 2).n.num
		if len(a) == 0 || len(b) == 0 {
			return
		}
		q, ok := r.divExact(r.mulPoly(a, b), b)
		if !ok || !q.equal(a) {
			rt.Fatalf("(%s)(%s)/(%s) is %v", r.fromPoly(a), r.fromPoly(b), r.fromPoly(b), ok)
		}
		if b.isConst() {
			return
		}
		if q, ok := r.divExact(addPoly(r.mulPoly(a, b), poly{{r.one, coefOne}}), b); ok {
			rt.Fatalf("%s divides with quotient %s", r.fromPoly(b), r.fromPoly(q))
		}
	})
}

// TestBudget: an expansion without bound stops with ErrTooLarge, and the ring
// is good for further use.
func TestBudget(t *testing.T) {
	r := testRing(t)
	e := mustRead(t, r, "x + y + z + a + b + D + U")
	err := r.WithBudget(50_000, func() error {
		return r.WithBudget(1_000_000, func() error {
			e.powNat(40)
			return nil
		})
	})
	if !errors.Is(err, ErrTooLarge) {
		t.Errorf("got %v", err)
	}
	if got := mustRead(t, r, "(x+y)^2 - x^2 - y^2 - 2*x*y"); !got.IsZero() {
		t.Errorf("got %s afterwards", got)
	}
}

// TestSplitPoly: the factors multiply to the polynomial and are coprime, also
// where a factor occurs twice and another once.
func TestSplitPoly(t *testing.T) {
	r := testRing(t)
	for _, in := range []string{
		"(x^3+y+1)^2*(x^4+y*x+3)", "(x^3+y+1)^3*(x^4+y*x+3)^2*(x^5-y)", "(x^2+y^2)^2*(x^2-y^2)", "(x-1)^5*(x+y)*y^2",
	} {
		p := r.prim(mustRead(t, r, in).n.num)
		fs := r.splitPoly(p)
		prod := poly{{r.one, coefOne}}
		for i, f := range fs {
			prod = r.mulPoly(prod, r.powPoly(f.p, f.e))
			for _, g := range fs[:i] {
				if d := r.gcdPoly(f.p, g.p); len(d) > 1 {
					t.Errorf("%s: factors share %s", in, r.fromPoly(d))
				}
			}
		}
		if !r.prim(prod).equal(p) {
			t.Errorf("%s: the factors do not multiply to it", in)
		}
		if len(fs) < 2 {
			t.Errorf("%s: %d factors", in, len(fs))
		}
	}
}

// TestGCDRoutes: the heuristic gcd and the subresultant remainder sequence
// agree, and the heuristic one masters what the other cannot.
func TestGCDRoutes(t *testing.T) {
	for i := range uint64(40) {
		c := seeded(i + 5<<32)
		r := testRing(t)
		g, a, b := c.genPoly(r, 2, 1), c.genPoly(r, 2, 2), c.genPoly(r, 2, 2)
		if g.IsZero() || a.IsZero() || b.IsZero() {
			continue
		}
		pa, pb := r.prim(g.Mul(a).n.num), r.prim(g.Mul(b).n.num)
		x := r.symbols["x"]
		if pa.degree(x).n == 0 || pb.degree(x).n == 0 {
			continue
		}
		h, ok := r.gcdHeuristic(pa, pb)
		if !ok {
			t.Errorf("seed %d: no heuristic gcd of %s and %s", i, r.fromPoly(pa), r.fromPoly(pb))
			continue
		}
		if s := r.gcdIn(pa, pb, x); !s.equal(h) {
			t.Errorf("seed %d: %s by remainders, %s by evaluation", i, r.fromPoly(s), r.fromPoly(h))
		}
	}
	r := testRing(t)
	g := mustRead(t, r, "D^2*x + omega_*y + a*b*x*y + 1")
	a := mustRead(t, r, "(x^2 + a*y + D)*(x - y + b)").Mul(g)
	b := mustRead(t, r, "(x*y + a + omega_)*(x + 2*y - D)").Mul(g)
	if h := r.gcdPoly(a.n.num, b.n.num); !h.equal(r.prim(g.n.num)) {
		t.Errorf("gcd %s, want %s", r.fromPoly(h), g)
	}
}

func TestInvMod(t *testing.T) {
	for _, a := range []uint64{1, 2, 3, modPrime - 1, modPrime / 2, 1 << 60, 123456789} {
		if mulMod(a, invMod(a)) != 1 || invMod(a) >= modPrime {
			t.Errorf("the inverse of %d is %d", a, invMod(a))
		}
	}
}
