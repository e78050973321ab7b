package quadrature

import (
	"context"
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// refine bisects until everything is resolved, then drops negligible ends.
func (b *builder) refine(ctx context.Context, ps []*panel) ([]*panel, error) {
	for pass := 0; ; pass++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if len(ps) > maxPanels {
			return nil, &fast.Unsupported{Method: "quadrature", Reason: fmt.Sprintf("the density needs more than %d panels", maxPanels)}
		}
		ps = b.drop(ps, 40)
		split, err := b.marks(ps)
		if err != nil {
			return nil, err
		}
		out := make([]*panel, 0, 2*len(ps))
		done := true
		for i, p := range ps {
			if !split[i] {
				out = append(out, p)
				continue
			}
			done = false
			l, r := p.bisect()
			for _, q := range []*panel{l, r} {
				if err := b.fill(q); err != nil {
					return nil, err
				}
			}
			out = append(out, l, r)
		}
		ps = out
		if done {
			break
		}
	}
	ps = b.drop(ps, 0)
	for k := 0; k < b.fid.split; k++ {
		var out []*panel
		for _, p := range ps {
			if p.fixed {
				out = append(out, p)
				continue
			}
			l, r := p.bisect()
			if _, err := b.fillAll([]*panel{l, r}); err != nil {
				return nil, err
			}
			out = append(out, l, r)
		}
		ps = out
	}
	return ps, nil
}

// levels returns W at the left end of every panel relative to the highest
// point of the log density, accumulated outwards from there so that it is
// accurate where the density is.
func levels(ps []*panel) []float64 {
	w := make([]float64, len(ps))
	best, at, acc := math.Inf(-1), 0, 0.0
	for i, p := range ps {
		if acc+p.high > best {
			best, at = acc+p.high, i
		}
		acc += p.dW
	}
	w[at] = -ps[at].high
	for i := at + 1; i < len(ps); i++ {
		w[i] = w[i-1] + ps[i-1].dW
	}
	for i := at - 1; i >= 0; i-- {
		w[i] = w[i+1] - ps[i].dW
	}
	return w
}

// drop removes outer panels that lie wholly below the cutoff.
func (b *builder) drop(ps []*panel, margin float64) []*panel {
	if b.iv.periodic {
		return ps
	}
	w := levels(ps)
	i, j := 0, len(ps)
	for i < j && b.ends[0] != endRegular && w[i]+ps[i].high < -b.fid.cutoff-margin {
		i++
	}
	for j > i && b.ends[1] != endRegular && w[j-1]+ps[j-1].high < -b.fid.cutoff-margin {
		j--
	}
	b.dropped[0] = b.dropped[0] || i > 0
	b.dropped[1] = b.dropped[1] || j < len(ps)
	return ps[i:j]
}

// marks says which panels must be bisected.
func (b *builder) marks(ps []*panel) ([]bool, error) {
	split := make([]bool, len(ps))
	w := levels(ps)
	first, last := 0, len(ps)
	if !b.iv.periodic {
		for first < last && w[first]+ps[first].high < -b.fid.cutoff {
			first++
		}
		for last > first && w[last-1]+ps[last-1].high < -b.fid.cutoff {
			last--
		}
	}
	for i := first; i < last; i++ {
		p := ps[i]
		if p.fixed || p.settled {
			continue
		}
		if p.settled = b.resolved(p); p.settled {
			continue
		}
		if b.atomic(p) {
			if err := b.singular(p); err != nil {
				return nil, err
			}
			p.fixed = true
			continue
		}
		split[i] = true
	}
	for _, x := range split {
		if x {
			return split, nil // coefficients are looked at where the density is known
		}
	}
	for k, c := range b.used {
		if err := b.markCoefficient(k, c, ps, w, split, first, last); err != nil {
			return nil, err
		}
	}
	return split, nil
}

// atomic reports whether a panel is as short as floating point allows.
func (b *builder) atomic(p *panel) bool {
	scale := math.Max(math.Abs(p.t0), math.Abs(p.t1))
	return math.Abs(p.t1-p.t0) < 64*2.3e-16*scale || math.Abs(p.t1-p.t0) < 1e-290
}

// singular reports a pole that remains in a panel that cannot be bisected.
func (b *builder) singular(p *panel) error {
	if math.Abs(p.dW) > 1e-3 || p.high-p.low > 1e-3 {
		return &fast.Undefined{Coefficient: "2*drift/noise^2 (a singularity inside the domain)", At: []float64{p.left()}, Value: math.Inf(1)}
	}
	return nil
}

