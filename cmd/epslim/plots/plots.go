// Package plots chooses what the figures of a result show: which quantity on
// which axes, and the sentence that states the finding. How they are drawn is
// the business of cmd/epslim/figure. It imports cmd/epslim/derivation,
// cmd/epslim/numbers and cmd/epslim/figure.
package plots

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/figure"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/present"
	"epslim/fokkerplanck"
	"epslim/generator/ito"
	"epslim/solver/density"
	"epslim/solver/ensemble"
)

// Meta is the provenance as the unseen fields of a figure.
func Meta(p present.Provenance) []figure.Field {
	out := []figure.Field{{Name: "version", Value: "epslim " + p.Version}, {Name: "model-sha256", Value: p.SHA256}}
	for _, o := range p.Options {
		out = append(out, figure.Field{Name: o.Name, Value: o.Value})
	}
	return append(out, figure.Field{Name: "command", Value: p.Command}, figure.Field{Name: "model", Value: p.Model})
}

// Encode draws a figure in the format that the name's extension asks for;
// .tex gives a pgfplots picture with the files it reads.
func Encode(p *figure.Plot, name string) ([]figure.File, error) {
	ext := strings.ToLower(filepath.Ext(name))
	var data []byte
	var err error
	switch ext {
	case ".svg":
		data, err = p.SVG()
	case ".png":
		data, err = p.PNG()
	case ".pdf":
		data, err = p.PDF()
	case ".tex":
		return p.TeX(strings.TrimSuffix(filepath.Base(name), filepath.Ext(name)))
	default:
		return nil, fmt.Errorf("%s: figures end in .svg, .png, .pdf or .tex", name)
	}
	if err != nil {
		return nil, err
	}
	return []figure.File{{Name: filepath.Base(name), Data: data}}, nil
}

// axis describes a slow variable as an axis.
func axis(v *ito.Variable, w *numbers.Window, d int) figure.Axis {
	a := figure.Axis{Min: w.Lo[d], Max: w.Hi[d]}
	switch v.Domain.Kind {
	case ito.Circle:
		a.Pi, a.Periodic = true, true
	case ito.Periodic:
		a.Periodic = true
	}
	return a
}

// Density draws the stationary density: a line with the closed form beside
// it, or a heat map with the current as streamlines where there is one. With
// three variables the marginal of the first two is shown.
func Density(res *derivation.Result, d *numbers.Density, meta []figure.Field) *figure.Plot {
	slow := res.System.Slow
	s := figure.Settings{Title: "Stationary density", Alt: densityAlt(res, d), Meta: meta}
	g := d.Result.Grid
	if g.Dim() == 1 {
		x := g.Axis(0).Centers()
		curves := []figure.Series{{Label: "grid", X: x, Y: flat(d.Result.P), Marks: figure.LineOnly}}
		if d.Difference != nil {
			curves = append(curves, figure.Series{Label: "closed form", X: x, Y: d.Difference.Exact, Marks: figure.LineOnly})
		}
		a := axis(slow[0], d.Window, 0)
		return figure.DensityLine(figure.DensityLineData{
			XLabel: figure.Symbol(slow[0].Name), YLabel: "$p_{s}(" + figure.SymbolMath(slow[0].Name) + ")$", X: a, Curves: curves,
		}, s)
	}
	data := mapData(res, d, flat(d.Result.P))
	data.Quantity = "$p_{s}(" + figure.SymbolMath(slow[0].Name) + ", " + figure.SymbolMath(slow[1].Name) + ")$"
	if g.Dim() == 3 {
		data.Density = flat(d.Result.Marginal(0, 1))
	} else if Flows(res, d) {
		data.Current = &figure.VectorField{
			X: g.Axis(0).Centers(), Y: g.Axis(1).Centers(), U: d.Current.Cells[0], V: d.Current.Cells[1],
			Style: figure.Streamlines, Label: "current",
		}
	}
	return figure.DensityMap(data, s)
}

// flat draws a density that is constant up to rounding as a constant.
func flat(p []float64) []float64 {
	lo, hi := slices.Min(p), slices.Max(p)
	if hi-lo > 1e-9*hi {
		return p
	}
	out := make([]float64, len(p))
	for i := range out {
		out[i] = (lo + hi) / 2
	}
	return out
}

func mapData(res *derivation.Result, d *numbers.Density, values []float64) figure.DensityMapData {
	slow, g := res.System.Slow, d.Result.Grid
	return figure.DensityMapData{
		XLabel: figure.Symbol(slow[0].Name), YLabel: figure.Symbol(slow[1].Name),
		X: axis(slow[0], d.Window, 0), Y: axis(slow[1], d.Window, 1),
		XEdges: g.Axis(0).Edges, YEdges: g.Axis(1).Edges, Density: values,
	}
}

