package spectral

import (
	"context"

	"epslim/perturb/cell/quadrature/fast"
)

// Window is the range of one coordinate that carries its fitted weight.
type Window struct {
	Lower, Upper float64
	// Centre and Scale are the median and half the distance of the quartiles.
	Centre, Scale float64
	// Heavy says that the weight falls off like a power.
	Heavy bool
}

// Windows returns, for every coordinate on a line, half-line or reflecting
// interval, where the weight that [New] would choose is above a fraction of
// its total mass; the zero Window for the others. Grids use it.
func Windows(ctx context.Context, p *fast.Problem, fraction float64) ([]Window, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	f := newFitter(p)
	if err := f.fit(ctx); err != nil {
		return nil, err
	}
	m := &maker{p: p, f: f, steps: ladder[min(len(p.Domains), len(ladder)-1)]}
	if err := m.adjust(ctx); err != nil {
		return nil, err
	}
	if err := m.widen(ctx); err != nil {
		return nil, err
	}
	out := make([]Window, len(f.owner))
	for _, i := range f.open {
		law := f.laws[i]
		w := &out[i]
		w.Heavy = law.heavy
		w.Centre, w.Scale = law.quartiles()
		acc := 0.0
		for k, x := range law.w {
			if acc += x; acc >= fraction {
				w.Lower = law.y[k]
				break
			}
		}
		acc = 0
		for k := len(law.w) - 1; k >= 0; k-- {
			if acc += law.w[k]; acc >= fraction {
				w.Upper = law.y[k]
				break
			}
		}
		if d := f.domain(i); d.Kind == fast.Reflecting {
			w.Lower, w.Upper = d.A, d.B
		} else if d.Kind == fast.HalfLine {
			w.Lower = 0
		}
	}
	return out, nil
}
