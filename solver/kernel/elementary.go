package kernel

import (
	"math"
	"math/bits"
)

// The functions of this file are the reference of the vector kernels: the
// assembly performs the same operations in the same order on its fast range and
// calls these functions outside it.
//
// Sources: the polynomials for sine and cosine on [-pi/4, pi/4] and for the
// logarithm are those of FDLIBM (K. C. Ng, Sun Microsystems, 1993: k_sin.c,
// k_cos.c, e_log.c); the sine on [-pi/2, pi/2] is a least-squares fit of relative
// accuracy 2^-61 whose coefficients were rounded one after the other, the fit of
// the remaining ones absorbing each rounding; the exponential is a Taylor sum. Reduction by three parts of pi after
// W. Cody and W. Waite, Software Manual for the Elementary Functions (1980), with
// fused multiply-adds, by which the first part is exact; for large arguments
// M. Payne and R. Hanek, SIGNUM Newsletter 18 (1983) 19-24.

const (
	magic    = 0x1.8p52 // adding it rounds to an integer in the low bits
	invPi    = 0.31830988618379067154
	invPio2  = 0.63661977236758134308
	piA      = 0x1.921fb54442d18p+1
	piB      = 0x1.1a62633145c07p-53
	piC      = -0x1.f1976b7ed8fbcp-109
	pio2A    = piA / 2
	pio2B    = piB / 2
	pio2C    = piC / 2
	tau      = 6.28318530717958647692
	trigMax  = 0x1p30 // beyond it the argument is reduced by integers
	expMax   = 708.0  // beyond it the result may not be a normal number
	ln2Hi    = 6.93147180369123816490e-01
	ln2Lo    = 1.90821492927058770002e-10
	log2e    = 1.44269504088896338700
	logBase  = 0x3fe6a09e667f3bcd // bits of sqrt(1/2)
	expBias  = 0x4338000000000000 // bits of magic
	minNorm  = 0x1p-1022
	signMask = 1 << 63
)

const (
	sin1 = -1.66666666666666324348e-01
	sin2 = 8.33333333332248946124e-03
	sin3 = -1.98412698298579493134e-04
	sin4 = 2.75573137070700676789e-06
	sin5 = -2.50507602534068634195e-08
	sin6 = 1.58969099521155010221e-10
	cos1 = 4.16666666666666019037e-02
	cos2 = -1.38888888888741095749e-03
	cos3 = 2.48015872894767294178e-05
	cos4 = -2.75573143513906633035e-07
	cos5 = 2.08757232129817482790e-09
	cos6 = -1.13596475577881948265e-11

	wide0 = -0.16666666666666666
	wide1 = 0.00833333333333321
	wide2 = -0.0001984126984121424
	wide3 = 2.7557319211911476e-06
	wide4 = -2.505210693752678e-08
	wide5 = 1.6058942709858692e-10
	wide6 = -7.643064299457894e-13
	wide7 = 2.721894008054035e-15

	log1 = 6.666666666666735130e-01
	log2 = 3.999999999940941908e-01
	log3 = 2.857142874366239149e-01
	log4 = 2.222219843214978396e-01
	log5 = 1.818357216161805012e-01
	log6 = 1.531383769920937332e-01
	log7 = 1.479819860511658591e-01

	exp2  = 1.0 / 2
	exp3  = 1.0 / 6
	exp4  = 1.0 / 24
	exp5  = 1.0 / 120
	exp6  = 1.0 / 720
	exp7  = 1.0 / 5040
	exp8  = 1.0 / 40320
	exp9  = 1.0 / 362880
	exp10 = 1.0 / 3628800
	exp11 = 1.0 / 39916800
	exp12 = 1.0 / 479001600
	exp13 = 1.0 / 6227020800
)

// quadrants replaces r and t by sine and cosine of r + k*pi/2 for |r| <= pi/4,
// where k is the pattern of bits of t; only its two low bits count.
func quadrants(r, t []float64) {
	t = t[:len(r)]
	for i, x := range r {
		k := math.Float64bits(t[i])
		z := float64(x * x)
		ps := math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(sin6, z, sin5), z, sin4), z, sin3), z, sin2), z, sin1)
		pc := math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(cos6, z, cos5), z, cos4), z, cos3), z, cos2), z, cos1)
		si := math.Float64bits(math.FMA(float64(z*x), ps, x))
		ci := math.Float64bits(math.FMA(float64(z*z), pc, math.FMA(-0.5, z, 1)))
		swap := (si ^ ci) & -(k & 1)
		r[i] = math.Float64frombits(si ^ swap ^ (k&2)<<62)
		t[i] = math.Float64frombits(ci ^ swap ^ ((k+1)&2)<<62)
	}
}

