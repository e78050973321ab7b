package ensemble

import (
	"cmp"
	"fmt"
	"math"
	"slices"
)

// Tally is everything a run accumulates. Two tallies of one kind of run over
// different paths can be merged in any order with the same result.
type Tally struct {
	Done   []Interval  // the paths that are in it, ascending, disjoint
	Times  []TimeTally // one for each observation time
	Exits  []ExitTally // one for each absorbing variable
	Leaves []LeaveTally
	Long   *LongTally `json:",omitempty"`
	BlowUp uint64     // paths stopped by a state that is not finite
	Events []Event    // the first of them
}

// Interval is a range of paths [From, To).
type Interval struct{ From, To uint64 }

// TimeTally holds sums over paths at one time: of each observable, and of the
// products of observables i <= j in the order (0,0), (0,1), ..., (1,1), ...
type TimeTally struct {
	Time     float64
	Count    uint64
	Sums     []Sum
	Products []Sum
	Cells    []Histogram `json:",omitempty"`
}

// ExitTally counts the paths stopped at the two ends of an absorbing variable
// and the times at which they were.
type ExitTally struct {
	Variable     string
	Lower, Upper uint64
	Alive        uint64
	Time, Square Sum // of the exit times of the stopped paths
}

// LeaveTally counts the path-steps that left the domain of a variable and were
// brought back by reflection.
type LeaveTally struct {
	Variable string
	Steps    uint64 // path-steps that left
	Of       uint64 // path-steps made
}

// Event is a path stopped by a state that is not finite.
type Event struct {
	Path  uint64
	Seed  uint64
	Time  float64   // of the last finite state
	State []float64 // that state
	Step  float64
}

func (e Event) String() string {
	return fmt.Sprintf("path %d of seed %d left the finite numbers at time %g, step %g, after the state %v", e.Path, e.Seed, e.Time, e.Step, e.State)
}

// LongTally holds sums over paths of averages along them.
type LongTally struct {
	Span     float64 // time averaged over, of one path
	Batch    float64 // time of one batch
	Count    uint64
	Mean     []Sum // path averages
	Square   []Sum // path averages of the squares
	BatchSq  []Sum // squares of batch averages, averaged over the batches of a path
	Products []Sum // of the path averages of observables i <= j
	Cells    []Histogram
}

// maxEvents is the number of events kept.
const maxEvents = 10

// Histogram counts values in equal cells, the last observable running fastest.
type Histogram struct {
	Spec    HistogramSpec
	Counts  []uint64
	Outside uint64 // values beyond the ends, or not numbers
}

func newHistogram(spec HistogramSpec) Histogram {
	n := 1
	for _, c := range spec.Cells {
		n *= c
	}
	return Histogram{Spec: spec, Counts: make([]uint64, n)}
}

// add counts one value; a value at the upper end belongs to the last cell.
func (h *Histogram) add(x ...float64) {
	cell := 0
	for i, v := range x {
		lo, hi, n := h.Spec.Lo[i], h.Spec.Hi[i], h.Spec.Cells[i]
		if !(v >= lo && v <= hi) {
			h.Outside++
			return
		}
		cell = cell*n + min(int((v-lo)/(hi-lo)*float64(n)), n-1)
	}
	h.Counts[cell]++
}

// Total returns the number of values inside the ends.
func (h *Histogram) Total() uint64 {
	var n uint64
	for _, c := range h.Counts {
		n += c
	}
	return n
}

// Edges returns the ends of the cells along one axis.
func (h *Histogram) Edges(axis int) []float64 {
	lo, hi, n := h.Spec.Lo[axis], h.Spec.Hi[axis], h.Spec.Cells[axis]
	e := make([]float64, n+1)
	for i := range e {
		e[i] = lo + (hi-lo)*float64(i)/float64(n)
	}
	e[n] = hi
	return e
}

func (h *Histogram) merge(o *Histogram) {
	for i, c := range o.Counts {
		h.Counts[i] += c
	}
	h.Outside += o.Outside
}

// newTally returns an empty tally for the shape of a run.
func newTally(m *Model, s *Settings) *Tally {
	n := len(m.observables())
	t := &Tally{}
	for _, at := range s.times() {
		t.Times = append(t.Times, newTimeTally(at, n, s.Histograms))
	}
	for _, v := range m.Variables {
		switch v.Domain.Kind {
		case Absorbing:
			t.Exits = append(t.Exits, ExitTally{Variable: v.Name})
		case Reflecting, HalfLine:
			t.Leaves = append(t.Leaves, LeaveTally{Variable: v.Name})
		}
	}
	if l := s.LongTime; l != nil {
		k := &LongTally{Span: s.Time - l.Burn, Mean: make([]Sum, n), Square: make([]Sum, n), BatchSq: make([]Sum, n), Products: make([]Sum, n*(n+1)/2)}
		k.Batch = k.Span / float64(l.batches())
		for _, h := range l.Histograms {
			k.Cells = append(k.Cells, newHistogram(h))
		}
		t.Long = k
	}
	return t
}

