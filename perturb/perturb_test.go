package perturb_test

import (
	"context"
	"errors"
	"math/big"
	"testing"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/perturb"
	"epslim/perturb/cell"
)

// derive runs the expansion of a model text with the closure route.
func derive(t *testing.T, text string, change func(*perturb.Problem)) (*ito.System, *perturb.Limit, error) {
	t.Helper()
	sys, err := ito.Parse("test", []byte(text), ito.Options{})
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
	p := perturb.Problem{Ring: sys.Ring, Gen: g, Numbers: cell.Numbers{Formulas: sys.Definitions(), Values: sys.Values()}}
	for _, v := range sys.Slow {
		p.Slow = append(p.Slow, v.Name)
	}
	kinds := map[ito.DomainKind]cell.DomainKind{
		ito.Circle: cell.Circle, ito.HalfLine: cell.HalfLine, ito.Periodic: cell.Periodic, ito.Reflecting: cell.Reflecting,
	}
	for _, v := range sys.Fast {
		p.Fast = append(p.Fast, cell.Variable{Name: v.Name, Kind: kinds[v.Domain.Kind], A: v.Domain.A, B: v.Domain.B})
	}
	if change != nil {
		change(&p)
	}
	lim, err := perturb.Derive(context.Background(), p)
	return sys, lim, err
}

// TestMathieu compares the corrections of the freely turning walker at
// constant speed with the expansion of its exact dispersion relation. With
// D u” + i k v cos(theta) u = lambda u and theta = 2 z, lambda = -D a_0(q)/4 and
// q = -2 i k v/D, where a_0(q) = -q^2/2 + 7 q^4/128 - ... is the lowest Mathieu
// characteristic value (Abramowitz and Stegun 20.2.25), so that
// lambda = -k^2 v^2/(2 D) - 7 k^4 v^4/(32 D^3) - ...
func TestMathieu(t *testing.T) {
	sys, lim, err := derive(t, `
slow x on line
fast theta on circle
param D positive
param v positive
dx = v*cos(theta)/eps dt
dtheta = sqrt(2*D)/eps dW1
`, func(p *perturb.Problem) { p.Next = big.NewRat(2, 1) })
	if err != nil {
		t.Fatal(err)
	}
	r := sys.Ring
	D, _ := r.Symbol("D")
	v, _ := r.Symbol("v")
	pow := func(e algebra.Expr, n int) algebra.Expr {
		out, err := e.PowInt(n)
		if err != nil {
			t.Fatal(err)
		}
		return out
	}
	if want := pow(v, 2).Mul(pow(D, -1)); !lim.Diffusion[0][0].Equal(want) {
		t.Errorf("A = %s, want %s", lim.Diffusion[0][0], want)
	}
	if len(lim.Corrections) != 1 || lim.Corrections[0].Power.Cmp(big.NewRat(2, 1)) != 0 {
		t.Fatalf("corrections %v, want one at order 2", lim.Corrections)
	}
	c := lim.Corrections[0]
	ts, err := c.Generator.Derivatives(lim.U0)
	if err != nil || len(ts) != 1 || ts[0].Index[0] != 4 {
		t.Fatalf("the correction is %s, want a fourth derivative alone (%v)", c.Generator, err)
	}
	// (ik)^4 = k^4
	if want := pow(v, 4).Mul(pow(D, -3)).Mul(r.Frac(-7, 32)); !ts[0].Coef.Equal(want) {
		t.Errorf("fourth-order coefficient %s, want %s", ts[0].Coef, want)
	}
	if !c.Residual.IsZero() {
		t.Errorf("residual %s", c.Residual)
	}
}

