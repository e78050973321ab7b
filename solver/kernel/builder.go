package kernel

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Node names a value inside the Builder that made it. The zero Node is the
// constant 0 of every Builder.
type Node int32

// kind is the operation of a node before lowering. Differences, negations and
// quotients by constants have no kind of their own: they are sums and scalings.
type kind uint8

const (
	kindConst kind = iota
	kindInput      // imm: index of the input
	kindScale      // imm * a
	kindAdd        // a + b
	kindMul        // a * b
	kindDiv        // a / b
	kindSqrt       // sqrt(a)
	kindAbs        // |a|
	kindFloor      // floor(a)
	kindMin        // min(a, b)
	kindMax        // max(a, b)
	kindSin        // sin(a)
	kindCos        // cos(a)
	kindExp        // exp(a)
	kindLog        // log(a)
	kindCall1      // scalar function of one argument, fn
	kindCall2      // scalar function of two arguments, fn
)

type node struct {
	kind kind
	fn   function
	a, b Node
	imm  float64
}

// Builder collects the nodes of one or more expressions. It is not safe for
// concurrent use. Its rewrites are those of exact arithmetic (a common factor
// is pulled in front of a product, 0*x is 0 even where x is not finite), so
// results may differ in the last places from a literal evaluation.
type Builder struct {
	nodes  []node
	index  map[node]Node
	inputs []string
	err    error
}

// NewBuilder returns a Builder with the given inputs declared in this order.
func NewBuilder(inputs ...string) *Builder {
	b := &Builder{index: map[node]Node{}}
	b.Const(0)
	for _, name := range inputs {
		b.Input(name)
	}
	return b
}

// Inputs returns the names of the inputs in the order of their declaration.
func (b *Builder) Inputs() []string { return slices.Clone(b.inputs) }

// Err returns the first misuse of the Builder, such as a Node of another
// Builder; Compile returns it too.
func (b *Builder) Err() error { return b.err }

func (b *Builder) fail(err error) Node {
	if b.err == nil {
		b.err = err
	}
	return 0
}

func (b *Builder) ok(x Node) bool { return x >= 0 && int(x) < len(b.nodes) }

func (b *Builder) intern(n node) Node {
	if n.operands() > 0 && !(b.ok(n.a) && b.ok(n.b)) {
		return b.fail(fmt.Errorf("kernel: a node that this builder did not make was used as an operand"))
	}
	if n.kind == kindConst && math.IsNaN(n.imm) {
		b.nodes = append(b.nodes, n) // NaN is unequal to itself: no key
		return Node(len(b.nodes) - 1)
	}
	if id, ok := b.index[n]; ok {
		return id
	}
	b.nodes = append(b.nodes, n)
	id := Node(len(b.nodes) - 1)
	b.index[n] = id
	return id
}

func (b *Builder) constant(x Node) (float64, bool) {
	if !b.ok(x) {
		b.fail(errors.New("kernel: a node that this builder did not make was used as an operand"))
		return 0, false
	}
	n := &b.nodes[x]
	return n.imm, n.kind == kindConst
}

// split writes x as c times a node that is neither a scaling nor, unless x is
// a constant, a constant.
func (b *Builder) split(x Node) (float64, Node) {
	if !b.ok(x) {
		b.constant(x) // records the misuse
		return 1, 0
	}
	if n := &b.nodes[x]; n.kind == kindScale {
		return n.imm, n.a
	}
	return 1, x
}

// Const returns the constant c.
func (b *Builder) Const(c float64) Node {
	if c == 0 {
		c = 0 // one zero: the sign of a constant zero is not kept
	}
	return b.intern(node{kind: kindConst, imm: c})
}

// Value returns the value of x when x is a constant.
func (b *Builder) Value(x Node) (float64, bool) { return b.constant(x) }

// Input returns the input of that name and declares it on first use.
func (b *Builder) Input(name string) Node {
	i := slices.Index(b.inputs, name)
	if i < 0 {
		i = len(b.inputs)
		b.inputs = append(b.inputs, name)
	}
	return b.intern(node{kind: kindInput, imm: float64(i)})
}

// Scale returns c*x for a number c.
func (b *Builder) Scale(c float64, x Node) Node {
	v, isConst := b.constant(x)
	switch {
	case isConst:
		return b.Const(c * v)
	case c == 0:
		return b.Const(0)
	}
	d, y := b.split(x)
	if c *= d; c == 1 {
		return y
	}
	return b.intern(node{kind: kindScale, a: y, imm: c})
}

