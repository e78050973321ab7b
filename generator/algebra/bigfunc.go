package algebra

import (
	"errors"
	"fmt"
	"math"
	"math/big"
)

// errOverflow reports an exponential beyond the range of the evaluation.
var errOverflow = errors.New("the value overflows")

// arith is real arithmetic at one binary precision with the elementary and
// special functions that expressions use. Domain errors are panics with an
// error value; the evaluator's entry points return them.
//
// Methods: R.P. Brent, P. Zimmermann, Modern Computer Arithmetic (2010), ch.
// 4, for argument reduction, Newton and Halley inversion and Bernoulli
// numbers; Abramowitz and Stegun for the series named at each function.
type arith struct {
	prec uint
	piV  *big.Float
	ln2V *big.Float
	bern []*big.Rat
}

func (a *arith) at(prec uint) *arith {
	return &arith{prec: prec, piV: a.piV, ln2V: a.ln2V, bern: a.bern}
}

func (a *arith) new() *big.Float                { return new(big.Float).SetPrec(a.prec) }
func (a *arith) int(n int64) *big.Float         { return a.new().SetInt64(n) }
func (a *arith) rat(q *big.Rat) *big.Float      { return a.new().SetRat(q) }
func (a *arith) add(x, y *big.Float) *big.Float { return a.new().Add(x, y) }
func (a *arith) sub(x, y *big.Float) *big.Float { return a.new().Sub(x, y) }
func (a *arith) mul(x, y *big.Float) *big.Float { return a.new().Mul(x, y) }
func (a *arith) neg(x *big.Float) *big.Float    { return a.new().Neg(x) }

func (a *arith) div(x, y *big.Float) *big.Float {
	if y.Sign() == 0 {
		panic(ErrDivisionByZero)
	}
	return a.new().Quo(x, y)
}

// shift is x * 2^n.
func (a *arith) shift(x *big.Float, n int) *big.Float { return a.new().SetMantExp(x, n) }

// atanInv is atan(1/n) (sign -1) or atanh(1/n) (sign 1) times 2^bits.
func atanInv(n int64, sign int64, bits uint) *big.Int {
	sum := new(big.Int)
	pow := new(big.Int).Lsh(big.NewInt(1), bits)
	pow.Quo(pow, big.NewInt(n))
	sq := big.NewInt(n * n)
	t := new(big.Int)
	for k, s := int64(1), int64(1); pow.Sign() != 0; k, s = k+2, s*sign {
		t.Quo(pow, big.NewInt(k))
		if s > 0 {
			sum.Add(sum, t)
		} else {
			sum.Sub(sum, t)
		}
		pow.Quo(pow, sq)
	}
	return sum
}

func combine(bits uint, sign int64, pairs ...[2]int64) *big.Float {
	sum := new(big.Int)
	for _, p := range pairs {
		sum.Add(sum, new(big.Int).Mul(big.NewInt(p[0]), atanInv(p[1], sign, bits)))
	}
	f := new(big.Float).SetPrec(bits).SetInt(sum)
	return f.SetMantExp(f, -int(bits))
}

// pi by Machin's formula 16 atan(1/5) - 4 atan(1/239).
func (a *arith) pi() *big.Float {
	if a.piV == nil || a.piV.Prec() < a.prec+16 {
		a.piV = combine(a.prec+32, -1, [2]int64{16, 5}, [2]int64{-4, 239})
	}
	return a.piV
}

// ln2 is 18 atanh(1/26) - 2 atanh(1/4801) + 8 atanh(1/8749).
func (a *arith) ln2() *big.Float {
	if a.ln2V == nil || a.ln2V.Prec() < a.prec+16 {
		a.ln2V = combine(a.prec+32, 1, [2]int64{18, 26}, [2]int64{-2, 4801}, [2]int64{8, 8749})
	}
	return a.ln2V
}

// reduce writes x = k*c + r with |r| <= c/2.
func (a *arith) reduce(x, c *big.Float) (k int64, r *big.Float) {
	q := a.div(x, c)
	half := big.NewFloat(0.5)
	if q.Sign() < 0 {
		half.Neg(half)
	}
	q.Add(q, half)
	n, _ := q.Int(nil)
	if !n.IsInt64() {
		panic(errOverflow)
	}
	return n.Int64(), a.sub(x, a.mul(a.new().SetInt(n), c))
}

// extra bits that the integer part of x takes.
func integerBits(x *big.Float) uint {
	if x.Sign() == 0 {
		return 0
	}
	return uint(max(0, x.MantExp(nil)))
}

