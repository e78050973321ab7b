package cell

import (
	"context"
	"errors"
	"fmt"
	"sort"

	"epslim/generator/algebra"
)

// Closure is the exact route. It writes f over functions of the fast
// variables, applies L0 until no new function appears, and solves the linear
// system over the field of slow expressions, strongly connected block by
// block. The average comes out as the extra unknown; no invariant density is
// needed. At walls the corrector must have zero slope, and on circles it must
// be periodic; where the plain closure violates that, a two-point problem
// over an enriched set of functions is solved instead.
type Closure struct {
	p       *Process
	names   []string
	fns     map[string]*fnNode
	conds   []algebra.Expr
	MaxSize int // functions in a closed set; 0 means 400
	MaxStep int // applications of L0 before giving up; 0 means 40
}

// fnNode is a basis function of the fast variables.
type fnNode struct {
	fn       algebra.Expr
	key      string
	image    []link // L0 fn, once computed
	expanded bool
	sol      *Solution
	mean     algebra.Expr // the average alone, if it was asked for
	err      error
}

type link struct {
	coef algebra.Expr
	to   *fnNode
}

// NewClosure prepares the exact route for a process.
func NewClosure(p *Process) *Closure {
	return &Closure{p: p, names: p.Names(), fns: map[string]*fnNode{}}
}

// Name implements Route.
func (c *Closure) Name() string { return "closure" }

// Conditions implements Route.
func (c *Closure) Conditions() []algebra.Expr { return c.conds }

// solveBudget bounds the work on one fast problem, in term operations.
const solveBudget = 60_000_000

// Solve implements Route.
func (c *Closure) Solve(ctx context.Context, f algebra.Expr) (Solution, error) {
	out := Solution{c.p.Ring.Int(0), c.p.Ring.Int(0)}
	err := c.eachPart(ctx, f, func(coef algebra.Expr, s *Solution) {
		out.Phi = out.Phi.Add(coef.Mul(s.Phi))
		out.Mean = out.Mean.Add(coef.Mul(s.Mean))
	})
	return out, err
}

// Mean implements Route. Without ends the averages follow from the closed set
// alone: the stationary law gives <L0 b> = 0 for each of its functions.
func (c *Closure) Mean(ctx context.Context, f algebra.Expr) (algebra.Expr, error) {
	out := c.p.Ring.Int(0)
	if !c.hasEnds() {
		err := c.p.Ring.WithBudget(solveBudget, func() error {
			for _, l := range c.split(f) {
				m, err := c.basisMean(ctx, l.to)
				if err != nil {
					return err
				}
				out = out.Add(l.coef.Mul(m))
			}
			return nil
		})
		if err == nil {
			return out, nil
		}
		out = c.p.Ring.Int(0)
	}
	err := c.eachPart(ctx, f, func(coef algebra.Expr, s *Solution) {
		out = out.Add(coef.Mul(s.Mean))
	})
	return out, err
}

// basisMean is the average of one basis function, block by block, without
// correctors: M <b> + N <d> = 0.
func (c *Closure) basisMean(ctx context.Context, n *fnNode) (algebra.Expr, error) {
	if n.sol != nil {
		return n.sol.Mean, nil
	}
	if n.mean.Valid() {
		return n.mean, nil
	}
	if fs := n.fn.Functions(); len(fs) > 0 {
		return n.mean, doesNotApply("%s is known by name only", fs[0])
	}
	set, err := c.close(ctx, []*fnNode{n})
	if err != nil {
		return n.mean, err
	}
	for _, block := range components(set) {
		if err := c.meanBlock(block); err != nil {
			return n.mean, err
		}
	}
	return n.mean, nil
}

func (c *Closure) meanBlock(block []*fnNode) error {
	r := c.p.Ring
	if len(block) == 1 && block[0].fn.IsOne() {
		block[0].mean = r.Int(1)
		return nil
	}
	at := map[*fnNode]int{}
	done := true
	for i, n := range block {
		at[n] = i
		if n.sol != nil {
			n.mean = n.sol.Mean
		}
		done = done && n.mean.Valid()
	}
	if done {
		return nil
	}
	k := len(block)
	m := make([][]algebra.Expr, k)
	rhs := make([]algebra.Expr, k)
	for i, n := range block {
		m[i] = make([]algebra.Expr, k)
		for j := range m[i] {
			m[i][j] = r.Int(0)
		}
		rhs[i] = r.Int(0)
		for _, l := range n.image {
			if j, ok := at[l.to]; ok {
				m[i][j] = m[i][j].Add(l.coef)
			} else {
				rhs[i] = rhs[i].Sub(l.coef.Mul(l.to.mean))
			}
		}
	}
	sol, err := algebra.SolveLinear(m, rhs)
	if err != nil || len(sol.Free) > 0 {
		return errSingular
	}
	for i, n := range block {
		n.mean = sol.X[i]
		// Put back: the average of L0 b must vanish.
		sum := rhs[i].Neg()
		for j := range block {
			sum = sum.Add(m[i][j].Mul(sol.X[j]))
		}
		if !sum.IsZero() {
			return fmt.Errorf("internal error: the average of L0 %s is %s", n.fn, sum)
		}
	}
	return nil
}

