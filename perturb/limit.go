package perturb

import (
	"context"
	"fmt"
	"math/big"

	"epslim/generator"
	"epslim/generator/algebra"
)

// limit reads drift and diffusion off the averaged operator.
func (e *expansion) limit(ctx context.Context, o Order) error {
	e.out.Power = o.Power
	e.out.Generator = o.Mean
	drift, diffusion, err := e.coefficients(o.Mean)
	if err != nil {
		return err
	}
	e.out.Drift, e.out.Diffusion = drift, diffusion
	if o.Power.Sign() < 0 {
		if err := e.tooEarly(o); err != nil {
			return err
		}
	}
	e.out.Regime = "averaging"
	for _, s := range o.Source {
		if s.Index > 0 {
			e.out.Regime = "homogenization"
		}
	}
	for _, r := range e.Routes {
		if e.used[r.Name()] {
			e.out.Pivots = append(e.out.Pivots, r.Conditions()...)
		}
	}
	if err := e.exists(e.Gen.Parts[0], e.integrands()); err != nil {
		return err
	}
	if err := e.correctors(); err != nil {
		return err
	}
	if err := e.origins(ctx, o); err != nil {
		return err
	}
	next := e.Next
	if e.frame != nil && e.frame.Short && next == nil {
		next = big.NewRat(1, 1)
	}
	if next == nil {
		return nil
	}
	return e.corrections(ctx, o.J, next)
}

// tooEarly deals with an averaged operator that does not vanish at a negative
// power: a refusal, or a moving frame where one was asked for.
func (e *expansion) tooEarly(o Order) error {
	for _, row := range e.out.Diffusion {
		for _, a := range row {
			if !a.IsZero() {
				return e.refuse(o)
			}
		}
	}
	if !e.MovingFrame {
		return e.refuse(o)
	}
	f := &Frame{Power: o.Power, Velocity: e.out.Drift}
	if e.frame == nil && e.movable(e.out.Drift) {
		e.moved = e.subtract(o.Power, e.out.Drift)
		e.frame = f
		return errMoved
	}
	f.Short = true
	e.frame = f
	return nil
}

// coefficients splits an operator on u0 into drift and A = sigma sigma^T.
func (e *expansion) coefficients(op algebra.Expr) ([]algebra.Expr, [][]algebra.Expr, error) {
	n := len(e.Slow)
	r := e.Ring
	drift := make([]algebra.Expr, n)
	diff := make([][]algebra.Expr, n)
	for i := range drift {
		drift[i] = r.Int(0)
		diff[i] = make([]algebra.Expr, n)
		for j := range diff[i] {
			diff[i][j] = r.Int(0)
		}
	}
	ts, err := op.Derivatives(e.out.U0)
	if err != nil {
		return nil, nil, fmt.Errorf("the averaged operator: %w", err)
	}
	for _, t := range ts {
		var which []int
		for i, k := range t.Index {
			for ; k > 0; k-- {
				which = append(which, i)
			}
		}
		switch len(which) {
		case 1:
			drift[which[0]] = t.Coef
		case 2:
			i, j := which[0], which[1]
			if i == j {
				diff[i][i] = t.Coef.Mul(r.Int(2))
			} else {
				diff[i][j], diff[j][i] = t.Coef, t.Coef
			}
		default:
			return nil, nil, fmt.Errorf("the averaged operator has a derivative of order %d: the limit is no diffusion", len(which))
		}
	}
	return drift, diff, nil
}

