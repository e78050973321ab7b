package algebra

import (
	"fmt"
	"math/big"
)

// builtins lists the functions of the expression language with their number
// of arguments.
var builtins = map[string]int{
	"sin": 1, "cos": 1, "tan": 1, "sinh": 1, "cosh": 1, "tanh": 1,
	"exp": 1, "log": 1, "sqrt": 1, "abs": 1, "sign": 1, "erf": 1,
	"gamma": 1, "besseli": 2, "polygamma": 2,
}

// IsBuiltin reports whether name is a function of the expression language,
// and its number of arguments.
func IsBuiltin(name string) (arity int, ok bool) {
	n, ok := builtins[name]
	return n, ok
}

// Call applies a builtin or a declared function.
func (r *Ring) Call(name string, args ...Expr) (out Expr, err error) {
	defer func() {
		if x := recover(); x != nil {
			e, ok := x.(error)
			if !ok {
				panic(x)
			}
			err = e
		}
	}()
	if f, ok := r.funcs[name]; ok {
		if len(args) != len(f.args) {
			return Expr{}, fmt.Errorf("%s takes %d arguments, not %d", name, len(f.args), len(args))
		}
		return r.kernelExpr(r.funcKernel(f, make([]int, len(args)), args)), nil
	}
	n, ok := builtins[name]
	if !ok {
		return Expr{}, fmt.Errorf("unknown function %s", name)
	}
	if n != len(args) {
		return Expr{}, fmt.Errorf("%s takes %d arguments, not %d", name, n, len(args))
	}
	return r.builtin(name, args)
}

func (r *Ring) builtin(name string, args []Expr) (Expr, error) {
	u := args[0]
	switch name {
	case "sqrt":
		return u.Sqrt()
	case "exp":
		return r.exp(u)
	case "sin", "cos", "tan":
		return r.trig(name, u)
	case "sinh", "cosh", "tanh":
		return r.hyperbolic(name, u)
	case "log":
		return r.log(u)
	case "abs":
		return r.abs(u)
	case "sign":
		return r.signFunc(u)
	case "erf":
		if u.IsZero() {
			return r.zero, nil
		}
		if u.leadsNegative() {
			e, err := r.builtin(name, []Expr{u.Neg()})
			return e.Neg(), err
		}
		return r.call(name, u.Sign(), u), nil
	case "gamma":
		return r.gamma(u)
	case "besseli":
		return r.besselI(args[0], args[1])
	case "polygamma":
		return r.call(name, AnyReal, args...), nil
	}
	return Expr{}, fmt.Errorf("unknown function %s", name)
}

func (r *Ring) call(name string, s Sign, args ...Expr) Expr {
	return r.kernelExpr(r.intern(&kernel{kind: kindCall, name: name, args: args, sign: s}))
}

func (r *Ring) funcKernel(f *function, deriv []int, args []Expr) *kernel {
	s := f.attr.Sign
	for _, d := range deriv {
		if d > 0 {
			s = AnyReal
		}
	}
	return r.intern(&kernel{kind: kindFunc, name: f.name, rank: f.rank, deriv: deriv, args: args, sign: s, attr: f.attr})
}

// leadsNegative reports whether the leading coefficient is negative; it
// fixes one of u and -u.
func (e Expr) leadsNegative() bool {
	if len(e.n.num) == 0 {
		return false
	}
	c := e.n.num[0].c
	if hasCis(e.n.num) {
		// c e^{ia} + conj is 2 re cos a - 2 im sin a
		return c.re.sign() < 0 || c.re.isZero() && c.im.sign() > 0
	}
	return c.re.sign() < 0 || c.re.isZero() && c.im.sign() < 0
}

// exp is the exponential, split into one group-like kernel for each
// primitive summand of the exponent.
func (r *Ring) exp(u Expr) (Expr, error) {
	out := r.unit
	for _, s := range u.summands() {
		if !s.q.re.isZero() {
			out = out.Mul(r.expReal(s.q.re, s.m))
		}
		if !s.q.im.isZero() {
			out = out.Mul(r.cis(s.q.im, s.m))
		}
	}
	return out, nil
}

// expReal is exp(q m) for real m.
func (r *Ring) expReal(q rat, m Expr) Expr {
	x, ok := expoFromRat(q)
	if !ok {
		panic(errTooLarge)
	}
	// exp(c log w) is w^c.
	for _, p := range m.n.num[0].m.p {
		if p.k.kind == kindCall && p.k.name == "log" && p.e == (expo{1, 1}) {
			rest := m.over(r.kernelExpr(p.k)).Mul(r.ratExpr(q))
			f, err := p.k.args[0].Pow(rest)
			if err == nil && !rest.hasKernel(p.k) {
				return f
			}
		}
	}
	return r.kernelPower(r.intern(&kernel{kind: kindExp, args: []Expr{m}, sign: Positive}), x)
}

