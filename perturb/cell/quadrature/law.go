package quadrature

import (
	"context"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// Law is a one-dimensional stationary law as a discrete measure fine enough to
// integrate polynomials of high degree against it.
type Law struct {
	// Y are the nodes in growing order, Weight their masses (total 1).
	Y, Weight []float64
	// PowerTail says that an unbounded end carries a power law, so that only
	// finitely many moments exist.
	PowerTail bool
	// Touches says for the lower and the upper end that noise and density do
	// not vanish there: the process reflects.
	Touches [2]bool
	// Density evaluates the density.
	Density func(y float64) float64
}

// NewLaw computes the stationary law of a problem of one variable that is not
// periodic. The errors are those of [New].
func NewLaw(ctx context.Context, p *fast.Problem) (*Law, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	m := &maker{domain: p.Domains[0], drift: &p.Drift[0], diff: &p.Diffusion[0][0]}
	if _, err := m.prepare(ctx); err != nil {
		return nil, err
	}
	if m.iv.periodic {
		return nil, &fast.Unsupported{Method: "quadrature", Reason: "a law on a circle has no orthogonal polynomials"}
	}
	made, err := m.level(ctx, 2, nil)
	if err != nil {
		return nil, err
	}
	l := made.(*level)
	if l.powerTail(0) || l.powerTail(1) {
		// Few moments exist, so there is no use for the far tails.
		if made, err = m.level(ctx, 0, nil); err != nil {
			return nil, err
		}
		l = made.(*level)
	}
	law := &Law{}
	for i, p := range l.ps {
		law.Y = append(law.Y, p.y...)
		law.Weight = append(law.Weight, l.wq[i*l.cheb.n:(i+1)*l.cheb.n]...)
	}
	total := 0.0
	for _, w := range law.Weight {
		total += w
	}
	for i := range law.Weight {
		law.Weight[i] /= total
	}
	for side, k := range l.b.ends {
		law.PowerTail = law.PowerTail || l.powerTail(side)
		law.Touches[side] = k == endRegular
	}
	law.Density = func(y float64) float64 {
		d, err := l.Density([][]float64{{y}})
		if err != nil {
			return 0
		}
		return d[0]
	}
	return law, nil
}

// powerTail compares the decay rate in the logarithm of y at an end with that
// three units further in: the same for a power law, much less for an
// exponential.
func (l *level) powerTail(side int) bool {
	n := len(l.ps)
	at := func(i int) *panel {
		if side == 1 {
			return l.ps[n-1-i]
		}
		return l.ps[i]
	}
	rate := func(p *panel) float64 {
		last := len(p.y) - 1
		u := func(j int) float64 { return p.cumW[j] + math.Log(2/p.a[j]) + math.Log(p.d[j]) }
		return math.Abs((u(last) - u(0)) / (math.Log(p.d[last]) - math.Log(p.d[0])))
	}
	outer := at(0)
	if l.b.ends[side] != endInfinite {
		return false
	}
	if outer.kind != panelLog {
		return false
	}
	for i := 1; i < n; i++ {
		p := at(i)
		if p.kind != panelLog {
			return rate(outer) < 3*rate(at(i-1))
		}
		if math.Log(outer.d[0])-math.Log(p.d[0]) > 3 {
			return rate(outer) < 3*rate(p)
		}
	}
	return false
}
