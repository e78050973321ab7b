package figure

import (
	"fmt"
	"math"
)

// ranges finds the range of each axis and of the colours, and reads the labels of the axes.
func (d *drawing) ranges() error {
	d.ax.Axis, d.ay.Axis = d.X, d.Y
	var err error
	if d.ax.label, err = parseLabel(d.X.Label); err != nil {
		return err
	}
	if d.ay.label, err = parseLabel(d.Y.Label); err != nil {
		return err
	}
	xs, ys := d.extent()
	d.flat = len(xs) == 0
	if err := setRange("x axis", &d.ax, xs, d.padX()); err != nil {
		return err
	}
	if err := setRange("y axis", &d.ay, ys, d.padY()); err != nil {
		return err
	}
	if d.Heat == nil {
		return nil
	}
	if d.scale, err = d.Heat.scale(); err != nil {
		return err
	}
	d.barAx.lo, d.barAx.hi, d.barAx.Log = d.scale.min, d.scale.max, d.scale.log
	d.barAx.label, err = parseLabel(d.Heat.Quantity)
	return err
}

// extent collects the ends of everything that is drawn.
func (d *drawing) extent() (xs, ys []float64) {
	add := func(to *[]float64, v []float64) {
		if len(v) > 0 {
			lo, hi := bounds(v)
			*to = append(*to, lo, hi)
		}
	}
	if h := d.Heat; h != nil {
		add(&xs, h.XEdges)
		add(&ys, h.YEdges)
	} else if f := d.Field; f != nil {
		add(&xs, f.X)
		add(&ys, f.Y)
	}
	for i := range d.Histograms {
		h := &d.Histograms[i]
		heights, errs := h.density()
		add(&xs, h.Edges)
		for k, y := range heights {
			ys = append(ys, 0, y)
			if h.ErrorBars {
				ys = append(ys, y+errs[k])
			}
		}
	}
	for i := range d.Series {
		s := &d.Series[i]
		add(&xs, s.X)
		add(&ys, s.Y)
		add(&ys, d.positive(s.Low))
		add(&ys, s.High)
	}
	for _, l := range d.Levels {
		ys = append(ys, l.Value)
	}
	low, _ := bounds(d.seriesY())
	for i := range d.Slopes {
		if l := d.slopeLine(i); l != nil { // a steep one may leave the box below
			ys = append(ys, math.Max(l[0].y, low/10), math.Max(l[1].y, low/10))
		}
	}
	for i := range d.Paths {
		if !d.X.Periodic {
			add(&xs, d.Paths[i].X)
		}
		if !d.Y.Periodic {
			add(&ys, d.Paths[i].Y)
		}
	}
	return xs, ys
}

// positive drops what cannot be shown on a logarithmic axis: a lower limit of an error bar at or
// below zero reaches down to the end of the axis.
func (d *drawing) positive(v []float64) []float64 {
	if !d.Y.Log {
		return v
	}
	var out []float64
	for _, a := range v {
		if a > 0 {
			out = append(out, a)
		}
	}
	return out
}

func (d *drawing) seriesY() (ys []float64) {
	for i := range d.Series {
		ys = append(ys, d.Series[i].Y...)
	}
	return ys
}

// padX is the part of the range that is left free at the ends of the x axis.
func (d *drawing) padX() float64 {
	if d.Heat != nil || len(d.Histograms) > 0 || d.Field != nil {
		return 0
	}
	if len(d.Slopes) > 0 {
		return 0.05
	}
	for i := range d.Series {
		if s := &d.Series[i]; s.Marks == PointsOnly || s.few() {
			return 0.04
		}
	}
	return 0
}

func (d *drawing) padY() float64 {
	if d.Heat != nil || d.Field != nil {
		return 0
	}
	return 0.06
}

func setRange(part string, a *axis, data []float64, pad float64) error {
	a.lo, a.hi = a.Min, a.Max
	if a.Min == 0 && a.Max == 0 {
		lo, hi := bounds(data)
		if len(data) == 0 {
			lo, hi, pad = 0, 1, 0
			if a.Log {
				lo, hi = 0.1, 1
			}
		}
		if a.Log && lo <= 0 {
			return &DataError{part, -1, fmt.Sprintf("the value %v cannot be shown on a logarithmic axis", lo)}
		}
		zero := a.FromZero && lo >= 0 && !a.Log
		if zero {
			lo = 0
			if hi == 0 {
				hi = 1
			}
		}
		lo, hi = widen(lo, hi, a.Log)
		if a.Log {
			f := math.Pow(hi/lo, pad)
			lo, hi = lo/f, hi*f
		} else {
			by := pad * (hi - lo)
			if !zero {
				lo -= by
			}
			hi += by
		}
		a.lo, a.hi = lo, hi
	}
	switch {
	case math.IsNaN(a.lo) || math.IsNaN(a.hi) || math.IsInf(a.hi-a.lo, 0) || !(a.lo < a.hi):
		return &DataError{part, -1, fmt.Sprintf("[%v, %v] is not a range", a.lo, a.hi)}
	case a.hi-a.lo < 1e-12*math.Max(math.Abs(a.lo), math.Abs(a.hi)):
		return &DataError{part, -1, fmt.Sprintf("the range [%v, %v] is too short to be drawn", a.lo, a.hi)}
	case a.hi-a.lo < 1e-290:
		return &DataError{part, -1, fmt.Sprintf("the range [%v, %v] is too close to zero to be drawn", a.lo, a.hi)}
	case a.Log && a.lo <= 0:
		return &DataError{part, -1, fmt.Sprintf("a logarithmic axis cannot begin at %v", a.lo)}
	}
	return nil
}

// slopeLine is the reference line of a slope, or nil if there are no data. It runs just below the series
// whose own slope, by least squares, is the nearest.
func (d *drawing) slopeLine(i int) []point {
	order, best := d.Slopes[i].Order, math.Inf(1)
	var line []point
	for k := range d.Series {
		s := &d.Series[k]
		fit, ok := s.logSlope()
		if !ok || math.Abs(fit-order) >= best {
			continue
		}
		best = math.Abs(fit - order)
		c := math.Inf(1)
		for j, x := range s.X {
			c = math.Min(c, 0.6*s.Y[j]/math.Pow(x, order))
		}
		lo, hi := bounds(s.X)
		line = []point{{lo, c * math.Pow(lo, order)}, {hi, c * math.Pow(hi, order)}}
	}
	return line
}

// logSlope is the least-squares slope of log y against log x.
func (s *Series) logSlope() (slope float64, ok bool) {
	var mx, my, sxx, sxy float64
	for i, x := range s.X {
		mx += math.Log(x) / float64(len(s.X))
		my += math.Log(s.Y[i]) / float64(len(s.X))
	}
	for i, x := range s.X {
		dx := math.Log(x) - mx
		sxx += dx * dx
		sxy += dx * (math.Log(s.Y[i]) - my)
	}
	return sxy / sxx, sxx > 1e-12
}

// density returns the height of each bin and its standard error; zeros if there are no counts.
func (h *Histogram) density() (heights, errs []float64) {
	n := 0.0
	for _, c := range h.Counts {
		n += c
	}
	heights, errs = make([]float64, len(h.Counts)), make([]float64, len(h.Counts))
	for i, c := range h.Counts {
		if w := h.Edges[i+1] - h.Edges[i]; n > 0 {
			heights[i] = c / (n * w)
			errs[i] = math.Sqrt(c*(1-c/n)) / (n * w)
		}
	}
	return heights, errs
}

// few tells whether each point of a series gets its marker.
func (s *Series) few() bool { return s.Marks == MarksAuto && len(s.X) <= 12 }
