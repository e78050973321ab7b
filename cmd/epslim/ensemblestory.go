package main

import (
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/present"
	"epslim/solver/ensemble"
)

// ensembleResult is the machine-readable result of the ensemble command.
type ensembleResult struct {
	Format      string             `json:"format"`
	Seed        uint64             `json:"seed"`
	Observables []ensembleObserved `json:"observables"`
	Speed       float64            `json:"path_steps_per_second"`
}

type ensembleObserved struct {
	Name  string          `json:"name"`
	Limit ensembleMoments `json:"limit"`
	Full  []ensembleFull  `json:"full"`
	Rate  *float64        `json:"rate"`
}

type ensembleMoments struct {
	Mean     *float64 `json:"mean"`
	StdErr   *float64 `json:"stderr"`
	Variance *float64 `json:"variance"`
}

type ensembleFull struct {
	Eps float64 `json:"eps"`
	ensembleMoments
}

func momentsOf(r *ensemble.Result, i int) ensembleMoments {
	m := r.Times[len(r.Times)-1].Moments
	return ensembleMoments{finite(m.Mean[i]), finite(m.StdErr[i]), finite(m.Variance(i))}
}

func ensembleJSON(run ensembleRun, c *ensemble.Convergence) ensembleResult {
	out := ensembleResult{Format: present.Format, Seed: run.seed, Observables: []ensembleObserved{}}
	for i, n := range c.Limit.Observables {
		o := ensembleObserved{Name: n, Limit: momentsOf(c.Limit, i), Full: []ensembleFull{}}
		for k, r := range c.Full {
			o.Full = append(o.Full, ensembleFull{run.eps[k], momentsOf(r, i)})
		}
		if i < len(c.Rates) && c.Rates[i].Status == ensemble.RateOK {
			o.Rate = finite(c.Rates[i].Exponent)
		}
		out.Observables = append(out.Observables, o)
	}
	for _, r := range c.Full {
		out.Speed = math.Max(out.Speed, r.PathStepsPerSecond)
	}
	return out
}

// ensembleStory is the table for readers.
func ensembleStory(res *derivation.Result, run ensembleRun, c *ensemble.Convergence) *present.Story {
	st := &present.Story{Title: res.System.Title}
	cell := func(format string, args ...any) []present.Span {
		return []present.Span{{Text: fmt.Sprintf(format, args...)}}
	}
	for i, n := range c.Limit.Observables {
		t := present.Table{Head: []string{"system", "mean", "standard error", "variance", "difference from the limit"}}
		row := func(name string, r *ensemble.Result, diff string) {
			m := r.Times[len(r.Times)-1].Moments
			t.Rows = append(t.Rows, [][]present.Span{cell("%s", name), cell("%.6g", m.Mean[i]), cell("%.2g", m.StdErr[i]), cell("%.6g", m.Variance(i)), cell("%s", diff)})
		}
		row("limit", c.Limit, "")
		for k, r := range c.Full {
			diff := ""
			if i < len(c.Points) && k < len(c.Points[i]) {
				p := c.Points[i][k]
				diff = fmt.Sprintf("%+.3g ± %.2g (z = %.1f)", p.Value, p.StdErr, p.Value/p.StdErr)
			}
			row(fmt.Sprintf("%s = %g", res.System.Small, run.eps[k]), r, diff)
		}
		blocks := []present.Block{t}
		if i < len(c.Rates) {
			blocks = append(blocks, present.Para{{Text: "Rate in " + res.System.Small + ": " + c.Rates[i].String() + "."}})
		}
		st.Sections = append(st.Sections, present.Section{ID: "observable", Title: fmt.Sprintf("%s at time %g", n, run.time), Blocks: blocks})
	}
	t := present.Table{Head: []string{"system", "scheme", "step", "paths", "steps of a path", "blown up"}}
	for k, r := range append([]*ensemble.Result{c.Limit}, c.Full...) {
		name := "limit"
		if k > 0 {
			name = fmt.Sprintf("%s = %g", res.System.Small, run.eps[k-1])
		}
		t.Rows = append(t.Rows, [][]present.Span{cell("%s", name), cell("%s", r.Scheme), cell("%.3g", r.Step), cell("%d", r.Paths), cell("%d", r.Steps), cell("%d", r.BlowUp)})
	}
	blocks := []present.Block{t}
	for _, r := range append([]*ensemble.Result{c.Limit}, c.Full...) {
		for k, e := range r.Events {
			if k == 3 {
				break
			}
			blocks = append(blocks, present.Para{{Text: "Stopped: " + e.String()}})
		}
	}
	st.Sections = append(st.Sections, present.Section{ID: "runs", Title: fmt.Sprintf("Runs (seed %d)", run.seed), Blocks: blocks})
	return st
}
