package algebra

import (
	"fmt"
	"sort"
	"strings"
)

// AtomKind tells what an Atom is.
type AtomKind uint8

// The kinds of atoms.
const (
	AtomPower AtomKind = iota // Var^Power
	AtomCos                   // cos(Frequency*Var)
	AtomSin                   // sin(Frequency*Var)
	AtomFunc                  // a derivative of the named function Func, to the power Power
	AtomOther                 // anything else: Expr
)

// Atom is one factor of a product of real functions.
type Atom struct {
	Kind      AtomKind
	Var       string
	Power     Expr // AtomPower, AtomFunc: a rational number
	Frequency Expr
	Func      string
	Deriv     []int
	Expr      Expr // the factor itself
}

// RealPart is Coef times the product of Atoms, which is Fn.
type RealPart struct {
	Coef  Expr
	Fn    Expr
	Atoms []Atom
}

// SplitReal is SplitBy with real functions: conjugate pairs of exp(i m) become
// products of sines and cosines of single angles, and every function comes
// with its factors. It fails for expressions that are not real.
func (e Expr) SplitReal(names ...string) ([]RealPart, error) {
	r := e.n.r
	in := func(k *kernel) bool {
		for _, n := range names {
			if k.dependsOn(n) {
				return true
			}
		}
		return false
	}
	// Denominators that depend on the names stay whole.
	var fixed []Atom
	outer := r.unit
	inner := r.unit
	for _, f := range e.n.den {
		p := f.f.p
		dep := false
		for _, k := range p.kernels() {
			dep = dep || in(k)
		}
		if s, ok := r.symmetrise(p); ok {
			p = s
		} else if dep {
			return nil, fmt.Errorf("a denominator of %s is not real", e)
		}
		g := r.fromPoly(p).powNat(f.e)
		if dep {
			inv := g.inv()
			inner = inner.Mul(g)
			fixed = append(fixed, Atom{Kind: AtomOther, Expr: inv})
		} else {
			outer = outer.Mul(g)
		}
	}
	num := e.Mul(inner).Mul(outer)
	if len(num.n.den) > 0 {
		return nil, fmt.Errorf("cannot clear the denominators of %s", e)
	}
	groups := map[string]*realGroup{}
	var order []string
	both := bothSigns(num.n.num, in)
	for _, t := range num.n.num {
		r.realTerm(t, in, both, groups, &order)
	}
	out := make([]RealPart, 0, len(order))
	for _, key := range order {
		g := groups[key]
		c := r.fromPoly(g.coef.poly())
		if c.IsZero() {
			continue
		}
		p := RealPart{Coef: c.over(outer), Fn: r.unit}
		for _, a := range append(g.atoms, fixed...) {
			p.Fn = p.Fn.Mul(a.Expr)
			p.Atoms = append(p.Atoms, a.classify(names))
		}
		out = append(out, p)
	}
	return out, nil
}

type realGroup struct {
	atoms []Atom
	coef  *accumulator
}

// bothSigns finds the exponentials that occur with exponents of both signs:
// they are taken apart into hyperbolic functions, which keep parities.
func bothSigns(p poly, in func(*kernel) bool) map[*kernel]bool {
	seen := map[*kernel]int{}
	for _, t := range p {
		for _, q := range t.m.p {
			if q.k.kind == kindExp && in(q.k) {
				if q.e.n > 0 {
					seen[q.k] |= 1
				} else {
					seen[q.k] |= 2
				}
			}
		}
	}
	out := map[*kernel]bool{}
	for k, s := range seen {
		out[k] = s == 3
	}
	return out
}

