package numbers

import (
	"context"
	"sort"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/solver/density"
	"epslim/solver/grid"
	"epslim/solver/kernel"
)

// gauss are nodes and weights of Gauss-Legendre quadrature of eight points on
// [-1, 1] (M. Abramowitz, I.A. Stegun, Handbook of Mathematical Functions,
// table 25.4).
var gauss = [4][2]float64{
	{0.1834346424956498, 0.3626837833783620},
	{0.5255324099163290, 0.3137066458778873},
	{0.7966664774136267, 0.2223810344533745},
	{0.9602898564975363, 0.1012285362903763},
}

// integratingFactor is the logarithm of a one-dimensional density whose
// potential holds an integral: h = (log p)' is compiled and integrated cell by
// cell from the middle of the grid. ok is false when h cannot be compiled.
func integratingFactor(ctx context.Context, res *derivation.Result, g *grid.Grid) (f density.Formula, ok bool, err error) {
	if g.Dim() != 1 || len(res.Stationary.H) != 1 {
		return nil, false, nil
	}
	h := res.Stationary.H[0]
	l := NewLowering(res.System, kernel.NewBuilder(), slowNames(res))
	if ok, err := namedConstants(ctx, res, l, []algebra.Expr{h}); err != nil || !ok {
		return nil, false, err
	}
	nodes, err := l.Nodes(h)
	if err != nil {
		return nil, false, nil
	}
	prog, err := l.Builder.Compile(nodes...)
	if err != nil {
		return nil, false, err
	}
	q := &primitive{program: prog, scratch: prog.NewScratch(), edges: g.Axis(0).Edges}
	if err := q.tabulate(); err != nil {
		return nil, false, err
	}
	return func(points [][]float64, out []float64) error {
		for i, x := range points[0] {
			v, err := q.at(x)
			if err != nil {
				return err
			}
			out[i] = v
		}
		return nil
	}, true, nil
}

// primitive is an integral tabulated at edges.
type primitive struct {
	program *kernel.Program
	scratch *kernel.Scratch
	edges   []float64
	sums    []float64 // from the middle edge to each edge
}

// over integrates between two points that are close.
func (p *primitive) over(a, b float64) (float64, error) {
	var x, y [8]float64
	mid, half := (a+b)/2, (b-a)/2
	for k, g := range gauss {
		x[2*k], x[2*k+1] = mid-half*g[0], mid+half*g[0]
	}
	if err := p.program.Eval(p.scratch, [][]float64{x[:]}, [][]float64{y[:]}, len(x)); err != nil {
		return 0, err
	}
	sum := 0.0
	for k, g := range gauss {
		sum += g[1] * (y[2*k] + y[2*k+1])
	}
	return half * sum, nil
}

func (p *primitive) tabulate() error {
	n := len(p.edges)
	p.sums = make([]float64, n)
	mid := n / 2
	for i := mid + 1; i < n; i++ {
		d, err := p.over(p.edges[i-1], p.edges[i])
		if err != nil {
			return err
		}
		p.sums[i] = p.sums[i-1] + d
	}
	for i := mid - 1; i >= 0; i-- {
		d, err := p.over(p.edges[i], p.edges[i+1])
		if err != nil {
			return err
		}
		p.sums[i] = p.sums[i+1] - d
	}
	return nil
}

func (p *primitive) at(x float64) (float64, error) {
	i := sort.SearchFloat64s(p.edges, x)
	i = min(max(i-1, 0), len(p.edges)-1)
	d, err := p.over(p.edges[i], x)
	return p.sums[i] + d, err
}
