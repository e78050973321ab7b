// Package derivation assembles one model's whole result: generator,
// expansion, limit, stationary law, certificates, verdicts on claims and
// values at points. Every output of the program is a rendering of this one
// object, so that outputs cannot disagree.
package derivation

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/big"

	"epslim/fokkerplanck"
	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/perturb"
	"epslim/perturb/cell"
	"epslim/perturb/cell/numeric"
)

// Options of a derivation.
type Options struct {
	At          []string // points at which numbers are wanted, as "x=0.3,y=0.2"
	SkipClaims  bool     // leave the claims alone, for work that needs the limit only
	MovingFrame bool     // subtract a large mean drift instead of refusing it
	Next        int      // powers of the small parameter beyond the limit
}

// Result is everything that was found about one model.
type Result struct {
	System       *ito.System
	Generator    *generator.Graded
	Refused      *perturb.Refusal // if not nil, the rest is empty
	Limit        *perturb.Limit
	Noise        [][]algebra.Expr // smallest factor of sigma sigma^T; nil when it was not found
	NoiseError   error
	Stratonovich []algebra.Expr
	Diffusion    *fokkerplanck.Diffusion
	Stationary   *fokkerplanck.Stationary
	Conditions   []string
	Certificates []Certificate
	Claims       []Verdict
	Values       []Value
	Exact        bool
	Route        *numeric.Route // evaluates averages that are known by name only
}

// Status of a certificate.
type Status string

// The states of a certificate.
const (
	Exact     Status = "exact"
	Numerical Status = "numerical"
	Failed    Status = "failed"
)

// Certificate records one check of the derivation.
type Certificate struct {
	What   string
	Status Status
	Detail string
}

// factorBudget bounds the work on the noise factor, in term operations.
const factorBudget = 40_000_000

// Run derives the limit of a system and checks everything that was claimed.
// The error is for models and points that cannot be worked with; a model
// without a limit is a Result with Refused set.
func Run(ctx context.Context, sys *ito.System, opt Options) (*Result, error) {
	res := &Result{System: sys, Exact: true}
	sys.Ring.Watch(ctx)
	err := algebra.Guard(func() error { return res.run(ctx, opt) })
	if errors.Is(err, algebra.ErrTooLarge) {
		return nil, fmt.Errorf("the derivation needs expressions beyond the size limit: %w", err)
	}
	return res, err
}

func (res *Result) run(ctx context.Context, opt Options) error {
	sys := res.System
	points := make([]*ito.Point, len(opt.At))
	for i, text := range opt.At {
		p, err := sys.At(text)
		if err != nil {
			return err
		}
		points[i] = p
	}
	eqs := make([]generator.Equation, len(sys.Equations))
	for i, e := range sys.Equations {
		eqs[i] = generator.Equation{Var: e.Variable, Drift: e.Drift, Noise: e.Noise}
	}
	g, err := generator.Build(sys.Ring, sys.Small, eqs)
	if err != nil {
		return err
	}
	res.Generator = g
	prob := perturb.Problem{
		Ring: sys.Ring, Gen: g, Slow: names(sys.Slow), Fast: fastVariables(sys),
		Numbers: cell.Numbers{Formulas: sys.Definitions(), Values: sys.Values()},
	}
	proc := &cell.Process{Ring: sys.Ring, L0: g.Parts[0].Op, Fast: prob.Fast}
	res.Route = numeric.New(proc, prob.Slow, prob.Numbers)
	prob.Routes = []cell.Route{cell.NewClosure(proc), res.Route}
	prob.Settle = res.Route.Settle
	prob.MovingFrame = opt.MovingFrame
	if opt.Next > 0 {
		prob.Next = big.NewRat(int64(opt.Next), 1)
	}
	lim, err := perturb.Derive(ctx, prob)
	var refused *perturb.Refusal
	if errors.As(err, &refused) {
		res.Refused = refused
		return nil
	}
	if err != nil {
		return err
	}
	res.Limit = lim
	res.NoiseError = sys.Ring.WithBudget(factorBudget, func() (err error) {
		if res.Noise, err = perturb.Factor(lim.Diffusion); err == nil {
			res.Stratonovich = perturb.StratonovichDrift(lim.Drift, res.Noise, prob.Slow)
		}
		return err
	})
	if res.NoiseError != nil {
		res.Noise, res.Stratonovich = nil, nil
	}
	res.Diffusion = slowDiffusion(sys, lim)
	res.numbers()
	if res.Stationary, err = res.Diffusion.Solve(ctx); err != nil {
		return err
	}
	res.method()
	res.conditions()
	res.certify(ctx)
	for _, c := range sys.Claims {
		if opt.SkipClaims {
			break
		}
		res.Claims = append(res.Claims, res.judge(ctx, c))
	}
	for _, p := range points {
		v, err := res.valueAt(ctx, p)
		if err != nil {
			return err
		}
		res.Values = append(res.Values, *v)
	}
	return nil
}

