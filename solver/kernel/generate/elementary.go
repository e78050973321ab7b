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
	sinWide   = []float64{-0.16666666666666666, 0.00833333333333321, -0.0001984126984121424, 2.7557319211911476e-06, -2.505210693752678e-08, 1.6058942709858692e-10, -7.643064299457894e-13, 2.721894008054035e-15}
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
func (g *guard) modulus(xs group) {
	for _, x := range xs {
		t := vector()
		if wide() {
			VPADDQ(x, x, t) // shifts the sign out
			VPMAXUQ(t, g.worst, g.worst)
			continue
		}
		and(word(absMask), x, t)
		VCMPPD(Imm(notLessEqual), number(g.limit), t, t)
		or(t, g.worst, g.worst)
	}
}

// normal notes where x is not a positive normal number.
func (g *guard) normal(xs group) {
	for _, x := range xs {
		t := vector()
		if wide() {
			VPSUBQ(get(number(minNorm)), x, t)
			VPMAXUQ(t, g.worst, g.worst)
			continue
		}
		VCMPPD(Imm(notGreaterEqual), number(minNorm), x, t)
		or(t, g.worst, g.worst)
		u := vector()
		VCMPPD(Imm(notLessEqual), number(maxNorm), x, u)
		or(u, g.worst, g.worst)
	}
}

// result returns a number other than zero when something was noted; limit is the
// largest allowed pattern of the wide form.
func (g *guard) result(limit uint64) {
	r := GP64()
	if wide() {
		k := K()
		VPCMPUQ(Imm(6), word(limit), g.worst, k) // greater
		KMOVB(k, r.As32())
	} else {
		VMOVMSKPD(g.worst, r.As32())
	}
	Store(r, ReturnIndex(0))
	done()
}

func elementary() {
	halfturns("sin", false)
	halfturns("cos", true)
	quarters()
	exponential()
	logarithm()
}

// pick returns the number of vectors of a group in the narrow and the wide form.
func pick(narrow, wideForm int) int {
	if wide() {
		return wideForm
	}
	return narrow
}

// reduce subtracts from x the multiples kf of a period given in three parts.
func reduce(x, kf group, a, b, c float64) {
	for _, part := range []float64{a, b, c} {
		each(VFNMADD231PD, get(number(part)), kf, x)
	}
}

// halfturns is Sin or Cos: reduction modulo pi and one odd polynomial.
func halfturns(name string, cosine bool) {
	function(name, "func(d, a []float64, c float64) uint64")
	d, a, c := base("d"), base("a"), broadcast("c")
	n := pick(2, 4)
	poly := numbers(sinWide...)
	hold(append(poly, numbers(invPi, magic, piA)...)...)
	g := newGuard(trigMax)
	loop("d", n*width, func(i reg.GPVirtual) {
		x := scaled(c, places(n, a, i))
		g.modulus(x)
		t, kf := copies(n, x), vectors(n)
		if cosine {
			each(VFMADD213PD, get(number(-0.5)), inRegister(number(invPi)), t)
			each(VADDPD, get(number(magic)), t, t)
			each(VSUBPD, get(number(magic)), t, kf)
			each(VADDPD, get(number(0.5)), kf, kf)
			each(VPADDQ, word(1), t, t)
		} else {
			each(VFMADD213PD, get(number(magic)), inRegister(number(invPi)), t)
			each(VSUBPD, get(number(magic)), t, kf)
		}
		reduce(x, kf, piA, piB, piC)
		z := vectors(n)
		each(VMULPD, x, x, z)
		p := horner(z, poly)
		each(VMULPD, x, z, z)
		each(VFMADD213PD, x, z, p)
		each(VPSLLQ, Imm(63), t, t)
		each(xor, t, p, p)
		store(p, places(n, d, i))
	})
	g.result(bitsOf(trigMax) << 1)
}

// holdQuadrant keeps the constants of quadrant.
func holdQuadrant(more ...Mem) {
	all := append(numbers(sinNarrow...), numbers(cosNarrow...)...)
	hold(append(append(all, word(1), word(sign)), more...)...)
}

// quadrant returns sine and cosine of r + k*pi/2, |r| <= pi/4.
func quadrant(r, k group) (s, c group) {
	n := len(r)
	z := vectors(n)
	each(VMULPD, r, r, z)
	ps := horner(z, numbers(sinNarrow...))
	s = vectors(n)
	each(VMULPD, z, r, s)
	each(VFMADD213PD, r, ps, s)
	pc := horner(z, numbers(cosNarrow...))
	h := copies(n, get(number(-0.5)))
	each(VFMADD213PD, get(number(1)), z, h)
	each(VMULPD, z, z, z)
	each(VFMADD213PD, h, pc, z)
	c = z
	if wide() {
		return turnWide(s, c, k)
	}
	turnNarrow(s, c, k)
	return s, c
}

// turnWide exchanges sine and cosine in odd quadrants and sets the signs.
func turnWide(s, c, k group) (group, group) {
	n := len(s)
	one, sgn := get(word(1)), get(word(sign))
	s2, c2, t := vectors(n), vectors(n), vectors(n)
	for i := range n {
		odd := K()
		VPTESTMQ(one, k[i], odd)
		VBLENDMPD(c[i], s[i], odd, s2[i])
		VBLENDMPD(s[i], c[i], odd, c2[i])
	}
	each(VPSLLQ, Imm(62), k, t)
	each(VPTERNLOGQ, Imm(0x78), sgn, t, s2) // s2 ^ (t & sign)
	each(VPADDQ, one, k, t)
	each(VPSLLQ, Imm(62), t, t)
	each(VPTERNLOGQ, Imm(0x78), sgn, t, c2)
	return s2, c2
}

