package special

import "math"

// BesselI is the modified Bessel function I_nu(x) of the first kind, for real
// order nu >= 0 and x >= 0, or integer order of either sign and any real x. It
// overflows to +Inf beyond x = 713; see [BesselIScaled].
func BesselI(nu, x float64) float64 {
	s := BesselIScaled(nu, x)
	a := math.Abs(x)
	if a < 700 {
		return s * math.Exp(a)
	}
	// exp in two steps, so that it overflows only when the result does.
	h := math.Exp(a / 2)
	return s * h * h
}

// BesselIScaled is exp(-|x|) I_nu(x), with the domain of [BesselI]. Relative
// accuracy is about 1e-15 for integer order and 3e-14 for others.
func BesselIScaled(nu, x float64) float64 {
	if math.IsNaN(nu) || math.IsNaN(x) {
		return math.NaN()
	}
	integer := nu == math.Trunc(nu)
	switch {
	case integer:
		nu = math.Abs(nu)
		s := bessel(nu, math.Abs(x))
		if x < 0 && math.Mod(nu, 2) == 1 {
			s = -s
		}
		return s
	case x < 0 || nu < 0:
		return math.NaN()
	}
	return bessel(nu, x)
}

func bessel(nu, x float64) float64 {
	switch {
	case x == 0:
		if nu == 0 {
			return 1
		}
		return 0
	case math.IsInf(x, 1):
		return 0
	case x > 60 && x > 2*nu*nu+60:
		return besselAsymptotic(nu, x)
	case nu == math.Trunc(nu) && x > 1:
		return besselMiller(int(nu), x)
	}
	return besselSeries(nu, x)
}

// besselSeries sums the ascending series; all terms are positive.
func besselSeries(nu, x float64) float64 {
	// The sum is scaled by its first term, whose logarithm is kept apart.
	lg, _ := math.Lgamma(nu + 1)
	first := nu*math.Log(x/2) - lg
	q := x * x / 4
	sum, term, shift := 1.0, 1.0, 0.0
	for k := 1.0; ; k++ {
		term *= q / (k * (k + nu))
		sum += term
		if term < 1e-17*sum {
			break
		}
		if sum > 1e250 {
			sum, term, shift = sum*1e-250, term*1e-250, shift+250*math.Ln10
		}
	}
	if nu < 100 && x < 1 {
		// Without the logarithm nothing is lost for small orders.
		return math.Pow(x/2, nu) / math.Gamma(nu+1) * sum * math.Exp(-x)
	}
	return math.Exp(first+shift-x) * sum
}

// besselMiller recurs downwards from an order where I is negligible and
// normalizes with exp(x) = I_0 + 2 I_1 + 2 I_2 + ...
func besselMiller(n int, x float64) float64 {
	start := n + 20 + int(9*math.Sqrt(x+float64(n))) + int(2*math.Sqrt(float64(n)))
	if x < 20 {
		start += 20
	}
	var above, sum, want float64
	cur := 1e-280
	for k := start; k > 0; k-- {
		below := above + 2*float64(k)/x*cur
		above, cur = cur, below
		if k-1 == n {
			want = cur
		}
		if k-1 > 0 {
			sum += 2 * cur
		} else {
			sum += cur
		}
		if cur > 1e250 {
			above, cur, sum, want = above*1e-250, cur*1e-250, sum*1e-250, want*1e-250
		}
	}
	return want / sum
}

// besselAsymptotic is Hankel's expansion (Abramowitz, Stegun 9.7.1).
func besselAsymptotic(nu, x float64) float64 {
	mu := 4 * nu * nu
	sum, term := 1.0, 1.0
	for k := 1.0; k < 200; k++ {
		next := -term * (mu - (2*k-1)*(2*k-1)) / (8 * k * x)
		if math.Abs(next) > math.Abs(term) || math.Abs(next) < 1e-18*math.Abs(sum) {
			break
		}
		term = next
		sum += term
	}
	return sum / math.Sqrt(2*math.Pi*x)
}

// BesselIRatio is I_{nu+1}(x)/I_nu(x) for nu >= 0 and real x, without overflow:
// the continued fraction of the recurrence (Abramowitz, Stegun 9.6.26), for
// large x the quotient of scaled values. For nu = 0 it is the mean resultant
// length of the von Mises law.
func BesselIRatio(nu, x float64) float64 {
	a := math.Abs(x)
	if nu < 0 || math.IsNaN(nu) || math.IsNaN(x) {
		return math.NaN()
	}
	if math.IsInf(a, 1) {
		return math.Copysign(1, x)
	}
	if a > 60 && a > 2*(nu+1)*(nu+1)+60 {
		return math.Copysign(besselAsymptotic(nu+1, a)/besselAsymptotic(nu, a), x)
	}
	if a == 0 {
		return 0
	}
	// r_k = 1/(2(k+1)/x + r_{k+1}), all positive: evaluate from below.
	steps := 30 + int(9*math.Sqrt(a+nu)) + int(a)
	r := 0.0
	for k := steps; k >= 0; k-- {
		r = 1 / (2*(nu+float64(k)+1)/a + r)
	}
	return math.Copysign(r, x)
}
