package ensemble

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"time"
)

// Target is an error bar to be reached and what may be spent on it.
type Target struct {
	StdErr      float64       // wanted for every observable of Observables
	Observables []string      // empty: all
	MaxPaths    uint64        // 0: 2^32
	MaxTime     time.Duration // 0: no limit; a run that ends by it depends on the speed of the machine
}

// TargetOutcome says how a run to a target ended.
type TargetOutcome uint8

const (
	TargetReached TargetOutcome = iota
	TargetPathsSpent
	TargetTimeSpent
	TargetInterrupted
)

func (o TargetOutcome) String() string {
	return [...]string{"target reached", "budget of paths spent", "budget of time spent", "interrupted"}[o]
}

// RunToTarget adds paths, in rounds whose sizes follow from the variances found so
// far, until the standard errors at the last observation time are at most those
// wanted or a budget is spent. s.To-s.From is the size of the first round (0:
// 1024 paths). The number of paths is a function of the seed alone unless the
// time limit ends the run.
func RunToTarget(ctx context.Context, m *Model, s Settings, goal Target) (*Result, TargetOutcome, error) {
	if !(goal.StdErr > 0) || math.IsInf(goal.StdErr, 0) {
		return nil, 0, fmt.Errorf("ensemble: the target for the standard error is %v; it must be positive", goal.StdErr)
	}
	if goal.MaxPaths == 0 {
		goal.MaxPaths = 1 << 32
	}
	if s.To <= s.From {
		s.To = s.From + min(1024, goal.MaxPaths)
	}
	for _, name := range goal.Observables {
		if !slices.Contains(m.ObservableNames(), name) {
			return nil, 0, fmt.Errorf("ensemble: the target names %q, which is not observed; observed are %v", name, m.ObservableNames())
		}
	}
	limited := ctx
	if goal.MaxTime > 0 {
		var cancel context.CancelFunc
		limited, cancel = context.WithTimeout(ctx, goal.MaxTime)
		defer cancel()
	}
	var total *Tally
	for {
		p, err := newPlan(m, &s, 1)
		if err != nil {
			return nil, 0, err
		}
		if total == nil {
			if total, err = p.resumed(); err != nil {
				return nil, 0, err
			}
		}
		r, err := p.run(limited, total)
		switch {
		case err != nil && ctx.Err() != nil:
			return r, TargetInterrupted, err
		case errors.Is(err, context.DeadlineExceeded):
			return r, TargetTimeSpent, nil
		case err != nil:
			return r, 0, err
		}
		factor := goal.factor(r)
		if factor <= 1 {
			return r, TargetReached, nil
		}
		done := s.To - s.From
		if done >= goal.MaxPaths {
			return r, TargetPathsSpent, nil
		}
		// At most four times as many at once: the first variances are rough.
		want := uint64(float64(done) * math.Min(4, 1.05*factor))
		want = (want + block - 1) / block * block
		s.To = s.From + min(want, goal.MaxPaths)
	}
}

// factor returns how many times as many paths are needed.
func (g Target) factor(r *Result) float64 {
	last := r.Times[len(r.Times)-1]
	worst := 0.0
	for i, name := range r.Observables {
		if len(g.Observables) > 0 && !slices.Contains(g.Observables, name) {
			continue
		}
		q := last.StdErr[i] / g.StdErr
		if math.IsNaN(q) {
			return math.Inf(1)
		}
		worst = math.Max(worst, q*q)
	}
	return worst
}
