package figure

import (
	"math"
	"strconv"
)

// tick is a mark on an axis; minor ticks have no label.
type tick struct {
	value float64
	label []run
}

// ticks chooses the marks of a range: as many as fit, where fits tells whether labels that long
// can stand side by side. The factor, if not nil, is to be written at the end of the axis: the
// labels are to be multiplied by it.
func ticks(a *axis, fits func([]tick) bool) (t []tick, factor []run) {
	lo, hi := a.lo, a.hi
	if t = givenTicks(a); len(t) > 0 && fits(t) {
		return t, nil
	}
	switch {
	case a.Log:
		return logTicks(lo, hi, fits), nil
	case a.Pi:
		return piTicks(lo, hi, fits), nil
	default:
		return linearTicks(lo, hi, fits)
	}
}

// givenTicks are the ticks that the plot asks for, as far as they are in the range.
func givenTicks(a *axis) (t []tick) {
	for _, v := range a.Ticks {
		if v >= a.lo && v <= a.hi {
			t = append(t, tick{v, []run{{text: minusSign(strconv.FormatFloat(v, 'g', 4, 64))}}})
		}
	}
	return t
}

// linearTicks has marks at multiples of 1, 2 or 5 times a power of ten.
func linearTicks(lo, hi float64, fits func([]tick) bool) (t []tick, factor []run) {
	exp := int(math.Floor(math.Log10((hi - lo) / 100)))
	for k := 0; k < 12; k++ {
		e := exp + k/3
		mant := []int64{1, 2, 5}[k%3]
		t, factor = multiples(lo, hi, mant, e)
		if len(t) <= 8 && fits(t) {
			return t, factor
		}
	}
	return t, factor
}

// multiples are the multiples of mant*10^e in the range, with their labels.
func multiples(lo, hi float64, mant int64, e int) (t []tick, factor []run) {
	step := float64(mant) * math.Pow(10, float64(e))
	const slack = 1e-9
	first, last := math.Ceil(lo/step-slack), math.Floor(hi/step+slack)
	if last-first > 200 {
		return make([]tick, 201), nil // too many to be of use
	}
	shift := 0 // power of ten taken out of the labels
	if big := math.Max(math.Abs(lo), math.Abs(hi)); big >= 1e5 || big < 1e-2 {
		shift = int(math.Floor(math.Log10(math.Max(math.Abs(first), math.Abs(last)) * step * (1 + slack))))
		factor = []run{{text: "×10"}, {text: signed(shift), script: 1}}
	}
	decimals := max(0, shift-e)
	for i := first; i <= last; i++ {
		v := i * step
		text := strconv.FormatFloat(i*float64(mant)*math.Pow(10, float64(e-shift)), 'f', decimals, 64)
		t = append(t, tick{v, []run{{text: minusSign(text)}}})
	}
	return t, factor
}

// signed is an integer with a proper minus sign.
func signed(i int) string { return minusSign(strconv.Itoa(i)) }

// minusSign replaces a leading hyphen, and drops it from zero.
func minusSign(s string) string {
	if s == "" || s[0] != '-' {
		return s
	}
	for _, c := range s[1:] {
		if c != '0' && c != '.' {
			return "−" + s[1:]
		}
	}
	return s[1:]
}

// piTicks has marks at multiples of pi times a power of two.
func piTicks(lo, hi float64, fits func([]tick) bool) (t []tick) {
	for q := -2; q < 12; q++ { // step 2^q pi
		step := math.Pi * math.Pow(2, float64(q))
		t = nil
		for i := math.Ceil(lo/step - 1e-9); i <= math.Floor(hi/step+1e-9) && len(t) < 20; i++ {
			t = append(t, tick{i * step, piLabel(int(i), q)})
		}
		if len(t) <= 9 && fits(t) {
			break
		}
	}
	return t
}

// piLabel writes i*2^q*pi.
func piLabel(i, q int) []run {
	den := 1
	for ; q > 0; q-- {
		i *= 2
	}
	for ; q < 0; q++ {
		if i%2 == 0 {
			i /= 2
		} else {
			den *= 2
		}
	}
	switch {
	case i == 0:
		return []run{{text: "0"}}
	case i == 1:
		return piOver("", den)
	case i == -1:
		return piOver("−", den)
	}
	return piOver(signed(i), den)
}

func piOver(num string, den int) []run {
	var r []run
	if num != "" {
		r = append(r, run{text: num})
	}
	r = append(r, run{text: "π", italic: true})
	if den > 1 {
		r = append(r, run{text: "/" + strconv.Itoa(den)})
	}
	return r
}

// logTicks has marks at powers of ten, or at 1, 2 and 5 times them on a short range, and unlabelled
// marks at the other multiples between.
func logTicks(lo, hi float64, fits func([]tick) bool) []tick {
	first, last := int(math.Floor(math.Log10(lo)-1e-9)), int(math.Ceil(math.Log10(hi)+1e-9))
	decades := math.Log10(hi / lo)
	if decades < 1.7 || len(logMarks(lo, hi, first, last, 1, []int{1}, false)) < 2 {
		for _, mants := range [][]int{{1, 2, 5}, {1, 3}, {1, 2, 3, 5, 7}} {
			major := logMarks(lo, hi, first, last, 1, mants, false)
			if len(major) > 1 && fits(major) {
				return append(major, logMarks(lo, hi, first, last, 1, []int{1, 2, 3, 4, 5, 6, 7, 8, 9}, true)...)
			}
		}
		if decades < 0.5 { // nearly linear
			t, _ := linearTicks(lo, hi, fits)
			return t
		}
	}
	stride := 1
	major := logMarks(lo, hi, first, last, stride, []int{1}, false)
	for !fits(major) && len(major) > 1 {
		stride++
		major = logMarks(lo, hi, first, last, stride, []int{1}, false)
	}
	if stride > 1 || decades > 8 {
		return append(major, logMarks(lo, hi, first, last, 1, []int{1}, true)...)
	}
	return append(major, logMarks(lo, hi, first, last, 1, []int{2, 3, 4, 5, 6, 7, 8, 9}, true)...)
}

func logMarks(lo, hi float64, first, last, stride int, mants []int, minor bool) (t []tick) {
	for k := first; k <= last; k++ {
		if ((k%stride)+stride)%stride != 0 {
			continue
		}
		for _, m := range mants {
			v := float64(m) * math.Pow(10, float64(k))
			if v < lo*(1-1e-9) || v > hi*(1+1e-9) {
				continue
			}
			var label []run
			if !minor {
				label = powerLabel(m, k, len(mants) > 1 && first >= -4 && last <= 4)
			}
			t = append(t, tick{v, label})
		}
	}
	return t
}

// powerLabel writes m*10^k, as a decimal number where that is short and the axis has such labels.
func powerLabel(m, k int, decimal bool) []run {
	if decimal {
		v := float64(m) * math.Pow(10, float64(k))
		return []run{{text: strconv.FormatFloat(v, 'f', max(0, -k), 64)}}
	}
	r := []run{{text: "10"}, {text: signed(k), script: 1}}
	if m > 1 {
		r[0].text = strconv.Itoa(m) + "·10"
	}
	return r
}
