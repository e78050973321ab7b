package quadrature

import (
	"context"
	"errors"
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// Settings are the options of [New]; the zero value works.
type Settings struct {
	// Tolerance is relative to the size of what is averaged; default 1e-12.
	Tolerance float64
}

// New prepares a problem of one fast variable. It returns [*fast.NotErgodic],
// [*fast.Undefined] or [*fast.Unsupported] where there is no answer by this
// route.
func New(ctx context.Context, p *fast.Problem, s Settings) (*fast.Engine, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	if p.Coordinates() != 1 {
		return nil, &fast.Unsupported{Method: "quadrature", Reason: fmt.Sprintf("there are %d fast coordinates, not one", p.Coordinates())}
	}
	if s.Tolerance == 0 {
		s.Tolerance = 1e-12
	}
	m := &maker{domain: p.Domains[0], drift: &p.Drift[0], diff: &p.Diffusion[0][0]}
	notes, err := m.prepare(ctx)
	if err != nil {
		return nil, err
	}
	return fast.NewEngine(fast.Route{
		Method: "quadrature", Notes: notes, Levels: len(fidelities), Tolerance: s.Tolerance,
		Make:     m.level,
		Resolves: func(l fast.Level, c *fast.Coefficient) bool { return l.(*level).resolves(c) },
	}), nil
}

// maker builds the levels of one problem.
type maker struct {
	domain      fast.Domain
	drift, diff *fast.Coefficient
	iv          interval
	noiseless   bool
	mirror      bool
}

// prepare settles existence and orientation on the coarsest mesh.
func (m *maker) prepare(ctx context.Context) ([]string, error) {
	zeros, none := findNoiseZeros(m.domain, m.drift, m.diff)
	if none {
		return m.prepareNoiseless()
	}
	var reports [2]endReport
	test := func(iv interval) error {
		b := newBuilder(m.drift, m.diff, iv, fidelities[0], nil)
		ps, err := b.mesh(ctx)
		if err != nil {
			return err
		}
		reports = [2]endReport{b.classify(ps, 0), b.classify(ps, 1)}
		return exists(m.domain, iv, reports)
	}
	iv, notes, err := carrier(m.domain, zeros, test)
	if err != nil {
		return nil, err
	}
	m.iv = iv
	if iv.periodic {
		return append(notes, m.orient(ctx)...), ctx.Err()
	}
	if err := test(iv); err != nil {
		return nil, err
	}
	for side, x := range []float64{iv.lo, iv.hi} {
		notes = append(notes, fmt.Sprintf("%s = %s: %v", m.domain.Name(0), ends(x), reports[side]))
	}
	return notes, nil
}

// orient makes the integral of 2 f/a over the period non-negative.
func (m *maker) orient(ctx context.Context) []string {
	b := newBuilder(m.drift, m.diff, m.iv, fidelities[0], nil)
	ps, err := b.mesh(ctx)
	if err != nil {
		return nil // reported when the level is made
	}
	turn := 0.0
	for _, p := range ps {
		turn += p.dW
	}
	if turn < 0 {
		m.mirror = true
		m.drift, m.diff = mirrored(m.drift), mirrored(m.diff)
		drift := *m.drift
		*m.drift = drift.Times(-1)
		m.iv.lo, m.iv.hi = -m.iv.hi, -m.iv.lo
	}
	if math.Abs(turn) < 1e-11 {
		return []string{"circle without stationary current"}
	}
	return []string{fmt.Sprintf("circle with a stationary current: the potential rises by %.6g a turn", -turn)}
}

func (m *maker) prepareNoiseless() ([]string, error) {
	name := m.domain.Name(0)
	if !m.domain.IsPeriodic() {
		return nil, &fast.Unsupported{Method: "quadrature", Reason: "the fast variable " + name + " has no noise"}
	}
	y := scanPoints(m.domain, 4000)
	f := make([]float64, len(y))
	m.drift.Values(f, [][]float64{y})
	smallest, largest := math.Inf(1), 0.0
	var laws []string
	for i := range y {
		smallest, largest = math.Min(smallest, math.Abs(f[i])), math.Max(largest, math.Abs(f[i]))
		if i > 0 && f[i-1]*f[i] <= 0 {
			kind := "an attractor"
			if f[i-1] < f[i] {
				kind = "a repeller"
			}
			laws = append(laws, fmt.Sprintf("a point mass near %s = %.4g (%s)", name, y[i], kind))
		}
	}
	if largest == 0 {
		return nil, &fast.NotErgodic{Reason: name + " has neither noise nor drift", Mend: "add noise or rotation"}
	}
	if len(laws) > 0 || smallest < 1e-9*largest {
		return nil, &fast.NotErgodic{Reason: "without noise the drift of " + name + " vanishes somewhere, so it stops there", Components: laws, Mend: "add noise"}
	}
	lo, hi := m.domain.Ends()
	m.iv = interval{lo: lo, hi: hi, periodic: true, period: hi - lo}
	m.noiseless = true
	return []string{"rotation without noise: the law is 1/|f|"}, nil
}

// mesh lays out and refines.
func (b *builder) mesh(ctx context.Context) ([]*panel, error) {
	ps, err := b.initial()
	if err != nil {
		return nil, err
	}
	if ps, err = b.refine(ctx, ps); err != nil {
		return nil, err
	}
	if len(ps) == 0 {
		return nil, errors.New("quadrature: empty mesh")
	}
	return ps, nil
}

func (m *maker) level(ctx context.Context, k int, used []*fast.Coefficient) (fast.Level, error) {
	if m.mirror {
		out := make([]*fast.Coefficient, len(used))
		for i, c := range used {
			out[i] = mirrored(c)
		}
		used = out
	}
	b := newBuilder(m.drift, m.diff, m.iv, fidelities[k], used)
	b.noiseless = m.noiseless
	ps, err := b.mesh(ctx)
	if err != nil {
		return nil, err
	}
	l := &level{cheb: b.cheb, b: b, ps: ps, iv: m.iv, mirror: m.mirror}
	switch {
	case m.noiseless:
		newRotation(l)
	case m.iv.periodic:
		l.ps = rotate(b, ps)
		if err := newCircle(l); err != nil {
			return nil, err
		}
	default:
		if depth := barrier(ps); depth > maxBarrier {
			return nil, &fast.NotErgodic{Reason: fmt.Sprintf("a barrier of height %.4g (in units of the noise) cannot be crossed within floating-point range", depth),
				Mend: "treat the wells as separate"}
		}
		newOpen(l)
	}
	return l, nil
}

// barrier is the greatest depth of the log density below the lower of the
// highest places on its two sides.
func barrier(ps []*panel) float64 {
	w := levels(ps)
	right := make([]float64, len(ps)+1)
	right[len(ps)] = math.Inf(-1)
	for i := len(ps) - 1; i >= 0; i-- {
		right[i] = math.Max(right[i+1], w[i]+ps[i].high)
	}
	left, depth := math.Inf(-1), 0.0
	for i, p := range ps {
		left = math.Max(left, w[i]+p.high)
		depth = math.Max(depth, math.Min(left, right[i])-w[i]-p.low)
	}
	return depth
}
