package algebra

import (
	"context"
	"errors"
	"math/big"
	"sort"
	"strings"
)

// ErrDivisionByZero reports a division by an expression that is identically
// zero.
var ErrDivisionByZero = errors.New("division by an expression that is identically zero")

// ErrTooLarge reports that an intermediate expression outgrew the budget.
var ErrTooLarge = errors.New("the expression grows beyond the size limit")

var (
	errTooLarge     = ErrTooLarge
	errNegativeRoot = errors.New("algebra: negative power of a root of a polynomial")
)

// maxProduct bounds the number of term products of one multiplication.
const maxProduct = 4 << 20

// Expr is an exact expression: an immutable value in the canonical form
// num / (f1^e1 ... fn^en), where num is a Laurent polynomial in kernels and
// the fi are pairwise coprime primitive polynomials that share no factor with
// num. The zero value is not an expression; make them through a Ring.
type Expr struct{ n *node }

type node struct {
	r   *Ring
	num poly
	den []denFactor // sorted by key
	k   string
}

// factorPoly is an interned denominator factor: primitive, at least two
// terms, no monomial content, normalised leading coefficient.
type factorPoly struct {
	p   poly
	key string
}

type denFactor struct {
	f *factorPoly
	e int
}

// Guard runs f and turns an outgrown computation into ErrTooLarge. Every
// public entry that may meet large expressions uses it, so that no panic
// leaves the package's users.
func Guard(f func() error) (err error) {
	defer func() {
		if x := recover(); x != nil {
			e, ok := x.(error)
			switch {
			case ok && errors.Is(e, ErrTooLarge):
				err = ErrTooLarge
			case ok && (errors.Is(e, context.Canceled) || errors.Is(e, context.DeadlineExceeded)):
				err = e
			default:
				panic(x)
			}
		}
	}()
	return f()
}

// WithBudget is Guard with a limit on the number of elementary operations
// on terms, a few million a second; f fails with ErrTooLarge beyond it. The
// count does not depend on the machine. Budgets nest: an inner one cannot
// exceed what is left of the outer.
func (r *Ring) WithBudget(steps int64, f func() error) error {
	outer := r.budget
	if steps < 1 {
		steps = 1
	}
	if outer > 0 {
		steps = min(steps, outer)
	}
	r.budget = steps
	defer func() {
		if outer > 0 {
			outer = max(1, outer-(steps-r.budget))
		}
		r.budget = outer
	}()
	return Guard(f)
}

// Watch makes long computations in the ring end when the context does: the
// context's error comes out of Guard. Nil stops watching.
func (r *Ring) Watch(ctx context.Context) { r.ctx = ctx }

// spend counts n operations against the budget.
func (r *Ring) spend(n int) {
	if r.ctx != nil {
		if r.sinceLook += n; r.sinceLook > 1<<14 {
			r.sinceLook = 0
			if err := r.ctx.Err(); err != nil {
				panic(err)
			}
		}
	}
	if r.budget == 0 {
		return
	}
	r.budget -= int64(n)
	if r.budget <= 0 {
		r.budget = 1
		panic(errTooLarge)
	}
}

func (r *Ring) fromPoly(p poly) Expr {
	if len(p) == 0 {
		return r.zero
	}
	return Expr{&node{r: r, num: p}}
}

func (r *Ring) kernelExpr(k *kernel) Expr { return r.kernelPower(k, expo{1, 1}) }

func (r *Ring) kernelPower(k *kernel, e expo) Expr {
	if e.isZero() {
		return r.unit
	}
	m := r.kernelMono(k, e)
	if m.needs {
		return r.monoExpr(m)
	}
	return r.fromPoly(poly{{m, coefOne}})
}

