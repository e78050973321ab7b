package ito

import (
	"math"
	"math/rand"
	"testing"
	"time"
)

// source makes choices for a generator of expressions: from random numbers or
// from the bytes of a fuzzer.
type source interface{ Intn(n int) int }

type byteSource struct {
	data []byte
	pos  int
}

func (b *byteSource) Intn(n int) int {
	if b.pos >= len(b.data) {
		return 0
	}
	b.pos++
	return int(b.data[b.pos-1]) % n
}

const generatedModel = `slow x on line
slow z in [0, 1] periodic
fast y on line
fast theta on circle
param k = 2 positive
param c
param n = 3 integer
function v(x, z) positive
function g(x)
dx = 0 dt
dz = 0 dt
dy = 0 dt
dtheta = 0 dt
`

// generate writes an expression of the language in the names of generatedModel.
// The argument of a standard function is a simple one unless nested is set: the
// algebra keeps sines of sines and the like as values, but does not promise to
// print them in the language.
func generate(r source, depth int, nested bool) string {
	leaves := []string{"x", "y", "theta", "k", "c", "v", "g", "2", "3", "1/2", "0.25", "z", "n", "pi", "eps", "1"}
	if depth <= 0 {
		return leaves[r.Intn(len(leaves))]
	}
	sub := func() string { return generate(r, depth-1-r.Intn(2), nested) }
	paren := func() string { return "(" + sub() + ")" }
	argument := paren
	if !nested {
		argument = func() string {
			return "(" + []string{"", "2*", "-", "k*", "x*", "y^2*"}[r.Intn(6)] + leaves[r.Intn(len(leaves))] + []string{"", " + x", "*pi", "/(1 + x^2)", "^2"}[r.Intn(5)] + ")"
		}
	}
	switch r.Intn(16) {
	case 0, 1:
		return sub() + " + " + sub()
	case 2:
		return sub() + " - " + paren()
	case 3, 4:
		return paren() + "*" + paren()
	case 5:
		return paren() + "/" + paren()
	case 6:
		return paren() + "^" + []string{"2", "3", "(-1)", "(1/2)", "(-3/2)", "k", "c", "n", "(1/3)", "0"}[r.Intn(10)]
	case 7:
		return "-" + paren()
	case 8, 9, 10:
		names := []string{"sin", "cos", "exp", "log", "sqrt", "tanh", "cosh", "sinh", "tan", "erf", "abs", "sign", "gamma"}
		if !nested {
			// Values only, for these: sums of absolute values over their arguments, and
			// gamma functions of quotients, are not always printed as they are.
			names = names[:len(names)-3]
		}
		return names[r.Intn(len(names))] + argument()
	case 11:
		return "besseli(" + []string{"0", "1", "2", "k"}[r.Intn(4)] + ", " + sub() + ")"
	case 12:
		return "v(" + sub() + ", z)"
	case 13:
		return "diff(" + sub() + ", " + []string{"x", "x, 2", "x, z", "y", "theta", "k"}[r.Intn(6)] + ")"
	case 14:
		return "g" + paren()
	}
	return leaves[r.Intn(len(leaves))]
}

// checkGenerated reads a model with an expression; when it is accepted, what the
// algebra makes of it must read as itself.
func checkGenerated(t *testing.T, e string) (accepted bool) {
	t.Helper()
	text := generatedModel + "let q = " + e
	begin := time.Now()
	s, err := Parse("m", []byte(text), Options{})
	if d := time.Since(begin); d > fuzzBudget {
		t.Fatalf("%s took %v", e, d)
	}
	if err != nil {
		_ = err.Error()
		return false
	}
	checkReadable(t, s, text)
	return true
}

func TestGeneratedExpressions(t *testing.T) {
	r := rand.New(rand.NewSource(7))
	accepted := 0
	for range 700 {
		if checkGenerated(t, generate(r, 4, false)) {
			accepted++
		}
	}
	if accepted < 400 {
		t.Errorf("only %d expressions were accepted", accepted)
	}
}

// TestGeneratedValues compares two ways from text to number that share nothing
// but the syntax tree: the floating-point evaluation that checks use, and the
// evaluation of the canonical expression in extended precision.
func TestGeneratedValues(t *testing.T) {
	const model = `slow x on line
slow z in [0, 1] periodic
fast y on line
fast theta on circle
param k = 2 positive
param c
param n = 3 integer
function v(x, z) = 1 + x^2*z^2 positive
function g(x) = x/2 + sin(x)
dx = 0 dt
dz = 0 dt
dy = 0 dt
dtheta = 0 dt
`
	r := rand.New(rand.NewSource(5))
	compared := 0
	for range 700 {
		text := generate(r, 4, true)
		s, err := Parse("m", []byte(model+"let q = "+text), Options{})
		if err != nil {
			continue
		}
		let := s.scope.entities["q"].value
		value, err := s.Lets[0].Value.SubsFunc(s.Definitions())
		if err != nil {
			continue
		}
		for range 3 {
			at := map[string]float64{}
			for _, name := range []string{"x", "z", "y", "theta", "c", "k", "n", "eps"} {
				at[name] = 0.1 + 0.8*r.Float64()
			}
			n := numeric{r: s.scope, at: at, steps: numericSteps, ok: true}
			want, scale := n.eval(let)
			got, err := value.EvalFloat(at)
			if !n.ok || err != nil || scale > 1e6 || math.Abs(want) > 1e6 {
				continue // outside the domain of a function, a derivative, or badly conditioned
			}
			compared++
			if math.Abs(got-want) > 1e-7*(1+scale) {
				t.Errorf("%s at %v is %g as typed and %g in canonical form %s", text, at, want, got, value)
			}
		}
	}
	if compared < 700 {
		t.Errorf("only %d values were compared", compared)
	}
}

// FuzzExpression does the same with choices made by the fuzzer.
//
//	go test ./generator/ito -run '^$' -fuzz FuzzExpression -parallel 1 -fuzzminimizetime 10x
func FuzzExpression(f *testing.F) {
	r := rand.New(rand.NewSource(11))
	for range 20 {
		data := make([]byte, 60)
		r.Read(data)
		f.Add(data)
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) > 300 {
			return
		}
		checkGenerated(t, generate(&byteSource{data: data}, 5, false))
	})
}
