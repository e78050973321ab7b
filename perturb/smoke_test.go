package perturb

import (
	"context"
	"fmt"
	"testing"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/perturb/cell"
)

func TestSmoke(t *testing.T) {
	r := algebra.NewRing()
	x := r.Declare("x", algebra.Attr{})
	y := r.Declare("y", algebra.Attr{})
	th := r.Declare("theta", algebra.Attr{})
	D := r.Declare("D", algebra.Attr{Sign: algebra.Positive, Parameter: true})
	om := r.Declare("omega", algebra.Attr{Parameter: true})
	eps := r.Declare("eps", algebra.Attr{Sign: algebra.Positive})
	r.DeclareFunction("v", []string{"x", "y"}, algebra.Attr{Sign: algebra.Positive})
	v, _ := r.Call("v", x, y)
	ok := func(e algebra.Expr, err error) algebra.Expr {
		if err != nil {
			t.Fatal(err)
		}
		return e
	}
	c := ok(r.Call("cos", th))
	s := ok(r.Call("sin", th))
	z := r.Int(0)
	e2 := eps.Mul(eps)
	g, err := generator.Build(r, "eps", []generator.Equation{
		{Var: "x", Drift: ok(v.Mul(c).Div(eps)), Noise: []algebra.Expr{z}},
		{Var: "y", Drift: ok(v.Mul(s).Div(eps)), Noise: []algebra.Expr{z}},
		{Var: "theta", Drift: ok(om.Div(e2)), Noise: []algebra.Expr{ok(ok(D.Mul(r.Int(2)).Sqrt()).Div(eps))}},
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range g.Parts {
		fmt.Println(p.Power, p.Op)
	}
	l, err := Derive(context.Background(), Problem{Ring: r, Gen: g, Slow: []string{"x", "y"}, Fast: []cell.Variable{{Name: "theta", Kind: cell.Circle}}})
	if err != nil {
		t.Fatal(err)
	}
	fmt.Println(l.Power, l.Regime)
	for i := range l.Drift {
		fmt.Println(l.Drift[i], "|", l.Diffusion[i], "|", l.Cell[i])
		for _, t := range l.Terms[i] {
			fmt.Println("   ", t.Origin, t.Value)
		}
	}
	f, err := Factor(l.Diffusion)
	fmt.Println(f, err)
	fmt.Println(StratonovichDrift(l.Drift, f, []string{"x", "y"}))
}
