package ensemble

import (
	"context"
	"fmt"
	"math"
)

// Traces are the observables of single paths at the observation times.
type Traces struct {
	Paths       []uint64
	Times       []float64 // the start is not among them
	Observables []string
	Values      [][][]float64 // [path][time][observable]; NaN for a path that blew up
}

// maxTraced bounds the numbers that Trace keeps.
const maxTraced = 1 << 24

// Trace simulates the given paths, each the same as in a run of the ensemble with
// these settings, and keeps their observables at Settings.Times. From, To,
// histograms and checkpoints of the settings are not used.
func Trace(ctx context.Context, m *Model, s Settings, paths []uint64) (*Traces, error) {
	s.From, s.To = 0, 1
	s.Histograms, s.LongTime, s.Checkpoint = nil, nil, ""
	p, err := newPlan(m, &s, 1)
	if err != nil {
		return nil, err
	}
	t := &Traces{Paths: paths, Times: s.times(), Observables: m.ObservableNames(), Values: make([][][]float64, len(paths))}
	if n := len(paths) * len(t.Times) * len(t.Observables); n == 0 || n > maxTraced {
		return nil, fmt.Errorf("ensemble: %d paths at %d times; between 1 and %d numbers can be kept", len(paths), len(t.Times), maxTraced)
	}
	byBlock := map[uint64][]int{}
	for i, k := range paths {
		if k >= MaxPaths {
			return nil, fmt.Errorf("ensemble: path %d; paths are numbered below %d", k, uint64(MaxPaths))
		}
		byBlock[k/block] = append(byBlock[k/block], i)
	}
	r := newRunner(p)
	for i, k := range paths {
		if t.Values[i] != nil {
			continue
		}
		if err := r.run(ctx, k/block, 0, block); err != nil {
			return nil, err
		}
		for _, n := range byBlock[k/block] {
			t.Values[n] = r.trace(int(paths[n] % block))
		}
	}
	return t, nil
}

// trace copies the record of one lane.
func (r *runner) trace(lane int) [][]float64 {
	values := make([][]float64, len(r.record))
	for at, row := range r.record {
		values[at] = make([]float64, len(row))
		for i := range row {
			values[at][i] = row[i][lane]
			if r.status[lane] == blownUp {
				values[at][i] = math.NaN()
			}
		}
	}
	return values
}
