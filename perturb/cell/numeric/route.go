// Package numeric is the route to fast problems without a closed form. It
// keeps correctors and averages as named functions of the variables they
// depend on, so that the expansion goes through by exact algebra, and
// evaluates the names by quadrature (one fast variable) or by a spectral
// method where numbers are asked for.
//
// It owns the naming, the symmetries that make averages vanish exactly, and
// the evaluation of names and of their slow derivatives. It imports
// perturb/cell, its sub-packages quadrature and spectral, and
// generator/algebra.
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
)

// Name is a named average and corrector: L0 Phi = Mean - Of.
type Name struct {
	Phi, Mean string
	Of        algebra.Expr // function of the fast variables, may contain earlier Phis
	PhiArgs   []string
	MeanArgs  []string     // slow variables that the average depends on
	Zero      bool         // the average vanishes by a symmetry of L0
	Closed    algebra.Expr // the average in closed form, if Valid
	square    bool         // the average is <f Phi_f>, which is never negative
	parity    []int        // under each symmetry: 1, -1, or 0 for neither
}

// Route is the numerical route. It tries closure for every function of the
// fast variables first.
type Route struct {
	p       *cell.Process
	numbers cell.Numbers
	closure *cell.Closure
	slow    []string
	names   []*Name
	byKey   map[string]*Name
	byPhi   map[string]*Name
	byMean  map[string]*Name
	syms    []symmetry
	circle  *vonMises       // closed averages on a circle, if the law is of that kind
	closed  map[string]bool // functions for which closure was tried in vain
}

// New prepares the route; slow are the names of the slow variables.
func New(p *cell.Process, slow []string, n cell.Numbers) *Route {
	r := &Route{
		p: p, numbers: n, slow: slow, closure: cell.NewClosure(p),
		byKey: map[string]*Name{}, byPhi: map[string]*Name{}, byMean: map[string]*Name{},
		closed: map[string]bool{},
	}
	r.closure.MaxStep, r.closure.MaxSize = 12, 120
	r.syms = findSymmetries(p)
	r.circle = findVonMises(p)
	return r
}

// Name implements cell.Route.
func (r *Route) Name() string {
	if len(r.p.Fast) == 1 {
		return "quadrature"
	}
	return "spectral"
}

// Conditions implements cell.Route.
func (r *Route) Conditions() []algebra.Expr { return r.closure.Conditions() }

// Names lists the named averages and correctors in order of introduction.
func (r *Route) Names() []*Name { return r.names }

// MeanNames is the set of names of averages, for finding them in results.
func (r *Route) MeanNames() map[string]bool {
	out := map[string]bool{}
	for _, n := range r.names {
		out[n.Mean] = true
	}
	return out
}

// IsNumerical reports whether e contains a named average.
func (r *Route) IsNumerical(e algebra.Expr) bool {
	for _, f := range e.Functions() {
		if r.byMean[f] != nil || r.byPhi[f] != nil {
			return true
		}
	}
	for _, s := range e.Symbols() {
		if r.byMean[s] != nil || r.byPhi[s] != nil {
			return true
		}
	}
	return false
}

// Solve implements cell.Route.
func (r *Route) Solve(ctx context.Context, f algebra.Expr) (cell.Solution, error) {
	out := cell.Solution{Phi: r.p.Ring.Int(0), Mean: r.p.Ring.Int(0)}
	err := r.eachPart(ctx, f, func(coef algebra.Expr, s cell.Solution) {
		out.Phi = out.Phi.Add(coef.Mul(s.Phi))
		out.Mean = out.Mean.Add(coef.Mul(s.Mean))
	})
	return out, err
}

// Mean implements cell.Route.
func (r *Route) Mean(ctx context.Context, f algebra.Expr) (algebra.Expr, error) {
	out := r.p.Ring.Int(0)
	err := r.eachPart(ctx, f, func(coef algebra.Expr, s cell.Solution) {
		out = out.Add(coef.Mul(s.Mean))
	})
	return out, err
}

