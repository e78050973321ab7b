package algebra

import (
	"errors"
	"flag"
	"fmt"
	"math/big"
	"math/rand/v2"
	"os"
	"testing"

	"pgregory.net/rapid"
)

// campaign lengthens the random tests: go test -run TestRandom -campaign 20000
var (
	campaign      = flag.Int("campaign", 0, "number of random expressions (0: a short run)")
	campaignStart = flag.Uint64("campaign.start", 0, "first seed")
)

// TestMain fixes the seed of the rapid tests, so that one run is like the
// next; -rapid.seed=N and -rapid.checks=N search elsewhere and longer.
func TestMain(m *testing.M) {
	flag.Parse()
	if f := flag.Lookup("rapid.seed"); f != nil && f.Value.String() == "0" {
		if err := f.Value.Set("1"); err != nil {
			panic(err)
		}
	}
	os.Exit(m.Run())
}

func seeded(seed uint64) chooser {
	g := rand.New(rand.NewPCG(seed, 7))
	return func(n int) int { return g.IntN(n) }
}

// drawn lets rapid choose, so that it can shrink what fails.
func drawn(t *rapid.T) chooser {
	return func(n int) int { return rapid.IntRange(0, n-1).Draw(t, "") }
}

const (
	testBits  = 260
	testSteps = 300_000
)

var testNames = []string{"x", "y", "z", "theta", "phi", "D", "a", "b", "c", "p", "m", "k", "n", "tau", "omega_", "s_"}

// near compares to about 60 digits, less what cancels in the reference: a
// second reference in higher precision tells how many digits it has.
func near(got, ref, better *big.Float, bits int) bool {
	d := new(big.Float).Sub(got, better)
	if d.Sign() == 0 {
		return true
	}
	err := new(big.Float).Sub(ref, better)
	loss := better.MantExp(nil) - testBits
	if err.Sign() != 0 {
		loss = max(loss, err.MantExp(nil))
	}
	return d.MantExp(nil) <= max(loss, better.MantExp(nil)-bits)+40
}

// checkValue compares e with the tree at several points.
func checkValue(r *Ring, a *ast, e Expr) error {
	return compareValues(r, e, 3, func(at Binding, prec uint) (*big.Float, error) { return a.valueAt(r, at, prec) })
}

func compareValues(r *Ring, e Expr, points int, reference func(Binding, uint) (*big.Float, error)) error {
	for i := uint64(0); i < 2*uint64(points); i += 2 {
		at := r.samplePoint(testNames, i)
		ref, err := reference(at, testBits)
		if err != nil {
			continue
		}
		better, err := reference(at, testBits+150)
		if err != nil {
			continue
		}
		if better.MantExp(nil) < -150 || better.MantExp(nil) > 5000 {
			continue // nothing but rounding, or too large to compare
		}
		got, err := e.EvalBig(at, testBits)
		if err != nil {
			return fmt.Errorf("%s has no value at point %d, where it should be %.10g: %v", e, i, better, err)
		}
		if !near(got, ref, better, 200) {
			return fmt.Errorf("%s is %.40g at point %d, should be %.40g", e, got, i, better)
		}
	}
	return nil
}

// checkTree runs everything that must hold of a single expression.
func checkTree(t testing.TB, a *ast) error {
	r := testRing(t)
	var e Expr
	if err := r.WithBudget(testSteps, func() (err error) { e, err = a.build(r); return err }); err != nil {
		return nil // an undefined or too large expression, reported as such
	}
	if err := checkCanonical(e); err != nil {
		return err
	}
	if err := checkValue(r, a, e); err != nil {
		return err
	}
	return r.WithBudget(testSteps, func() error {
		if err := checkPrinted(r, e); err != nil {
			return err
		}
		if err := checkFresh(t, a, e); err != nil {
			return err
		}
		if err := checkSign(r, e); err != nil {
			return err
		}
		return checkDiff(r, e)
	})
}

// checkPrinted reads what was printed and runs the other printers.
func checkPrinted(r *Ring, e Expr) error {
	f := e.Form()
	again, err := readExpr(r, f.String())
	if err != nil {
		return fmt.Errorf("%s does not read back: %w", f, err)
	}
	if v := again.Sub(e).ZeroTest(); v == VerdictNonZero || v == VerdictUndecided && !hasAlgebraicKernel(e) {
		return fmt.Errorf("%s reads back as %s, %s", f, again, v)
	}
	for _, s := range []string{f.LaTeX(LatexOptions{}), f.LaTeX(LatexOptions{Inline: true}), f.Text(), f.MathML()} {
		if s == "" {
			return fmt.Errorf("%s: an empty formula", f)
		}
	}
	return nil
}

// checkFresh builds the same tree in a ring that has made other kernels
// before, in another order: the text must be the same.
func checkFresh(t testing.TB, a *ast, e Expr) error {
	r := testRing(t)
	for i := len(a.args) - 1; i >= 0; i-- {
		if _, err := a.args[i].build(r); err != nil {
			return err
		}
	}
	if _, err := opAST("sin", leafAST("theta")).build(r); err != nil {
		return err
	}
	again, err := a.build(r)
	if err != nil {
		return fmt.Errorf("builds once and not again: %w", err)
	}
	if again.key() != e.key() {
		return fmt.Errorf("canonical form depends on history: %s and %s", e.key(), again.key())
	}
	if x, y := e.String(), again.String(); x != y {
		return fmt.Errorf("text depends on history: %s and %s", x, y)
	}
	return nil
}