func (a *arith) exp(x *big.Float) *big.Float {
	if x.Sign() == 0 {
		return a.int(1)
	}
	if integerBits(x) > 30 {
		panic(errOverflow)
	}
	s := 4 + int(math.Sqrt(float64(a.prec))/2)
	w := a.at(a.prec + 32 + integerBits(x) + uint(s))
	k, r := w.reduce(x, w.ln2())
	a.ln2V = w.ln2V
	r = w.shift(r, -s)
	sum, t := w.int(1), w.int(1)
	for n := int64(1); ; n++ {
		t = w.div(w.mul(t, r), w.int(n))
		if t.Sign() == 0 || t.MantExp(nil) < -int(w.prec) {
			break
		}
		sum = w.add(sum, t)
	}
	for ; s > 0; s-- {
		sum = w.mul(sum, sum)
	}
	return a.new().SetMantExp(sum, int(k))
}

// sincos halves the argument and doubles 1 - cos, which keeps its relative
// accuracy.
func (a *arith) sincos(x *big.Float) (sin, cos *big.Float) {
	if x.Sign() == 0 {
		return a.int(0), a.int(1)
	}
	if integerBits(x) > 4096 {
		panic(errOverflow)
	}
	s := 4 + int(math.Sqrt(float64(a.prec))/2)
	w := a.at(a.prec + 32 + integerBits(x) + 2*uint(s))
	half := w.shift(w.pi(), -1)
	a.piV = w.piV
	q := w.div(x, half)
	if q.Sign() >= 0 {
		q.Add(q, big.NewFloat(0.5))
	} else {
		q.Sub(q, big.NewFloat(0.5))
	}
	n, _ := q.Int(nil)
	r := w.sub(x, w.mul(w.new().SetInt(n), half))
	quarter := new(big.Int).And(n, big.NewInt(3)).Int64()
	// v = 1 - cos(r/2^s) = sum (-1)^(k+1) r^(2k)/(2k)!
	sq := w.shift(w.mul(r, r), -2*s)
	v, t := w.int(0), w.int(-1)
	for k := int64(1); r.Sign() != 0; k++ {
		t = w.neg(w.div(w.mul(t, sq), w.int(2*k*(2*k-1))))
		if t.MantExp(nil) < sq.MantExp(nil)-int(w.prec) {
			break
		}
		v = w.add(v, t)
	}
	two := w.int(2)
	for ; s > 0; s-- {
		v = w.mul(w.shift(v, 1), w.sub(two, v)) // 1-cos 2r = 2 v (2 - v)
	}
	c := w.sub(w.int(1), v)
	sn := w.new().Sqrt(w.mul(v, w.sub(two, v)))
	if r.Sign() < 0 {
		sn.Neg(sn)
	}
	switch quarter {
	case 1:
		sn, c = c, w.neg(sn)
	case 2:
		sn, c = w.neg(sn), w.neg(c)
	case 3:
		sn, c = w.neg(c), sn
	}
	return a.new().Set(sn), a.new().Set(c)
}

// log by Halley's iteration y += 2 (m - e^y)/(m + e^y) on the mantissa.
func (a *arith) log(x *big.Float) *big.Float {
	if x.Sign() <= 0 {
		panic(fmt.Errorf("logarithm of the non-positive value %.6g", x))
	}
	m := a.new().SetPrec(max(a.prec, x.Prec()))
	e := x.MantExp(m)
	if m.Cmp(big.NewFloat(math.Sqrt2/2)) < 0 {
		m.SetMantExp(m, 1)
		e--
	}
	d := new(big.Float).SetPrec(m.Prec()+2).Sub(m, big.NewFloat(1))
	lost := uint(0)
	if d.Sign() == 0 {
		if e == 0 {
			return a.int(0)
		}
	} else {
		lost = uint(max(0, -d.MantExp(nil)))
	}
	w := a.at(a.prec + 32 + lost)
	d64, _ := d.Float64()
	y := w.new().SetFloat64(math.Log1p(d64))
	for p := uint(48); p < w.prec && d.Sign() != 0; p *= 3 {
		ey := w.exp(y)
		y = w.add(y, w.div(w.shift(w.sub(m, ey), 1), w.add(m, ey)))
	}
	if e != 0 {
		y = w.add(y, w.mul(w.int(int64(e)), w.ln2()))
	}
	a.ln2V = w.ln2V
	return a.new().Set(y)
}

