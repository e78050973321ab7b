package density

import (
	"context"

	"epslim/solver/grid"
	"epslim/solver/multigrid"
	"epslim/solver/volume"
)

// linear solves (M + shift V) x = b or its transpose by elimination or by
// multigrid.
type linear struct {
	direct  *volume.Elimination
	solver  *multigrid.Solver
	adjoint bool
}

func newLinear(ctx context.Context, m *volume.Operator, c volume.Coefficients, shift float64, adjoint bool, s Settings) (*linear, error) {
	if s.useDirect(m) {
		e, err := volume.Eliminate(m, shift, nil)
		return &linear{direct: e, adjoint: adjoint}, err
	}
	sv, err := multigrid.New(ctx, m, c, shift, adjoint, s.multigrid())
	return &linear{solver: sv, adjoint: adjoint}, err
}

func (l *linear) solve(ctx context.Context, x, b []float64) (multigrid.Outcome, float64) {
	switch {
	case l.solver != nil:
		st := l.solver.Solve(ctx, x, b)
		return st.Outcome, st.Residual
	case ctx.Err() != nil:
		return multigrid.Cancelled, 0
	case l.adjoint:
		l.direct.SolveAdjoint(x, b)
	default:
		l.direct.Solve(x, b)
	}
	return multigrid.Converged, 0
}

// volumes returns the cell volumes as a padded vector.
func volumes(m *volume.Operator) []float64 {
	l := &m.Layout
	v := l.Vector()
	for r := 0; r < l.Rows; r++ {
		for i := 0; i < l.Nx; i++ {
			v[l.Row(r)+i] = m.RowVolume(r) * m.Width(i)
		}
	}
	return v
}

func unpack(g *grid.Grid, m *volume.Operator, v []float64) []float64 {
	out := make([]float64, g.Cells())
	m.Layout.Unpack(out, v)
	return out
}
