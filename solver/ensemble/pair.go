package ensemble

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// Coupled is one of the two systems of a pair on common noise.
type Coupled struct {
	Model  *Model
	Scheme string // empty takes DefaultScheme
}

// Difference holds the moments of the observables of two systems simulated on
// common noise, and of their differences path by path.
type Difference struct {
	Observables []string
	Time        float64
	Fine        Moments
	Coarse      Moments
	Delta       Moments   // fine minus coarse
	Correlation []float64 // between fine and coarse
	BlowUp      uint64    // pairs left out because one of the two blew up
	StepFine    float64
	StepCoarse  float64
	// CostFine and CostCoarse are the numbers of steps of one path.
	CostFine, CostCoarse uint64
}

// RunPair simulates fine and coarse on the same Brownian paths, path k of a pair
// being a function of the seed and of k. The coarse system makes one step for
// ratio steps of the fine one. Wiener processes are shared by name where both
// models name them and by number otherwise; one that only one of the systems has
// is its own. Settings.Step is the step of the fine system; the observables of
// the two models must have the same names. Only the moments at the last time are
// accumulated. Absorbing variables are not supported.
func RunPair(ctx context.Context, fine, coarse Coupled, ratio int, s Settings) (*Difference, error) {
	t, p, q, err := runPair(ctx, fine, coarse, ratio, s)
	if t == nil {
		return nil, err
	}
	return t.difference(p, q), err
}

// pairTally holds the sums over pairs of paths.
type pairTally struct {
	fine, coarse, delta TimeTally
	blowUp              uint64
}

func newPairTally(n int, time float64) *pairTally {
	return &pairTally{newTimeTally(time, n, nil), newTimeTally(time, n, nil), newTimeTally(time, n, nil), 0}
}

func (t *pairTally) merge(o *pairTally) {
	for _, x := range [][2]*TimeTally{{&t.fine, &o.fine}, {&t.coarse, &o.coarse}, {&t.delta, &o.delta}} {
		x[0].Count += x[1].Count
		mergeSums(x[0].Sums, x[1].Sums)
		mergeSums(x[0].Products, x[1].Products)
	}
	t.blowUp += o.blowUp
}

func (t *pairTally) difference(p, q *plan) *Difference {
	d := &Difference{Observables: p.m.ObservableNames(), Time: t.fine.Time, BlowUp: t.blowUp, StepFine: p.step, StepCoarse: q.step, CostFine: p.steps, CostCoarse: q.steps}
	d.Fine = moments(t.fine.Count, t.fine.Sums, t.fine.Products)
	d.Coarse = moments(t.coarse.Count, t.coarse.Sums, t.coarse.Products)
	d.Delta = moments(t.delta.Count, t.delta.Sums, t.delta.Products)
	for i := range d.Observables {
		a, b, c := d.Fine.Variance(i), d.Coarse.Variance(i), d.Delta.Variance(i)
		d.Correlation = append(d.Correlation, (a+b-c)/(2*math.Sqrt(a*b)))
	}
	return d
}

func runPair(ctx context.Context, fine, coarse Coupled, ratio int, s Settings) (*pairTally, *plan, *plan, error) {
	p, q, err := pairPlans(fine, coarse, ratio, s)
	if err != nil {
		return nil, nil, nil, err
	}
	share, err := shareNoise(p, q, ratio)
	if err != nil {
		return nil, nil, nil, err
	}
	n := len(p.m.ObservableNames())
	total := newPairTally(n, s.Time)
	err = forBlocks(ctx, s, func() blockWorker {
		return &pairRunner{p: p, q: q, ratio: ratio, share: share, fine: newRunner(p), coarse: newRunner(q), tally: newPairTally(n, s.Time)}
	}, func(w blockWorker) { total.merge(w.(*pairRunner).tally) })
	if err != nil && !errors.Is(err, context.Canceled) && !errors.Is(err, context.DeadlineExceeded) {
		return nil, nil, nil, err
	}
	return total, p, q, err
}

// maxRatio bounds the rows of random numbers that a pair keeps.
const maxRatio = 1 << 12

func pairPlans(fine, coarse Coupled, ratio int, s Settings) (p, q *plan, err error) {
	if ratio < 1 || ratio > maxRatio {
		return nil, nil, fmt.Errorf("ensemble: a ratio of steps of %d; between 1 and %d are possible", ratio, maxRatio)
	}
	if len(s.Times) > 0 || len(s.Histograms) > 0 || s.LongTime != nil || s.Checkpoint != "" {
		return nil, nil, errors.New("ensemble: a pair has moments at the last time only: no observation times, histograms, long-time averages or checkpoints")
	}
	sf := s
	sf.Scheme = fine.Scheme
	if p, err = newPlan(fine.Model, &sf, uint64(ratio)); err != nil {
		return nil, nil, err
	}
	sc := s
	sc.Scheme = coarse.Scheme
	sc.Step = s.Time / float64(p.steps/uint64(ratio))
	if q, err = newPlan(coarse.Model, &sc, 1); err != nil {
		return nil, nil, err
	}
	if q.steps*uint64(ratio) != p.steps {
		return nil, nil, fmt.Errorf("ensemble: %d fine steps for %d coarse ones at a ratio of %d", p.steps, q.steps, ratio)
	}
	a, b := p.m.ObservableNames(), q.m.ObservableNames()
	if fmt.Sprint(a) != fmt.Sprint(b) {
		return nil, nil, fmt.Errorf("ensemble: the observables of a pair differ: %v and %v", a, b)
	}
	for _, m := range []*Model{fine.Model, coarse.Model} {
		for _, v := range m.Variables {
			if v.Domain.Kind == Absorbing {
				return nil, nil, fmt.Errorf("ensemble: variable %q is absorbing, which pairs do not support", v.Name)
			}
		}
	}
	return p, q, nil
}

