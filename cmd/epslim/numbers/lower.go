package numbers

import (
	"fmt"

	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/solver/kernel"
)

// Lowering lowers expressions of one system into one builder.
type Lowering struct {
	Builder *kernel.Builder
	system  *ito.System
	consts  map[string]float64 // further names with a value
	inputs  map[string]bool
}

// NewLowering prepares a builder whose inputs are the given names; everything
// else must have a value.
func NewLowering(sys *ito.System, b *kernel.Builder, inputs []string) *Lowering {
	l := &Lowering{Builder: b, system: sys, consts: map[string]float64{}, inputs: map[string]bool{}}
	for _, n := range inputs {
		l.inputs[n] = true
		b.Input(n)
	}
	return l
}

// SetConstant gives a name a value, such as eps or a named average.
func (l *Lowering) SetConstant(name string, v float64) { l.consts[name] = v }

// Nodes lowers expressions. An error names what has no value; see also
// ito.System.NeedNumbers, which points at the declarations.
func (l *Lowering) Nodes(exprs ...algebra.Expr) ([]kernel.Node, error) {
	if err := l.system.NeedNumbers(nil, exprs...); err != nil {
		return nil, err
	}
	defs := l.system.Definitions()
	subs := make([]algebra.Expr, len(exprs))
	for i, e := range exprs {
		f, err := e.SubsFunc(defs)
		if err != nil {
			return nil, err
		}
		subs[i] = f
	}
	return algebra.LowerTo(target{l}, subs...)
}

// target maps the operations of algebra to those of a kernel.Builder.
type target struct{ l *Lowering }

func (t target) b() *kernel.Builder { return t.l.Builder }

func (t target) Input(name string) (kernel.Node, error) {
	if t.l.inputs[name] {
		return t.b().Input(name), nil
	}
	if v, ok := t.l.consts[name]; ok {
		return t.b().Const(v), nil
	}
	if p := t.l.system.Parameter(name); p != nil && p.Value != nil {
		v, _ := p.Value.Float64()
		return t.b().Const(v), nil
	}
	return 0, fmt.Errorf("no value for %s", name)
}

func (t target) Const(c float64) kernel.Node              { return t.b().Const(c) }
func (t target) Add(x, y kernel.Node) kernel.Node         { return t.b().Add(x, y) }
func (t target) Sub(x, y kernel.Node) kernel.Node         { return t.b().Sub(x, y) }
func (t target) Mul(x, y kernel.Node) kernel.Node         { return t.b().Mul(x, y) }
func (t target) Div(x, y kernel.Node) kernel.Node         { return t.b().Div(x, y) }
func (t target) Neg(x kernel.Node) kernel.Node            { return t.b().Neg(x) }
func (t target) PowInt(x kernel.Node, n int) kernel.Node  { return t.b().PowInt(x, n) }
func (t target) Pow(x, y kernel.Node) kernel.Node         { return t.b().Pow(x, y) }
func (t target) Sqrt(x kernel.Node) kernel.Node           { return t.b().Sqrt(x) }
func (t target) Exp(x kernel.Node) kernel.Node            { return t.b().Exp(x) }
func (t target) Log(x kernel.Node) kernel.Node            { return t.b().Log(x) }
func (t target) Sin(x kernel.Node) kernel.Node            { return t.b().Sin(x) }
func (t target) Cos(x kernel.Node) kernel.Node            { return t.b().Cos(x) }
func (t target) Sinh(x kernel.Node) kernel.Node           { return t.b().Sinh(x) }
func (t target) Cosh(x kernel.Node) kernel.Node           { return t.b().Cosh(x) }
func (t target) Tanh(x kernel.Node) kernel.Node           { return t.b().Tanh(x) }
func (t target) Abs(x kernel.Node) kernel.Node            { return t.b().Abs(x) }
func (t target) Sign(x kernel.Node) kernel.Node           { return t.b().Sign(x) }
func (t target) Erf(x kernel.Node) kernel.Node            { return t.b().Erf(x) }
func (t target) Gamma(x kernel.Node) kernel.Node          { return t.b().Gamma(x) }
func (t target) BesselI(n int, x kernel.Node) kernel.Node { return t.b().BesselI(n, x) }
