package numbers

import (
	"context"
	"fmt"

	"epslim/cmd/epslim/derivation"
	"epslim/solver/density"
	"epslim/solver/ensemble"
	"epslim/solver/grid"
)

// Law is the stationary law of the limit on the cells of histograms: one for
// each slow variable that is observed under its own name.
type Law struct {
	Specs []ensemble.HistogramSpec
	Cells [][]float64 // probabilities, in the order of the cells
}

// StationaryLaw solves for the stationary density of the limit on a grid
// whose cells divide those of the histograms.
func StationaryLaw(ctx context.Context, res *derivation.Result, observed []string, cells, workers int) (*Law, error) {
	dim := len(res.System.Slow)
	if dim > grid.MaxDim {
		return nil, fmt.Errorf("the model has %d slow variables; grids have at most %d dimensions", dim, grid.MaxDim)
	}
	seen := map[string]bool{}
	for _, n := range observed {
		seen[n] = true
	}
	for _, o := range res.System.Observables {
		seen[o.Name] = o.Value.String() == o.Name
	}
	fold := max(1, (DefaultCells[dim]+cells-1)/cells)
	d, err := StationaryDensity(ctx, res, DensityOptions{Cells: []int{cells * fold}, Settings: density.Settings{Workers: workers}})
	if err != nil {
		return nil, err
	}
	l := &Law{}
	for i, v := range res.System.Slow {
		if !seen[v.Name] {
			continue
		}
		p := make([]float64, cells)
		axis := d.Result.Grid.Axis(i)
		for k, x := range d.Result.Marginal(i) {
			p[k/fold] += x * (axis.Edges[k+1] - axis.Edges[k])
		}
		l.Cells = append(l.Cells, p)
		l.Specs = append(l.Specs, ensemble.HistogramSpec{Observables: []string{v.Name}, Lo: []float64{d.Window.Lo[i]}, Hi: []float64{d.Window.Hi[i]}, Cells: []int{cells}})
	}
	if len(l.Specs) == 0 {
		return nil, fmt.Errorf("no slow variable is observed under its own name; observed are %v", observed)
	}
	return l, nil
}
