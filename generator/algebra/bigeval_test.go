package algebra

import (
	"errors"
	"math"
	"testing"
)

// TestEvalFloat evaluates typed expressions against the math package.
func TestEvalFloat(t *testing.T) {
	x, y, a, th := 0.7, -1.3, 2.1, 0.4
	at := map[string]float64{"x": x, "y": y, "a": a, "theta": th, "D": 0.8, "p": 0, "n": 3, "m": -2}
	for _, c := range []struct {
		in   string
		want float64
	}{
		{"x + y*a", x + y*a},
		{"sin(theta)*cos(x) - tan(theta)", math.Sin(th)*math.Cos(x) - math.Tan(th)},
		{"exp(-x^2/2)/sqrt(2*pi)", math.Exp(-x*x/2) / math.Sqrt(2*math.Pi)},
		{"sqrt(x^2 + y^2)", math.Hypot(x, y)},
		{"sqrt(y^2)", math.Abs(y)},
		{"abs(x*y)", math.Abs(x * y)},
		{"sign(y)*x", -x},
		{"log(a) + log(x)", math.Log(a * x)},
		{"log(x*y*y)", math.Log(x * y * y)},
		{"a^x", math.Pow(a, x)},
		{"(1+x^2)^(-1/2-D)", math.Pow(1+x*x, -1.3)},
		{"exp(sin(x))", math.Exp(math.Sin(x))},
		{"exp(a*cos(theta))", math.Exp(a * math.Cos(th))},
		{"sinh(x) + tanh(y)", math.Sinh(x) + math.Tanh(y)},
		{"erf(x) + gamma(a)", math.Erf(x) + math.Gamma(a)},
		{"integral(exp(-s_^2), s_, 0, x)", math.Erf(x) * math.Sqrt(math.Pi) / 2},
		{"integral(1/(x+s_), s_, 0, 1)", math.Log((x + 1) / x)},
		{"x^n", x * x * x},
		{"y^n", y * y * y},
		{"(sqrt(1+x^2) - x)*(sqrt(1+x^2) + x)", 1},
		{"y^(1/3)", math.Cbrt(y)},
		{"p", 0},
		{"sqrt(p)", 0},
	} {
		r := testRing(t)
		e := mustRead(t, r, c.in)
		got, err := e.EvalFloat(at)
		if err != nil || math.Abs(got-c.want) > 4e-15*(1+math.Abs(c.want)) {
			t.Errorf("%s = %.17g (%v), want %.17g", c.in, got, err, c.want)
		}
	}
}

// TestEvalFloatErrors: what has no finite real value is an error.
func TestEvalFloatErrors(t *testing.T) {
	for _, in := range []string{
		"1/x", "log(x)", "log(y)", "sqrt(y)", "x^(-1/2)", "gamma(x)", "exp(1/p)", "v", "diff(U, x)", "z",
		"exp(exp(theta))", "y^a", "1/(sin(x)^2 + x)", "integral(v, s_, 0, 1)*v",
	} {
		r := testRing(t)
		e := mustRead(t, r, in)
		got, err := e.EvalFloat(map[string]float64{"x": 0, "y": -1, "a": 0.5, "p": 0, "theta": 9})
		if err == nil {
			t.Errorf("%s = %g without an error", in, got)
		}
	}
	r := testRing(t)
	if _, err := mustRead(t, r, "1/(x - 1)").EvalFloat(map[string]float64{"x": 1}); !errors.Is(err, ErrDivisionByZero) {
		t.Errorf("a pole gives %v", err)
	}
	if _, err := mustRead(t, r, "x").EvalFloat(map[string]float64{"x": math.NaN()}); err == nil {
		t.Error("NaN is taken as a value")
	}
}

// TestEvalFloatCancels loses all 16 digits in a naive evaluation.
func TestEvalFloatCancels(t *testing.T) {
	r := testRing(t)
	e := mustRead(t, r, "(exp(x) - 1 - x - x^2/2)/x^3")
	got, err := e.EvalFloat(map[string]float64{"x": 1e-9})
	if want := 1.0/6 + 1e-9/24; err != nil || math.Abs(got-want) > 1e-16 {
		t.Errorf("got %.17g (%v), want %.17g", got, err, want)
	}
}

// TestZeroTest has zeros that the canonical form cannot see, zeros it does
// see, and near misses.
func TestZeroTest(t *testing.T) {
	for _, c := range []struct {
		in   string
		want Verdict
	}{
		{"sin(x)^2 + cos(x)^2 - 1", VerdictZero},
		{"v*diff(v,x) - diff(v,y)*v", VerdictNonZero},
		{"v(x+0,y) - v", VerdictZero},
		{"v(x+1,y) - v", VerdictNonZero},
		{"sqrt(5+2*sqrt(6)) - sqrt(2) - sqrt(3)", VerdictUndecided},
		{"sqrt(5+2*sqrt(6)) - sqrt(2) - sqrt(3) + 10^(-40)", VerdictNonZero},
		{"v(sqrt(5+2*sqrt(6)),y) - v(sqrt(2) + sqrt(3),y)", VerdictUndecided},
		{"abs(x) - x", VerdictNonZero},
		{"abs(a) - a", VerdictZero},
		{"sqrt(x^2) - x", VerdictNonZero},
		{"sqrt(1 - x^2) - 1", VerdictNonZero},
		{"log(x/sqrt(1+x^2) - 3)*y", VerdictUndecided}, // defined nowhere
		{"integral(exp(s_), s_, 0, x) - exp(x) + 1", VerdictUndecided},
		{"integral(exp(s_), s_, 0, x) - exp(x)", VerdictNonZero},
		{"integral(h(s_), s_, 0, x) - x", VerdictUndecided},
		{"exp(x) - 1 - x - x^2/2", VerdictNonZero},
	} {
		r := testRing(t)
		e, err := readExpr(r, c.in)
		if err != nil {
			t.Errorf("%s: %v", c.in, err)
			continue
		}
		if got := e.ZeroTest(); got != c.want {
			t.Errorf("%s is %s, want %s", c.in, got, c.want)
		}
	}
}

func BenchmarkEvalBig(b *testing.B) {
	r := testRing(b)
	e := mustRead(b, r, "v*(D*sin(theta) - exp(-x^2/2)*diff(v,y))/(2*(D^2+x^2)) + log(1+x^2)*(a+x+y)^5")
	at := r.samplePoint(e.Symbols(), 1)
	for b.Loop() {
		if _, err := e.EvalBig(at, 170); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkZeroTest(b *testing.B) {
	r := testRing(b)
	e := mustRead(b, r, "sqrt(5+2*sqrt(6)) - sqrt(2) - sqrt(3)")
	for b.Loop() {
		if e.ZeroTest() != VerdictUndecided {
			b.Fatal("decided")
		}
	}
}
