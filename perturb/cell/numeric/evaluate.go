package numeric

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/big"
	"strings"

	"epslim/generator/algebra"
	"epslim/perturb/cell"
	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
	"epslim/perturb/cell/spectral/grid"
)

// Point is a slow point with values for the parameters, ready to evaluate
// named averages there. It is not safe for concurrent use.
type Point struct {
	r      *Route
	at     algebra.Binding
	subst  map[string]algebra.Expr // the same values as exact expressions
	defs   map[string]algebra.FuncDef
	solver *fast.Engine
	phis   map[string]solved
	// Tolerance is relative; zero means that of the route.
	Tolerance float64
}

type solved struct {
	phi  fast.Function
	mean fast.Value
}

// At prepares a slow point. The values are exact; names left without a value
// get arbitrary admissible ones only if the binding says so.
func (r *Route) At(values map[string]*big.Rat, arbitrary bool) *Point {
	p := &Point{r: r, defs: r.numbers.Formulas, phis: map[string]solved{}, subst: map[string]algebra.Expr{}}
	p.at = algebra.Binding{Values: map[string]*big.Float{}, Arbitrary: arbitrary}
	for n, v := range r.numbers.Values {
		if f, err := v.EvalBig(algebra.Binding{}, 200); err == nil {
			p.at.Values[n] = f
		}
	}
	for n, v := range values {
		p.at.Values[n] = new(big.Float).SetPrec(200).SetRat(v)
	}
	return p
}

// Bind sets a value.
func (p *Point) Bind(name string, v *big.Float) { p.at.Values[name] = v }

// Values are the values at the point.
func (p *Point) Values() map[string]*big.Float { return p.at.Values }

// coef evaluates an expression without fast variables, which may contain
// named averages; the error estimate covers those.
func (p *Point) coef(ctx context.Context, e algebra.Expr) (value, errEst float64, err error) {
	e, err = e.SubsFunc(p.defs)
	if err != nil {
		return 0, 0, err
	}
	names := p.r.MeanNames()
	e, uses, err := e.NameFunctions(names)
	if err != nil {
		return 0, 0, err
	}
	for _, n := range p.r.names { // averages without arguments are symbols
		if len(n.MeanArgs) == 0 && e.DependsOn(n.Mean) {
			uses = append(uses, algebra.FuncUse{Name: n.Mean, Symbol: n.Mean})
		}
	}
	at := p.at
	at.Values = map[string]*big.Float{}
	for k, v := range p.at.Values {
		at.Values[k] = v
	}
	errs := map[string]float64{}
	for _, u := range uses {
		v, err := p.mean(ctx, p.r.byMean[u.Name], u.Deriv)
		if err != nil {
			return 0, 0, err
		}
		at.Values[u.Symbol] = new(big.Float).SetPrec(200).SetFloat64(v.Value)
		errs[u.Symbol] = v.Error
	}
	v, err := e.EvalBig(at, 160)
	if err != nil {
		return 0, 0, err
	}
	value, _ = v.Float64()
	for s, de := range errs {
		old := at.Values[s]
		at.Values[s] = new(big.Float).SetPrec(200).Add(old, big.NewFloat(de))
		if w, err := e.EvalBig(at, 160); err == nil {
			d, _ := new(big.Float).Sub(w, v).Float64()
			errEst += math.Abs(d)
		}
		at.Values[s] = old
	}
	return value, errEst + math.Abs(value)*0x1p-52, nil
}

// Value evaluates an expression in the slow variables that may contain named
// averages, with an estimate of its absolute error.
func (p *Point) Value(ctx context.Context, e algebra.Expr) (value, errEst float64, err error) {
	return p.coef(ctx, e)
}

// prepare builds the solver at this point.
func (p *Point) prepare(ctx context.Context) error {
	if p.solver != nil {
		return nil
	}
	pr := p.r.p
	prob := &fast.Problem{}
	for i := 0; i < len(pr.Fast); i++ {
		d, err := p.domain(ctx, i)
		if err != nil {
			return err
		}
		prob.Domains = append(prob.Domains, d)
		if d.Kind == fast.Sphere {
			i += 2
		}
	}
	n := len(pr.Fast)
	for i := 0; i < n; i++ {
		c, err := p.coefficient(ctx, pr.Drift(i))
		if err != nil {
			return err
		}
		prob.Drift = append(prob.Drift, c)
		row := make([]fast.Coefficient, n)
		for j := range row {
			if row[j], err = p.coefficient(ctx, pr.Diffusion(i, j)); err != nil {
				return err
			}
		}
		prob.Diffusion = append(prob.Diffusion, row)
	}
	var err error
	// Each route says where it does not apply; the next one takes over.
	var no *fast.Unsupported
	if n == 1 {
		p.solver, err = quadrature.New(ctx, prob, quadrature.Settings{Tolerance: p.Tolerance})
	}
	if n > 1 || errors.As(err, &no) {
		p.solver, err = spectral.New(ctx, prob, spectral.Settings{Tolerance: p.Tolerance})
	}
	if errors.As(err, &no) && n <= 2 {
		p.solver, err = grid.New(ctx, prob, grid.Settings{})
	}
	return outcome(err)
}