func names(vs []*ito.Variable) []string {
	out := make([]string, len(vs))
	for i, v := range vs {
		out[i] = v.Name
	}
	return out
}

func fastVariables(sys *ito.System) []cell.Variable {
	sphere := map[string]int{}
	for i, s := range sys.Spheres {
		for _, n := range s.Names {
			sphere[n] = i
		}
	}
	out := make([]cell.Variable, len(sys.Fast))
	for i, v := range sys.Fast {
		c := cell.Variable{Name: v.Name, A: v.Domain.A, B: v.Domain.B}
		switch v.Domain.Kind {
		case ito.HalfLine:
			c.Kind = cell.HalfLine
		case ito.Circle:
			c.Kind = cell.Circle
		case ito.Periodic:
			c.Kind = cell.Periodic
		case ito.Reflecting:
			c.Kind = cell.Reflecting
		case ito.OnSphere:
			c.Kind, c.Sphere = cell.SpherePart, sphere[v.Name]
		}
		out[i] = c
	}
	return out
}

func slowDiffusion(sys *ito.System, lim *perturb.Limit) *fokkerplanck.Diffusion {
	d := &fokkerplanck.Diffusion{
		Ring: sys.Ring, Drift: lim.Drift, A: lim.Diffusion,
		Formulas: sys.Definitions(), Values: sys.Values(),
	}
	for _, v := range sys.Slow {
		d.Slow = append(d.Slow, fokkerplanck.Variable{Name: v.Name, Kind: v.Domain.Kind, A: v.Domain.A, B: v.Domain.B})
	}
	return d
}

// method tells whether numbers stand in the limit or were used on the way, and
// by which route.
func (res *Result) method() {
	lim := res.Limit
	res.Exact = true
	for i, f := range lim.Drift {
		res.Exact = res.Exact && !res.Route.IsNumerical(f)
		for _, a := range lim.Diffusion[i] {
			res.Exact = res.Exact && !res.Route.IsNumerical(a)
		}
	}
	for _, o := range lim.Orders {
		res.Exact = res.Exact && o.Note == ""
	}
	lim.Method = "closure"
	if !res.Exact {
		lim.Method = res.Route.Name()
	}
}

// numbers gives the Fokker-Planck side the means to evaluate averages that are
// known by name only.
func (res *Result) numbers() {
	known := map[string]bool{"pi": true}
	for n := range res.System.Values() {
		known[n] = true
	}
	res.Diffusion.Number = func(ctx context.Context, e algebra.Expr, at map[string]float64) (float64, error) {
		if err := res.missing(e, known); err != nil {
			return 0, err
		}
		p := res.Route.At(nil, false)
		for n, v := range at {
			p.Bind(n, new(big.Float).SetPrec(200).SetFloat64(v))
		}
		v, _, err := p.Value(ctx, e)
		return v, err
	}
	res.Diffusion.Vanishes = func(ctx context.Context, e algebra.Expr) bool {
		if !res.Route.IsNumerical(e) {
			return false
		}
		zero, _, err := res.Route.Settle(ctx, e)
		return err == nil && zero
	}
}

// TimeScale is the time on which the limit holds: "1", "1/eps", "1/eps^2".
func (res *Result) TimeScale() string {
	p := res.Limit.Power
	switch {
	case p.Sign() == 0:
		return "1"
	case p.Cmp(big.NewRat(-1, 1)) == 0:
		return res.System.Small
	case p.Sign() < 0:
		return res.System.Small + "^(" + perturb.NegPower(p) + ")"
	case p.Cmp(big.NewRat(1, 1)) == 0:
		return "1/" + res.System.Small
	case p.IsInt():
		return "1/" + res.System.Small + "^" + p.Num().String()
	}
	return "1/" + res.System.Small + "^(" + p.RatString() + ")"
}

// conditions lists what the result needs beyond the declared signs.
func (res *Result) conditions() {
	seen := map[string]bool{}
	add := func(s string) {
		if !seen[s] {
			seen[s] = true
			res.Conditions = append(res.Conditions, s)
		}
	}
	x := &cell.Existence{}
	if e := res.Limit.Existence; e != nil {
		x.Conditions = append(x.Conditions, e.Conditions...)
	}
	// Divisors of the correctors count where they are left in the result.
	final := append([]algebra.Expr(nil), res.Limit.Drift...)
	for _, row := range res.Limit.Diffusion {
		final = append(final, row...)
	}
	for _, e := range final {
		_, den := e.NumDen()
		x.Divides(den, "the limit")
	}
	for _, c := range x.Conditions {
		add(c.String())
	}
	for _, c := range res.Stationary.Conditions {
		add(c)
	}
}

