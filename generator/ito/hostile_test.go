package ito

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"epslim/generator/ito/diagnostic"
)

// TestHostileModels reads short models that would take forever, or all memory,
// if they were worked out. What matters is that each comes to an end; which of
// them are within the limits may change, and those that are far beyond may not.
func TestHostileModels(t *testing.T) {
	chain := func(n int, first, format string) string {
		var b strings.Builder
		b.WriteString("let a0 = " + first + "\n")
		for i := 1; i < n; i++ {
			fmt.Fprintf(&b, strings.ReplaceAll(format, "$", "a%[2]d")+"\n", i, i-1)
		}
		return b.String()
	}
	sum := func(n int, format string) string {
		var b strings.Builder
		b.WriteString("let q = 0")
		for i := range n {
			fmt.Fprintf(&b, format, i+1)
		}
		return b.String()
	}
	nest := func(n int, open, inner string) string {
		return "let q = " + strings.Repeat(open, n) + inner + strings.Repeat(")", n)
	}
	for _, c := range []struct {
		name, text string
		code       diagnostic.Code // "" when it is within the limits
	}{
		{"tower", "let q = 9^9^9^9", diagnostic.TooComplex},
		{"digits", "let q = 2^100001", diagnostic.TooComplex},
		{"power of a sum", "let q = (x + y + k)^100000", diagnostic.TooComplex},
		{"squares of squares", chain(60, "x + y", "let a%[1]d = $^2 + 1"), diagnostic.TooComplex},
		{"squares of monomials", chain(60, "3*x", "let a%[1]d = $*$"), diagnostic.TooComplex},
		{"rational squares", chain(60, "x + y", "let a%[1]d = $*(x + $)/(1 + $)"), diagnostic.TooComplex},
		{"nested roots", chain(60, "x + y", "let a%[1]d = sqrt(1 + $) + $"), diagnostic.TooComplex},
		{"nested sines", nest(90, "sin(", "x"), diagnostic.TooComplex},
		{"nested roots in line", nest(90, "sqrt(1 + ", "x"), diagnostic.TooComplex},
		{"nested exponentials by name", chain(60, "x", "let a%[1]d = exp($)"), diagnostic.TooComplex},
		{"continued fraction", nest(90, "1/(x + ", "y"), ""},
		{"many denominators", sum(400, " + 1/(x + %d)"), diagnostic.TooComplex},
		{"many sines", sum(800, " + sin(%d*x)"), ""},
		{"doubled abbreviations", chain(1000, "x", "let a%[1]d = $ + $"), ""},
		{"doubled functions", "function f0(x) = 1\n" + func() string {
			var b strings.Builder
			for i := 1; i < 200; i++ {
				fmt.Fprintf(&b, "function f%d(x) = f%d + f%d - 1 positive\n", i, i-1, i-1)
			}
			return b.String()
		}(), ""},
		{"high derivative", "let q = diff(sin(x^2)*exp(x)/(1 + x^2), x, 12)", ""},
		{"derivative of high order", "let q = diff(exp(x^2), x, 12, y, 12)", diagnostic.BadDerivative},
		{"power of a cosine", "let q = cos(x)^500", ""},
		{"large order", "let q = besseli(1000000, x) + gamma(x + 100000)", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Parse("m", []byte(base+c.text), Options{})
			var errs ErrorList
			errors.As(err, &errs)
			switch {
			case c.code == "" && err != nil:
				t.Errorf("%.300v", err)
			case c.code != "" && (len(errs) == 0 || errs[0].Code != c.code):
				t.Errorf("got %.300v, want %s", err, c.code)
			}
		})
	}
}
