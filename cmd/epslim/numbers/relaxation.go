package numbers

import (
	"context"
	"fmt"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/ito"
	"epslim/solver/density"
	"epslim/solver/grid"
	"epslim/solver/volume"
)

// Relaxation is what the time-dependent Fokker-Planck equation of the limit
// tells on a grid.
type Relaxation struct {
	Grid  *grid.Grid
	Rates []density.Rate // slowest first; nil when not asked for
	Exit  *density.Exit  // mean exit time by starting cell; nil when not asked for
	Start []float64      // the point where paths start
}

// limitGrid prepares a grid and the limit's coefficients on it.
func limitGrid(ctx context.Context, res *derivation.Result, opt DensityOptions) (*grid.Grid, *Window, volume.Coefficients, error) {
	w, err := Domain(res)
	if err != nil {
		return nil, nil, nil, err
	}
	c, err := LimitCoefficients(ctx, res, w)
	if err != nil {
		return nil, nil, nil, err
	}
	if w.Automatic() {
		for _, v := range res.System.Slow {
			if v.Domain.Kind == ito.Absorbing {
				return nil, nil, nil, fmt.Errorf("%s absorbs, so that no window can be chosen from a stationary density; give one to each unbounded variable", v.Name)
			}
		}
	}
	if err := w.Choose(ctx, res, c, opt.Settings); err != nil {
		return nil, nil, nil, err
	}
	cells, err := opt.cells(len(res.System.Slow))
	if err != nil {
		return nil, nil, nil, err
	}
	g, err := w.Grid(res.System, cells)
	return g, w, c, err
}

// Relax finds the given number of decay rates, none for 0, and with exit the
// mean exit time through the absorbing sides.
func Relax(ctx context.Context, res *derivation.Result, opt DensityOptions, rates int, exit bool) (*Relaxation, error) {
	g, w, c, err := limitGrid(ctx, res, opt)
	if err != nil {
		return nil, err
	}
	r := &Relaxation{Grid: g}
	s := opt.Settings
	s.Window = w.Open
	if rates > 0 {
		if r.Rates, err = density.DecayRates(ctx, g, c, rates, s); err != nil {
			return nil, err
		}
	}
	if !exit {
		return r, nil
	}
	if r.Exit, err = density.MeanExitTime(ctx, g, c, s); err != nil {
		return nil, err
	}
	for _, v := range res.System.Slow {
		x, err := variable(res.System, v)
		if err != nil {
			return nil, err
		}
		r.Start = append(r.Start, x.Start)
	}
	if g.CellAt(r.Start...) < 0 {
		return nil, fmt.Errorf("the start %s lies outside the grid; give a window that holds it", g.PointText(r.Start))
	}
	return r, nil
}
