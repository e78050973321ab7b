package derivation

import (
	"context"
	"fmt"
	"math"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// Value holds drift and diffusion at one slow point.
type Value struct {
	At        *ito.Point
	Drift     []float64
	Diffusion [][]float64
	Error     float64 // bound on the absolute error
	// SmallEnough is the small parameter below which the first correction
	// changes drift and diffusion by less than one per cent of the largest
	// entry of each; zero where no correction was derived.
	SmallEnough float64
}

// MissingValue reports that a number was asked for where a parameter has no
// value or a function no formula.
type MissingValue struct{ Name, Kind string }

func (m *MissingValue) Error() string {
	if m.Kind == "function" {
		return fmt.Sprintf("numbers were asked for, but the function %s has no formula; give one in the model file or with --set", m.Name)
	}
	return fmt.Sprintf("numbers were asked for, but the parameter %s has no value; give one in the model file or with --set %s=...", m.Name, m.Name)
}

// valueAt evaluates the limit at a point.
func (res *Result) valueAt(ctx context.Context, p *ito.Point) (*Value, error) {
	v := &Value{At: p}
	eval, err := res.evaluator(ctx, p)
	if err != nil {
		return nil, err
	}
	n := len(res.System.Slow)
	for i := 0; i < n; i++ {
		f, de, err := eval(res.Limit.Drift[i])
		if err != nil {
			return nil, fmt.Errorf("drift of %s at %s: %w", res.System.Slow[i].Name, p.Text, err)
		}
		v.Drift = append(v.Drift, f)
		row := make([]float64, n)
		for j := range row {
			var de float64
			if row[j], de, err = eval(res.Limit.Diffusion[i][j]); err != nil {
				return nil, fmt.Errorf("diffusion of %s, %s at %s: %w", res.System.Slow[i].Name, res.System.Slow[j].Name, p.Text, err)
			}
			v.Error = math.Max(v.Error, de)
		}
		v.Diffusion = append(v.Diffusion, row)
		v.Error = math.Max(v.Error, de)
	}
	return v, res.smallEnough(v, eval)
}

// smallEnough compares the first correction with the limit.
func (res *Result) smallEnough(v *Value, eval func(algebra.Expr) (float64, float64, error)) error {
	if len(res.Limit.Corrections) == 0 {
		return nil
	}
	c := res.Limit.Corrections[0]
	p, _ := c.Power.Float64()
	size := func(xs ...float64) (m float64) {
		for _, x := range xs {
			m = math.Max(m, math.Abs(x))
		}
		return m
	}
	bound := math.Inf(1)
	add := func(limit float64, es ...algebra.Expr) error {
		m := 0.0
		for _, e := range es {
			x, _, err := eval(e)
			if err != nil {
				return err
			}
			m = size(m, x)
		}
		if m > 0 && limit > 0 {
			bound = math.Min(bound, math.Pow(0.01*limit/m, 1/p))
		}
		return nil
	}
	if err := add(size(v.Drift...), c.Drift...); err != nil {
		return err
	}
	limit := 0.0
	var entries []algebra.Expr
	for i, row := range v.Diffusion {
		limit = size(limit, size(row...))
		entries = append(entries, c.Diffusion[i]...)
	}
	if err := add(limit, entries...); err != nil {
		return err
	}
	if !math.IsInf(bound, 1) {
		v.SmallEnough = bound
	}
	return nil
}

// evaluator evaluates expressions at a point, with formulas for functions and
// values for parameters; averages that are known by name only are computed.
// The second result bounds the absolute error.
func (res *Result) evaluator(ctx context.Context, p *ito.Point) (func(algebra.Expr) (float64, float64, error), error) {
	point := res.Route.At(nil, false)
	bind := func(name string, x algebra.Expr) error {
		v, err := x.EvalBig(algebra.Binding{}, 200)
		if err == nil {
			point.Bind(name, v)
		}
		return err
	}
	known := map[string]bool{"pi": true}
	for n, x := range p.Parameters {
		if err := bind(n, x.Expr); err != nil {
			return nil, err
		}
		known[n] = true
	}
	for i, v := range res.System.Slow {
		if err := bind(v.Name, p.Slow[i].Expr); err != nil {
			return nil, err
		}
	}
	for n := range res.System.Values() {
		known[n] = true
	}
	return func(e algebra.Expr) (float64, float64, error) {
		if err := res.missing(e, known); err != nil {
			return 0, 0, err
		}
		v, de, err := point.Value(ctx, e)
		if err == nil && (math.IsInf(v, 0) || math.IsNaN(v)) {
			err = fmt.Errorf("the value is not finite")
		}
		return v, de, err
	}, nil
}

// missing names the first parameter without a value or function without a
// formula that e needs. What stands behind named averages is checked with the
// fast process.
func (res *Result) missing(e algebra.Expr, known map[string]bool) error {
	exprs := []algebra.Expr{e}
	if res.Route.IsNumerical(e) {
		for _, t := range res.Limit.Process.L0.Terms() {
			exprs = append(exprs, t.Coef)
		}
	}
	defs := res.System.Definitions()
	for _, x := range exprs {
		x, err := x.SubsFunc(defs)
		if err != nil {
			return err
		}
		for _, s := range x.Symbols() {
			if q := res.System.Parameter(s); q != nil && !known[s] {
				return &MissingValue{s, "parameter"}
			}
		}
		for _, f := range x.Functions() {
			if res.System.Function(f) != nil {
				return &MissingValue{f, "function"}
			}
		}
	}
	return nil
}
