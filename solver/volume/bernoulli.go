package volume

import "math"

// Bernoulli returns B(z) = z/(exp(z)-1), the weight of the exponentially
// fitted flux, to a few units in the last place for every z: B(0) = 1,
// B(z) -> -z for z -> -Inf and B(z) -> 0 for z -> +Inf. B(-z) = B(z) + z.
func Bernoulli(z float64) float64 {
	if z > -0.5 && z < 0.5 {
		// The even part z/2*coth(z/2) by its Taylor series; coefficients
		// B_2n/(2n)! with the Bernoulli numbers (Abramowitz & Stegun 23.1.1).
		return evenBernoulli(z*z) - 0.5*z
	}
	if z > 0 {
		e := math.Exp(-z)
		return z * e / -math.Expm1(-z)
	}
	return z / math.Expm1(z)
}

// evenBernoulli returns (z/2) coth(z/2) for s = z^2 < 1/4.
func evenBernoulli(s float64) float64 {
	return 1 + s*(1.0/12+s*(-1.0/720+s*(1.0/30240+s*(-1.0/1209600+s*(1.0/47900160+s*(-691.0/1307674368000+s*(1.0/74724249600)))))))
}

// bernoulliPair returns B(-z) and B(z), both without cancellation.
func bernoulliPair(z float64) (minus, plus float64) {
	if z > -0.5 && z < 0.5 {
		e := evenBernoulli(z * z)
		return e + 0.5*z, e - 0.5*z
	}
	if z > 0 {
		b := Bernoulli(z)
		return b + z, b
	}
	b := Bernoulli(-z)
	return b, b - z
}