func (e Expr) hasKernel(k *kernel) bool {
	found := false
	e.eachKernel(func(l *kernel) { found = found || l == k })
	return found
}

// cis is exp(i q m) for real m.
func (r *Ring) cis(q rat, m Expr) Expr {
	if m.Equal(r.Pi()) {
		return r.rootOfUnity(q)
	}
	x, ok := expoFromRat(q)
	if !ok {
		panic(errTooLarge)
	}
	return r.kernelPower(r.intern(&kernel{kind: kindCis, args: []Expr{m}}), x)
}

// rootOfUnity is exp(i pi q), in radicals when 12 q is an integer.
func (r *Ring) rootOfUnity(q rat) Expr {
	b := q.rational()
	n := new(big.Int).Mul(b.Num(), big.NewInt(2))
	n.Div(n, b.Denom()) // floor(2q): quarter turns
	f := new(big.Rat).Sub(b, new(big.Rat).SetFrac(n, big.NewInt(2)))
	quarter := int(new(big.Int).Mod(n, big.NewInt(4)).Int64())
	c := coefOne
	for ; quarter > 0; quarter-- {
		c = c.mul(coefI)
	}
	out := r.coefExpr(c)
	j := new(big.Rat).Mul(f, big.NewRat(12, 1))
	if j.IsInt() {
		half := coefRat(rat{n: 1, d: 2})
		ihalf := half.mul(coefI)
		sqrt := func(p int64) Expr { return r.kernelPower(r.primeKernel(p), expo{1, 2}) }
		c6 := sqrt(3).Mul(r.coefExpr(half)).Add(r.coefExpr(ihalf))           // exp(i pi/6)
		c4 := sqrt(2).Mul(r.coefExpr(half.add(ihalf)))                       // exp(i pi/4)
		c6i := sqrt(3).Mul(r.coefExpr(half)).Sub(r.coefExpr(ihalf))          // exp(-i pi/6)
		table := []Expr{r.unit, c4.Mul(c6i), c6, c4, c6.Mul(c6), c4.Mul(c6)} // k pi/12
		return out.Mul(table[j.Num().Int64()])
	}
	x, ok := expoFromRat(fromBig(f))
	if !ok {
		panic(errTooLarge)
	}
	return out.Mul(r.kernelPower(r.intern(&kernel{kind: kindCis, args: []Expr{r.Pi()}}), x))
}

func (r *Ring) trig(name string, u Expr) (Expr, error) {
	e, err := r.exp(u.Mul(r.coefExpr(coefI)))
	if err != nil {
		return Expr{}, err
	}
	f := e.inv()
	half := r.Frac(1, 2)
	cos := e.Add(f).Mul(half)
	sin := e.Sub(f).Mul(half).Mul(r.coefExpr(coefI.neg()))
	switch name {
	case "cos":
		return cos, nil
	case "sin":
		return sin, nil
	}
	if cos.IsZero() {
		return Expr{}, fmt.Errorf("tan(%s) is infinite: %w", u, ErrDivisionByZero)
	}
	return sin.over(cos), nil
}

func (r *Ring) hyperbolic(name string, u Expr) (Expr, error) {
	e, err := r.exp(u)
	if err != nil {
		return Expr{}, err
	}
	f := e.inv()
	switch name {
	case "cosh":
		return e.Add(f).Mul(r.Frac(1, 2)), nil
	case "sinh":
		return e.Sub(f).Mul(r.Frac(1, 2)), nil
	}
	return e.Sub(f).over(e.Add(f)), nil
}