// checkSign: the claimed sign holds at sample points.
func checkSign(r *Ring, e Expr) error {
	if !e.IsReal() {
		return nil
	}
	s := e.Sign()
	for i := uint64(0); i < 3; i++ {
		v, err := e.EvalBig(r.samplePoint(testNames, i), 120)
		if err != nil || v.Sign() == 0 || v.MantExp(nil) < -50 {
			continue
		}
		if v.Sign() > 0 && s&Positive == 0 || v.Sign() < 0 && s&Negative == 0 {
			return fmt.Errorf("%s is said to be %s, but is %.6g", e, s, v)
		}
	}
	return nil
}

// testFormulas are smooth functions to put in for the named ones.
func testFormulas(r *Ring) map[string]FuncDef {
	def := func(s string, args ...string) FuncDef {
		e, err := readExpr(r, s)
		if err != nil {
			panic(err)
		}
		return FuncDef{args, e}
	}
	return map[string]FuncDef{
		"v": def("2 + sin(x)*cos(y)", "x", "y"),
		"U": def("x^2/2 + cos(x*y)", "x", "y"),
		"g": def("exp(x)/(1+x^2)", "x"),
		"h": def("x^3 - x*sin(x)", "x"),
	}
}

// checkDiff compares the derivative, with formulas for the named functions,
// with central differences in high precision.
func checkDiff(r *Ring, e Expr) error {
	if e.Size() > 60 {
		return nil
	}
	defs := testFormulas(r)
	f, err := e.SubsFunc(defs)
	if err != nil {
		return nil
	}
	d := e.Diff("x")
	if err := checkCanonical(d); err != nil {
		return fmt.Errorf("derivative: %w", err)
	}
	df, err := d.SubsFunc(defs)
	if err != nil {
		return fmt.Errorf("derivative of %s: %w", e, err)
	}
	return compareValues(r, df, 2, func(at Binding, prec uint) (*big.Float, error) {
		// h^2 is 2^-280, and half of 2*prec+300 bits cancel
		h := new(big.Float).SetMantExp(big.NewFloat(1), -140-int(prec-testBits))
		wide := 2*prec + 300
		var v [2]*big.Float
		for i, s := range []float64{1, -1} {
			x := new(big.Float).SetPrec(wide).Mul(h, big.NewFloat(s))
			b := at
			b.Values = map[string]*big.Float{}
			for n, y := range at.Values {
				b.Values[n] = y
			}
			b.Values["x"] = x.Add(x, at.Values["x"])
			if v[i], err = f.EvalBig(b, wide); err != nil {
				return nil, err
			}
		}
		out := new(big.Float).SetPrec(wide).Sub(v[0], v[1])
		return out.Quo(out, h.Mul(h, big.NewFloat(2))), nil
	})
}

// TestRandomExpressions is the short run of the campaign.
func TestRandomExpressions(t *testing.T) {
	n := 100
	if *campaign > 0 {
		n = *campaign
	}
	bad := 0
	for i := 0; i < n && bad < 12; i++ {
		seed := *campaignStart + uint64(i)
		a := seeded(seed).generate(2 + int(seed%3))
		err := func() (err error) {
			defer func() {
				if x := recover(); x != nil {
					err = fmt.Errorf("panic: %v", x)
				}
			}()
			return checkTree(t, a)
		}()
		if err != nil && !errors.Is(err, ErrTooLarge) {
			t.Errorf("seed %d: %s:\n  %v", seed, a, err)
			bad++
		}
	}
}

// TestRapidExpressions lets rapid search and shrink.
func TestRapidExpressions(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		a := drawn(rt).generate(3)
		if err := checkTree(t, a); err != nil && !errors.Is(err, ErrTooLarge) {
			rt.Fatalf("%s: %v", a, err)
		}
	})
}

// TestOddRoots: roots of odd order have the sign of their radicand, and even
// powers of them do not tell it.
func TestOddRoots(t *testing.T) {
	r := testRing(t)
	at := map[string]float64{"x": -2, "y": 5, "m": -3}
	for _, c := range []struct {
		in   string
		want float64
	}{
		{"sign((x + y/5)^(1/3))", -1},
		{"abs(x^(1/3))^3", 2},
		{"abs((x - y)^(1/3))^3", 7},
		{"sqrt((x-y)^(2/3))^3", 7},
		{"sqrt(x^(2/3))^3", 2},
		{"exp(3*log((x-y)^(2/3)))", 49},
		{"sign(m^(1/3))", -1},
		{"(m*x)^(1/3)*(m*x)^(2/3)", 6},
	} {
		e := mustRead(t, r, c.in)
		if got, err := e.EvalFloat(at); err != nil || got < c.want-1e-12 || got > c.want+1e-12 {
			t.Errorf("%s (%s) is %g (%v), want %g", c.in, e, got, err, c.want)
		}
	}
	for _, in := range []string{"sqrt(m^(1/3))", "log(m^(1/3))"} {
		if e, err := readExpr(r, in); err == nil {
			t.Errorf("%s is %s", in, e)
		}
	}
	if s := mustRead(t, r, "(x - y)^(1/3)").Sign(); s != AnyReal {
		t.Errorf("a cube root is %s", s)
	}
	if s := mustRead(t, r, "sqrt(x - y)").Sign(); s != NonNegative {
		t.Errorf("a square root is %s", s)
	}
}
