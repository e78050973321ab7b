package algebra

import (
	"math/big"
	"sort"
)

// divided splits off the polynomial part: x + 1/(x - 1) for (x^2-x+1)/(x-1).
func (b *former) divided(e Expr, depth int) *Form {
	r := b.r
	if len(e.n.den) == 0 || hasCis(e.n.num) {
		return nil
	}
	num, den := e.NumDen()
	quo, rem := r.divRem(num.n.num, den.n.num)
	if len(quo) == 0 || len(rem) == 0 || len(den.n.den) > 0 || len(num.n.den) > 0 || len(quo) > 6 {
		return nil
	}
	frac := r.fromPoly(rem).over(den)
	if frac.Size() >= e.Size() {
		return nil
	}
	parts := []*Form{b.expr(r.fromPoly(quo), depth+1), b.expr(frac, depth+1)}
	var flat []*Form
	for _, p := range parts {
		if p.Op == FormSum {
			flat = append(flat, p.Args...)
		} else {
			flat = append(flat, p)
		}
	}
	return positiveFirst(flat)
}

// quotientRule puts the derivative of a quotient of two named functions back
// together: D*v_x - v*D_x over D^2 is diff(v/D, x).
func (b *former) quotientRule(e Expr, depth int) *Form {
	r := b.r
	if len(e.n.num) > 60 {
		return nil
	}
	var ts []*Form
	rest := e
	for again := true; again; {
		again = false
		ks := firstDerivatives(rest)
	search:
		for _, f := range ks {
			for _, g := range ks {
				if f.k == g.k || f.arg != g.arg || f.k.name == g.k.name {
					continue
				}
				c1, c2 := rest.linearIn(f.k), rest.linearIn(g.k)
				if !c1.Valid() || !c2.Valid() {
					continue
				}
				// c1 F_s - (c1 F/G) G_s is c1 G (F/G)_s; the rest of c2 must
				// get shorter by it.
				part := c1.Mul(f.base).over(g.base).Neg()
				if left := c2.Sub(part); !left.IsZero() && len(left.n.num)+len(part.n.num) > len(c2.n.num) {
					continue
				}
				c2 = part
				q := &Form{Op: FormDiff, Vars: []string{f.arg}, Args: []*Form{b.expr(f.base.over(g.base), depth+1)}}
				p := &prod{b: b, c: ratOne, depth: depth}
				t := b.expr(c1.Mul(g.base), depth+1)
				neg := t.Op == FormNeg
				if neg {
					t = t.Args[0]
				}
				if t.Op == FormQuotient {
					p.form(t.Args[0], 1)
					p.form(t.Args[1], -1)
				} else {
					p.form(t, 1)
				}
				p.fs = append(p.fs, prodFactor{class: 6, form: q, e: ratOne})
				t = p.build()
				if neg {
					t = negForm(t)
				}
				ts = append(ts, t)
				rest = rest.Sub(c1.Mul(r.kernelExpr(f.k))).Sub(c2.Mul(r.kernelExpr(g.k)))
				again = true
				break search
			}
		}
	}
	if len(ts) == 0 {
		return nil
	}
	if !rest.IsZero() {
		f := b.expr(rest, depth+1)
		if f.Op == FormSum {
			ts = append(append([]*Form(nil), f.Args...), ts...)
		} else {
			ts = append([]*Form{f}, ts...)
		}
	}
	return positiveFirst(ts)
}

// firstDerivative is a first derivative kernel with the function it is the
// derivative of.
type firstDerivative struct {
	k    *kernel
	arg  string
	base Expr
}

func firstDerivatives(e Expr) []firstDerivative {
	r := e.n.r
	var out []firstDerivative
	for _, k := range e.n.num.kernels() {
		if k.kind != kindFunc || sumInts(k.deriv) != 1 {
			continue
		}
		f := r.funcs[k.name]
		for i, d := range k.deriv {
			if d == 1 && k.args[i].Equal(r.kernelExpr(r.symbols[f.args[i]])) {
				base := r.kernelExpr(r.funcKernel(f, make([]int, len(k.args)), k.args))
				out = append(out, firstDerivative{k, f.args[i], base})
			}
		}
	}
	return out
}

// linearIn is the coefficient of k where e is linear in it and k stands in no
// denominator, else not Valid; terms with k may contain other kernels.
func (e Expr) linearIn(k *kernel) Expr {
	r := e.n.r
	for _, f := range e.n.den {
		if !f.f.p.degree(k).isZero() {
			return Expr{}
		}
	}
	var c poly
	for _, t := range e.n.num {
		switch d := t.m.degree(k); d {
		case expo{0, 1}:
		case expo{1, 1}:
			c = append(c, term{r.monoWithout(t.m, k), t.c})
		default:
			return Expr{}
		}
	}
	if len(c) == 0 {
		return Expr{}
	}
	sort.Slice(c, func(i, j int) bool { return compareMono(c[i].m, c[j].m) > 0 })
	return r.reduce(c, e.n.den, nil)
}

