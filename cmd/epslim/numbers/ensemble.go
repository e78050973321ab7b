package numbers

import (
	"context"
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/solver/ensemble"
	"epslim/solver/kernel"
)

// LimitModel is the limit as a model for ensembles.
func LimitModel(ctx context.Context, res *derivation.Result) (*ensemble.Model, error) {
	if res.Noise == nil {
		return nil, fmt.Errorf("the noise factor of the limit is not known in closed form, so its paths cannot be simulated: %w", res.NoiseError)
	}
	l := NewLowering(res.System, kernel.NewBuilder(), slowNames(res))
	var exprs []algebra.Expr
	exprs = append(exprs, res.Limit.Drift...)
	for _, row := range res.Noise {
		exprs = append(exprs, row...)
	}
	ok, err := namedConstants(ctx, res, l, exprs)
	if err != nil {
		return nil, err
	}
	if !ok {
		return nil, fmt.Errorf("the limit is known by numbers that vary from place to place; ensembles of it are not possible")
	}
	nodes, err := l.Nodes(exprs...)
	if err != nil {
		return nil, err
	}
	m := &ensemble.Model{Title: "limit", Graph: l.Builder}
	n := len(res.System.Slow)
	cols := len(res.Noise[0])
	for i, v := range res.System.Slow {
		x, err := variable(res.System, v)
		if err != nil {
			return nil, err
		}
		m.Variables = append(m.Variables, x)
		m.Drift = append(m.Drift, nodes[i])
		m.Noise = append(m.Noise, nodes[n+i*cols:n+(i+1)*cols])
	}
	m.Observables, err = observables(res.System, l)
	return m, err
}

// FullModel is the full system at one value of the scale parameter, in the
// unit of time of the limit.
func FullModel(res *derivation.Result, eps float64) (*ensemble.Model, error) {
	sys := res.System
	vars := append(append([]*ito.Variable(nil), sys.Slow...), sys.Fast...)
	var names []string
	for _, v := range vars {
		names = append(names, v.Name)
	}
	l := NewLowering(sys, kernel.NewBuilder(), names)
	l.SetConstant(sys.Small, eps)
	p, _ := res.Limit.Power.Float64()
	speed := math.Pow(eps, -p) // of the limit's clock
	m := &ensemble.Model{Title: fmt.Sprintf("%s = %g", sys.Small, eps), Graph: l.Builder, Eps: eps, Wiener: sys.Noises}
	for _, v := range vars {
		e := sys.Equation(v.Name)
		nodes, err := l.Nodes(append([]algebra.Expr{e.Drift}, e.Noise...)...)
		if err != nil {
			return nil, err
		}
		x, err := variable(sys, v)
		if err != nil {
			return nil, err
		}
		m.Variables = append(m.Variables, x)
		m.Drift = append(m.Drift, l.Builder.Scale(speed, nodes[0]))
		row := nodes[1:]
		for k := range row {
			row[k] = l.Builder.Scale(math.Sqrt(speed), row[k])
		}
		m.Noise = append(m.Noise, row)
	}
	var err error
	m.Observables, err = observables(sys, l)
	return m, err
}

func observables(sys *ito.System, l *Lowering) ([]ensemble.Observable, error) {
	if len(sys.Observables) == 0 {
		var out []ensemble.Observable
		for _, v := range sys.Slow {
			out = append(out, ensemble.Observable{Name: v.Name, Value: l.Builder.Input(v.Name)})
		}
		return out, nil
	}
	var out []ensemble.Observable
	for _, o := range sys.Observables {
		n, err := l.Nodes(o.Value)
		if err != nil {
			return nil, fmt.Errorf("observable %s: %w", o.Name, err)
		}
		out = append(out, ensemble.Observable{Name: o.Name, Value: n[0]})
	}
	return out, nil
}

// number evaluates an expression of numbers and parameters.
func number(sys *ito.System, e algebra.Expr) (float64, error) {
	if err := sys.NeedNumbers(nil, e); err != nil {
		return 0, err
	}
	f, err := e.Subs(sys.Values())
	if err != nil {
		return 0, err
	}
	return f.EvalFloat(nil)
}

