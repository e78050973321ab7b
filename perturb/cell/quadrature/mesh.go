package quadrature

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// nodesPerPanel with maxVariation fixes the resolution: exp(x) over a range of
// maxVariation is resolved to rounding by that many Chebyshev nodes.
const (
	nodesPerPanel = 24
	maxVariation  = 7.0
	maxPanels     = 60000
	maxBarrier    = 600.0
)

// fidelity is what grows from level to level.
type fidelity struct {
	cutoff float64 // how far below its maximum the log density is followed
	extent float64 // how far power-law ends are followed, in log distance
	split  int     // extra bisections of every panel
	strict float64 // relative resolution asked for
}

var fidelities = [...]fidelity{
	{150, 45, 0, 1e-12},
	{200, 60, 1, 1e-13},
	{400, 120, 1, 1e-14},
	{600, 250, 2, 1e-14},
}

// interval is the piece of the domain that carries the stationary law.
type interval struct {
	lo, hi   float64
	periodic bool
	// period is the length of the circle where the interval is a circle cut at
	// zeros of the noise, so that y may leave the declared range.
	period float64
}

// builder makes meshes.
type builder struct {
	cheb        *chebyshev
	drift, diff *fast.Coefficient
	used        []*fast.Coefficient
	iv          interval
	fid         fidelity
	eval        *evaluator
	noiseless   bool
	ends        [2]endKind
	dropped     [2]bool // panels were dropped: the density fell below the cutoff
	scratch     [4][]float64
	// left is the share of a coefficient on panels that cannot be bisected, and
	// history that on the worst panel, pass by pass.
	left    map[*fast.Coefficient]float64
	history map[*fast.Coefficient][]float64
}

type endKind uint8

const (
	endRegular  endKind = iota // smooth coefficients and noise at the end itself
	endSingular                // finite end where noise vanishes or a coefficient is singular
	endInfinite
)

func newBuilder(drift, diff *fast.Coefficient, iv interval, fid fidelity, used []*fast.Coefficient) *builder {
	b := &builder{left: map[*fast.Coefficient]float64{}, history: map[*fast.Coefficient][]float64{}, cheb: newChebyshev(nodesPerPanel), drift: drift, diff: diff, iv: iv, fid: fid, used: used,
		eval: &evaluator{expansions: map[expansionKey]*expansion{}, lo: iv.lo, hi: iv.hi}}
	for i := range b.scratch {
		b.scratch[i] = make([]float64, nodesPerPanel)
	}
	return b
}

// fill evaluates the coefficients on a panel and integrates 2 f/a.
func (b *builder) fill(p *panel) error {
	p.place(b.cheb)
	n := b.cheb.n
	p.f, p.a, p.h, p.cumW = make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	if err := b.eval.values(b.drift, p, p.f); err != nil {
		return err
	}
	if err := b.eval.values(b.diff, p, p.a); err != nil {
		return err
	}
	if b.noiseless {
		return nil
	}
	for j := range p.h {
		if p.a[j] < 0 {
			return &fast.Undefined{Coefficient: "the noise (its square " + b.diff.Label() + " is negative)", At: []float64{p.y[j]}, Value: p.a[j]}
		}
		if p.a[j] == 0 {
			return &fast.Undefined{Coefficient: "2*drift/noise^2", At: []float64{p.y[j]}, Value: math.Inf(1)}
		}
		p.h[j] = 2 * p.f[j] / p.a[j] * p.jac[j]
		if math.IsInf(p.h[j], 0) {
			return &fast.Undefined{Coefficient: "2*drift/noise^2", At: []float64{p.y[j]}, Value: p.h[j]}
		}
	}
	b.cheb.apply(b.cheb.cum, p.h, p.cumW)
	p.dW = 0
	for j, w := range b.cheb.weights {
		p.dW += w * p.h[j]
	}
	p.low, p.high = math.Inf(1), math.Inf(-1)
	for j := range p.h {
		l := p.cumW[j] + math.Log(2/p.a[j]) + b.logJac(p, j)
		p.low, p.high = math.Min(p.low, l), math.Max(p.high, l)
	}
	return nil
}

// logJac is log|dy/dt|.
func (b *builder) logJac(p *panel, j int) float64 {
	if p.kind == panelLog {
		return math.Log(p.d[j])
	}
	return 0
}

func (b *builder) linear(t0, t1 float64) *panel { return &panel{kind: panelLinear, t0: t0, t1: t1} }

