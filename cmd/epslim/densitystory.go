package main

import (
	"fmt"
	"math"
	"strings"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/plots"
	"epslim/cmd/epslim/present"
)

// densityStory tells what was found of the stationary density.
func densityStory(res *derivation.Result, d *numbers.Density) *present.Story {
	st := &present.Story{Title: res.System.Title}
	for _, s := range present.Tell(res).Sections {
		if s.ID == "stationary" {
			st.Sections = append(st.Sections, s)
		}
	}
	rows := [][2]string{
		{"grid", d.Result.Grid.String() + " cells on " + windowText(res, d.Window)},
		{"solver", solverText(d)},
		{"mass", fmt.Sprintf("%.15g", d.Result.Mass())},
	}
	lo, at := d.Result.Minimum()
	hi, top := d.Result.Maximum()
	g := d.Result.Grid
	rows = append(rows,
		[2]string{"smallest", fmt.Sprintf("%.6g at %s", lo, g.PointText(g.CenterOf(at)))},
		[2]string{"largest", fmt.Sprintf("%.6g at %s", hi, g.PointText(g.CenterOf(top)))},
	)
	mean, cov := d.Result.Moments()
	for i, v := range res.System.Slow {
		rows = append(rows, [2]string{"mean of " + v.Name, fmt.Sprintf("%.8g, standard deviation %.8g", mean[i], math.Sqrt(math.Max(cov[i][i], 0)))})
	}
	for _, b := range openSides(res, d) {
		rows = append(rows, [2]string{"mass near " + b[0], b[1]})
	}
	if plots.Flows(res, d) {
		rows = append(rows,
			[2]string{"current", fmt.Sprintf("at most %.6g, at %s", d.Current.Max, g.PointText(g.CenterOf(d.Current.MaxAt)))},
			[2]string{"entropy production", fmt.Sprintf("%.6g per unit of time", d.Entropy)})
	} else {
		rows = append(rows, [2]string{"current", fmt.Sprintf("none beyond the error of the grid (%.2g)", d.Current.Max)})
	}
	if d.Difference != nil {
		_, why := d.Verdict()
		rows = append(rows, [2]string{"closed form", why})
	}
	t := present.Table{}
	for _, r := range rows {
		t.Rows = append(t.Rows, [][]present.Span{{{Text: r[0]}}, {{Text: r[1]}}})
	}
	st.Sections = append(st.Sections, present.Section{ID: "grid", Title: "On a grid", Blocks: []present.Block{t}})
	return st
}

func solverText(d *numbers.Density) string {
	s := d.Result.Method.String()
	if d.Result.Iterations > 0 {
		s += fmt.Sprintf(", %d iterations", d.Result.Iterations)
	}
	return s + fmt.Sprintf(", residual %.2g, %s", d.Result.Residual, d.Result.Outcome)
}

func windowText(res *derivation.Result, w *numbers.Window) string {
	var parts []string
	for d, v := range res.System.Slow {
		s := fmt.Sprintf("%s in [%.6g, %.6g]", v.Name, w.Lo[d], w.Hi[d])
		if w.Chosen[d] {
			s += " (window chosen)"
		}
		parts = append(parts, s)
	}
	return strings.Join(parts, ", ")
}

// openSides reports the mass near sides that stand in for infinity.
func openSides(res *derivation.Result, d *numbers.Density) [][2]string {
	var out [][2]string
	for i, sides := range d.Result.Boundary() {
		for q, b := range sides {
			if d.Window.Open[i][q] {
				x := []float64{d.Window.Lo[i], d.Window.Hi[i]}[q]
				out = append(out, [2]string{fmt.Sprintf("%s = %.6g", res.System.Slow[i].Name, x), fmt.Sprintf("%.2g", b.Mass)})
			}
		}
	}
	return out
}