// monoExpr brings a raw monomial, whose algebraic kernels may be out of
// range, to canonical form.
func (r *Ring) monoExpr(m *mono) Expr {
	var rest []power
	den := r.unit
	num := r.unit
	for _, q := range m.p {
		if !q.k.algebraic || q.k.kind == kindPrime {
			rest = append(rest, q)
			continue
		}
		n := floorDiv(int64(q.e.n), int64(q.e.d)*int64(q.k.period))
		if e := q.e.sub(mkExpo(n*int64(q.k.period), 1)); !e.isZero() {
			rest = append(rest, power{q.k, e})
		}
		b := q.k.base
		for ; n > 0; n-- {
			num = num.Mul(b)
		}
		for ; n < 0; n++ {
			den = den.Mul(b)
		}
	}
	mm := r.internMono(rest)
	p := poly{{mm, coefOne}}
	if mm.needs {
		p = r.reduceMono(mm)
	}
	return r.fromPoly(p).Mul(num).over(den)
}

// Int returns the integer n.
func (r *Ring) Int(n int64) Expr {
	if n == 0 {
		return r.zero
	}
	return r.fromPoly(poly{{r.one, coefInt(n)}})
}

// Rat returns the rational q.
func (r *Ring) Rat(q *big.Rat) Expr {
	if q.Sign() == 0 {
		return r.zero
	}
	return r.fromPoly(poly{{r.one, coefRat(fromBig(new(big.Rat).Set(q)))}})
}

func (r *Ring) ratExpr(q rat) Expr {
	if q.isZero() {
		return r.zero
	}
	return r.fromPoly(poly{{r.one, coefRat(q)}})
}

func (r *Ring) coefExpr(c coef) Expr {
	if c.isZero() {
		return r.zero
	}
	return r.fromPoly(poly{{r.one, c}})
}

// Frac returns the rational a/b, b != 0.
func (r *Ring) Frac(a, b int64) Expr { return r.ratExpr(normRat(a, b)) }

// Pi returns the constant pi.
func (r *Ring) Pi() Expr { return r.kernelExpr(r.symbols["pi"]) }

// Ring returns the ring that e belongs to.
func (e Expr) Ring() *Ring { return e.n.r }

// Valid reports whether e is an expression and not the zero value.
func (e Expr) Valid() bool { return e.n != nil }

// IsZero reports whether the canonical form of e is zero.
func (e Expr) IsZero() bool { return len(e.n.num) == 0 }

// IsOne reports whether e is the number one.
func (e Expr) IsOne() bool { return len(e.n.den) == 0 && e.n.num.isOne() }

// Equal reports whether the canonical form of e - f is zero.
func (e Expr) Equal(f Expr) bool {
	if e.n == f.n {
		return true
	}
	if len(e.n.den) == 0 && len(f.n.den) == 0 {
		return e.n.num.equal(f.n.num)
	}
	return e.Sub(f).IsZero()
}

// IsConstant returns the value of e if it is a rational number.
func (e Expr) IsConstant() (*big.Rat, bool) {
	q, ok := e.rational()
	if !ok {
		return nil, false
	}
	return new(big.Rat).Set(q.rational()), true
}

func (e Expr) rational() (rat, bool) {
	if len(e.n.den) > 0 || len(e.n.num) > 1 {
		return rat{}, false
	}
	if len(e.n.num) == 0 {
		return ratZero, true
	}
	t := e.n.num[0]
	if !t.m.isOne() || !t.c.isReal() {
		return rat{}, false
	}
	return t.c.re, true
}

// Neg returns -e.
func (e Expr) Neg() Expr { return Expr{&node{r: e.n.r, num: e.n.num.neg(), den: e.n.den}} }

// Add returns e + f.
func (e Expr) Add(f Expr) Expr {
	r := e.n.r
	switch {
	case e.IsZero():
		return f
	case f.IsZero():
		return e
	case len(e.n.den) == 0 && len(f.n.den) == 0:
		return r.fromPoly(addPoly(e.n.num, f.n.num))
	}
	r.spend(len(e.n.num) + len(f.n.num))
	lcm, ea, eb := r.commonDen(e.n.den, f.n.den)
	a := r.raise(e.n.num, lcm, ea)
	b := r.raise(f.n.num, lcm, eb)
	sum := addPoly(a, b)
	// A factor that occurs with different powers on the two sides cannot
	// divide the sum: one summand is free of it and the other is not.
	check := make([]bool, len(lcm))
	for i := range lcm {
		check[i] = ea[i] == eb[i]
	}
	return r.reduce(sum, lcm, check)
}

// Sub returns e - f.
func (e Expr) Sub(f Expr) Expr { return e.Add(f.Neg()) }

