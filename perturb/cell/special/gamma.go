package special

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// LowerGamma is the lower incomplete gamma function, the integral of
// t^(a-1) exp(-t) from 0 to x, for a > 0 and x >= 0.
func LowerGamma(a, x float64) float64 {
	if !(a > 0) || !(x >= 0) {
		return math.NaN()
	}
	if x < 1 || x < a {
		// x^a e^-x sum x^k / (a (a+1) ... (a+k)), all terms positive.
		sum, term := 1/a, 1/a
		for k := 1.0; term > 1e-17*sum; k++ {
			term *= x / (a + k)
			sum += term
		}
		if l := a*math.Log(x) - x; a > 100 {
			return math.Exp(l) * sum
		}
		return math.Pow(x, a) * math.Exp(-x) * sum
	}
	return math.Gamma(a) * mathext.GammaIncReg(a, x)
}

// UpperGamma is the upper incomplete gamma function, the integral of
// t^(a-1) exp(-t) from x to infinity, for a > 0 and x >= 0.
func UpperGamma(a, x float64) float64 {
	if !(a > 0) || !(x >= 0) {
		return math.NaN()
	}
	return math.Gamma(a) * mathext.GammaIncRegComp(a, x)
}

const eulerGamma = 0.57721566490153286060651209008240243

// ExpIntegral is the exponential integral Ei(x), the principal value of the
// integral of exp(t)/t from -infinity to x, x != 0.
func ExpIntegral(x float64) float64 {
	switch {
	case math.IsNaN(x) || x == 0:
		return math.NaN()
	case x < -1:
		return -expIntegralFraction(-x)
	case x > 45:
		// Asymptotic series, smallest term exp(-x).
		sum, term := 1.0, 1.0
		for k := 1.0; k < x; k++ {
			term *= k / x
			sum += term
			if term < 1e-17*sum {
				break
			}
		}
		return math.Exp(x) / x * sum
	}
	sum, term := 0.0, 1.0
	for k := 1.0; k < 400; k++ {
		term *= x / k
		sum += term / k
		if math.Abs(term/k) < 1e-18*math.Abs(sum) {
			break
		}
	}
	return eulerGamma + math.Log(math.Abs(x)) + sum
}

// expIntegralFraction is E1(x) by its continued fraction (Abramowitz, Stegun
// 5.1.22), x > 1.
func expIntegralFraction(x float64) float64 {
	f := 0.0
	for k := 200; k >= 1; k-- {
		n := float64(k)
		f = n * n / (x + 2*n + 1 - f)
	}
	return math.Exp(-x) / (x + 1 - f)
}

// Langevin is coth(x) - 1/x, the mean orientation on the sphere in a field.
func Langevin(x float64) float64 {
	if a := math.Abs(x); a < 0.5 {
		// x/3 - x^3/45 + 2 x^5/945 - ... as a continued fraction:
		// x/(3 + x^2/(5 + x^2/(7 + ...))).
		f := 0.0
		for k := 12; k >= 0; k-- {
			f = x * x / (float64(2*k+5) + f)
		}
		return x / (3 + f)
	}
	return 1/math.Tanh(x) - 1/x
}