func (a *arith) powInt(x *big.Float, n int64) *big.Float {
	inv := n < 0
	if inv {
		n = -n
	}
	w := a.at(a.prec + 16)
	out, b := w.int(1), w.new().Set(x)
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			out = w.mul(out, b)
		}
		if n > 1 {
			b = w.mul(b, b)
		}
	}
	if inv {
		out = w.div(w.int(1), out)
	}
	return a.new().Set(out)
}

// root is the real x^(n/d): for negative x the odd roots are negative, the
// even ones an error.
func (a *arith) root(x *big.Float, n, d int64) *big.Float {
	switch {
	case d == 1:
		return a.powInt(x, n)
	case x.Sign() == 0:
		if n < 0 {
			panic(ErrDivisionByZero)
		}
		return a.int(0)
	case x.Sign() < 0:
		if d%2 == 0 {
			panic(fmt.Errorf("%w: %.6g", ErrNegativeRoot, x))
		}
		out := a.root(a.neg(x), n, d)
		if n%2 != 0 {
			out.Neg(out)
		}
		return out
	case d == 2:
		w := a.at(a.prec + 16)
		return a.powInt(w.new().Sqrt(x), n)
	}
	w := a.at(a.prec + 32)
	y := w.mul(w.log(x), w.rat(big.NewRat(n, d)))
	return a.new().Set(w.exp(y))
}

// erf by 7.1.6 of Abramowitz and Stegun, whose terms have one sign.
func (a *arith) erf(x *big.Float) *big.Float {
	if x.Sign() == 0 {
		return a.int(0)
	}
	if f, _ := x.Float64(); f*f > float64(a.prec+16)*math.Ln2 {
		return a.int(int64(x.Sign()))
	}
	w := a.at(a.prec + 48)
	sq := w.shift(w.mul(x, x), 1)
	sum, t := w.new().Set(x), w.new().Set(x)
	for n := int64(1); ; n++ {
		t = w.div(w.mul(t, sq), w.int(2*n+1))
		sum = w.add(sum, t)
		if t.MantExp(nil) < sum.MantExp(nil)-int(w.prec) {
			break
		}
	}
	e := w.exp(w.neg(w.mul(x, x)))
	out := w.mul(w.shift(e, 1), sum)
	return a.new().Set(w.div(out, w.new().Sqrt(w.pi())))
}

// bernoulli returns B_2, B_4, ..., B_2n from the tangent numbers.
func (a *arith) bernoulli(n int) []*big.Rat {
	if len(a.bern) >= n {
		return a.bern[:n]
	}
	t := make([]*big.Int, n+1)
	t[1] = big.NewInt(1)
	for k := 2; k <= n; k++ {
		t[k] = new(big.Int).Mul(big.NewInt(int64(k-1)), t[k-1])
	}
	for k := 2; k <= n; k++ {
		for j := k; j <= n; j++ {
			x := new(big.Int).Mul(big.NewInt(int64(j-k)), t[j-1])
			y := new(big.Int).Mul(big.NewInt(int64(j-k+2)), t[j])
			t[j] = x.Add(x, y)
		}
	}
	// B_2k = (-1)^(k-1) 2k T_k / (4^k (4^k - 1))
	out := make([]*big.Rat, n)
	for k := 1; k <= n; k++ {
		p := new(big.Int).Lsh(big.NewInt(1), uint(2*k))
		den := new(big.Int).Mul(p, new(big.Int).Sub(p, big.NewInt(1)))
		num := new(big.Int).Mul(big.NewInt(int64(2*k)), t[k])
		if k%2 == 0 {
			num.Neg(num)
		}
		out[k-1] = new(big.Rat).SetFrac(num, den)
	}
	a.bern = out
	return out
}

// shifted moves x up by an integer until the asymptotic series reaches the
// working precision, at about exp(-2 pi x).
func (a *arith) shifted(x *big.Float) int64 {
	f, _ := x.Float64()
	if x.IsInt() && x.Sign() <= 0 {
		panic(fmt.Errorf("pole of the gamma function at %.6g", x))
	}
	if f < -1e5 || f > 1e8 {
		panic(errOverflow)
	}
	return int64(max(0, math.Ceil(float64(a.prec)/8+12-f)))
}

