package grid

import (
	"context"
	"fmt"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral"
)

// Settings are the options of [New]; the zero value works.
type Settings struct {
	// Tolerance is relative to the size of what is averaged; default 1e-6.
	Tolerance float64
}

// cells on the coarser grid of every level.
var (
	cells1 = []int{50, 100, 200, 400, 800, 1600, 3200}
	cells2 = []int{16, 24, 36, 54, 80, 110}
)

// New prepares a problem of one or two fast variables (no sphere).
func New(ctx context.Context, p *fast.Problem, s Settings) (*fast.Engine, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	if p.Coordinates() > 2 {
		return nil, &fast.Unsupported{Method: "grid", Reason: fmt.Sprintf("%d fast coordinates", p.Coordinates())}
	}
	for i, d := range p.Domains {
		if d.Kind == fast.Reflecting && p.Coordinates() == 2 && !p.Diffusion[0][1].IsZero() {
			return nil, &fast.Unsupported{Method: "grid", Reason: "noise shared between the reflected variable " + p.Domains[i].Name(0) + " and another one"}
		}
	}
	if s.Tolerance == 0 {
		s.Tolerance = 1e-6
	}
	windows, err := spectral.Windows(ctx, p, 1e-18)
	if err != nil {
		return nil, err
	}
	cells := cells1
	if p.Coordinates() == 2 {
		cells = cells2
	}
	return fast.NewEngine(fast.Route{Method: "grid", Levels: len(cells), Tolerance: s.Tolerance,
		Make: func(ctx context.Context, k int, _ []*fast.Coefficient) (fast.Level, error) {
			l := &level{}
			for half, m := range []**mesh{&l.coarse, &l.fine} {
				var axes []*axis
				for i, d := range p.Domains {
					axes = append(axes, newAxis(d, windows[i], cells[k]<<half))
				}
				made, err := newMesh(ctx, p, axes)
				if err != nil {
					return nil, err
				}
				*m = made
			}
			return l, nil
		}}), nil
}
