package ensemble

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
)

// MultilevelSettings ask for the mean of one observable at the end of a run to a
// given accuracy by the multilevel method (M. B. Giles, Oper. Res. 56 (2008)
// 607-617): the mean at the finest step is that at the coarsest plus corrections
// between successive steps, each simulated in pairs on common noise and with the
// number of pairs that its variance and cost ask for.
type MultilevelSettings struct {
	Observable string  // empty: the first
	Target     float64 // root mean square error, half of its square for the bias of the step
	Coarsest   float64 // step of level 0; 0: four times the recommended one
	Levels     int     // the most levels to use; 0: 10
	Scheme     string  // empty: DefaultScheme
	Time       float64
	Seed       uint64
	Workers    int
	MaxPaths   uint64 // on any level; 0: 2^32
}

// Level is one term of the multilevel sum.
type Level struct {
	Step     float64
	Paths    uint64
	Mean     float64 // of the observable on level 0, of the correction above
	Variance float64 // of one path or pair
	Cost     float64 // steps of one path or pair
}

// MultilevelResult is the estimate and what it was made of.
type MultilevelResult struct {
	Observable string
	Mean       float64
	StdErr     float64
	Bias       float64 // estimated from the last corrections
	Levels     []Level
	Cost       float64 // steps made in all
	SingleCost float64 // steps that paths of the finest step alone would need for the same error
	Converged  bool    // whether the bias met its share before Levels was exhausted
}

// Multilevel estimates the mean.
func Multilevel(ctx context.Context, m *Model, s MultilevelSettings) (*MultilevelResult, error) {
	l, err := newLadder(m, s)
	if err != nil {
		return nil, err
	}
	r := &MultilevelResult{Observable: l.s.Observable}
	for len(l.rungs) < 3 {
		if err := l.add(ctx); err != nil {
			return nil, err
		}
	}
	for {
		if err := l.allocate(ctx); err != nil {
			return nil, err
		}
		r.Bias = l.bias()
		r.Converged = r.Bias <= s.Target/math.Sqrt2
		if r.Converged || len(l.rungs) >= l.s.Levels {
			break
		}
		if err := l.add(ctx); err != nil {
			return nil, err
		}
	}
	var variance float64
	for i := range l.rungs {
		g := l.rungs[i].level()
		r.Levels = append(r.Levels, g)
		r.Mean += g.Mean
		variance += g.Variance / float64(g.Paths)
		r.Cost += g.Cost * float64(g.Paths)
	}
	r.StdErr = math.Sqrt(variance)
	finest := r.Levels[len(r.Levels)-1]
	r.SingleCost = r.Levels[0].Variance / variance * s.Time / finest.Step
	return r, nil
}

// ladder is a multilevel estimation under way.
type ladder struct {
	m     *Model
	s     MultilevelSettings
	index int // of the observable
	order float64
	rungs []*rung
}

// rung is one level with the sums over its paths.
type rung struct {
	step  float64
	cost  float64
	paths uint64
	sums  TimeTally // of the observable or of the correction
	index int
}

func (g *rung) level() Level {
	m := moments(g.sums.Count, g.sums.Sums, g.sums.Products)
	return Level{Step: g.step, Paths: g.paths, Mean: m.Mean[g.index], Variance: m.Variance(g.index), Cost: g.cost}
}

func newLadder(m *Model, s MultilevelSettings) (*ladder, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	names := m.ObservableNames()
	if s.Observable == "" {
		s.Observable = names[0]
	}
	index := slices.Index(names, s.Observable)
	if index < 0 {
		return nil, fmt.Errorf("ensemble: %q is not observed; observed are %v", s.Observable, names)
	}
	if !(s.Target > 0) || math.IsInf(s.Target, 0) {
		return nil, fmt.Errorf("ensemble: the target is %v; it must be positive", s.Target)
	}
	if s.Levels == 0 {
		s.Levels = 10
	}
	if s.Levels < 3 || s.Levels > 30 {
		return nil, fmt.Errorf("ensemble: %d levels; between 3 and 30 are possible", s.Levels)
	}
	if s.MaxPaths == 0 {
		s.MaxPaths = 1 << 32
	}
	sheet, _, err := m.DefaultScheme()
	if s.Scheme != "" {
		sheet, err = SchemeByName(s.Scheme)
	}
	if err != nil {
		return nil, err
	}
	s.Scheme = sheet.Name
	a, err := m.Advise(sheet, s.Time)
	if err != nil {
		return nil, err
	}
	if s.Coarsest == 0 {
		s.Coarsest = 4 * a.Step
	}
	if !(s.Coarsest > 0) || s.Coarsest > s.Time {
		return nil, fmt.Errorf("ensemble: a coarsest step of %v in a time of %v", s.Coarsest, s.Time)
	}
	return &ladder{m: m, s: s, index: index, order: sheet.WeakOrder}, nil
}

