package algebra

import (
	"errors"
	"sort"
)

// ErrNoPotential reports that no potential was found in closed form; it is
// not a proof that none exists.
var ErrNoPotential = errors.New("no closed form of the potential was found")

// Potential finds u with du/dvars[i] = h[i] by an ansatz over logarithms of
// the factors and functions present, products that could be antiderivatives
// of the terms, and powers of the denominators' factors, with coefficients
// that do not depend on vars; the coefficients come from linear algebra and
// the result is confirmed by differentiation.
func (r *Ring) Potential(h []Expr, vars []string) (Expr, error) {
	return r.PotentialIn(h, vars, nil)
}

// PotentialIn is Potential with a point inside the domain, which decides the
// sign of the arguments of logarithms where the declared signs do not: log(1-y)
// rather than log(y-1) on an interval below one.
func (r *Ring) PotentialIn(h []Expr, vars []string, inside map[string]Expr) (Expr, error) {
	var u Expr
	err := Guard(func() error {
		zero := true
		for _, e := range h {
			zero = zero && e.IsZero()
		}
		if zero {
			u = r.zero
			return nil
		}
		cands := r.potentialCandidates(h, vars, inside)
		if len(cands) == 0 || len(cands) > 160 {
			return ErrNoPotential
		}
		c, ok := r.fitGradient(h, cands, vars)
		if !ok {
			return ErrNoPotential
		}
		u = r.zero
		for k, w := range cands {
			if !c[k].IsZero() {
				u = u.Add(c[k].Mul(w))
			}
		}
		for i, v := range vars {
			if !u.Diff(v).Equal(h[i]) {
				return ErrNoPotential
			}
		}
		return nil
	})
	return u, err
}

