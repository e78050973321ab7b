package kernel

import (
	"math"
	"strings"
	"testing"
)

// scalar evaluates nodes literally, node by node, as the reference of lowering.
func scalar(b *Builder, x Node, in []float64) float64 {
	n := b.nodes[x]
	arg := func(y Node) float64 { return scalar(b, y, in) }
	switch n.kind {
	case kindConst:
		return n.imm
	case kindInput:
		return in[int(n.imm)]
	case kindScale:
		return n.imm * arg(n.a)
	case kindAdd:
		return arg(n.a) + arg(n.b)
	case kindMul:
		return arg(n.a) * arg(n.b)
	case kindDiv:
		return arg(n.a) / arg(n.b)
	case kindSqrt:
		return math.Sqrt(arg(n.a))
	case kindAbs:
		return math.Abs(arg(n.a))
	case kindFloor:
		return math.Floor(arg(n.a))
	case kindMin:
		return math.Min(arg(n.a), arg(n.b))
	case kindMax:
		return math.Max(arg(n.a), arg(n.b))
	case kindSin:
		return math.Sin(arg(n.a))
	case kindCos:
		return math.Cos(arg(n.a))
	case kindExp:
		return math.Exp(arg(n.a))
	case kindLog:
		return math.Log(arg(n.a))
	case kindCall1:
		return n.fn.apply1(arg(n.a), n.imm)
	}
	return n.fn.apply2(arg(n.a), arg(n.b))
}

// gallery builds one output for every kind of node and several fusions.
func gallery(b *Builder) []Node {
	x, y, t := b.Input("x"), b.Input("y"), b.Input("t")
	c := b.Const
	v := b.Add(c(1), b.Mul(c(0.5), b.Mul(b.Sin(b.Scale(2*math.Pi, x)), b.Cos(b.Scale(2*math.Pi, y)))))
	s, co := b.SinCos(t)
	return []Node{
		v, b.Mul(v, co), b.Mul(v, s),
		b.Sub(x, b.Mul(c(3), y)), b.Sub(c(2), b.Div(x, b.Scale(4, y))),
		b.FMA(x, y, t), b.Add(b.Scale(-2, b.Mul(x, y)), t), b.Neg(b.Mul(x, b.Neg(y))),
		b.Exp(b.Neg(b.Mul(x, x))), b.Log(b.Add(b.Mul(x, x), c(1))),
		b.Sqrt(b.Abs(b.Sub(x, y))), b.Floor(b.Scale(7, x)), b.Min(x, y), b.Max(x, c(0.25)),
		b.PowInt(x, 5), b.PowInt(b.Add(x, c(2)), -3), b.Pow(b.Add(b.Abs(y), c(1)), c(2.5)),
		b.Pow(b.Add(b.Abs(y), c(1)), x), b.Pow(b.Add(b.Abs(x), c(1)), c(-1.5)),
		b.Tan(x), b.Sinh(x), b.Cosh(y), b.Tanh(t), b.Sign(x), b.Erf(y), b.Gamma(b.Add(b.Abs(x), c(1))), b.BesselI(2, x),
		x, c(4), b.Cos(b.Neg(t)), b.Sin(b.Scale(-3, t)), v, b.Div(c(2), b.Add(c(3), x)),
		b.Sum(x, y, t, b.Neg(x)), b.Prod(x, y, t), b.Div(b.Mul(x, y), v),
	}
}

func TestProgramAgainstLiteralEvaluation(t *testing.T) {
	b := NewBuilder("x", "y", "t")
	outs := gallery(b)
	p, err := b.Compile(outs...)
	if err != nil {
		t.Fatal(err)
	}
	for _, n := range []int{0, 1, 15, 16, 17, 511, 512, 513, 1300} {
		in := [][]float64{make([]float64, n), make([]float64, n), {0.7}}
		for i := range n {
			in[0][i] = math.Sin(float64(3*i+1)) * 1.3
			in[1][i] = math.Cos(float64(5*i+2))*2 + 0.01
		}
		out := make([][]float64, len(outs))
		for i := range out {
			out[i] = make([]float64, n)
		}
		if err := p.Eval(p.NewScratch(), in, out, n); err != nil {
			t.Fatal(err)
		}
		for i, x := range outs {
			for j := range n {
				want := scalar(b, x, []float64{in[0][j], in[1][j], 0.7})
				if got := out[i][j]; !(math.Abs(got-want) <= 4e-14*(1+math.Abs(want))) {
					t.Fatalf("n=%d output %d point %d: %v, want %v\n%s", n, i, j, got, want, p)
				}
			}
		}
	}
}