// byKernel groups a fraction by the powers of one function or symbol and
// reduces each coefficient on its own: c^2/D + s/(1 + D) for the fraction
// over D*(1 + D).
func (b *former) byKernel(e Expr, depth int) *Form {
	if len(e.n.den) == 0 || len(e.n.num) > 30 || depth > 2 {
		return nil
	}
	r := b.r
	var best *Form
	for _, k := range e.n.num.kernels() {
		if k.kind != kindFunc && k.kind != kindSymbol {
			continue
		}
		exps, cs := r.split(e.n.num, k)
		if len(exps) < 2 || len(exps) > 4 {
			continue
		}
		var ts []*Form
		gain := false
		for i, x := range exps {
			c := r.reduce(cs[i], e.n.den, nil)
			gain = gain || len(c.n.den) < len(e.n.den)
			f := b.expr(c.Mul(r.kernelPower(k, x)), depth+2)
			if f.Op == FormSum {
				ts = append(ts, f.Args...)
			} else {
				ts = append(ts, f)
			}
		}
		if gain {
			f := positiveFirst(ts)
			if best == nil || f.cost() < best.cost() {
				best = f
			}
		}
	}
	return best
}

// byFunctions groups the terms by the named function whose derivatives they
// contain and arranges each group on its own.
func (b *former) byFunctions(e Expr, depth int) *Form {
	r := b.r
	owner := func(m *mono) string {
		for _, q := range m.p {
			if q.k.kind == kindFunc && sumInts(q.k.deriv) > 0 {
				return q.k.name
			}
		}
		return ""
	}
	groups := map[string]poly{}
	var order []string
	for _, t := range e.n.num {
		o := owner(t.m)
		if _, ok := groups[o]; !ok {
			order = append(order, o)
		}
		groups[o] = append(groups[o], t)
	}
	if len(order) < 2 || len(order) > 12 {
		return nil
	}
	var ts []*Form
	for _, o := range order {
		f := b.expr(r.reduce(groups[o], e.n.den, nil), depth+1)
		if f.Op == FormSum {
			ts = append(ts, f.Args...)
		} else {
			ts = append(ts, f)
		}
	}
	return positiveFirst(ts)
}

// commonFactor takes out only what is a factor of every term as it stands:
// D/k^2*(1 - 1/c^2) rather than D*(c^2 - 1)/(k^2*c^2).
func (b *former) commonFactor(num poly, depth int) *Form {
	r := b.r
	c, m, _ := b.content(num)
	var keep []power
	for _, q := range m.p {
		all := true
		for _, t := range num {
			if e := t.m.degree(q.k); e.n*q.e.n <= 0 {
				all = false
			}
		}
		if all {
			keep = append(keep, q)
		}
	}
	if len(keep) == len(m.p) || len(keep) == 0 || hasAlgebraic(num) {
		return nil
	}
	k := r.internMono(keep)
	p := &prod{b: b, c: c, depth: depth}
	p.mono(k)
	s := b.sum(r.divMono(num, k).scale(coefRat(c.inv())), depth, true)
	if s.Op == FormNeg {
		p.c, s = p.c.neg(), s.Args[0]
	}
	p.form(s, 1)
	return p.build()
}

// content splits num into rational content, monomial content without
// exp(i m), and the rest.
func (b *former) content(num poly) (rat, *mono, poly) {
	r := b.r
	m := r.monoContent(num)
	var keep []power
	mixed := bothSigns(num, func(*kernel) bool { return true })
	for _, q := range m.p {
		if q.k.kind != kindCis && !mixed[q.k] {
			keep = append(keep, q)
		}
	}
	m = r.internMono(keep)
	q := r.divMono(num, m)
	c := ratOne
	if hasCis(q) {
		// numContent may be complex: use the content of the sines and cosines.
		g := ratZero
		for _, t := range b.trigAngles(q) {
			g = ratGCD(ratGCD(g, t.c.re), t.c.im)
		}
		c = g
	} else {
		c = numContent(q).re
	}
	q = q.scale(coefRat(c.inv()))
	return c, m, q
}

func ratGCD(a, b rat) rat {
	if a.isZero() {
		return b.abs()
	}
	if b.isZero() {
		return a.abs()
	}
	g := new(big.Int).GCD(nil, nil, new(big.Int).Mul(new(big.Int).Abs(a.num()), b.den()), new(big.Int).Mul(new(big.Int).Abs(b.num()), a.den()))
	return fromBig(new(big.Rat).SetFrac(g, new(big.Int).Mul(a.den(), b.den())))
}

