package algebra

import (
	"errors"
	"fmt"
	"hash/fnv"
	"math/big"
)

// Binding gives the values at which an expression is evaluated.
type Binding struct {
	// Values of the symbols. pi is known.
	Values map[string]*big.Float
	// Arbitrary gives every named function, and each of its derivatives, a
	// deterministic value of its own at each point of its arguments, in
	// accord with its declared sign. Values at different points or of
	// different derivatives are unrelated, as those of an arbitrary function
	// are. Without it a named function is an error: replace it by its formula
	// with SubsFunc.
	Arbitrary bool
	// Seed selects among such arbitrary functions.
	Seed uint64
}

// guardBits are computed beyond the precision that is asked for.
const guardBits = 64

var errArbitraryIntegral = errors.New("the integral of an arbitrary function has no value")

// EvalBig evaluates e with prec bits and some guard bits. Leading digits that
// cancel in sums are lost from the result; ZeroTest shows how to tell. It
// fails where a symbol or formula is missing, outside the real domain of a
// function, at poles, and where the value is not real.
func (e Expr) EvalBig(at Binding, prec uint) (out *big.Float, err error) {
	err = protect(func() error {
		ev := newEvaluator(e.n.r, at, prec+guardBits)
		x := ev.real(e)
		out = new(big.Float).SetPrec(prec).Set(x)
		return nil
	})
	return out, err
}

// EvalFloat evaluates e to double precision. The value is computed in
// extended precision, so that cancellation between summands does no harm; a
// result that no precision up to 1000 bits tells from zero is zero. It fails
// where EvalBig does and where the value overflows; it never returns NaN or
// infinities.
func (e Expr) EvalFloat(at map[string]float64) (float64, error) {
	b := Binding{Values: make(map[string]*big.Float, len(at))}
	for k, v := range at {
		if v != v || v-v != 0 {
			return 0, fmt.Errorf("the value %g of %s is not finite", v, k)
		}
		b.Values[k] = big.NewFloat(v)
	}
	var out float64
	err := protect(func() error {
		for prec := uint(128); prec <= 1024; prec *= 2 {
			x, scale := newEvaluator(e.n.r, b, prec).realScale(e)
			out, _ = x.Float64()
			if out-out != 0 {
				return errOverflow
			}
			if x.Sign() == 0 && scale.Sign() == 0 || x.Sign() != 0 && x.MantExp(nil) > scale.MantExp(nil)-int(prec)+72 {
				return nil
			}
		}
		out = 0
		return nil
	})
	if err != nil {
		return 0, err
	}
	return out, nil
}

// protect turns panics with error values, among them those of math/big on
// operations between infinities, into errors.
func protect(f func() error) (err error) {
	defer func() {
		if x := recover(); x != nil {
			e, ok := x.(error)
			if !ok {
				panic(x)
			}
			var nan big.ErrNaN
			if errors.As(e, &nan) {
				e = errOverflow
			}
			err = e
		}
	}()
	return f()
}

// cplx is a complex number; a nil imaginary part is an exact zero.
type cplx struct{ re, im *big.Float }

func (a *arith) cmul(x, y cplx) cplx {
	switch {
	case x.im == nil && y.im == nil:
		return cplx{a.mul(x.re, y.re), nil}
	case x.im == nil:
		return cplx{a.mul(x.re, y.re), a.mul(x.re, y.im)}
	case y.im == nil:
		return cplx{a.mul(x.re, y.re), a.mul(x.im, y.re)}
	}
	return cplx{a.sub(a.mul(x.re, y.re), a.mul(x.im, y.im)), a.add(a.mul(x.re, y.im), a.mul(x.im, y.re))}
}

func (a *arith) cadd(x, y cplx) cplx {
	out := cplx{a.add(x.re, y.re), x.im}
	switch {
	case x.im == nil:
		out.im = y.im
	case y.im != nil:
		out.im = a.add(x.im, y.im)
	}
	return out
}

func (a *arith) cinv(x cplx) cplx {
	if x.im == nil {
		return cplx{a.div(a.int(1), x.re), nil}
	}
	n := a.add(a.mul(x.re, x.re), a.mul(x.im, x.im))
	return cplx{a.div(x.re, n), a.neg(a.div(x.im, n))}
}

