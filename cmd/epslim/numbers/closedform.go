package numbers

import (
	"context"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/solver/density"
	"epslim/solver/grid"
	"epslim/solver/kernel"
)

// ClosedForm is the closed form of the stationary density for blocks of
// points on a grid, scaled so that it does not overflow; nil where there is
// none. Its logarithm is compiled, so that densities whose values span more
// than the range of doubles can be compared.
func ClosedForm(ctx context.Context, res *derivation.Result, g *grid.Grid) (density.Formula, error) {
	p := res.Stationary.Density
	if !p.Valid() {
		return nil, nil
	}
	logp, err := p.Ring().Call("log", p)
	if err != nil {
		logp = algebra.Expr{}
	}
	eval, err := logFormula(ctx, res, g, p, logp)
	if err != nil {
		return nil, err
	}
	top, err := largest(g, eval)
	if err != nil {
		return nil, err
	}
	return func(points [][]float64, out []float64) error {
		if err := eval(points, out); err != nil {
			return err
		}
		for i, v := range out {
			out[i] = math.Exp(v - top)
		}
		return nil
	}, nil
}

// logFormula evaluates the logarithm of the density.
func logFormula(ctx context.Context, res *derivation.Result, g *grid.Grid, p, logp algebra.Expr) (density.Formula, error) {
	for _, e := range []algebra.Expr{logp, p} {
		if !e.Valid() {
			continue
		}
		l := NewLowering(res.System, kernel.NewBuilder(), slowNames(res))
		if ok, err := namedConstants(ctx, res, l, []algebra.Expr{e}); err != nil || !ok {
			continue
		}
		nodes, err := l.Nodes(e)
		if err != nil {
			continue
		}
		if !logp.Valid() || !e.Equal(logp) {
			nodes[0] = l.Builder.Log(nodes[0])
		}
		prog, err := l.Builder.Compile(nodes...)
		if err != nil {
			return nil, err
		}
		s := prog.NewScratch()
		return func(points [][]float64, out []float64) error {
			return prog.Eval(s, points, [][]float64{out}, len(out))
		}, nil
	}
	if f, ok, err := integratingFactor(ctx, res, g); ok || err != nil {
		return f, err
	}
	return pointwise(ctx, res, p)
}

// pointwise evaluates what cannot be compiled, such as integrals, point by
// point.
func pointwise(ctx context.Context, res *derivation.Result, p algebra.Expr) (density.Formula, error) {
	if err := res.System.NeedNumbers(nil, p); err != nil {
		return nil, err
	}
	q, err := p.SubsFunc(res.System.Definitions())
	if err != nil {
		return nil, err
	}
	if q, err = q.Subs(res.System.Values()); err != nil {
		return nil, err
	}
	names := slowNames(res)
	at := map[string]float64{}
	return func(points [][]float64, out []float64) error {
		for i := range out {
			if err := ctx.Err(); err != nil {
				return err
			}
			for d, n := range names {
				at[n] = points[d][i]
			}
			v, err := q.EvalFloat(at)
			if err != nil {
				return err
			}
			out[i] = math.Log(v)
		}
		return nil
	}, nil
}

// largest is the largest value of a function over a coarse sample of a grid.
func largest(g *grid.Grid, f density.Formula) (float64, error) {
	step := max(g.Cells()/20000, 1)
	var points [][]float64
	for d := 0; d < g.Dim(); d++ {
		points = append(points, nil)
	}
	for k := 0; k < g.Cells(); k += step {
		for d, x := range g.CenterOf(k) {
			points[d] = append(points[d], x)
		}
	}
	out := make([]float64, len(points[0]))
	if err := f(points, out); err != nil {
		return 0, err
	}
	top := math.Inf(-1)
	for _, v := range out {
		top = math.Max(top, v)
	}
	return top, nil
}
