// Package perturb runs the orders of the multiscale expansion: the centring
// and solvability conditions, the limit, its factor and Stratonovich form,
// and the origin of every drift term. It knows nothing of particular fast
// processes; those are the business of perturb/cell. It imports perturb/cell,
// generator and generator/algebra.
//
// Literature: G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), ch. 10,
// 11 and 18; G.C. Papanicolaou, D. Stroock, S.R.S. Varadhan, Martingale
// approach to some limit theorems (1977); citations from memory.
package perturb

import (
	"context"
	"errors"
	"fmt"
	"math/big"
	"sort"

	"epslim/generator"
	"epslim/generator/algebra"
	"epslim/perturb/cell"
)

// Problem is what the expansion starts from.
type Problem struct {
	Ring *algebra.Ring
	Gen  *generator.Graded
	Slow []string
	Fast []cell.Variable
	// Routes are tried in order for every fast problem; nil means closure
	// alone.
	Routes []cell.Route
	// Settle decides whether an average that is known only by name vanishes;
	// nil takes the canonical form for the answer.
	Settle func(ctx context.Context, e algebra.Expr) (zero bool, note string, err error)
	// MaxPower bounds the search for a limit on longer times: the largest
	// power of the small parameter at which the averaged operator is still
	// looked for. Zero means 4.
	MaxPower int
	// MovingFrame deals with a large mean drift instead of refusing it.
	MovingFrame bool
	// Next asks for corrections to the limit up to this power of the small
	// parameter, relative to the limit; nil asks for none.
	Next *big.Rat
	// Numbers settle conditions that the declared signs leave open.
	Numbers cell.Numbers
}

// Reason names why there is no limit.
type Reason string

// The reasons of refusal.
const (
	Uncentred     Reason = "uncentred"      // a large drift with a non-zero mean
	NotErgodic    Reason = "not-ergodic"    // no unique stationary law of the fast process
	NotFast       Reason = "not-fast"       // the leading generator moves a slow variable
	SingularNoise Reason = "singular-noise" // noise that blows up as eps -> 0
)

// Refusal is the outcome for a model without a limit; it is an error value.
type Refusal struct {
	Reason Reason
	Order  *big.Rat // the power of the small parameter where it shows
	Text   string   // what is wrong, with the quantity
	Mend   string   // what would mend it
	Detail map[string]algebra.Expr
}

func (r *Refusal) Error() string { return string(r.Reason) + ": " + r.Text }

// Order is one line of the hierarchy: L_lead u_J + Source = 0 (or = du0/dt),
// with the average that the solvability condition asks about.
type Order struct {
	J         int
	Power     *big.Rat
	Source    []Contribution
	Sum       algebra.Expr // the sum of the sources
	Mean      algebra.Expr // its average: an operator acting on u0
	Corrector algebra.Expr // u_J, with L_lead u_J = Mean - Sum; not Valid where it was not needed
	Limit     bool         // the solvability condition is the limit equation
	Note      string       // how the average was found to vanish, if by numbers
}

// Contribution is L_power u_index in the source of an order.
type Contribution struct {
	Power *big.Rat
	Op    *generator.Operator
	Index int
	Value algebra.Expr
}

// Limit is the outcome of the expansion.
type Limit struct {
	Lead        *big.Rat // lowest power of the small parameter
	Power       *big.Rat // power at which the limit appears; time is of order eps^-Power
	U0          string   // name of the undetermined function
	Orders      []Order
	Regime      string // "homogenization" or "averaging"
	Method      string // "closure", ...
	Drift       []algebra.Expr
	Diffusion   [][]algebra.Expr
	Cell        []algebra.Expr // corrector of each slow variable's large drift
	Terms       [][]Term
	Pivots      []algebra.Expr  // divided by on the way; must not vanish
	Existence   *cell.Existence // of the stationary law of the fast process
	Process     *cell.Process
	Generator   algebra.Expr // the limit generator on u0
	Frame       *Frame       // nil unless a mean drift was dealt with
	Corrections []Correction // beyond the limit, as far as asked for
	UpTo        *big.Rat     // the power up to which corrections were looked for; nil if none
	WhyNot      []string     // why earlier routes did not apply
	routes      []cell.Route
}

// Term is a piece of the Ito drift with its origin.
type Term struct {
	Origin string
	Value  algebra.Expr
}

// expansion is the state of one run.
type expansion struct {
	Problem
	step  *big.Rat // spacing of the orders
	shift []int    // of every part of the generator, in steps above the lead
	u     []algebra.Expr
	used  map[string]bool
	out   *Limit
	frame *Frame
	moved *generator.Graded // the generator in a moving frame, for another run
}

