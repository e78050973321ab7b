package figure

import (
	"fmt"
	"path/filepath"
	"strings"
)

// Width is the width of a figure on the page.
type Width int

// The widths that fit the columns of a journal.
const (
	OneColumn Width = iota // 8.5 cm
	FullWidth              // 17 cm
)

// Field is one piece of information that the files of a figure carry unseen: the version, the hash
// of the model text, an option, the command that repeats it.
type Field struct{ Name, Value string }

// Settings are what all kinds of figures have in common. The zero value gives a figure of one column.
type Settings struct {
	Width  Width
	Height float64 // cm; 0 for a height that suits the kind of figure
	DPI    int     // least resolution of the PNG; 0 for 300
	Title  string  // plain text, not drawn: the name of the figure for readers and screen readers
	Alt    string  // plain text: states the finding; when empty, a sentence that says what is plotted
	Meta   []Field // written in this order
}

// Axis describes one axis. The zero value has no label and takes its range from the data.
type Axis struct {
	Label    string  // markup, see the package comment
	Min, Max float64 // range; taken from the data when both are zero
	Log      bool    // logarithmic
	Pi       bool    // ticks at multiples of pi, for angles
	// Ticks are the places of the ticks, if not nil; when their labels do not fit, or none is in the
	// range, the usual ones take over.
	Ticks []float64
	// Periodic says that Min and Max are one and the same place: sample paths are drawn into the
	// range, leaving on one side and coming back on the other. Min and Max must be set.
	Periodic bool
	FromZero bool // the range starts at zero if all data are non-negative
}

// Marks says how the points of a series are drawn.
type Marks int

// The ways of drawing a series.
const (
	MarksAuto  Marks = iota // a line, with a marker at each point if there are few, else at some of them
	LineOnly                // a line
	PointsOnly              // markers
)

// Bounds says how Low and High of a series are drawn.
type Bounds int

// The ways of drawing the uncertainty of a series.
const (
	Band      Bounds = iota // a shaded band
	ErrorBars               // a bar at each point
)

// Series is a set of points joined by a line. It may have one point or none.
type Series struct {
	Label     string // markup; without a label the series is not in the legend
	X, Y      []float64
	Low, High []float64 // lower and upper limit at each point; both or neither
	Bounds    Bounds
	Marks     Marks
}

// Histogram is a bar chart of counts, drawn as a density: count/(total*width of the bin).
type Histogram struct {
	Label  string
	Edges  []float64 // increasing, one more than Counts
	Counts []float64 // non-negative
	// ErrorBars draws the standard error sqrt(c(1-c/n))/(n w) of each bin, where c is the count and n
	// their sum; it assumes independent samples (the binomial variance).
	ErrorBars bool
}

// Slope is a straight reference line C x^Order on two logarithmic axes, drawn just below the data.
type Slope struct {
	Order float64
	Label string // markup; "slope" and the order when empty
}

// Level is a horizontal reference line across the axes.
type Level struct {
	Value float64
	Label string // markup, for the legend
}

// HeatMap is a function that is constant on the cells of a grid. Each cell is drawn as one
// rectangle in one of 256 colours, without smoothing.
type HeatMap struct {
	XEdges, YEdges []float64 // boundaries of the cells, increasing; nx+1 and ny+1 of them
	Values         []float64 // nx*ny values, x fastest
	Quantity       string    // markup: label of the colour bar
	Map            ColourMap
	Log            bool    // logarithmic colours; all values must be positive
	Min, Max       float64 // range of the colours; taken from the data when both are zero
}

// FieldStyle says how a vector field is drawn.
type FieldStyle int

// The ways of drawing a vector field.
const (
	Arrows FieldStyle = iota
	Streamlines
)

// VectorField is a vector field, such as a probability current, on a rectangular lattice of points.
type VectorField struct {
	X, Y  []float64 // places, increasing; nx and ny of them
	U, V  []float64 // components, nx*ny each, x fastest
	Style FieldStyle
	Label string // markup, for the legend
	// Count is about the number of arrows, or of streamlines side by side, along the longer side; 0
	// for 14 arrows or 20 streamlines. Each arrow is the average of the field over its part of the grid.
	Count int
}

// Path is a sample path; on a heat map its start is marked by a disc and its end by a square.
type Path struct {
	Label string // markup, for the legend
	X, Y  []float64
}

// Plot is a figure with one pair of axes. Its parts are drawn in the order heat map, field,
// histograms, bands, series, paths. The zero value is an empty pair of axes.
type Plot struct {
	Settings
	X, Y       Axis
	Aspect     Aspect
	Heat       *HeatMap
	Field      *VectorField
	Histograms []Histogram
	Series     []Series
	Slopes     []Slope
	Levels     []Level
	Paths      []Path
}

// Aspect says how the units of the two axes compare on the page.
type Aspect int

// The aspects.
const (
	// AspectAuto makes the units equal on a heat map whose sides differ by a factor of at most three,
	// and fills the figure otherwise.
	AspectAuto Aspect = iota
	AspectEqual
	AspectFree
)

const (
	pointsPerCm = 72 / 2.54
	labelSize   = 9.0 // points, of axis labels
	tickSize    = 8.0 // of tick labels and the legend
)

// widthPoints is the width on the page in points.
func (w Width) points() float64 {
	if w == FullWidth {
		return 17 * pointsPerCm
	}
	return 8.5 * pointsPerCm
}

// SVG returns the figure as an SVG document. Formulas and labels are text.
func (p *Plot) SVG() ([]byte, error) {
	s, err := p.scene()
	if err != nil {
		return nil, err
	}
	return s.svg(), nil
}

// PNG returns the figure as an image with the resolution of the settings, or a finer one such that
// each cell of a heat map is a whole number of pixels wide.
func (p *Plot) PNG() ([]byte, error) {
	s, err := p.scene()
	if err != nil {
		return nil, err
	}
	dpi := p.DPI
	if dpi <= 0 {
		dpi = 300
	}
	return s.png(float64(dpi))
}

// PDF returns the figure as a document of one page. Text is drawn as outlines, so it looks the same
// everywhere and cannot be searched.
func (p *Plot) PDF() ([]byte, error) {
	s, err := p.scene()
	if err != nil {
		return nil, err
	}
	return s.pdf()
}

// Format returns the figure in the format that a file name or its ending asks for: .svg, .png or .pdf.
func (p *Plot) Format(name string) ([]byte, error) {
	switch strings.ToLower(filepath.Ext("." + strings.TrimPrefix(name, "."))) {
	case ".svg":
		return p.SVG()
	case ".png":
		return p.PNG()
	case ".pdf":
		return p.PDF()
	}
	return nil, &DataError{"file name", -1, fmt.Sprintf("%q ends in none of .svg, .png and .pdf", name)}
}

// File is a file of a figure. Its name has no folder.
type File struct {
	Name string
	Data []byte
}

// Files returns the figure in all its forms: base.svg, base.png, base.pdf, and the files of [Plot.TeX].
func (p *Plot) Files(base string) ([]File, error) {
	var out []File
	for _, f := range []struct {
		suffix string
		write  func() ([]byte, error)
	}{{".svg", p.SVG}, {".png", p.PNG}, {".pdf", p.PDF}} {
		data, err := f.write()
		if err != nil {
			return nil, err
		}
		out = append(out, File{base + f.suffix, data})
	}
	tex, err := p.TeX(base)
	if err != nil {
		return nil, err
	}
	return append(out, tex...), nil
}
