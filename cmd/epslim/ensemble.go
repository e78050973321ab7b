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

// ensembleOutput is where the results of an ensemble go.
type ensembleOutput struct {
	format, figure, csv, npz string
	force                    bool
}

func (o *ensembleOutput) bind(cmd *cobra.Command) {
	cmd.Flags().StringVar(&o.format, "format", "text", "text or json")
	cmd.Flags().StringVar(&o.figure, "figure", "", "draw the convergence in eps to a file that ends in .svg, .png, .pdf or .tex")
	cmd.Flags().StringVar(&o.csv, "csv", "", "write means, differences and rates to a table")
	cmd.Flags().StringVar(&o.npz, "npz", "", "write moments, covariances and histograms as NumPy arrays")
	cmd.Flags().BoolVar(&o.force, "force", false, "replace files that exist")
}

func (o ensembleOutput) check(a *app) error {
	if err := oneOf("--format", o.format, "text", "json"); err != nil {
		return err
	}
	if o.figure != "" {
		if err := figureName(o.figure); err != nil {
			return err
		}
	}
	return a.targets(o.force, o.figure, o.csv, o.npz)
}

func (a *app) ensembleCommand() *cobra.Command {
	var f ensembleFlags
	var o ensembleOutput
	var schemes bool
	cmd := &cobra.Command{
		Use:   "ensemble FILE",
		Short: "Paths of the full system and of its limit, and the rate in eps",
		Long: `Simulate the full system at several values of the scale parameter and its limit,
and compare the means of the observables, with standard errors and the observed rate.`,
		Example: `  epslim ensemble crawler.ito
  epslim ensemble crawler.ito --eps 0.4,0.2,0.1 --paths 100000 --time 2 --figure rate.svg
  epslim ensemble crawler.ito --target 1e-3 --budget 60s --checkpoint run
  epslim ensemble crawler.ito --time 50 --long 10 --histogram 64`,
		Args: func(cmd *cobra.Command, args []string) error {
			if schemes && len(args) == 0 {
				return nil
			}
			return oneFile(cmd, args)
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if schemes {
				return a.schemes()
			}
			if err := o.check(a); err != nil {
				return err
			}
			if f.Target > 0 && !cmd.Flags().Changed("paths") {
				f.Paths = "1024" // the size of the first round
			}
			run, err := f.settings()
			if err != nil {
				return err
			}
			return a.ensemble(cmd.Context(), args[0], f, run, o)
		},
	}
	f.bind(cmd, "20000")
	f.bindMore(cmd)
	o.bind(cmd)
	cmd.Flags().BoolVar(&schemes, "schemes", false, "print the fact sheets of the time-stepping schemes")
	return cmd
}

func (a *app) ensemble(ctx context.Context, file string, f ensembleFlags, run ensembleRun, o ensembleOutput) error {
	sys, err := a.read(file)
	if err != nil {
		return err
	}
	res, err := derivation.Run(ctx, sys, derivation.Options{SkipClaims: true})
	if err != nil {
		return a.deriveError(err)
	}
	camp := newCampaign(sys, file, a.set, f)
	prov := camp.provenance(run)
	if res.Refused != nil {
		return a.refused(res, prov, o.format)
	}
	st, s, law, err := a.study(ctx, res, run)
	if err != nil {
		return a.deriveError(err)
	}
	if run.checkpoint != "" {
		if err := camp.begin(run.checkpoint, run.resume, o.force, len(run.eps)+1); err != nil {
			return err
		}
	}
	c, interrupted := a.simulate(ctx, res, run, st, s)
	if interrupted != nil && (c == nil || c.Limit == nil) {
		return a.deriveError(interrupted)
	}
	if err := a.tell(res, run, c, law, prov, o); err != nil {
		return err
	}
	if interrupted != nil && run.checkpoint != "" {
		a.remark("what is finished is kept; go on with --resume")
	}
	return interrupted
}