// factored is content times factors over the denominator's factors.
func (b *former) factored(num poly, den []polyFactor, depth int) *Form {
	r := b.r
	c, m, q := b.content(num)
	p := &prod{b: b, c: c, depth: depth}
	p.mono(m)
	if !q.isConst() {
		for _, f := range b.merged(b.factors(q)) {
			if f.e == 0 { // a sign
				p.c = p.c.neg()
				continue
			}
			s := b.sum(f.p, depth, true)
			if s.Op == FormNeg && f.e%2 == 1 {
				p.c, s = p.c.neg(), s.Args[0]
			}
			p.form(s, f.e)
		}
	} else if len(q) == 1 {
		p.c = p.c.mul(q[0].c.re)
	}
	for _, f := range b.merged(den) {
		dc, dm, dq := b.content(f.p)
		for i := 0; i < f.e; i++ {
			p.c = p.c.mul(dc.inv())
		}
		p.mono(r.monoPow(dm, mkExpo(int64(-f.e), 1)))
		s := b.sum(dq, depth, true)
		if s.Op == FormNeg && f.e%2 == 1 {
			p.c, s = p.c.neg(), s.Args[0]
		}
		p.form(s, -f.e)
	}
	return p.build()
}

// merged multiplies out pairs of factors whose product is shorter, such as
// (a - b)*(a + b).
func (b *former) merged(fs []polyFactor) []polyFactor {
	if len(fs) < 2 || len(fs) > 6 {
		return fs
	}
	out := append([]polyFactor(nil), fs...)
	for i := 0; i < len(out); i++ {
		for j := i + 1; j < len(out); j++ {
			if out[i].e != out[j].e || out[i].e == 0 || len(out[i].p) != 2 || len(out[j].p) != 2 {
				continue
			}
			if p := b.r.mulPoly(out[i].p, out[j].p); len(p) == 2 && !hasCis(p) {
				out[i].p = p
				out = append(out[:j], out[j+1:]...)
				j = i
			}
		}
	}
	return out
}

// factors splits a content-free polynomial; with exp(i m) present every
// factor must be real on its own. A factor with exponent 0 stands for -1.
func (b *former) factors(q poly) []polyFactor {
	r := b.r
	if len(q) > 200 {
		return []polyFactor{{q, 1}}
	}
	for _, mixed := range bothSigns(q, func(*kernel) bool { return true }) {
		if mixed {
			return []polyFactor{{q, 1}}
		}
	}
	if !hasCis(q) {
		fs := r.splitPoly(q)
		prod := poly{{r.one, coefOne}}
		for _, f := range fs {
			prod = r.mulPoly(prod, r.powPoly(f.p, f.e))
		}
		switch {
		case prod.equal(q):
			return fs
		case prod.neg().equal(q):
			return append(fs, polyFactor{})
		}
		return []polyFactor{{q, 1}}
	}
	_, _, z := r.primitive(q)
	fs := r.splitPoly(z)
	if len(fs) < 2 && !(len(fs) == 1 && fs[0].e > 1) {
		return []polyFactor{{q, 1}}
	}
	prod := poly{{r.one, coefOne}}
	for i := range fs {
		s, ok := r.symmetrise(fs[i].p)
		if !ok {
			return []polyFactor{{q, 1}}
		}
		fs[i].p = s
		prod = r.mulPoly(prod, r.powPoly(s, fs[i].e))
	}
	u := r.fromPoly(q).over(r.fromPoly(prod))
	c, ok := u.rational()
	if !ok || !c.abs().isOne() {
		return []polyFactor{{q, 1}}
	}
	if c.sign() < 0 {
		fs = append(fs, polyFactor{})
	}
	return fs
}

// sum prints a polynomial as a sum; collect also tries to group it by one of
// its kernels.
func (b *former) sum(p poly, depth int, collect bool) *Form {
	best := b.expanded(p)
	if !collect || len(p) < 3 || len(p) > 40 || depth >= maxFormDepth || hasCis(p) {
		return best
	}
	for _, k := range p.kernels() {
		exps, cs := b.r.split(p, k)
		if len(exps) < 2 && len(exps[0:1]) == 1 || len(exps) == len(p) {
			continue
		}
		var ts []*Form
		for i, e := range exps {
			t := b.expr(b.r.fromPoly(cs[i]), depth+2)
			neg := t.Op == FormNeg
			if neg {
				t = t.Args[0]
			}
			q := &prod{b: b, c: ratOne, depth: depth}
			q.mono(b.r.kernelMono(k, e))
			if t.Op == FormQuotient {
				q.form(t.Args[0], 1)
				q.form(t.Args[1], -1)
			} else {
				q.form(t, 1)
			}
			g := q.build()
			if neg {
				g = negForm(g)
			}
			ts = append(ts, g)
		}
		best = shorter(best, positiveFirst(ts))
	}
	return best
}