func turnNarrow(s, c, k group) {
	for i := range s {
		m, x := vector(), vector()
		xor(x, x, x)
		and(word(1), k[i], m)
		VPSUBQ(m, x, m)
		xor(s[i], c[i], x)
		and(m, x, x)
		xor(x, s[i], s[i])
		xor(x, c[i], c[i])
		t := vector()
		VPSLLQ(Imm(62), k[i], t)
		and(word(sign), t, t)
		xor(t, s[i], s[i])
		VPADDQ(word(1), k[i], t)
		VPSLLQ(Imm(62), t, t)
		and(word(sign), t, t)
		xor(t, c[i], c[i])
	}
}

// quarters is SinCos: reduction modulo pi/2 and two polynomials.
func quarters() {
	function("sincos", "func(d, d2, a []float64, c float64) uint64")
	d, d2, a, c := base("d"), base("d2"), base("a"), broadcast("c")
	n := pick(1, 2)
	holdQuadrant(numbers(invPio2, magic)...)
	g := newGuard(trigMax)
	loop("d", n*width, func(i reg.GPVirtual) {
		x := scaled(c, places(n, a, i))
		g.modulus(x)
		t, kf := copies(n, x), vectors(n)
		each(VFMADD213PD, get(number(magic)), inRegister(number(invPio2)), t)
		each(VSUBPD, get(number(magic)), t, kf)
		reduce(x, kf, piA/2, piB/2, piC/2)
		s, co := quadrant(x, t)
		store(s, places(n, d, i))
		store(co, places(n, d2, i))
	})
	g.result(bitsOf(trigMax) << 1)
}

func exponential() {
	function("exp", "func(d, a []float64, c float64) uint64")
	d, a, c := base("d"), base("a"), broadcast("c")
	n := pick(2, 4)
	poly := numbers(expTaylor...)
	hold(poly...)
	g := newGuard(expMax)
	loop("d", n*width, func(i reg.GPVirtual) {
		x := scaled(c, places(n, a, i))
		g.modulus(x)
		t, kf := copies(n, x), vectors(n)
		each(VFMADD213PD, get(number(magic)), inRegister(number(log2e)), t)
		each(VSUBPD, get(number(magic)), t, kf)
		each(VFNMADD231PD, get(number(ln2Hi)), kf, x)
		each(VFNMADD231PD, get(number(ln2Lo)), kf, x)
		p := horner(x, poly)
		q := vectors(n)
		each(VMULPD, x, x, q)
		each(VFMADD213PD, x, p, q)
		each(VADDPD, get(number(1)), q, q)
		each(VPSLLQ, Imm(52), t, t)
		each(VPADDQ, t, q, q)
		store(q, places(n, d, i))
	})
	g.result(bitsOf(expMax) << 1)
}

// logarithmOf returns log(x) for positive normal x.
func logarithmOf(x group) group {
	n := len(x)
	e := vectors(n)
	each(VPSUBQ, get(word(logBase)), x, e)
	if wide() {
		each(VPSRAQ, Imm(52), e, e)
	} else { // an arithmetic shift out of two logical ones
		for i := range e {
			negative, zero := vector(), vector()
			VPSRLQ(Imm(63), e[i], negative)
			xor(zero, zero, zero)
			VPSUBQ(negative, zero, negative)
			VPSLLQ(Imm(12), negative, negative)
			VPSRLQ(Imm(52), e[i], e[i])
			or(negative, e[i], e[i])
		}
	}
	f := vectors(n)
	each(VPSLLQ, Imm(52), e, f)
	each(VPSUBQ, f, x, f)
	each(VPADDQ, get(word(expBias)), e, e)
	each(VSUBPD, get(number(magic)), e, e)
	each(VSUBPD, get(number(1)), f, f)
	s := vectors(n)
	each(VADDPD, get(number(2)), f, s)
	each(VDIVPD, s, f, s)
	z := vectors(n)
	each(VMULPD, s, s, z)
	p := horner(z, numbers(logOdd...))
	h := vectors(n)
	each(VMULPD, get(number(0.5)), f, h)
	each(VMULPD, f, h, h)
	each(VFMADD213PD, h, p, z)
	q := vectors(n)
	each(VMULPD, get(number(ln2Lo)), e, q)
	each(VFMADD213PD, q, z, s)
	each(VSUBPD, s, h, h)
	each(VSUBPD, h, f, f) // f - (h - q)
	each(VFMADD213PD, f, inRegister(number(ln2Hi)), e)
	return e
}

func logarithm() {
	function("log", "func(d, a []float64) uint64")
	d, a := base("d"), base("a")
	n := pick(1, 2)
	hold(append(numbers(append([]float64{magic, 1, 2, 0.5, ln2Lo, ln2Hi, minNorm}, logOdd...)...), word(logBase), word(expBias))...)
	g := newGuard(0)
	loop("d", n*width, func(i reg.GPVirtual) {
		x := fetch(places(n, a, i))
		g.normal(x)
		store(logarithmOf(x), places(n, d, i))
	})
	g.result(bitsOf(maxNorm) - bitsOf(minNorm))
}
