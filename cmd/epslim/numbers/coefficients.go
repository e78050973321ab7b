package numbers

import (
	"context"
	"fmt"
	"math/big"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/solver/kernel"
	"epslim/solver/volume"
)

// Coefficients are drift and diffusion of the limit as one compiled program.
// It implements volume.Coefficients, Cloner and DiagonalDiffusion.
type Coefficients struct {
	program  *kernel.Program
	scratch  *kernel.Scratch
	dim      int
	diagonal bool
}

// Clone gives another goroutine scratch of its own.
func (c *Coefficients) Clone() volume.Coefficients {
	d := *c
	d.scratch = c.program.NewScratch()
	return &d
}

// IsDiagonal reports whether the cross entries of A vanish identically.
func (c *Coefficients) IsDiagonal() bool { return c.diagonal }

// Eval implements volume.Coefficients.
func (c *Coefficients) Eval(points, drift, diffusion [][]float64) error {
	out := make([][]float64, 0, len(drift)+len(diffusion))
	out = append(append(out, drift...), diffusion...)
	return c.program.Eval(c.scratch, points, out, len(points[0]))
}

// upperTriangle lists the entries of A row by row.
func upperTriangle(a [][]algebra.Expr) []algebra.Expr {
	var out []algebra.Expr
	for i := range a {
		out = append(out, a[i][i:]...)
	}
	return out
}

func slowNames(res *derivation.Result) []string {
	var out []string
	for _, v := range res.System.Slow {
		out = append(out, v.Name)
	}
	return out
}

// LimitCoefficients compiles drift and diffusion of the limit. Averages that
// are known by numbers only are evaluated once when they are constants, and
// tabulated between the given ends otherwise.
func LimitCoefficients(ctx context.Context, res *derivation.Result, w *Window) (volume.Coefficients, error) {
	exprs := append(append([]algebra.Expr(nil), res.Limit.Drift...), upperTriangle(res.Limit.Diffusion)...)
	l := NewLowering(res.System, kernel.NewBuilder(), slowNames(res))
	ok, err := namedConstants(ctx, res, l, exprs)
	if err != nil {
		return nil, err
	}
	if !ok {
		return tabulate(ctx, res, w, exprs)
	}
	nodes, err := l.Nodes(exprs...)
	if err != nil {
		return nil, err
	}
	p, err := l.Builder.Compile(nodes...)
	if err != nil {
		return nil, err
	}
	c := &Coefficients{program: p, scratch: p.NewScratch(), dim: len(res.System.Slow), diagonal: true}
	for i, row := range res.Limit.Diffusion {
		for _, a := range row[i+1:] {
			c.diagonal = c.diagonal && a.IsZero()
		}
	}
	return c, nil
}

// namedConstants evaluates the named averages that depend on no slow variable
// and gives them to the lowering; ok is false when others occur in exprs.
func namedConstants(ctx context.Context, res *derivation.Result, l *Lowering, exprs []algebra.Expr) (ok bool, err error) {
	if res.Route == nil {
		return true, nil
	}
	ok = true
	for _, n := range res.Route.Names() {
		used := false
		for _, e := range exprs {
			for _, f := range e.Functions() {
				used = used || f == n.Mean
			}
			used = used || e.DependsOn(n.Mean)
		}
		if !used || n.Zero {
			continue
		}
		if len(n.MeanArgs) > 0 {
			ok = false
			continue
		}
		m, found := res.System.Ring.Symbol(n.Mean)
		if !found {
			ok = false
			continue
		}
		if err := res.System.NeedNumbers(nil, n.Of); err != nil {
			return false, err
		}
		v, _, err := res.Route.At(nil, false).Value(ctx, m)
		if err != nil {
			return false, fmt.Errorf("average %s: %w", n.Mean, err)
		}
		l.SetConstant(n.Mean, v)
	}
	return ok, nil
}

// tableNodes is the number of nodes along each axis of a table, by dimension.
var tableNodes = []int{0, 257, 49, 13}

// tabulate evaluates coefficients that are known by numbers only at the nodes
// of a tensor grid.
func tabulate(ctx context.Context, res *derivation.Result, w *Window, exprs []algebra.Expr) (volume.Coefficients, error) {
	dim := len(res.System.Slow)
	if dim >= len(tableNodes) {
		return nil, fmt.Errorf("the limit is known by numbers only, and a table of it in %d variables would be too large", dim)
	}
	if w == nil {
		return nil, fmt.Errorf("the limit is known by numbers only; give each unbounded variable a window")
	}
	if err := res.System.NeedNumbers(nil, exprs...); err != nil {
		return nil, err
	}
	n := tableNodes[dim]
	nodes := make([][]float64, dim)
	total := 1
	for d := range nodes {
		for i := 0; i < n; i++ {
			nodes[d] = append(nodes[d], w.Lo[d]+(w.Hi[d]-w.Lo[d])*float64(i)/float64(n-1))
		}
		total *= n
	}
	table := make([][]float64, len(exprs))
	for k := range table {
		table[k] = make([]float64, total)
	}
	for q := 0; q < total; q++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		p := res.Route.At(nil, false)
		for d, r := 0, q; d < dim; d++ {
			x := nodes[d][r%n]
			r /= n
			p.Bind(res.System.Slow[d].Name, new(big.Float).SetPrec(200).SetFloat64(x))
		}
		for k, e := range exprs {
			v, _, err := p.Value(ctx, e)
			if err != nil {
				return nil, err
			}
			table[k][q] = v
		}
	}
	return volume.NewTabulated(nodes, table[:dim], table[dim:])
}