// refuse tells a large mean drift from a noise that blows up.
func (e *expansion) refuse(o Order) error {
	detail := map[string]algebra.Expr{}
	noise := false
	for i, s := range e.Slow {
		detail[s] = e.out.Drift[i]
		for j := range e.Slow {
			noise = noise || !e.out.Diffusion[i][j].IsZero()
		}
	}
	small := e.Gen.Small
	if noise {
		for i, s := range e.Slow {
			detail[s] = e.out.Diffusion[i][i]
		}
		return &Refusal{
			Reason: SingularNoise, Order: o.Power, Detail: detail,
			Text: fmt.Sprintf("the averaged generator has second derivatives at %s^(%s): the noise of the slow variables grows without bound as %s -> 0", small, o.Power.RatString(), small),
			Mend: fmt.Sprintf("scale the noise of the slow equations so that its square has no negative power of %s, or ask for the limit on the shorter time scale", small),
		}
	}
	return &Refusal{
		Reason: Uncentred, Order: o.Power, Detail: detail,
		Text: fmt.Sprintf("the large drift at %s^(%s) has a non-zero mean over the fast process, so the slow variables run away as %s -> 0", small, o.Power.RatString(), small),
		Mend: "subtract the mean drift (a moving frame), or take the averaging limit on the shorter time scale",
	}
}

// correctors reads Phi_i from the first corrector: the coefficient of
// du0/dx_i.
func (e *expansion) correctors() error {
	r := e.Ring
	e.out.Cell = make([]algebra.Expr, len(e.Slow))
	for i := range e.out.Cell {
		e.out.Cell[i] = r.Int(0)
	}
	for _, o := range e.out.Orders {
		c := o.Corrector
		if !c.Valid() || c.IsZero() {
			continue
		}
		ts, err := c.Derivatives(e.out.U0)
		if err != nil {
			return err
		}
		for _, t := range ts {
			if sumIndex(t.Index) != 1 {
				continue
			}
			for i, k := range t.Index {
				if k == 1 && !o.Limit || k == 1 && len(e.out.Orders) == 1 {
					e.out.Cell[i] = e.out.Cell[i].Add(t.Coef)
				}
			}
		}
		break
	}
	return nil
}

func sumIndex(index []int) int {
	n := 0
	for _, k := range index {
		n += k
	}
	return n
}

// The origins of drift terms.
const (
	OriginAveraged    = "average of the slow drift"
	OriginFluctuation = "induced by the fluctuations of the large drift"
	OriginFastLaw     = "slow dependence of the fast process"
	OriginShared      = "noise shared by the slow and the fast equations"
	OriginFastDrift   = "weaker drift or noise of the fast variables"
	OriginHigher      = "second-order slow terms acting on the correctors"
)

// origins splits the Ito drift by the piece of the generator that made it.
func (e *expansion) origins(ctx context.Context, o Order) error {
	n := len(e.Slow)
	e.out.Terms = make([][]Term, n)
	add := func(origin string, op algebra.Expr) error {
		mean, err := e.mean(ctx, op)
		if err != nil {
			return err
		}
		mean, _, err = e.settle(ctx, mean)
		if err != nil {
			return err
		}
		d, _, err := e.coefficients(mean)
		if err != nil {
			return err
		}
		for i := range d {
			e.addTerm(i, origin, d[i])
		}
		return nil
	}
	for _, c := range o.Source {
		if c.Index == 0 {
			if err := add(OriginAveraged, c.Value); err != nil {
				return err
			}
			continue
		}
		for _, piece := range e.pieces(c.Op) {
			v := piece.op.Apply(e.u[c.Index])
			if v.IsZero() {
				continue
			}
			if piece.origin != OriginFluctuation {
				if err := add(piece.origin, v); err != nil {
					return err
				}
				continue
			}
			frozen, err := e.frozen(ctx, piece.op, c.Index)
			if err != nil {
				return err
			}
			if frozen.Valid() {
				if err := add(OriginFluctuation, frozen); err != nil {
					return err
				}
				v = v.Sub(frozen)
				if err := add(OriginFastLaw, v); err != nil {
					return err
				}
				continue
			}
			if err := add(OriginFluctuation, v); err != nil {
				return err
			}
		}
	}
	return e.checkTerms(ctx)
}

func (e *expansion) addTerm(i int, origin string, v algebra.Expr) {
	if v.IsZero() {
		return
	}
	for k, t := range e.out.Terms[i] {
		if t.Origin == origin {
			s := t.Value.Add(v)
			if s.IsZero() {
				e.out.Terms[i] = append(e.out.Terms[i][:k], e.out.Terms[i][k+1:]...)
			} else {
				e.out.Terms[i][k].Value = s
			}
			return
		}
	}
	e.out.Terms[i] = append(e.out.Terms[i], Term{origin, v})
}

