package figure

import (
	"fmt"
	"math"
)

// check finds data that cannot be drawn.
func (p *Plot) check() error {
	if math.IsNaN(p.Height) || p.Height < 0 || p.Height > 100 {
		return &DataError{"settings height", -1, fmt.Sprintf("%v cm is not a height between 0 and 100", p.Height)}
	}
	if p.DPI < 0 || p.DPI > 2400 {
		return &DataError{"settings resolution", -1, fmt.Sprintf("%d dots an inch is not between 0 and 2400", p.DPI)}
	}
	for _, a := range []struct {
		part string
		axis Axis
	}{{"x axis", p.X}, {"y axis", p.Y}} {
		if len(a.axis.Ticks) > 0 {
			if err := checkIncreasing(a.part+" ticks", a.axis.Ticks, 1); err != nil {
				return err
			}
		}
		if err := checkFinite(a.part+" range", []float64{a.axis.Min, a.axis.Max}); err != nil {
			return err
		}
		if a.axis.Periodic && (!(a.axis.Min < a.axis.Max) || a.axis.Log) {
			return &DataError{a.part, -1, "a periodic axis must be linear and needs its range"}
		}
	}
	if len(p.Slopes) > 0 && !(p.X.Log && p.Y.Log) {
		return &DataError{"slopes", -1, "a reference slope needs two logarithmic axes"}
	}
	if p.Heat != nil {
		if err := p.Heat.check(); err != nil {
			return err
		}
	}
	if p.Field != nil {
		if err := p.Field.check(); err != nil {
			return err
		}
		if p.X.Log || p.Y.Log {
			return &DataError{"field", -1, "cannot be drawn on logarithmic axes"}
		}
	}
	for i := range p.Histograms {
		if err := p.Histograms[i].check(); err != nil {
			return err
		}
	}
	for i := range p.Series {
		if err := p.Series[i].check(p.X.Log, p.Y.Log); err != nil {
			return err
		}
	}
	for i, s := range p.Slopes {
		if err := checkFinite(fmt.Sprintf("slope %d order", i), []float64{s.Order}); err != nil {
			return err
		}
	}
	for i, l := range p.Levels {
		v := []float64{l.Value}
		part := fmt.Sprintf("level %d", i)
		if err := checkPoints(part, v, v, false, p.Y.Log); err != nil {
			return err
		}
	}
	for i := range p.Paths {
		if err := p.Paths[i].check(p.X.Log, p.Y.Log); err != nil {
			return err
		}
	}
	return nil
}

// maxCells bounds the cells of a heat map, so that a mistaken grid does not exhaust the memory.
const maxCells = 1 << 26

func (h *HeatMap) check() error {
	if err := checkIncreasing("heat map x edges", h.XEdges, 2); err != nil {
		return err
	}
	if err := checkIncreasing("heat map y edges", h.YEdges, 2); err != nil {
		return err
	}
	nx, ny := len(h.XEdges)-1, len(h.YEdges)-1
	if nx > maxCells/ny {
		return &DataError{"heat map", -1, fmt.Sprintf("%d by %d cells are more than %d", nx, ny, maxCells)}
	}
	if err := checkLength("heat map values", h.Values, nx*ny); err != nil {
		return err
	}
	if err := checkFinite("heat map values", h.Values); err != nil {
		return err
	}
	if err := checkFinite("heat map colour range", []float64{h.Min, h.Max}); err != nil {
		return err
	}
	if h.Log {
		return checkPositive("heat map values", h.Values)
	}
	return nil
}

func checkPositive(part string, v []float64) error {
	for i, a := range v {
		if !(a > 0) {
			return &DataError{part, i, fmt.Sprintf("%v has no logarithm", a)}
		}
	}
	return nil
}

func (f *VectorField) check() error {
	if err := checkIncreasing("field x", f.X, 2); err != nil {
		return err
	}
	if err := checkIncreasing("field y", f.Y, 2); err != nil {
		return err
	}
	for _, c := range []struct {
		part string
		v    []float64
	}{{"field u", f.U}, {"field v", f.V}} {
		if err := checkLength(c.part, c.v, len(f.X)*len(f.Y)); err != nil {
			return err
		}
		if err := checkFinite(c.part, c.v); err != nil {
			return err
		}
	}
	if f.Count < 0 || f.Count > 200 {
		return &DataError{"field count", -1, fmt.Sprintf("%d is not between 0 and 200", f.Count)}
	}
	return nil
}

func (h *Histogram) check() error {
	part := fmt.Sprintf("histogram %q", h.Label)
	if len(h.Edges) == 0 && len(h.Counts) == 0 {
		return nil
	}
	if err := checkIncreasing(part+" edges", h.Edges, 2); err != nil {
		return err
	}
	if err := checkLength(part+" counts", h.Counts, len(h.Edges)-1); err != nil {
		return err
	}
	for i, c := range h.Counts {
		if !(c >= 0) || math.IsInf(c, 0) {
			return &DataError{part + " counts", i, fmt.Sprintf("%v is not a count", c)}
		}
	}
	return nil
}

func (s *Series) check(xLog, yLog bool) error {
	part := fmt.Sprintf("series %q", s.Label)
	if err := checkPoints(part, s.X, s.Y, xLog, yLog); err != nil {
		return err
	}
	if s.Low == nil && s.High == nil {
		return nil
	}
	if err := checkLength(part+" low", s.Low, len(s.X)); err != nil {
		return err
	}
	if err := checkLength(part+" high", s.High, len(s.X)); err != nil {
		return err
	}
	for i := range s.Low {
		for _, e := range []float64{s.Low[i], s.High[i]} {
			if math.IsNaN(e) || math.IsInf(e, 0) {
				return &DataError{part + " limits", i, fmt.Sprintf("the value is %v, not a finite number", e)}
			}
		}
		if s.Low[i] > s.High[i] {
			return &DataError{part + " limits", i, fmt.Sprintf("the lower limit %v exceeds the upper one, %v", s.Low[i], s.High[i])}
		}
	}
	return nil
}

func (p *Path) check(xLog, yLog bool) error {
	return checkPoints(fmt.Sprintf("path %q", p.Label), p.X, p.Y, xLog, yLog)
}

func checkPoints(part string, x, y []float64, xLog, yLog bool) error {
	if len(x) != len(y) {
		return &DataError{part, -1, fmt.Sprintf("has %d x values and %d y values", len(x), len(y))}
	}
	for _, c := range []struct {
		part string
		v    []float64
		log  bool
	}{{part + " x", x, xLog}, {part + " y", y, yLog}} {
		if err := checkFinite(c.part, c.v); err != nil {
			return err
		}
		if c.log {
			if err := checkPositive(c.part, c.v); err != nil {
				return err
			}
		}
	}
	return nil
}
