package generator_test

import (
	"math/big"
	"testing"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

const model = `
slow x in [0, 1] periodic
fast y on line
param a = 1 positive
param s = 0.7 positive
param h = 0.3
function g(x) positive
dx = g*y/sqrt(eps) dt + h dW1
dy = -a*y/eps dt + s/sqrt(eps) dW1
`

func build(t *testing.T) (*ito.System, *generator.Graded) {
	t.Helper()
	sys, err := ito.Parse("test", []byte(model), ito.Options{})
	if err != nil {
		t.Fatal(err)
	}
	var eqs []generator.Equation
	for _, e := range sys.Equations {
		eqs = append(eqs, generator.Equation{Var: e.Variable, Drift: e.Drift, Noise: e.Noise})
	}
	g, err := generator.Build(sys.Ring, sys.Small, eqs)
	if err != nil {
		t.Fatal(err)
	}
	return sys, g
}

// TestBuild checks the grading, half-integer powers included, and the cross
// term of shared noise: the mixed coefficient is sigma_x sigma_y in full.
func TestBuild(t *testing.T) {
	_, g := build(t)
	want := []struct{ power, op string }{
		{"-1", "-a*y*diff(u, y) + s^2*diff(u, y, 2)/2"},
		{"-1/2", "g*y*diff(u, x) + h*s*diff(u, x, y)"},
		{"0", "h^2*diff(u, x, 2)/2"},
	}
	if len(g.Parts) != len(want) {
		t.Fatalf("%d parts, want %d", len(g.Parts), len(want))
	}
	for i, w := range want {
		p := g.Parts[i]
		q, _ := new(big.Rat).SetString(w.power)
		if p.Power.Cmp(q) != 0 {
			t.Errorf("part %d has the power %s, want %s", i, p.Power.RatString(), w.power)
		}
		// The coefficients are compared as operators, not as text.
		if got := p.Op.String(); got != w.op && !sameWords(got, w.op) {
			t.Errorf("part %d is %s, want %s", i, got, w.op)
		}
	}
}

// sameWords compares texts up to the order of factors.
func sameWords(a, b string) bool {
	count := map[rune]int{}
	for _, c := range a {
		count[c]++
	}
	for _, c := range b {
		count[c]--
	}
	for _, n := range count {
		if n != 0 {
			return false
		}
	}
	return true
}

// TestAdjoint: the adjoint of the adjoint is the operator, and the adjoint of
// a product is the product of the adjoints in reverse.
func TestAdjoint(t *testing.T) {
	_, g := build(t)
	a, b := g.Parts[0].Op, g.Parts[1].Op
	if !a.Adjoint().Adjoint().Equal(a) || !b.Adjoint().Adjoint().Equal(b) {
		t.Error("the adjoint of the adjoint is not the operator")
	}
	if !a.Compose(b).Adjoint().Equal(b.Adjoint().Compose(a.Adjoint())) {
		t.Error("(a b)* is not b* a*")
	}
	if a.Compose(b).Equal(b.Compose(a)) {
		t.Error("operators that do not commute compose as if they did")
	}
}

// TestCompose: (a b) u = a (b u) on a function with all its derivatives.
func TestCompose(t *testing.T) {
	sys, g := build(t)
	r := sys.Ring
	x, _ := r.Symbol("x")
	y, _ := r.Symbol("y")
	if err := r.DeclareFunction("w", []string{"x", "y"}, algebra.Attr{}); err != nil {
		t.Fatal(err)
	}
	w, err := r.Call("w", x, y)
	if err != nil {
		t.Fatal(err)
	}
	a, b := g.Parts[0].Op, g.Parts[1].Op
	if !a.Compose(b).Apply(w).Equal(a.Apply(b.Apply(w))) {
		t.Error("the composition does not act as the two operators in turn")
	}
}

// TestAdjointOfDivergence: the adjoint of f d + 1/2 a d^2 on a density is
// -(f p)' + 1/2 (a p)” (Risken, The Fokker-Planck Equation, section 4.1;
// from memory).
func TestAdjointOfDivergence(t *testing.T) {
	sys, _ := build(t)
	r := sys.Ring
	y, _ := r.Symbol("y")
	f, a := y.Mul(y).Neg(), y.Add(r.Int(2))
	op := generator.New(r, []string{"y"})
	op.Add([]int{1}, f)
	op.Add([]int{2}, a.Mul(r.Frac(1, 2)))
	p, err := r.Call("exp", y.Mul(y).Neg())
	if err != nil {
		t.Fatal(err)
	}
	want := f.Mul(p).Diff("y").Neg().Add(a.Mul(p).DiffN("y", 2).Mul(r.Frac(1, 2)))
	if !op.Adjoint().Apply(p).Equal(want) {
		t.Errorf("adjoint %s, want %s", op.Adjoint().Apply(p), want)
	}
}
