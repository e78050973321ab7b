package algebra

import (
	"errors"
	"fmt"
	"math/big"
	"strings"
)

// ast is a plain expression tree: what a user may type, before any algebra.
// Its value is computed node by node, without the expression core, and so
// serves as the reference for what the core makes of it.
type ast struct {
	op   string // "num", "leaf", "+", "-", "*", "/", "^", "neg" or a function
	num  *big.Rat
	name string // leaf: source text of a symbol, function or derivative
	args []*ast
}

func (a *ast) String() string {
	switch a.op {
	case "num":
		if a.num.Sign() < 0 || !a.num.IsInt() {
			return "(" + a.num.RatString() + ")"
		}
		return a.num.RatString()
	case "leaf":
		return a.name
	case "neg":
		return "(-" + a.args[0].String() + ")"
	case "+", "-", "*", "/", "^":
		return "(" + a.args[0].String() + " " + a.op + " " + a.args[1].String() + ")"
	}
	s := make([]string, len(a.args))
	for i, x := range a.args {
		s[i] = x.String()
	}
	return a.op + "(" + strings.Join(s, ", ") + ")"
}

func numAST(a, b int64) *ast             { return &ast{op: "num", num: big.NewRat(a, b)} }
func leafAST(name string) *ast           { return &ast{op: "leaf", name: name} }
func opAST(op string, args ...*ast) *ast { return &ast{op: op, args: args} }

// build makes the canonical expression.
func (a *ast) build(r *Ring) (Expr, error) {
	args := make([]Expr, len(a.args))
	for i, x := range a.args {
		e, err := x.build(r)
		if err != nil {
			return Expr{}, err
		}
		args[i] = e
	}
	switch a.op {
	case "num":
		return r.Rat(a.num), nil
	case "leaf":
		return readExpr(r, a.name)
	case "neg":
		return args[0].Neg(), nil
	case "+":
		return args[0].Add(args[1]), nil
	case "-":
		return args[0].Sub(args[1]), nil
	case "*":
		return args[0].Mul(args[1]), nil
	case "/":
		return args[0].Div(args[1])
	case "^":
		return args[0].Pow(args[1])
	}
	return r.Call(a.op, args...)
}

// value evaluates the tree as it stands; domain errors panic.
func (a *ast) value(ev *evaluator) *big.Float {
	args := make([]*big.Float, len(a.args))
	for i, x := range a.args {
		args[i] = x.value(ev)
	}
	switch a.op {
	case "num":
		return ev.rat(a.num)
	case "leaf":
		e, err := readExpr(ev.r, a.name)
		if err != nil {
			panic(err)
		}
		return ev.real(e)
	case "neg":
		return ev.neg(args[0])
	case "+":
		return ev.add(args[0], args[1])
	case "-":
		return ev.sub(args[0], args[1])
	case "*":
		return ev.mul(args[0], args[1])
	case "/":
		return ev.div(args[0], args[1])
	case "^":
		return a.power(ev, args[0], args[1])
	case "exp":
		return ev.exp(args[0])
	case "log":
		return ev.log(args[0])
	case "sqrt":
		return ev.root(args[0], 1, 2)
	case "sin":
		s, _ := ev.sincos(args[0])
		return s
	case "cos":
		_, c := ev.sincos(args[0])
		return c
	case "tan":
		s, c := ev.sincos(args[0])
		return ev.div(s, c)
	case "sinh", "cosh", "tanh":
		e := ev.exp(args[0])
		f := ev.div(ev.int(1), e)
		s, c := ev.shift(ev.sub(e, f), -1), ev.shift(ev.add(e, f), -1)
		switch a.op {
		case "sinh":
			return s
		case "cosh":
			return c
		}
		return ev.div(s, c)
	case "abs":
		return ev.new().Abs(args[0])
	case "sign":
		return ev.int(int64(args[0].Sign()))
	case "erf":
		return ev.erf(args[0])
	case "gamma":
		return ev.gamma(args[0])
	case "besseli":
		return ev.besselI(args[0], args[1])
	}
	panic(fmt.Errorf("no value of %s", a.op))
}

func (a *ast) power(ev *evaluator, b, x *big.Float) *big.Float {
	if e := a.args[1]; e.op == "num" {
		return ev.root(b, e.num.Num().Int64(), e.num.Denom().Int64())
	}
	if x.IsInt() {
		n, _ := x.Int64()
		if n < 0 && b.Sign() == 0 || n > 1000 || n < -1000 {
			panic(ErrDivisionByZero)
		}
		return ev.powInt(b, n)
	}
	if b.Sign() <= 0 {
		panic(ErrNegativeRoot)
	}
	return ev.exp(ev.mul(x, ev.log(b)))
}

