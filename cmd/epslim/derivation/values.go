package derivation

import (
	"fmt"
	"math"
	"math/big"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// Value holds drift and diffusion at one slow point.
type Value struct {
	At        *ito.Point
	Drift     []float64
	Diffusion [][]float64
	Error     float64 // bound on the absolute error
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
func (res *Result) valueAt(p *ito.Point) (*Value, error) {
	v := &Value{At: p}
	n := len(res.System.Slow)
	for i := 0; i < n; i++ {
		f, err := res.number(res.Limit.Drift[i], p)
		if err != nil {
			return nil, fmt.Errorf("drift of %s at %s: %w", res.System.Slow[i].Name, p.Text, err)
		}
		v.Drift = append(v.Drift, f)
		row := make([]float64, n)
		for j := range row {
			if row[j], err = res.number(res.Limit.Diffusion[i][j], p); err != nil {
				return nil, fmt.Errorf("diffusion of %s, %s at %s: %w", res.System.Slow[i].Name, res.System.Slow[j].Name, p.Text, err)
			}
			v.Error = math.Max(v.Error, math.Abs(row[j]))
		}
		v.Diffusion = append(v.Diffusion, row)
		v.Error = math.Max(v.Error, math.Abs(f))
	}
	v.Error = math.Max(v.Error, 1) * 0x1p-52
	return v, nil
}

// number evaluates e at a point, with formulas for functions and values for
// parameters.
func (res *Result) number(e algebra.Expr, p *ito.Point) (float64, error) {
	e, err := e.SubsFunc(res.System.Definitions())
	if err != nil {
		return 0, err
	}
	values := res.System.Values()
	for n, x := range p.Parameters {
		values[n] = x.Expr
	}
	for _, s := range e.Symbols() {
		if q := res.System.Parameter(s); q != nil && !values[s].Valid() {
			return 0, &MissingValue{s, "parameter"}
		}
	}
	for _, f := range e.Functions() {
		return 0, &MissingValue{f, "function"}
	}
	at := algebra.Binding{Values: map[string]*big.Float{}}
	bind := func(name string, x algebra.Expr) error {
		v, err := x.EvalBig(algebra.Binding{}, 160)
		if err == nil {
			at.Values[name] = v
		}
		return err
	}
	for n, x := range values {
		if err := bind(n, x); err != nil {
			return 0, err
		}
	}
	for i, v := range res.System.Slow {
		if err := bind(v.Name, p.Slow[i].Expr); err != nil {
			return 0, err
		}
	}
	v, err := e.EvalBig(at, 160)
	if err != nil {
		return 0, err
	}
	f, _ := v.Float64()
	if math.IsInf(f, 0) || math.IsNaN(f) {
		return 0, fmt.Errorf("the value is not finite")
	}
	return f, nil
}