// log splits the logarithm over factors of known positive sign.
func (r *Ring) log(u Expr) (Expr, error) {
	if u.IsZero() {
		return Expr{}, fmt.Errorf("logarithm of zero")
	}
	c, ps, ok := u.parts()
	if !ok {
		return Expr{}, fmt.Errorf("logarithm of the complex quantity %s", u)
	}
	if u.Sign() == Negative {
		return Expr{}, fmt.Errorf("logarithm of the negative quantity %s", u)
	}
	out := r.zero
	whole := r.unit
	if c.sign() < 0 {
		whole = whole.Neg()
	}
	number := func(z *big.Int, s int64) {
		primes, exps, rest := primeFactors(z)
		for i, p := range primes {
			out = out.Add(r.call("log", AnyReal, r.Int(p)).Mul(r.Int(s * int64(exps[i]))))
		}
		if rest.Cmp(big.NewInt(1)) > 0 {
			out = out.Add(r.call("log", Positive, r.ratExpr(fromBig(new(big.Rat).SetInt(rest)))).Mul(r.Int(s)))
		}
	}
	number(c.abs().num(), 1)
	number(c.abs().den(), -1)
	for _, p := range ps {
		switch {
		case p.sign.Is(NonNegative):
			out = out.Add(r.logPart(p.base, p.k).Mul(r.ratExpr(p.e.rat())))
		case p.sign.Is(NonPositive):
			out = out.Add(r.logPart(p.base.Neg(), nil).Mul(r.ratExpr(p.e.rat())))
			if p.e.oddPower() {
				whole = whole.Neg()
			}
		default:
			whole = whole.Mul(r.partPower(p, expo{1, 1}))
		}
	}
	if !whole.IsOne() {
		out = out.Add(r.call("log", AnyReal, whole))
	}
	return out, nil
}

func (r *Ring) logPart(base Expr, k *kernel) Expr {
	if k != nil {
		switch k.kind {
		case kindExp:
			return k.args[0]
		case kindPow:
			l, err := r.log(k.args[0])
			if err != nil {
				panic(err)
			}
			return k.args[1].Mul(l)
		}
	}
	return r.call("log", AnyReal, base)
}

// abs is the absolute value, taken factor by factor.
func (r *Ring) abs(u Expr) (Expr, error) {
	switch s := u.Sign(); {
	case s.Is(NonNegative):
		return u, nil
	case s.Is(NonPositive):
		return u.Neg(), nil
	}
	c, ps, ok := u.parts()
	if !ok {
		return Expr{}, fmt.Errorf("absolute value of the complex quantity %s", u)
	}
	out := r.ratExpr(c.abs())
	for _, p := range ps {
		if p.sign.Is(NonNegative) {
			out = out.Mul(r.partPower(p, expo{1, 1}))
			continue
		}
		if p.sign.Is(NonPositive) {
			out = out.Mul(r.partPower(part{base: p.base.Neg(), e: p.e}, expo{1, 1}))
			continue
		}
		b := p.base
		if b.leadsNegative() {
			b = b.Neg()
		}
		k := r.intern(&kernel{
			kind: kindCall, name: "abs", args: []Expr{b}, sign: b.Sign()&Zero | Positive,
			algebraic: true, period: 2, base: b.Mul(b),
		})
		out = out.Mul(r.kernelPower(k, p.e))
	}
	return out, nil
}

func (r *Ring) signFunc(u Expr) (Expr, error) {
	switch u.Sign() {
	case Positive:
		return r.unit, nil
	case Negative:
		return r.unit.Neg(), nil
	case Zero:
		return r.zero, nil
	}
	c, ps, ok := u.parts()
	if !ok {
		return Expr{}, fmt.Errorf("sign of the complex quantity %s", u)
	}
	rest := r.unit
	neg := c.sign() < 0
	for _, p := range ps {
		switch {
		case p.sign == Positive:
		case p.sign == Negative:
			neg = neg != p.e.oddPower()
		default:
			rest = rest.Mul(r.partPower(p, expo{1, 1}))
		}
	}
	if rest.leadsNegative() {
		rest, neg = rest.Neg(), !neg
	}
	out := r.call("sign", u.Sign()|NonZero, rest)
	if neg {
		out = out.Neg()
	}
	return out, nil
}

// gamma shifts a rational constant in the argument into [0, 1), a number
// into (0, 1], and knows the values at integers and half-integers.
func (r *Ring) gamma(u Expr) (Expr, error) {
	if q, ok := u.rational(); ok && q.isInt() && q.sign() <= 0 {
		return Expr{}, fmt.Errorf("gamma(%s) is infinite", u)
	}
	out := r.unit
	shift := u.constantTerm()
	if shift.big == nil {
		n := floorDiv(shift.n, shift.d)
		if u.isNumber() {
			n = -floorDiv(-shift.n, shift.d) - 1 // ceil - 1
		}
		if n < 64 && n > -64 {
			for ; n > 0; n-- {
				u = u.Sub(r.unit)
				out = out.Mul(u)
			}
			for ; n < 0; n++ {
				out = out.over(u)
				u = u.Add(r.unit)
			}
		}
	}
	if u.IsOne() {
		return out, nil
	}
	if q, ok := u.rational(); ok && q.equal(rat{n: 1, d: 2}) {
		return out.Mul(r.Pi().mustPow(expo{1, 2})), nil
	}
	s := AnyReal
	if u.Sign() == Positive {
		s = Positive
	}
	return out.Mul(r.call("gamma", s, u)), nil
}

