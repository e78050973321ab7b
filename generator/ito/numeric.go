package ito

import (
	"math"

	"epslim/generator/ito/syntax"
)

// numeric evaluates expressions of the file in floating point, for checks that
// compare numbers: bounds, initial values, declared signs of formulas. It is
// not used for results. A value comes with the size of the largest term that
// went into it, so that a rounding error is not taken for a sign.
type numeric struct {
	r     *reader
	at    map[string]float64 // values of variables
	set   map[string]float64 // values of parameters that replace those of the file
	steps int                // left; abbreviations of abbreviations can be long
	ok    bool               // cleared when something has no number
}

const (
	numericSteps = 50_000    // for one value
	evaluatedMax = 3_000_000 // for one reading; checks that are left then are left out
)

// number evaluates an expression of numbers and parameters; set may be nil. It
// is not known when a parameter has no value.
func (r *reader) number(e syntax.Expr, set map[string]float64) (float64, bool) {
	n := numeric{r: r, set: set, steps: numericSteps, ok: true}
	v, _ := n.eval(e)
	return v, n.ok && !math.IsNaN(v)
}

func (n *numeric) unknown() (float64, float64) {
	n.ok = false
	return math.NaN(), 0
}

// eval returns the value and its scale.
func (n *numeric) eval(e syntax.Expr) (v, scale float64) {
	n.steps--
	n.r.evaluated++
	if n.steps < 0 || n.r.evaluated > evaluatedMax || !n.ok || e == nil {
		return n.unknown()
	}
	switch e := e.(type) {
	case *syntax.Number:
		f, _ := e.Value.Float64()
		return f, math.Abs(f)
	case *syntax.Name:
		return n.name(e.Name)
	case *syntax.Unary:
		v, scale = n.eval(e.X)
		if e.Op == "-" {
			v = -v
		}
		return v, scale
	case *syntax.Binary:
		return n.binary(e)
	case *syntax.Call:
		return n.call(e)
	}
	return n.unknown()
}

func (n *numeric) name(name string) (float64, float64) {
	if name == "pi" {
		return math.Pi, math.Pi
	}
	if x, ok := n.at[name]; ok {
		return x, math.Abs(x)
	}
	e := n.r.entities[name]
	if e == nil {
		return n.unknown()
	}
	switch e.kind {
	case entityParam:
		if x, ok := n.set[name]; ok {
			return x, math.Abs(x)
		}
		return n.eval(e.value)
	case entityLet, entityFunction:
		if e.state == 2 && !e.ok && e.kind == entityLet {
			return n.unknown()
		}
		return n.eval(e.value)
	}
	return n.unknown()
}

func (n *numeric) binary(e *syntax.Binary) (float64, float64) {
	x, sx := n.eval(e.X)
	y, sy := n.eval(e.Y)
	switch e.Op {
	case "+":
		return x + y, max(sx, sy, math.Abs(x+y))
	case "-":
		return x - y, max(sx, sy, math.Abs(x-y))
	case "*":
		return x * y, sx * sy
	case "/":
		if y == 0 {
			return n.unknown()
		}
		return x / y, sx / math.Abs(y)
	}
	v := math.Pow(x, y)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return n.unknown()
	}
	return v, max(math.Abs(v), math.Pow(sx, math.Abs(y)))
}

func (n *numeric) call(e *syntax.Call) (float64, float64) {
	name := e.Fun.Name
	if name == "diff" || name == "at" || name == "integral" {
		return n.unknown()
	}
	args := make([]float64, len(e.Args))
	for i, a := range e.Args {
		args[i], _ = n.eval(a)
	}
	if !n.ok {
		return n.unknown()
	}
	if f := n.r.entities[name]; f != nil && f.kind == entityFunction && len(f.args) == len(args) {
		inner := numeric{r: n.r, set: n.set, steps: n.steps, ok: true, at: map[string]float64{}}
		for i, a := range f.args {
			inner.at[a] = args[i]
		}
		v, s := inner.eval(f.value)
		n.steps, n.ok = inner.steps, inner.ok
		return v, s
	}
	v := standard(name, args)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return n.unknown()
	}
	return v, max(math.Abs(v), scaleOf(name))
}

// scaleOf is the natural size of functions whose zeros are hit with an error of
// that size times the rounding unit.
func scaleOf(name string) float64 {
	switch name {
	case "sin", "cos", "tan":
		return 1
	}
	return 0
}

// standard evaluates a function of the expression language; NaN when it has no
// value or is not known.
func standard(name string, args []float64) float64 {
	if name == "besseli" && len(args) == 2 {
		return besselI(args[0], args[1])
	}
	if len(args) != 1 {
		return math.NaN()
	}
	x := args[0]
	switch name {
	case "sin":
		return math.Sin(x)
	case "cos":
		return math.Cos(x)
	case "tan":
		return math.Tan(x)
	case "sinh":
		return math.Sinh(x)
	case "cosh":
		return math.Cosh(x)
	case "tanh":
		return math.Tanh(x)
	case "exp":
		return math.Exp(x)
	case "log":
		return math.Log(x)
	case "sqrt":
		return math.Sqrt(x)
	case "abs":
		return math.Abs(x)
	case "sign":
		switch {
		case x > 0:
			return 1
		case x < 0:
			return -1
		}
		return x
	case "erf":
		return math.Erf(x)
	case "gamma":
		return math.Gamma(x)
	}
	return math.NaN()
}

// besselI sums the power series of the modified Bessel function of the first
// kind (Abramowitz and Stegun 9.6.10), which has positive terms for z > 0.
func besselI(nu, z float64) float64 {
	if nu < 0 && nu == math.Trunc(nu) {
		nu = -nu
	}
	if math.Abs(z) > 600 || z < 0 && nu != math.Trunc(nu) {
		return math.NaN()
	}
	term := math.Pow(z/2, nu) / math.Gamma(nu+1)
	sum := term
	for k := 1.0; k < 2000; k++ {
		term *= z * z / 4 / (k * (nu + k))
		sum += term
		if math.Abs(term) <= 1e-17*math.Abs(sum) {
			break
		}
	}
	return sum
}