// initial lays out the first panels.
func (b *builder) initial() ([]*panel, error) {
	lo, hi := b.iv.lo, b.iv.hi
	if b.iv.periodic {
		return b.fillAll(b.linearPanels(lo, hi, 8))
	}
	for side, e := range []float64{lo, hi} {
		switch {
		case math.IsInf(e, 0):
			b.ends[side] = endInfinite
		case b.regular(side):
			b.ends[side] = endRegular
		default:
			b.ends[side] = endSingular
		}
	}
	// The middle [c0, c1] is linear; what is outside goes by log distance from
	// a base point.
	var c0, c1, baseL, baseR float64
	switch {
	case !math.IsInf(lo, 0) && !math.IsInf(hi, 0):
		w := hi - lo
		c0, c1, baseL, baseR = lo+w/4, hi-w/4, lo, hi
		if b.ends[0] == endRegular {
			c0 = lo
		}
		if b.ends[1] == endRegular {
			c1 = hi
		}
	case math.IsInf(lo, 0) && math.IsInf(hi, 0):
		c0, c1 = -1, 1
	case math.IsInf(hi, 0):
		s := math.Max(1, math.Abs(lo))
		baseL, baseR, c0, c1 = lo, lo, lo+s, lo+s
		if b.ends[0] == endRegular {
			c0 = lo
		}
	default:
		s := math.Max(1, math.Abs(hi))
		baseL, baseR, c0, c1 = hi, hi, hi-s, hi-s
		if b.ends[1] == endRegular {
			c1 = hi
		}
	}
	var panels []*panel
	if c1 > c0 {
		var err error
		if panels, err = b.fillAll(b.linearPanels(c0, c1, 8)); err != nil {
			return nil, err
		}
	}
	left, err := b.extend(panels, -1, baseL, c0)
	if err != nil {
		return nil, err
	}
	right, err := b.extend(panels, 1, baseR, c1)
	if err != nil {
		return nil, err
	}
	out := make([]*panel, 0, len(left)+len(panels)+len(right))
	for i := len(left) - 1; i >= 0; i-- {
		out = append(out, left[i])
	}
	return append(append(out, panels...), right...), nil
}

// linearPanels cuts at zero and at known breaks.
func (b *builder) linearPanels(a, c float64, n int) []*panel {
	cuts := []float64{a}
	for i := 1; i < n; i++ {
		cuts = append(cuts, a+(c-a)*float64(i)/float64(n))
	}
	cuts = append(cuts, c)
	for _, k := range append([]*fast.Coefficient{b.drift, b.diff}, b.used...) {
		for _, x := range k.Breaks {
			for i := 1; i < len(cuts); i++ {
				if cuts[i-1] < x && x < cuts[i] {
					cuts = append(cuts[:i], append([]float64{x}, cuts[i:]...)...)
					break
				}
			}
		}
	}
	var out []*panel
	for i := 1; i < len(cuts); i++ {
		out = append(out, b.linear(cuts[i-1], cuts[i]))
	}
	return out
}

func (b *builder) fillAll(ps []*panel) ([]*panel, error) {
	for _, p := range ps {
		if err := b.fill(p); err != nil {
			return nil, err
		}
	}
	return ps, nil
}

// regular reports whether the coefficients are smooth up to a finite end and
// noise is present there.
func (b *builder) regular(side int) bool {
	end, sign := b.iv.lo, 1.0
	if side == 1 {
		end, sign = b.iv.hi, -1
	}
	width := b.iv.hi - b.iv.lo
	if math.IsInf(width, 0) {
		width = math.Max(1, math.Abs(end))
	}
	for k := 0; k < 5; k++ {
		w := width / 8 * math.Pow(16, -float64(k))
		p := b.linear(end, end+sign*w)
		if sign < 0 {
			p = b.linear(end-w, end)
		}
		if b.fill(p) != nil {
			return false
		}
		ta, la := b.cheb.tail(p.a)
		th, lh := b.cheb.tail(p.h)
		if ta <= 1e-12*la && th <= 1e-12*lh+1e-14 {
			return math.Abs(b.cheb.at(p.a, -sign)) > 1e-9*la
		}
	}
	return false
}

