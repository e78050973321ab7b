package algebra

import (
	"errors"
	"fmt"
	"math/big"
)

// ErrNegativeRoot reports an even root of an expression known to be negative.
var ErrNegativeRoot = errors.New("even root of a negative quantity")

// PowInt returns e^n; ErrDivisionByZero for a negative power of zero.
func (e Expr) PowInt(n int) (Expr, error) {
	r := e.n.r
	if n < 0 && e.IsZero() {
		return Expr{}, ErrDivisionByZero
	}
	if n < 0 {
		return e.inv().powNat(-n), nil
	}
	if n == 0 {
		return r.unit, nil
	}
	return e.powNat(n), nil
}

func (e Expr) powNat(n int) Expr {
	r := e.n.r
	if n > 4096 && len(e.n.num)+len(e.n.den) > 1 {
		panic(errTooLarge)
	}
	if len(e.n.num) == 1 && len(e.n.den) == 0 && !hasAlgebraic(e.n.num) {
		if t := e.n.num[0]; t.c.isOne() {
			return r.fromPoly(poly{{r.monoPow(t.m, mkExpo(int64(n), 1)), coefOne}})
		}
	}
	if n > 1<<16 {
		panic(errTooLarge)
	}
	out := r.unit
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			out = out.Mul(e)
		}
		if n > 1 {
			e = e.Mul(e)
		}
	}
	return out
}

// Sqrt returns the principal square root.
func (e Expr) Sqrt() (Expr, error) { return e.powRational(rat{n: 1, d: 2}) }

// Pow returns e^f, the principal power. A power of a product is split only
// over factors whose sign is known.
func (e Expr) Pow(f Expr) (Expr, error) {
	if q, ok := f.rational(); ok {
		return e.powRational(q)
	}
	if e.IsZero() {
		if f.Sign() == Positive {
			return e.n.r.zero, nil
		}
		return Expr{}, ErrDivisionByZero
	}
	return e.powSymbolic(f)
}

// primeFactors splits a positive integer; large cofactors are left whole.
func primeFactors(n *big.Int) (primes []int64, exps []int, rest *big.Int) {
	rest = new(big.Int).Set(n)
	p := new(big.Int)
	m := new(big.Int)
	q := new(big.Int)
	for c := int64(2); c < 1<<14; c++ {
		p.SetInt64(c)
		e := 0
		for {
			q.QuoRem(rest, p, m)
			if m.Sign() != 0 {
				break
			}
			rest.Set(q)
			e++
		}
		if e > 0 {
			primes, exps = append(primes, c), append(exps, e)
		}
		if rest.IsInt64() && rest.Int64() < c*c {
			break
		}
	}
	if rest.IsInt64() && rest.Int64() > 1 && rest.ProbablyPrime(20) {
		primes, exps = append(primes, rest.Int64()), append(exps, 1)
		rest = big.NewInt(1)
	}
	return primes, exps, rest
}

func sqrtRat(q rat) (rat, bool) {
	if q.sign() < 0 {
		return rat{}, false
	}
	n := new(big.Int).Sqrt(q.num())
	d := new(big.Int).Sqrt(q.den())
	if new(big.Int).Mul(n, n).Cmp(q.num()) != 0 || new(big.Int).Mul(d, d).Cmp(q.den()) != 0 {
		return rat{}, false
	}
	return fromBig(new(big.Rat).SetFrac(n, d)), true
}

func (r *Ring) primeKernel(p int64) *kernel {
	return r.intern(&kernel{kind: kindPrime, prime: p, sign: Positive, algebraic: true, period: 1})
}

// ratPower is q^e for q > 0.
func (r *Ring) ratPower(q rat, e expo) Expr {
	out := r.unit
	for i, z := range []*big.Int{q.num(), q.den()} {
		ee := e
		if i == 1 {
			ee = e.neg()
		}
		primes, exps, rest := primeFactors(z)
		for j, p := range primes {
			out = out.Mul(r.kernelPower(r.primeKernel(p), ee.mul(mkExpo(int64(exps[j]), 1))))
		}
		if rest.Cmp(big.NewInt(1)) > 0 {
			b := r.ratExpr(fromBig(new(big.Rat).SetInt(rest)))
			out = out.Mul(r.rootKernel(b, ee))
		}
	}
	return out
}

