package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

func numbers(xs ...float64) []Mem {
	m := make([]Mem, len(xs))
	for i, x := range xs {
		m[i] = number(x)
	}
	return m
}

// The constants of elementary.go in package kernel.
const (
	magic   = 0x1.8p52
	invPi   = 0.31830988618379067154
	invPio2 = 0.63661977236758134308
	piA     = 0x1.921fb54442d18p+1
	piB     = 0x1.1a62633145c07p-53
	piC     = -0x1.f1976b7ed8fbcp-109
	tau     = 6.28318530717958647692
	trigMax = 0x1p30
	expMax  = 708.0
	ln2Hi   = 6.93147180369123816490e-01
	ln2Lo   = 1.90821492927058770002e-10
	log2e   = 1.44269504088896338700
	logBase = 0x3fe6a09e667f3bcd
	expBias = 0x4338000000000000
	minNorm = 0x1p-1022
	maxNorm = 0x1.fffffffffffffp1023
	absMask = 1<<63 - 1
	sign    = 1 << 63
)

var (
	sinNarrow = []float64{-1.66666666666666324348e-01, 8.33333333332248946124e-03, -1.98412698298579493134e-04, 2.75573137070700676789e-06, -2.50507602534068634195e-08, 1.58969099521155010221e-10}
	cosNarrow = []float64{4.16666666666666019037e-02, -1.38888888888741095749e-03, 2.48015872894767294178e-05, -2.75573143513906633035e-07, 2.08757232129817482790e-09, -1.13596475577881948265e-11}
	sinWide   = []float64{-0.16666666666666666, 0.008333333333333316, -0.00019841269841254955, 2.755731921915843e-06, -2.5052107616384624e-08, 1.6058977272817488e-10, -7.64396903111606e-13, 2.7314289869116175e-15}
	logOdd    = []float64{6.666666666666735130e-01, 3.999999999940941908e-01, 2.857142874366239149e-01, 2.222219843214978396e-01, 1.818357216161805012e-01, 1.531383769920937332e-01, 1.479819860511658591e-01}
	expTaylor = []float64{1.0 / 2, 1.0 / 6, 1.0 / 24, 1.0 / 120, 1.0 / 720, 1.0 / 5040, 1.0 / 40320, 1.0 / 362880, 1.0 / 3628800, 1.0 / 39916800, 1.0 / 479001600, 1.0 / 6227020800}
)

// guard collects whether an argument left the fast range. The wide form keeps
// the largest bit pattern, the narrow form the union of comparisons.
type guard struct {
	worst V
	limit float64
}

func newGuard(limit float64) *guard {
	g := &guard{worst: vector(), limit: limit}
	xor(g.worst, g.worst, g.worst)
	return g
}

// modulus notes where |x| exceeds the limit or x is not a number.
func (g *guard) modulus(x V) {
	t := vector()
	if wide() {
		VPADDQ(x, x, t) // shifts the sign out
		VPMAXUQ(t, g.worst, g.worst)
		return
	}
	and(number2(absMask), x, t)
	VCMPPD(Imm(notLessEqual), get(number(g.limit)), t, t)
	or(t, g.worst, g.worst)
}

func number2(bits uint64) Op { return get(word(bits)) }

// normal notes where x is not a positive normal number.
func (g *guard) normal(x V) {
	t := vector()
	if wide() {
		VPSUBQ(get(number(minNorm)), x, t)
		VPMAXUQ(t, g.worst, g.worst)
		return
	}
	VCMPPD(Imm(notGreaterEqual), get(number(minNorm)), x, t)
	or(t, g.worst, g.worst)
	u := vector()
	VCMPPD(Imm(notLessEqual), get(number(maxNorm)), x, u)
	or(u, g.worst, g.worst)
}

// result stores a number other than zero when something was noted; limit is the
// largest allowed pattern of the wide form.
func (g *guard) result(limit Mem) {
	r := GP64()
	if wide() {
		k := K()
		VPCMPUQ(Imm(6), limit, g.worst, k) // greater
		KMOVB(k, r.As32())
	} else {
		VMOVMSKPD(g.worst, r.As32())
	}
	Store(r, ReturnIndex(0))
	done()
}

func doubled(x float64) Mem { return word(bitsOf(x) << 1) }

