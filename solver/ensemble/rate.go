package ensemble

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

// Point is an error measured at one value of the scale parameter or of the step.
type Point struct {
	Eps    float64
	Value  float64 // difference from the limit, with its sign
	StdErr float64
}

// RateStatus says what a fit of a rate is worth.
type RateStatus uint8

const (
	RateOK         RateStatus = iota // the rate is determined
	RateNoiseFloor                   // the differences do not stand out of the noise: no rate
	RateFewPoints                    // fewer than two values of eps
)

func (s RateStatus) String() string {
	return [...]string{"ok", "noise floor reached", "fewer than two values of eps"}[s]
}

// Rate is an observed power law |difference| = C eps^Exponent.
type Rate struct {
	Status   RateStatus
	Exponent float64 // NaN unless Status is RateOK
	StdErr   float64
	Lower    float64 // 95 % confidence interval
	Upper    float64
	Constant float64
	Used     []float64 // the values of eps that stand out of the noise
	Chi2     float64   // of the fit, with len(Used)-2 degrees of freedom
}

// String gives the rate with its interval, or the reason why there is none.
func (r Rate) String() string {
	if r.Status != RateOK {
		return r.Status.String()
	}
	return fmt.Sprintf("%.2f [%.2f, %.2f]", r.Exponent, r.Lower, r.Upper)
}

// significance is the number of standard errors from which a difference counts
// as seen; its logarithm then has a standard error below 1/3.
const significance = 3

// FitRate fits a power law to the differences that exceed their standard errors
// significance times: a weighted straight line through the logarithms, the
// standard error of log|v| being StdErr/|v|. Differences of the smaller eps that
// drown in the noise are left out; with fewer than two left the noise floor is
// reported instead of a rate. When the line does not fit, the interval is
// widened by the square root of chi^2 per degree of freedom.
//
// common is the standard error of a part that all differences share, such as the
// mean of the limit; the differences are then not independent, and the interval
// accounts for a common shift by adding the rate's response to it.
func FitRate(points []Point, common float64) Rate {
	r := Rate{Exponent: math.NaN(), StdErr: math.NaN(), Lower: math.NaN(), Upper: math.NaN(), Constant: math.NaN()}
	var used []Point
	for _, p := range points {
		total := math.Hypot(p.StdErr, common)
		if p.Eps > 0 && !math.IsNaN(p.Value) && math.Abs(p.Value) > significance*total && p.Value != 0 {
			used = append(used, p)
		}
	}
	if len(points) < 2 {
		r.Status = RateFewPoints
		return r
	}
	slices.SortFunc(used, func(a, b Point) int {
		if a.Eps > b.Eps {
			return -1
		}
		return 1
	})
	// A change of sign is a crossing of zero, not a power law: keep the tail of
	// smallest eps with one sign.
	for i := len(used) - 2; i >= 0; i-- {
		if math.Signbit(used[i].Value) != math.Signbit(used[i+1].Value) {
			used = used[i+1:]
			break
		}
	}
	if len(used) < 2 || used[0].Eps == used[len(used)-1].Eps {
		r.Status = RateNoiseFloor
		return r
	}
	r.fit(used, common)
	return r
}

func (r *Rate) fit(used []Point, common float64) {
	var w, x, y, xx, xy float64
	weight := func(p Point) float64 {
		s := math.Max(p.StdErr/math.Abs(p.Value), 1e-12)
		return 1 / (s * s)
	}
	for _, p := range used {
		a, b, c := weight(p), math.Log(p.Eps), math.Log(math.Abs(p.Value))
		w, x, y, xx, xy = w+a, x+a*b, y+a*c, xx+a*b*b, xy+a*b*c
		r.Used = append(r.Used, p.Eps)
	}
	det := w*xx - x*x
	r.Exponent = (w*xy - x*y) / det
	r.Constant = math.Exp((y - r.Exponent*x) / w)
	variance := w / det
	response := 0.0 // of the exponent to a common shift of all values
	for _, p := range used {
		b := math.Log(p.Eps)
		e := math.Log(math.Abs(p.Value)) - math.Log(r.Constant) - r.Exponent*b
		r.Chi2 += weight(p) * e * e
		response += weight(p) * (w*b - x) / det / p.Value
	}
	if k := len(used) - 2; k > 0 && r.Chi2 > float64(k) {
		variance *= r.Chi2 / float64(k)
	}
	r.StdErr = math.Hypot(math.Sqrt(variance), response*common)
	r.Lower, r.Upper = r.Exponent-1.96*r.StdErr, r.Exponent+1.96*r.StdErr
}

// Table formats points and rate for a report.
func (r Rate) Table(points []Point) string {
	var s strings.Builder
	for _, p := range points {
		fmt.Fprintf(&s, "%-10.4g %12.5g +- %.2g\n", p.Eps, p.Value, p.StdErr)
	}
	fmt.Fprintf(&s, "rate %s\n", r)
	return s.String()
}