func (r *Route) eachPart(ctx context.Context, f algebra.Expr, use func(coef algebra.Expr, s cell.Solution)) error {
	parts, err := r.p.Reduce(f).SplitReal(r.p.Names()...)
	if err != nil {
		return err
	}
	for _, part := range parts {
		if err := ctx.Err(); err != nil {
			return err
		}
		s, err := r.part(ctx, part)
		if err != nil {
			return err
		}
		use(part.Coef, s)
	}
	return nil
}

func (r *Route) part(ctx context.Context, part algebra.RealPart) (cell.Solution, error) {
	key := part.Fn.String()
	if !r.hasPhi(part) && !r.closed[key] {
		s, err := r.closure.Solve(ctx, part.Fn)
		if err == nil {
			return s, nil
		}
		if !errors.Is(err, cell.ErrDoesNotApply) {
			return s, err
		}
		r.closed[key] = true
	}
	n, err := r.name(key, part)
	if err != nil {
		return cell.Solution{}, err
	}
	phi, err := r.call(n.Phi, n.PhiArgs)
	if err != nil {
		return cell.Solution{}, err
	}
	mean := r.p.Ring.Int(0)
	if !n.Zero {
		if closed, ok := r.average(part); ok {
			n.Closed = closed
			return cell.Solution{Phi: phi, Mean: closed}, nil
		}
		if mean, err = r.call(n.Mean, n.MeanArgs); err != nil {
			return cell.Solution{}, err
		}
	}
	return cell.Solution{Phi: phi, Mean: mean}, nil
}

func (r *Route) hasPhi(part algebra.RealPart) bool {
	for _, a := range part.Atoms {
		if a.Kind == algebra.AtomFunc && r.byPhi[a.Func] != nil {
			return true
		}
	}
	return false
}

// call is the named function at its declared arguments; without arguments it
// is a symbol.
func (r *Route) call(name string, args []string) (algebra.Expr, error) {
	if len(args) == 0 {
		sign := algebra.AnyReal
		if n := r.byMean[name]; n != nil && n.square {
			sign = algebra.NonNegative
		}
		return r.p.Ring.Declare(name, algebra.Attr{Parameter: true, Sign: sign}), nil
	}
	as := make([]algebra.Expr, len(args))
	for i, a := range args {
		as[i], _ = r.p.Ring.Symbol(a)
	}
	return r.p.Ring.Call(name, as...)
}

// name introduces names for a function of the fast variables.
func (r *Route) name(key string, part algebra.RealPart) (*Name, error) {
	if n, ok := r.byKey[key]; ok {
		return n, nil
	}
	n := &Name{Of: part.Fn}
	suffix := subscript(len(r.names) + 1)
	n.Phi, n.Mean = r.free("Φ"+suffix), r.free("M"+suffix)
	depends := map[string]bool{}
	for _, t := range r.p.L0.Terms() {
		for _, s := range t.Coef.Symbols() {
			depends[s] = true
		}
	}
	for _, s := range part.Fn.Symbols() {
		depends[s] = true
	}
	for _, s := range r.slow {
		if depends[s] {
			n.MeanArgs = append(n.MeanArgs, s)
		}
	}
	n.PhiArgs = append(append([]string(nil), n.MeanArgs...), r.p.Names()...)
	index := fmt.Sprint(len(r.names) + 1)
	if err := r.p.Ring.DeclareFunction(n.Phi, n.PhiArgs, algebra.Attr{Latex: `\Phi_{` + index + `}`}); err != nil {
		return nil, err
	}
	n.square = r.isSquare(part)
	if len(n.MeanArgs) > 0 {
		attr := algebra.Attr{Latex: `M_{` + index + `}`}
		if n.square {
			attr.Sign = algebra.NonNegative
		}
		if err := r.p.Ring.DeclareFunction(n.Mean, n.MeanArgs, attr); err != nil {
			return nil, err
		}
	}
	n.parity = make([]int, len(r.syms))
	for i := range r.syms {
		n.parity[i] = r.parityOf(part, i)
		if n.parity[i] == -1 {
			n.Zero = true
		}
	}
	r.names = append(r.names, n)
	r.byKey[key], r.byPhi[n.Phi], r.byMean[n.Mean] = n, n, n
	return n, nil
}