// rootKernel is b^e with b kept whole.
func (r *Ring) rootKernel(b Expr, e expo) Expr {
	k := &kernel{kind: kindRoot, args: []Expr{b}, algebraic: true, period: 1, base: b}
	if old, ok := r.kernels[kernelKey(k)]; ok {
		return r.kernelPower(old, e)
	}
	k.sign = b.Sign()
	return r.kernelPower(r.intern(k), e)
}

// part is one factor of a product: base^exp, base a kernel or a polynomial.
type part struct {
	base Expr
	k    *kernel // nil for polynomials
	e    expo
	sign Sign
}

// parts splits a non-zero real expression into its rational content and
// factors. ok is false where e is not real.
func (e Expr) parts() (c rat, out []part, ok bool) {
	r := e.n.r
	for _, f := range e.n.den {
		p := f.f.p
		if hasCis(p) {
			if p, ok = r.symmetrise(p); !ok {
				return rat{}, nil, false
			}
			p = trigPrimitive(p)
		}
		out = append(out, part{r.fromPoly(p), nil, mkExpo(int64(-f.e), 1), r.signPoly(p, 2)})
	}
	num := e
	for _, p := range out {
		num = num.Mul(p.base.powNat(int(-p.e.n)))
	}
	if len(num.n.den) > 0 {
		return rat{}, nil, false
	}
	var rest []power
	_, m, q := r.primitive(num.n.num)
	for _, p := range m.p {
		if p.k.kind == kindCis {
			continue
		}
		rest = append(rest, p)
		out = append(out, part{r.kernelExpr1(p.k), p.k, p.e, baseSign(p)})
	}
	left := num.over(r.monoExpr(r.internMono(rest)))
	if !q.isConst() {
		prod := r.unit
		var fs []part
		for _, f := range r.joinHalfAngles(r.splitPoly(q)) {
			g := f.p
			if hasCis(g) {
				if g, ok = r.symmetrise(g); !ok {
					break
				}
				g = trigPrimitive(g)
			}
			fs = append(fs, part{r.fromPoly(g), nil, mkExpo(int64(f.e), 1), r.signPoly(g, 2)})
			prod = prod.Mul(r.fromPoly(g).powNat(f.e))
		}
		if u := left.over(prod); u.isNumber() {
			out = append(out, fs...)
			left = u
		} else {
			out = append(out, part{left, nil, expo{1, 1}, left.Sign()})
			left = r.unit
		}
	}
	c, ok = left.rational()
	if !ok || c.isZero() {
		return rat{}, nil, false
	}
	return c, out, true
}

// trigPrimitive scales a real polynomial in exp(i m) so that its sines,
// cosines and other terms have coprime integer coefficients.
func trigPrimitive(p poly) poly {
	g := ratZero
	for _, t := range p {
		c := t.c
		if hasCis(poly{t}) {
			c = c.mul(coefInt(2)) // one of a conjugate pair
		}
		g = ratGCD(ratGCD(g, c.re), c.im)
	}
	return p.scale(coefRat(g.inv()))
}

// joinHalfAngles multiplies factors such as exp(i x) - 1 and exp(i x) + 1,
// which are real in half angles only, together to sin(x) where they occur
// with the same power.
func (r *Ring) joinHalfAngles(fs []polyFactor) []polyFactor {
	at := map[string]int{}
	var out []polyFactor
	for _, f := range fs {
		key, half := "", false
		for _, k := range f.p.kernels() {
			if k.kind != kindCis {
				continue
			}
			key += k.key + ";"
			d := f.p.degree(k)
			half = half || d.n%2 != 0
		}
		if !half {
			out = append(out, f)
			continue
		}
		key += itoa(f.e)
		if i, ok := at[key]; ok {
			out[i].p = r.prim(r.mulPoly(out[i].p, f.p))
			continue
		}
		at[key] = len(out)
		out = append(out, f)
	}
	return out
}

func (e Expr) isNumber() bool {
	_, ok := e.rational()
	return ok
}

// signAlone is the sign of the kernel itself, of a root's radicand.
func (k *kernel) signAlone() Sign { return k.sign }