const pilotPaths = 4 * block

// add opens the next level with a pilot run.
func (l *ladder) add(ctx context.Context) error {
	k := len(l.rungs)
	n := math.Ceil(l.s.Time/l.s.Coarsest-1e-9) * math.Exp2(float64(k))
	g := &rung{step: l.s.Time / n, cost: n, index: l.index, sums: newTimeTally(l.s.Time, len(l.m.ObservableNames()), nil)}
	if k > 0 {
		g.cost = 1.5 * n
	}
	l.rungs = append(l.rungs, g)
	return l.extend(ctx, k, pilotPaths)
}

// extend brings level k to the given number of paths.
func (l *ladder) extend(ctx context.Context, k int, paths uint64) error {
	g := l.rungs[k]
	paths = min((paths+block-1)/block*block, l.s.MaxPaths)
	if paths <= g.paths {
		return nil
	}
	mix := splitMix64(l.s.Seed ^ uint64(k)*0x9e3779b97f4a7c15)
	s := Settings{From: g.paths, To: paths, Time: l.s.Time, Step: g.step, Seed: mix.next(), Workers: l.s.Workers}
	if k == 0 {
		s.Scheme = l.s.Scheme
		p, err := newPlan(l.m, &s, 1)
		if err != nil {
			return err
		}
		t := newTally(l.m, &s)
		if _, err := p.run(ctx, t); err != nil {
			return err
		}
		g.take(&t.Times[0])
	} else {
		c := Coupled{l.m, l.s.Scheme}
		t, _, _, err := runPair(ctx, c, c, 2, s)
		if err != nil {
			return err
		}
		g.take(&t.delta)
	}
	if g.sums.Count < 2 {
		return errors.New("ensemble: nearly all paths of a level blew up; a shorter coarsest step may help")
	}
	g.paths = paths
	return nil
}

func (g *rung) take(t *TimeTally) {
	g.sums.Count += t.Count
	mergeSums(g.sums.Sums, t.Sums)
	mergeSums(g.sums.Products, t.Products)
}

// allocate runs the number of paths on each level that reaches the variance
// target at the least cost: proportional to sqrt(variance/cost).
func (l *ladder) allocate(ctx context.Context) error {
	for range 4 { // the variances sharpen as paths are added
		var sum float64
		for _, g := range l.rungs {
			v := g.level()
			sum += math.Sqrt(math.Max(v.Variance, 0) * v.Cost)
		}
		enough := true
		for k, g := range l.rungs {
			v := g.level()
			want := math.Ceil(2 / (l.s.Target * l.s.Target) * math.Sqrt(math.Max(v.Variance, 0)/v.Cost) * sum)
			if want > float64(g.paths) && g.paths < l.s.MaxPaths {
				enough = false
				if err := l.extend(ctx, k, uint64(math.Min(want, float64(l.s.MaxPaths)))); err != nil {
					return err
				}
			}
		}
		if enough {
			return nil
		}
	}
	return nil
}

// bias estimates the bias of the finest level from the last two corrections, each
// scaled to the finest with the weak order.
func (l *ladder) bias() float64 {
	n := len(l.rungs)
	f := math.Exp2(l.order)
	last, before := math.Abs(l.rungs[n-1].level().Mean), math.Abs(l.rungs[n-2].level().Mean)
	return math.Max(last, before/f) / (f - 1)
}