// Derive runs the expansion. A model without a limit gives a *Refusal.
func Derive(ctx context.Context, p Problem) (*Limit, error) {
	if p.MaxPower == 0 {
		p.MaxPower = 4
	}
	var frame *Frame
	for {
		e := &expansion{Problem: p, used: map[string]bool{}, frame: frame}
		var out *Limit
		err := algebra.Guard(func() error {
			var err error
			out, err = e.run(ctx)
			return err
		})
		if errors.Is(err, errMoved) {
			p.Gen, frame = e.moved, e.frame
			continue
		}
		var bad *cell.NotErgodic
		if errors.As(err, &bad) {
			err = &Refusal{Reason: NotErgodic, Order: p.Gen.Parts[0].Power, Text: bad.Text, Mend: bad.Mend, Detail: bad.Detail}
		}
		if out != nil {
			out.Frame = e.frame
		}
		return out, err
	}
}

func (e *expansion) run(ctx context.Context) (*Limit, error) {
	if len(e.Gen.Parts) == 0 {
		return nil, &Refusal{Reason: NotFast, Order: new(big.Rat), Text: "nothing moves in this model"}
	}
	lead := e.Gen.Parts[0]
	if r := e.checkFast(lead); r != nil {
		return nil, r
	}
	e.out = &Limit{Lead: lead.Power}
	e.out.Process = &cell.Process{Ring: e.Ring, L0: lead.Op, Fast: e.Fast}
	if e.Routes == nil {
		e.Routes = []cell.Route{cell.NewClosure(e.out.Process)}
	}
	e.out.routes = e.Routes
	if err := e.exists(lead, nil); err != nil {
		return nil, err
	}
	e.spacing()
	name := "u₀"
	if e.frame == nil {
		if err := e.Ring.DeclareFunction(name, e.Slow, algebra.Attr{Latex: "u_{0}"}); err != nil {
			return nil, err
		}
	}
	args := make([]algebra.Expr, len(e.Slow))
	for i, s := range e.Slow {
		args[i], _ = e.Ring.Symbol(s)
	}
	u0, err := e.Ring.Call(name, args...)
	if err != nil {
		return nil, err
	}
	e.u = []algebra.Expr{u0}
	e.out.U0 = name
	last := new(big.Rat).SetInt64(int64(e.MaxPower))
	for j := 1; ; j++ {
		power := new(big.Rat).Mul(e.step, new(big.Rat).SetInt64(int64(j)))
		power.Add(power, lead.Power)
		if power.Cmp(last) > 0 {
			return e.nothing(lead)
		}
		done, err := e.order(ctx, j, power)
		if err != nil {
			return nil, err
		}
		if done {
			return e.out, nil
		}
	}
}

// exists asks for the stationary law of the fast process, and for the averages
// of the given functions of the fast variables.
func (e *expansion) exists(lead generator.Part, integrands []algebra.Expr) error {
	x, err := e.out.Process.Check(e.Numbers, integrands)
	var bad *cell.NotErgodic
	if errors.As(err, &bad) {
		return &Refusal{Reason: NotErgodic, Order: lead.Power, Text: bad.Text, Mend: bad.Mend, Detail: bad.Detail}
	}
	e.out.Existence = x
	return err
}

// integrands lists the functions of the fast variables that were averaged.
func (e *expansion) integrands() []algebra.Expr {
	names := e.out.Process.Names()
	seen := map[string]bool{}
	var out []algebra.Expr
	for _, o := range e.out.Orders {
		for _, t := range o.Sum.SplitBy(names...) {
			if k := t.Fn.String(); !seen[k] {
				seen[k] = true
				out = append(out, t.Fn)
			}
		}
	}
	return out
}

// checkFast refuses a leading generator that differentiates in a slow
// variable.
func (e *expansion) checkFast(lead generator.Part) *Refusal {
	slow := e.slowIndex()
	for _, t := range lead.Op.Terms() {
		for _, i := range slow {
			if t.Index[i] > 0 {
				v := lead.Op.Vars()[i]
				return &Refusal{
					Reason: NotFast, Order: lead.Power,
					Text:   fmt.Sprintf("the leading generator, at %s^(%s), moves the slow variable %s through the term %s", e.Gen.Small, lead.Power.RatString(), v, termText(lead.Op, t)),
					Mend:   fmt.Sprintf("the fast equations must carry a lower power of %s than the equation of %s, so that the fast variables relax before %s moves", e.Gen.Small, v, v),
					Detail: map[string]algebra.Expr{v: t.Coef},
				}
			}
		}
	}
	return nil
}

func termText(o *generator.Operator, t generator.Term) string {
	p := generator.New(o.Ring(), o.Vars())
	p.Add(t.Index, t.Coef)
	return p.String()
}

func (e *expansion) slowIndex() []int {
	var out []int
	for i, v := range e.Gen.Parts[0].Op.Vars() {
		for _, s := range e.Slow {
			if s == v {
				out = append(out, i)
			}
		}
	}
	return out
}

// spacing finds the common step of the powers.
func (e *expansion) spacing() {
	lead := e.Gen.Parts[0].Power
	l := big.NewInt(1)
	var diffs []*big.Rat
	for _, p := range e.Gen.Parts {
		d := new(big.Rat).Sub(p.Power, lead)
		diffs = append(diffs, d)
		g := new(big.Int).GCD(nil, nil, l, d.Denom())
		l = new(big.Int).Mul(l, new(big.Int).Quo(d.Denom(), g))
	}
	n := new(big.Int)
	for _, d := range diffs {
		k := new(big.Int).Quo(new(big.Int).Mul(d.Num(), l), d.Denom())
		n.GCD(nil, nil, n, k)
	}
	if n.Sign() == 0 {
		n.SetInt64(1)
	}
	e.step = new(big.Rat).SetFrac(n, l)
	for _, d := range diffs {
		q := new(big.Rat).Quo(d, e.step)
		e.shift = append(e.shift, int(q.Num().Int64()))
	}
}