func (a *arith) cpow(x cplx, n int64) cplx {
	if x.im == nil {
		if n < 0 && x.re.Sign() == 0 {
			panic(ErrDivisionByZero)
		}
		return cplx{a.powInt(x.re, n), nil}
	}
	if n < 0 {
		x, n = a.cinv(x), -n
	}
	out := cplx{a.int(1), nil}
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			out = a.cmul(out, x)
		}
		if n > 1 {
			x = a.cmul(x, x)
		}
	}
	return out
}

// cexp is exp(x).
func (a *arith) cexp(x cplx) cplx {
	m := a.exp(x.re)
	if x.im == nil {
		return cplx{m, nil}
	}
	s, c := a.sincos(x.im)
	return cplx{a.mul(m, c), a.mul(m, s)}
}

// size is |re| + |im|.
func (a *arith) size(x cplx) *big.Float {
	s := a.new().Abs(x.re)
	if x.im != nil {
		s = a.add(s, a.new().Abs(x.im))
	}
	return s
}

// evaluator evaluates expressions of one ring at one point.
type evaluator struct {
	*arith
	r    *Ring
	at   Binding
	memo map[*kernel]cplx // value of the kernel's base: see kernelPow
	pows map[power]cplx
}

func newEvaluator(r *Ring, at Binding, prec uint) *evaluator {
	return &evaluator{&arith{prec: prec}, r, at, map[*kernel]cplx{}, map[power]cplx{}}
}

// noise tells whether x is rounding noise beside summands of the given size.
func (ev *evaluator) noise(x, scale *big.Float) bool {
	if x == nil || x.Sign() == 0 {
		return true
	}
	return x.MantExp(nil) < scale.MantExp(nil)-int(ev.prec/2)
}

// expr returns the value of e and the size of its largest summands.
func (ev *evaluator) expr(e Expr) (cplx, *big.Float) {
	v, scale := ev.poly(e.n.num)
	for _, f := range e.n.den {
		d, s := ev.poly(f.f.p)
		size := ev.size(d)
		if ev.noise(size, s) {
			panic(ErrDivisionByZero)
		}
		v = ev.cmul(v, ev.cpow(d, int64(-f.e)))
		scale = ev.mul(scale, ev.powInt(size, int64(-f.e)))
	}
	return v, scale
}

func (ev *evaluator) poly(p poly) (cplx, *big.Float) {
	sum := cplx{ev.int(0), nil}
	scale := ev.int(0)
	for _, t := range p {
		v := cplx{ev.rat(t.c.re.rational()), nil}
		if !t.c.isReal() {
			v.im = ev.rat(t.c.im.rational())
		}
		for _, q := range t.m.p {
			v = ev.cmul(v, ev.kernelPow(q))
		}
		sum = ev.cadd(sum, v)
		if s := ev.size(v); s.Cmp(scale) > 0 {
			scale = s
		}
	}
	return sum, scale
}

// real is the value of an expression that must be real; rounding noise beside
// larger summands counts as zero.
func (ev *evaluator) real(e Expr) *big.Float {
	x, _ := ev.realScale(e)
	return x
}

func (ev *evaluator) realScale(e Expr) (*big.Float, *big.Float) {
	v, scale := ev.expr(e)
	if v.im != nil && !ev.noise(v.im, scale) {
		panic(fmt.Errorf("%s is not real here", e))
	}
	return v.re, scale
}

// realClean also replaces noise by an exact zero, for functions whose value
// jumps there.
func (ev *evaluator) realClean(e Expr) *big.Float {
	x, scale := ev.realScale(e)
	if ev.noise(x, scale) {
		return ev.int(0)
	}
	return x
}

// kernelPow is kernel^exponent.
func (ev *evaluator) kernelPow(q power) cplx {
	if v, ok := ev.pows[q]; ok {
		return v
	}
	v := ev.kernelPowRaw(q)
	ev.pows[q] = v
	return v
}

func (ev *evaluator) kernelPowRaw(q power) cplx {
	b := ev.base(q.k)
	n, d := int64(q.e.n), int64(q.e.d)
	switch q.k.kind {
	case kindExp, kindCis, kindPow:
		// base is the exponent
		x := ev.cmul(b, cplx{ev.rat(q.e.rat().rational()), nil})
		if q.k.kind == kindPow && q.k.args[0].Sign()&Negative != 0 {
			return ev.symbolicPow(q, x)
		}
		return ev.cexp(x)
	}
	if d == 1 {
		return ev.cpow(b, n)
	}
	if b.im != nil {
		panic(fmt.Errorf("fractional power of a complex value"))
	}
	return cplx{ev.root(b.re, n, d), nil}
}

