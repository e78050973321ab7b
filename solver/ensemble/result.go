package ensemble

import (
	"fmt"
	"math"
	"math/big"
)

// Result is what a run found.
type Result struct {
	Seed        uint64
	Scheme      string
	Step        float64 // the largest
	Steps       uint64  // of each path
	Paths       uint64  // in the result
	Observables []string
	Times       []TimeResult
	Exits       []ExitResult
	Leaves      []LeaveTally
	Long        *LongResult `json:",omitempty"`
	BlowUp      uint64
	Events      []Event
	Warnings    []string
	// PathStepsPerSecond is the speed of this process; it is not part of the
	// statistics and differs from run to run.
	PathStepsPerSecond float64 `json:"-"`
}

// Moments are the sample moments of several quantities: N values, their means,
// the sums M2 of products of deviations from the means, the unbiased covariance
// M2/(N-1) and the standard errors of the means. Each is rounded once.
type Moments struct {
	N          uint64
	Mean       []float64
	M2         [][]float64
	Covariance [][]float64
	StdErr     []float64
}

// Variance returns the sample variance of quantity i.
func (m *Moments) Variance(i int) float64 { return m.Covariance[i][i] }

// TimeResult are the moments of the observables at one time.
type TimeResult struct {
	Time float64
	Moments
	Histograms []Histogram
}

// ExitResult describes the paths stopped at an absorbing variable.
type ExitResult struct {
	Variable             string
	Lower, Upper, Alive  uint64
	MeanTime, StdErrTime float64 // of the stopped paths; NaN for fewer than 2
}

// LongResult are averages along the paths.
type LongResult struct {
	Span        float64
	Moments               // of the path averages: Mean is the stationary mean, StdErr its error
	Stationary  []float64 // variance of the observable under the stationary law
	Correlation []float64 // integrated autocorrelation time, from the spread of the batches
	Effective   []float64 // number of independent samples the averages are worth
	Histograms  []Histogram
}

// moments evaluates exact sums and sums of products.
func moments(n uint64, sums, products []Sum) Moments {
	k := len(sums)
	m := Moments{N: n, Mean: make([]float64, k), StdErr: make([]float64, k)}
	count := new(big.Rat).SetInt(new(big.Int).SetUint64(n))
	at := 0
	for range k {
		m.M2 = append(m.M2, make([]float64, k))
		m.Covariance = append(m.Covariance, make([]float64, k))
	}
	for i := range k {
		m.Mean[i] = quotient(&sums[i], count)
		for j := i; j < k; j++ {
			v := centred(&products[at], &sums[i], &sums[j], count)
			at++
			m.M2[i][j], m.M2[j][i] = v, v
			c := v / float64(n-1)
			if n < 2 {
				c = math.NaN()
			}
			m.Covariance[i][j], m.Covariance[j][i] = c, c
		}
		m.StdErr[i] = math.Sqrt(m.Covariance[i][i] / float64(n))
	}
	return m
}

func quotient(s *Sum, n *big.Rat) float64 {
	r, ok := s.Rat()
	if !ok || n.Sign() == 0 {
		return math.NaN()
	}
	f, _ := r.Quo(r, n).Float64()
	return f
}

// centred returns P - S T/n.
func centred(p, s, t *Sum, n *big.Rat) float64 {
	rp, ok1 := p.Rat()
	rs, ok2 := s.Rat()
	rt, ok3 := t.Rat()
	if !ok1 || !ok2 || !ok3 || n.Sign() == 0 {
		return math.NaN()
	}
	rs.Mul(rs, rt)
	f, _ := rp.Sub(rp, rs.Quo(rs, n)).Float64()
	return f
}

func (p *plan) result(t *Tally) (*Result, error) {
	r := &Result{
		Seed: p.s.Seed, Scheme: p.scheme.Name, Step: p.step, Steps: p.steps, Paths: t.Paths(),
		Observables: p.m.ObservableNames(), Leaves: t.Leaves, BlowUp: t.BlowUp, Events: t.Events,
	}
	for i := range t.Times {
		x := &t.Times[i]
		r.Times = append(r.Times, TimeResult{Time: x.Time, Moments: moments(x.Count, x.Sums, x.Products), Histograms: x.Cells})
	}
	for i := range t.Exits {
		e := &t.Exits[i]
		n := e.Lower + e.Upper
		m := moments(n, []Sum{e.Time}, []Sum{e.Square})
		r.Exits = append(r.Exits, ExitResult{e.Variable, e.Lower, e.Upper, e.Alive, m.Mean[0], m.StdErr[0]})
	}
	if t.Long != nil {
		r.Long = longResult(t.Long)
	}
	r.warn(p)
	return r, nil
}

func (r *Result) warn(p *plan) {
	if a, err := p.m.Advise(p.scheme, p.s.Time); err == nil {
		longest := 0.0
		for _, g := range p.segments {
			longest = max(longest, g.stepper.h)
		}
		if w := a.Warning(longest); w != "" {
			r.Warnings = append(r.Warnings, w)
		}
	}
	if r.BlowUp > 0 {
		r.Warnings = append(r.Warnings, fmt.Sprintf("%d of %d paths left the finite numbers and are not counted; a shorter step may help", r.BlowUp, r.Paths))
	}
	for _, l := range r.Leaves {
		if l.Of > 0 && float64(l.Steps) > 0.05*float64(l.Of) {
			r.Warnings = append(r.Warnings, fmt.Sprintf("%.1f %% of the steps of %q were reflected; the step is long for its domain", 100*float64(l.Steps)/float64(l.Of), l.Variable))
		}
	}
}

// longResult derives the autocorrelation time from the spread of batch averages:
// the variance of an average over a time L is 2 tau s^2/L for L much longer than
// tau, s^2 being the variance under the stationary law.
func longResult(t *LongTally) *LongResult {
	l := &LongResult{Span: t.Span, Moments: moments(t.Count, t.Mean, t.Products), Histograms: t.Cells}
	count := new(big.Rat).SetInt(new(big.Int).SetUint64(t.Count))
	for i := range t.Mean {
		mean := l.Mean[i]
		s2 := quotient(&t.Square[i], count) - mean*mean
		batch := quotient(&t.BatchSq[i], count) - mean*mean
		tau := batch * t.Batch / (2 * s2)
		l.Stationary = append(l.Stationary, s2)
		l.Correlation = append(l.Correlation, tau)
		l.Effective = append(l.Effective, float64(t.Count)*t.Span/(2*tau))
		if t.Count < 2 { // one path: the error from its batches
			l.StdErr[i] = math.Sqrt(batch * t.Batch / t.Span)
		}
	}
	return l
}
