package ensemble

import (
	"context"
	"math"
)

// StepBias is the part of the error that comes from the length of the step,
// estimated from two lengths on common noise: with the weak order p of the
// scheme the bias at step h is about (E_h - E_2h)/(2^p - 1).
type StepBias struct {
	Observables []string
	Scheme      string
	Order       float64 // the weak order that was assumed
	Step        float64
	Bias        []float64 // at Step
	StdErr      []float64
	Correlation []float64 // of the two simulations; near 1 where common noise helps
}

// EstimateStepBias simulates the model with the step of the settings and with
// twice that step on the same Brownian paths.
func EstimateStepBias(ctx context.Context, m *Model, s Settings) (*StepBias, error) {
	scheme := s.Scheme
	if scheme == "" {
		sc, _, err := m.DefaultScheme()
		if err != nil {
			return nil, err
		}
		scheme = sc.Name
	}
	sheet, err := SchemeByName(scheme)
	if err != nil {
		return nil, err
	}
	d, err := RunPair(ctx, Coupled{m, scheme}, Coupled{m, scheme}, 2, s)
	if d == nil {
		return nil, err
	}
	b := &StepBias{Observables: d.Observables, Scheme: scheme, Order: sheet.WeakOrder, Step: d.StepFine, Correlation: d.Correlation}
	f := 1 / (math.Exp2(sheet.WeakOrder) - 1)
	for i := range d.Observables {
		// E_h - E_0 is (E_2h - E_h)/(2^p - 1), and Delta is fine minus coarse.
		b.Bias = append(b.Bias, -f*d.Delta.Mean[i])
		b.StdErr = append(b.StdErr, f*d.Delta.StdErr[i])
	}
	return b, err
}

// Controlled returns the mean of observable i of the fine system with the coarse
// one as control variate: fine - beta (coarse - known), beta being the regression
// coefficient. known is the mean of the coarse system with its standard error,
// from a grid or a longer run.
func (d *Difference) Controlled(i int, known, knownErr float64) (mean, stderr, beta float64) {
	a, b := d.Fine.Variance(i), d.Coarse.Variance(i)
	cov := (a + b - d.Delta.Variance(i)) / 2
	if b > 0 {
		beta = cov / b
	}
	mean = d.Fine.Mean[i] - beta*(d.Coarse.Mean[i]-known)
	variance := math.Max(0, a-beta*cov) / float64(d.Fine.N)
	return mean, math.Hypot(math.Sqrt(variance), beta*knownErr), beta
}
