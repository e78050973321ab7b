package perturb

import (
	"errors"
	"math/big"

	"epslim/generator"
	"epslim/generator/algebra"
)

// Frame tells how a large mean drift was dealt with.
type Frame struct {
	Power    *big.Rat       // of the small parameter that multiplies Velocity
	Velocity []algebra.Expr // one entry a slow variable
	// Short is set when the mean depends on the slow variables, so that no
	// frame moves with it: the limit is then the averaging limit on the
	// shorter time scale, and the first correction is the diffusion of the
	// deviation from it.
	Short bool
}

// movable reports whether a constant mean drift can be subtracted: the
// velocity must not depend on the slow variables, and nothing else in the
// generator may depend on those that move.
func (e *expansion) movable(velocity []algebra.Expr) bool {
	for i, v := range velocity {
		for _, s := range e.Slow {
			if v.DependsOn(s) {
				return false
			}
		}
		if v.IsZero() {
			continue
		}
		for _, p := range e.Gen.Parts {
			for _, t := range p.Op.Terms() {
				if t.Coef.DependsOn(e.Slow[i]) {
					return false
				}
			}
		}
	}
	return true
}

// subtract is the generator seen from the moving frame.
func (e *expansion) subtract(power *big.Rat, velocity []algebra.Expr) *generator.Graded {
	g := &generator.Graded{Small: e.Gen.Small}
	done := false
	shift := func(op *generator.Operator) *generator.Operator {
		out := generator.New(op.Ring(), op.Vars())
		for _, t := range op.Terms() {
			out.Add(t.Index, t.Coef)
		}
		slow := e.slowIndex()
		for i, v := range velocity {
			idx := make([]int, len(op.Vars()))
			idx[slow[i]] = 1
			out.Add(idx, v.Neg())
		}
		return out
	}
	for _, p := range e.Gen.Parts {
		if p.Power.Cmp(power) == 0 {
			p.Op = shift(p.Op)
			done = true
		}
		g.Parts = append(g.Parts, p)
	}
	if !done {
		// The mean came out between two powers of the model.
		var parts []generator.Part
		for _, p := range g.Parts {
			if !done && p.Power.Cmp(power) > 0 {
				parts = append(parts, generator.Part{Power: power, Op: shift(generator.New(e.Ring, p.Op.Vars()))})
				done = true
			}
			parts = append(parts, p)
		}
		if !done {
			parts = append(parts, generator.Part{Power: power, Op: shift(generator.New(e.Ring, g.Parts[0].Op.Vars()))})
		}
		g.Parts = parts
	}
	return g
}

// errMoved asks for another run in a moving frame.
var errMoved = errors.New("the frame moves")