// baseSign is the sign of what is raised to the power: where an even root is
// defined its radicand is not negative.
func baseSign(q power) Sign {
	s := q.k.sign
	if q.e.d%2 == 0 {
		s &= NonNegative
		if s == 0 {
			s = NonNegative
		}
	}
	return s
}

// oddPower reports whether b^e has the sign of b: odd powers and odd roots of
// them.
func (e expo) oddPower() bool { return e.n%2 != 0 && e.d%2 != 0 }

// kernelExpr1 is kernel^1; for roots, whose first power is their base, the
// base itself.
func (r *Ring) kernelExpr1(k *kernel) Expr {
	if k.kind == kindPrime {
		return r.Int(k.prime)
	}
	if k.kind == kindRoot {
		return k.base
	}
	return r.kernelExpr(k)
}

// powRational is the principal e^q.
func (e Expr) powRational(q rat) (Expr, error) {
	r := e.n.r
	if q.isInt() {
		if q.big != nil || abs64(q.n) > 1<<20 {
			return Expr{}, ErrTooLarge
		}
		return e.PowInt(int(q.n))
	}
	x, ok := expoFromRat(q)
	if !ok {
		return Expr{}, ErrTooLarge
	}
	if e.IsZero() {
		if q.sign() < 0 {
			return Expr{}, ErrDivisionByZero
		}
		return r.zero, nil
	}
	c, ps, ok := e.parts()
	if !ok {
		return Expr{}, fmt.Errorf("root of the complex quantity %s", e)
	}
	even := x.d%2 == 0
	out := r.ratPower(c.abs(), x)
	neg := c.sign() < 0 // sign collected in front of what stays whole
	whole := r.unit
	for _, p := range ps {
		switch {
		case p.sign.Is(NonNegative):
			out = out.Mul(r.partPower(p, x))
		case p.sign.Is(NonPositive):
			p.base, p.sign = p.base.Neg(), p.sign.neg()
			if p.e.oddPower() {
				neg = !neg
			}
			p.k = nil
			out = out.Mul(r.partPower(p, x))
		case p.e.d%2 != 0 && p.e.n%2 == 0 && even:
			// (u^2)^(1/2) is |u|: the sign of u is not known.
			y := p.e.mul(x)
			b := p.base
			if !(y.d == 1 && y.n%2 == 0) {
				var err error
				if b, err = r.Call("abs", b); err != nil {
					return Expr{}, err
				}
			}
			f, err := b.powRational(y.rat())
			if err != nil {
				return Expr{}, err
			}
			out = out.Mul(f)
		default:
			whole = whole.Mul(r.partPower(p, expo{1, 1}))
		}
	}
	if whole.IsOne() {
		if !neg {
			return out, nil
		}
		if even {
			return Expr{}, fmt.Errorf("%w: (%s)^(%s)", ErrNegativeRoot, e, q)
		}
		if x.n%2 != 0 {
			out = out.Neg()
		}
		return out, nil
	}
	if neg {
		whole = whole.Neg()
	}
	return out.Mul(r.wholePower(whole, x)), nil
}

// partPower is (base^e)^x for a factor of known non-negative sign.
func (r *Ring) partPower(p part, x expo) Expr {
	y := p.e.mul(x)
	if p.k != nil {
		return r.kernelPower(p.k, y)
	}
	if y.isInt() {
		f, err := p.base.PowInt(int(y.n))
		if err != nil {
			panic(err)
		}
		return f
	}
	if t := p.base.n.num; len(t) == 1 && len(p.base.n.den) == 0 {
		// minus a kernel of negative sign
		return r.rootKernel(p.base, y)
	}
	return r.rootKernel(p.base, y)
}

// wholePower is the power of a product of factors of unknown sign.
func (r *Ring) wholePower(b Expr, x expo) Expr {
	if len(b.n.den) == 0 && len(b.n.num) == 1 {
		t := b.n.num[0]
		if t.c.isOne() && len(t.m.p) == 1 {
			q := t.m.p[0]
			if q.e.d == 1 && (q.e.n == 1 || q.e.n == -1) && !q.k.algebraic {
				return r.kernelPower(q.k, q.e.mul(x))
			}
		}
	}
	// A quotient n/d has the sign of n*d.
	d := r.unit
	for _, f := range b.n.den {
		p := f.f.p
		if s, ok := r.symmetrise(p); ok {
			p = s
		}
		d = d.Mul(r.fromPoly(p).powNat(f.e))
	}
	_, m, _ := r.primitive(b.n.num)
	var low []power
	for _, q := range m.p {
		if q.e.n < 0 && q.k.kind != kindCis {
			low = append(low, power{q.k, q.e.neg()})
		}
	}
	d = d.Mul(r.monoExpr(r.internMono(low)))
	if d.IsOne() {
		return r.rootKernel(b, x)
	}
	n := b.Mul(d)
	ad, err := r.Call("abs", d)
	if err != nil {
		return r.rootKernel(b, x)
	}
	return r.rootKernel(n.Mul(d), x).over(ad.mustPow(mkExpo(2*int64(x.n), int64(x.d))))
}