// extend adds log panels from c towards an end until the density is
// negligible or its power law is established. Panels come in order of
// distance.
func (b *builder) extend(middle []*panel, dir int, base, c float64) ([]*panel, error) {
	kind := b.ends[(dir+1)/2]
	if kind == endRegular {
		return nil, nil
	}
	top := math.Inf(-1)
	w := 0.0
	for _, p := range middle {
		top = math.Max(top, w+p.high)
		w += p.dW
	}
	if dir < 0 {
		w = 0 // from here on w is the value at the near end of the new panels
	}
	t, step, outward := math.Log(math.Abs(c-base)), 2.0, 1.0
	if kind == endSingular {
		outward = -1
	}
	start := t
	var out []*panel
	var far float64
	for math.Abs(t-start) < b.fid.extent {
		p := b.logPanel(base, dir, kind, t, t+outward*step)
		if err := b.fill(p); err != nil {
			if step > 0.1 {
				step /= 2
				continue
			}
			return nil, err
		}
		leaves, err := b.followed(p)
		if err != nil {
			return nil, err
		}
		if leaves == nil {
			return out, b.oscillates(out, dir, top-far)
		}
		for i := range leaves { // in growing y
			q := leaves[i]
			if dir < 0 {
				q = leaves[len(leaves)-1-i]
				w -= q.dW
			}
			top = math.Max(top, w+q.high)
			far = b.endLog(q, dir) + w
			if dir > 0 {
				w += q.dW
			}
			out = append(out, q)
		}
		t += outward * step
		if far < top-b.fid.cutoff-50 {
			break
		}
	}
	// The highest place is the outermost one and the density still rises
	// faster than any power: there is nothing to normalise.
	if last := out[len(out)-1]; math.Abs(t-start) >= b.fid.extent && far >= top-1 && last.high-last.low > 100 {
		return nil, &fast.NotErgodic{Reason: "the speed density grows without bound towards " + ends([2]float64{b.iv.lo, b.iv.hi}[(dir+1)/2]) + " (attracting end: the drift carries the process away)",
			Mend: "a drift that confines"}
	}
	return out, nil
}

// followed bisects a new outer panel until the increments of W are known, which
// an oscillating drift makes necessary; nil when that takes too many panels.
func (b *builder) followed(p *panel) ([]*panel, error) {
	leaves, todo := []*panel{}, []*panel{p}
	for len(todo) > 0 {
		q := todo[len(todo)-1]
		todo = todo[:len(todo)-1]
		if tail, largest := b.cheb.tail(q.h); tail <= 1e-7+1e-7*largest || b.atomic(q) {
			leaves = append(leaves, q)
			continue
		}
		if len(leaves)+len(todo) > 4000 {
			return nil, nil
		}
		l, r := q.bisect()
		if _, err := b.fillAll([]*panel{l, r}); err != nil {
			return nil, err
		}
		todo = append(todo, r, l) // left first
	}
	return leaves, nil
}

// oscillates is the outcome for a drift that oscillates towards an unbounded
// end faster than can be followed; drop is how far the log density has fallen.
func (b *builder) oscillates(out []*panel, dir int, drop float64) error {
	place := b.iv.hi
	if dir < 0 {
		place = b.iv.lo
	}
	reach := 0.0
	for _, p := range out {
		reach = math.Max(reach, math.Max(math.Abs(p.left()), math.Abs(p.right())))
	}
	// A law must fall faster than 1/|y|.
	if drop < math.Log(math.Max(reach, 2)) {
		return &fast.NotErgodic{Reason: fmt.Sprintf("the speed density does not fall off towards %s: followed to |y| = %.3g it is only a factor exp(-%.3g) below its maximum and oscillates", ends(place), reach, math.Max(drop, 0)),
			Mend: "a drift that confines, or a circle in the place of the line"}
	}
	return &fast.Unsupported{Method: "quadrature", Reason: fmt.Sprintf("the drift oscillates towards %s and could be followed to |y| = %.3g only", ends(place), reach)}
}

// endLog is log m + log|dy/dt| at the outer end relative to W at the left end.
func (b *builder) endLog(p *panel, dir int) float64 {
	j := 0
	if dir > 0 {
		j = len(p.y) - 1
	}
	return p.cumW[j] + math.Log(2/p.a[j]) + b.logJac(p, j)
}

func (b *builder) logPanel(base float64, dir int, kind endKind, near, far float64) *panel {
	p := &panel{kind: panelLog, base: base, sign: float64(dir), t0: near, t1: far}
	if kind == endSingular {
		p.sign, p.finiteEnd = -float64(dir), dir
	} else if base == b.iv.lo || base == b.iv.hi {
		p.finiteEnd = -dir
	}
	// Nodes must run with growing y. (The places themselves may round to the
	// same number.)
	if (p.t1 > p.t0) != (p.sign > 0) {
		p.t0, p.t1 = p.t1, p.t0
	}
	return p
}
