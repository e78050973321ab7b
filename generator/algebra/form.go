package algebra

import (
	"math/big"
	"sort"
	"strings"
)

// FormOp tells what a Form is.
type FormOp uint8

// The kinds of printed nodes.
const (
	FormNumber   FormOp = iota // Num, a non-negative rational
	FormSymbol                 // Name
	FormSum                    // Args; a negative summand is a FormNeg
	FormProduct                // Args
	FormQuotient               // Args[0] / Args[1]
	FormPower                  // Args[0] ^ Args[1]
	FormRoot                   // square root of Args[0]
	FormNeg                    // -Args[0]
	FormCall                   // Name(Args...)
	FormDiff                   // derivative of function Name in Vars, at Args if not nil
	FormIntegral               // integral of Args[0] over Name from Args[1] to Args[2]
	FormImag                   // the imaginary unit
)

// Form is an expression arranged for reading: a tree that any printer
// (source text, Unicode, TeX, MathML, program code) renders without further
// algebra.
type Form struct {
	Op    FormOp
	Num   *big.Rat
	Name  string
	Latex string // the user's own TeX for a symbol or function
	Args  []*Form
	Vars  []string // FormDiff: variable names with repetition
	text  string
}

func (f *Form) isOne() bool  { return f.Op == FormNumber && f.Num.Cmp(big.NewRat(1, 1)) == 0 }
func (f *Form) isZero() bool { return f.Op == FormNumber && f.Num.Sign() == 0 }

func numForm(q rat) *Form {
	if q.sign() < 0 {
		return &Form{Op: FormNeg, Args: []*Form{numForm(q.neg())}}
	}
	return &Form{Op: FormNumber, Num: q.rational()}
}

func negForm(f *Form) *Form {
	if f.Op == FormNeg {
		return f.Args[0]
	}
	if f.isZero() {
		return f
	}
	return &Form{Op: FormNeg, Args: []*Form{f}}
}

func sumForm(fs []*Form) *Form {
	switch len(fs) {
	case 0:
		return numForm(ratZero)
	case 1:
		return fs[0]
	}
	return &Form{Op: FormSum, Args: fs}
}

func productForm(fs []*Form) *Form {
	switch len(fs) {
	case 0:
		return numForm(ratOne)
	case 1:
		return fs[0]
	}
	return &Form{Op: FormProduct, Args: fs}
}

func quotientForm(n, d []*Form) *Form {
	if len(d) == 0 {
		return productForm(n)
	}
	return &Form{Op: FormQuotient, Args: []*Form{productForm(n), productForm(d)}}
}

// Form arranges e for reading: the shortest of several arrangements
// (factored, expanded, collected by derivatives or by a common kernel).
func (e Expr) Form() *Form {
	b := &former{r: e.n.r, memo: map[string]*Form{}}
	return b.expr(e, 0)
}

// former builds forms; memo avoids arranging the same expression twice.
type former struct {
	r    *Ring
	memo map[string]*Form
}

const maxFormDepth = 6

func (b *former) expr(e Expr, depth int) *Form {
	if e.IsZero() {
		return numForm(ratZero)
	}
	key := e.key()
	if f, ok := b.memo[key]; ok {
		return f
	}
	f := b.arrange(e, depth)
	b.memo[key] = f
	return f
}

// arrange tries the arrangements and keeps the shortest.
func (b *former) arrange(e Expr, depth int) *Form {
	num, den, ok := b.realParts(e)
	if !ok {
		return b.complex(e, depth)
	}
	best := b.factored(num, den, depth)
	if depth < maxFormDepth && len(num) > 1 {
		if len(den) == 0 {
			x := b.expanded(num)
			if best.Op == FormQuotient && best.Args[0].Op == FormSum && len(num) <= 4 && !hasAlgebraic(num) && 4*x.cost() <= 5*best.cost() {
				best = x // a sum of quotients reads better than one long quotient
			}
			best = shorter(best, x)
			best = shorter(best, b.commonFactor(num, depth))
		}
		if len(num) <= 400 {
			best = shorter(best, b.byFunctions(e, depth))
			best = shorter(best, b.quotientRule(e, depth))
			best = shorter(best, b.byKernel(e, depth))
			best = shorter(best, b.byDerivatives(e, num, depth))
		}
		if len(num) <= 40 {
			best = shorter(best, b.unrationalised(e, num, depth))
			best = shorter(best, b.divided(e, depth))
		}
	}
	return best
}

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