func elementary() {
	halfturns("sin", false)
	halfturns("cos", true)
	quarters()
	exponential()
	logarithm()
}

// reduce subtracts the multiple kf of a period whose negated parts are given.
func reduce(x, kf V, a, b, c float64) V {
	r := load(kf)
	VFMADD213PD(x, inRegister(number(-a)), r)
	VFMADD231PD(get(number(-b)), kf, r)
	VFMADD231PD(get(number(-c)), kf, r)
	return r
}

// halfturns is Sin or Cos: reduction modulo pi and one odd polynomial.
func halfturns(name string, cosine bool) {
	function(name, "func(d, a []float64, c float64) uint64")
	d, a, c := base("d"), base("a"), broadcast("c")
	poly := numbers(sinWide...)
	hold(append(poly, numbers(invPi, magic, -piA, -piB, -piC, -0.5, 0.5)...)...)
	if wide() && cosine {
		held[word(1).Symbol.Name] = load(word(1))
	}
	g := newGuard(trigMax)
	loop("d", width, func(i reg.GPVirtual) {
		x := vector()
		VMULPD(at(a, i, 0), c, x)
		g.modulus(x)
		t, kf := load(x), vector()
		if cosine {
			VFMADD213PD(get(number(-0.5)), inRegister(number(invPi)), t)
			VADDPD(get(number(magic)), t, t)
			VSUBPD(get(number(magic)), t, kf)
			VADDPD(get(number(0.5)), kf, kf)
			VPADDQ(get(word(1)), t, t)
		} else {
			VFMADD213PD(get(number(magic)), inRegister(number(invPi)), t)
			VSUBPD(get(number(magic)), t, kf)
		}
		r := reduce(x, kf, piA, piB, piC)
		z := vector()
		VMULPD(r, r, z)
		p := horner(z, poly)
		VMULPD(r, z, z)
		VFMADD213PD(r, z, p)
		VPSLLQ(Imm(63), t, t)
		xor(t, p, p)
		VMOVUPD(p, at(d, i, 0))
	})
	g.result(doubled(trigMax))
}

// holdQuadrant keeps the constants of quadrant.
func holdQuadrant(more ...Mem) {
	all := append(numbers(sinNarrow...), numbers(cosNarrow...)...)
	all = append(all, number(-0.5), number(1), word(1), word(sign))
	hold(append(all, more...)...)
}

// quadrant returns sine and cosine of r + k*pi/2, |r| <= pi/4.
func quadrant(r, k V) (s, c V) {
	z := vector()
	VMULPD(r, r, z)
	ps := horner(z, numbers(sinNarrow...))
	pc := horner(z, numbers(cosNarrow...))
	s = vector()
	VMULPD(z, r, s)
	VFMADD213PD(r, ps, s)
	h := constant(number(-0.5))
	VFMADD213PD(get(number(1)), z, h)
	VMULPD(z, z, z)
	VFMADD213PD(h, pc, z)
	c = z
	if wide() {
		odd := K()
		VPTESTMQ(inRegister(word(1)), k, odd)
		s2, c2 := vector(), vector()
		VBLENDMPD(c, s, odd, s2)
		VBLENDMPD(s, c, odd, c2)
		t, u := vector(), vector()
		VPSLLQ(Imm(62), k, t)
		VPTERNLOGQ(Imm(0x78), inRegister(word(sign)), t, s2) // s2 ^ (t & sign)
		VPADDQ(inRegister(word(1)), k, u)
		VPSLLQ(Imm(62), u, u)
		VPTERNLOGQ(Imm(0x78), inRegister(word(sign)), u, c2)
		return s2, c2
	}
	m, zero, x := vector(), vector(), vector()
	and(word(1), k, m)
	xor(zero, zero, zero)
	VPSUBQ(m, zero, m)
	xor(s, c, x)
	and(m, x, x)
	xor(x, s, s)
	xor(x, c, c)
	t, u := vector(), vector()
	VPSLLQ(Imm(62), k, t)
	and(word(sign), t, t)
	xor(t, s, s)
	VPADDQ(word(1), k, u)
	VPSLLQ(Imm(62), u, u)
	and(word(sign), u, u)
	xor(u, c, c)
	return s, c
}