// certify puts the correctors back into their equations.
func (res *Result) certify(ctx context.Context) {
	p := res.Limit.Process
	for _, o := range res.Limit.Orders {
		if !o.Corrector.Valid() {
			// Put back function by function when it was solved; by linearity
			// the equation holds for their sum.
			c := Certificate{
				What:   fmt.Sprintf("corrector at order %s^(%s)", res.System.Small, o.Power.RatString()),
				Status: Exact, Detail: "L0 Phi + f - <f> = 0 identically",
			}
			if !p.HasEnds() {
				c.What = fmt.Sprintf("average at order %s^(%s)", res.System.Small, o.Power.RatString())
				c.Detail = "<L0 f> = 0 for every function f that was averaged"
			}
			if res.Route.IsNumerical(o.Sum) {
				c.Status = Numerical
				c.Detail = "the named correctors are defined by their fast problems, solved by the " + res.Route.Name() + " route"
				if o.Note != "" {
					c.Detail += "; an average is " + o.Note
				}
			}
			res.Certificates = append(res.Certificates, c)
			continue
		}
		r := p.Residual(o.Sum, cell.Solution{Phi: o.Corrector, Mean: o.Mean})
		c := Certificate{
			What:   fmt.Sprintf("corrector at order %s^(%s)", res.System.Small, o.Power.RatString()),
			Status: Exact, Detail: "L0 Phi + f - <f> = 0 identically",
		}
		switch {
		case res.Route.IsNumerical(r) || res.Route.IsNumerical(o.Corrector):
			c.Status = Numerical
			c.Detail = "the named correctors are defined by their fast problems, solved by the " + res.Route.Name() + " route"
			if o.Note != "" {
				c.Detail += "; an average is " + o.Note
			}
		case !r.IsZero():
			c.Status, c.Detail = Failed, "L0 Phi + f - <f> = "+r.String()
		}
		res.Certificates = append(res.Certificates, c)
	}
	if worst, count, err := res.Route.CheckClosed(ctx); count > 0 || err != nil {
		c := Certificate{
			What: "averages in closed form", Status: Numerical,
			Detail: fmt.Sprintf("they agree with quadrature to %.1g relative", math.Max(worst, 1e-16)),
		}
		switch {
		case err != nil:
			c.Detail = "the comparison with quadrature failed: " + err.Error()
		case worst > 1e-8:
			c.Status = Failed
		}
		res.Certificates = append(res.Certificates, c)
	}
	if res.Noise != nil {
		c := Certificate{What: "noise factor", Status: Exact, Detail: "sigma sigma^T - A = 0 identically"}
		for i := range res.Noise {
			for j := range res.Noise {
				s := res.System.Ring.Int(0)
				for k := range res.Noise[i] {
					s = s.Add(res.Noise[i][k].Mul(res.Noise[j][k]))
				}
				switch s.Sub(res.Limit.Diffusion[i][j]).ZeroTest() {
				case algebra.VerdictUndecided:
					if c.Status == Exact {
						c.Status, c.Detail = Numerical, "sigma sigma^T = A in extended precision"
					}
				case algebra.VerdictNonZero:
					c.Status, c.Detail = Failed, "sigma sigma^T differs from A"
				}
			}
		}
		res.Certificates = append(res.Certificates, c)
	}
	if d := res.Stationary.Density; d.Valid() {
		c := Certificate{What: "stationary density", Status: Exact, Detail: "div J = 0 identically"}
		r := res.densityResidual(d, res.Stationary.WithFormulas, res.Stationary.WithValues)
		switch r.ZeroTest() {
		case algebra.VerdictUndecided:
			c.Status, c.Detail = Numerical, "div J = 0 in extended precision"
		case algebra.VerdictNonZero:
			c.Status, c.Detail = Failed, "div J = "+r.String()
		}
		if res.Stationary.WithFormulas {
			c.Detail += " (with the formulas given)"
		}
		res.Certificates = append(res.Certificates, c)
	}
	if x := res.Limit.Existence; x != nil {
		for _, u := range x.Unchecked {
			res.Certificates = append(res.Certificates, Certificate{"existence", Numerical, "not checked: " + u})
		}
	}
}

// densityResidual is div J divided by p, with functions and parameters
// replaced as asked.
func (res *Result) densityResidual(p algebra.Expr, formulas, values bool) algebra.Expr {
	d := *res.Diffusion
	r := d.Residual(p)
	if q, err := r.Div(p); err == nil {
		r = q
	}
	if formulas {
		if q, err := r.SubsFunc(d.Formulas); err == nil {
			r = q
		}
	}
	if values {
		if q, err := r.Subs(d.Values); err == nil {
			r = q
		}
	}
	return r
}