// Neg returns -x.
func (b *Builder) Neg(x Node) Node { return b.Scale(-1, x) }

// Add returns x + y.
func (b *Builder) Add(x, y Node) Node {
	cx, isX := b.constant(x)
	cy, isY := b.constant(y)
	switch {
	case isX && isY:
		return b.Const(cx + cy)
	case isX:
		x, y, cy, isY = y, x, cx, true
	}
	if isY {
		if cy == 0 {
			return x
		}
		if !b.ok(x) {
			return 0
		}
		if n := b.nodes[x]; n.kind == kindAdd {
			if c, ok := b.constant(n.b); ok { // (a + c) + cy
				return b.Add(n.a, b.Const(c+cy))
			}
		}
		return b.intern(node{kind: kindAdd, a: x, b: y}) // a constant stands last
	}
	fx, ux := b.split(x)
	if fy, uy := b.split(y); ux == uy {
		return b.Scale(fx+fy, ux)
	}
	if x > y {
		x, y = y, x
	}
	return b.intern(node{kind: kindAdd, a: x, b: y})
}

// Sub returns x - y.
func (b *Builder) Sub(x, y Node) Node { return b.Add(x, b.Neg(y)) }

// Sum returns the sum of the arguments, added from the left; 0 for none.
func (b *Builder) Sum(xs ...Node) Node {
	var s Node
	for _, x := range xs {
		s = b.Add(s, x)
	}
	return s
}

// Mul returns x * y.
func (b *Builder) Mul(x, y Node) Node {
	if c, ok := b.constant(x); ok {
		return b.Scale(c, y)
	}
	if c, ok := b.constant(y); ok {
		return b.Scale(c, x)
	}
	cx, x := b.split(x)
	cy, y := b.split(y)
	if x > y {
		x, y = y, x
	}
	return b.Scale(cx*cy, b.intern(node{kind: kindMul, a: x, b: y}))
}

// Prod returns the product of the arguments, multiplied from the left; 1 for none.
func (b *Builder) Prod(xs ...Node) Node {
	p := b.Const(1)
	for _, x := range xs {
		p = b.Mul(p, x)
	}
	return p
}

// Div returns x / y. Division by a constant multiplies by its reciprocal.
func (b *Builder) Div(x, y Node) Node {
	if c, ok := b.constant(y); ok {
		if v, isConst := b.constant(x); isConst {
			return b.Const(v / c)
		}
		if r := 1 / c; !math.IsInf(r, 0) {
			return b.Scale(r, x)
		}
	}
	if c, ok := b.constant(x); ok && c == 0 {
		return b.Const(0)
	}
	cy, y := b.split(y)
	if c, ok := b.constant(x); ok {
		return b.Scale(c/cy, b.intern(node{kind: kindDiv, a: b.Const(1), b: y}))
	}
	cx, x := b.split(x)
	if x == y {
		return b.Const(cx / cy)
	}
	return b.Scale(cx/cy, b.intern(node{kind: kindDiv, a: x, b: y}))
}

// FMA returns x*y + z; lowering fuses every product that is added once, so this
// is a convenience.
func (b *Builder) FMA(x, y, z Node) Node { return b.Add(b.Mul(x, y), z) }

// PowInt returns x to the integer power n by repeated squaring; x^0 is 1.
func (b *Builder) PowInt(x Node, n int) Node {
	if n < 0 {
		return b.Div(b.Const(1), b.PowInt(x, -n))
	}
	r := b.Const(1)
	for p := x; ; p = b.Mul(p, p) {
		if n&1 == 1 {
			r = b.Mul(r, p)
		}
		if n >>= 1; n == 0 {
			return r
		}
	}
}

// maxPowInt is the largest integer power that is multiplied out; beyond it the
// rounding of repeated squaring is worse than that of the general power.
const maxPowInt = 64

// Pow returns x^y. Constant integer and half-integer exponents up to 64 become
// products and square roots.
func (b *Builder) Pow(x, y Node) Node {
	if e, ok := b.constant(y); ok {
		if e == math.Trunc(e) && math.Abs(e) <= maxPowInt {
			return b.PowInt(x, int(e))
		}
		if h := 2 * e; h == math.Trunc(h) && math.Abs(h) <= maxPowInt {
			r := b.Sqrt(x)
			p := b.Mul(b.PowInt(x, int(math.Abs(h))/2), r)
			if e < 0 {
				return b.Div(b.Const(1), p)
			}
			return p
		}
	}
	return b.call2(fnPow, x, y)
}