// checkTerms makes sure that the terms add up to the drift.
func (e *expansion) checkTerms(ctx context.Context) error {
	for i, ts := range e.out.Terms {
		sum := e.Ring.Int(0)
		for _, t := range ts {
			sum = sum.Add(t.Value)
		}
		diff := sum.Sub(e.out.Drift[i])
		zero := diff.IsZero()
		if !zero && e.Settle != nil {
			var err error
			if zero, _, err = e.Settle(ctx, diff); err != nil {
				return err
			}
		}
		if !zero {
			return fmt.Errorf("internal error: the terms of the drift of %s add up to %s, not %s", e.Slow[i], sum, e.out.Drift[i])
		}
	}
	return nil
}

type piece struct {
	origin string
	op     *generator.Operator
}

// pieces sorts the terms of an operator by what they differentiate.
func (e *expansion) pieces(op *generator.Operator) []piece {
	isSlow := map[int]bool{}
	for _, i := range e.slowIndex() {
		isSlow[i] = true
	}
	origins := []string{OriginFluctuation, OriginShared, OriginFastDrift, OriginHigher}
	ops := map[string]*generator.Operator{}
	for _, o := range origins {
		ops[o] = generator.New(op.Ring(), op.Vars())
	}
	for _, t := range op.Terms() {
		slow, fast := 0, 0
		for i, k := range t.Index {
			if isSlow[i] {
				slow += k
			} else {
				fast += k
			}
		}
		switch {
		case slow == 1 && fast == 0:
			ops[OriginFluctuation].Add(t.Index, t.Coef)
		case slow > 0 && fast > 0:
			ops[OriginShared].Add(t.Index, t.Coef)
		case fast > 0:
			ops[OriginFastDrift].Add(t.Index, t.Coef)
		default:
			ops[OriginHigher].Add(t.Index, t.Coef)
		}
	}
	var out []piece
	for _, o := range origins {
		if !ops[o].IsZero() {
			out = append(out, piece{o, ops[o]})
		}
	}
	return out
}

// frozen is the slow drift operator acting on u_i with the slow dependence
// of the fast process ignored: d/dx of u_i is replaced by the corrector of
// the differentiated source. It is invalid (the zero value) when the leading
// generator does not depend on the slow variables, as nothing is to be told
// apart then, or when the source cannot be differentiated order by order.
func (e *expansion) frozen(ctx context.Context, op *generator.Operator, index int) (algebra.Expr, error) {
	lead := e.Gen.Parts[0].Op
	depends := false
	for _, s := range e.Slow {
		depends = depends || !lead.DiffCoefficients(s).IsZero()
	}
	var source *Order
	for k := range e.out.Orders {
		if e.out.Orders[k].J == index {
			source = &e.out.Orders[k]
		}
	}
	if !depends || source == nil || len(source.Source) != 1 || source.Source[0].Index != 0 {
		return algebra.Expr{}, nil
	}
	out := e.Ring.Int(0)
	for _, t := range op.Terms() {
		for i, k := range t.Index {
			if k == 0 {
				continue
			}
			s, err := e.solve(ctx, source.Sum.Diff(op.Vars()[i]))
			if err != nil {
				return algebra.Expr{}, err
			}
			out = out.Add(t.Coef.Mul(s.Phi))
		}
	}
	return out, nil
}

// NegPower is -p as a short text: the exponent of the time scale.
func NegPower(p *big.Rat) string { return new(big.Rat).Neg(p).RatString() }

// Average is the mean of a function over the fast process.
func (l *Limit) Average(ctx context.Context, f algebra.Expr) (algebra.Expr, error) {
	var last error
	for _, r := range l.routes {
		m, err := r.Mean(ctx, f)
		if err == nil {
			return m, nil
		}
		last = err
	}
	return algebra.Expr{}, last
}
