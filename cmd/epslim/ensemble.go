package main

import (
	"bytes"
	"context"
	"fmt"
	"math"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/plots"
	"epslim/cmd/epslim/present"
	"epslim/solver/ensemble"
)

// ensembleFlags are the options of a run as typed.
type ensembleFlags struct {
	eps, paths string
	time, step float64
	seed       uint64
	workers    int
	scheme     string
	bias       bool
}

func (f *ensembleFlags) bind(cmd *cobra.Command, paths string) {
	cmd.Flags().StringVar(&f.eps, "eps", "0.2,0.1,0.05", "values of the scale parameter, decreasing")
	cmd.Flags().StringVar(&f.paths, "paths", paths, "number of paths, or a range such as 1000:2000")
	cmd.Flags().Float64Var(&f.time, "time", 1, "length of the simulated time, in the limit's unit")
	cmd.Flags().Float64Var(&f.step, "step", 0, "largest time step (0: chosen from eps and the rates of the system)")
	cmd.Flags().Uint64Var(&f.seed, "seed", 1, "seed of all random numbers")
	cmd.Flags().IntVar(&f.workers, "workers", 0, "goroutines (0: one a processor); results do not depend on it")
	cmd.Flags().StringVar(&f.scheme, "scheme", "", "time-stepping scheme (default: chosen to suit the system)")
	cmd.Flags().BoolVar(&f.bias, "bias", false, "estimate the bias of the step with two steps on common noise")
}

// ensembleRun is a run that has been checked.
type ensembleRun struct {
	eps        []float64
	from, to   uint64
	time, step float64
	seed       uint64
	workers    int
	scheme     string
	bias       bool
}

// Limits of what a run accepts.
const (
	maxTime = 1e9
	maxEps  = 10
)

func (f *ensembleFlags) settings() (ensembleRun, error) {
	r := ensembleRun{time: f.time, step: f.step, seed: f.seed, workers: f.workers, scheme: f.scheme, bias: f.bias}
	for _, s := range strings.Split(f.eps, ",") {
		v, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
		if err != nil || !(v > 0) || v > maxEps {
			return r, fmt.Errorf("--eps is %q; it takes positive numbers of at most %d, such as 0.2,0.1,0.05", f.eps, maxEps)
		}
		r.eps = append(r.eps, v)
	}
	from, to, isRange := strings.Cut(f.paths, ":")
	if !isRange {
		from, to = "0", f.paths
	}
	var e1, e2 error
	r.from, e1 = strconv.ParseUint(from, 10, 64)
	r.to, e2 = strconv.ParseUint(to, 10, 64)
	if e1 != nil || e2 != nil || r.to <= r.from {
		return r, fmt.Errorf("--paths is %q; it takes a positive number or a range such as 1000:2000", f.paths)
	}
	if r.to > ensemble.MaxPaths {
		return r, fmt.Errorf("--paths is %q; at most %d are possible", f.paths, uint64(ensemble.MaxPaths))
	}
	if !(f.time > 0) || f.time > maxTime {
		return r, fmt.Errorf("--time is %g; it must be positive and at most %g", f.time, float64(maxTime))
	}
	if f.step < 0 || f.step > f.time || math.IsNaN(f.step) {
		return r, fmt.Errorf("--step is %g; it must be positive and at most the time of %g, or 0 for the recommended one", f.step, f.time)
	}
	if f.scheme != "" {
		if _, err := ensemble.SchemeByName(f.scheme); err != nil {
			return r, fmt.Errorf("--scheme: %w", err)
		}
	}
	return r, nil
}

