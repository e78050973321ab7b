package algebra

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
)

// tape counts operations and evaluates on the fly.
type tape struct {
	at  map[string]float64
	ops []string
}

func (t *tape) op(name string, v float64) float64 { t.ops = append(t.ops, name); return v }

func (t *tape) Const(c float64) float64 { return c }
func (t *tape) Input(name string) (float64, error) {
	v, ok := t.at[name]
	if !ok {
		return 0, fmt.Errorf("no input %s", name)
	}
	return v, nil
}
func (t *tape) Add(x, y float64) float64         { return t.op("+", x+y) }
func (t *tape) Sub(x, y float64) float64         { return t.op("-", x-y) }
func (t *tape) Mul(x, y float64) float64         { return t.op("*", x*y) }
func (t *tape) Div(x, y float64) float64         { return t.op("/", x/y) }
func (t *tape) Neg(x float64) float64            { return t.op("neg", -x) }
func (t *tape) PowInt(x float64, n int) float64  { return t.op("^n", math.Pow(x, float64(n))) }
func (t *tape) Pow(x, y float64) float64         { return t.op("^", math.Pow(x, y)) }
func (t *tape) Sqrt(x float64) float64           { return t.op("sqrt", math.Sqrt(x)) }
func (t *tape) Exp(x float64) float64            { return t.op("exp", math.Exp(x)) }
func (t *tape) Log(x float64) float64            { return t.op("log", math.Log(x)) }
func (t *tape) Sin(x float64) float64            { return t.op("sin", math.Sin(x)) }
func (t *tape) Cos(x float64) float64            { return t.op("cos", math.Cos(x)) }
func (t *tape) Sinh(x float64) float64           { return t.op("sinh", math.Sinh(x)) }
func (t *tape) Cosh(x float64) float64           { return t.op("cosh", math.Cosh(x)) }
func (t *tape) Tanh(x float64) float64           { return t.op("tanh", math.Tanh(x)) }
func (t *tape) Abs(x float64) float64            { return t.op("abs", math.Abs(x)) }
func (t *tape) Erf(x float64) float64            { return t.op("erf", math.Erf(x)) }
func (t *tape) Gamma(x float64) float64          { return t.op("gamma", math.Gamma(x)) }
func (t *tape) BesselI(n int, x float64) float64 { return t.op("besseli", math.NaN()) }
func (t *tape) Sign(x float64) float64 {
	switch {
	case x > 0:
		return t.op("sign", 1)
	case x < 0:
		return t.op("sign", -1)
	}
	return t.op("sign", x)
}

// TestLowerTo compares lowered values with the extended precision evaluation
// and bounds the number of operations.
func TestLowerTo(t *testing.T) {
	at := map[string]float64{"x": 0.7, "y": -1.3, "z": 0.2, "a": 2.1, "theta": 0.4, "D": 0.8, "c": -0.6, "n": 3, "m": -2, "omega_": 1.7, "b": 0.9}
	for _, c := range []struct {
		in  string
		ops int // at most
	}{
		{"x", 0},
		{"x^5 + 3*x^4 - 2*x^3 + x^2 - 7*x + 1", 9},
		{"(1+x)^7", 2},
		{"a*x^2 + a*x*y + a*y^2", 7},
		{"sin(theta)*cos(x) - cos(2*theta)", 6},
		{"sin(theta)^2/(2 + cos(theta))", 7},
		{"exp(-x^2/2)/sqrt(2*pi)", 6},
		{"sqrt(x^2 + y^2)*(x^2 + y^2)", 6},
		{"y^(1/3) + a^(2/3)", 7},
		{"y^n + a^x", 3},
		{"abs(y)*sign(y)", 3},
		{"log(a) + erf(x) + gamma(a)", 5},
		{"(1+x^2)^(-1/2-D)", 8},
		{"D/(2*(D^2+omega_^2)) + omega_/(2*(D^2+omega_^2))", 9},
		{"-x - y - x*y", 5},
		{"a^(3/2)", 2},
		{"exp(sin(x))*exp(a*cos(theta))", 5},
		{"1/x^3", 2},
		{"-1/3*x", 1},
	} {
		r := testRing(t)
		e := mustRead(t, r, c.in)
		tp := &tape{at: at}
		got, err := LowerTo(tp, e)
		if err != nil {
			t.Errorf("%s: %v", c.in, err)
			continue
		}
		want, err := e.EvalFloat(at)
		if err != nil {
			t.Errorf("%s: %v", c.in, err)
			continue
		}
		if math.Abs(got[0]-want) > 1e-14*(1+math.Abs(want)) {
			t.Errorf("%s is %.17g, want %.17g", c.in, got[0], want)
		}
		if len(tp.ops) > c.ops {
			t.Errorf("%s (%s) takes %d operations: %s", c.in, e, len(tp.ops), strings.Join(tp.ops, " "))
		}
	}
}

// TestLowerShares: what two outputs have in common is computed once.
func TestLowerShares(t *testing.T) {
	r := testRing(t)
	e, f := mustRead(t, r, "exp(x^2)*y"), mustRead(t, r, "sin(exp(x^2)) + x^2")
	tp := &tape{at: map[string]float64{"x": 1, "y": 2}}
	if _, err := LowerTo(tp, e, f); err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(tp.ops, " "); got != "^n exp * sin +" {
		t.Errorf("operations %s", got)
	}
}

func TestLowerErrors(t *testing.T) {
	r := testRing(t)
	for _, in := range []string{"v*x", "diff(v, x)", "integral(exp(-s_^2), s_, 0, x)", "besseli(1/3, a)", "polygamma(1, a)"} {
		if _, err := LowerTo(&tape{at: map[string]float64{"x": 1, "a": 2}}, mustRead(t, r, in)); err == nil {
			t.Errorf("%s is lowered", in)
		}
	}
	if _, err := LowerTo(&tape{}, mustRead(t, r, "integral(exp(-s_^2), s_, 0, x)")); !errors.Is(err, ErrNotLowered) {
		t.Errorf("%v", err)
	}
}