// symbolicPow is b^m for a base that may be negative here: then only integer
// exponents are real.
func (ev *evaluator) symbolicPow(q power, x cplx) cplx {
	b := ev.realClean(q.k.args[0])
	if b.Sign() > 0 {
		return ev.cexp(x)
	}
	m := ev.mul(ev.real(q.k.args[1]), ev.rat(q.e.rat().rational()))
	if !m.IsInt() || b.Sign() == 0 {
		panic(fmt.Errorf("%w: symbolic power of %.6g", ErrNegativeRoot, b))
	}
	n, acc := m.Int64()
	if acc != big.Exact {
		panic(errOverflow)
	}
	return cplx{ev.powInt(b, n), nil}
}

// base is what kernelPow raises to a power: the kernel's value, the radicand
// of a root, the exponent of a group-like kernel.
func (ev *evaluator) base(k *kernel) cplx {
	if v, ok := ev.memo[k]; ok {
		return v
	}
	v := ev.baseRaw(k)
	ev.memo[k] = v
	return v
}

func (ev *evaluator) baseRaw(k *kernel) cplx {
	switch k.kind {
	case kindPrime:
		return cplx{ev.int(k.prime), nil}
	case kindSymbol:
		return cplx{ev.symbol(k), nil}
	case kindFunc:
		return cplx{ev.arbitrary(k), nil}
	case kindExp:
		v, _ := ev.expr(k.args[0])
		return v
	case kindCis:
		v, _ := ev.expr(k.args[0])
		if v.im == nil {
			return cplx{ev.int(0), v.re}
		}
		return cplx{ev.neg(v.im), v.re}
	case kindPow:
		b := ev.realClean(k.args[0])
		if b.Sign() <= 0 {
			return cplx{ev.int(0), nil} // symbolicPow decides
		}
		m, _ := ev.expr(k.args[1])
		return ev.cmul(m, cplx{ev.log(b), nil})
	case kindRoot:
		return cplx{ev.realClean(k.base), nil}
	case kindIntegral:
		return cplx{ev.integral(k), nil}
	case kindTrig:
		s, c := ev.sincos(ev.real(k.args[0]))
		if k.name == "cos" {
			s = c
		}
		return cplx{s, nil}
	}
	return cplx{ev.call(k), nil}
}

func (ev *evaluator) symbol(k *kernel) *big.Float {
	if v, ok := ev.at.Values[k.name]; ok {
		return ev.new().Set(v)
	}
	if k.name == "pi" {
		return ev.new().Set(ev.pi())
	}
	panic(fmt.Errorf("no value is given for %s", k.name))
}

func (ev *evaluator) call(k *kernel) *big.Float {
	x := ev.realClean(k.args[len(k.args)-1])
	switch k.name {
	case "log":
		return ev.log(x)
	case "abs":
		return ev.new().Abs(x)
	case "sign":
		return ev.int(int64(x.Sign()))
	case "erf":
		return ev.erf(x)
	case "gamma":
		return ev.gamma(x)
	case "besseli":
		return ev.besselI(ev.realClean(k.args[0]), x)
	case "polygamma":
		n := ev.realClean(k.args[0])
		m, acc := n.Int64()
		if acc != big.Exact || m < 0 || m > 1000 {
			panic(fmt.Errorf("polygamma of order %.6g", n))
		}
		return ev.polygamma(m, x)
	}
	panic(fmt.Errorf("%s cannot be evaluated", k.name))
}

// arbitraryBits is the resolution at which points count as equal when an
// arbitrary function is given values.
const arbitraryBits = 90

