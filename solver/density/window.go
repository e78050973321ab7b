package density

import (
	"context"
	"fmt"
	"math"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Range is the domain of a variable for which a window is wanted.
type Range struct {
	Name         string
	Lo, Hi       float64 // -Inf and +Inf where the domain does not end
	Lower, Upper grid.Side
}

// windowWidths is how many standard deviations a window reaches from the mean.
const windowWidths = 6

// Windows finds a bounded window for every unbounded end of the ranges, from
// moments: starting from guess (a box that should contain the bulk of the mass),
// it solves on coarse grids of cells cells an axis, moves open ends outwards while
// there is density at them, then draws them in to six standard deviations, and
// ends when the density at all of them is below the tolerance of the settings.
// It reports a *WindowError when the window grows past 1e6 times the guess,
// which is what happens when no stationary density exists.
func Windows(ctx context.Context, c volume.Coefficients, ranges []Range, guess [][2]float64, cells int, s Settings) ([]Range, error) {
	box := append([]Range(nil), ranges...)
	first := make([]float64, len(box))
	for d := range box {
		box[d].Lo, box[d].Hi = math.Max(ranges[d].Lo, guess[d][0]), math.Min(ranges[d].Hi, guess[d][1])
		first[d] = box[d].Hi - box[d].Lo
		if !(first[d] > 0) {
			return nil, fmt.Errorf("window of %s: the guess [%g, %g] has no part inside the domain [%g, %g]", box[d].Name, guess[d][0], guess[d][1], ranges[d].Lo, ranges[d].Hi)
		}
	}
	tol := s.WindowTolerance
	if tol == 0 {
		tol = 1e-6
	}
	s.Window = [grid.MaxDim][2]bool{}
	drawn, shrunk := false, false
	for round := 0; round < 60; round++ {
		g, err := boxGrid(box, cells)
		if err != nil {
			return nil, err
		}
		r, err := Stationary(ctx, g, c, s)
		if err != nil {
			return nil, err
		}
		edge := r.Boundary()
		grown := false
		for d := range box {
			grown = grow(&box[d], ranges[d], edge[d], tol) || grown
			if box[d].Hi-box[d].Lo > 1e6*first[d] {
				return nil, &WindowError{box[d].Name, "upper", box[d].Hi, edge[d][1].Level}
			}
		}
		if grown {
			// Ends that were drawn in too far stay where they are now put.
			shrunk = shrunk || drawn
			continue
		}
		if shrunk {
			return box, nil
		}
		mean, cov := r.Moments()
		again := false
		for d := range box {
			drawn = true
			again = shrink(&box[d], ranges[d], mean[d], math.Sqrt(cov[d][d]), cells) || again
		}
		if !again {
			// The bulk is resolved. A last pass sees to tails heavier than a Gaussian.
			shrunk = true
		}
	}
	return nil, fmt.Errorf("window of %s: no window found that holds the mass; give one", box[0].Name)
}

func boxGrid(box []Range, cells int) (*grid.Grid, error) {
	var axes []grid.Axis
	for _, b := range box {
		u, err := grid.Uniform(b.Name, b.Lo, b.Hi, cells, grid.Reflecting)
		if err != nil {
			return nil, err
		}
		a, err := grid.NonUniform(b.Name, u.Edges, b.Lower, b.Upper)
		if err != nil {
			return nil, err
		}
		axes = append(axes, a)
	}
	return grid.New(axes...)
}

// grow moves the open ends at which there is density outwards and reports
// whether it did.
func grow(b *Range, domain Range, edge [2]Side, tol float64) bool {
	width := b.Hi - b.Lo
	grown := false
	if math.IsInf(domain.Lo, -1) && edge[0].Level > tol {
		b.Lo -= 0.5 * width
		grown = true
	}
	if math.IsInf(domain.Hi, 1) && edge[1].Level > tol {
		b.Hi += 0.5 * width
		grown = true
	}
	return grown
}

// shrink draws the open ends in to six standard deviations, taken not smaller
// than a cell, and reports whether the width fell by more than a third.
func shrink(b *Range, domain Range, mean, sd float64, cells int) bool {
	width := b.Hi - b.Lo
	reach := windowWidths * math.Max(sd, width/float64(cells))
	if math.IsInf(domain.Lo, -1) {
		b.Lo = math.Max(b.Lo, mean-reach)
	}
	if math.IsInf(domain.Hi, 1) {
		b.Hi = math.Min(b.Hi, mean+reach)
	}
	return b.Hi-b.Lo < 0.67*width
}