// gamma by Stirling's series, 6.1.40 of Abramowitz and Stegun.
func (a *arith) gamma(x *big.Float) *big.Float {
	w := a.at(a.prec + 64)
	n := w.shifted(x)
	prod := w.int(1)
	y := w.new().Set(x)
	for ; n > 0; n-- {
		prod = w.mul(prod, y)
		y = w.add(y, w.int(1))
	}
	half := w.rat(big.NewRat(1, 2))
	s := w.sub(w.mul(w.sub(y, half), w.log(y)), y)
	s = w.add(s, w.mul(half, w.log(w.shift(w.pi(), 1))))
	inv := w.div(w.int(1), y)
	sq := w.mul(inv, inv)
	for k, b := range w.bernoulli(int(w.prec)/4 + 8) {
		m := int64(2 * (k + 1))
		t := w.mul(w.rat(new(big.Rat).Quo(b, big.NewRat(m*(m-1), 1))), inv)
		if t.MantExp(nil) < -int(w.prec) {
			break
		}
		s = w.add(s, t)
		inv = w.mul(inv, sq)
	}
	a.bern, a.piV, a.ln2V = w.bern, w.piV, w.ln2V
	return a.new().Set(w.div(w.exp(s), prod))
}

// polygamma is the n-th derivative of psi = (log gamma)', by 6.4.6 and
// 6.4.11 (n = 0: 6.3.5 and 6.3.18) of Abramowitz and Stegun.
func (a *arith) polygamma(n int64, x *big.Float) *big.Float {
	w := a.at(a.prec + 64)
	fact := w.int(1)
	for k := int64(2); k <= n; k++ {
		fact = w.mul(fact, w.int(k))
	}
	sum := w.int(0) // of n!/(x+k)^(n+1)
	y := w.new().Set(x)
	for m := w.shifted(x) + n; m > 0; m-- {
		sum = w.add(sum, w.div(fact, w.powInt(y, n+1)))
		y = w.add(y, w.int(1))
	}
	inv := w.div(w.int(1), y)
	p := w.powInt(inv, n)
	sum = w.add(sum, w.shift(w.mul(fact, w.mul(p, inv)), -1))
	if n == 0 {
		sum = w.sub(sum, w.log(y))
	} else {
		sum = w.add(sum, w.div(w.mul(fact, p), w.int(n)))
	}
	// B_2k (2k+n-1)!/(2k)! / y^(2k+n)
	ratio := w.div(fact, w.int(max(n, 1))) // (n-1)!
	for k, b := range w.bernoulli(int(w.prec)/4 + 8) {
		m := int64(2 * (k + 1))
		p = w.mul(p, w.mul(inv, inv))
		if n == 0 {
			ratio = w.div(w.int(1), w.int(m))
		} else {
			ratio = w.div(w.mul(ratio, w.mul(w.int(m+n-2), w.int(m+n-1))), w.mul(w.int(m-1), w.int(m)))
		}
		t := w.mul(w.rat(b), w.mul(ratio, p))
		if t.MantExp(nil) < sum.MantExp(nil)-int(w.prec) {
			break
		}
		sum = w.add(sum, t)
	}
	a.bern, a.ln2V = w.bern, w.ln2V
	if n%2 == 0 {
		sum.Neg(sum)
	}
	return a.new().Set(sum)
}

// besselI is I_nu(z) by its power series, 9.6.10 of Abramowitz and Stegun.
func (a *arith) besselI(nu, z *big.Float) *big.Float {
	f, _ := z.Float64()
	if math.Abs(f) > 1e5 {
		panic(errOverflow)
	}
	integer := nu.IsInt()
	if integer && nu.Sign() < 0 {
		nu = a.neg(nu)
	}
	if z.Sign() == 0 {
		switch {
		case nu.Sign() == 0:
			return a.int(1)
		case nu.Sign() > 0:
			return a.int(0)
		}
		panic(ErrDivisionByZero)
	}
	if z.Sign() < 0 && !integer {
		panic(fmt.Errorf("besseli of the non-integer order %.6g at the negative value %.6g", nu, z))
	}
	w := a.at(a.prec + 64)
	h := w.shift(z, -1)
	sq := w.mul(h, h)
	var lead *big.Float
	if integer {
		n, _ := nu.Int64()
		if n > 1<<20 {
			panic(errOverflow)
		}
		lead = w.powInt(h, n)
	} else {
		lead = w.exp(w.mul(nu, w.log(h)))
	}
	t := w.div(lead, w.gamma(w.add(nu, w.int(1))))
	sum := w.new().Set(t)
	least := 0
	for k := int64(1); ; k++ {
		t = w.div(w.mul(t, sq), w.mul(w.int(k), w.add(nu, w.int(k))))
		sum = w.add(sum, t)
		if g, _ := nu.Float64(); float64(k)+g < 0 {
			continue
		}
		if t.MantExp(nil) < sum.MantExp(nil)-int(w.prec) {
			if least++; least > 1 {
				break
			}
		}
	}
	return a.new().Set(sum)
}