// order solves one order of the hierarchy; done tells that it gave the limit.
func (e *expansion) order(ctx context.Context, j int, power *big.Rat) (done bool, err error) {
	o := Order{J: j, Power: power, Sum: e.Ring.Int(0)}
	for k, p := range e.Gen.Parts {
		if i := j - e.shift[k]; k > 0 && i >= 0 && !e.u[i].IsZero() {
			c := Contribution{p.Power, p.Op, i, p.Op.Apply(e.u[i])}
			if !c.Value.IsZero() {
				o.Source = append(o.Source, c)
				o.Sum = o.Sum.Add(c.Value)
			}
		}
	}
	if len(o.Source) == 0 {
		e.u = append(e.u, e.Ring.Int(0))
		return false, nil
	}
	at := func(err error) error {
		return fmt.Errorf("at order %s^(%s): %w", e.Gen.Small, power.RatString(), err)
	}
	mean, err := e.mean(ctx, o.Sum)
	if err != nil {
		return false, at(err)
	}
	o.Mean = mean
	if o.Mean, o.Note, err = e.settle(ctx, o.Mean); err != nil {
		return false, at(err)
	}
	o.Limit = !o.Mean.IsZero()
	if !o.Limit || len(e.out.Orders) == 0 {
		// The corrector of the limit order itself is of no use later, and may
		// be long; in averaging problems it is the only one.
		s, err := e.solve(ctx, o.Sum)
		if err != nil {
			return false, at(err)
		}
		o.Corrector = s.Phi
	}
	e.out.Orders = append(e.out.Orders, o)
	if !o.Limit {
		e.u = append(e.u, o.Corrector)
		return false, nil
	}
	return true, e.limit(ctx, o)
}

// settle drops the parts of an averaged operator that vanish numerically.
func (e *expansion) settle(ctx context.Context, mean algebra.Expr) (algebra.Expr, string, error) {
	if e.Settle == nil || mean.IsZero() {
		return mean, "", nil
	}
	ts, err := mean.Derivatives(e.out.U0)
	if err != nil {
		return mean, "", err
	}
	out := mean
	notes := ""
	for _, t := range ts {
		zero, note, err := e.Settle(ctx, t.Coef)
		if err != nil {
			return mean, "", err
		}
		if zero {
			out = out.Sub(t.Coef.Mul(e.derivative(t.Index)))
			notes = note
		}
	}
	return out, notes, nil
}

// derivative is a derivative of u0.
func (e *expansion) derivative(index []int) algebra.Expr {
	d := e.u[0]
	for i, n := range index {
		d = d.DiffN(e.Slow[i], n)
	}
	return d
}

// solve tries the routes in turn.
func (e *expansion) solve(ctx context.Context, f algebra.Expr) (cell.Solution, error) {
	var out cell.Solution
	err := e.try(func(r cell.Route) (err error) {
		out, err = r.Solve(ctx, f)
		return err
	})
	return out, err
}

// mean is the average alone.
func (e *expansion) mean(ctx context.Context, f algebra.Expr) (algebra.Expr, error) {
	var out algebra.Expr
	err := e.try(func(r cell.Route) (err error) {
		out, err = r.Mean(ctx, f)
		return err
	})
	return out, err
}

// try runs a task with the first route that applies.
func (e *expansion) try(task func(cell.Route) error) error {
	var last error
	for _, r := range e.Routes {
		err := task(r)
		if err == nil {
			e.used[r.Name()] = true
			e.out.Method = r.Name()
			return nil
		}
		if !errors.Is(err, cell.ErrDoesNotApply) {
			return err
		}
		e.whyNot(r.Name() + ": " + err.Error())
		last = err
	}
	return last
}

func (e *expansion) whyNot(s string) {
	for _, t := range e.out.WhyNot {
		if t == s {
			return
		}
	}
	if len(e.out.WhyNot) < 3 {
		e.out.WhyNot = append(e.out.WhyNot, s)
	}
}

// nothing is the outcome when no averaged operator appears at all.
func (e *expansion) nothing(lead generator.Part) (*Limit, error) {
	e.out.Power = new(big.Rat)
	e.out.Regime = "averaging"
	e.out.Method = "closure"
	e.out.Generator = e.Ring.Int(0)
	e.out.Terms = make([][]Term, len(e.Slow))
	e.out.Drift, e.out.Diffusion = e.zeros()
	e.out.Cell, _ = e.zeros()
	return e.out, nil
}

// DetailNames lists the names in Detail, sorted.
func (r *Refusal) DetailNames() []string {
	out := make([]string, 0, len(r.Detail))
	for k := range r.Detail {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}