func (l *LongTime) batches() int {
	if l.Batches == 0 {
		return 16
	}
	return l.Batches
}

func (l *LongTime) every() int { return max(1, l.Every) }

func newTimeTally(at float64, n int, specs []HistogramSpec) TimeTally {
	t := TimeTally{Time: at, Sums: make([]Sum, n), Products: make([]Sum, n*(n+1)/2)}
	for _, h := range specs {
		t.Cells = append(t.Cells, newHistogram(h))
	}
	return t
}

// add counts one path's values.
func (t *TimeTally) add(x []float64) {
	t.Count++
	k := 0
	for i, v := range x {
		t.Sums[i].Add(v)
		for _, w := range x[i:] {
			t.Products[k].AddProduct(v, w)
			k++
		}
	}
}

func mergeSums(s, o []Sum) {
	for i := range s {
		s[i].Merge(&o[i])
	}
}

// Merge adds the tally o, which must have the same shape and no path in common.
func (t *Tally) Merge(o *Tally) error {
	if len(t.Times) != len(o.Times) || len(t.Exits) != len(o.Exits) || len(t.Leaves) != len(o.Leaves) || (t.Long == nil) != (o.Long == nil) {
		return fmt.Errorf("ensemble: the tallies to merge have different shapes")
	}
	done, err := unite(t.Done, o.Done)
	if err != nil {
		return err
	}
	t.Done = done
	for i := range t.Times {
		a, b := &t.Times[i], &o.Times[i]
		if a.Time != b.Time || len(a.Sums) != len(b.Sums) || len(a.Cells) != len(b.Cells) {
			return fmt.Errorf("ensemble: the tallies to merge have different shapes at time %v", a.Time)
		}
		a.Count += b.Count
		mergeSums(a.Sums, b.Sums)
		mergeSums(a.Products, b.Products)
		for k := range a.Cells {
			a.Cells[k].merge(&b.Cells[k])
		}
	}
	for i := range t.Exits {
		a, b := &t.Exits[i], &o.Exits[i]
		a.Lower, a.Upper, a.Alive = a.Lower+b.Lower, a.Upper+b.Upper, a.Alive+b.Alive
		a.Time.Merge(&b.Time)
		a.Square.Merge(&b.Square)
	}
	for i := range t.Leaves {
		t.Leaves[i].Steps += o.Leaves[i].Steps
		t.Leaves[i].Of += o.Leaves[i].Of
	}
	if t.Long != nil {
		t.Long.merge(o.Long)
	}
	t.BlowUp += o.BlowUp
	t.addEvents(o.Events)
	return nil
}

// addEvents keeps the events of the lowest paths.
func (t *Tally) addEvents(events []Event) {
	t.Events = append(t.Events, events...)
	slices.SortFunc(t.Events, func(a, b Event) int { return cmp.Compare(a.Path, b.Path) })
	t.Events = t.Events[:min(len(t.Events), maxEvents)]
}

func (l *LongTally) merge(o *LongTally) {
	l.Count += o.Count
	mergeSums(l.Mean, o.Mean)
	mergeSums(l.Square, o.Square)
	mergeSums(l.BatchSq, o.BatchSq)
	mergeSums(l.Products, o.Products)
	for k := range l.Cells {
		l.Cells[k].merge(&o.Cells[k])
	}
}

// unite merges two lists of disjoint intervals.
func unite(a, b []Interval) ([]Interval, error) {
	all := append(slices.Clone(a), b...)
	slices.SortFunc(all, func(x, y Interval) int { return cmp.Compare(x.From, y.From) })
	var out []Interval
	for _, x := range all {
		if k := len(out) - 1; k >= 0 {
			if x.From < out[k].To {
				return nil, fmt.Errorf("ensemble: paths %d to %d are in both parts", x.From, min(x.To, out[k].To)-1)
			}
			if x.From == out[k].To {
				out[k].To = x.To
				continue
			}
		}
		out = append(out, x)
	}
	return out, nil
}

// Paths returns the number of paths in the tally.
func (t *Tally) Paths() uint64 {
	var n uint64
	for _, i := range t.Done {
		n += i.To - i.From
	}
	return n
}

// missing returns the ranges of [from, to) that are not in the tally.
func (t *Tally) missing(from, to uint64) []Interval {
	var gaps []Interval
	for _, x := range t.Done {
		if x.To <= from {
			continue
		}
		if x.From >= to {
			break
		}
		if from < x.From {
			gaps = append(gaps, Interval{from, x.From})
		}
		from = max(from, x.To)
	}
	if from < to {
		gaps = append(gaps, Interval{from, to})
	}
	return gaps
}

// finite reports whether all values are finite.
func finite(x []float64) bool {
	for _, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}