// quarters is SinCos: reduction modulo pi/2 and two polynomials.
func quarters() {
	function("sincos", "func(d, d2, a []float64, c float64) uint64")
	d, d2, a, c := base("d"), base("d2"), base("a"), broadcast("c")
	holdQuadrant(numbers(invPio2, magic, -piA/2, -piB/2, -piC/2)...)
	g := newGuard(trigMax)
	loop("d", width, func(i reg.GPVirtual) {
		x := vector()
		VMULPD(at(a, i, 0), c, x)
		g.modulus(x)
		t, kf := load(x), vector()
		VFMADD213PD(get(number(magic)), inRegister(number(invPio2)), t)
		VSUBPD(get(number(magic)), t, kf)
		s, co := quadrant(reduce(x, kf, piA/2, piB/2, piC/2), t)
		VMOVUPD(s, at(d, i, 0))
		VMOVUPD(co, at(d2, i, 0))
	})
	g.result(doubled(trigMax))
}

func exponential() {
	function("exp", "func(d, a []float64, c float64) uint64")
	d, a, c := base("d"), base("a"), broadcast("c")
	poly := numbers(expTaylor...)
	hold(append(poly, numbers(log2e, magic, -ln2Hi, -ln2Lo, 1)...)...)
	g := newGuard(expMax)
	loop("d", width, func(i reg.GPVirtual) {
		x := vector()
		VMULPD(at(a, i, 0), c, x)
		g.modulus(x)
		t, kf := load(x), vector()
		VFMADD213PD(get(number(magic)), inRegister(number(log2e)), t)
		VSUBPD(get(number(magic)), t, kf)
		r := load(kf)
		VFMADD213PD(x, inRegister(number(-ln2Hi)), r)
		VFMADD231PD(get(number(-ln2Lo)), kf, r)
		p := horner(r, poly)
		q := vector()
		VMULPD(r, r, q)
		VFMADD213PD(r, p, q)
		VADDPD(get(number(1)), q, q)
		VPSLLQ(Imm(52), t, t)
		VPADDQ(t, q, q)
		VMOVUPD(q, at(d, i, 0))
	})
	g.result(doubled(expMax))
}

// logConstants are the constants of logarithmOf.
func logConstants() []Mem {
	return append(numbers(append([]float64{magic, 1, 2, 0.5, ln2Lo, ln2Hi, minNorm}, logOdd...)...), word(logBase), word(expBias))
}

// logarithmOf returns log(x) for positive normal x.
func logarithmOf(x V) V {
	e := vector()
	VPSUBQ(get(word(logBase)), x, e)
	if wide() {
		VPSRAQ(Imm(52), e, e)
	} else { // an arithmetic shift out of two logical ones
		negative, zero := vector(), vector()
		VPSRLQ(Imm(63), e, negative)
		xor(zero, zero, zero)
		VPSUBQ(negative, zero, negative)
		VPSLLQ(Imm(12), negative, negative)
		VPSRLQ(Imm(52), e, e)
		or(negative, e, e)
	}
	f := vector()
	VPSLLQ(Imm(52), e, f)
	VPSUBQ(f, x, f)
	VPADDQ(get(word(expBias)), e, e)
	VSUBPD(get(number(magic)), e, e)
	VSUBPD(get(number(1)), f, f)
	s := vector()
	VADDPD(get(number(2)), f, s)
	VDIVPD(s, f, s)
	z := vector()
	VMULPD(s, s, z)
	p := horner(z, numbers(logOdd...))
	h := vector()
	VMULPD(get(number(0.5)), f, h)
	VMULPD(f, h, h)
	VFMADD213PD(h, p, z)
	q := vector()
	VMULPD(get(number(ln2Lo)), e, q)
	VFMADD213PD(q, z, s)
	VSUBPD(s, h, h)
	VSUBPD(h, f, f) // f - (h - q)
	VFMADD213PD(f, inRegister(number(ln2Hi)), e)
	return e
}

func logarithm() {
	function("log", "func(d, a []float64) uint64")
	d, a := base("d"), base("a")
	hold(logConstants()...)
	g := newGuard(0)
	loop("d", width, func(i reg.GPVirtual) {
		x := load(at(a, i, 0))
		g.normal(x)
		VMOVUPD(logarithmOf(x), at(d, i, 0))
	})
	g.result(word(bitsOf(maxNorm) - bitsOf(minNorm)))
}
