package fast

import (
	"context"
	"errors"
	"fmt"
	"math"
)

// Vector is a function at one resolution; its type belongs to the level.
type Vector any

// Level is a fast problem at one resolution: what a route implements to get a
// [Solver] from [NewEngine].
type Level interface {
	Coefficient(c *Coefficient) (Vector, error)
	Sum(factors []float64, u []Vector) (Vector, error)
	Apply(op Operator, u Vector) (Vector, error)
	Product(u, v Vector) (Vector, error)
	// Mean returns the average, with Error the rounding error and Scale the
	// size of what was averaged.
	Mean(u Vector) (Value, error)
	Solve(u Vector) (Vector, error)
	At(u Vector, y [][]float64) ([]float64, error)
	Density(y [][]float64) ([]float64, error)
	// String describes the resolution.
	String() string
	Unknowns() int
}

// Route makes the levels of a method.
type Route struct {
	Method string
	Notes  []string
	// Make builds level k (0, 1, ...) and is told all coefficients that have
	// been used so far, which the level should resolve.
	Make func(ctx context.Context, k int, used []*Coefficient) (Level, error)
	// Resolves reports whether a level resolves a coefficient that was not
	// known when the level was made; nil for always.
	Resolves func(l Level, c *Coefficient) bool
	// Levels is how many levels there are.
	Levels int
	// Tolerance is relative to Value.Scale.
	Tolerance float64
}

type node struct {
	label string
	coef  *Coefficient
	op    Operator
	kind  nodeKind
	args  []int
	scale []float64
}

type nodeKind uint8

const (
	nodeCoefficient nodeKind = iota
	nodeSum
	nodeApply
	nodeProduct
	nodeSolve
)

// Engine is the [Solver] that evaluates chains of operations at rising
// resolution.
type Engine struct {
	route  Route
	nodes  []node
	used   []*Coefficient
	levels []*levelState
	// at is the finer of the two levels compared at present.
	at int
}

type levelState struct {
	level Level
	cache map[int]Vector
}

var _ Solver = (*Engine)(nil)

// NewEngine returns a solver on the levels of a route.
func NewEngine(r Route) *Engine {
	return &Engine{route: r, levels: make([]*levelState, r.Levels), at: 1}
}

func (e *Engine) add(n node) Function {
	e.nodes = append(e.nodes, n)
	return Function{owner: e, id: len(e.nodes) - 1}
}

// Coefficient implements [Solver].
func (e *Engine) Coefficient(c Coefficient) Function {
	p := &c
	e.use(p)
	return e.add(node{kind: nodeCoefficient, coef: p, label: c.Label()})
}

func (e *Engine) use(c *Coefficient) {
	e.used = append(e.used, c)
	if e.route.Resolves == nil {
		return
	}
	for k, l := range e.levels {
		if l != nil && !e.route.Resolves(l.level, c) {
			e.levels[k] = nil
		}
	}
}

// Sum implements [Solver].
func (e *Engine) Sum(terms ...Scaled) Function {
	n := node{kind: nodeSum, label: "0"}
	for i, t := range terms {
		n.args = append(n.args, t.Function.id)
		n.scale = append(n.scale, t.Factor)
		if i == 0 {
			n.label = e.nodes[t.Function.id].label
		} else if len(n.label) < 60 {
			n.label += " + " + e.nodes[t.Function.id].label
		}
	}
	return e.add(n)
}

// Apply implements [Solver].
func (e *Engine) Apply(op Operator, u Function) Function {
	label := ""
	for i := range op {
		e.use(&op[i].Coefficient)
		if i > 0 {
			label += " + "
		}
		label += op[i].Coefficient.Label()
		if op[i].Total() > 0 {
			label += fmt.Sprint("*d", op[i].Order)
		}
	}
	if len(label) > 60 {
		label = "(operator)"
	}
	return e.add(node{kind: nodeApply, op: op, args: []int{u.id}, label: label + " " + e.nodes[u.id].label})
}

// Product implements [Solver].
func (e *Engine) Product(u, v Function) Function {
	return e.add(node{kind: nodeProduct, args: []int{u.id, v.id}, label: "(" + e.nodes[u.id].label + ")*(" + e.nodes[v.id].label + ")"})
}

// Solve implements [Solver].
func (e *Engine) Solve(ctx context.Context, g Function) (Function, Value, error) {
	if err := e.owns(g); err != nil {
		return Function{}, Value{}, err
	}
	mean, err := e.Mean(ctx, g)
	phi := e.add(node{kind: nodeSolve, args: []int{g.id}, label: "Phi[" + e.nodes[g.id].label + "]"})
	return phi, mean, err
}

func (e *Engine) owns(u Function) error {
	if u.owner != e {
		return errors.New("fast: a function of another solver")
	}
	return nil
}