// quadrant is quadrants for one point.
func quadrant(r float64, k uint64) (s, c float64) {
	x, t := [1]float64{r}, [1]float64{math.Float64frombits(k)}
	quadrants(x[:], t[:])
	return x[0], t[0]
}

// halfturn returns the sine of r + k*pi for |r| <= pi/2; only the low bit of k counts.
func halfturn(r float64, k uint64) float64 {
	z := float64(r * r)
	p := math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(wide7, z, wide6), z, wide5), z, wide4), z, wide3), z, wide2), z, wide1), z, wide0)
	return math.Float64frombits(math.Float64bits(math.FMA(float64(z*r), p, r)) ^ k<<63)
}

// Sin returns the sine of x. It is NaN for infinities and NaN.
func Sin(x float64) float64 {
	if !(math.Abs(x) <= trigMax) {
		s, _ := sinCosLarge(x)
		return s
	}
	return sinFast(x)
}

func sinFast(x float64) float64 {
	t := math.FMA(x, invPi, magic)
	kf := t - magic
	return halfturn(math.FMA(kf, -piC, math.FMA(kf, -piB, math.FMA(kf, -piA, x))), math.Float64bits(t))
}

// Cos returns the cosine of x. It is NaN for infinities and NaN.
func Cos(x float64) float64 {
	if !(math.Abs(x) <= trigMax) {
		_, c := sinCosLarge(x)
		return c
	}
	return cosFast(x)
}

func cosFast(x float64) float64 {
	t := math.FMA(x, invPi, -0.5) + magic
	kf := t - magic + 0.5
	return halfturn(math.FMA(kf, -piC, math.FMA(kf, -piB, math.FMA(kf, -piA, x))), math.Float64bits(t)+1)
}

// SinCos returns sine and cosine of x, as the two-output kernel computes them:
// the last bits may differ from those of Sin and Cos.
func SinCos(x float64) (sin, cos float64) {
	if !(math.Abs(x) <= trigMax) {
		return sinCosLarge(x)
	}
	t := math.FMA(x, invPio2, magic)
	kf := t - magic
	r := math.FMA(kf, -pio2C, math.FMA(kf, -pio2B, math.FMA(kf, -pio2A, x)))
	return quadrant(r, math.Float64bits(t))
}

// twoOverPi holds the first 1280 bits of 2/pi, most significant first.
var twoOverPi = [20]uint64{
	0xa2f9836e4e441529, 0xfc2757d1f534ddc0, 0xdb6295993c439041, 0xfe5163abdebbc561,
	0xb7246e3a424dd2e0, 0x06492eea09d1921c, 0xfe1deb1cb129a73e, 0xe88235f52ebb4484,
	0xe99c7026b45f7e41, 0x3991d639835339f4, 0x9c845f8bbdf9283b, 0x1ff897ffde05980f,
	0xef2f118b5a0a6d1f, 0x6d367ecf27cb09b7, 0x4f463f669e5fea2d, 0x7527bac7ebe5f17b,
	0x3d0739f78a5292ea, 0x6bfb5fb11f8d5d08, 0x56033046fc7b6bab, 0xf0cfbc209af4361d,
}

// sinCosLarge handles |x| > trigMax, infinities and NaN.
func sinCosLarge(x float64) (sin, cos float64) {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return math.NaN(), math.NaN()
	}
	k, r := reduceLarge(math.Abs(x))
	sin, cos = quadrant(r, k)
	if x < 0 {
		sin = -sin
	}
	return sin, cos
}