// arbitrary is the value of a derivative of a named function: a hash of its
// name, multi-index and point, brought to (1/4, 9/4) with its declared sign.
func (ev *evaluator) arbitrary(k *kernel) *big.Float {
	if !ev.at.Arbitrary {
		panic(fmt.Errorf("%s is an arbitrary function: give its formula with SubsFunc", k.name))
	}
	h := fnv.New64a()
	fmt.Fprint(h, k.name, k.deriv, ev.at.Seed)
	for _, a := range k.args {
		x := ev.shift(ev.real(a), arbitraryBits)
		half := big.NewFloat(0.5)
		if x.Sign() < 0 {
			half.Neg(half)
		}
		n, _ := x.Add(x, half).Int(nil)
		fmt.Fprint(h, "|", n)
	}
	u := mix(h.Sum64())
	x := ev.shift(ev.new().SetUint64(u>>1|1), -62)
	x = ev.add(x, ev.rat(big.NewRat(1, 4)))
	s := k.sign
	if s&Positive == 0 || s&Negative != 0 && u&1 == 1 {
		x.Neg(x)
	}
	if s == Zero {
		return ev.int(0)
	}
	return x
}

// mix is the finaliser of splitmix64 (Steele, Lea, Flood, OOPSLA 2014).
func mix(z uint64) uint64 {
	z += 0x9E3779B97F4A7C15
	z = (z ^ z>>30) * 0xBF58476D1CE4E5B9
	z = (z ^ z>>27) * 0x94D049BB133111EB
	return z ^ z>>31
}

// integral is the value by the tanh-sinh rule (Takahasi, Mori, Publ. RIMS 9
// (1974) 721), halving the step until two levels agree to working accuracy.
func (ev *evaluator) integral(k *kernel) *big.Float {
	f := k.args[0]
	if f.dependsOnArbitrary(k.name) {
		panic(errArbitraryIntegral)
	}
	lo, hi := ev.real(k.args[1]), ev.real(k.args[2])
	c, h := ev.shift(ev.add(hi, lo), -1), ev.shift(ev.sub(hi, lo), -1)
	// sum over one level; odd points only beyond the first
	sum := func(level int) *big.Float {
		total := ev.int(0)
		for j := int64(0); ; j++ {
			if level > 0 && j%2 == 0 {
				continue
			}
			t := ev.shift(ev.int(j), -level)
			e := ev.exp(t)
			u := ev.mul(ev.shift(ev.pi(), -1), ev.shift(ev.sub(e, ev.div(ev.int(1), e)), -1))
			q := ev.exp(ev.neg(ev.shift(u, 1))) // exp(-2u)
			p := ev.add(ev.int(1), q)
			// weight (pi/2) cosh t / cosh^2 u, distance of the node from the end
			w := ev.mul(ev.shift(ev.pi(), -1), ev.shift(ev.add(e, ev.div(ev.int(1), e)), -1))
			w = ev.div(ev.shift(ev.mul(w, q), 2), ev.mul(p, p))
			if w.MantExp(nil) < -int(ev.prec) {
				return total
			}
			x := ev.mul(h, ev.div(ev.sub(ev.int(1), q), p))
			v := ev.integrand(f, k.name, ev.add(c, x))
			if j > 0 {
				v = ev.add(v, ev.integrand(f, k.name, ev.sub(c, x)))
			}
			total = ev.add(total, ev.mul(w, v))
		}
	}
	acc := sum(0)
	last := ev.mul(acc, h)
	for level := 1; level <= 9; level++ {
		acc = ev.add(acc, sum(level))
		next := ev.mul(h, ev.shift(acc, -level))
		d := ev.sub(next, last)
		// The error squares from level to level: agreement to half the
		// digits is agreement of the next level to all of them.
		if level > 2 && (d.Sign() == 0 || d.MantExp(nil) < next.MantExp(nil)-int(ev.prec)*2/3) {
			return next
		}
		last = next
	}
	panic(fmt.Errorf("the integral over %s does not converge", k.name))
}

func (ev *evaluator) integrand(f Expr, name string, x *big.Float) *big.Float {
	at := ev.at
	at.Values = make(map[string]*big.Float, len(ev.at.Values)+1)
	for s, v := range ev.at.Values {
		at.Values[s] = v
	}
	at.Values[name] = x
	sub := newEvaluator(ev.r, at, ev.prec)
	sub.piV, sub.ln2V, sub.bern = ev.piV, ev.ln2V, ev.bern
	return sub.real(f)
}

// dependsOnArbitrary reports whether a named function of the symbol occurs.
func (e Expr) dependsOnArbitrary(name string) bool {
	found := false
	e.eachKernel(func(k *kernel) {
		if !k.dependsOn(name) {
			return
		}
		if k.kind == kindFunc {
			found = true
		}
		for _, a := range k.args {
			found = found || a.dependsOnArbitrary(name)
		}
	})
	return found
}