// shareNoise lists for each normal row of the coarse step the fine rows, in the
// order of time within a coarse step, whose sum it is; none for its own noise.
// Fine row r of sub-step k has the number k*rows + r.
func shareNoise(p, q *plan, ratio int) ([][]int, error) {
	f, c := p.segments[0].stepper, q.segments[0].stepper
	share := make([][]int, len(c.rows))
	parts := map[int][]int{} // coarse rows of each column
	for i, r := range c.rows {
		if r.kind == rowNormal && r.column >= 0 {
			parts[r.column] = append(parts[r.column], i)
		}
	}
	for column, list := range parts {
		target := sharedColumn(p.m, q.m, column)
		if target < 0 {
			continue
		}
		var fine []int
		for k := range ratio {
			for i, r := range f.rows {
				if r.kind == rowNormal && r.column == target {
					fine = append(fine, k*len(f.rows)+i)
				}
			}
		}
		if len(fine) == 0 {
			continue
		}
		if len(fine)%len(list) != 0 {
			return nil, fmt.Errorf("ensemble: %d fine increments of Wiener process %s for %d coarse ones; use a ratio that divides", len(fine), q.m.wienerName(column), len(list))
		}
		k := len(fine) / len(list)
		for n, i := range list {
			share[i] = fine[n*k : (n+1)*k]
		}
	}
	return share, nil
}

// sharedColumn returns the column of fine that is column j of coarse, or -1.
func sharedColumn(fine, coarse *Model, j int) int {
	if len(fine.Wiener) == 0 || len(coarse.Wiener) == 0 {
		if j < fine.wiener() {
			return j
		}
		return -1
	}
	for i, name := range fine.Wiener {
		if name == coarse.Wiener[j] {
			return i
		}
	}
	return -1
}

// pairRunner simulates blocks of pairs for one worker.
type pairRunner struct {
	p, q         *plan
	ratio        int
	share        [][]int
	fine, coarse *runner
	kept         [][]float64 // rows of the fine steps within a coarse one
	tally        *pairTally
}

func (r *pairRunner) runBlock(ctx context.Context, number uint64, lo, hi int) error {
	f, c := r.fine, r.coarse
	f.start(number, lo, hi)
	c.start(number, lo, hi)
	c.stream = c.aux // the coarse system's own noise
	gf, gc := r.p.segments[0], r.q.segments[0]
	width := len(gf.stepper.rows)
	if r.kept == nil {
		r.kept = rows(width * r.ratio)
	}
	for step := range gc.steps {
		if step%window == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		for k := range r.ratio {
			f.fill(gf.stepper)
			for i := range width {
				copy(r.kept[k*width+i], f.noise[i])
			}
			if err := f.moveChecked(gf, step*uint64(r.ratio)+uint64(k)); err != nil {
				return err
			}
		}
		c.fill(gc.stepper)
		for i, list := range r.share {
			r.addUp(c.noise[i], list)
		}
		if err := c.moveChecked(gc, step); err != nil {
			return err
		}
		if step%window == window-1 {
			f.wrapState(gf.stepper)
			c.wrapState(gc.stepper)
		}
	}
	f.wrapState(gf.stepper)
	c.wrapState(gc.stepper)
	return r.commit()
}

// addUp sets the coarse increment to the normalized sum of the fine ones.
func (r *pairRunner) addUp(to []float64, list []int) {
	if len(list) == 0 {
		return
	}
	copy(to, r.kept[list[0]])
	for _, i := range list[1:] {
		for k, x := range r.kept[i] {
			to[k] += x
		}
	}
	f := 1 / math.Sqrt(float64(len(list)))
	for k := range to {
		to[k] *= f
	}
}

// moveChecked makes a step with the random numbers in place and removes lanes
// that are not finite.
func (r *runner) moveChecked(g segment, k uint64) error {
	if err := r.move(g, k); err != nil {
		return err
	}
	if !r.finite() {
		r.removeBlownUp(g.at(k), g.stepper.h)
	}
	return nil
}

func (r *pairRunner) commit() error {
	f, c := r.fine, r.coarse
	if err := f.observe(r.p.s.Time, f.values); err != nil {
		return err
	}
	if err := c.observe(r.q.s.Time, c.values); err != nil {
		return err
	}
	n := len(f.values)
	x, y, d := make([]float64, n), make([]float64, n), make([]float64, n)
	for lane := f.lo; lane < f.hi; lane++ {
		if f.status[lane] == blownUp || c.status[lane] == blownUp {
			r.tally.blowUp++
			continue
		}
		for i := range n {
			x[i], y[i] = f.values[i][lane], c.values[i][lane]
			d[i] = x[i] - y[i]
		}
		r.tally.fine.add(x)
		r.tally.coarse.add(y)
		r.tally.delta.add(d)
	}
	return nil
}
