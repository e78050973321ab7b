package algebra

import (
	"math/big"
	"sort"
)

// Leading is the leading behaviour coef * name^power of e as the symbol goes
// to zero (from above) or to infinity. ok is false when the symbol occurs
// other than in powers.
func (e Expr) Leading(name string, atInfinity bool) (power *big.Rat, coef Expr, ok bool) {
	r := e.n.r
	k, found := r.symbols[name]
	if !found || e.IsZero() {
		return new(big.Rat), e, true
	}
	side := func(p poly) (expo, Expr, bool) {
		for _, t := range p {
			for _, q := range t.m.p {
				if q.k != k && q.k.dependsOn(name) {
					return expo{}, Expr{}, false
				}
			}
		}
		exps, cs := r.split(p, k)
		i := len(exps) - 1
		if atInfinity {
			i = 0
		}
		return exps[i], r.fromPoly(cs[i]), true
	}
	d, c, ok := side(e.n.num)
	if !ok {
		return nil, Expr{}, false
	}
	for _, f := range e.n.den {
		fd, fc, ok := side(f.f.p)
		if !ok {
			return nil, Expr{}, false
		}
		d = d.sub(fd.mul(expo{int32(f.e), 1}))
		c = c.over(fc.powNat(f.e))
	}
	return d.rat().rational(), c, true
}

// Coefficients lists the coefficients of e as a polynomial in the symbol,
// constant first; ok is false when e is no polynomial in it.
func (e Expr) Coefficients(name string) (c []Expr, ok bool) {
	ts, err := e.Laurent(name)
	if err != nil {
		return nil, false
	}
	r := e.n.r
	for _, t := range ts {
		if !t.Power.IsInt() || t.Power.Sign() < 0 || t.Power.Num().Int64() > 1000 {
			return nil, false
		}
		n := int(t.Power.Num().Int64())
		for len(c) <= n {
			c = append(c, r.zero)
		}
		c[n] = t.Coef
	}
	return c, true
}

// Factors are the non-constant factors of the numerator of e, as far as the
// core factors polynomials.
func (e Expr) Factors() []Expr {
	r := e.n.r
	_, m, q := r.primitive(e.n.num)
	var out []Expr
	for _, p := range m.p {
		if p.e.n > 0 {
			out = append(out, r.kernelExpr1(p.k))
		}
	}
	if q.isConst() {
		return out
	}
	for _, f := range r.splitPoly(q) {
		g := f.p
		if hasCis(g) || !isRealPoly(g) {
			if s, ok := r.symmetrise(g); ok {
				g = s
			}
		}
		out = append(out, r.fromPoly(g))
	}
	return out
}

// NumDen splits e into numerator and denominator without negative powers.
func (e Expr) NumDen() (num, den Expr) {
	r := e.n.r
	den = r.fromPoly(e.denPoly())
	var low []power
	for _, q := range r.monoContent(e.n.num).p {
		if q.e.n < 0 && q.k.kind != kindCis {
			low = append(low, power{q.k, q.e.neg()})
		}
	}
	den = den.Mul(r.monoExpr(r.internMono(low)))
	return e.Mul(den), den
}

// Primitive divides e by its positive rational content.
func (e Expr) Primitive() Expr {
	r := e.n.r
	if e.IsZero() {
		return e
	}
	c := ratZero
	for _, t := range e.n.num {
		c = ratGCD(ratGCD(c, t.c.re), t.c.im)
	}
	return e.Mul(r.ratExpr(c.inv()))
}

// Summands lists the terms of the numerator over the denominator.
func (e Expr) Summands() []Expr {
	r := e.n.r
	out := make([]Expr, 0, len(e.n.num))
	for _, t := range e.n.num {
		out = append(out, r.reduce(poly{t}, e.n.den, nil))
	}
	return out
}

// SymbolNames lists the declared symbols in order of declaration.
func (r *Ring) SymbolNames() []string {
	ks := make([]*kernel, 0, len(r.symbols))
	for _, k := range r.symbols {
		if k.name != "pi" {
			ks = append(ks, k)
		}
	}
	sort.Slice(ks, func(i, j int) bool { return compareKernels(ks[i], ks[j]) < 0 })
	out := make([]string, len(ks))
	for i, k := range ks {
		out[i] = k.name
	}
	return out
}

// SignOf is the declared sign of a symbol.
func (r *Ring) SignOf(name string) Sign {
	if k, ok := r.symbols[name]; ok {
		return k.sign
	}
	return AnyReal
}

// FactorPower is one factor of a product, with a rational exponent.
type FactorPower struct {
	Base Expr
	Exp  *big.Rat
}

// FactorPowers splits a non-zero real expression into a rational content and
// factors, as far as the core factors; ok is false for expressions that are
// not known to be real.
func (e Expr) FactorPowers() (content *big.Rat, fs []FactorPower, ok bool) {
	if e.IsZero() {
		return nil, nil, false
	}
	c, ps, ok := e.parts()
	if !ok {
		return nil, nil, false
	}
	for _, p := range ps {
		fs = append(fs, FactorPower{p.base, p.e.rat().rational()})
	}
	return new(big.Rat).Set(c.rational()), fs, true
}

// HasIntegral reports whether e contains an integral kept by name.
func (e Expr) HasIntegral() bool {
	found := false
	var visit func(e Expr)
	visit = func(e Expr) {
		e.eachKernel(func(k *kernel) {
			found = found || k.kind == kindIntegral
			for _, a := range k.args {
				visit(a)
			}
		})
	}
	visit(e)
	return found
}