// eachPart solves for every function of the fast variables in f.
func (c *Closure) eachPart(ctx context.Context, f algebra.Expr, use func(coef algebra.Expr, s *Solution)) error {
	err := c.p.Ring.WithBudget(solveBudget, func() error {
		for _, l := range c.split(f) {
			if err := ctx.Err(); err != nil {
				return err
			}
			s, err := c.basis(ctx, l.to)
			if err != nil {
				return err
			}
			use(l.coef, s)
		}
		return nil
	})
	if errors.Is(err, algebra.ErrTooLarge) {
		err = doesNotApply("the closed set of functions is too large: %v", err)
	}
	return err
}

// split writes e over basis functions.
func (c *Closure) split(e algebra.Expr) []link {
	var out []link
	for _, t := range c.p.Reduce(e).SplitBy(c.names...) {
		key := t.Fn.String()
		n, ok := c.fns[key]
		if !ok {
			n = &fnNode{fn: t.Fn, key: key}
			c.fns[key] = n
		}
		out = append(out, link{t.Coef, n})
	}
	return out
}

func (c *Closure) expand(n *fnNode) []link {
	if !n.expanded {
		n.image = c.split(c.p.L0.Apply(n.fn))
		n.expanded = true
	}
	return n.image
}

// basis solves the fast problem of one basis function.
func (c *Closure) basis(ctx context.Context, n *fnNode) (*Solution, error) {
	if n.sol != nil || n.err != nil {
		return n.sol, n.err
	}
	n.sol, n.err = c.solveBasis(ctx, n)
	if n.err == nil {
		c.addConditions(n.sol)
		if res := c.p.Residual(n.fn, *n.sol); !res.IsZero() {
			n.sol, n.err = nil, fmt.Errorf("internal error: the corrector of %s leaves the residual %s", n.fn, res)
		}
	}
	return n.sol, n.err
}

func (c *Closure) solveBasis(ctx context.Context, n *fnNode) (*Solution, error) {
	r := c.p.Ring
	if n.fn.IsOne() {
		return &Solution{r.Int(0), r.Int(1)}, nil
	}
	if fs := n.fn.Functions(); len(fs) > 0 {
		return nil, doesNotApply("%s is known by name only", fs[0])
	}
	set, open := c.close(ctx, []*fnNode{n})
	if open != nil && !errors.Is(open, ErrDoesNotApply) {
		return nil, open
	}
	if open == nil {
		s, err := c.solveBlocks(n, set)
		if c.hasEnds() {
			c.dropMisfits(set)
		}
		if err == nil && n.sol != nil {
			return s, nil
		}
		if err != nil && !errors.Is(err, errSingular) {
			return nil, err
		}
	}
	s, err := c.twoPoint(n, set, open == nil)
	if err != nil && open != nil {
		return nil, open
	}
	return s, err
}

// dropMisfits forgets block solutions that violate the conditions at the ends
// of the domain. A solution built on them is checked on its own.
func (c *Closure) dropMisfits(set []*fnNode) {
	for _, m := range set {
		if m.sol != nil && !m.fn.IsOne() && !c.fitsEnds(m.sol.Phi) {
			m.sol = nil
		}
	}
}

// close collects the functions that L0 makes of the given ones.
func (c *Closure) close(ctx context.Context, start []*fnNode) ([]*fnNode, error) {
	maxSize, maxStep := c.MaxSize, c.MaxStep
	if maxSize == 0 {
		maxSize = 400
	}
	if maxStep == 0 {
		maxStep = 40
	}
	seen := map[*fnNode]bool{}
	var set []*fnNode
	layer := start
	for step := 0; len(layer) > 0; step++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		var next []*fnNode
		for _, n := range layer {
			if seen[n] {
				continue
			}
			seen[n] = true
			set = append(set, n)
			for _, l := range c.expand(n) {
				if !seen[l.to] {
					next = append(next, l.to)
				}
			}
		}
		if len(next) > 0 && (len(set) > maxSize || step > maxStep) {
			return set, doesNotApply("applying the fast generator to %s does not close (%d functions after %d steps, the last %s)",
				start[0].fn, len(set), step, next[0].fn)
		}
		layer = next
	}
	return set, nil
}