func (b *Builder) unary(k kind, x Node, f func(float64) float64) Node {
	if c, ok := b.constant(x); ok {
		return b.Const(f(c))
	}
	return b.intern(node{kind: k, a: x})
}

// Sqrt returns the square root of x.
func (b *Builder) Sqrt(x Node) Node { return b.unary(kindSqrt, x, math.Sqrt) }

// Exp returns e^x.
func (b *Builder) Exp(x Node) Node { return b.unary(kindExp, x, Exp) }

// Log returns the natural logarithm of x.
func (b *Builder) Log(x Node) Node { return b.unary(kindLog, x, Log) }

// Floor returns the largest integer not above x.
func (b *Builder) Floor(x Node) Node { return b.unary(kindFloor, x, math.Floor) }

// Abs returns |x|.
func (b *Builder) Abs(x Node) Node {
	if c, ok := b.constant(x); ok {
		return b.Const(math.Abs(c))
	}
	c, u := b.split(x)
	return b.Scale(math.Abs(c), b.intern(node{kind: kindAbs, a: u}))
}

// Sin returns the sine of x.
func (b *Builder) Sin(x Node) Node {
	if c, u := b.split(x); c < 0 {
		return b.Neg(b.Sin(b.Scale(-c, u)))
	}
	return b.unary(kindSin, x, Sin)
}

// Cos returns the cosine of x.
func (b *Builder) Cos(x Node) Node {
	if c, u := b.split(x); c < 0 {
		return b.Cos(b.Scale(-c, u))
	}
	return b.unary(kindCos, x, Cos)
}

// SinCos returns sine and cosine of x; lowering computes both at once whenever
// both are used, so this is a convenience.
func (b *Builder) SinCos(x Node) (sin, cos Node) { return b.Sin(x), b.Cos(x) }

// Tan returns sin(x)/cos(x), within 4 units in the last place.
func (b *Builder) Tan(x Node) Node { return b.Div(b.Sin(x), b.Cos(x)) }

// Min returns the smaller of x and y; y where either is not a number.
func (b *Builder) Min(x, y Node) Node { return b.binary(kindMin, x, y, minimum) }

// Max returns the larger of x and y; y where either is not a number.
func (b *Builder) Max(x, y Node) Node { return b.binary(kindMax, x, y, maximum) }

func (b *Builder) binary(k kind, x, y Node, f func(x, y float64) float64) Node {
	cx, isX := b.constant(x)
	if cy, isY := b.constant(y); isX && isY {
		return b.Const(f(cx, cy))
	}
	return b.intern(node{kind: k, a: x, b: y})
}

// Sinh returns the hyperbolic sine of x.
func (b *Builder) Sinh(x Node) Node { return b.call1(fnSinh, x, 0) }

// Cosh returns the hyperbolic cosine of x.
func (b *Builder) Cosh(x Node) Node { return b.call1(fnCosh, x, 0) }

// Tanh returns the hyperbolic tangent of x.
func (b *Builder) Tanh(x Node) Node { return b.call1(fnTanh, x, 0) }

// Sign returns -1, 0 or 1 with the sign of x; NaN for NaN.
func (b *Builder) Sign(x Node) Node { return b.call1(fnSign, x, 0) }

// Erf returns the error function of x.
func (b *Builder) Erf(x Node) Node { return b.call1(fnErf, x, 0) }

// Gamma returns Euler's gamma function of x.
func (b *Builder) Gamma(x Node) Node { return b.call1(fnGamma, x, 0) }

// BesselI returns the modified Bessel function of the first kind I_n(x), n an
// integer; I_{-n} = I_n.
func (b *Builder) BesselI(n int, x Node) Node {
	if n < 0 {
		n = -n
	}
	return b.call1(fnBesselI, x, float64(n))
}

func (b *Builder) call1(fn function, x Node, imm float64) Node {
	if c, ok := b.constant(x); ok {
		return b.Const(fn.apply1(c, imm))
	}
	return b.intern(node{kind: kindCall1, fn: fn, a: x, imm: imm})
}

func (b *Builder) call2(fn function, x, y Node) Node {
	cx, isX := b.constant(x)
	if cy, isY := b.constant(y); isX && isY {
		return b.Const(fn.apply2(cx, cy))
	}
	return b.intern(node{kind: kindCall2, fn: fn, a: x, b: y})
}