// realTerm expands the exp(i m) of one term into cosines and sines.
func (r *Ring) realTerm(t term, in func(*kernel) bool, both map[*kernel]bool, groups map[string]*realGroup, order *[]string) {
	var plain, rest []power
	type angle struct {
		k   *kernel
		e   expo
		neg bool
	}
	var angles []angle
	for _, q := range t.m.p {
		switch {
		case !in(q.k):
			rest = append(rest, q)
		case q.k.kind == kindCis || both[q.k]:
			a := angle{q.k, q.e, q.e.n < 0}
			if a.neg {
				a.e = a.e.neg()
			}
			angles = append(angles, a)
		default:
			plain = append(plain, q)
		}
	}
	for mask := 0; mask < 1<<len(angles); mask++ {
		c := t.c
		var key strings.Builder
		for _, q := range plain {
			fmt.Fprintf(&key, "%s^%s;", q.k.key, q.e.rat())
		}
		var atoms []Atom
		for i, a := range angles {
			arg := a.k.args[0].Mul(r.ratExpr(a.e.rat()))
			odd := mask>>i&1 == 1
			if odd && a.neg {
				c = c.neg()
			}
			name, kind := "cos", AtomCos
			var v Expr
			var err error
			if both[a.k] {
				// e^a = cosh a + sinh a
				name, kind = "cosh", AtomOther
				if odd {
					name = "sinh"
				}
				v, err = r.hyperbolic(name, arg)
			} else {
				// e^{ia} = cos a + i sin a
				if odd {
					name, kind = "sin", AtomSin
					c = c.mul(coefI)
				}
				v, err = r.trig(name, arg)
			}
			if err != nil {
				panic(err)
			}
			fmt.Fprintf(&key, "%s %s^%s;", name, a.k.key, a.e.rat())
			atoms = append(atoms, Atom{Kind: kind, Frequency: arg, Expr: v})
		}
		g, ok := groups[key.String()]
		if !ok {
			g = &realGroup{coef: r.accumulate(4)}
			for _, q := range plain {
				g.atoms = append(g.atoms, r.powerAtom(q))
			}
			g.atoms = append(g.atoms, atoms...)
			groups[key.String()] = g
			*order = append(*order, key.String())
		}
		g.coef.add(r.internMono(rest), c)
	}
}

func (r *Ring) powerAtom(q power) Atom {
	a := Atom{Kind: AtomOther, Expr: r.kernelPower(q.k, q.e), Power: r.ratExpr(q.e.rat())}
	switch q.k.kind {
	case kindSymbol:
		a.Kind, a.Var = AtomPower, q.k.name
	case kindFunc:
		a.Kind, a.Func, a.Deriv = AtomFunc, q.k.name, append([]int(nil), q.k.deriv...)
	}
	return a
}

// classify finds the one variable of an angle and its frequency.
func (a Atom) classify(names []string) Atom {
	if a.Kind != AtomCos && a.Kind != AtomSin {
		return a
	}
	arg := a.Frequency
	for _, n := range names {
		if !arg.DependsOn(n) {
			continue
		}
		y, _ := arg.n.r.Symbol(n)
		f := arg.over(y)
		for _, m := range names {
			if f.DependsOn(m) {
				a.Kind = AtomOther
				return a
			}
		}
		a.Var, a.Frequency = n, f
		return a
	}
	a.Kind = AtomOther
	return a
}

// FuncUse is an occurrence of a derivative of a named function at its
// declared arguments, replaced by a symbol.
type FuncUse struct {
	Name   string
	Deriv  []int
	Symbol string
	Expr   Expr // the derivative itself
}

// NameFunctions replaces derivatives of the named functions (all functions
// when names is nil), at their declared arguments, by symbols and tells which.
func (e Expr) NameFunctions(names map[string]bool) (Expr, []FuncUse, error) {
	r := e.n.r
	uses := map[string]FuncUse{}
	out, err := e.rebuild(func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error) {
		if k.kind == kindSymbol {
			return r.kernelExpr(k), true, nil
		}
		if k.kind != kindFunc || names != nil && !names[k.name] {
			return Expr{}, false, nil
		}
		f := r.funcs[k.name]
		for i, a := range k.args {
			if !a.Equal(r.kernelExpr(r.symbols[f.args[i]])) {
				return Expr{}, false, nil
			}
		}
		u := FuncUse{Name: k.name, Deriv: append([]int(nil), k.deriv...), Symbol: "#" + k.key, Expr: r.kernelExpr(k)}
		uses[u.Symbol] = u
		return r.Declare(u.Symbol, Attr{Sign: k.sign, Parameter: true}), true, nil
	})
	if err != nil {
		return Expr{}, nil, err
	}
	list := make([]FuncUse, 0, len(uses))
	for _, u := range uses {
		list = append(list, u)
	}
	sort.Slice(list, func(i, j int) bool { return list[i].Symbol < list[j].Symbol })
	return out, list, nil
}