var errSingular = errors.New("a block of the closed system is singular")

// solveBlocks solves by strongly connected components of the graph "L0 of
// this function contains that one", last first: within a block with matrix M
// and lower functions d, L0 b = M b + N d, so
//
//	<b> = -M^-1 N <d>,  Phi_b = -M^-1 (b + N Phi_d).
func (c *Closure) solveBlocks(n *fnNode, set []*fnNode) (*Solution, error) {
	for _, block := range components(set) {
		if len(block) == 1 && block[0].fn.IsOne() {
			one := block[0]
			if one.sol == nil {
				one.sol = &Solution{c.p.Ring.Int(0), c.p.Ring.Int(1)}
			}
			continue
		}
		if err := c.solveBlock(block, n); err != nil {
			return nil, err
		}
	}
	return n.sol, nil
}

// solveBlock solves for every member of the block that lower blocks asked
// for; in a block of several functions each member is solved by its own
// transposed system, which is cheaper than the inverse.
func (c *Closure) solveBlock(block []*fnNode, want *fnNode) error {
	r := c.p.Ring
	at := map[*fnNode]int{}
	for i, n := range block {
		at[n] = i
	}
	k := len(block)
	mt := make([][]algebra.Expr, k) // M transposed
	for i := range mt {
		mt[i] = make([]algebra.Expr, k)
		for j := range mt[i] {
			mt[i][j] = r.Int(0)
		}
	}
	rest := make([]Solution, k) // N Phi_d and N <d>
	for i, n := range block {
		rest[i] = Solution{n.fn, r.Int(0)}
		for _, l := range n.image {
			if j, ok := at[l.to]; ok {
				mt[j][i] = mt[j][i].Add(l.coef)
				continue
			}
			rest[i].Phi = rest[i].Phi.Add(l.coef.Mul(l.to.sol.Phi))
			rest[i].Mean = rest[i].Mean.Add(l.coef.Mul(l.to.sol.Mean))
		}
	}
	for i, n := range block {
		if n.sol != nil {
			continue
		}
		rhs := make([]algebra.Expr, k)
		for j := range rhs {
			rhs[j] = r.Int(0)
		}
		rhs[i] = r.Int(-1)
		sol, err := algebra.SolveLinear(mt, rhs)
		if err != nil || len(sol.Free) > 0 {
			return errSingular
		}
		s := Solution{r.Int(0), r.Int(0)}
		for j := range block {
			if sol.X[j].IsZero() {
				continue
			}
			s.Phi = s.Phi.Add(sol.X[j].Mul(rest[j].Phi))
			s.Mean = s.Mean.Add(sol.X[j].Mul(rest[j].Mean))
		}
		n.sol = &s
	}
	return nil
}

// addConditions keeps the denominators of a solution that the declared signs
// do not keep away from zero.
func (c *Closure) addConditions(s *Solution) {
	for _, e := range []algebra.Expr{s.Mean, s.Phi} {
		_, den := e.NumDen()
		for _, f := range den.Factors() {
			if f.Sign()&algebra.Zero == 0 || !f.IsReal() || dependsOnFast(c.p, f) {
				continue
			}
			known := false
			for _, q := range c.conds {
				known = known || q.Equal(f)
			}
			if !known {
				c.conds = append(c.conds, f)
			}
		}
	}
}

// components are the strongly connected components of the set in an order in
// which every block comes after the blocks it needs (Tarjan 1972).
func components(set []*fnNode) [][]*fnNode {
	index := map[*fnNode]int{}
	low := map[*fnNode]int{}
	on := map[*fnNode]bool{}
	var stack []*fnNode
	var out [][]*fnNode
	next := 1
	var visit func(n *fnNode)
	visit = func(n *fnNode) {
		index[n], low[n] = next, next
		next++
		stack = append(stack, n)
		on[n] = true
		for _, l := range n.image {
			if index[l.to] == 0 {
				visit(l.to)
				low[n] = min(low[n], low[l.to])
			} else if on[l.to] {
				low[n] = min(low[n], index[l.to])
			}
		}
		if low[n] == index[n] {
			var block []*fnNode
			for {
				m := stack[len(stack)-1]
				stack = stack[:len(stack)-1]
				on[m] = false
				block = append(block, m)
				if m == n {
					break
				}
			}
			sort.Slice(block, func(i, j int) bool { return block[i].key < block[j].key })
			out = append(out, block)
		}
	}
	for _, n := range set {
		if index[n] == 0 {
			visit(n)
		}
	}
	return out
}