// mustPow is e^x for non-negative e.
func (e Expr) mustPow(x expo) Expr {
	f, err := e.powRational(x.rat())
	if err != nil {
		panic(err)
	}
	return f
}

// linearPart is one summand of an exponent: q times a primitive monomial
// over a denominator.
type linearPart struct {
	q coef
	m Expr
}

// summands writes e as a sum of rational multiples of primitive quotients
// that are linearly independent over the rationals (for a common
// denominator: the polynomial part is divided off first).
func (e Expr) summands() []linearPart {
	r := e.n.r
	if out, ok := e.trigSummands(); ok {
		return out
	}
	var out []linearPart
	quo, rem := poly(nil), e.n.num
	den := r.unit
	if len(e.n.den) > 0 {
		d := e.denPoly()
		quo, rem = r.divRem(e.n.num, d)
		den = r.fromPoly(d)
	}
	for _, t := range quo {
		out = append(out, linearPart{t.c, r.fromPoly(poly{{t.m, coefOne}})})
	}
	for _, t := range rem {
		out = append(out, linearPart{t.c, r.fromPoly(poly{{t.m, coefOne}}).over(den)})
	}
	return out
}

// trigSummands does the same for expressions with exp(i m): conjugate pairs
// become sines and cosines, so that every summand is real. ok is false where
// there is no exp(i m) or the denominator cannot be made real.
func (e Expr) trigSummands() (out []linearPart, ok bool) {
	r := e.n.r
	den := r.unit
	trig := hasCis(e.n.num)
	for _, f := range e.n.den {
		p := f.f.p
		if hasCis(p) {
			trig = true
			if p, ok = r.symmetrise(p); !ok {
				return nil, false
			}
		}
		den = den.Mul(r.fromPoly(p).powNat(f.e))
	}
	num := e.Mul(den)
	if !trig || len(num.n.den) > 0 {
		return nil, false
	}
	coefs := map[*mono]coef{}
	for _, t := range num.n.num {
		coefs[t.m] = t.c
	}
	half := coefRat(rat{n: 1, d: 2})
	for _, t := range num.n.num {
		conj := r.conjMono(t.m)
		b, paired := coefs[conj]
		if conj == t.m {
			out = append(out, linearPart{t.c, r.fromPoly(poly{{t.m, coefOne}}).over(den)})
			continue
		}
		a, m := t.c, t.m
		if compareMono(m, conj) < 0 {
			if paired {
				continue // done with its partner
			}
			a, b, m, conj = coefZero, t.c, conj, t.m
		} else if !paired {
			b = coefZero
		}
		// a E + b/E = (a + b) cos + i (a - b) sin
		cos := r.fromPoly(poly{{m, half}, {conj, half}}).over(den)
		sin := r.fromPoly(poly{{m, half.mul(coefI.neg())}, {conj, half.mul(coefI)}}).over(den)
		for _, s := range []linearPart{{a.add(b), cos}, {a.sub(b).mul(coefI), sin}} {
			if !s.q.isZero() {
				out = append(out, s.normalised(den)...)
			}
		}
	}
	return out, true
}

// normalised gives a sine or cosine over a denominator the content 1/2 that
// it has without one; where the denominator cancels, the summand is split
// anew.
func (s linearPart) normalised(den Expr) []linearPart {
	if den.IsOne() {
		return []linearPart{s}
	}
	if len(s.m.n.den) == 0 {
		out := s.m.summands()
		for i := range out {
			out[i].q = out[i].q.mul(s.q)
		}
		return out
	}
	g := ratZero
	for _, t := range s.m.n.num {
		g = ratGCD(ratGCD(g, t.c.re), t.c.im)
	}
	g = g.mul(ratInt(2))
	return []linearPart{{s.q.mul(coefRat(g)), s.m.Mul(s.m.n.r.ratExpr(g.inv()))}}
}

