package density

import (
	"context"
	"errors"

	"epslim/solver/grid"
	"epslim/solver/multigrid"
	"epslim/solver/volume"
)

// Exit holds a quantity of the backward equation in every cell as the starting
// point.
type Exit struct {
	Grid     *grid.Grid
	Values   []float64
	Outcome  multigrid.Outcome
	Residual float64
}

// errNoExit is returned for a domain without absorbing sides.
var errNoExit = errors.New("exit: no side of the grid absorbs, so the process never leaves")

// MeanExitTime returns the mean time until the process started in a cell
// reaches an absorbing side, the solution of L T = -1 with T = 0 there
// (Gardiner, Handbook of Stochastic Methods, sections 5.2.7 and 5.4).
func MeanExitTime(ctx context.Context, g *grid.Grid, c volume.Coefficients, s Settings) (*Exit, error) {
	m, err := exitOperator(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	return backward(ctx, m, c, volumes(m), s)
}

// SplittingProbability returns the probability that the process started in a
// cell leaves through one of the chosen absorbing sides and not through
// another: through[d][0] is the lower, through[d][1] the upper side of axis d.
// It solves L h = 0 with h = 1 on the chosen sides and 0 on the other absorbing
// ones (Gardiner, section 5.2.8).
func SplittingProbability(ctx context.Context, g *grid.Grid, c volume.Coefficients, through [grid.MaxDim][2]bool, s Settings) (*Exit, error) {
	m, err := exitOperator(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	b := m.Layout.Vector()
	for d := range through {
		for side, chosen := range through[d] {
			if !chosen {
				continue
			}
			kill := m.KillAt[d][side]
			if kill == nil {
				return nil, errors.New("exit: a side chosen for the splitting probability does not absorb")
			}
			for i, v := range kill {
				b[i] += v
			}
		}
	}
	return backward(ctx, m, c, b, s)
}

func exitOperator(ctx context.Context, g *grid.Grid, c volume.Coefficients, s Settings) (*volume.Operator, error) {
	if !g.HasAbsorbing() {
		return nil, errNoExit
	}
	m, err := assemble(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	if m.Report.ZeroLinks > 0 {
		if classes := volume.FindClasses(m); len(classes.Recurrent) > 0 {
			return nil, &trappedError{classes}
		}
	}
	return m, nil
}

// trappedError reports cells from which no absorbing side can be reached.
type trappedError struct{ classes *volume.Classes }

func (e *trappedError) Error() string {
	return "exit: some cells never reach an absorbing side; " + (&volume.ReducibleError{Classes: e.classes}).Error()
}

func backward(ctx context.Context, m *volume.Operator, c volume.Coefficients, b []float64, s Settings) (*Exit, error) {
	sv, err := newLinear(ctx, m, c, 0, true, s)
	if err != nil {
		return nil, err
	}
	x := m.Layout.Vector()
	o, res := sv.solve(ctx, x, b)
	return &Exit{m.Grid, unpack(m.Grid, m, x), o, res}, nil
}

// Average returns the mean of the values over a starting density of mass one.
func (e *Exit) Average(start []float64) float64 {
	var t float64
	for k, v := range e.Grid.Volumes() {
		t += v * start[k] * e.Values[k]
	}
	return t
}