// isSquare recognises f times its own corrector: <f Phi_f> is half the
// intensity of a noise (a Green-Kubo integral).
func (r *Route) isSquare(part algebra.RealPart) bool {
	rest := r.p.Ring.Int(1)
	var phi *Name
	for _, a := range part.Atoms {
		n := r.byPhi[a.Func]
		if a.Kind != algebra.AtomFunc || n == nil {
			rest = rest.Mul(a.Expr)
			continue
		}
		for _, d := range a.Deriv {
			if d != 0 {
				return false
			}
		}
		if phi != nil {
			return false
		}
		phi = n
	}
	return phi != nil && rest.Equal(phi.Of)
}

// free makes a name unknown to the ring.
func (r *Route) free(name string) string {
	for {
		if _, ok := r.p.Ring.Symbol(name); !ok {
			return name
		}
		name += "'"
	}
}

func subscript(n int) string {
	var b strings.Builder
	for _, c := range fmt.Sprint(n) {
		b.WriteRune('₀' + (c - '0'))
	}
	return b.String()
}

// Settle decides whether an average that contains names vanishes: each
// coefficient is evaluated at sample points of the slow variables, with the
// values of the parameters where there are any and arbitrary admissible ones
// where not. It implements perturb.Settler.
func (r *Route) Settle(ctx context.Context, e algebra.Expr) (zero bool, note string, err error) {
	if !r.IsNumerical(e) {
		return e.IsZero(), "", nil
	}
	// Named functions are arbitrary here: what vanishes for their formulas
	// only does not vanish as a formula in their names.
	zero, note, err = r.settle(ctx, e, true)
	if err != nil && ctx.Err() == nil {
		return r.settle(ctx, e, false) // arbitrary values may leave the domain of the model
	}
	return zero, note, err
}

func (r *Route) settle(ctx context.Context, e algebra.Expr, arbitrary bool) (zero bool, note string, err error) {
	worst := 0.0
	for k := 0; k < 3; k++ {
		p := r.Sample(k)
		if arbitrary {
			p.defs = nil
		}
		v, de, err := p.Value(ctx, e)
		if err != nil {
			return false, "", err
		}
		scale := p.scale(ctx, e)
		if math.Abs(v) > 200*de+1e-11*scale {
			return false, "", nil
		}
		worst = math.Max(worst, math.Abs(v)/math.Max(scale, 1e-300))
	}
	return true, fmt.Sprintf("zero numerically, to %.1g of its summands", worst), nil
}

// Sample is a deterministic slow point with the values of the parameters;
// names without a value get arbitrary admissible ones.
func (r *Route) Sample(k int) *Point {
	p := r.At(nil, true)
	for i, s := range r.slow {
		p.at.Values[s] = big.NewFloat(0.137 + 0.311*float64(k) + 0.0731*float64(i))
	}
	for i, s := range r.p.Ring.SymbolNames() {
		if _, ok := p.at.Values[s]; !ok && r.byMean[s] == nil {
			v := 0.61 + 0.173*float64((i*7+k*3)%11)
			if sg := r.p.Ring.SignOf(s); sg == algebra.Negative || sg == algebra.NonPositive {
				v = -v
			}
			p.at.Values[s] = big.NewFloat(v)
		}
	}
	return p
}

// scale is the size of the largest summand of e.
func (p *Point) scale(ctx context.Context, e algebra.Expr) float64 {
	out := 0.0
	for _, t := range e.Summands() {
		if v, _, err := p.Value(ctx, t); err == nil {
			out = math.Max(out, math.Abs(v))
		}
	}
	return out
}

// CheckClosed compares the averages in closed form with numbers at a sample
// point and returns the largest relative difference and how many there are.
func (r *Route) CheckClosed(ctx context.Context) (worst float64, count int, err error) {
	p := r.Sample(1)
	for _, n := range r.names {
		if !n.Closed.Valid() {
			continue
		}
		want, _, err := p.Value(ctx, n.Closed)
		if err != nil {
			return worst, count, err
		}
		got, err := p.mean(ctx, n, nil)
		if err != nil {
			return worst, count, err
		}
		count++
		worst = math.Max(worst, math.Abs(got.Value-want)/math.Max(math.Abs(want), math.Max(got.Scale, 1e-300)))
	}
	return worst, count, nil
}