// raise multiplies num by what its denominator (exponents have) lacks.
func (r *Ring) raise(num poly, lcm []denFactor, have []int) poly {
	for i, f := range lcm {
		if k := f.e - have[i]; k > 0 {
			num = r.mulPoly(num, r.powPoly(f.f.p, k))
		}
	}
	return num
}

// commonDen merges two denominators over a coprime basis and returns the
// least common one with the exponents that each side had in it.
func (r *Ring) commonDen(a, b []denFactor) (lcm []denFactor, ea, eb []int) {
	a, b = r.refine(a, b)
	i, j := 0, 0
	for i < len(a) || j < len(b) {
		switch {
		case j == len(b) || i < len(a) && a[i].f.key < b[j].f.key:
			lcm, ea, eb = append(lcm, a[i]), append(ea, a[i].e), append(eb, 0)
			i++
		case i == len(a) || b[j].f.key < a[i].f.key:
			lcm, ea, eb = append(lcm, b[j]), append(ea, 0), append(eb, b[j].e)
			j++
		default:
			lcm = append(lcm, denFactor{a[i].f, max(a[i].e, b[j].e)})
			ea, eb = append(ea, a[i].e), append(eb, b[j].e)
			i, j = i+1, j+1
		}
	}
	return lcm, ea, eb
}

// refine splits factors of a and b that share a proper common factor.
func (r *Ring) refine(a, b []denFactor) ([]denFactor, []denFactor) {
	for again := true; again; {
		again = false
	scan:
		for i := range a {
			for j := range b {
				if a[i].f == b[j].f {
					continue
				}
				g := r.gcdFactors(a[i].f, b[j].f)
				if len(g) > 1 {
					a, b = r.splitFactor(a, i, g), r.splitFactor(b, j, g)
					again = true
					break scan
				}
			}
		}
	}
	return a, b
}

func (r *Ring) gcdFactors(f, g *factorPoly) poly {
	if f.key > g.key {
		f, g = g, f
	}
	pair := [2]*factorPoly{f, g}
	if p, ok := r.gcds[pair]; ok {
		return p
	}
	p := r.gcdPoly(f.p, g.p)
	r.gcds[pair] = p
	return p
}

// splitFactor replaces factor i, which g divides, by g and its cofactor.
func (r *Ring) splitFactor(d []denFactor, i int, g poly) []denFactor {
	out := make([]denFactor, 0, len(d)+1)
	for j, f := range d {
		if j != i {
			out = append(out, f)
		}
	}
	q, ok := r.divExact(d[i].f.p, g)
	if !ok {
		panic("algebra: a gcd does not divide")
	}
	out = r.addFactor(out, g, d[i].e)
	if !q.isConst() {
		out = r.addFactor(out, q, d[i].e)
	}
	return out
}

// addFactor multiplies a denominator by p^e, p primitive up to a constant
// that must be one.
func (r *Ring) addFactor(d []denFactor, p poly, e int) []denFactor {
	f := r.internFactor(p)
	out := make([]denFactor, 0, len(d)+1)
	done := false
	for _, g := range d {
		if g.f == f {
			g.e += e
			done = true
		}
		out = append(out, g)
	}
	if !done {
		out = append(out, denFactor{f, e})
		sort.Slice(out, func(i, j int) bool { return out[i].f.key < out[j].f.key })
	}
	return out
}

func (r *Ring) internFactor(p poly) *factorPoly {
	k := p.key()
	if f, ok := r.factors[k]; ok {
		return f
	}
	f := &factorPoly{p: p, key: k}
	r.factors[k] = f
	return f
}