func (e *Engine) state(ctx context.Context, k int) (*levelState, error) {
	if e.levels[k] == nil {
		l, err := e.route.Make(ctx, k, e.used)
		if err != nil {
			return nil, err
		}
		e.levels[k] = &levelState{level: l, cache: map[int]Vector{}}
	}
	return e.levels[k], nil
}

func (e *Engine) eval(ctx context.Context, s *levelState, id int) (Vector, error) {
	if v, ok := s.cache[id]; ok {
		return v, nil
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	n := &e.nodes[id]
	args := make([]Vector, len(n.args))
	for i, a := range n.args {
		v, err := e.eval(ctx, s, a)
		if err != nil {
			return nil, err
		}
		args[i] = v
	}
	var v Vector
	var err error
	switch n.kind {
	case nodeCoefficient:
		v, err = s.level.Coefficient(n.coef)
	case nodeSum:
		v, err = s.level.Sum(n.scale, args)
	case nodeApply:
		v, err = s.level.Apply(n.op, args[0])
	case nodeProduct:
		v, err = s.level.Product(args[0], args[1])
	case nodeSolve:
		v, err = s.level.Solve(args[0])
	}
	if err != nil {
		var d *Divergent
		if errors.As(err, &d) && d.Quantity == "" {
			d.Quantity = n.label
		}
		return nil, err
	}
	s.cache[id] = v
	return v, nil
}

func (e *Engine) meanAt(ctx context.Context, k, id int) (Value, error) {
	s, err := e.state(ctx, k)
	if err != nil {
		return Value{}, err
	}
	u, err := e.eval(ctx, s, id)
	if err != nil {
		return Value{}, err
	}
	v, err := s.level.Mean(u)
	if err != nil {
		var d *Divergent
		if errors.As(err, &d) && d.Quantity == "" {
			d.Quantity = e.nodes[id].label
		}
		return Value{}, err
	}
	if math.IsNaN(v.Value) || math.IsInf(v.Value, 0) {
		return Value{}, &NotSettled{Quantity: "average of " + e.nodes[id].label, Value: Value{Error: math.Inf(1)}, Tolerance: e.route.Tolerance, Resolution: s.level.String()}
	}
	return v, nil
}

// Mean implements [Solver].
func (e *Engine) Mean(ctx context.Context, g Function) (Value, error) {
	if err := e.owns(g); err != nil {
		return Value{}, err
	}
	var best Value
	for {
		coarse, err := e.meanAt(ctx, e.at-1, g.id)
		var fine Value
		if err == nil {
			fine, err = e.meanAt(ctx, e.at, g.id)
		}
		var ns *NotSettled
		if err != nil && !errors.As(err, &ns) {
			if best.Scale > 0 && (errors.Is(err, ErrBudget) || ctx.Err() != nil) {
				// Fall back to the finest pair of levels that could be made.
				e.at = max(1, e.at-1)
				if errors.Is(err, ErrBudget) {
					e.route.Levels = e.at + 1
				}
				return best, e.unsettled(g.id, best)
			}
			return Value{}, err
		}
		if err == nil {
			best = fine
			best.Error = math.Abs(fine.Value-coarse.Value) + fine.Error
			scale := math.Max(best.Scale, math.Abs(best.Value))
			// What is lost to rounding does not come back at a higher level: the
			// value is returned with its honest error.
			if best.Error-fine.Rounding <= math.Max(e.route.Tolerance*scale, fine.Rounding) {
				return best, nil
			}
		}
		if e.at+1 >= e.route.Levels {
			if err != nil {
				return Value{}, err
			}
			return best, e.unsettled(g.id, best)
		}
		e.at++
		if e.at >= 3 {
			e.levels[e.at-3] = nil
		}
	}
}

func (e *Engine) unsettled(id int, best Value) error {
	n := &NotSettled{Quantity: "average of " + e.nodes[id].label, Value: best, Tolerance: e.route.Tolerance}
	for k := e.at; k >= 0 && n.Resolution == ""; k-- {
		if e.levels[k] != nil {
			n.Resolution = e.levels[k].level.String()
		}
	}
	return n
}

// At implements [Solver].
func (e *Engine) At(ctx context.Context, u Function, y [][]float64) ([]float64, error) {
	if err := e.owns(u); err != nil {
		return nil, err
	}
	s, err := e.state(ctx, e.at)
	if err != nil {
		return nil, err
	}
	v, err := e.eval(ctx, s, u.id)
	if err != nil {
		return nil, err
	}
	return s.level.At(v, y)
}

// Density implements [Solver].
func (e *Engine) Density(ctx context.Context, y [][]float64) ([]float64, error) {
	s, err := e.state(ctx, e.at)
	if err != nil {
		return nil, err
	}
	return s.level.Density(y)
}

// Report implements [Solver].
func (e *Engine) Report() Report {
	r := Report{Method: e.route.Method, Notes: e.route.Notes}
	if s := e.levels[e.at]; s != nil {
		r.Resolution, r.Unknowns = s.level.String(), s.level.Unknowns()
	}
	return r
}