// TestMovingFrame: dispersion in plane Couette flow in the laboratory frame is
// refused, and in the frame of the mean has 2 D + U^2 H^2/(60 D) (R. Aris,
// Proc. R. Soc. A 235 (1956) 67; D_eff = D (1 + Pe^2/30) on the half-gap; from
// memory).
func TestMovingFrame(t *testing.T) {
	const couette = `
slow x on line
fast y in [0, H] reflecting
param H positive
param U
param D positive
dx = U*y/H/eps dt + sqrt(2*D) dW1
dy = sqrt(2*D)/eps dW2
`
	_, _, err := derive(t, couette, nil)
	var refused *perturb.Refusal
	if !errors.As(err, &refused) || refused.Reason != perturb.Uncentred || refused.Detail["x"].String() != "U/2" {
		t.Fatalf("got %v, want a refusal with the mean drift U/2", err)
	}
	sys, lim, err := derive(t, couette, func(p *perturb.Problem) { p.MovingFrame = true })
	if err != nil {
		t.Fatal(err)
	}
	if lim.Frame == nil || lim.Frame.Short || lim.Frame.Velocity[0].String() != "U/2" {
		t.Fatalf("frame %+v", lim.Frame)
	}
	H, _ := sys.Ring.Symbol("H")
	U, _ := sys.Ring.Symbol("U")
	D, _ := sys.Ring.Symbol("D")
	q, err := U.Mul(U).Mul(H).Mul(H).Div(D.Mul(sys.Ring.Int(60)))
	if err != nil {
		t.Fatal(err)
	}
	if want := D.Mul(sys.Ring.Int(2)).Add(q); !lim.Diffusion[0][0].Equal(want) {
		t.Errorf("A = %s, want %s", lim.Diffusion[0][0], want)
	}
}

// TestFluctuation: the deviation from an average has the variance rate 2 int C
// of the fluctuation's correlation function, here 2 q/a^2 for an
// Ornstein-Uhlenbeck forcing (Freidlin and Wentzell, Random Perturbations of
// Dynamical Systems, ch. 7; from memory).
func TestFluctuation(t *testing.T) {
	_, lim, err := derive(t, `
slow x on line
fast y on line
param a positive
param q positive
dx = (-x + y) dt
dy = -a*y/eps dt + sqrt(2*q/eps) dW1
`, func(p *perturb.Problem) { p.Next = big.NewRat(1, 1) })
	if err != nil {
		t.Fatal(err)
	}
	if lim.Regime != "averaging" || lim.Drift[0].String() != "-x" || !lim.Diffusion[0][0].IsZero() {
		t.Errorf("limit %s, %s, %s", lim.Regime, lim.Drift[0], lim.Diffusion[0][0])
	}
	if len(lim.Corrections) != 1 || lim.Corrections[0].Diffusion[0][0].String() != "2*q/a^2" {
		t.Errorf("corrections %+v", lim.Corrections)
	}
}

// TestTerms: the pieces of the drift add up, whatever they are called.
func TestTerms(t *testing.T) {
	_, lim, err := derive(t, `
slow x on line
fast y on line
param h
function g(x) positive
function a(x) positive
function s(x) positive
dx = g*y/eps dt + h dW1 - x dt
dy = (-a*y/eps^2 + x*y^2/eps) dt + s/eps dW1
`, nil)
	if err != nil {
		t.Fatal(err)
	}
	sum := lim.Drift[0].Neg()
	for _, term := range lim.Terms[0] {
		sum = sum.Add(term.Value)
	}
	if !sum.IsZero() || len(lim.Terms[0]) < 4 {
		t.Errorf("%d terms leave %s", len(lim.Terms[0]), sum)
	}
}

// TestFactor: sigma sigma^T is A with as many columns as the rank.
func TestFactor(t *testing.T) {
	r := algebra.NewRing()
	x := r.Declare("x", algebra.Attr{})
	y := r.Declare("y", algebra.Attr{})
	one := r.Int(1)
	a := [][]algebra.Expr{ // (1, 0, -y)(.)^T + (0, 1, x)(.)^T
		{one, r.Int(0), y.Neg()},
		{r.Int(0), one, x},
		{y.Neg(), x, x.Mul(x).Add(y.Mul(y))},
	}
	s, err := perturb.Factor(a)
	if err != nil {
		t.Fatal(err)
	}
	for i := range a {
		if len(s[i]) != 2 {
			t.Fatalf("row %d has %d columns, want 2", i, len(s[i]))
		}
		for j := range a {
			sum := r.Int(0)
			for k := range s[i] {
				sum = sum.Add(s[i][k].Mul(s[j][k]))
			}
			if !sum.Equal(a[i][j]) {
				t.Errorf("entry %d, %d: %s, want %s", i, j, sum, a[i][j])
			}
		}
	}
}
