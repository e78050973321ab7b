package ito

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
)

// checkReadable pastes every expression of a system, as the algebra prints it,
// back into the model and expects the same expression.
func checkReadable(t *testing.T, s *System, text string) {
	t.Helper()
	exprs := expressions(s)
	var b strings.Builder
	b.WriteString(text)
	for i, e := range exprs {
		b.WriteString("\nlet reread" + itoa(i) + " = " + e.String())
	}
	again, err := Parse("m", []byte(b.String()), Options{})
	if err != nil {
		var errs ErrorList
		errors.As(err, &errs)
		for _, d := range errs {
			switch d.Code {
			case diagnostic.Duplicate, diagnostic.NestedTooDeep, diagnostic.StatementLong, diagnostic.LineTooLong, diagnostic.TooComplex, diagnostic.TooMany:
				return // the added lines are what is wrong, and not because they cannot be read
			}
		}
		t.Fatalf("printed expressions cannot be read:\n%s\n%v", b.String(), err)
	}
	// Both forms are in the new ring: the text was read again, too.
	at := len(again.Lets) - len(exprs)
	for i, e := range expressions(again)[:len(exprs)] {
		got := again.Lets[at+i].Value
		if !got.Equal(e) && got.Sub(e).ZeroTest() == algebra.VerdictNonZero {
			t.Fatalf("%s\nreads as\n%s\nin\n%s", e, got, text)
		}
	}
}

// expressions lists those of the equations and claims, and then the abbreviations.
func expressions(s *System) (list []algebra.Expr) {
	for _, e := range s.Equations {
		list = append(list, e.Drift)
		list = append(list, e.Noise...)
	}
	for _, c := range s.Claims {
		list = append(list, c.Right)
	}
	for _, l := range s.Lets {
		list = append(list, l.Value)
	}
	return list
}

// TestPrintedExpressionsAreReadable does so for all models.
func TestPrintedExpressionsAreReadable(t *testing.T) {
	files, _ := filepath.Glob("testdata/models/*.ito")
	more, _ := filepath.Glob("templates/*.ito")
	for _, file := range append(files, more...) {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		s, err := Parse(file, text, Options{})
		if err != nil {
			t.Fatal(err)
		}
		checkReadable(t, s, string(text))
	}
	model := base + "slow z\ndz = 0 dt\nfunction v(x, z)\nfunction g(x)\n"
	for _, e := range []string{
		"v(x + 1, z)", "diff(v(x + 1, z), x)", "diff(v(2*x, x*z), x, 2, z)", "g(x)^k*diff(g, x, 3)", "x^(1/3) - x^(-k)",
		"besseli(1, x)/besseli(0, x)", "erf(x)*exp(-x^2)", "abs(x)*sign(z)", "tan(x)/tanh(x)", "sqrt(1 + x^2)/sqrt(k)", "log(k*(1 + x^2))",
		"at(diff(v, x), x, 2, z, x)", "0.1*pi^2", "(1 + x)^k", "gamma(k + 1/3)",
		"integral(exp(-s^2*v(s, z)), s, 0, x)", "x*integral(integral(log(1 + s*u), s, 0, u)/(1 + u^2), u, x, 1)", "diff(integral(g(s)*exp(s), s, 0, x), x)",
		"integral(exp(-y^2), y, 0, x)", "polygamma(1, x^2 + 1)",
	} {
		checkReadable(t, mustParse(t, model+"let q = "+e), model+"let q = "+e)
	}
}