// positiveFirst puts a positive summand in front, so that a sum starts with
// a minus sign only when it must.
func positiveFirst(ts []*Form) *Form {
	if len(ts) > 1 && ts[0].Op == FormNeg {
		for i, t := range ts {
			if t.Op != FormNeg {
				copy(ts[1:i+1], ts[:i])
				ts[0] = t
				return sumForm(ts)
			}
		}
		// All negative: one minus sign in front.
		for i := range ts {
			ts[i] = ts[i].Args[0]
		}
		return negForm(sumForm(ts))
	}
	return sumForm(ts)
}

// expanded prints term by term.
func (b *former) expanded(p poly) *Form {
	if hasCis(p) {
		return b.trigSum(p)
	}
	if q, ok := b.hyperbolic(p); ok {
		return shorter(b.termwise(p), b.termwise(q))
	}
	return b.termwise(p)
}

// termwise prints the terms one by one.
func (b *former) termwise(p poly) *Form {
	ts := append(poly(nil), p...)
	sort.SliceStable(ts, func(i, j int) bool { return displayLess(ts[i].m, ts[j].m) })
	fs := make([]*Form, len(ts))
	for i, t := range ts {
		fs[i] = b.product(t.m, t.c.re, 0)
	}
	return positiveFirst(fs)
}

// displayLess orders summands: descending powers of the declared symbols in
// order of declaration, then functions, constants last.
func displayLess(a, b *mono) bool {
	da, db := totalDegree(a), totalDegree(b)
	if c := da.cmp(db); c != 0 {
		return c > 0
	}
	return compareMono(a, b) > 0
}

// totalDegree in the variables (not the parameters).
func totalDegree(m *mono) rat {
	d := ratZero
	for _, q := range m.p {
		if q.k.kind == kindSymbol && !q.k.attr.Parameter && q.k.rank >= 0 {
			d = d.add(q.e.rat())
		}
	}
	return d
}

func (b *former) product(m *mono, c rat, depth int) *Form {
	p := &prod{b: b, c: c, depth: depth}
	p.mono(m)
	return p.build()
}

// byDerivatives groups the numerator by derivatives of named functions and
// reduces each coefficient on its own.
func (b *former) byDerivatives(e Expr, num poly, depth int) *Form {
	derivative := func(k *kernel) bool {
		if k.kind != kindFunc {
			return false
		}
		for _, d := range k.deriv {
			if d > 0 {
				return true
			}
		}
		return false
	}
	parts := e.splitBy(derivative)
	if len(parts) < 2 {
		return nil
	}
	var ts []*Form
	for _, t := range parts {
		f := b.expr(t.coef, depth+2)
		if !t.fn.IsOne() {
			p := &prod{b: b, c: ratOne, depth: depth}
			neg := f.Op == FormNeg
			if neg {
				f = f.Args[0]
			}
			if f.Op == FormQuotient {
				p.form(f.Args[0], 1)
				p.form(f.Args[1], -1)
			} else {
				p.form(f, 1)
			}
			if len(t.fn.n.den) > 0 {
				return nil
			}
			p.mono(t.fn.n.num[0].m)
			f = p.build()
			if neg {
				f = negForm(f)
			}
		}
		ts = append(ts, f)
	}
	return positiveFirst(ts)
}

// unrationalised tries to put a square root back into the denominator where
// that is shorter: (sqrt(2) v + b)/(2 v^2 - b^2) is 1/(sqrt(2) v - b).
func (b *former) unrationalised(e Expr, num poly, depth int) *Form {
	r := b.r
	if len(e.n.den) == 0 || !hasAlgebraic(num) {
		return nil
	}
	_, _, q := b.content(num)
	conj, ok := r.conjugate(q)
	if !ok {
		return nil
	}
	rest := e.Mul(r.fromPoly(conj))
	if rest.IsZero() || len(rest.n.num) >= len(num) || rest.Size() >= e.Size() {
		return nil
	}
	f := b.expr(rest, depth+1)
	c := b.sum(conj, depth+1, true)
	neg := false
	for _, p := range []**Form{&f, &c} {
		if (*p).Op == FormNeg {
			neg, *p = !neg, (*p).Args[0]
		}
	}
	n, d := f, []*Form{c}
	if f.Op == FormQuotient {
		n = f.Args[0]
		if f.Args[1].Op == FormProduct {
			d = append(append([]*Form(nil), f.Args[1].Args...), c)
		} else {
			d = []*Form{f.Args[1], c}
		}
	}
	g := quotientForm([]*Form{n}, d)
	if neg {
		if s := flipSum(c); s != nil {
			d[len(d)-1] = s
			return quotientForm([]*Form{n}, d)
		}
		g = negForm(g)
	}
	return g
}