// grain is the spacing of floating-point numbers relative to the length of the
// panel: what varies over the panel cannot be known better.
func (p *panel) grain() float64 {
	if p.finiteEnd != 0 {
		return 0
	}
	n := len(p.y)
	return 1e-15 * math.Max(math.Abs(p.y[0]), math.Abs(p.y[n-1])) / math.Abs(p.y[n-1]-p.y[0])
}

func (b *builder) resolved(p *panel) bool {
	if b.noiseless {
		v := b.scratch[0]
		for j, f := range p.f {
			v[j] = p.jac[j] / f
		}
		tail, largest := b.cheb.tail(v)
		return tail <= (1e-14+p.grain())*largest
	}
	th, lh := b.cheb.tail(p.h)
	grain := p.grain()
	if th > 1e-14+(4e-15+grain)*lh {
		return false
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, w := range p.cumW {
		lo, hi = math.Min(lo, w), math.Max(hi, w)
	}
	if p.high-p.low > maxVariation || hi-lo > maxVariation {
		return false
	}
	u, v := b.scratch[0], b.scratch[1]
	for j, w := range p.cumW {
		u[j] = math.Exp(w-hi) / p.a[j] * p.jac[j]
		v[j] = math.Exp(lo-w) * p.jac[j]
	}
	for _, x := range [][]float64{u, v} {
		tail, largest := b.cheb.tail(x)
		if tail > (b.fid.strict+grain)*largest+1e-300 {
			return false
		}
	}
	return true
}

// markCoefficient marks panels on which a coefficient is not resolved and the
// law has mass enough for that to matter. A coefficient whose share on the
// worst panel does not shrink as the panel is bisected has a singularity that
// is not integrable.
func (b *builder) markCoefficient(k int, c *fast.Coefficient, ps []*panel, w []float64, split []bool, first, last int) error {
	var total float64
	for i := first; i < last; i++ {
		p := ps[i]
		if len(p.stats) <= k {
			p.stats = append(p.stats, make([]coefficientStat, len(b.used)+1-len(p.stats))...)
		}
		if !p.stats[k].known {
			if err := b.stat(c, p, &p.stats[k]); err != nil {
				return err
			}
		}
		total += p.stats[k].size * b.weight(p, w[i])
	}
	worst, at := 0.0, 0
	for i := first; i < last; i++ {
		p := ps[i]
		x := &p.stats[k]
		if x.resolved || p.fixed || x.tail*b.weight(p, w[i]) <= 1e-16*total {
			continue
		}
		if s := x.size * b.weight(p, w[i]); s > worst {
			worst, at = s, i
		}
		if b.atomic(p) {
			b.left[c] = math.Max(b.left[c], x.size*b.weight(p, w[i])/total)
			continue
		}
		split[i] = true
	}
	h := append(b.history[c], worst)
	b.history[c] = h
	if n := len(h); worst > 0 && n > 50 && math.Abs(ps[at].t1-ps[at].t0) < 1e-9*math.Max(1e-290, math.Abs(ps[last-1].right()-ps[first].left())) {
		// The share goes like width^(1+p).
		if p := math.Log2(h[n-26]/worst)/25 - 1; p < -0.999 {
			return &fast.Divergent{Quantity: c.Label(), Where: fmt.Sprintf("y = %.6g", ps[at].left()), Exponent: p}
		}
	}
	return nil
}

// weight is the factor of the sizes of a panel.
func (b *builder) weight(p *panel, w float64) float64 {
	if b.noiseless || b.iv.periodic {
		return 1
	}
	return math.Exp(w + p.high)
}

func (b *builder) stat(c *fast.Coefficient, p *panel, x *coefficientStat) error {
	v := b.scratch[2]
	if err := b.eval.values(c, p, v); err != nil {
		return err
	}
	var mass float64
	for j := range v {
		m := b.cheb.weights[j] * math.Abs(p.jac[j])
		if !b.noiseless && !b.iv.periodic {
			m *= math.Exp(p.cumW[j] + math.Log(2/p.a[j]) - p.high)
		}
		mass += m
		x.size += m * math.Abs(v[j])
	}
	tail, largest := b.cheb.tail(v)
	x.tail = tail * mass
	x.resolved = tail <= (b.fid.strict+p.grain())*largest
	x.known = true
	return nil
}