// Flows reports whether the stationary current stands out of rounding.
func Flows(res *derivation.Result, d *numbers.Density) bool {
	if res.Stationary.Reversible == fokkerplanck.Yes {
		return false
	}
	return d.Current.Max > 1e-8*d.Current.Scale && d.Entropy > 1e-8
}

// Difference draws grid minus closed form in two dimensions, or nil where
// there is nothing to draw.
func Difference(res *derivation.Result, d *numbers.Density, meta []figure.Field) *figure.Plot {
	if d.Difference == nil || d.Result.Grid.Dim() != 2 {
		return nil
	}
	data := mapData(res, d, d.Difference.Map)
	data.Quantity = "grid minus closed form"
	return figure.DifferenceMap(data, figure.Settings{
		Title: "Difference from the closed form", Meta: meta,
		Alt: fmt.Sprintf("The density on the %s grid differs from the closed form by at most %.2g of its maximum.", d.Result.Grid, d.Difference.Max),
	})
}

func densityAlt(res *derivation.Result, d *numbers.Density) string {
	var b strings.Builder
	lo, _ := d.Result.Minimum()
	hi, at := d.Result.Maximum()
	fmt.Fprintf(&b, "The stationary density lies between %.3g and %.3g and is largest at %s.", lo, hi, d.Result.Grid.PointText(d.Result.Grid.CenterOf(at)))
	if d.Difference != nil {
		fmt.Fprintf(&b, " Grid and closed form differ by %.2g in L1.", d.Difference.L1)
	}
	if Flows(res, d) {
		fmt.Fprintf(&b, " A stationary current runs, at most %.3g; the entropy production rate is %.4g.", d.Current.Max, d.Entropy)
	}
	return b.String()
}

// GridConvergence draws the distance from the closed form against the number
// of cells, or nil where there is none.
func GridConvergence(cells []float64, l1 []float64, meta []figure.Field) *figure.Plot {
	for _, e := range l1 {
		if !(e > 0) || math.IsInf(e, 1) {
			return nil
		}
	}
	return figure.GridConvergence(figure.GridConvergenceData{
		ErrorLabel: "$L^{1}$ distance", Errors: []figure.GridErrors{{Label: "grid", Cells: cells, Error: l1}},
	}, figure.Settings{Title: "Convergence of the grid", Meta: meta, Alt: fmt.Sprintf("The distance from the closed form falls to %.2g.", l1[len(l1)-1])})
}

// DensityCSV is the density as a table: the place, the density, the closed
// form where there is one, and the current.
func DensityCSV(r *density.Result, diff *density.Difference, cur *density.Current, header string) []byte {
	var b strings.Builder
	fmt.Fprintf(&b, "# %s\n", header)
	g := r.Grid
	var names []string
	for _, a := range g.Axes() {
		names = append(names, a.Name)
	}
	cols := append([]string(nil), names...)
	cols = append(cols, "density")
	if diff != nil {
		cols = append(cols, "closed_form")
	}
	for _, n := range names {
		cols = append(cols, "current_"+n)
	}
	b.WriteString(strings.Join(cols, ",") + "\n")
	for k, p := range r.P {
		for _, x := range g.CenterOf(k) {
			fmt.Fprintf(&b, "%.17g,", x)
		}
		fmt.Fprintf(&b, "%.17g", p)
		if diff != nil {
			fmt.Fprintf(&b, ",%.17g", diff.Exact[k])
		}
		for _, c := range cur.Cells {
			fmt.Fprintf(&b, ",%.17g", c[k])
		}
		b.WriteByte('\n')
	}
	return []byte(b.String())
}

// EpsConvergence draws the distance of the means of the full system from those
// of the limit, with bars of two standard errors.
func EpsConvergence(res *derivation.Result, c *ensemble.Convergence, meta []figure.Field) *figure.Plot {
	d := figure.EpsConvergenceData{Small: res.System.Small, ErrorLabel: "distance of the mean from the limit"}
	alt := ""
	for i, n := range c.Limit.Observables {
		e := figure.EpsErrors{Label: figure.Symbol(n)}
		for _, p := range c.Points[i] {
			v := math.Abs(p.Value)
			if v == 0 {
				continue
			}
			e.Eps = append(e.Eps, p.Eps)
			e.Error = append(e.Error, v)
			e.Low = append(e.Low, v-2*p.StdErr)
			e.High = append(e.High, v+2*p.StdErr)
			d.NoiseFloor = math.Max(d.NoiseFloor, 2*p.StdErr)
		}
		d.Observed = append(d.Observed, e)
		alt += fmt.Sprintf("Mean of %s: rate in %s %s. ", n, res.System.Small, c.Rates[i])
	}
	return figure.EpsConvergence(d, figure.Settings{Title: "Convergence in " + res.System.Small, Alt: strings.TrimSpace(alt), Meta: meta})
}