func TestEqualSubexpressionsAreOneNode(t *testing.T) {
	b := NewBuilder("x", "y")
	x, y := b.Input("x"), b.Input("y")
	pairs := [][2]Node{
		{b.Add(x, y), b.Add(y, x)},
		{b.Mul(x, y), b.Mul(y, x)},
		{b.Sub(x, x), b.Const(0)},
		{b.Add(x, x), b.Scale(2, x)},
		{b.Mul(b.Scale(2, x), b.Scale(3, y)), b.Scale(6, b.Mul(x, y))},
		{b.Neg(b.Neg(x)), x},
		{b.Add(b.Add(x, b.Const(1)), b.Const(2)), b.Add(x, b.Const(3))},
		{b.Mul(b.Const(0), b.Exp(x)), b.Const(0)},
		{b.Cos(b.Neg(x)), b.Cos(x)},
		{b.Sin(b.Neg(x)), b.Neg(b.Sin(x))},
		{b.Pow(x, b.Const(2)), b.Mul(x, x)},
		{b.Sin(b.Const(1)), b.Const(Sin(1))},
	}
	for i, p := range pairs {
		if p[0] != p[1] {
			t.Errorf("pair %d: nodes %d and %d", i, p[0], p[1])
		}
	}
	p, err := b.Compile(b.Mul(b.Sin(x), b.Cos(x)), b.Add(b.Sin(x), y))
	if err != nil {
		t.Fatal(err)
	}
	if n := strings.Count(p.String(), "sincos"); n != 1 || p.Len() != 3 {
		t.Errorf("sine and cosine of one argument are not one operation:\n%s", p)
	}
}

func TestMisuseIsAnError(t *testing.T) {
	b := NewBuilder("x")
	x := b.Input("x")
	p, err := b.Compile(x)
	if err != nil {
		t.Fatal(err)
	}
	s := p.NewScratch()
	row := make([]float64, 4)
	for name, err := range map[string]error{
		"inputs":  p.Eval(s, nil, [][]float64{row}, 4),
		"outputs": p.Eval(s, [][]float64{row}, nil, 4),
		"short":   p.Eval(s, [][]float64{row}, [][]float64{row[:2]}, 4),
		"long":    p.Eval(s, [][]float64{row[:2]}, [][]float64{row}, 4),
		"scratch": p.Eval(nil, [][]float64{row}, [][]float64{row}, 4),
		"point":   p.EvalPoint(s, nil, row[:1]),
	} {
		if err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	if _, err := b.Compile(); err == nil {
		t.Error("no outputs: no error")
	}
	if _, err := b.Compile(Node(99)); err == nil {
		t.Error("unknown output: no error")
	}
	for _, misuse := range []func(*Builder){
		func(b *Builder) { b.Add(99, 0) },
		func(b *Builder) { b.Sin(99) },
		func(b *Builder) { b.Mul(b.Input("x"), 77) },
		func(b *Builder) { b.Div(-1, b.Input("x")) },
		func(b *Builder) { b.Abs(99) },
	} {
		c := NewBuilder("x")
		misuse(c)
		if _, err := c.Compile(c.Input("x")); err == nil {
			t.Error("misuse: no error")
		}
	}
}

func TestImportAndAffine(t *testing.T) {
	src := NewBuilder("x", "y")
	x, y := src.Input("x"), src.Input("y")
	f := src.Add(src.Mul(src.Sin(x), src.Sub(src.Const(2), src.Scale(3, y))), src.Exp(x))
	g := src.Mul(y, src.Sin(y))

	c, s, ok := src.Affine(f, "y")
	if !ok {
		t.Fatal("f is affine in y")
	}
	if src.DependsOn(c, "y") || src.DependsOn(s[0], "y") || !src.DependsOn(f, "y") {
		t.Error("the parts of an affine form contain the variable")
	}
	for _, v := range [][]float64{{0.3, 0.4}, {-1, 2}} {
		want := scalar(src, f, v)
		if got := scalar(src, c, v) + v[1]*scalar(src, s[0], v); math.Abs(got-want) > 1e-15*(1+math.Abs(want)) {
			t.Errorf("affine form: %v, want %v", got, want)
		}
	}
	if _, _, ok := src.Affine(g, "y"); ok {
		t.Error("y sin(y) is not affine in y")
	}
	b := NewBuilder("u")
	u := b.Input("u")
	out := b.Import(src, []Node{f, g}, map[string]Node{"x": b.Mul(u, u), "y": b.Const(2)})
	for i, want := range []float64{math.Sin(0.25)*(2-6) + math.Exp(0.25), 2 * math.Sin(2)} {
		if got := scalar(b, out[i], []float64{0.5}); math.Abs(got-want) > 1e-15*math.Abs(want) {
			t.Errorf("import %d: %v, want %v", i, got, want)
		}
	}
	if names := b.Inputs(); len(names) != 1 {
		t.Errorf("inputs after a full binding: %v", names)
	}
}