func (p *Point) domain(ctx context.Context, i int) (fast.Domain, error) {
	v := p.r.p.Fast[i]
	d := fast.Domain{Names: []string{v.Name}}
	switch v.Kind {
	case cell.Line:
		d.Kind = fast.Line
	case cell.HalfLine:
		d.Kind = fast.HalfLine
	case cell.Circle:
		d.Kind = fast.Circle
	case cell.SpherePart:
		d.Kind = fast.Sphere
		d.Names = nil
		for k := i; k < i+3; k++ {
			d.Names = append(d.Names, p.r.p.Fast[k].Name)
		}
		return d, nil
	case cell.Periodic, cell.Reflecting:
		d.Kind = fast.Periodic
		if v.Kind == cell.Reflecting {
			d.Kind = fast.Reflecting
		}
		var err error
		if d.A, _, err = p.coef(ctx, v.A); err != nil {
			return d, err
		}
		d.B, _, err = p.coef(ctx, v.B)
		return d, err
	}
	return d, nil
}

// mean is a derivative of a named average in the slow variables.
func (p *Point) mean(ctx context.Context, n *Name, deriv []int) (fast.Value, error) {
	alpha := make([]int, len(n.MeanArgs))
	copy(alpha, deriv)
	if n.Zero {
		return fast.Value{}, nil
	}
	s, err := p.phi(ctx, n, alpha)
	return s.mean, err
}

// phi solves for the derivative d^alpha of a named corrector in its slow
// arguments:
//
//	L0 d^a Phi = d^a M - [ d^a g + sum_{0<c<=a} binom(a,c) (d^c L0) d^(a-c) Phi ].
func (p *Point) phi(ctx context.Context, n *Name, alpha []int) (solved, error) {
	key := fmt.Sprint(n.Phi, alpha)
	if s, ok := p.phis[key]; ok {
		return s, nil
	}
	if err := p.prepare(ctx); err != nil {
		return solved{}, err
	}
	g := n.Of
	for i, a := range n.MeanArgs {
		g = g.DiffN(a, alpha[i])
	}
	rhs, err := p.function(ctx, g)
	if err != nil {
		return solved{}, err
	}
	terms := []fast.Scaled{{Factor: 1, Function: rhs}}
	for _, c := range below(alpha) {
		rest := make([]int, len(alpha))
		weight := 1.0
		for i := range alpha {
			rest[i] = alpha[i] - c[i]
			weight *= binomial(alpha[i], c[i])
		}
		op, err := p.operator(ctx, n, c)
		if err != nil {
			return solved{}, err
		}
		if len(op) == 0 {
			continue
		}
		lower, err := p.phi(ctx, n, rest)
		if err != nil {
			return solved{}, err
		}
		terms = append(terms, fast.Scaled{Factor: weight, Function: p.solver.Apply(op, lower.phi)})
	}
	var s solved
	s.phi, s.mean, err = p.solver.Solve(ctx, p.solver.Sum(terms...))
	var ns *fast.NotSettled
	if errors.As(err, &ns) {
		s.mean, err = ns.Value, nil // the error estimate says how good it is
	}
	if err != nil {
		return solved{}, outcome(err)
	}
	p.phis[key] = s
	return s, nil
}

// below lists the multi-indices c with 0 < c <= a.
func below(a []int) [][]int {
	out := [][]int{{}}
	for _, n := range a {
		var next [][]int
		for _, c := range out {
			for k := 0; k <= n; k++ {
				next = append(next, append(append([]int(nil), c...), k))
			}
		}
		out = next
	}
	return out[1:]
}

func binomial(n, k int) float64 {
	out := 1.0
	for i := 0; i < k; i++ {
		out = out * float64(n-i) / float64(i+1)
	}
	return out
}

// operator is d^c L0 in the slow arguments of n, as numbers.
func (p *Point) operator(ctx context.Context, n *Name, c []int) (fast.Operator, error) {
	op := p.r.p.L0
	for i, a := range n.MeanArgs {
		for k := 0; k < c[i]; k++ {
			op = op.DiffCoefficients(a)
		}
	}
	var out fast.Operator
	fastIndex := map[string]int{}
	for i, v := range p.r.p.Fast {
		fastIndex[v.Name] = i
	}
	for _, t := range op.Terms() {
		order := make([]int, len(p.r.p.Fast))
		for i, v := range op.Vars() {
			if k, ok := fastIndex[v]; ok {
				order[k] = t.Index[i]
			}
		}
		q, err := p.coefficient(ctx, t.Coef)
		if err != nil {
			return nil, err
		}
		out = append(out, fast.OperatorTerm{Coefficient: q, Order: order})
	}
	return out, nil
}

// outcome turns what a solver found wrong with the fast process into the
// refusal of the cell problem.
func outcome(err error) error {
	var ne *fast.NotErgodic
	if errors.As(err, &ne) {
		text := ne.Reason
		if len(ne.Components) > 0 {
			text += "; stationary laws: " + strings.Join(ne.Components, "; ")
		}
		return &cell.NotErgodic{Text: text, Mend: ne.Mend}
	}
	var dv *fast.Divergent
	if errors.As(err, &dv) {
		return &cell.NotErgodic{
			Text: fmt.Sprintf("the stationary law exists, but the average of %s diverges at %s, where the integrand is like a power with exponent %.4g", dv.Quantity, dv.Where, dv.Exponent),
			Mend: "lighter tails of the fast process, or a bounded amplitude",
		}
	}
	return err
}
