package figure

import (
	"fmt"
	"slices"
)

// DensityLineData is a density in one dimension.
type DensityLineData struct {
	XLabel, YLabel string // markup; YLabel "density" when empty
	X              Axis   // range, ticks at multiples of pi; its label is XLabel
	Curves         []Series
}

// DensityLine draws densities of one variable as lines: for example the grid solution and the closed form.
func DensityLine(d DensityLineData, s Settings) *Plot {
	p := &Plot{Settings: s, X: d.X, Y: Axis{Label: or(d.YLabel, "density"), FromZero: true}, Series: d.Curves}
	p.X.Label = or(d.XLabel, d.X.Label)
	return p
}

// DensityMapData is a function on a grid of cells in two dimensions, nx by ny, with what may lie on top.
type DensityMapData struct {
	XLabel, YLabel, Quantity string // markup; Quantity is the label of the colour bar
	X, Y                     Axis   // periodic, ticks at multiples of pi; range and label are set here
	XEdges, YEdges           []float64
	Density                  []float64 // nx*ny, x fastest
	Map                      ColourMap
	Log                      bool         // logarithmic colours
	Current                  *VectorField // nil for none; CellCentres gives its places
	Paths                    []Path
}

// DensityMap draws a density as a heat map, with the current as arrows or streamlines and sample paths on
// top where they are given. Axes that are periodic get the range of the grid.
func DensityMap(d DensityMapData, s Settings) *Plot {
	p := &Plot{Settings: s, X: d.X, Y: d.Y, Field: d.Current, Paths: d.Paths,
		Heat: &HeatMap{XEdges: d.XEdges, YEdges: d.YEdges, Values: d.Density, Quantity: or(d.Quantity, "density"), Map: d.Map, Log: d.Log}}
	p.X.Label, p.Y.Label = or(d.XLabel, d.X.Label), or(d.YLabel, d.Y.Label)
	for _, a := range []struct {
		axis  *Axis
		edges []float64
	}{{&p.X, d.XEdges}, {&p.Y, d.YEdges}} {
		if len(a.edges) > 0 {
			a.axis.Min, a.axis.Max = a.edges[0], a.edges[len(a.edges)-1]
		}
	}
	return p
}

// DifferenceMap draws a difference as a heat map in a diverging map centred at zero.
func DifferenceMap(d DensityMapData, s Settings) *Plot {
	d.Map, d.Log, d.Quantity = Diverging, false, or(d.Quantity, "difference")
	return DensityMap(d, s)
}

// HistogramData is an empirical distribution beside densities that it should follow.
type HistogramData struct {
	XLabel     string
	X          Axis
	Histograms []Histogram
	Curves     []Series
}

// HistogramAgainst draws histograms, as densities, and curves over them.
func HistogramAgainst(d HistogramData, s Settings) *Plot {
	p := &Plot{Settings: s, X: d.X, Y: Axis{Label: "density", FromZero: true}, Histograms: d.Histograms}
	p.X.Label = or(d.XLabel, d.X.Label)
	for _, c := range d.Curves {
		if c.Marks == MarksAuto && len(c.X) > 12 {
			c.Marks = LineOnly
		}
		p.Series = append(p.Series, c)
	}
	return p
}

// GridConvergenceData is an error on a sequence of grids.
type GridConvergenceData struct {
	ErrorLabel string // markup; "error" when empty
	Errors     []GridErrors
	Orders     []float64 // of the reference slopes; 2 when nil
}

// GridErrors is an error against the number of cells a side. Errors must be positive.
type GridErrors struct {
	Label string
	Cells []float64
	Error []float64
}

// GridConvergence draws errors against the number of cells on logarithmic axes, with reference slopes.
func GridConvergence(d GridConvergenceData, s Settings) *Plot {
	p := &Plot{Settings: s, X: Axis{Label: "cells in each direction", Log: true}, Y: Axis{Label: or(d.ErrorLabel, "error"), Log: true}}
	for _, e := range d.Errors {
		p.Series = append(p.Series, Series{Label: e.Label, X: e.Cells, Y: e.Error})
	}
	p.X.Ticks = fewValues(p.Series)
	orders := d.Orders
	if orders == nil {
		orders = []float64{2}
	}
	for _, k := range orders {
		p.Slopes = append(p.Slopes, Slope{Order: -k, Label: fmt.Sprintf("order %g", k)})
	}
	return p
}

// EpsConvergenceData is the distance of the full system from its limit at several eps.
type EpsConvergenceData struct {
	Small      string // name of the small parameter; "eps" when empty
	ErrorLabel string // markup; "distance from the limit" when empty
	Observed   []EpsErrors
	// NoiseFloor draws the level below which a distance cannot be told from zero; 0 for none.
	NoiseFloor float64
	Orders     []float64 // of the reference slopes; 1 when nil
}

// EpsErrors are distances with their confidence limits.
type EpsErrors struct {
	Label     string
	Eps       []float64
	Error     []float64 // positive
	Low, High []float64 // confidence limits; a lower one may be zero or negative. Both or neither
	Band      bool      // limits as a band and not as bars
}

// EpsConvergence draws distances against eps on logarithmic axes, with reference slopes.
func EpsConvergence(d EpsConvergenceData, s Settings) *Plot {
	p := &Plot{Settings: s, X: Axis{Label: Symbol(or(d.Small, "eps")), Log: true},
		Y: Axis{Label: or(d.ErrorLabel, "distance from the limit"), Log: true}}
	for _, e := range d.Observed {
		b := ErrorBars
		if e.Band {
			b = Band
		}
		p.Series = append(p.Series, Series{Label: e.Label, X: e.Eps, Y: e.Error, Low: e.Low, High: e.High, Bounds: b})
	}
	p.X.Ticks = fewValues(p.Series)
	orders := d.Orders
	if orders == nil {
		orders = []float64{1}
	}
	for _, k := range orders {
		p.Slopes = append(p.Slopes, Slope{Order: k, Label: fmt.Sprintf("slope %g", k)})
	}
	if d.NoiseFloor != 0 {
		p.Levels = []Level{{d.NoiseFloor, "noise floor"}}
	}
	return p
}

// fewValues are the abscissas of the series in increasing order, or nil if they are too many for ticks.
func fewValues(s []Series) []float64 {
	var all []float64
	for i := range s {
		all = append(all, s[i].X...)
	}
	slices.Sort(all)
	all = slices.Compact(all)
	if len(all) > 10 || checkFinite("", all) != nil {
		return nil
	}
	return all
}

// UniformEdges are the n+1 boundaries of n equal cells between a and b.
func UniformEdges(a, b float64, n int) []float64 {
	out := make([]float64, max(0, n)+1)
	for i := range out {
		out[i] = a + (b-a)*float64(i)/float64(max(1, n))
	}
	out[len(out)-1] = b
	return out
}

// CellCentres are the midpoints of cells with the given boundaries.
func CellCentres(edges []float64) []float64 { return centres(edges) }

func or(a, b string) string {
	if a != "" {
		return a
	}
	return b
}
