package figure

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
)

// column is one column of a CSV file; shorter ones are filled up with nan, which plotting programs skip.
type column struct {
	name string
	data []float64
}

// table is a CSV file in the making.
type table struct {
	columns []column
}

// add appends a column and returns its name, which is made unique.
func (t *table) add(name string, data []float64) string {
	unique := name
	for k := 2; t.has(unique); k++ {
		unique = name + "_" + strconv.Itoa(k)
	}
	t.columns = append(t.columns, column{unique, data})
	return unique
}

func (t *table) has(name string) bool {
	for _, c := range t.columns {
		if c.name == name {
			return true
		}
	}
	return false
}

// share returns the name of a column that begins with the given stem and has the same data, or adds one.
func (t *table) share(stem string, data []float64) string {
	for _, c := range t.columns {
		if strings.HasPrefix(c.name, stem) && equal(c.data, data) {
			return c.name
		}
	}
	return t.add(stem, data)
}

func equal(a, b []float64) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// csv writes the table: a line of provenance behind a #, the names, the rows. Numbers have the digits
// that give back the same value.
func (t *table) csv(meta []Field) []byte {
	var b strings.Builder
	fmt.Fprintf(&b, "# %s\n", metaJSON(meta))
	rows := 0
	for i, c := range t.columns {
		if i > 0 {
			b.WriteByte(',')
		}
		b.WriteString(c.name)
		rows = max(rows, len(c.data))
	}
	b.WriteByte('\n')
	for r := range rows {
		for i, c := range t.columns {
			if i > 0 {
				b.WriteByte(',')
			}
			v := math.NaN()
			if r < len(c.data) {
				v = c.data[r]
			}
			if math.IsNaN(v) {
				b.WriteString("nan")
			} else {
				b.WriteString(strconv.FormatFloat(v, 'g', -1, 64))
			}
		}
		b.WriteByte('\n')
	}
	return []byte(b.String())
}

// columnName turns a label into the name of a column: ASCII letters, digits and underscores.
func columnName(label, otherwise string) string {
	runs, err := parseLabel(label)
	if err != nil {
		return otherwise
	}
	var b strings.Builder
	for _, c := range plainText(runs) {
		name, greek := nameOf(c)
		switch {
		case c < unicode.MaxASCII && (unicode.IsLetter(c) || unicode.IsDigit(c)):
			b.WriteRune(c)
		case greek && unicode.IsLetter(c):
			b.WriteString(name)
		default:
			b.WriteByte('_')
		}
	}
	name := b.String()
	for strings.Contains(name, "__") {
		name = strings.ReplaceAll(name, "__", "_")
	}
	name = strings.Trim(name, "_")
	if name == "" || unicode.IsDigit(rune(name[0])) && len(name) == 1 {
		return otherwise
	}
	if unicode.IsDigit(rune(name[0])) {
		name = otherwise + "_" + name
	}
	return name
}

// seriesColumns are the names of the columns of a series.
type seriesColumns struct{ x, y, low, high string }

// dataTable is the table of the histograms and series of a plot.
func (d *drawing) dataTable() (t table, hists, series []seriesColumns) {
	xName := columnName(d.X.Label, "x")
	for i := range d.Histograms {
		h := &d.Histograms[i]
		heights, errs := h.density()
		name := columnName(h.Label, "histogram")
		var c seriesColumns
		left := h.Edges
		c.x = t.share(name+"_edge", left)
		t.add(name+"_count", h.Counts)
		c.y = t.add(name+"_density", repeatLast(heights))
		if h.ErrorBars {
			c.low = t.add(name+"_centre", centres(h.Edges))
			c.high = t.add(name+"_stderr", errs)
		}
		hists = append(hists, c)
	}
	for i := range d.Series {
		s := &d.Series[i]
		name := columnName(s.Label, "y")
		c := seriesColumns{x: t.share(xName, s.X)}
		c.y = t.add(name, s.Y)
		if len(s.Low) > 0 {
			c.low, c.high = t.add(name+"_low", s.Low), t.add(name+"_high", s.High)
		}
		series = append(series, c)
	}
	return t, hists, series
}

// repeatLast appends the last value once more, for a step plot over edges.
func repeatLast(v []float64) []float64 {
	if len(v) == 0 {
		return nil
	}
	return append(append([]float64{}, v...), v[len(v)-1])
}

// centres are the midpoints of neighbouring edges.
func centres(edges []float64) []float64 {
	out := make([]float64, max(0, len(edges)-1))
	for i := range out {
		out[i] = edges[i] + (edges[i+1]-edges[i])/2
	}
	return out
}

// heatTable has one row for each cell, x fastest: its centre and its value.
func (d *drawing) heatTable() (t table, x, y, value string) {
	h := d.Heat
	nx, ny := len(h.XEdges)-1, len(h.YEdges)-1
	xs, ys := make([]float64, nx*ny), make([]float64, nx*ny)
	cx, cy := centres(h.XEdges), centres(h.YEdges)
	for k := range xs {
		xs[k], ys[k] = cx[k%nx], cy[k/nx]
	}
	x = t.add(columnName(d.X.Label, "x"), xs)
	y = t.add(columnName(d.Y.Label, "y"), ys)
	value = t.add(columnName(h.Quantity, "value"), h.Values)
	return t, x, y, value
}

// CSV returns the numbers of the plot: the cells of the heat map, one a row, if there is one, else the
// histograms and the series side by side. The first line is the metadata behind a #.
func (p *Plot) CSV() ([]byte, error) {
	d, err := p.prepare()
	if err != nil {
		return nil, err
	}
	if p.Heat != nil {
		t, _, _, _ := d.heatTable()
		return t.csv(p.Meta), nil
	}
	t, _, _ := d.dataTable()
	return t.csv(p.Meta), nil
}