func (a *app) ensembleCommand() *cobra.Command {
	var f ensembleFlags
	var format, figureFile, csv string
	var force bool
	cmd := &cobra.Command{
		Use:   "ensemble FILE",
		Short: "Paths of the full system and of its limit, and the rate in eps",
		Long: `Simulate the full system at several values of the scale parameter and its limit,
and compare the means of the observables, with standard errors and the observed rate.`,
		Example: `  epslim ensemble crawler.ito
  epslim ensemble crawler.ito --eps 0.4,0.2,0.1 --paths 100000 --time 2 --figure rate.svg`,
		Args: oneFile,
		RunE: func(cmd *cobra.Command, args []string) error {
			if err := oneOf("--format", format, "text", "json"); err != nil {
				return err
			}
			run, err := f.settings()
			if err != nil {
				return err
			}
			if figureFile != "" {
				if err := figureName(figureFile); err != nil {
					return err
				}
			}
			if err := a.targets(force, figureFile, csv); err != nil {
				return err
			}
			return a.ensemble(cmd, args[0], run, format, figureFile, csv, force)
		},
	}
	f.bind(cmd, "20000")
	cmd.Flags().StringVar(&format, "format", "text", "text or json")
	cmd.Flags().StringVar(&figureFile, "figure", "", "draw the convergence in eps to a file that ends in .svg, .png, .pdf or .tex")
	cmd.Flags().StringVar(&csv, "csv", "", "write means and differences to a table")
	cmd.Flags().BoolVar(&force, "force", false, "replace files that exist")
	return cmd
}

func (a *app) ensemble(cmd *cobra.Command, file string, run ensembleRun, format, figureFile, csv string, force bool) error {
	sys, err := a.read(file)
	if err != nil {
		return err
	}
	ctx := cmd.Context()
	res, err := derivation.Run(ctx, sys, derivation.Options{SkipClaims: true})
	if err != nil {
		return a.deriveError(err)
	}
	prov := a.provenance(cmd, sys, file)
	if res.Refused != nil {
		return a.refused(res, prov, format)
	}
	c, err := a.runStudy(ctx, res, run)
	if err != nil && (c == nil || c.Limit == nil) {
		return a.deriveError(err)
	}
	interrupted := err
	for _, r := range append([]*ensemble.Result{c.Limit}, c.Full...) {
		for _, w := range r.Warnings {
			a.remark("%s", w)
		}
	}
	if figureFile != "" && len(c.Points) > 0 {
		files, err := plots.Encode(plots.EpsConvergence(res, c, plots.Meta(prov)), figureFile)
		if err != nil {
			return err
		}
		for _, x := range files {
			if err := write(filepath.Join(filepath.Dir(figureFile), x.Name), x.Data, force); err != nil {
				return err
			}
		}
	}
	if csv != "" {
		var b bytes.Buffer
		if err := c.WriteCSV(&b, prov.OneLine()); err != nil {
			return err
		}
		if err := write(csv, b.Bytes(), force); err != nil {
			return err
		}
	}
	if format == "json" {
		err = a.printJSON(ensembleJSON(run, c))
	} else {
		_, err = a.out.Write(present.StoryText(ensembleStory(res, run, c), present.TextSettings{Colour: colour(a.out)}))
	}
	if err != nil {
		return err
	}
	return interrupted
}

// runStudy simulates limit and full systems with a progress line.
func (a *app) runStudy(ctx context.Context, res *derivation.Result, run ensembleRun) (*ensemble.Convergence, error) {
	st, err := numbers.Study(ctx, res, run.eps)
	if err != nil {
		return nil, err
	}
	st.FullScheme, st.Bias = run.scheme, run.bias
	if run.step > 0 {
		st.LimitStep = run.step
		for range run.eps {
			st.Steps = append(st.Steps, run.step)
		}
	}
	p := a.progress()
	defer p.clear()
	return st.Run(ctx, ensemble.Settings{
		From: run.from, To: run.to, Time: run.time, Seed: run.seed, Workers: workers(run.workers),
		Progress: func(q ensemble.Progress) {
			p.show("paths %d of %d, %.3g path-steps a second, %s left", q.Done, q.Total, q.StepsPerSec, q.Remaining.Round(1e9))
		},
	})
}

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
