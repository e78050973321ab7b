package algebra

import (
	"fmt"
	"math/big"
	"sort"
)

// LaurentTerm is Coef * symbol^Power.
type LaurentTerm struct {
	Power *big.Rat
	Coef  Expr
}

// Laurent writes e as a finite sum of rational powers of the symbol with
// coefficients that do not contain it, lowest power first. It fails where
// the symbol occurs in any other way.
func (e Expr) Laurent(name string) ([]LaurentTerm, error) {
	r := e.n.r
	k, ok := r.symbols[name]
	if !ok || !e.DependsOn(name) {
		if e.IsZero() {
			return nil, nil
		}
		return []LaurentTerm{{new(big.Rat), e}}, nil
	}
	byPower := map[expo]*accumulator{}
	var powers []expo
	for _, t := range e.n.num {
		d := expo{0, 1}
		var rest []power
		for _, q := range t.m.p {
			switch {
			case q.k == k:
				d = q.e
			case q.k.dependsOn(name):
				return nil, fmt.Errorf("%s occurs inside %s", name, r.kernelExpr(q.k))
			default:
				rest = append(rest, q)
			}
		}
		acc, ok := byPower[d]
		if !ok {
			acc = r.accumulate(4)
			byPower[d] = acc
			powers = append(powers, d)
		}
		acc.add(r.internMono(rest), t.c)
	}
	den := r.unit
	for _, f := range e.n.den {
		g := r.fromPoly(f.f.p)
		if g.DependsOn(name) {
			return nil, fmt.Errorf("%s occurs in the denominator %s together with other things", name, g)
		}
		den = den.Mul(g.powNat(f.e))
	}
	sort.Slice(powers, func(i, j int) bool { return powers[i].cmp(powers[j]) < 0 })
	out := make([]LaurentTerm, 0, len(powers))
	for _, d := range powers {
		c := r.fromPoly(byPower[d].poly()).over(den)
		if !c.IsZero() {
			out = append(out, LaurentTerm{d.rat().rational(), c})
		}
	}
	return out, nil
}

// Derivatives lists the derivatives of the named function that occur in e,
// each as a multi-index over the function's arguments, together with the
// coefficient that multiplies it. It fails when e is not linear in them.
func (e Expr) Derivatives(name string) ([]DerivativeTerm, error) {
	for _, f := range e.n.den {
		for _, k := range f.f.p.kernels() {
			if k.kind == kindFunc && k.name == name {
				return nil, fmt.Errorf("not linear in %s", name)
			}
		}
	}
	parts := e.splitBy(func(k *kernel) bool { return k.kind == kindFunc && k.name == name })
	out := make([]DerivativeTerm, 0, len(parts))
	for _, p := range parts {
		if p.fn.IsOne() {
			return nil, fmt.Errorf("not homogeneous in %s", name)
		}
		m := p.fn.n.num[0].m
		if len(m.p) != 1 || m.p[0].e != (expo{1, 1}) || len(p.fn.n.den) > 0 {
			return nil, fmt.Errorf("not linear in %s", name)
		}
		out = append(out, DerivativeTerm{append([]int(nil), m.p[0].k.deriv...), p.coef})
	}
	return out, nil
}

// DerivativeTerm is Coef times the derivative with multi-index Index.
type DerivativeTerm struct {
	Index []int
	Coef  Expr
}