// divRem is the division with remainder in the lexicographic order; Laurent
// numerators are left whole.
func (r *Ring) divRem(a, b poly) (quo, rem poly) {
	for _, t := range a {
		for _, q := range t.m.p {
			if q.e.n < 0 {
				return nil, a
			}
		}
	}
	acc := r.accumulate(4)
	for len(a) > 0 {
		if !monoDivides(b[0].m, a[0].m) {
			rem = append(rem, a[0])
			a = a[1:]
			continue
		}
		t := term{r.monoMul(a[0].m, r.monoInvRaw(b[0].m)), a[0].c.mul(b[0].c.inv())}
		acc.add(t.m, t.c)
		a = r.subMulTerm(a[1:], b[1:], t)
	}
	return acc.poly(), rem
}

// powSymbolic is e^f for an exponent that is not a number.
func (e Expr) powSymbolic(f Expr) (Expr, error) {
	r := e.n.r
	if e.IsOne() {
		return e, nil
	}
	c, ps, ok := e.parts()
	if !ok {
		return Expr{}, fmt.Errorf("symbolic power of the complex quantity %s", e)
	}
	if e.Sign() == Negative && !f.isInteger() {
		return Expr{}, fmt.Errorf("%w: (%s)^(%s)", ErrNegativeRoot, e, f)
	}
	out := r.unit
	whole := r.unit
	if c.sign() < 0 {
		whole = whole.Neg()
	}
	primes := func(z *big.Int, up bool) {
		g := f
		if !up {
			g = f.Neg()
		}
		ps, es, rest := primeFactors(z)
		for i, p := range ps {
			out = out.Mul(r.symbolicPower(r.Int(p), nil, g.Mul(r.Int(int64(es[i])))))
		}
		if rest.Cmp(big.NewInt(1)) > 0 {
			out = out.Mul(r.symbolicPower(r.ratExpr(fromBig(new(big.Rat).SetInt(rest))), nil, g))
		}
	}
	primes(c.abs().num(), true)
	primes(c.abs().den(), false)
	for _, p := range ps {
		g := f.Mul(r.ratExpr(p.e.rat()))
		switch {
		case p.sign.Is(NonNegative):
			out = out.Mul(r.symbolicPower(p.base, p.k, g))
		case p.sign.Is(NonPositive):
			out = out.Mul(r.symbolicPower(p.base.Neg(), nil, g))
			if p.e.oddPower() {
				whole = whole.Neg()
			}
		default:
			whole = whole.Mul(r.partPower(p, expo{1, 1}))
		}
	}
	if !whole.IsOne() {
		out = out.Mul(r.symbolicPower(whole, nil, f))
	}
	return out, nil
}

// symbolicPower is base^f for a base taken as one piece: a rational power
// times one group-like kernel for each symbolic summand of f.
func (r *Ring) symbolicPower(base Expr, k *kernel, f Expr) Expr {
	if k != nil && (k.kind == kindExp || k.kind == kindPow) {
		// exp(m)^f = exp(m f), (b^m)^f = b^(m f)
		if k.kind == kindExp {
			x, err := r.exp(k.args[0].Mul(f))
			if err != nil {
				panic(err)
			}
			return x
		}
		return r.symbolicPower(k.args[0], nil, k.args[1].Mul(f))
	}
	out := r.unit
	for _, s := range f.summands() {
		if !s.q.isReal() {
			panic(errors.New("algebra: complex exponent"))
		}
		x, ok := expoFromRat(s.q.re)
		if !ok {
			panic(errTooLarge)
		}
		if s.m.IsOne() {
			p, err := base.powRational(s.q.re)
			if err != nil {
				p = r.rootKernel(base, x)
			}
			out = out.Mul(p)
			continue
		}
		sg := Positive
		if base.Sign() != Positive {
			sg = AnyReal
		}
		pk := r.intern(&kernel{kind: kindPow, args: []Expr{base, s.m}, sign: sg})
		out = out.Mul(r.kernelPower(pk, x))
	}
	return out
}