// provenance names the options that shape the result and nothing else, so
// that slices, resumed runs and merged ones give the bytes of an unbroken run.
func (c campaign) provenance(run ensembleRun) present.Provenance {
	p := present.Provenance{Version: version, SHA256: c.SHA256, Model: c.Model}
	words := []string{"epslim", "ensemble", quote(c.File)}
	opt := func(name, value, usual string) {
		p.Options = append(p.Options, present.Option{Name: name, Value: value})
		if value != usual {
			words = append(words, "--"+name, quote(value))
		}
	}
	f := c.Run
	for _, s := range c.Set {
		opt("set", s, "")
	}
	opt("eps", f.Eps, "")
	opt("paths", pathsText(run.from, run.to), "")
	opt("time", float(f.Time), "1")
	opt("step", float(f.Step), "0")
	opt("seed", strconv.FormatUint(f.Seed, 10), "")
	for _, x := range []struct {
		name, value string
		set         bool
	}{
		{"scheme", f.Scheme, f.Scheme != ""}, {"limit-scheme", f.LimitScheme, f.LimitScheme != ""},
		{"times", f.Times, f.Times != ""}, {"long", float(f.Long), f.Long >= 0},
		{"histogram", strconv.Itoa(f.Histogram), f.Histogram > 0},
		{"target", float(f.Target), f.Target > 0}, {"budget", f.Budget, f.Budget != ""},
	} {
		if x.set {
			opt(x.name, x.value, "")
		}
	}
	if f.Bias {
		p.Options = append(p.Options, present.Option{Name: "bias", Value: "true"})
		words = append(words, "--bias")
	}
	p.Command = strings.Join(words, " ")
	return p
}

