package main

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"epslim/solver/ensemble"
)

// ensembleFlags are the options of a run as typed. They are kept with the
// parts of a run, so that the parts can be merged.
type ensembleFlags struct {
	Eps         string  `json:"eps"`
	Paths       string  `json:"paths"`
	Time        float64 `json:"time"`
	Step        float64 `json:"step"`
	Seed        uint64  `json:"seed"`
	Scheme      string  `json:"scheme"`
	LimitScheme string  `json:"limit_scheme"`
	Bias        bool    `json:"bias"`
	Times       string  `json:"times"`
	Long        float64 `json:"long"` // negative: no averages along the paths
	Histogram   int     `json:"histogram"`
	Target      float64 `json:"target"`
	Budget      string  `json:"budget"`

	workers    int
	checkpoint string
	every      time.Duration
	resume     bool
}

// bind declares what every command that runs ensembles takes.
func (f *ensembleFlags) bind(cmd *cobra.Command, paths string) {
	f.Long = -1
	cmd.Flags().StringVar(&f.Eps, "eps", "0.2,0.1,0.05", "values of the scale parameter, decreasing")
	cmd.Flags().StringVar(&f.Paths, "paths", paths, "number of paths, or a range such as 1000:2000")
	cmd.Flags().Float64Var(&f.Time, "time", 1, "length of the simulated time, in the limit's unit")
	cmd.Flags().Float64Var(&f.Step, "step", 0, "largest time step (0: chosen from eps and the rates of the system)")
	cmd.Flags().Uint64Var(&f.Seed, "seed", 1, "seed of all random numbers")
	cmd.Flags().IntVar(&f.workers, "workers", 0, "goroutines (0: one a processor); results do not depend on it")
	cmd.Flags().StringVar(&f.Scheme, "scheme", "", "time-stepping scheme of the full system (default: chosen to suit the system)")
	cmd.Flags().BoolVar(&f.Bias, "bias", false, "estimate the bias of the step with two steps on common noise")
}

// bindMore declares what the ensemble command takes beyond that.
func (f *ensembleFlags) bindMore(cmd *cobra.Command) {
	cmd.Flags().StringVar(&f.LimitScheme, "limit-scheme", "", "time-stepping scheme of the limit (default: chosen to suit it)")
	cmd.Flags().StringVar(&f.Times, "times", "", "times at which the observables are taken, ascending, such as 0.25,0.5,1")
	cmd.Flags().Float64Var(&f.Long, "long", -1, "average along each path from this time on, with autocorrelation times")
	cmd.Flags().IntVar(&f.Histogram, "histogram", 0, "compare histograms of this many cells with the limit's stationary density")
	cmd.Flags().Float64Var(&f.Target, "target", 0, "add paths until every standard error is at most this")
	cmd.Flags().StringVar(&f.Budget, "budget", "", "what --target may spend: paths of each system, such as 1000000, or time, such as 60s")
	cmd.Flags().StringVar(&f.checkpoint, "checkpoint", "", "keep the finished part in files of this name, for --resume and for epslim merge")
	cmd.Flags().DurationVar(&f.every, "checkpoint-every", 10*time.Second, "time between checkpoints")
	cmd.Flags().BoolVar(&f.resume, "resume", false, "go on from the checkpoint")
}

// ensembleRun is a run that has been checked.
type ensembleRun struct {
	eps         []float64
	from, to    uint64
	time, step  float64
	seed        uint64
	workers     int
	scheme      string
	limitScheme string
	bias        bool
	times       []float64
	long        float64 // negative: none
	histogram   int
	target      *ensemble.Target
	checkpoint  string
	every       time.Duration
	resume      bool
}

// Limits of what a run accepts.
const (
	maxTime      = 1e9
	maxEps       = 10
	maxHistogram = 1000
	maxWorkers   = 4096
	minEvery     = 10 * time.Millisecond
)