// potentialCandidates lists functions whose gradients could make up h.
func (r *Ring) potentialCandidates(h []Expr, vars []string, inside map[string]Expr) []Expr {
	set := &candidateSet{r: r, vars: vars, inside: inside, seen: map[string]bool{}}
	den := map[string]denFactor{}
	for i, e := range h {
		for _, f := range e.n.den {
			if g, ok := den[f.f.key]; !ok || g.e < f.e {
				den[f.f.key] = f
			}
		}
		for _, t := range e.n.num {
			set.fromTerm(t, i)
		}
	}
	keys := make([]string, 0, len(den))
	for k := range den {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	// Rational parts: numerators over lower powers of the denominators.
	plain := append([]Expr{r.unit}, set.list...)
	for _, k := range keys {
		f := den[k]
		if !polyDependsOn(f.f.p, vars) {
			continue
		}
		for _, g := range r.radicalFactors(f.f.p) {
			set.addLog(g)
			for j := 1; j <= f.e && j < 4; j++ {
				inv := g.powNat(j).inv()
				for n, w := range plain {
					if n > 12 {
						break
					}
					if _, isLog := w.asLog(); !isLog {
						set.add(w.Mul(inv))
					}
				}
			}
		}
	}
	return set.list
}

type candidateSet struct {
	r      *Ring
	vars   []string
	inside map[string]Expr
	seen   map[string]bool
	list   []Expr
}

func polyDependsOn(p poly, vars []string) bool {
	for _, k := range p.kernels() {
		for _, v := range vars {
			if k.dependsOn(v) {
				return true
			}
		}
	}
	return false
}

func (c *candidateSet) dependent(k *kernel) bool {
	for _, v := range c.vars {
		if k.dependsOn(v) {
			return true
		}
	}
	return false
}

func (c *candidateSet) add(e Expr) {
	// A constant factor does not matter.
	for _, s := range e.splitBy(c.dependent) {
		if s.fn.IsOne() {
			continue
		}
		if key := s.fn.key(); !c.seen[key] {
			c.seen[key] = true
			c.list = append(c.list, s.fn)
		}
	}
}

func (c *candidateSet) addLog(e Expr) {
	if e.Sign() == Negative {
		e = e.Neg()
	} else if e.Sign() != Positive && c.inside != nil {
		if v, err := e.Subs(c.inside); err == nil && v.Sign() == Negative {
			e = e.Neg()
		}
	}
	l := c.r.call("log", AnyReal, e)
	if e.Sign() == Positive {
		if s, err := c.r.log(e); err == nil {
			c.add(s)
			return
		}
	}
	c.add(l)
}

func (e Expr) asLog() (Expr, bool) {
	if len(e.n.den) == 0 && len(e.n.num) == 1 && len(e.n.num[0].m.p) == 1 {
		k := e.n.num[0].m.p[0].k
		if k.kind == kindCall && k.name == "log" {
			return k.args[0], true
		}
	}
	return Expr{}, false
}

// fromTerm adds what could be an antiderivative of a numerator term of h_i.
func (c *candidateSet) fromTerm(t term, i int) {
	r := c.r
	var dep []power
	for _, q := range t.m.p {
		if c.dependent(q.k) {
			dep = append(dep, q)
		}
	}
	m := r.internMono(dep)
	e := r.fromPoly(poly{{m, coefOne}})
	x, _ := r.Symbol(c.vars[i])
	c.add(e.Mul(x))
	hasGroup := false
	for _, q := range dep {
		switch q.k.kind {
		case kindFunc:
			c.lowered(e, q, i)
		case kindExp, kindCis, kindPow:
			hasGroup = true
		case kindSymbol, kindCall, kindIntegral:
			if q.k.kind == kindSymbol {
				c.addLog(r.kernelExpr(q.k))
			}
		case kindRoot:
			c.addLog(q.k.base)
			c.add(e.Mul(q.k.base))
		}
		if q.k.kind == kindFunc && q.e.n < 0 {
			c.addLog(r.kernelExpr(q.k))
		}
	}
	if hasGroup {
		c.add(e)
		var group []power
		for _, q := range dep {
			if q.k.kind == kindExp || q.k.kind == kindCis || q.k.kind == kindPow {
				group = append(group, q)
			}
		}
		c.add(r.fromPoly(poly{{r.internMono(group), coefOne}}))
		var plain []power // without the angles: sin(y) exp(cos(y))
		for _, q := range group {
			if q.k.kind != kindCis {
				plain = append(plain, q)
			}
		}
		if len(plain) > 0 {
			c.add(r.fromPoly(poly{{r.internMono(plain), coefOne}}))
		}
		// Polynomial times exponential: lower the powers of x.
		if n := m.degree(r.symbols[c.vars[i]]); n.isInt() && n.n > 0 && n.n < 8 {
			f := e
			for k := int32(0); k < n.n; k++ {
				f = f.over(x)
				c.add(f)
			}
		}
	}
}

// lowered replaces a derivative in direction i by the function it is the
// derivative of: F^n F_x comes from F^(n+1), F_x/F from log F.
func (c *candidateSet) lowered(e Expr, q power, i int) {
	r := c.r
	f := r.funcs[q.k.name]
	if q.e != (expo{1, 1}) {
		return
	}
	for a, name := range f.args {
		if name != c.vars[i] || q.k.deriv[a] == 0 {
			continue
		}
		d := append([]int(nil), q.k.deriv...)
		d[a]--
		g := r.kernelExpr(r.funcKernel(f, d, q.k.args))
		c.add(e.over(r.kernelExpr(q.k)).Mul(g))
		if len(d) > 0 && sumInts(d) == 0 {
			c.addLog(g)
		}
	}
}

func sumInts(d []int) int {
	n := 0
	for _, k := range d {
		n += k
	}
	return n
}

// radicalFactors splits a denominator factor further over square roots of
// primes and of positive symbols, where it is a difference of squares in one
// kernel, and makes trigonometric factors real.
func (r *Ring) radicalFactors(p poly) []Expr {
	if hasCis(p) || !isRealPoly(p) {
		if s, ok := r.symmetrise(p); ok {
			return []Expr{r.fromPoly(s)}
		}
		return nil
	}
	for _, k := range p.kernels() {
		if k.algebraic || p.degree(k) != (expo{2, 1}) || exponentDens(p)[k] != 1 {
			continue
		}
		v := r.dense(p, k, 1)
		disc := subPoly(r.mulPoly(v[1], v[1]), r.mulPoly(v[2], v[0]).scale(coefInt(4)))
		if len(disc) != 1 || len(v[2]) != 1 || !disc[0].c.isReal() || disc[0].c.re.sign() <= 0 {
			continue
		}
		s, err := r.fromPoly(disc).Sqrt()
		if err != nil {
			continue
		}
		if s, err = s.DropAbs(); err != nil {
			continue
		}
		b := r.fromPoly(v[1])
		two := r.fromPoly(v[2]).Mul(r.Int(2)).Mul(r.kernelExpr(k))
		return []Expr{two.Add(b).Add(s).withoutContent(), two.Add(b).Sub(s).withoutContent()}
	}
	return []Expr{r.fromPoly(p)}
}

// withoutContent is the primitive numerator.
func (e Expr) withoutContent() Expr {
	_, _, q := e.n.r.primitive(e.n.num)
	return e.n.r.fromPoly(q)
}

// fitGradient solves sum_k c_k grad w_k = h for constants c_k.
func (r *Ring) fitGradient(h, cands []Expr, vars []string) ([]Expr, bool) {
	dep := func(k *kernel) bool {
		for _, v := range vars {
			if k.dependsOn(v) {
				return true
			}
		}
		return false
	}
	n := len(cands)
	var a [][]Expr
	var b []Expr
	for i, v := range vars {
		cols := make([]Expr, n+1)
		for k, w := range cands {
			cols[k] = w.Diff(v)
		}
		cols[n] = h[i]
		// One common denominator turns the equation into one of numerators.
		den := r.unit
		for _, c := range cols {
			have := c.Mul(den)
			for _, f := range have.n.den {
				den = den.Mul(r.fromPoly(f.f.p).powNat(f.e))
			}
		}
		rows := map[string]int{}
		for k, c := range cols {
			for _, t := range c.Mul(den).splitBy(dep) {
				key := t.fn.key()
				row, ok := rows[key]
				if !ok {
					row = len(a)
					rows[key] = row
					zero := make([]Expr, n)
					for j := range zero {
						zero[j] = r.zero
					}
					a, b = append(a, zero), append(b, r.zero)
				}
				if k == n {
					b[row] = b[row].Add(t.coef)
				} else {
					a[row][k] = a[row][k].Add(t.coef)
				}
			}
		}
	}
	sol, err := SolveLinear(a, b)
	if err != nil {
		return nil, false
	}
	return sol.X, true
}

// MatchGradient looks for constants c_k such that every c_k dw_k/dvars[i]
// occurs in h[i], candidate by candidate, and returns the c_k w_k. The
// gradient of their sum need not be h: the rest of h is left over. It serves
// to guess the stationary density of irreversible diffusions, to be tested by
// the caller.
func (r *Ring) MatchGradient(h []Expr, vars []string) ([]Expr, error) {
	var u []Expr
	err := Guard(func() error {
		dep := func(k *kernel) bool {
			for _, v := range vars {
				if k.dependsOn(v) {
					return true
				}
			}
			return false
		}
		for _, w := range r.potentialCandidates(h, vars, nil) {
			var c Expr
			ok := true
			for i, v := range vars {
				d := w.Diff(v)
				if d.IsZero() {
					continue
				}
				ts := d.splitBy(dep)
				if len(ts) != 1 {
					ok = false
					break
				}
				q := r.zero
				for _, t := range h[i].splitBy(dep) {
					if t.fn.Equal(ts[0].fn) {
						q = t.coef.over(ts[0].coef)
					}
				}
				if q.IsZero() || c.Valid() && !c.Equal(q) {
					ok = false
					break
				}
				c = q
			}
			if ok && c.Valid() {
				u = append(u, c.Mul(w))
			}
		}
		return nil
	})
	return u, err
}

// ShiftedBy substitutes name + period for the symbol, but leaves named
// functions at their declared arguments alone: they are taken to be periodic
// wherever their variables are.
func (e Expr) ShiftedBy(name string, period Expr) (Expr, error) {
	r := e.n.r
	return e.rebuild(func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error) {
		switch k.kind {
		case kindSymbol:
			s := r.kernelExpr(k)
			if k.name == name {
				s = s.Add(period)
			}
			return s, true, nil
		case kindFunc:
			f := r.funcs[k.name]
			for i, a := range k.args {
				if !a.Equal(r.kernelExpr(r.symbols[f.args[i]])) {
					return Expr{}, false, nil
				}
			}
			return r.kernelExpr(k), true, nil
		}
		return Expr{}, false, nil
	})
}