func float(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

// study prepares the systems, the settings and, where histograms are wanted,
// the law they are compared with.
func (a *app) study(ctx context.Context, res *derivation.Result, run ensembleRun) (*ensemble.Study, ensemble.Settings, *numbers.Law, error) {
	s := ensemble.Settings{
		From: run.from, To: run.to, Time: run.time, Times: run.times, Seed: run.seed, Workers: workers(run.workers),
		Checkpoint: run.checkpoint, CheckpointEvery: run.every, Resume: run.resume,
	}
	st, err := numbers.Study(ctx, res, run.eps)
	if err != nil {
		return nil, s, nil, err
	}
	st.FullScheme, st.LimitScheme, st.Bias, st.Target = run.scheme, run.limitScheme, run.bias, run.target
	if run.step > 0 {
		st.LimitStep = run.step
		for range run.eps {
			st.Steps = append(st.Steps, run.step)
		}
	}
	if run.long >= 0 {
		s.LongTime = &ensemble.LongTime{Burn: run.long}
	}
	if run.histogram == 0 {
		return st, s, nil, nil
	}
	law, err := numbers.StationaryLaw(ctx, res, st.Limit.ObservableNames(), run.histogram, workers(run.workers))
	if err != nil {
		return nil, s, nil, fmt.Errorf("--histogram: %w", err)
	}
	if s.LongTime != nil {
		s.LongTime.Histograms = law.Specs
	} else {
		s.Histograms = law.Specs
	}
	return st, s, law, nil
}

// runStudy simulates limit and full systems.
func (a *app) runStudy(ctx context.Context, res *derivation.Result, run ensembleRun) (*ensemble.Convergence, error) {
	st, s, _, err := a.study(ctx, res, run)
	if err != nil {
		return nil, err
	}
	return a.simulate(ctx, res, run, st, s)
}

// simulate runs a study with a progress line.
func (a *app) simulate(ctx context.Context, res *derivation.Result, run ensembleRun, st *ensemble.Study, s ensemble.Settings) (*ensemble.Convergence, error) {
	p := a.progress()
	defer p.clear()
	st.Progress = func(system int, q ensemble.Progress) {
		p.show("%s: paths %d of %d, %.3g path-steps a second, %s left", systemName(res, run, system), q.Done, q.Total, q.StepsPerSec, q.Remaining.Round(1e9))
	}
	return st.Run(ctx, s)
}

func systemName(res *derivation.Result, run ensembleRun, system int) string {
	if system == 0 {
		return "limit"
	}
	return fmt.Sprintf("%s = %g", res.System.Small, run.eps[system-1])
}

// tell writes everything that is wanted of a study.
func (a *app) tell(res *derivation.Result, run ensembleRun, c *ensemble.Convergence, law *numbers.Law, prov present.Provenance, o ensembleOutput) error {
	for k, r := range systems(c) {
		for _, w := range r.Warnings {
			a.remark("%s: %s", systemName(res, run, k), w)
		}
	}
	if len(c.Points) > 0 {
		if err := a.ensembleFiles(res, c, prov, o); err != nil {
			return err
		}
	}
	if o.format == "json" {
		return a.printJSON(ensembleJSON(run, c))
	}
	st := ensembleStory(res, run, c)
	st.Sections = append(st.Sections, moreSections(res, run, c, law)...)
	_, err := a.out.Write(present.StoryText(st, present.TextSettings{Colour: colour(a.out)}))
	return err
}

func systems(c *ensemble.Convergence) []*ensemble.Result {
	return append([]*ensemble.Result{c.Limit}, c.Full...)
}

func (a *app) ensembleFiles(res *derivation.Result, c *ensemble.Convergence, prov present.Provenance, o ensembleOutput) error {
	if o.figure != "" {
		files, err := plots.Encode(plots.EpsConvergence(res, c, plots.Meta(prov)), o.figure)
		if err != nil {
			return err
		}
		for _, x := range files {
			if err := write(filepath.Join(filepath.Dir(o.figure), x.Name), x.Data, o.force); err != nil {
				return err
			}
		}
	}
	if o.csv != "" {
		if err := write(o.csv, ensembleCSV(c, prov.OneLine()), o.force); err != nil {
			return err
		}
	}
	if o.npz == "" {
		return nil
	}
	var b bytes.Buffer
	var arrays []ensemble.Array
	eps := ensemble.Array{Name: "eps", Shape: []int{len(c.Full)}}
	for i := range c.Full {
		eps.Data = append(eps.Data, c.Points[0][i].Eps)
	}
	arrays = append(arrays, eps)
	for k, r := range systems(c) {
		for _, x := range r.Arrays() {
			x.Name = fmt.Sprintf("system%d_%s", k, x.Name)
			arrays = append(arrays, x)
		}
	}
	meta := prov.OneLine() + "\n" + strings.Join(c.Limit.Observables, ",") + "\n" + prov.Model
	if err := ensemble.WriteNPZ(&b, meta, arrays...); err != nil {
		return err
	}
	return write(o.npz, b.Bytes(), o.force)
}

// ensembleCSV is one row for each observable, system and time; eps is 0 for
// the limit. Differences are from the limit at the same time; their errors hold
// both systems.
func ensembleCSV(c *ensemble.Convergence, header string) []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, "# %s\n", header)
	b.WriteString("observable,eps,time,n,mean,stderr,variance,difference,difference_stderr,rate,rate_lower,rate_upper\n")
	cell := func(x *float64) string {
		if x == nil {
			return ""
		}
		return float(*x)
	}
	for i, name := range c.Limit.Observables {
		q := c.Rates[i]
		for k, r := range systems(c) {
			e := 0.0
			if k > 0 {
				e = c.Points[i][k-1].Eps
			}
			for t, m := range r.Times {
				l := c.Limit.Times[t]
				row := []string{name, float(e), float(m.Time), strconv.FormatUint(m.N, 10), cell(finite(m.Mean[i])), cell(finite(m.StdErr[i])), cell(finite(m.Variance(i)))}
				if k == 0 {
					row = append(row, "", "", "", "", "")
				} else {
					row = append(row, cell(finite(m.Mean[i]-l.Mean[i])), cell(finite(math.Hypot(m.StdErr[i], l.StdErr[i]))), cell(finite(q.Exponent)), cell(finite(q.Lower)), cell(finite(q.Upper)))
				}
				b.WriteString(strings.Join(row, ",") + "\n")
			}
		}
	}
	return b.Bytes()
}

// schemes prints the fact sheets.
func (a *app) schemes() error {
	st := &present.Story{Title: "Time-stepping schemes"}
	for _, s := range ensemble.Schemes() {
		strong := "laws only"
		if s.StrongOrder > 0 {
			strong = float(s.StrongOrder)
		}
		t := present.Table{}
		for _, r := range [][2]string{
			{"weak order", float(s.WeakOrder)}, {"strong order", strong}, {"noise", s.Noise}, {"interpretation", s.Interpretation}, {"source", s.Source},
		} {
			t.Rows = append(t.Rows, [][]present.Span{{{Text: r[0]}}, {{Text: r[1]}}})
		}
		st.Sections = append(st.Sections, present.Section{ID: s.Name, Title: s.Name, Blocks: []present.Block{present.Para{{Text: s.Description}}, t}})
	}
	_, err := a.out.Write(present.StoryText(st, present.TextSettings{Colour: colour(a.out)}))
	return err
}