// reduceLarge returns k and r with x = r + k*pi/2 modulo 2*pi and |r| <= pi/4, for
// finite x > 1. Of the product of the 53-bit significand with 2/pi only the 192
// bits below the weight 4 are formed; what is cut off is below 2^-137.
func reduceLarge(x float64) (k uint64, r float64) {
	b := math.Float64bits(x)
	m := b&(1<<52-1) | 1<<52
	e := int(b>>52) - 1023 - 52 // x = m * 2^e
	w := [3]uint64{}            // the bits of 2/pi from the weight 2^-(e-1) on
	for i := range w {
		w[i] = bitsAt(e - 2 + 64*i)
	}
	hi2, lo2 := bits.Mul64(m, w[2])
	hi1, lo1 := bits.Mul64(m, w[1])
	f2 := lo2
	f1, carry := bits.Add64(lo1, hi2, 0)
	f0, _ := bits.Add64(m*w[0], hi1, carry)
	k = f0 >> 62
	// The fraction of a quarter turn, rounded to the nearest quarter.
	f0, f1, f2 = f0<<2|f1>>62, f1<<2|f2>>62, f2<<2
	negative := f0>>63 == 1
	if negative {
		k++
		var borrow uint64
		f2, borrow = bits.Sub64(0, f2, 0)
		f1, borrow = bits.Sub64(0, f1, borrow)
		f0, _ = bits.Sub64(0, f0, borrow)
	}
	shift := 0
	for f0 == 0 && shift < 128 {
		f0, f1, f2 = f1, f2, 0
		shift += 64
	}
	n := bits.LeadingZeros64(f0)
	if n > 0 {
		f0, f1 = f0<<n|f1>>(64-n), f1<<n|f2>>(64-n)
		shift += n
	}
	hi := math.Ldexp(float64(f0>>11), -53-shift)
	lo := math.Ldexp(float64(f0<<53>>1|f1>>12), -53-63-shift)
	p := float64(hi * pio2A)
	r = p + (math.FMA(hi, pio2A, -p) + math.FMA(hi, pio2B, float64(lo*pio2A)))
	if negative {
		r = -r
	}
	return k, r
}

// bitsAt returns 64 bits of 2/pi from bit i on, bit 0 being of weight 1/2; bits
// before it are zero.
func bitsAt(i int) uint64 {
	word := func(j int) uint64 {
		if j < 0 || j >= len(twoOverPi) {
			return 0
		}
		return twoOverPi[j]
	}
	j, s := i>>6, uint(i&63)
	if s == 0 {
		return word(j)
	}
	return word(j)<<s | word(j+1)>>(64-s)
}

// expReduced returns e^x / 2^k and k in the low bits of the second result.
func expReduced(x float64) (q float64, k uint64) {
	t := math.FMA(x, log2e, magic)
	kf := t - magic
	r := math.FMA(kf, -ln2Lo, math.FMA(kf, -ln2Hi, x))
	p := math.FMA(exp13, r, exp12)
	p = math.FMA(p, r, exp11)
	p = math.FMA(p, r, exp10)
	p = math.FMA(p, r, exp9)
	p = math.FMA(p, r, exp8)
	p = math.FMA(p, r, exp7)
	p = math.FMA(p, r, exp6)
	p = math.FMA(p, r, exp5)
	p = math.FMA(p, r, exp4)
	p = math.FMA(p, r, exp3)
	p = math.FMA(p, r, exp2)
	return math.FMA(float64(r*r), p, r) + 1, math.Float64bits(t)
}

// Exp returns e^x: +Inf above the largest finite result, 0 below the smallest.
func Exp(x float64) float64 {
	if math.Abs(x) <= expMax {
		q, k := expReduced(x)
		return math.Float64frombits(math.Float64bits(q) + k<<52)
	}
	switch {
	case math.IsNaN(x):
		return x
	case x > 709.782712893384:
		return math.Inf(1)
	case x < -745.1332191019412:
		return 0
	}
	q, k := expReduced(x)
	return math.Ldexp(q, int(int64(k-expBias)))
}

// Log returns the natural logarithm of x: -Inf for 0, NaN for negative x.
func Log(x float64) float64 {
	var shift float64
	if !(x >= minNorm && x <= math.MaxFloat64) {
		switch {
		case x == 0:
			return math.Inf(-1)
		case x < 0:
			return math.NaN()
		case !(x < minNorm):
			return x // +Inf, NaN
		}
		x *= 0x1p54
		shift = 54
	}
	return logFast(x, shift)
}

// logFast returns log(x / 2^shift) for positive normal x.
func logFast(x, shift float64) float64 {
	ix := math.Float64bits(x)
	e := uint64(int64(ix-logBase) >> 52)
	m := math.Float64frombits(ix - e<<52)
	ef := math.Float64frombits(e+expBias) - magic - shift
	f := m - 1
	s := f / (2 + f)
	z := float64(s * s)
	p := math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(math.FMA(log7, z, log6), z, log5), z, log4), z, log3), z, log2), z, log1)
	h := float64(float64(0.5*f) * f)
	w := math.FMA(z, p, h)
	q := math.FMA(s, w, float64(ef*ln2Lo))
	return math.FMA(ef, ln2Hi, -(float64(h-q) - f))
}

// minimum and maximum follow the processor's instructions: the second operand
// where the operands are equal or either is not a number.
func minimum(x, y float64) float64 {
	if x < y {
		return x
	}
	return y
}

func maximum(x, y float64) float64 {
	if x > y {
		return x
	}
	return y
}
