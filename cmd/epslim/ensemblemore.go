package main

import (
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/present"
	"epslim/solver/ensemble"
)

func textCell(format string, args ...any) []present.Span {
	return []present.Span{{Text: fmt.Sprintf(format, args...)}}
}

// moreSections tells what was asked for beyond the means at the end.
func moreSections(res *derivation.Result, run ensembleRun, c *ensemble.Convergence, law *numbers.Law) []present.Section {
	var out []present.Section
	add := func(id, title string, blocks ...present.Block) {
		out = append(out, present.Section{ID: id, Title: title, Blocks: blocks})
	}
	if len(c.Limit.Times) > 1 {
		add("times", "Means at all times", timesTable(res, run, c))
	}
	if len(c.Limit.Observables) > 1 {
		add("covariance", fmt.Sprintf("Covariances at time %g", run.time), covarianceTable(res, run, c))
	}
	if c.Limit.Long != nil {
		add("long", fmt.Sprintf("Averages along the paths from time %g on", run.long), longTable(res, run, c))
	}
	if len(c.Limit.Exits) > 0 {
		add("exits", fmt.Sprintf("First passage before time %g", run.time), exitTable(res, run, c))
	}
	if law != nil {
		add("histograms", "Histograms against the limit's stationary density", histogramBlocks(res, run, c, law)...)
	}
	if c.LimitBias != nil {
		add("bias", "Bias of the step, from two steps on common noise", biasTable(res, run, c))
	}
	if run.target != nil {
		add("target", fmt.Sprintf("Target for the standard errors: %g", run.target.StdErr), targetTable(res, run, c))
	}
	return out
}

func timesTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"observable", "time"}}
	for k := range systems(c) {
		t.Head = append(t.Head, systemName(res, run, k))
	}
	for i, n := range c.Limit.Observables {
		for j, x := range c.Limit.Times {
			row := [][]present.Span{textCell("%s", n), textCell("%g", x.Time)}
			for _, r := range systems(c) {
				row = append(row, textCell("%.6g ± %.2g", r.Times[j].Mean[i], r.Times[j].StdErr[i]))
			}
			t.Rows = append(t.Rows, row)
		}
	}
	return t
}

func covarianceTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"system", "of", "covariance", "correlation"}}
	for k, r := range systems(c) {
		m := r.Times[len(r.Times)-1]
		for i, a := range r.Observables {
			for j := i + 1; j < len(r.Observables); j++ {
				v := m.Covariance[i][j]
				t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s, %s", a, r.Observables[j]),
					textCell("%.4g", v), textCell("%.4g", v/math.Sqrt(m.Variance(i)*m.Variance(j)))})
			}
		}
	}
	return t
}

func longTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"system", "observable", "mean", "standard error", "variance of the stationary law", "autocorrelation time", "independent samples"}}
	for k, r := range systems(c) {
		for i, n := range r.Observables {
			l := r.Long
			time, samples := correlation(l, i)
			t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s", n), textCell("%.6g", l.Mean[i]), textCell("%.2g", l.StdErr[i]),
				textCell("%.6g", l.Stationary[i]), textCell("%.4g", time), textCell("%.4g", samples)})
		}
	}
	return t
}

// enoughPaths is the number of paths from which the spread of their averages
// tells the autocorrelation time to a fifth or better.
const enoughPaths = 64

// correlation is the integrated autocorrelation time, the integral of the
// autocorrelation from 0 on, and the number of independent samples that the
// averages are worth. Many paths tell it by the spread of their averages, whose
// variance is 2 time variance/span; few by the spread of batches along them,
// which underestimates a time that is not short beside a batch.
func correlation(l *ensemble.LongResult, i int) (time, samples float64) {
	if l.N < enoughPaths {
		return l.Correlation[i], l.Effective[i]
	}
	samples = l.Stationary[i] / (l.StdErr[i] * l.StdErr[i])
	return float64(l.N) * l.Span / (2 * samples), samples
}

func exitTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"system", "variable", "at the lower end", "at the upper end", "still inside", "mean exit time of those that left"}}
	for k, r := range systems(c) {
		for _, e := range r.Exits {
			mean := "too few"
			if !math.IsNaN(e.MeanTime) {
				mean = fmt.Sprintf("%.6g ± %.2g", e.MeanTime, e.StdErrTime)
			}
			t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s", e.Variable), textCell("%d", e.Lower), textCell("%d", e.Upper),
				textCell("%d", e.Alive), textCell("%s", mean)})
		}
	}
	return t
}

// histogramBlocks compares with the stationary density. Samples along a path are
// correlated, so that no probability can be given for them.
func histogramBlocks(res *derivation.Result, run ensembleRun, c *ensemble.Convergence, law *numbers.Law) []present.Block {
	t := present.Table{Head: []string{"system", "variable", "L1 distance", "L1 of independent samples of the law", "Kolmogorov-Smirnov distance", "probability of a larger one"}}
	note := fmt.Sprintf("The law of the paths at time %g is compared; it is the stationary one only when that time is long beside the relaxation.", run.time)
	if run.long >= 0 {
		note = "Samples along a path are correlated: the distances are those of the averages, and no probability is given."
	}
	for k, r := range systems(c) {
		for i := range law.Specs {
			h := r.Times[len(r.Times)-1].Histograms
			if run.long >= 0 {
				h = r.Long.Histograms
			}
			d, err := h[i].Compare(law.Cells[i])
			if err != nil {
				t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s", law.Specs[i].Observables[0]), textCell("%v", err), nil, nil, nil})
				continue
			}
			noise, prob := fmt.Sprintf("%.3g", d.L1Noise), fmt.Sprintf("%.3g", d.KSProb)
			if run.long >= 0 {
				noise, prob = "", ""
			}
			t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s", law.Specs[i].Observables[0]), textCell("%.3g", d.L1),
				textCell("%s", noise), textCell("%.3g", d.KS), textCell("%s", prob)})
		}
	}
	return []present.Block{t, present.Para{{Text: note}}}
}

func biasTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"system", "observable", "scheme", "step", "bias", "correlation of the pair"}}
	for k, b := range append([]*ensemble.StepBias{c.LimitBias}, c.FullBias...) {
		if b == nil {
			continue
		}
		for i, n := range b.Observables {
			t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%s", n), textCell("%s", b.Scheme), textCell("%.3g", b.Step),
				textCell("%+.3g ± %.2g", b.Bias[i], b.StdErr[i]), textCell("%.4f", b.Correlation[i])})
		}
	}
	return t
}

func targetTable(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) present.Table {
	t := present.Table{Head: []string{"system", "paths", "largest standard error", "outcome"}}
	for k, r := range systems(c) {
		worst := 0.0
		for _, e := range r.Times[len(r.Times)-1].StdErr {
			worst = math.Max(worst, e)
		}
		outcome := "budget spent"
		if worst <= run.target.StdErr {
			outcome = "reached"
		}
		t.Rows = append(t.Rows, [][]present.Span{textCell("%s", systemName(res, run, k)), textCell("%d", r.Paths), textCell("%.3g", worst), textCell("%s", outcome)})
	}
	return t
}
