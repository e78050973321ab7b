package spectral

import (
	"context"
	"errors"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// Settings are the options of [New]; the zero value works.
type Settings struct {
	// Tolerance is relative to the size of what is averaged; default 1e-10.
	Tolerance float64
	// Levels bounds how often the basis is raised; default all that there are.
	Levels int
}

// sizes of the bases by level: polynomials, Fourier modes, degree on a sphere.
type sizes struct{ polynomial, modes, degree int }

var ladder = [...][]sizes{
	1: {{24, 16, 8}, {40, 28, 12}, {60, 48, 18}, {90, 96, 26}, {130, 200, 34}, {180, 400, 40}},
	2: {{16, 6, 6}, {26, 10, 9}, {40, 16, 14}, {58, 24, 18}, {80, 36, 24}, {110, 50, 30}},
	3: {{10, 4, 4}, {16, 6, 6}, {22, 9, 9}, {30, 12, 12}, {38, 16, 15}},
	4: {{6, 3, 3}, {9, 4, 4}, {12, 6, 6}, {15, 7, 7}},
}

// New prepares a problem of any number of fast variables that a tensor basis
// can hold. It returns [*fast.NotErgodic] or [*fast.Unsupported] where there
// is no answer by this route.
func New(ctx context.Context, p *fast.Problem, s Settings) (*fast.Engine, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	if s.Tolerance == 0 {
		s.Tolerance = 1e-10
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
	levels := len(m.steps)
	if s.Levels >= 2 {
		levels = min(levels, s.Levels)
	}
	var notes []string
	for _, i := range f.open {
		notes = append(notes, f.domain(i).Name(0)+": polynomials for the "+f.laws[i].about)
	}
	return fast.NewEngine(fast.Route{Method: "spectral", Notes: notes, Levels: levels, Tolerance: s.Tolerance,
		Make: func(ctx context.Context, k int, _ []*fast.Coefficient) (fast.Level, error) {
			return m.level(ctx, m.steps[k])
		}}), nil
}

type maker struct {
	p     *fast.Problem
	f     *fitter
	steps []sizes
}

func (m *maker) level(ctx context.Context, z sizes) (fast.Level, error) {
	spaces, err := m.spaces(z)
	if err != nil {
		return nil, err
	}
	l, err := newLevel(ctx, m.p, spaces)
	if err != nil {
		return nil, err
	}
	l.trusted = m.f.exact
	return l, nil
}

func (m *maker) spaces(z sizes) ([]*space, error) {
	var out []*space
	c := 0
	for _, d := range m.p.Domains {
		switch {
		case d.Kind == fast.Sphere:
			out = append(out, sphere(d, c, z.degree))
		case d.IsPeriodic():
			out = append(out, fourier(d, c, z.modes))
		default:
			basis := polynomial
			if m.f.laws[c].heavy {
				basis = arctangent
			}
			s, err := basis(d, c, m.f.laws[c], z.polynomial)
			if err != nil {
				return nil, err
			}
			s.wall = m.f.wall[c]
			out = append(out, s)
		}
		c += d.Coordinates()
	}
	return out, nil
}

// adjust compares mean, deviation and kurtosis of every coordinate on a line
// with those of its weight, at low resolution; it moves and stretches weights
// that miss and replaces those whose tails are too light, for which the
// expansion would not converge.
func (m *maker) adjust(ctx context.Context) error {
	if m.f.exact || len(m.p.Domains) == 1 {
		return nil
	}
	for round := 0; round < 4; round++ {
		made, err := m.level(ctx, m.steps[0])
		if err != nil {
			return err
		}
		l := made.(*level)
		changed := false
		for _, i := range m.f.open {
			if m.f.domain(i).Kind != fast.Line {
				continue
			}
			mean, sd, tail := l.moments(i)
			wm, ws := m.f.laws[i].moments()
			if !(sd > 0) || math.IsInf(sd, 0) {
				continue
			}
			// A weight that is somewhat too wide is safe; one with tails lighter
			// than those of the law is not, so shrinking is the last resort.
			if math.Abs(mean-wm) > 0.3*ws || sd > 1.3*ws || sd < ws/4 {
				scale := sd / ws
				if scale > 0.25 {
					scale = math.Max(1, scale)
				}
				m.f.laws[i] = m.f.laws[i].affine(mean-scale*wm, scale)
				changed = true
			}
			if wt := m.f.laws[i].kurtosis(); tail > wt+0.4 && tail > 3 {
				if err := m.f.hyperbolic(ctx, i, mean, sd, tail); err != nil {
					return err
				}
				changed = true
			}
		}
		if !changed {
			break
		}
	}
	return nil
}

// widen stretches the weights of the lines until the density is resolved at the
// second level, if that can be had.
func (m *maker) widen(ctx context.Context) error {
	if m.f.exact || len(m.p.Domains) == 1 {
		return nil
	}
	start := map[int]*measure{}
	for _, i := range m.f.open {
		if m.f.domain(i).Kind == fast.Line {
			start[i] = m.f.laws[i]
		}
	}
	if len(start) == 0 {
		return nil
	}
	best, at := math.Inf(1), 1.0
	stretch := func(s float64) {
		for i, law := range start {
			mean, _ := law.moments()
			m.f.laws[i] = law
			if s != 1 {
				m.f.laws[i] = law.affine(mean-s*mean, s)
			}
		}
	}
	for _, s := range []float64{1, 1.25, 1.6, 2, 2.6, 3.4} {
		stretch(s)
		made, err := m.level(ctx, m.steps[1])
		if errors.Is(err, fast.ErrBudget) {
			break
		}
		if err != nil {
			return err
		}
		if share := made.(*level).unresolved(); share < best {
			best, at = share, s
		}
		if best < maxUnresolved {
			break
		}
	}
	stretch(at)
	return nil
}

// moments returns mean, deviation and kurtosis of a coordinate under the
// computed law.
func (l *level) moments(i int) (mean, sd, kurtosis float64) {
	avg := func(p float64) float64 {
		c := fast.SumOf("y", fast.Term{Constant: 1, Factors: []fast.Factor{{Coordinate: i, Kind: fast.Power, P: p}}})
		v, err := l.Coefficient(&c)
		if err != nil {
			return math.NaN()
		}
		m, err := l.Mean(v)
		if err != nil {
			return math.NaN()
		}
		return m.Value
	}
	mean = avg(1)
	m2, m3, m4 := avg(2), avg(3), avg(4)
	v := m2 - mean*mean
	fourth := m4 - 4*mean*m3 + 6*mean*mean*m2 - 3*mean*mean*mean*mean
	return mean, math.Sqrt(v), fourth / (v * v)
}
