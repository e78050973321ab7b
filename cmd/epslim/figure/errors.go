package figure

import (
	"fmt"
	"math"
)

// DataError reports data that cannot be drawn: which part of the plot, which element, and why.
type DataError struct {
	Part   string // for example `series "grid" y`
	Index  int    // index of the offending element, or -1 when the part as a whole is wrong
	Reason string
}

func (e *DataError) Error() string {
	if e.Index < 0 {
		return fmt.Sprintf("figure: %s: %s", e.Part, e.Reason)
	}
	return fmt.Sprintf("figure: %s[%d]: %s", e.Part, e.Index, e.Reason)
}

// LabelError reports a label that does not follow the syntax given in the package comment.
type LabelError struct {
	Label  string
	Reason string
}

func (e *LabelError) Error() string {
	return fmt.Sprintf("figure: label %q: %s", e.Label, e.Reason)
}

// checkFinite returns a DataError for the first element that is not a finite number.
func checkFinite(part string, v []float64) error {
	for i, a := range v {
		if math.IsNaN(a) || math.IsInf(a, 0) {
			return &DataError{part, i, fmt.Sprintf("the value is %v, not a finite number", a)}
		}
	}
	return nil
}

// checkLength returns a DataError unless v has want elements.
func checkLength(part string, v []float64, want int) error {
	if len(v) != want {
		return &DataError{part, -1, fmt.Sprintf("has %d values, want %d", len(v), want)}
	}
	return nil
}

// checkIncreasing returns a DataError unless v has at least n strictly increasing elements.
func checkIncreasing(part string, v []float64, n int) error {
	if len(v) < n {
		return &DataError{part, -1, fmt.Sprintf("has %d values, want at least %d", len(v), n)}
	}
	if err := checkFinite(part, v); err != nil {
		return err
	}
	for i := 1; i < len(v); i++ {
		if !(v[i] > v[i-1]) {
			return &DataError{part, i, fmt.Sprintf("%v does not exceed the value before it, %v", v[i], v[i-1])}
		}
	}
	return nil
}
