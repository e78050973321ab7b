// Package figure draws the figures of a result: lines with confidence bands or error bars, heat
// maps with a current or sample paths on top, histograms against a curve, and convergence plots.
//
// It owns the layout (margins, ticks, legend, colour bar) and its four writers: SVG, PNG, PDF, and a
// pgfplots fragment with the CSV it reads. The first three draw one and the same list of
// shapes, so they cannot differ in where a point lands. It takes plain numbers and knows nothing of
// models, solvers or files; it imports the standard library, the outline reader and rasteriser of
// golang.org/x/image, and the Liberation fonts (codeberg.org/go-fonts/liberation), whose metrics
// are those of Arial and Helvetica, so that text measured here fits wherever an SVG is shown.
//
// A plotting library is not used: one layout for all formats keeps axes and cells together to the last
// digit, labels need Greek and scripts in each of them, and an image must fill its box in an SVG.
//
// A caller fills one of the data structs of kinds.go and calls its constructor, or composes a [Plot]
// from the parts of plot.go; the zero value of every settings field works:
//
//	p := figure.DensityMap(figure.DensityMapData{
//		XLabel: "$x$", YLabel: "$y$", Quantity: "$p_s(x,y)$",
//		XEdges: xe, YEdges: ye, Density: p,
//	}, figure.Settings{Alt: "The walkers gather where they are slow."})
//	svg, err := p.SVG()
//
// # Labels
//
// Labels are plain text with formulas between dollar signs, in a small part of the language of TeX:
// letters are italic, _ and ^ set a subscript and a superscript (one character or a group in
// braces), Greek letters and a few symbols are written by name (\theta, \varepsilon, \partial,
// \langle) or as themselves, \mathrm{...} is upright. [Plain] escapes a text for use as a label and
// [Symbol] turns the name of a variable or parameter into one.
//
// # Units and order
//
// Lengths inside the package are points (1/72 inch) with y downwards; public sizes are centimetres.
// Arrays on a grid of nx by ny cells are stored with x fastest: cell (i, j) is at j*nx+i.
//
// # Determinism
//
// The output is a function of the plot alone: no clock, no random numbers, no map order. The
// same plot gives the same bytes on every run.
package figure