// reduce cancels common factors of num and den; check tells which factors
// may share something with num (nil: all).
func (r *Ring) reduce(num poly, den []denFactor, check []bool) Expr {
	if len(num) == 0 {
		return r.zero
	}
	if len(den) == 0 {
		return r.fromPoly(num)
	}
	var out []denFactor
	todo := make([]denFactor, 0, len(den))
	for i, f := range den {
		if check == nil || check[i] {
			todo = append(todo, f)
		} else {
			out = append(out, f)
		}
	}
	for len(todo) > 0 {
		f := todo[0]
		todo = todo[1:]
		m := r.monoContent(num)
		base := r.divMono(num, m)
		for f.e > 0 {
			q, ok := r.divExact(base, f.f.p)
			if !ok {
				break
			}
			base = q
			f.e--
			num = r.mulTerm(base, term{m, coefOne})
		}
		if f.e == 0 {
			continue
		}
		if g := r.gcdPoly(base, f.f.p); len(g) > 1 {
			q, _ := r.divExact(f.f.p, g)
			// num loses one g; the factor splits into g and its cofactor.
			base, _ = r.divExact(base, g)
			num = r.mulTerm(base, term{m, coefOne})
			if f.e > 1 {
				todo = append(todo, denFactor{r.internFactor(g), f.e - 1})
			}
			if !q.isConst() {
				todo = append(todo, denFactor{r.internFactor(q), f.e})
			}
			continue
		}
		out = append(out, f)
	}
	sort.Slice(out, func(i, j int) bool { return out[i].f.key < out[j].f.key })
	return Expr{&node{r: r, num: num, den: out}}
}

// Mul returns e * f.
func (e Expr) Mul(f Expr) Expr {
	r := e.n.r
	if e.IsZero() || f.IsZero() {
		return r.zero
	}
	if len(e.n.den) == 0 && len(f.n.den) == 0 {
		return r.fromPoly(r.mulPoly(e.n.num, f.n.num))
	}
	// Cancel crosswise first: it keeps the products small.
	a := r.reduce(e.n.num, f.n.den, nil)
	b := r.reduce(f.n.num, e.n.den, nil)
	da, db := r.refine(a.n.den, b.n.den)
	den := da
	for _, g := range db {
		den = r.addFactor(den, g.f.p, g.e)
	}
	num := r.mulPoly(a.n.num, b.n.num)
	if hasAlgebraic(a.n.num) && hasAlgebraic(b.n.num) {
		return r.reduce(num, den, nil)
	}
	return Expr{&node{r: r, num: num, den: den}}
}

func hasAlgebraic(p poly) bool {
	for _, t := range p {
		for _, q := range t.m.p {
			if q.k.algebraic {
				return true
			}
		}
	}
	return false
}

// Div returns e / f, or ErrDivisionByZero.
func (e Expr) Div(f Expr) (Expr, error) {
	if f.IsZero() {
		return Expr{}, ErrDivisionByZero
	}
	return e.over(f), nil
}

// over is e / f for f known to be non-zero.
func (e Expr) over(f Expr) Expr {
	if f.IsOne() {
		return e
	}
	return e.Mul(f.inv())
}

// inv is 1/e for non-zero e.
func (e Expr) inv() Expr {
	r := e.n.r
	num := poly{{r.one, coefOne}}
	for _, f := range e.n.den {
		num = r.mulPoly(num, r.powPoly(f.f.p, f.e))
	}
	return r.fromPoly(num).Mul(r.invPoly(e.n.num))
}

// invPoly is 1/p with every algebraic kernel brought into the numerator where
// that is possible by conjugates.
func (r *Ring) invPoly(p poly) Expr {
	c, m, q := r.primitive(p)
	out := r.monoExpr(r.monoInvRaw(m)).Mul(r.coefExpr(c.inv()))
	if q.isConst() {
		return out
	}
	if conj, ok := r.conjugate(q); ok {
		norm := r.mulPoly(q, conj)
		if len(norm) > 0 {
			return out.Mul(r.fromPoly(conj)).Mul(r.invPoly(norm))
		}
	}
	var den []denFactor
	for _, f := range r.splitPoly(q) {
		den = r.addFactor(den, f.p, f.e)
	}
	return out.Mul(Expr{&node{r: r, num: poly{{r.one, coefOne}}, den: den}})
}

