package numbers

import (
	"context"
	"errors"
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/solver/density"
	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Window is the box on which grids live. Open marks sides that stand in for
// infinity.
type Window struct {
	Lo, Hi []float64
	Open   [grid.MaxDim][2]bool
	// Chosen marks variables whose window the program chose.
	Chosen []bool
}

// Domain reads the box of a system: domains, windows given in the model, and
// a first guess for the rest.
func Domain(res *derivation.Result) (*Window, error) {
	sys := res.System
	if n := len(sys.Slow); n > grid.MaxDim {
		return nil, fmt.Errorf("the model has %d slow variables; grids have at most %d dimensions", n, grid.MaxDim)
	}
	w := &Window{}
	value := func(e algebra.Expr) (float64, error) {
		if err := sys.NeedNumbers(nil, e); err != nil {
			return 0, err
		}
		f, err := e.Subs(sys.Values())
		if err != nil {
			return 0, err
		}
		return f.EvalFloat(nil)
	}
	for d, v := range sys.Slow {
		var lo, hi float64
		var err error
		chosen := false
		a, b := v.Domain.A, v.Domain.B
		switch v.Domain.Kind {
		case ito.Circle:
			lo, hi = 0, 2*math.Pi
		case ito.Line, ito.HalfLine:
			w.Open[d] = [2]bool{true, true}
			if v.Domain.Kind == ito.HalfLine {
				w.Open[d][0] = false
			}
			a, b = v.Domain.WindowA, v.Domain.WindowB
			if !a.Valid() {
				chosen = true
				lo, hi = -4, 4
				if v.Domain.Kind == ito.HalfLine {
					lo = 0
				}
			}
		}
		if !chosen && v.Domain.Kind != ito.Circle {
			if lo, err = value(a); err != nil {
				return nil, err
			}
			if hi, err = value(b); err != nil {
				return nil, err
			}
			if v.Domain.Kind == ito.HalfLine && lo > 0 {
				w.Open[d][0] = true
			}
		}
		w.Lo, w.Hi, w.Chosen = append(w.Lo, lo), append(w.Hi, hi), append(w.Chosen, chosen)
	}
	return w, nil
}

// Automatic reports whether some window is the program's choice.
func (w *Window) Automatic() bool {
	for _, c := range w.Chosen {
		if c {
			return true
		}
	}
	return false
}

// Grid is the uniform grid with the given numbers of cells.
func (w *Window) Grid(sys *ito.System, cells []int) (*grid.Grid, error) {
	axes := make([]grid.Axis, len(sys.Slow))
	for d, v := range sys.Slow {
		side := grid.Reflecting
		switch v.Domain.Kind {
		case ito.Periodic, ito.Circle:
			side = grid.Periodic
		case ito.Absorbing:
			side = grid.Absorbing
		}
		a, err := grid.Uniform(v.Name, w.Lo[d], w.Hi[d], cells[d], side)
		if err != nil {
			return nil, err
		}
		axes[d] = a
	}
	return grid.New(axes...)
}

// How a window is chosen: it grows until the density at its sides is below
// sideLevel of a uniform one, then shrinks to a number of standard deviations.
const (
	sideLevel   = 1e-7
	maxGrowth   = 40
	deviations  = 7.0
	coarseCells = 48
)

// Choose fits the windows that the model leaves open to where the density
// lies, by solutions on coarse grids.
func (w *Window) Choose(ctx context.Context, res *derivation.Result, c volume.Coefficients, s density.Settings) error {
	if !w.Automatic() {
		return nil
	}
	s.Progress, s.Window = nil, [grid.MaxDim][2]bool{}
	cells := make([]int, len(w.Lo))
	for d := range cells {
		cells[d] = map[int]int{1: 400, 2: coarseCells, 3: 20}[len(cells)]
	}
	for k := 0; k < maxGrowth; k++ {
		g, err := w.Grid(res.System, cells)
		if err != nil {
			return err
		}
		r, err := density.Stationary(ctx, g, c, s)
		var outside *volume.CoefficientError
		if errors.As(err, &outside) {
			return fmt.Errorf("a window could not be chosen: %w; give it in the model file as \"window [A, B]\"", err)
		}
		if err != nil {
			return err
		}
		mean, cov := r.Moments()
		sides := r.Boundary()
		changed := false
		for d := range w.Lo {
			if !w.Chosen[d] {
				continue
			}
			span := w.Hi[d] - w.Lo[d]
			sd := math.Sqrt(math.Max(cov[d][d], 0))
			grown := false
			if w.Open[d][1] && sides[d][1].Level > sideLevel {
				w.Hi[d] += span
				grown = true
			}
			if w.Open[d][0] && sides[d][0].Level > sideLevel {
				w.Lo[d] -= span
				grown = true
			}
			lo, hi := mean[d]-deviations*sd, mean[d]+deviations*sd
			if !w.Open[d][0] {
				lo = w.Lo[d]
			}
			if !grown && sd > 0 && hi-lo < span/1.8 {
				w.Lo[d], w.Hi[d] = lo, hi
				grown = true
			}
			changed = changed || grown
		}
		if !changed {
			w.round()
			return nil
		}
	}
	return fmt.Errorf("no window was found that holds the stationary density: its tails are too heavy, or it cannot be normalised; give one in the model file as \"window [A, B]\"")
}

// round brings chosen ends to two digits, outwards.
func (w *Window) round() {
	for d, c := range w.Chosen {
		if !c {
			continue
		}
		unit := math.Pow(10, math.Floor(math.Log10((w.Hi[d]-w.Lo[d])/10)))
		if w.Open[d][0] {
			w.Lo[d] = math.Floor(w.Lo[d]/unit) * unit
		}
		w.Hi[d] = math.Ceil(w.Hi[d]/unit) * unit
	}
}
