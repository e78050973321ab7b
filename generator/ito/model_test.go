package ito

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"epslim/generator/algebra"
)

// expr reads an expression in the names of a model, by way of a let statement.
func expr(t *testing.T, model, text string) (*System, algebra.Expr) {
	t.Helper()
	s := mustParse(t, model+"\nlet wanted = "+text+"\n")
	return s, s.Lets[len(s.Lets)-1].Value
}

func readModel(t testing.TB, name string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("testdata/models", name+".ito"))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// TestModels reads every model, and again from its canonical layout, and expects
// the same system.
func TestModels(t *testing.T) {
	files, err := filepath.Glob("testdata/models/*.ito")
	if err != nil || len(files) < 60 {
		t.Fatal(len(files), err)
	}
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		s, err := Parse(file, text, Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if s.Title == "" || len(s.Equations) != len(s.Slow)+len(s.Fast) || len(s.Warnings) > 0 {
			t.Errorf("%s: title %q, %d equations, warnings %v", file, s.Title, len(s.Equations), s.Warnings)
		}
		laidOut, err := Format(file, text)
		if err != nil {
			t.Error(err)
			continue
		}
		again, err := Parse(file, laidOut, Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if a, b := dump(s), dump(again); a != b {
			t.Errorf("%s: the canonical layout reads as another system:\n%s\nand\n%s", file, a, b)
		}
	}
}

// dump writes what a system says, without places.
func dump(s *System) string {
	var b strings.Builder
	line := func(parts ...string) { b.WriteString(strings.Join(parts, " ") + "\n") }
	text := func(e algebra.Expr) string {
		if !e.Valid() {
			return "-"
		}
		return e.String()
	}
	line(s.Title, s.Small, s.Calculus.String(), s.Latex, strings.Join(s.Noises, ","))
	for _, list := range [][]*Variable{s.Slow, s.Fast} {
		for _, v := range list {
			line(v.Name, v.Domain.Kind.String(), text(v.Domain.A), text(v.Domain.B), text(v.Domain.WindowA), text(v.Domain.WindowB), v.Latex)
		}
	}
	for _, p := range s.Parameters {
		value := "-"
		if p.Value != nil {
			value = p.Value.RatString()
		}
		line(p.Name, value, p.Sign.String(), p.Latex)
	}
	for _, f := range s.Functions {
		line(f.Name, strings.Join(f.Args, ","), text(f.Body), f.Sign.String())
	}
	for _, e := range s.Equations {
		line(e.Variable, text(e.Drift), text(e.Typed))
		for _, n := range e.Noise {
			line(" ", text(n))
		}
	}
	for _, c := range s.Claims {
		line(c.Label(), text(c.Right))
	}
	for _, x := range s.Starts {
		line(x.Variable, text(x.Value))
	}
	for _, x := range s.Observables {
		line(x.Name, text(x.Value))
	}
	return b.String()
}

// TestSystem looks at every part of one model.
func TestSystem(t *testing.T) {
	const model = `title "Gel crawler # 7"
small delta
slow x in [-L, 2*L] periodic
slow y on line window [-3, 3]
fast theta on circle
fast (a, b, c) on sphere
param L = 1.25 positive
param k
param n = -3 integer
function v(x, y) = 1 + x^2 positive
function w(y)
let q = k/L
latex delta = "\varepsilon"
latex v = "v_0"
dx = v*cos(theta)/delta dt + (q dt + dWb)
dy = w dt + 2 dWa
dtheta = sqrt(2*L)/delta dWb - dWa
da = 0 dt
db = 0 dt
dc = 0 dt
claim drift x = w*diff(w, y)
claim diffusion x y = 1
claim mean cos(theta)^2 = 1/2
claim noise x 2 = v(x + 1, y)
start x = L/2
observe r = x^2 + y^2`
	s := mustParse(t, model)
	check := func(what string, got, want any) {
		t.Helper()
		if got != want {
			t.Errorf("%s is %v, want %v", what, got, want)
		}
	}
	equal := func(what string, got algebra.Expr, want string) {
		t.Helper()
		// Same ring: read the wanted formula as an abbreviation of the same model.
		other, e := expr(t, model, want)
		_ = other
		if got.String() != e.String() {
			t.Errorf("%s is %s, want %s", what, got, e)
		}
	}
	sum := sha256.Sum256([]byte(model))
	check("hash", s.SHA256, hex.EncodeToString(sum[:]))
	check("source", s.Source, model)
	check("title", s.Title, "Gel crawler # 7")
	check("small", s.Small, "delta")
	check("TeX", s.Latex, `\varepsilon`)
	check("noises", strings.Join(s.Noises, " "), "Wb Wa")
	check("slow", s.Slow[0].Name+s.Slow[1].Name, "xy")
	check("fast", len(s.Fast), 4)
	check("sphere", s.Spheres[0].Names, [3]string{"a", "b", "c"})
	check("kinds", s.Slow[0].Domain.Kind.String()+s.Slow[1].Domain.Kind.String()+s.Fast[0].Domain.Kind.String()+s.Fast[3].Domain.Kind.String(), "periodiclinecirclesphere")
	equal("lower end", s.Slow[0].Domain.A, "-L")
	equal("upper end", s.Slow[0].Domain.B, "2*L")
	equal("window", s.Slow[1].Domain.WindowA, "-3")
	check("no interval", s.Slow[1].Domain.A.Valid(), false)
	check("L", s.Parameter("L").Value.RatString()+s.Parameter("L").Sign.String(), "5/4positive")
	check("k", s.Parameter("k").Value == nil, true)
	check("n", s.Parameter("n").Integer, true)
	check("v", s.Function("v").Latex+s.Function("v").Sign.String(), "v_0positive")
	check("w", s.Function("w").Body.Valid(), false)
	equal("formula", s.Function("v").Body, "1 + x^2")
	equal("drift", s.Equation("x").Drift, "v*cos(theta)/delta + k/L")
	equal("noise", s.Equation("x").Noise[0], "1")
	equal("no noise", s.Equation("x").Noise[1], "0")
	equal("shared noise", s.Equation("theta").Noise[0], "sqrt(2*L)/delta")
	equal("shared noise", s.Equation("theta").Noise[1], "-1")
	equal("drift", s.Equation("y").Drift, "w(y)")
	check("labels", s.Claims[0].Label()+"|"+s.Claims[1].Label()+"|"+s.Claims[3].Label(), "drift x|diffusion x y|noise x 2")
	check("claim text", s.Claims[2].Text, "claim mean cos(theta)^2 = 1/2")
	check("claim line", s.Claims[2].Line, 23)
	equal("claim", s.Claims[0].Right, "w*diff(w, y)")
	equal("start", s.Starts[0].Value, "5/8*L/(5/4)")
	equal("observable", s.Observables[0].Value, "x^2 + y^2")
	check("definitions", len(s.Definitions()), 1)
	check("values", len(s.Values()), 2)
	check("let", s.Lets[0].Value.String(), "k/L")
}

// TestStratonovich converts systems whose Ito form stands in textbooks.
func TestStratonovich(t *testing.T) {
	head := "calculus stratonovich\nslow x on line\nparam s positive\nparam a\n"
	for _, c := range []struct {
		name, model, variable, drift string
		corrections                  int
	}{
		// Geometric Brownian motion: dX = a X dt + s X o dW is dX = (a + s^2/2) X dt + s X dW
		// (B. Oksendal, Stochastic Differential Equations, section 5.1; from memory).
		{"geometric", "fast y on line\ndx = 0 dt\ndy = a*y dt + s*y dW1\n", "y", "(a + s^2/2)*y", 1},
		// Brownian motion on the unit circle: dX = -Y o dW, dY = X o dW is dX = -X/2 dt - Y dW,
		// dY = -Y/2 dt + X dW (Oksendal, example 5.1.4, from memory).
		{"circle", "fast y on line\nfast z on line\ndx = 0 dt\ndy = -z dW1\ndz = y dW1\n", "y", "-y/2", 1},
		{"circle", "fast y on line\nfast z on line\ndx = 0 dt\ndy = -z dW1\ndz = y dW1\n", "z", "-z/2", 1},
		// Additive noise needs no correction.
		{"additive", "fast y on line\ndx = 0 dt\ndy = -a*y dt + s dW1\n", "y", "-a*y", 0},
		// Two noises, one multiplied by the other variable: 1/2 sum_k sum_j sigma_jk d_j sigma_ik
		// (C. Gardiner, Handbook of Stochastic Methods, eq. 4.3.41, from memory).
		{"two", "fast y on line\nfast z on line\ndx = 0 dt\ndy = z dW1 + y^2 dW2\ndz = s dW1 + a dW2\n", "y", "s/2 + y^3", 2},
		// Spherical Brownian motion from dn = n x o dW: the Ito drift is -n
		// (rotational diffusion with D = 1/2 decays the first harmonics at rate 2 D).
		{"sphere", "fast (u, v, w) on sphere\ndx = 0 dt\ndu = v dW3 - w dW2\ndv = w dW1 - u dW3\ndw = u dW2 - v dW1\n", "u", "-u", 2},
	} {
		s, want := expr(t, head+c.model, c.drift)
		eq := s.Equation(c.variable)
		if !eq.Drift.Equal(want) || len(eq.Corrections) != c.corrections {
			t.Errorf("%s: the drift of %s is %s with %d corrections, want %s with %d", c.name, c.variable, eq.Drift, len(eq.Corrections), want, c.corrections)
		}
		sum := eq.Typed
		for _, k := range eq.Corrections {
			sum = sum.Add(k.Term)
		}
		if !sum.Equal(eq.Drift) {
			t.Errorf("%s: the typed drift and the corrections add up to %s, not %s", c.name, sum, eq.Drift)
		}
	}
	s := mustParse(t, strings.Replace(head, "stratonovich", "ito", 1)+"fast y on line\ndx = 0 dt\ndy = a*y dt + s*y dW1\n")
	if eq := s.Equation("y"); !eq.Drift.Equal(eq.Typed) || eq.Corrections != nil {
		t.Errorf("an Ito system was converted: %s", eq.Drift)
	}
}

// TestSphereUnderRoots: where components stand under a root, keeping the sphere
// is checked by numbers, and said to be.
func TestSphereUnderRoots(t *testing.T) {
	const model = "slow x\nfast (a, b, c) on sphere\ndx = a/eps dt\nparam D positive\n"
	// sqrt(a^2 + b^2) and sqrt(1 - c^2) are the same on the sphere.
	s := mustParse(t, model+"da = b*(sqrt(1 - c^2) - sqrt(a^2 + b^2)) dt - b*sqrt(1 - c^2)*D dt\ndb = a*sqrt(a^2 + b^2)*D dt\ndc = 0 dt\n")
	if len(s.Warnings) == 0 || s.Warnings[0].Headline() != "m:2:7: that the equations keep the sphere was checked to 40 digits at 4 points, not proven [leaves-sphere]" {
		t.Errorf("warnings %v", s.Warnings)
	}
	_, err := Parse("m", []byte(model+"da = -b*sqrt(1 - c^2)*D dt\ndb = 2*a*sqrt(a^2 + b^2)*D dt\ndc = 0 dt\n"), Options{})
	var errs ErrorList
	if !errors.As(err, &errs) || len(errs) != 1 || errs[0].Code != "leaves-sphere" {
		t.Errorf("leaving the sphere: %v", err)
	}
}

// TestNamesOfPrintedFunctions: functions that only results contain may be
// declared names of a model.
func TestNamesOfPrintedFunctions(t *testing.T) {
	s := mustParse(t, "slow x\nfast y\nparam at = 2\nfunction integral(x)\nfunction polygamma(x)\n"+
		"dx = at*integral(x + 1)*y/eps dt\ndy = -y/eps^2 dt + polygamma/eps dW1\n")
	if len(s.Functions) != 2 || s.Parameter("at") == nil {
		t.Errorf("%+v", s)
	}
}

func TestConditionsOfDomains(t *testing.T) {
	s := mustParse(t, `slow x in [0, L] periodic
slow z in [0, H] reflecting
fast y in [a, b] reflecting
param L positive
param H = 2
param a = -1 negative
param b = 1
dx = 0 dt
dz = 0 dt
dy = 1/eps dW1`)
	var got []string
	for _, e := range s.MustBePositive {
		got = append(got, e.String())
	}
	if strings.Join(got, "; ") != "H; b - a" {
		t.Errorf("conditions %q", got)
	}
}

// TestVariableCalledW: the differential of a variable W is no Wiener increment.
func TestVariableCalledW(t *testing.T) {
	s := mustParse(t, "slow x\nfast W\ndx = W dt\ndW = -W/eps dt + 1/sqrt(eps) dW1\n")
	if s.Equation("W") == nil || len(s.Noises) != 1 || s.Noises[0] != "W1" {
		t.Errorf("%v", s.Noises)
	}
	_, err := Parse("m", []byte("slow x\nfast W\ndx = W dt\ndW = -W/eps dt + 1/sqrt(eps) dW\n"), Options{})
	var errs ErrorList
	if !errors.As(err, &errs) || len(errs) != 1 || errs[0].Code != "not-a-noise" {
		t.Errorf("%v", err)
	}
}

func TestDefaults(t *testing.T) {
	s := mustParse(t, "slow x\nfast y\ndx = y dt\ndy = -y/eps dt + 1/sqrt(eps) dW\n")
	if s.Small != "eps" || s.Calculus != Ito || s.Slow[0].Domain.Kind != Line || s.Noises[0] != "W" {
		t.Errorf("%+v", s)
	}
}

// TestFunctionsStayNames checks that an override changes the numbers and leaves
// the derivation alone.
func TestOverride(t *testing.T) {
	model := readModel(t, "a902-recoil")
	plain := mustParse(t, model)
	s := mustParse(t, model, "D=1.9,b=0.35", "v(x,y)=exp(x)", "v=2 + x", "D=3/2")
	if got := s.Parameter("D").Value.RatString() + " " + s.Parameter("b").Value.RatString(); got != "3/2 7/20" {
		t.Errorf("values %s", got)
	}
	if got := s.Function("v").Body.String(); got != "x + 2" && got != "2 + x" {
		t.Errorf("formula %s", got)
	}
	for i, e := range s.Equations {
		if e.Drift.String() != plain.Equations[i].Drift.String() {
			t.Errorf("the drift of %s has become %s", e.Variable, e.Drift)
		}
	}
	if len(s.Set) != 4 || s.Source != model {
		t.Errorf("set %q", s.Set)
	}
}

// TestWarnings: a formula that breaks its sign on part of an unbounded domain,
// or one that was set by an option, is a remark and no error.
func TestWarnings(t *testing.T) {
	s := mustParse(t, base+"function f(x) = 1 + x/4 positive\n")
	if len(s.Warnings) != 1 || s.Warnings[0].Headline() != `m:6:17: the function "f" is declared positive, and its formula has the value -0.25 at x = -5 [broken-sign]` {
		t.Errorf("warnings %v", s.Warnings)
	}
	s = mustParse(t, "slow x in [0, 1] periodic\nfast y\ndx = y dt\ndy = -y/eps dt + 1/sqrt(eps) dW1\nfunction f(x) = 1 positive", "f(x)=sin(2*pi*x)")
	if len(s.Warnings) != 1 || !strings.HasPrefix(s.Warnings[0].Headline(), `--set:1:6: the function "f" is declared positive, and its formula has the value`) {
		t.Errorf("warnings %v", s.Warnings)
	}
}

func TestAt(t *testing.T) {
	const model = `slow x in [0, H] periodic
slow y on halfline
slow z on line
fast theta on circle
param H = 2 positive
param n = 1 integer
param chi
let q = H
function v(x)
dx = 1 dt
dy = 1 dt
dz = 1 dt
dtheta = 1/eps dW1
`
	s := mustParse(t, model)
	p, err := s.At("y = 1e-05, z=-pi/2, x=1/3, chi=-0.5, H=1")
	if err != nil {
		t.Fatal(err)
	}
	if q, ok := p.Slow[0].Expr.IsConstant(); !ok || q.RatString() != "1/3" || p.Slow[1].Float != 1e-5 || p.Slow[2].Text != "-pi/2" {
		t.Errorf("%+v", p)
	}
	if len(p.Parameters) != 2 || p.Parameters["chi"].Float != -0.5 {
		t.Errorf("%+v", p.Parameters)
	}
	for _, c := range []struct{ text, want string }{
		{"x=1,y=1", `--at:1:8: the point lacks a value for z [bad-point]`},
		{"x=1", `--at:1:4: the point lacks a value for y, z [bad-point]`},
		{"x=1,y=1,z=1,w=2", `--at:1:13: the name "w" is not declared [bad-point]`},
		{"x=1,y=1,z=1,Chi=2", `--at:1:13: the name "Chi" is not declared [bad-point]`},
		{"x=1,y=1,z=1,x=2", `--at:1:13: "x" is given twice [bad-point]`},
		{"x=1,y=1,z=1,theta=2", `--at:1:13: "theta" is a fast variable; a point has values for slow variables and parameters [bad-point]`},
		{"x=1,y=1,z=1,q=2", `--at:1:13: "q" is an abbreviation; a point has values for slow variables and parameters [bad-point]`},
		{"x=1,y=1,z=1,eps=2", `--at:1:13: "eps" is the small parameter; a point has values for slow variables and parameters [bad-point]`},
		{"x=2.5,y=1,z=1", `--at:1:3: the value x = 2.5 lies outside the interval [0, 2]; 0.5 is the same place [bad-point]`},
		{"x=1.5,y=1,z=1,H=1", `--at:1:3: the value x = 1.5 lies outside the interval [0, 1]; 0.5 is the same place [bad-point]`},
		{"x=1,y=0,z=1", `--at:1:7: the value y = 0 lies outside the half-line (0, inf) [bad-point]`},
		{"x=1,y=1,z=1,H=-1", `--at:1:15: the parameter "H" is declared positive, and its value -1 is negative [broken-sign]`},
		{"x=1,y=1,z=1,n=1.5", `--at:1:15: the parameter "n" is declared integer, and its value 1.5 is not an integer [broken-sign]`},
		{"x=1,y=1,z=H", `--at:1:11: the value depends on "H" [not-constant]`},
		{"x=1,y=1,z=1/0", `--at:1:13: the divisor 0 is identically zero [division-by-zero]`},
		{"x=1,y=1,z=sqrt(-1)", `--at:1:11: sqrt(-1) is the root of a negative quantity [not-real]`},
		{"x=1,y=1,z=foo(1)", `--at:1:11: the function "foo" is not declared [undeclared-name]`},
		{"x=1,y=1,z", `--at:1:10: the name z is given no value [syntax]`},
		{"0.3,0.2", `--at:1:1: unexpected "0.3" [syntax]`},
	} {
		_, err := s.At(c.text)
		var errs ErrorList
		if !errors.As(err, &errs) || len(errs) != 1 || errs[0].Headline() != c.want {
			t.Errorf("%s: got %v\nwant %s", c.text, err, c.want)
		}
	}
}

func TestNeedNumbers(t *testing.T) {
	const model = `slow x on line
fast y on line
param D = 1
param chi
param kappa
function v(x)
function u(x) = kappa*x
function w(x) = v + 1
dx = v*y/eps dt
dy = -y/eps^2 dt + 1/eps dW1
let e1 = D*x
let e2 = chi*diff(v, x)
let e3 = u*D
let e4 = w^2
`
	s := mustParse(t, model)
	value := func(i int) algebra.Expr { return s.Lets[i].Value }
	if err := s.NeedNumbers(nil, value(0)); err != nil {
		t.Error(err)
	}
	for i, want := range []string{
		"",
		`m:4:7: the parameter "chi" has no value, and numbers are asked for [missing-value]
m:6:10: the function "v" has no formula, and numbers are asked for [missing-value]`,
		`m:5:7: the parameter "kappa" has no value, and numbers are asked for [missing-value]`,
		`m:6:10: the function "v" has no formula, and numbers are asked for [missing-value]`,
	} {
		if want == "" {
			continue
		}
		errs, _ := s.NeedNumbers(nil, value(i)).(ErrorList)
		var got []string
		for _, d := range errs {
			got = append(got, d.Headline())
		}
		if strings.Join(got, "\n") != want {
			t.Errorf("e%d: got\n%v\nwant\n%s", i+1, errs, want)
		}
	}
	p, err := s.At("x=1,kappa=2")
	if err != nil {
		t.Fatal(err)
	}
	if err := s.NeedNumbers(p, value(2)); err != nil {
		t.Error(err)
	}
}

func TestTemplates(t *testing.T) {
	for _, k := range Templates() {
		text, err := NewModel(k.Kind, `My "first" model`)
		if err != nil {
			t.Error(err)
			continue
		}
		s, err := Parse(k.Kind, text, Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if s.Title != "My 'first' model" || len(s.Claims) < 2 || len(s.Starts) == 0 || len(s.Warnings) > 0 {
			t.Errorf("%s: %+v", k.Kind, s)
		}
		laidOut, err := Format(k.Kind, text)
		if err != nil || string(laidOut) != string(text) {
			t.Errorf("%s is not laid out canonically: %v\n%s", k.Kind, err, laidOut)
		}
	}
	if _, err := NewModel("mvoer", ""); err == nil || err.Error() != `there is no starting point "mvoer"; there are: mover, noise, mass, channel, cell, sphere; did you mean "mover"?` {
		t.Error(err)
	}
}

func TestOutline(t *testing.T) {
	o := ReadOutline([]byte("title \"T\"\nslow x onn line\nfast (a, b, c) on sphere\nparam D = \nfunction v(x) = ((x\nlet q ="))
	if o.Title != "T" || strings.Join(o.Slow, ",") != "x" || strings.Join(o.Fast, ",") != "a,b,c" || strings.Join(o.Parameters, ",") != "D" || strings.Join(o.Functions, ",") != "v(x)" {
		t.Errorf("%+v", o)
	}
}