// constantTerm is the rational constant summand of a polynomial expression.
func (e Expr) constantTerm() rat {
	if len(e.n.den) > 0 {
		return ratZero
	}
	for _, t := range e.n.num {
		if t.m.isOne() {
			return t.c.re
		}
	}
	return ratZero
}

// besselI reduces integer orders to 0 and 1 by I_{n+1} = I_{n-1} - 2n/z I_n
// (Abramowitz and Stegun 9.6.26) and makes the sign of z unique.
func (r *Ring) besselI(order, z Expr) (Expr, error) {
	q, ok := order.rational()
	if !ok || !q.isInt() || q.big != nil || abs64(q.n) > 24 {
		s := AnyReal
		if z.Sign() == Positive && order.Sign().Is(NonNegative) {
			s = Positive
		}
		return r.call("besseli", s, order, z), nil
	}
	n := int(abs64(q.n)) // I_{-n} = I_n
	if z.IsZero() {
		if n == 0 {
			return r.unit, nil
		}
		return r.zero, nil
	}
	neg := false
	if z.leadsNegative() {
		z = z.Neg()
		neg = n%2 == 1
	}
	odd := z.Sign()
	i0 := r.call("besseli", Positive, r.zero, z)
	i1 := r.call("besseli", odd, r.unit, z)
	a, b := i0, i1
	if n == 0 {
		return i0, nil
	}
	for k := 1; k < n; k++ {
		a, b = b, a.Sub(b.Mul(r.Int(int64(2*k))).over(z))
	}
	if neg {
		b = b.Neg()
	}
	return b, nil
}

// Integral is the definite integral of f over the dummy variable between the
// bounds, kept by name. The dummy must be a declared symbol.
func (r *Ring) Integral(f Expr, dummy string, lo, hi Expr) Expr {
	if f.IsZero() || lo.Equal(hi) {
		return r.zero
	}
	out := r.zero
	add := func(coef, fn Expr) {
		if fn.IsOne() {
			out = out.Add(coef.Mul(hi.Sub(lo)))
			return
		}
		k := r.intern(&kernel{kind: kindIntegral, name: dummy, args: []Expr{fn, lo, hi}})
		out = out.Add(coef.Mul(r.kernelExpr(k)))
	}
	// Sines and cosines stay real.
	if parts, err := f.SplitReal(dummy); err == nil {
		for _, p := range parts {
			add(p.Coef, p.Fn)
		}
		return out
	}
	for _, g := range f.splitBy(func(k *kernel) bool { return k.dependsOn(dummy) }) {
		add(g.coef, g.fn)
	}
	return out
}

func hasCis(p poly) bool {
	for _, t := range p {
		for _, q := range t.m.p {
			if q.k.kind == kindCis {
				return true
			}
		}
	}
	return false
}

// conjPoly is the complex conjugate: all kernels are real but exp(i m).
func (r *Ring) conjPoly(p poly) poly {
	acc := r.accumulate(len(p))
	for _, t := range p {
		acc.add(r.conjMono(t.m), t.c.conj())
	}
	return acc.poly()
}

func (r *Ring) conjMono(m *mono) *mono {
	q := make([]power, len(m.p))
	for i, x := range m.p {
		if x.k.kind == kindCis {
			x.e = x.e.neg()
		}
		q[i] = x
	}
	return r.internMono(q)
}

// symmetrise multiplies p by a unit (a number and powers of exp(i m)) so
// that the result is real, if that is possible.
func (r *Ring) symmetrise(p poly) (poly, bool) {
	var shift []power
	for _, k := range p.kernels() {
		if k.kind != kindCis {
			continue
		}
		lo, hi := p[0].m.degree(k), p[0].m.degree(k)
		for _, t := range p[1:] {
			d := t.m.degree(k)
			if d.cmp(lo) < 0 {
				lo = d
			}
			if d.cmp(hi) > 0 {
				hi = d
			}
		}
		if s := lo.add(hi).mul(expo{-1, 2}); !s.isZero() {
			shift = append(shift, power{k, s})
		}
	}
	q := r.mulTerm(p, term{r.internMono(shift), coefOne})
	c := r.conjPoly(q)
	if len(c) != len(q) || len(q) == 0 {
		return nil, false
	}
	// conj(q) = u q must hold with one number u.
	u := c[0].c.mul(q[0].c.inv())
	if !c.equal(q.scale(u)) {
		return nil, false
	}
	k := coefOne.add(u)
	if k.isZero() {
		k = coefI
	}
	q = q.scale(k)
	n := numContent(q)
	if n.isReal() {
		q = q.scale(coefRat(n.re.abs()).inv())
	}
	return q, true
}