// conjugate finds a multiplier that removes one algebraic kernel of p from
// its norm: t -> -t for square roots, the cubic adjoint for cube roots.
func (r *Ring) conjugate(p poly) (poly, bool) {
	for _, k := range p.kernels() {
		if !k.algebraic {
			continue
		}
		den := exponentDens(p)[k]
		order := int(den) * k.period
		if order%2 == 0 {
			out := make(poly, len(p))
			for i, t := range p {
				e := t.m.degree(k)
				if int(e.n)*int(den)/int(e.d)%2 != 0 {
					t.c = t.c.neg()
				}
				out[i] = t
			}
			if out.equal(p) {
				continue
			}
			return out, true
		}
		if order == 3 {
			v := append(r.dense(p, k, den), nil, nil)
			b := k.basePoly(r)
			if b == nil {
				continue
			}
			c0 := subPoly(r.mulPoly(v[0], v[0]), r.mulPoly(b, r.mulPoly(v[1], v[2])))
			c1 := subPoly(r.mulPoly(b, r.mulPoly(v[2], v[2])), r.mulPoly(v[0], v[1]))
			c2 := subPoly(r.mulPoly(v[1], v[1]), r.mulPoly(v[0], v[2]))
			return r.undense([]poly{c0, c1, c2}, k, den), true
		}
	}
	return nil, false
}

func (k *kernel) basePoly(r *Ring) poly {
	if k.kind == kindPrime {
		return poly{{r.one, coefInt(k.prime)}}
	}
	if len(k.base.n.den) > 0 {
		return nil
	}
	return k.base.n.num
}

// denPoly is the denominator multiplied out.
func (e Expr) denPoly() poly {
	r := e.n.r
	out := poly{{r.one, coefOne}}
	for _, f := range e.n.den {
		out = r.mulPoly(out, r.powPoly(f.f.p, f.e))
	}
	return out
}

// key is a canonical text of e: equal expressions of the supported class
// have equal keys.
func (e Expr) key() string {
	if e.n.k == "" {
		var b strings.Builder
		b.WriteString(e.n.num.key())
		if len(e.n.den) > 0 {
			b.WriteByte('/')
			b.WriteString(e.denPoly().key())
		}
		e.n.k = b.String()
		if e.n.k == "" {
			e.n.k = "0"
		}
	}
	return e.n.k
}

// Symbols returns the names of the free symbols of e, sorted.
func (e Expr) Symbols() []string {
	set := map[string]bool{}
	e.eachKernel(func(k *kernel) {
		for _, s := range k.syms {
			set[s] = true
		}
	})
	out := make([]string, 0, len(set))
	for s := range set {
		out = append(out, s)
	}
	sort.Strings(out)
	return out
}

func (e Expr) eachKernel(f func(*kernel)) {
	seen := map[*kernel]bool{}
	visit := func(p poly) {
		for _, t := range p {
			for _, q := range t.m.p {
				if !seen[q.k] {
					seen[q.k] = true
					f(q.k)
				}
			}
		}
	}
	visit(e.n.num)
	for _, d := range e.n.den {
		visit(d.f.p)
	}
}

// Functions returns the names of the named functions that occur in e, also
// inside other kernels, sorted.
func (e Expr) Functions() []string {
	set := map[string]bool{}
	var visit func(e Expr)
	visit = func(e Expr) {
		e.eachKernel(func(k *kernel) {
			if k.kind == kindFunc {
				set[k.name] = true
			}
			for _, a := range k.args {
				visit(a)
			}
		})
	}
	visit(e)
	out := make([]string, 0, len(set))
	for s := range set {
		out = append(out, s)
	}
	sort.Strings(out)
	return out
}

// DependsOn reports whether the symbol occurs in e.
func (e Expr) DependsOn(name string) bool {
	found := false
	e.eachKernel(func(k *kernel) { found = found || k.dependsOn(name) })
	return found
}

// IsReal reports whether e is real for real values of its symbols.
func (e Expr) IsReal() bool { return e.conj().Equal(e) }

// conj is the complex conjugate.
func (e Expr) conj() Expr {
	r := e.n.r
	out := r.fromPoly(r.conjPoly(e.n.num))
	for _, f := range e.n.den {
		if out.IsZero() {
			break
		}
		out = out.over(r.fromPoly(r.conjPoly(f.f.p)).powNat(f.e))
	}
	return out
}

// Size counts the terms of numerator and denominator: a measure of length.
func (e Expr) Size() int {
	n := len(e.n.num)
	for _, f := range e.n.den {
		n += len(f.f.p)
	}
	return n
}
