package numeric

import (
	"context"
	"fmt"
	"math"

	"epslim/generator/algebra"
	"epslim/perturb/cell/quadrature/fast"
)

// function turns an expression in the fast variables, which may contain named
// correctors, into a handle of the solver.
func (p *Point) function(ctx context.Context, e algebra.Expr) (fast.Function, error) {
	parts, err := p.r.p.Reduce(e).SplitReal(p.r.p.Names()...)
	if err != nil {
		return fast.Function{}, err
	}
	var terms []fast.Scaled
	var plain []algebra.RealPart
	for _, part := range parts {
		if !p.r.hasPhi(part) {
			plain = append(plain, part)
			continue
		}
		c, _, err := p.coef(ctx, part.Coef)
		if err != nil {
			return fast.Function{}, err
		}
		f, err := p.product(ctx, part)
		if err != nil {
			return fast.Function{}, err
		}
		terms = append(terms, fast.Scaled{Factor: c, Function: f})
	}
	if len(plain) > 0 || len(terms) == 0 {
		c, err := p.fromParts(ctx, e.String(), plain)
		if err != nil {
			return fast.Function{}, err
		}
		terms = append(terms, fast.Scaled{Factor: 1, Function: p.solver.Coefficient(c)})
	}
	return p.solver.Sum(terms...), nil
}

// product is the product of explicit atoms and derivatives of correctors.
func (p *Point) product(ctx context.Context, part algebra.RealPart) (fast.Function, error) {
	explicit := algebra.RealPart{Coef: p.r.p.Ring.Int(1), Fn: p.r.p.Ring.Int(1)}
	var fs []fast.Function
	for _, a := range part.Atoms {
		n := p.r.byPhi[a.Func]
		if a.Kind != algebra.AtomFunc || n == nil {
			explicit.Atoms = append(explicit.Atoms, a)
			explicit.Fn = explicit.Fn.Mul(a.Expr)
			continue
		}
		k := len(n.MeanArgs)
		s, err := p.phi(ctx, n, a.Deriv[:k])
		if err != nil {
			return fast.Function{}, err
		}
		f := s.phi
		if total(a.Deriv[k:]) > 0 {
			f = p.solver.Apply(fast.Derivative(fast.Constant(1), a.Deriv[k:]...), f)
		}
		q, ok := a.Power.IsConstant()
		if !ok || !q.IsInt() || q.Sign() <= 0 {
			return fast.Function{}, fmt.Errorf("the corrector %s occurs to the power %s", n.Phi, a.Power)
		}
		for i := int64(0); i < q.Num().Int64(); i++ {
			fs = append(fs, f)
		}
	}
	out := fs[0]
	for _, f := range fs[1:] {
		out = p.solver.Product(out, f)
	}
	if len(explicit.Atoms) == 0 {
		return out, nil
	}
	c, err := p.fromParts(ctx, explicit.Fn.String(), []algebra.RealPart{explicit})
	if err != nil {
		return fast.Function{}, err
	}
	return p.solver.Apply(fast.Multiply(c), out), nil
}

func total(d []int) int {
	n := 0
	for _, k := range d {
		n += k
	}
	return n
}

// coefficient turns an expression without correctors into a coefficient.
func (p *Point) coefficient(ctx context.Context, e algebra.Expr) (fast.Coefficient, error) {
	if e.IsZero() {
		return fast.Coefficient{}, nil
	}
	e = p.r.p.Reduce(e)
	parts, err := e.SplitReal(p.r.p.Names()...)
	if err != nil {
		return fast.Coefficient{}, err
	}
	return p.fromParts(ctx, e.String(), parts)
}

// fromParts writes a sum of products with numbers for the slow coefficients;
// a factor of several fast variables makes the whole an ordinary function.
func (p *Point) fromParts(ctx context.Context, name string, parts []algebra.RealPart) (fast.Coefficient, error) {
	out := fast.Coefficient{Name: name, Terms: []fast.Term{}}
	for _, part := range parts {
		c, _, err := p.coef(ctx, part.Coef)
		if err != nil {
			return out, err
		}
		t := fast.Term{Constant: c}
		for _, a := range part.Atoms {
			f, ok, err := p.factor(ctx, a)
			if err != nil {
				return out, err
			}
			if !ok {
				return p.dense(ctx, name, parts)
			}
			t.Factors = append(t.Factors, f)
		}
		out.Terms = append(out.Terms, t)
	}
	return out, nil
}

// factor is an atom of one fast variable; ok is false for several.
func (p *Point) factor(ctx context.Context, a algebra.Atom) (fast.Factor, bool, error) {
	index := func(name string) int {
		for i, v := range p.r.p.Fast {
			if v.Name == name {
				return i
			}
		}
		return -1
	}
	switch a.Kind {
	case algebra.AtomPower:
		q, _ := a.Power.IsConstant()
		x, _ := q.Float64()
		return fast.Factor{Coordinate: index(a.Var), Kind: fast.Power, P: x}, true, nil
	case algebra.AtomCos, algebra.AtomSin:
		w, _, err := p.coef(ctx, a.Frequency)
		if err != nil {
			return fast.Factor{}, false, err
		}
		k := fast.Cos
		if a.Kind == algebra.AtomSin {
			k = fast.Sin
		}
		return fast.Factor{Coordinate: index(a.Var), Kind: k, P: w}, true, nil
	}
	only := -1
	for i, v := range p.r.p.Fast {
		if a.Expr.DependsOn(v.Name) {
			if only >= 0 {
				return fast.Factor{}, false, nil
			}
			only = i
		}
	}
	f, err := p.compile(ctx, a.Expr, []string{p.r.p.Fast[only].Name})
	if err != nil {
		return fast.Factor{}, false, err
	}
	return fast.Factor{Coordinate: only, Kind: fast.Other, Func: func(y float64) float64 { return f([]float64{y}) }}, true, nil
}

