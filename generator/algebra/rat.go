package algebra

import (
	"math/big"
	"math/bits"
)

// rat is an exact rational. While numerator and denominator fit 62 bits they
// live in n/d (d >= 1, lowest terms) and no allocation happens; beyond that
// the value moves to big, and moves back when it shrinks.
type rat struct {
	n, d int64
	big  *big.Rat
}

const smallLimit = 1 << 62

func ratInt(n int64) rat { return normRat(n, 1) }

// normRat brings n/d (d != 0) to lowest terms with a positive denominator.
func normRat(n, d int64) rat {
	if d == 1 && n > -smallLimit && n < smallLimit {
		return rat{n: n, d: 1}
	}
	if n <= -smallLimit || n >= smallLimit || d <= -smallLimit || d >= smallLimit {
		return fromBig(new(big.Rat).SetFrac(big.NewInt(n), big.NewInt(d)))
	}
	if d < 0 {
		n, d = -n, -d
	}
	if g := gcd64(n, d); g > 1 {
		n, d = n/g, d/g
	}
	return rat{n: n, d: d}
}

func gcd64(a, b int64) int64 {
	if a < 0 {
		a = -a
	}
	if b < 0 {
		b = -b
	}
	for b != 0 {
		a, b = b, a%b
	}
	return a
}

func lcm64(a, b int64) int64 {
	if a == 0 || b == 0 {
		return 0
	}
	return a / gcd64(a, b) * b
}

func fromBig(q *big.Rat) rat {
	if q.Num().IsInt64() && q.Denom().IsInt64() {
		n, d := q.Num().Int64(), q.Denom().Int64()
		if n > -smallLimit && n < smallLimit && d < smallLimit {
			return rat{n: n, d: d}
		}
	}
	return rat{big: q}
}

// rational returns the value as a big.Rat that the caller must not modify.
func (a rat) rational() *big.Rat {
	if a.big != nil {
		return a.big
	}
	return big.NewRat(a.n, a.d)
}

func mulFits(a, b int64) (int64, bool) {
	ua, ub := uint64(a), uint64(b)
	if a < 0 {
		ua = uint64(-a)
	}
	if b < 0 {
		ub = uint64(-b)
	}
	hi, lo := bits.Mul64(ua, ub)
	if hi != 0 || lo >= smallLimit {
		return 0, false
	}
	return a * b, true
}

func (a rat) add(b rat) rat {
	if a.big == nil && b.big == nil {
		if a.d == 1 && b.d == 1 {
			return normRat(a.n+b.n, 1)
		}
		x, ok1 := mulFits(a.n, b.d)
		y, ok2 := mulFits(b.n, a.d)
		z, ok3 := mulFits(a.d, b.d)
		if ok1 && ok2 && ok3 {
			if s := x + y; s > -smallLimit && s < smallLimit {
				return normRat(s, z)
			}
		}
	}
	return fromBig(new(big.Rat).Add(a.rational(), b.rational()))
}

func (a rat) neg() rat {
	if a.big != nil {
		return rat{big: new(big.Rat).Neg(a.big)}
	}
	return rat{n: -a.n, d: a.d}
}

func (a rat) sub(b rat) rat { return a.add(b.neg()) }

func (a rat) mul(b rat) rat {
	if a.big == nil && b.big == nil {
		n, ok1 := mulFits(a.n, b.n)
		d, ok2 := mulFits(a.d, b.d)
		if ok1 && ok2 {
			return normRat(n, d)
		}
	}
	return fromBig(new(big.Rat).Mul(a.rational(), b.rational()))
}

// inv returns 1/a; a must not be zero.
func (a rat) inv() rat {
	if a.big != nil {
		return fromBig(new(big.Rat).Inv(a.big))
	}
	return normRat(a.d, a.n)
}

func (a rat) isZero() bool { return a.big == nil && a.n == 0 }
func (a rat) isOne() bool  { return a.big == nil && a.n == 1 && a.d == 1 }
func (a rat) isInt() bool {
	if a.big != nil {
		return a.big.IsInt()
	}
	return a.d == 1
}