func (f *ensembleFlags) settings() (ensembleRun, error) {
	r := ensembleRun{time: f.Time, step: f.Step, seed: f.Seed, workers: f.workers, scheme: f.Scheme, limitScheme: f.LimitScheme, bias: f.Bias,
		long: f.Long, histogram: f.Histogram, checkpoint: f.checkpoint, every: f.every, resume: f.resume}
	for _, s := range strings.Split(f.Eps, ",") {
		v, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
		if err != nil || !(v > 0) || v > maxEps {
			return r, fmt.Errorf("--eps is %q; it takes positive numbers of at most %d, such as 0.2,0.1,0.05", f.Eps, maxEps)
		}
		r.eps = append(r.eps, v)
	}
	var err error
	if r.from, r.to, err = parsePaths(f.Paths); err != nil {
		return r, err
	}
	if !(f.Time > 0) || f.Time > maxTime {
		return r, fmt.Errorf("--time is %g; it must be positive and at most %g", f.Time, float64(maxTime))
	}
	if f.Step < 0 || f.Step > f.Time || math.IsNaN(f.Step) {
		return r, fmt.Errorf("--step is %g; it must be positive and at most the time of %g, or 0 for the recommended one", f.Step, f.Time)
	}
	if f.Step > 0 && f.Time/f.Step > ensemble.MaxSteps {
		return r, fmt.Errorf("--step is %g, which makes %.3g steps of a time of %g; at most %d are possible", f.Step, f.Time/f.Step, f.Time, uint64(ensemble.MaxSteps))
	}
	if f.workers < 0 || f.workers > maxWorkers {
		return r, fmt.Errorf("--workers is %d; between 1 and %d are possible, or 0 for one a processor", f.workers, maxWorkers)
	}
	for flag, name := range map[string]string{"--scheme": f.Scheme, "--limit-scheme": f.LimitScheme} {
		if name == "" {
			continue
		}
		if _, err := ensemble.SchemeByName(name); err != nil {
			return r, fmt.Errorf("%s: %w; epslim ensemble --schemes lists them", flag, err)
		}
	}
	return r, f.more(&r)
}

// more checks the options that only the ensemble command has.
func (f *ensembleFlags) more(r *ensembleRun) error {
	last := 0.0
	for _, s := range strings.FieldsFunc(f.Times, func(c rune) bool { return c == ',' }) {
		v, err := strconv.ParseFloat(strings.TrimSpace(s), 64)
		if err != nil || !(v > last) || v > f.Time {
			return fmt.Errorf("--times is %q; it takes ascending times in (0, %g], the end given by --time", f.Times, f.Time)
		}
		last = v
		r.times = append(r.times, v)
	}
	if len(r.times) > ensemble.MaxTimes {
		return fmt.Errorf("--times has %d times; at most %d are possible", len(r.times), ensemble.MaxTimes)
	}
	if len(r.times) > 0 && last < f.Time {
		r.times = append(r.times, f.Time)
	}
	if f.Long >= f.Time || math.IsNaN(f.Long) {
		return fmt.Errorf("--long is %g; the averages must begin before the end at time %g", f.Long, f.Time)
	}
	if f.Histogram < 0 || f.Histogram > maxHistogram || f.Histogram == 1 {
		return fmt.Errorf("--histogram is %d; between 2 and %d cells are possible", f.Histogram, maxHistogram)
	}
	if f.resume && f.checkpoint == "" {
		return fmt.Errorf("--resume needs --checkpoint FILE to go on from")
	}
	if f.checkpoint != "" && f.every < minEvery {
		return fmt.Errorf("--checkpoint-every is %v; at least %v is possible", f.every, minEvery)
	}
	return f.goal(r)
}

// goal reads the target and its budget.
func (f *ensembleFlags) goal(r *ensembleRun) error {
	if f.Target == 0 && f.Budget == "" {
		return nil
	}
	if !(f.Target > 0) || math.IsInf(f.Target, 0) {
		return fmt.Errorf("--target is %g; it takes a positive standard error, such as 1e-3", f.Target)
	}
	r.target = &ensemble.Target{StdErr: f.Target}
	if f.Budget == "" {
		return nil
	}
	if n, err := strconv.ParseFloat(f.Budget, 64); err == nil {
		if !(n >= 1) || n > ensemble.MaxPaths {
			return fmt.Errorf("--budget is %q; between 1 and %d paths are possible", f.Budget, uint64(ensemble.MaxPaths))
		}
		r.target.MaxPaths = uint64(n)
		r.to = min(r.to, r.from+r.target.MaxPaths)
		return nil
	}
	d, err := time.ParseDuration(f.Budget)
	if err != nil || d <= 0 {
		return fmt.Errorf("--budget is %q; it takes a number of paths, such as 1000000, or a time, such as 60s", f.Budget)
	}
	// Limit and full systems share the time equally.
	r.target.MaxTime = d / time.Duration(len(r.eps)+1)
	return nil
}

func parsePaths(s string) (from, to uint64, err error) {
	a, b, isRange := strings.Cut(s, ":")
	if !isRange {
		a, b = "0", s
	}
	from, e1 := strconv.ParseUint(a, 10, 64)
	to, e2 := strconv.ParseUint(b, 10, 64)
	if e1 != nil || e2 != nil || to <= from {
		return 0, 0, fmt.Errorf("--paths is %q; it takes a positive number or a range such as 1000:2000", s)
	}
	if to > ensemble.MaxPaths {
		return 0, 0, fmt.Errorf("--paths is %q; at most %d are possible", s, uint64(ensemble.MaxPaths))
	}
	return from, to, nil
}

// pathsText is a range of paths as it is typed.
func pathsText(from, to uint64) string {
	if from == 0 {
		return strconv.FormatUint(to, 10)
	}
	return fmt.Sprintf("%d:%d", from, to)
}
