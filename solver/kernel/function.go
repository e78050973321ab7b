package kernel

import "math"

// function is a scalar function that has no vector kernel.
type function uint8

const (
	fnNone function = iota
	fnPow
	fnSinh
	fnCosh
	fnTanh
	fnSign
	fnErf
	fnGamma
	fnBesselI
)

func (f function) String() string {
	return [...]string{"none", "pow", "sinh", "cosh", "tanh", "sign", "erf", "gamma", "besseli"}[f]
}

// apply1 evaluates a function of one argument; parameter is the order of besseli.
func (f function) apply1(x, parameter float64) float64 {
	switch f {
	case fnSinh:
		return math.Sinh(x)
	case fnCosh:
		return math.Cosh(x)
	case fnTanh:
		return math.Tanh(x)
	case fnSign:
		switch {
		case x > 0:
			return 1
		case x < 0:
			return -1
		}
		return x // 0, NaN
	case fnErf:
		return math.Erf(x)
	case fnGamma:
		return math.Gamma(x)
	case fnBesselI:
		return BesselI(int(parameter), x)
	}
	return math.NaN()
}

// apply2 evaluates a function of two arguments.
func (f function) apply2(x, y float64) float64 {
	if f == fnPow {
		return math.Pow(x, y)
	}
	return math.NaN()
}

// BesselI returns the modified Bessel function of the first kind of integer
// order n: I_n(x) = sum_k (x/2)^(2k+n) / (k! (k+n)!), whose terms all have one
// sign, and for large x the expansion of Abramowitz and Stegun, Handbook of
// Mathematical Functions, 9.7.1.
func BesselI(n int, x float64) float64 {
	if n < 0 {
		n = -n
	}
	sign := 1.0
	if x < 0 {
		if x = -x; n%2 == 1 {
			sign = -1
		}
	}
	mu := 4 * float64(n) * float64(n)
	if x > 40 && mu < x {
		term, sum := 1.0, 1.0
		for k := 1.0; k < 80 && math.Abs(term) > 1e-18; k++ {
			term *= -(mu - (2*k-1)*(2*k-1)) / (k * 8 * x)
			sum += term
		}
		half := math.Exp(x / 2) // e^x alone would overflow first
		return sign * half * (half / math.Sqrt(2*math.Pi*x) * sum)
	}
	first := 1.0
	for i := 1; i <= n; i++ {
		first *= x / 2 / float64(i)
	}
	q := x * x / 4
	term, sum := first, first
	for k := 1.0; k < 5000; k++ {
		term *= q / (k * (k + float64(n)))
		sum += term
		if term <= sum*1e-18 {
			break
		}
	}
	return sign * sum
}
