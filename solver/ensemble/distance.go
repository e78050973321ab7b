package ensemble

import (
	"fmt"
	"math"
)

// Distance compares a histogram with a law.
type Distance struct {
	N       uint64  // values compared, those outside the ends included
	KS      float64 // largest difference of the distribution functions at the cell edges; one axis only, else NaN
	KSScale float64 // sqrt(N)*KS: beyond 1.36 for one law in twenty, 1.63 for one in a hundred
	KSProb  float64 // probability of a larger difference under the law (asymptotic; a bound, as only edges are compared)
	L1      float64 // sum over the cells of |frequency - probability|, the outside being one more cell
	L1Noise float64 // the L1 distance expected from N values of the law itself
	Chi2    float64 // Pearson's statistic over cells with at least five expected values, the rest pooled
	Degrees int     // its degrees of freedom
}

// Compare returns the distances of the histogram from the law that gives the
// cells the probabilities p, in the order of h.Counts; what is missing to 1 is
// the probability of the outside.
//
// The Kolmogorov probability is the series of A. Kolmogorov (1933) in the form
// of W. Feller, Ann. Math. Statist. 19 (1948) 177-189.
func (h *Histogram) Compare(p []float64) (Distance, error) {
	if len(p) != len(h.Counts) {
		return Distance{}, fmt.Errorf("ensemble: %d probabilities for %d cells", len(p), len(h.Counts))
	}
	d := Distance{N: h.Total() + h.Outside, KS: math.NaN(), KSScale: math.NaN(), KSProb: math.NaN()}
	if d.N == 0 {
		return Distance{}, fmt.Errorf("ensemble: the histogram of %v is empty", h.Spec.Observables)
	}
	n := float64(d.N)
	var mass, ks, f, g float64
	var pooledP, pooledN float64
	cells := 0
	note := func(count uint64, q float64) {
		d.L1 += math.Abs(float64(count)/n - q)
		d.L1Noise += math.Sqrt(2 / math.Pi * q * (1 - q) / n)
		if n*q >= 5 {
			x := float64(count) - n*q
			d.Chi2 += x * x / (n * q)
			cells++
		} else {
			pooledP += q
			pooledN += float64(count)
		}
	}
	for i, q := range p {
		if !(q >= 0) || math.IsInf(q, 0) {
			return Distance{}, fmt.Errorf("ensemble: cell %d has the probability %v", i, q)
		}
		mass += q
		f += float64(h.Counts[i]) / n
		g += q
		ks = math.Max(ks, math.Abs(f-g))
		note(h.Counts[i], q)
	}
	if mass > 1+1e-9 {
		return Distance{}, fmt.Errorf("ensemble: the probabilities of the cells sum to %v", mass)
	}
	outside := math.Max(0, 1-mass)
	if outside > 1e-12 || h.Outside > 0 {
		note(h.Outside, outside)
	}
	if pooledP > 0 {
		x := pooledN - n*pooledP
		d.Chi2 += x * x / (n * pooledP)
		cells++
	}
	d.Degrees = max(0, cells-1)
	if len(h.Spec.Cells) == 1 {
		d.KS, d.KSScale = ks, math.Sqrt(n)*ks
		d.KSProb = KolmogorovProbability(d.KSScale)
	}
	return d, nil
}

// KolmogorovProbability returns the limiting probability that sqrt(n) times the
// Kolmogorov-Smirnov distance of n values from their continuous law exceeds x.
func KolmogorovProbability(x float64) float64 {
	if x < 0.2 {
		return 1
	}
	if x < 1 { // the theta series converges faster here
		sum := 0.0
		for k := 1.0; k < 20; k++ {
			sum += math.Exp(-(2*k - 1) * (2*k - 1) * math.Pi * math.Pi / (8 * x * x))
		}
		return 1 - math.Sqrt(2*math.Pi)/x*sum
	}
	sum, sign := 0.0, 1.0
	for k := 1.0; k < 20; k++ {
		sum += sign * math.Exp(-2*k*k*x*x)
		sign = -sign
	}
	return math.Max(0, 2*sum)
}

// CellProbabilities returns the probabilities of the cells of a histogram of one
// observable under the distribution function cdf.
func (h *Histogram) CellProbabilities(cdf func(float64) float64) []float64 {
	e := h.Edges(0)
	p := make([]float64, len(e)-1)
	for i := range p {
		p[i] = math.Max(0, cdf(e[i+1])-cdf(e[i]))
	}
	return p
}