// chooser draws a number below n; it is all that the generator needs, so that
// plain random numbers, rapid and fuzzing bytes can all drive it.
type chooser func(n int) int

var genLeaves = []string{
	"x", "y", "z", "theta", "D", "a", "b", "p", "m", "k", "pi", "v", "U", "g", "h",
	"diff(v, x)", "diff(U, x, y)", "diff(g, x, 2)", "v(x+1, y)", "h(x*y)",
}

// generate draws a tree of at most the given depth.
func (c chooser) generate(depth int) *ast {
	if depth <= 0 || c(9) == 0 {
		return c.leaf()
	}
	sub := func() *ast { return c.generate(depth - 1 - c(2)) }
	switch c(16) {
	case 0, 1, 2:
		return opAST("+", sub(), sub())
	case 3, 4:
		return opAST("-", sub(), sub())
	case 5, 6, 7:
		return opAST("*", sub(), sub())
	case 8, 9:
		return opAST("/", sub(), sub())
	case 10, 11:
		return opAST("^", sub(), c.exponent())
	case 12:
		return c.identity(depth, sub)
	}
	return c.call(sub)
}

func (c chooser) leaf() *ast {
	if c(4) == 0 {
		return numAST(int64(c(7)-3), int64(1+c(3)))
	}
	return leafAST(genLeaves[c(len(genLeaves))])
}

func (c chooser) exponent() *ast {
	switch c(8) {
	case 0:
		return numAST(int64(c(5)-2), 2)
	case 1:
		return numAST(int64(1+c(3)), 3)
	case 2:
		return leafAST([]string{"a", "D", "c", "n"}[c(4)])
	case 3:
		return numAST(-int64(1+c(2)), 1)
	}
	return numAST(int64(2+c(2)), 1)
}

func (c chooser) call(sub func() *ast) *ast {
	square := func() *ast { return opAST("^", sub(), numAST(2, 1)) }
	switch c(16) {
	case 0, 1:
		return opAST("exp", sub())
	case 2:
		return opAST("log", opAST("+", numAST(1, 1), square()))
	case 3:
		return opAST("log", sub())
	case 4, 5:
		return opAST("sin", sub())
	case 6, 7:
		return opAST("cos", sub())
	case 8:
		return opAST([]string{"tan", "sinh", "cosh", "tanh"}[c(4)], sub())
	case 9:
		return opAST("abs", sub())
	case 10:
		return opAST("sign", sub())
	case 11:
		return opAST("sqrt", opAST("+", numAST(1, 1), square()))
	case 12:
		return opAST("sqrt", sub())
	case 13:
		return opAST("erf", sub())
	case 14:
		return opAST("gamma", opAST("+", leafAST("a"), numAST(int64(c(5)-2), int64(1+c(2)))))
	}
	return opAST("besseli", numAST(int64(c(4)), 1), sub())
}

// identity draws a tree whose value does not depend on part of it, so that
// cancellations happen inside larger expressions.
func (c chooser) identity(depth int, sub func() *ast) *ast {
	u, w := sub(), sub()
	sq := func(a *ast) *ast { return opAST("^", a, numAST(2, 1)) }
	switch c(8) {
	case 0: // sin^2 + cos^2
		return opAST("+", sq(opAST("sin", u)), sq(opAST("cos", u)))
	case 1: // u + w - u
		return opAST("-", opAST("+", u, w), u)
	case 2: // u w / u
		return opAST("/", opAST("*", u, w), u)
	case 3: // exp(u + w) exp(-u)
		return opAST("*", opAST("exp", opAST("+", u, w)), opAST("exp", opAST("neg", u)))
	case 4: // (u^2 - w^2)/(u - w)
		return opAST("/", opAST("-", sq(u), sq(w)), opAST("-", u, w))
	case 5: // sin(u + w)
		return opAST("-", opAST("sin", opAST("+", u, w)), opAST("*", opAST("sin", u), opAST("cos", w)))
	case 6: // sqrt(u^2)
		return opAST("sqrt", sq(u))
	}
	return opAST("exp", opAST("log", u))
}

var errSkip = errors.New("not defined here")

// valueAt is the value of the tree at a binding, or an error.
func (a *ast) valueAt(r *Ring, at Binding, prec uint) (out *big.Float, err error) {
	err = protect(func() error {
		out = a.value(newEvaluator(r, at, prec))
		return nil
	})
	if err != nil {
		return nil, errors.Join(errSkip, err)
	}
	return out, nil
}
