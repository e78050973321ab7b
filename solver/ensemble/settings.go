package ensemble

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"time"

	"epslim/solver/kernel"
)

// Settings are the choices of one run. Time must be set; every other zero value
// has a meaning.
type Settings struct {
	// Paths is the range of paths [From, To); paths are numbered from 0.
	From, To uint64
	// Time is the length of the simulated time.
	Time float64
	// Step is the largest step; 0 takes the one that Advise recommends. Each
	// interval between observation times is cut into equal steps.
	Step float64
	// Times are the observation times, ascending, in (0, Time]; Time alone when
	// there are none.
	Times []float64
	// Seed of all random numbers.
	Seed uint64
	// Scheme is the name of a scheme; empty takes DefaultScheme.
	Scheme string
	// Histograms of observables at the observation times.
	Histograms []HistogramSpec
	// LongTime asks for averages along the paths.
	LongTime *LongTime
	// Workers is the number of goroutines; 0 means one. It does not change results.
	Workers int
	// Checkpoint is the name of a file to which the finished part of the run is
	// written every CheckpointEvery (0: 10 s) and at the end; empty for none.
	Checkpoint      string
	CheckpointEvery time.Duration
	// Resume takes up the finished part from the checkpoint when the file exists.
	Resume bool
	// Progress is called about twice a second and at the end, from one goroutine.
	Progress func(Progress)
	// Implementation of the kernels; nil takes the fastest.
	Implementation *kernel.Implementation
}

// HistogramSpec asks for counts of one observable, or of two jointly, in equal
// cells.
type HistogramSpec struct {
	Observables []string // one or two names
	Lo, Hi      []float64
	Cells       []int
}

// LongTime asks for averages along each path from Burn to the end of the run.
type LongTime struct {
	Burn       float64 // time discarded at the start
	Every      int     // steps between samples; 0 means 1
	Batches    int     // stretches a path is cut into; 0 means 16
	Histograms []HistogramSpec
}

// Progress reports on a run.
type Progress struct {
	Done, Total uint64        // paths
	Steps       uint64        // path-steps done by this process
	StepsPerSec float64       // path-steps per second
	Elapsed     time.Duration // since the start of this process's part
	Remaining   time.Duration // estimate
}

// Limits on what is accepted.
const (
	MaxPaths = 1 << 40
	MaxSteps = 1 << 40 // steps of one path
	MaxTimes = 10000
	MaxCells = 1 << 24
	MaxSums  = 1 << 17 // exact sums: times * n(n+3)/2 for n observables
)

// check validates the settings for the model.
func (s *Settings) check(m *Model) error {
	var errs []error
	bad := func(format string, args ...any) { errs = append(errs, fmt.Errorf("ensemble: "+format, args...)) }
	if s.To <= s.From {
		bad("the range of paths %d:%d is empty; at least one path is needed", s.From, s.To)
	} else if s.To > MaxPaths {
		bad("%d paths; at most %d are possible", s.To, uint64(MaxPaths))
	}
	if !(s.Time > 0) || math.IsInf(s.Time, 0) {
		bad("the time is %v; it must be positive and finite", s.Time)
	}
	if math.IsNaN(s.Step) || s.Step < 0 || math.IsInf(s.Step, 0) {
		bad("the step is %v; it must be positive, or 0 for the recommended one", s.Step)
	} else if s.Step > 0 && s.Time/s.Step > MaxSteps {
		bad("%.3g steps of %v in a time of %v; at most %d are possible", s.Time/s.Step, s.Step, s.Time, uint64(MaxSteps))
	} else if s.Step > s.Time {
		bad("the step %v is longer than the time %v", s.Step, s.Time)
	}
	if len(s.Times) > MaxTimes {
		bad("%d observation times; at most %d are possible", len(s.Times), MaxTimes)
	}
	n := len(m.observables())
	if sums := len(s.times()) * n * (n + 3) / 2; sums > MaxSums {
		bad("%d observables at %d times need %d sums; at most %d are possible", n, len(s.times()), sums, MaxSums)
	}
	last := 0.0
	for _, t := range s.Times {
		if !(t > last && t <= s.Time) {
			bad("observation time %v: the times must ascend within (0, %v]", t, s.Time)
			break
		}
		last = t
	}
	if s.Workers < 0 || s.Workers > 4096 {
		bad("%d workers; between 1 and 4096 are possible", s.Workers)
	}
	names := m.ObservableNames()
	for _, h := range s.Histograms {
		errs = append(errs, h.check(names))
	}
	if l := s.LongTime; l != nil {
		if !(l.Burn >= 0 && l.Burn < s.Time) {
			bad("%v of time is discarded of %v", l.Burn, s.Time)
		}
		if l.Every < 0 || l.Batches < 0 || l.Batches == 1 || l.Batches > 4096 {
			bad("long-time averages need a sample every >= 1 steps and 2 to 4096 batches, not %d and %d", l.Every, l.Batches)
		}
		for _, h := range l.Histograms {
			errs = append(errs, h.check(names))
		}
	}
	return errors.Join(errs...)
}

func (h HistogramSpec) check(names []string) error {
	k := len(h.Observables)
	if k < 1 || k > 2 || len(h.Lo) != k || len(h.Hi) != k || len(h.Cells) != k {
		return fmt.Errorf("ensemble: a histogram needs one or two observables with lower and upper ends and numbers of cells")
	}
	total := 1
	for i, name := range h.Observables {
		if !slices.Contains(names, name) {
			return fmt.Errorf("ensemble: histogram of %q, which is not observed; observed are %v", name, names)
		}
		if !(h.Lo[i] < h.Hi[i]) || math.IsInf(h.Hi[i]-h.Lo[i], 0) {
			return fmt.Errorf("ensemble: histogram of %q over [%v, %v]", name, h.Lo[i], h.Hi[i])
		}
		if h.Cells[i] < 1 || h.Cells[i] > MaxCells {
			return fmt.Errorf("ensemble: histogram of %q with %d cells; between 1 and %d are possible", name, h.Cells[i], MaxCells)
		}
		total *= h.Cells[i]
		if total > MaxCells {
			return fmt.Errorf("ensemble: a histogram of %v with more than %d cells", h.Observables, MaxCells)
		}
	}
	return nil
}

// times returns the observation times after the default.
func (s *Settings) times() []float64 {
	if len(s.Times) > 0 {
		return s.Times
	}
	return []float64{s.Time}
}

func (s *Settings) workers() int { return max(1, s.Workers) }

func (s *Settings) implementation() kernel.Implementation {
	if s.Implementation != nil {
		return *s.Implementation
	}
	return kernel.Implementations()[0]
}