// variable is a variable with its domain and its starting point. Without a
// start statement a path begins in the middle of a bounded domain, at 1 on a
// half-line, at 0 elsewhere, and on a sphere at the first component.
func variable(sys *ito.System, v *ito.Variable) (ensemble.Variable, error) {
	out := ensemble.Variable{Name: v.Name, Fast: !v.Slow}
	var err error
	bounds := func(k ensemble.DomainKind) error {
		out.Domain.Kind = k
		if out.Domain.Lo, err = number(sys, v.Domain.A); err != nil {
			return err
		}
		if out.Domain.Hi, err = number(sys, v.Domain.B); err != nil {
			return err
		}
		out.Start = (out.Domain.Lo + out.Domain.Hi) / 2
		return nil
	}
	switch v.Domain.Kind {
	case ito.HalfLine:
		out.Domain.Kind, out.Start = ensemble.HalfLine, 1
	case ito.Circle:
		out.Domain.Kind = ensemble.Circle
	case ito.Periodic:
		err = bounds(ensemble.Periodic)
	case ito.Reflecting:
		err = bounds(ensemble.Reflecting)
	case ito.Absorbing:
		err = bounds(ensemble.Absorbing)
	case ito.OnSphere:
		out.Domain.Kind = ensemble.Sphere
		for _, s := range sys.Spheres {
			if s.Names[0] == v.Name {
				out.Start = 1
			}
		}
	}
	if err != nil {
		return out, err
	}
	for _, s := range sys.Starts {
		if s.Variable == v.Name {
			if out.Start, err = number(sys, s.Value); err != nil {
				return out, err
			}
		}
	}
	return out, nil
}

// Study prepares the comparison of the full system at several values of the
// scale parameter with the limit.
func Study(ctx context.Context, res *derivation.Result, eps []float64) (*ensemble.Study, error) {
	limit, err := LimitModel(ctx, res)
	if err != nil {
		return nil, err
	}
	st := &ensemble.Study{Limit: limit}
	for _, e := range eps {
		m, err := FullModel(res, e)
		if err != nil {
			return nil, err
		}
		st.Full = append(st.Full, m)
	}
	return st, nil
}

// Agreement judges a study: for each observable the differences from the
// limit must fall with eps, or be lost in the noise.
type Agreement struct {
	Observable string
	OK         bool
	Why        string
}

// Judge judges each observable of a study.
func Judge(c *ensemble.Convergence) []Agreement {
	var out []Agreement
	for i, name := range c.Limit.Observables {
		points, rate := c.Points[i], c.Rates[i]
		last := points[len(points)-1]
		z := 0.0
		if last.StdErr > 0 {
			z = math.Abs(last.Value) / last.StdErr
		}
		a := Agreement{Observable: name, OK: true}
		switch {
		case z < 4:
			a.Why = fmt.Sprintf("at eps = %g the mean differs from that of the limit by %.2g ± %.2g (z = %.1f)", last.Eps, last.Value, last.StdErr, z)
		case rate.Status == ensemble.RateOK && rate.Exponent > 0.4:
			a.Why = fmt.Sprintf("the difference falls like eps^%s, to %.2g ± %.2g at eps = %g", rate, last.Value, last.StdErr, last.Eps)
		default:
			a.OK = false
			a.Why = fmt.Sprintf("at eps = %g the mean differs by %.2g ± %.2g (z = %.1f) and the difference does not fall with eps (rate %s)", last.Eps, last.Value, last.StdErr, z, rate)
		}
		out = append(out, a)
	}
	return out
}

// Steps is the number of steps that a path of a model takes with the
// recommended step.
func Steps(m *ensemble.Model, time float64) (float64, error) {
	scheme, _, err := m.DefaultScheme()
	if err != nil {
		return 0, err
	}
	a, err := m.Advise(scheme, time)
	if err != nil {
		return 0, err
	}
	return math.Ceil(time / a.Step), nil
}

// Affordable keeps the values of eps at which the given number of paths costs
// at most budget steps in all.
func Affordable(res *derivation.Result, eps []float64, time float64, paths uint64, budget float64) ([]float64, error) {
	var out []float64
	for _, e := range eps {
		m, err := FullModel(res, e)
		if err != nil {
			return nil, err
		}
		n, err := Steps(m, time)
		if err != nil {
			return nil, err
		}
		if n*float64(paths) <= budget {
			out = append(out, e)
		}
	}
	return out, nil
}