func (a rat) sign() int {
	if a.big != nil {
		return a.big.Sign()
	}
	switch {
	case a.n > 0:
		return 1
	case a.n < 0:
		return -1
	}
	return 0
}

func (a rat) abs() rat {
	if a.sign() < 0 {
		return a.neg()
	}
	return a
}

func (a rat) cmp(b rat) int {
	if a.big == nil && b.big == nil && a.d == 1 && b.d == 1 {
		switch {
		case a.n < b.n:
			return -1
		case a.n > b.n:
			return 1
		}
		return 0
	}
	return a.rational().Cmp(b.rational())
}

func (a rat) equal(b rat) bool {
	if a.big == nil && b.big == nil {
		return a.n == b.n && a.d == b.d
	}
	return a.cmp(b) == 0
}

func (a rat) String() string {
	q := a.rational()
	if q.IsInt() {
		return q.Num().String()
	}
	return q.String()
}

func (a rat) float() float64 {
	if a.big == nil && a.n > -(1<<53) && a.n < 1<<53 && a.d < 1<<53 {
		return float64(a.n) / float64(a.d)
	}
	f, _ := a.rational().Float64()
	return f
}

// num and den as big integers; the caller must not modify them.
func (a rat) num() *big.Int { return a.rational().Num() }
func (a rat) den() *big.Int { return a.rational().Denom() }

// coef is an element of Q(i).
type coef struct{ re, im rat }

var (
	ratZero  = rat{n: 0, d: 1}
	ratOne   = rat{n: 1, d: 1}
	coefZero = coef{ratZero, ratZero}
	coefOne  = coef{ratOne, ratZero}
	coefI    = coef{ratZero, ratOne}
)

func coefInt(n int64) coef { return coef{ratInt(n), ratZero} }
func coefRat(q rat) coef   { return coef{q, ratZero} }

func (a coef) isReal() bool { return a.im.isZero() }
func (a coef) isZero() bool { return a.re.isZero() && a.im.isZero() }
func (a coef) isOne() bool  { return a.re.isOne() && a.im.isZero() }

func (a coef) add(b coef) coef {
	if a.isReal() && b.isReal() {
		return coef{a.re.add(b.re), ratZero}
	}
	return coef{a.re.add(b.re), a.im.add(b.im)}
}

func (a coef) neg() coef       { return coef{a.re.neg(), a.im.neg()} }
func (a coef) sub(b coef) coef { return a.add(b.neg()) }
func (a coef) conj() coef      { return coef{a.re, a.im.neg()} }

func (a coef) mul(b coef) coef {
	if a.isReal() && b.isReal() {
		return coef{a.re.mul(b.re), ratZero}
	}
	return coef{a.re.mul(b.re).sub(a.im.mul(b.im)), a.re.mul(b.im).add(a.im.mul(b.re))}
}

// inv returns 1/a; a must not be zero.
func (a coef) inv() coef {
	if a.isReal() {
		return coef{a.re.inv(), ratZero}
	}
	n := a.re.mul(a.re).add(a.im.mul(a.im)).inv()
	return coef{a.re.mul(n), a.im.neg().mul(n)}
}

func (a coef) equal(b coef) bool { return a.re.equal(b.re) && a.im.equal(b.im) }

// String is used in keys only: it is unique per value.
func (a coef) String() string {
	if a.isReal() {
		return a.re.String()
	}
	return a.re.String() + "+" + a.im.String() + "i"
}

// gaussGCD is a greatest common divisor in Z[i] of two Gaussian integers,
// by Euclid with rounding to the nearest Gaussian integer.
func gaussGCD(a, b coef) coef {
	for !b.isZero() {
		q := a.mul(b.inv())
		q = coef{roundRat(q.re), roundRat(q.im)}
		a, b = b, a.sub(b.mul(q))
	}
	return a
}

func roundRat(a rat) rat {
	if a.isInt() {
		return a
	}
	q := new(big.Rat).Add(a.rational(), big.NewRat(1, 2))
	z := new(big.Int)
	m := new(big.Int)
	z.DivMod(q.Num(), q.Denom(), m)
	return fromBig(new(big.Rat).SetInt(z))
}