func (p *Point) dense(ctx context.Context, name string, parts []algebra.RealPart) (fast.Coefficient, error) {
	sum := p.r.p.Ring.Int(0)
	for _, part := range parts {
		sum = sum.Add(part.Coef.Mul(part.Fn))
	}
	f, err := p.compile(ctx, sum, p.r.p.Names())
	if err != nil {
		return fast.Coefficient{}, err
	}
	return fast.FuncN(name, f), nil
}

// compile makes a Go function of the named variables; everything else gets
// its number now.
func (p *Point) compile(ctx context.Context, e algebra.Expr, vars []string) (func([]float64) float64, error) {
	e, err := e.SubsFunc(p.defs)
	if err != nil {
		return nil, err
	}
	t := &closures{ctx: ctx, p: p, vars: vars}
	fs, err := algebra.LowerTo[evalFunc](t, e)
	if err != nil {
		return nil, err
	}
	return fs[0], nil
}

type evalFunc = func([]float64) float64

// closures is a lowering target that composes Go functions.
type closures struct {
	ctx  context.Context
	p    *Point
	vars []string
}

func (c *closures) Const(v float64) evalFunc { return func([]float64) float64 { return v } }

func (c *closures) Input(name string) (evalFunc, error) {
	for i, v := range c.vars {
		if v == name {
			return func(y []float64) float64 { return y[i] }, nil
		}
	}
	s, ok := c.p.r.p.Ring.Symbol(name)
	if !ok {
		return nil, fmt.Errorf("%w: %s has no value", algebra.ErrNotLowered, name)
	}
	v, _, err := c.p.coef(c.ctx, s)
	if err != nil {
		return nil, err
	}
	return c.Const(v), nil
}

func (c *closures) one(x evalFunc, f func(float64) float64) evalFunc {
	return func(y []float64) float64 { return f(x(y)) }
}

func (c *closures) Add(x, y evalFunc) evalFunc {
	return func(p []float64) float64 { return x(p) + y(p) }
}
func (c *closures) Sub(x, y evalFunc) evalFunc {
	return func(p []float64) float64 { return x(p) - y(p) }
}
func (c *closures) Mul(x, y evalFunc) evalFunc {
	return func(p []float64) float64 { return x(p) * y(p) }
}
func (c *closures) Div(x, y evalFunc) evalFunc {
	return func(p []float64) float64 { return x(p) / y(p) }
}
func (c *closures) Pow(x, y evalFunc) evalFunc {
	return func(p []float64) float64 { return math.Pow(x(p), y(p)) }
}
func (c *closures) PowInt(x evalFunc, n int) evalFunc {
	return c.one(x, func(v float64) float64 {
		out := 1.0
		for k, b := n, v; k > 0; k >>= 1 {
			if k&1 == 1 {
				out *= b
			}
			b *= b
		}
		return out
	})
}
func (c *closures) Neg(x evalFunc) evalFunc   { return c.one(x, func(v float64) float64 { return -v }) }
func (c *closures) Sqrt(x evalFunc) evalFunc  { return c.one(x, math.Sqrt) }
func (c *closures) Exp(x evalFunc) evalFunc   { return c.one(x, math.Exp) }
func (c *closures) Log(x evalFunc) evalFunc   { return c.one(x, math.Log) }
func (c *closures) Sin(x evalFunc) evalFunc   { return c.one(x, math.Sin) }
func (c *closures) Cos(x evalFunc) evalFunc   { return c.one(x, math.Cos) }
func (c *closures) Sinh(x evalFunc) evalFunc  { return c.one(x, math.Sinh) }
func (c *closures) Cosh(x evalFunc) evalFunc  { return c.one(x, math.Cosh) }
func (c *closures) Tanh(x evalFunc) evalFunc  { return c.one(x, math.Tanh) }
func (c *closures) Abs(x evalFunc) evalFunc   { return c.one(x, math.Abs) }
func (c *closures) Erf(x evalFunc) evalFunc   { return c.one(x, math.Erf) }
func (c *closures) Gamma(x evalFunc) evalFunc { return c.one(x, math.Gamma) }
func (c *closures) Sign(x evalFunc) evalFunc {
	return c.one(x, func(v float64) float64 {
		switch {
		case v > 0:
			return 1
		case v < 0:
			return -1
		}
		return 0
	})
}
func (c *closures) BesselI(n int, x evalFunc) evalFunc {
	return c.one(x, func(v float64) float64 { return besselI(n, v) })
}

// besselI is I_n(x) = 1/pi int_0^pi exp(x cos t) cos(n t) dt (Abramowitz and
// Stegun 9.6.19); the trapezoidal rule converges geometrically.
func besselI(n int, x float64) float64 {
	m := 40 + n + int(2*math.Sqrt(math.Abs(x))*6)
	sum := 0.0
	for k := 0; k <= m; k++ {
		t := math.Pi * float64(k) / float64(m)
		w := 1.0
		if k == 0 || k == m {
			w = 0.5
		}
		sum += w * math.Exp(x*math.Cos(t)-math.Abs(x)) * math.Cos(float64(n)*t)
	}
	return sum / float64(m) * math.Exp(math.Abs(x))
}
