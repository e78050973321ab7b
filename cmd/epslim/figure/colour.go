package figure

import (
	"encoding/hex"
	"fmt"
	"image/color"
	"math"
)

// ColourMap is a colour map for a heat map.
type ColourMap int

// The colour maps. None of them relies on the difference of red and green.
const (
	Viridis   ColourMap = iota // for densities; perceptually uniform, dark to light
	Cividis                    // for densities; the same to readers with and without colour blindness
	Diverging                  // for differences: blue, white at zero, red
)

// table returns the entries of the map, first to last.
func (m ColourMap) table() []color.RGBA {
	text := viridisHex
	switch m {
	case Cividis:
		text = cividisHex
	case Diverging:
		text = divergingHex
	}
	b, err := hex.DecodeString(text)
	if err != nil { // excluded by a test of each table
		return []color.RGBA{{A: 0xff}}
	}
	out := make([]color.RGBA, len(b)/3)
	for i := range out {
		out[i] = color.RGBA{b[3*i], b[3*i+1], b[3*i+2], 0xff}
	}
	return out
}

// lineColours are the colours of M. Okabe and K. Ito, "Color Universal Design" (2008), in the order
// in which series take them: yellow, which is faint on paper, comes last.
func lineColours() []colour {
	return []colour{
		{0x00, 0x72, 0xb2, blueRole}, // blue
		{0xd5, 0x5e, 0x00, ""},       // vermilion
		{0x00, 0x9e, 0x73, ""},       // bluish green
		{0xcc, 0x79, 0xa7, ""},       // reddish purple
		{0xe6, 0x9f, 0x00, ""},       // orange
		{0x56, 0xb4, 0xe9, ""},       // sky blue
		black,
		{0xf0, 0xe4, 0x42, ""}, // yellow
	}
}

// lineDashes has one entry fewer than lineColours, so that the pairs do not repeat soon.
func lineDashes() [][]float64 {
	return [][]float64{nil, {5, 2}, {1.2, 1.6}, {6, 1.8, 1.2, 1.8}, {9, 2.2}, {3, 1.4, 1.2, 1.4, 1.2, 1.4}, {2.6, 2.6}}
}

// markers are the names of the marker shapes, in the order in which series take them.
var markers = [...]string{"disc", "square", "triangle", "diamond", "cross", "inverted", "plus"}

// seriesStyle is the look of the i-th series.
func seriesStyle(i int) (c colour, dash []float64, marker string) {
	cs, ds := lineColours(), lineDashes()
	return cs[i%len(cs)], ds[i%len(ds)], markers[i%len(markers)]
}

func (c colour) hex() string { return fmt.Sprintf("#%02x%02x%02x", c.r, c.g, c.b) }

// colourScale maps values to entries of a colour map.
type colourScale struct {
	min, max float64
	log      bool
	n        int
}

// scale chooses the range of the colours. A constant field gets a range around its value.
func (h *HeatMap) scale() (colourScale, error) {
	s := colourScale{min: h.Min, max: h.Max, log: h.Log, n: len(h.Map.table())}
	if s.min == 0 && s.max == 0 {
		s.min, s.max = bounds(h.Values)
		if h.Map == Diverging {
			a := math.Max(math.Abs(s.min), math.Abs(s.max))
			s.min, s.max = -a, a
		}
		s.min, s.max = widen(s.min, s.max, h.Log)
	}
	switch {
	case !(s.min < s.max) || math.IsInf(s.max-s.min, 0):
		return s, &DataError{"heat map colour range", -1, fmt.Sprintf("[%v, %v] is not a range", s.min, s.max)}
	case h.Log && s.min <= 0:
		return s, &DataError{"heat map colour range", -1, "logarithmic colours need a positive minimum"}
	case h.Log && h.Map == Diverging:
		return s, &DataError{"heat map colour range", -1, "a diverging map cannot be logarithmic"}
	case h.Map == Diverging && s.min != -s.max:
		return s, &DataError{"heat map colour range", -1, "a diverging map must be centred at zero"}
	}
	return s, nil
}

// index is the entry for a value; values outside the range take the entry at its end.
func (s colourScale) index(v float64) uint8 {
	t := s.at(v)
	return uint8(math.Max(0, math.Min(float64(s.n-1), math.Floor(t*float64(s.n)))))
}

// at maps the range to [0, 1].
func (s colourScale) at(v float64) float64 {
	if s.log {
		return (math.Log(v) - math.Log(s.min)) / (math.Log(s.max) - math.Log(s.min))
	}
	return (v - s.min) / (s.max - s.min)
}

// bounds returns the smallest and the largest of the values, or 0, 0 if there are none.
func bounds(v []float64) (lo, hi float64) {
	for i, a := range v {
		if i == 0 || a < lo {
			lo = a
		}
		if i == 0 || a > hi {
			hi = a
		}
	}
	return lo, hi
}

// widen gives an empty range some extent.
func widen(lo, hi float64, log bool) (float64, float64) {
	if lo < hi {
		return lo, hi
	}
	switch {
	case log:
		return lo / 2, hi * 2
	case lo == 0:
		return -1, 1
	default:
		d := math.Abs(lo) / 2
		return lo - d, hi + d
	}
}