func shorter(a, b *Form) *Form {
	if b == nil || b.cost() >= a.cost() {
		return a
	}
	return b
}

// cost measures how hard a form is to read: its length, more for sums nested
// in sums, less for the square of a sum.
func (f *Form) cost() int {
	n := len(f.String())
	var walk func(g *Form, depth int)
	walk = func(g *Form, depth int) {
		switch g.Op {
		case FormSum:
			if depth > 0 {
				n += 3 * depth
			}
			depth++
		case FormPower:
			if g.Args[0].Op == FormSum && g.Args[1].String() == "2" {
				n -= 7
			}
		case FormCall, FormRoot, FormIntegral:
			return
		}
		for _, a := range g.Args {
			walk(a, depth)
		}
	}
	walk(f, 0)
	return n
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

// realParts multiplies numerator and denominator by units so that both are
// real when they contain exp(i m).
func (b *former) realParts(e Expr) (poly, []polyFactor, bool) {
	r := b.r
	den := make([]polyFactor, len(e.n.den))
	trig := hasCis(e.n.num)
	for i, f := range e.n.den {
		den[i] = polyFactor{f.f.p, f.e}
		trig = trig || hasCis(f.f.p) || !isRealPoly(f.f.p)
	}
	if !trig {
		for _, t := range e.n.num {
			if !t.c.isReal() {
				return nil, nil, false
			}
		}
		return e.n.num, den, true
	}
	x := e
	var out []polyFactor
	done := map[string]bool{}
	for _, f := range den {
		if isRealPoly(f.p) && !hasCis(f.p) {
			out = append(out, f)
			x = x.Mul(r.fromPoly(f.p).powNat(f.e))
			continue
		}
		if s, ok := r.symmetrise(f.p); ok {
			out = append(out, polyFactor{s, f.e})
			x = x.Mul(r.fromPoly(s).powNat(f.e))
			continue
		}
		// A factor and its conjugate, such as D + i omega and D - i omega,
		// make a real one together.
		if done[f.p.key()] {
			continue
		}
		conj := r.prim(r.conjPoly(f.p))
		for _, g := range den {
			if g.p.equal(conj) {
				done[conj.key()] = true
				f.e = max(f.e, g.e)
			}
		}
		s, ok := r.symmetrise(r.mulPoly(f.p, conj))
		if !ok {
			return nil, nil, false
		}
		out = append(out, polyFactor{s, f.e})
		x = x.Mul(r.fromPoly(s).powNat(f.e))
	}
	if len(x.n.den) > 0 || !r.conjPoly(x.n.num).equal(x.n.num) {
		return nil, nil, false
	}
	return x.n.num, out, true
}

func isRealPoly(p poly) bool {
	for _, t := range p {
		if !t.c.isReal() {
			return false
		}
	}
	return true
}

// complex prints real and imaginary parts; no result of a real model is
// complex, so it serves intermediate steps only.
func (b *former) complex(e Expr, depth int) *Form {
	r := b.r
	var den []*Form
	for _, f := range e.n.den {
		den = append(den, b.power(b.sum(f.f.p, depth+1, true), r.Int(int64(f.e)), depth))
	}
	var ts []*Form
	for _, t := range e.n.num {
		m := b.product(t.m, ratOne, depth)
		if !t.c.re.isZero() {
			ts = append(ts, b.scaled(t.c.re, m))
		}
		if !t.c.im.isZero() {
			ts = append(ts, b.scaled(t.c.im, productForm([]*Form{{Op: FormImag}, m})))
		}
	}
	return quotientForm([]*Form{sumForm(ts)}, den)
}

func (b *former) scaled(c rat, f *Form) *Form {
	g := f
	if !c.abs().isOne() {
		g = productForm([]*Form{numForm(c.abs()), f})
	}
	if c.sign() < 0 {
		return negForm(g)
	}
	return g
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

// hyperbolic turns exponentials of both signs into hyperbolic sines and
// cosines.
func (b *former) hyperbolic(p poly) (poly, bool) {
	r := b.r
	found := false
	for k, mixed := range bothSigns(p, func(*kernel) bool { return true }) {
		if !mixed {
			continue
		}
		found = true
		acc := r.accumulate(len(p))
		for _, t := range p {
			e := t.m.degree(k)
			if e.isZero() {
				acc.add(t.m, t.c)
				continue
			}
			m := r.monoWithout(t.m, k)
			s := t.c
			if e.n < 0 {
				e, s = e.neg(), s.neg()
			}
			angle := k.args[0].Mul(r.ratExpr(e.rat()))
			if angle.leadsNegative() {
				angle, s = angle.Neg(), s.neg()
			}
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cosh", angle), expo{1, 1})), t.c)
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sinh", angle), expo{1, 1})), s)
		}
		p = acc.poly()
	}
	return p, found
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

// trigSum turns conjugate pairs of exp(i m) back into sines and cosines: of
// sums of angles, or products over the separate angles, whichever is shorter.
func (b *former) trigSum(p poly) *Form {
	x := b.expanded(b.trigAngles(p))
	if y, ok := b.trigProducts(p); ok {
		x = shorter(x, b.expanded(y))
	}
	return x
}

func (r *Ring) trigKernel(name string, angle Expr) *kernel {
	return r.intern(&kernel{kind: kindTrig, name: name, args: []Expr{angle}})
}

// trigAngles writes a real Laurent polynomial in exp(i m) with sines and
// cosines of combined angles.
func (b *former) trigAngles(p poly) poly {
	r := b.r
	acc := r.accumulate(len(p))
	for _, t := range p {
		var rest []power
		angle := r.zero
		for _, q := range t.m.p {
			if q.k.kind == kindCis {
				angle = angle.Add(q.k.args[0].Mul(r.ratExpr(q.e.rat())))
			} else {
				rest = append(rest, q)
			}
		}
		m := r.internMono(rest)
		if angle.IsZero() {
			acc.add(m, t.c)
			continue
		}
		// c e^{ia} + conj(c) e^{-ia}: each of the two gives half.
		re, im := t.c.re, t.c.im
		if angle.leadsNegative() {
			angle, im = angle.Neg(), im.neg()
		}
		if !re.isZero() {
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cos", angle), expo{1, 1})), coefRat(re))
		}
		if !im.isZero() {
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sin", angle), expo{1, 1})), coefRat(im.neg()))
		}
	}
	return acc.poly()
}

// trigProducts does the same one angle at a time, which keeps products such
// as sin(a)*cos(b).
func (b *former) trigProducts(p poly) (poly, bool) {
	r := b.r
	var cis []*kernel
	for _, k := range p.kernels() {
		if k.kind == kindCis {
			cis = append(cis, k)
		}
	}
	if len(cis) < 2 || len(cis) > 4 {
		return nil, false
	}
	for _, k := range cis {
		acc := r.accumulate(len(p))
		for _, t := range p {
			e := t.m.degree(k)
			m := r.monoWithout(t.m, k)
			if e.isZero() {
				acc.add(m, t.c)
				continue
			}
			angle := k.args[0].Mul(r.ratExpr(e.rat()))
			s := coefOne
			if angle.leadsNegative() {
				angle, s = angle.Neg(), s.neg()
			}
			// e^{ia} = cos a + i sin a
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cos", angle), expo{1, 1})), t.c)
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sin", angle), expo{1, 1})), t.c.mul(coefI).mul(s))
		}
		p = acc.poly()
	}
	for _, t := range p {
		if !t.c.isReal() {
			return nil, false
		}
	}
	return p, true
}

// prod gathers the factors of a product by base before they are laid out.
type prod struct {
	b     *former
	c     rat
	depth int
	fs    []prodFactor
}

type prodFactor struct {
	class int // constants, parameters, variables, functions, derivatives, others
	k     *kernel
	form  *Form
	e     rat
	sym   Expr // symbolic part of the exponent, if valid
	nonng bool // known non-negative
}

func (p *prod) mono(m *mono) {
	r := p.b.r
	exponent := r.zero // of exp
	symbolic := map[string]Expr{}
	base := map[string]Expr{}
	var order []string
	for _, q := range m.p {
		switch q.k.kind {
		case kindExp:
			exponent = exponent.Add(q.k.args[0].Mul(r.ratExpr(q.e.rat())))
		case kindPow:
			key := q.k.args[0].key()
			if _, ok := symbolic[key]; !ok {
				symbolic[key] = r.zero
				base[key] = q.k.args[0]
				order = append(order, key)
			}
			symbolic[key] = symbolic[key].Add(q.k.args[1].Mul(r.ratExpr(q.e.rat())))
		}
	}
	for _, q := range m.p {
		if q.k.kind == kindExp || q.k.kind == kindPow {
			continue
		}
		e := q.e.rat()
		if q.k.kind != kindPrime {
			key := r.kernelExpr1(q.k).key()
			if s, ok := symbolic[key]; ok {
				// v^a v^(m) is v^(a + m)
				symbolic[key] = s.Add(r.ratExpr(e))
				continue
			}
		}
		p.fs = append(p.fs, prodFactor{class: displayClass(q.k), k: q.k, form: p.b.kernel(q.k, p.depth), e: e, nonng: q.k.signAlone().Is(NonNegative)})
	}
	for _, key := range order {
		p.fs = append(p.fs, prodFactor{class: 7, form: p.b.expr(base[key], p.depth+1), e: ratOne, sym: symbolic[key]})
	}
	if !exponent.IsZero() {
		f := &Form{Op: FormCall, Name: "exp", Args: []*Form{p.b.expr(exponent, p.depth+1)}}
		p.fs = append(p.fs, prodFactor{class: 8, form: f, e: ratOne})
	}
}

func (p *prod) form(f *Form, e int) {
	if f.isOne() {
		return
	}
	if f.Op == FormNumber {
		q := fromBig(f.Num)
		if e < 0 {
			q, e = q.inv(), -e
		}
		for ; e > 0; e-- {
			p.c = p.c.mul(q)
		}
		return
	}
	if f.Op == FormProduct {
		for _, g := range f.Args {
			p.form(g, e)
		}
		return
	}
	p.fs = append(p.fs, prodFactor{class: formClass(f), form: f, e: ratInt(int64(e))})
}

// formClass is displayClass for what is arranged already.
func formClass(f *Form) int {
	switch f.Op {
	case FormSymbol:
		return 3
	case FormPower:
		return formClass(f.Args[0])
	case FormDiff:
		return 5
	case FormSum:
		return 6
	}
	return 7
}

func displayClass(k *kernel) int {
	switch k.kind {
	case kindPrime:
		return 0
	case kindSymbol:
		switch {
		case k.rank < 0:
			return 1
		case k.attr.Parameter:
			return 2
		}
		return 3
	case kindFunc:
		for _, d := range k.deriv {
			if d > 0 {
				return 5
			}
		}
		return 4
	}
	return 7
}

// build lays the factors out as one quotient with one square root above and
// one below.
func (p *prod) build() *Form {
	sort.SliceStable(p.fs, func(i, j int) bool {
		a, b := p.fs[i], p.fs[j]
		if a.class != b.class {
			return a.class < b.class
		}
		if a.k != nil && b.k != nil {
			if a.k.kind == kindTrig && b.k.kind == kindTrig {
				// by angle, the first declared variable first
				if c := compareMono(a.k.args[0].n.num[0].m, b.k.args[0].n.num[0].m); c != 0 {
					return c > 0
				}
			}
			return compareKernels(a.k, b.k) < 0
		}
		return false
	})
	p.merge()
	p.flip()
	c := p.c
	var num, den, rootNum, rootDen []*Form
	for _, f := range p.fs {
		if f.sym.Valid() {
			num = append(num, p.b.power(f.form, f.sym, p.depth))
			continue
		}
		if f.k != nil && f.k.kind == kindPrime && f.e.equal(rat{n: 1, d: 2}) {
			pr := ratInt(f.k.prime)
			if q := c.mul(pr); f.k.prime > 1 && divisible(c, f.k.prime) {
				c = q
				rootDen = append(rootDen, numForm(pr))
			} else {
				rootNum = append(rootNum, numForm(pr))
			}
			continue
		}
		e := f.e
		if f.nonng && e.abs().equal(rat{n: 1, d: 2}) {
			if e.sign() > 0 {
				rootNum = append(rootNum, f.form)
			} else {
				rootDen = append(rootDen, f.form)
			}
			continue
		}
		if e.sign() > 0 {
			num = append(num, p.b.ratPower(f.form, e))
		} else {
			den = append(den, p.b.ratPower(f.form, e.neg()))
		}
	}
	switch {
	case len(rootNum) > 0 && len(rootDen) > 0:
		num = append(num, rootForm(quotientForm(mergeNumbers(rootNum), mergeNumbers(rootDen))))
	case len(rootNum) > 0:
		num = append(num, rootForm(productForm(mergeNumbers(rootNum))))
	case len(rootDen) > 0:
		den = append(den, rootForm(productForm(mergeNumbers(rootDen))))
	}
	a := c.abs()
	if n := fromBig(new(big.Rat).SetInt(a.num())); !n.isOne() || len(num) == 0 {
		num = append([]*Form{numForm(n)}, num...)
	}
	if d := fromBig(new(big.Rat).SetInt(a.den())); !d.isOne() {
		den = append([]*Form{numForm(d)}, den...)
	}
	if len(num) > 1 && num[0].isOne() {
		num = num[1:]
	}
	f := quotientForm(num, den)
	if c.sign() < 0 {
		f = negForm(f)
	}
	return f
}

// merge adds the exponents of factors with the same base, as a root of a
// polynomial and that polynomial in the denominator.
func (p *prod) merge() {
	at := map[string]int{}
	out := p.fs[:0]
	for _, f := range p.fs {
		if f.k != nil && f.k.kind == kindPrime {
			out = append(out, f)
			continue
		}
		key := f.form.String()
		i, ok := at[key]
		if !ok && !f.sym.Valid() && f.e.isInt() && f.form.Op == FormSum {
			// 1 - y and y - 1 are one base up to a sign
			if g := flipSum(f.form); g != nil {
				if i, ok = at[g.String()]; ok && f.e.n%2 != 0 {
					p.c = p.c.neg()
				}
			}
		}
		if !ok {
			at[key] = len(out)
			out = append(out, f)
			continue
		}
		g := &out[i]
		r := p.b.r
		switch {
		case f.sym.Valid() && g.sym.Valid():
			g.sym = g.sym.Add(f.sym)
		case f.sym.Valid():
			g.sym = f.sym.Add(r.ratExpr(g.e))
		case g.sym.Valid():
			g.sym = g.sym.Add(r.ratExpr(f.e))
		default:
			g.e = g.e.add(f.e)
		}
		g.nonng = g.nonng || f.nonng
	}
	p.fs = out[:0]
	for _, f := range out {
		if f.sym.Valid() {
			if q, ok := f.sym.rational(); ok {
				f.sym, f.e = Expr{}, q
			}
		}
		if f.sym.Valid() || !f.e.isZero() {
			p.fs = append(p.fs, f)
		}
	}
}

// flip turns -(a - b) into b - a.
func (p *prod) flip() {
	if p.c.sign() >= 0 {
		return
	}
	for i := range p.fs {
		f := &p.fs[i]
		if f.sym.Valid() || f.form.Op != FormSum || !f.e.isInt() || f.e.n%2 == 0 {
			continue
		}
		if g := flipSum(f.form); g != nil {
			f.form = g
			p.c = p.c.neg()
			return
		}
	}
}

// flipSum is minus a sum that has a negative summand, or nil.
func flipSum(f *Form) *Form {
	if f.Op != FormSum {
		return nil
	}
	ts := make([]*Form, len(f.Args))
	has := false
	for i, t := range f.Args {
		has = has || t.Op == FormNeg
		ts[i] = negForm(t)
	}
	if !has {
		return nil
	}
	return positiveFirst(ts)
}

// mergeNumbers multiplies the numbers under one root.
func mergeNumbers(fs []*Form) []*Form {
	c := ratOne
	var out []*Form
	for _, f := range fs {
		if f.Op == FormNumber {
			c = c.mul(fromBig(f.Num))
			continue
		}
		out = append(out, f)
	}
	if !c.isOne() || len(out) == 0 {
		out = append([]*Form{numForm(c)}, out...)
	}
	return out
}

func divisible(c rat, p int64) bool {
	return new(big.Int).Mod(c.den(), big.NewInt(p)).Sign() == 0
}

func rootForm(f *Form) *Form { return &Form{Op: FormRoot, Args: []*Form{f}} }

func (b *former) ratPower(f *Form, e rat) *Form {
	switch {
	case e.isOne():
		return f
	case e.equal(rat{n: 1, d: 2}):
		return rootForm(f)
	}
	return &Form{Op: FormPower, Args: []*Form{f, numForm(e)}}
}

func (b *former) power(f *Form, e Expr, depth int) *Form {
	if e.IsOne() {
		return f
	}
	return &Form{Op: FormPower, Args: []*Form{f, b.expr(e, depth+1)}}
}

// kernel prints the first power of a kernel (for roots, the base).
func (b *former) kernel(k *kernel, depth int) *Form {
	args := func() []*Form {
		out := make([]*Form, len(k.args))
		for i, a := range k.args {
			out[i] = b.expr(a, depth+1)
		}
		return out
	}
	switch k.kind {
	case kindPrime:
		return numForm(ratInt(k.prime))
	case kindSymbol:
		return &Form{Op: FormSymbol, Name: k.name, Latex: k.attr.Latex}
	case kindRoot:
		return b.expr(k.base, depth+1)
	case kindExp:
		return &Form{Op: FormCall, Name: "exp", Args: args()}
	case kindCis:
		return &Form{Op: FormCall, Name: "cis", Args: args()}
	case kindPow:
		return b.power(b.expr(k.args[0], depth+1), k.args[1], depth)
	case kindFunc:
		return b.function(k, args)
	case kindIntegral:
		return &Form{Op: FormIntegral, Name: k.name, Args: args()}
	}
	return &Form{Op: FormCall, Name: k.name, Args: args()}
}

func (b *former) function(k *kernel, args func() []*Form) *Form {
	f := b.r.funcs[k.name]
	standard := true
	for i, a := range k.args {
		s := b.r.kernelExpr(b.r.symbols[f.args[i]])
		standard = standard && a.Equal(s)
	}
	out := &Form{Op: FormDiff, Name: k.name, Latex: f.attr.Latex}
	for i, n := range k.deriv {
		for ; n > 0; n-- {
			out.Vars = append(out.Vars, f.args[i])
		}
	}
	if !standard {
		out.Args = args()
	}
	if len(out.Vars) == 0 {
		if standard {
			return &Form{Op: FormSymbol, Name: k.name, Latex: f.attr.Latex}
		}
		return &Form{Op: FormCall, Name: k.name, Latex: f.attr.Latex, Args: out.Args}
	}
	if !standard {
		// The declared names, in order, tell the printer what Args replace.
		out.Vars = append(out.Vars, "")
		out.Vars = append(out.Vars, f.args...)
	}
	return out
}

// DiffVars returns the variables of differentiation of a FormDiff and, when
// it is taken at other than the declared arguments, the declared names that
// Args replace.
func (f *Form) DiffVars() (vars, at []string) {
	for i, v := range f.Vars {
		if v == "" {
			return f.Vars[:i], f.Vars[i+1:]
		}
	}
	return f.Vars, nil
}

// String is the source text of the form, readable by the model reader.
func (f *Form) String() string {
	if f.text == "" {
		var b strings.Builder
		f.source(&b, 0)
		f.text = b.String()
	}
	return f.text
}
