package algebra

import (
	"errors"
	"testing"
)

// bytesChooser lets fuzzing bytes choose; it repeats them when they run out.
func bytesChooser(data []byte) chooser {
	i := 0
	return func(n int) int {
		if len(data) == 0 {
			return 0
		}
		b := int(data[i%len(data)]) + i/len(data)
		i++
		return b % n
	}
}

// FuzzTree runs checkTree on trees that the fuzzer grows:
// go test -fuzz FuzzTree -fuzztime 60s
func FuzzTree(f *testing.F) {
	for _, s := range []string{"", "\x01\x02\x03\x04", "\x05\x0a\x01\x07\x0c\x02\x0f", "\x08\x03\x0d\x0c\x00\x09\x04\x0b\x02", "\x08\x0e\x0f\x01\x02\x05\x06\x07\x0b\x0c\x0d"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		a := bytesChooser(data).generate(3)
		if err := checkTree(t, a); err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("%s: %v", a, err)
		}
	})
}

// FuzzRead takes source text as it comes: nothing but errors may come out of
// the package for what it cannot make, and what is printed reads back.
func FuzzRead(f *testing.F) {
	for _, c := range hardZeros {
		f.Add(c.in)
	}
	for _, s := range []string{"0^0", "0^(-1)", "1/0", "sqrt(-1)", "log(0)", "log(-x^2)", "gamma(-3)", "x^(1/0)", "(-8)^(1/3)", "((x))^-1",
		"besseli(0,0)", "tan(pi/2)", "2^(10^9)", "x^1000000", "(x+y)^5000", "10^400*x", "x^(1/999983)", "exp(exp(exp(x)))", "abs(abs(x))", "sign(0)"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if len(s) > 200 {
			return
		}
		r := testRing(t)
		err := r.WithBudget(testSteps, func() error {
			e, err := readExpr(r, s)
			if err != nil {
				return nil
			}
			if err := checkCanonical(e); err != nil {
				return err
			}
			if e.Size() > 200 {
				return nil
			}
			return checkPrinted(r, e)
		})
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("%q: %v", s, err)
		}
	})
}
