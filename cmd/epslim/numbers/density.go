package numbers

import (
	"context"
	"errors"
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/fokkerplanck"
	"epslim/solver/density"
	"epslim/solver/volume"
)

// DensityOptions steers the grid solution. The zero value is usable.
type DensityOptions struct {
	Cells    []int // along each axis, or one number for all; nil takes a default by dimension
	Settings density.Settings
}

// Density is the stationary density on a grid, with its comparison.
type Density struct {
	Result     *density.Result
	Window     *Window
	ClosedForm density.Formula     // nil where there is none
	Difference *density.Difference // from the closed form, on the fine grid
	Coarse     *density.Result     // the grid with half the cells
	CoarseL1   float64             // of Coarse
	Order      float64             // observed between the two grids; NaN where none can be observed
	Current    *density.Current
	Entropy    float64 // entropy production rate
	Warnings   []string
}

// DefaultCells is the number of cells along an axis, by dimension.
var DefaultCells = []int{0, 1024, 128, 40}

// StationaryDensity solves the stationary Fokker-Planck equation of the limit
// on two grids and compares with the closed form.
//
// Errors are those of density.Stationary and of Domain; a window that cuts
// the mass is a warning.
func StationaryDensity(ctx context.Context, res *derivation.Result, opt DensityOptions) (*Density, error) {
	w, err := Domain(res)
	if err != nil {
		return nil, err
	}
	c, err := LimitCoefficients(ctx, res, w)
	if err != nil {
		return nil, err
	}
	never := res.Stationary.Density.Valid() && res.Stationary.Normal == fokkerplanck.No
	if never && w.Automatic() {
		return nil, &NotNormalisable{res.Stationary.NormalWhy}
	}
	if err := w.Choose(ctx, res, c, opt.Settings); err != nil {
		return nil, err
	}
	cells, err := opt.cells(len(res.System.Slow))
	if err != nil {
		return nil, err
	}
	d := &Density{Window: w, Order: math.NaN()}
	opt.Settings.Window = w.Open
	solve := func(cells []int) (*density.Result, error) {
		g, err := w.Grid(res.System, cells)
		if err != nil {
			return nil, err
		}
		r, err := density.Stationary(ctx, g, c, opt.Settings)
		var cut *density.WindowError
		if errors.As(err, &cut) {
			if len(d.Warnings) == 0 {
				d.Warnings = append(d.Warnings, cut.Error())
			}
			err = nil
		}
		return r, err
	}
	half := make([]int, len(cells))
	for i, n := range cells {
		half[i] = max(n/2, 2)
	}
	if res.Stationary.Density.Valid() {
		if d.Coarse, err = solve(half); err != nil {
			return nil, err
		}
	}
	d.Warnings = nil
	if never {
		d.Warnings = append(d.Warnings, "the density cannot be normalised on the whole domain; the grid shows what it is in the window")
	}
	if d.Result, err = solve(cells); err != nil {
		return nil, err
	}
	d.Current = d.Result.Current()
	d.Entropy = d.Result.EntropyProduction()
	if d.Coarse == nil {
		return d, nil
	}
	return d, d.compare(ctx, res)
}

func (o DensityOptions) cells(dim int) ([]int, error) {
	cells := o.Cells
	if len(cells) == 0 {
		cells = []int{DefaultCells[dim]}
	}
	if len(cells) == 1 {
		for len(cells) < dim {
			cells = append(cells, cells[0])
		}
	}
	if len(cells) != dim {
		return nil, fmt.Errorf("%d numbers of cells for %d slow variables", len(cells), dim)
	}
	for _, n := range cells {
		if n < 4 || n > 1<<20 {
			return nil, fmt.Errorf("%d cells along an axis; between 4 and %d can be used", n, 1<<20)
		}
	}
	return cells, nil
}

// compare finds the distance from the closed form on both grids.
func (d *Density) compare(ctx context.Context, res *derivation.Result) error {
	f, err := ClosedForm(ctx, res, d.Result.Grid)
	if ctx.Err() != nil {
		return ctx.Err()
	}
	if err != nil {
		d.Warnings = append(d.Warnings, "the closed form could not be evaluated: "+err.Error())
		return nil
	}
	d.ClosedForm = f
	if d.Difference, err = d.Result.Compare(f); err != nil {
		d.Warnings = append(d.Warnings, err.Error())
		return nil
	}
	c, err := d.Coarse.Compare(f)
	if err != nil {
		d.Warnings = append(d.Warnings, err.Error())
		return nil
	}
	d.CoarseL1 = c.L1
	if c.L1 > roundingLevel && d.Difference.L1 > roundingLevel {
		ratio := float64(d.Result.Grid.Cells()) / float64(d.Coarse.Grid.Cells())
		d.Order = math.Log(c.L1/d.Difference.L1) / math.Log(ratio) * float64(d.Result.Grid.Dim())
	}
	return nil
}

// roundingLevel is the L1 distance below which no order can be observed.
const roundingLevel = 1e-11

// Rounding reports whether grid and closed form agree up to rounding.
func (d *Density) Rounding() bool {
	return d.Difference != nil && d.Difference.L1 <= roundingLevel
}

// Verdict judges the comparison: the grid must converge to the closed form
// with the order of the scheme. ok is false for a failure; why is one line.
func (d *Density) Verdict() (ok bool, why string) {
	switch {
	case d.Difference == nil:
		return true, "there is no closed form to compare with"
	case d.Rounding():
		return true, fmt.Sprintf("equal up to rounding (L1 distance %.2g)", d.Difference.L1)
	case d.Order > 1.5:
		return true, fmt.Sprintf("L1 distance %.2g on %s, %.2g on %s: order %.2f", d.CoarseL1, d.Coarse.Grid, d.Difference.L1, d.Result.Grid, d.Order)
	case d.Difference.L1 < 1e-3 && d.Order > 0.5:
		return true, fmt.Sprintf("L1 distance %.2g on %s, %.2g on %s: order %.2f only", d.CoarseL1, d.Coarse.Grid, d.Difference.L1, d.Result.Grid, d.Order)
	}
	return false, fmt.Sprintf("L1 distance %.2g on %s, %.2g on %s: the grid does not converge to the closed form (order %.2f)", d.CoarseL1, d.Coarse.Grid, d.Difference.L1, d.Result.Grid, d.Order)
}

// NotNormalisable reports a stationary density of infinite mass.
type NotNormalisable struct{ Why string }

func (e *NotNormalisable) Error() string {
	return "no stationary density: the solution of the stationary equation cannot be normalised (" + e.Why + "); a window in the model file gives its shape there"
}

// NoDensity explains an error of the solver that means that there is no
// stationary density, or returns the empty string.
func NoDensity(err error) string {
	var abs *density.AbsorbingError
	var red *volume.ReducibleError
	var inf *NotNormalisable
	switch {
	case errors.As(err, &inf):
		return inf.Error()
	case errors.As(err, &abs):
		return abs.Error()
	case errors.As(err, &red):
		return red.Error()
	}
	return ""
}
