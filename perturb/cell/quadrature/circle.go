package quadrature

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// circle is the shape of a periodic interval. The panels have been rotated so
// that W is never below its value 0 at the first one, and W grows by turn >= 0
// over the period.
type circle struct {
	w     []float64 // W at the panel ends, len(panels)+1
	turn  float64
	split int // panels before it are integrated from the left, the others from the right
}

// rotate puts the panel at which the unrolled W is lowest first and shifts the
// panels before it by a period.
func rotate(b *builder, ps []*panel) []*panel {
	at, acc, low := 0, 0.0, 0.0
	for i, p := range ps {
		if acc <= low {
			at, low = i, acc
		}
		acc += p.dW
	}
	out := append([]*panel{}, ps[at:]...)
	length := b.iv.hi - b.iv.lo
	for _, p := range ps[:at] {
		q := *p
		q.t0, q.t1 = p.t0+length, p.t1+length
		q.y = make([]float64, len(p.y))
		for j := range q.y {
			q.y[j] = p.y[j] + length
		}
		out = append(out, &q)
	}
	return out
}

func newCircle(l *level) error {
	n := l.cheb.n
	c := &circle{w: make([]float64, len(l.ps)+1)}
	best := 0.0
	for i, p := range l.ps {
		c.w[i+1] = c.w[i] + p.dW
		if c.w[i+1] > best {
			best, c.split = c.w[i+1], i+1
		}
	}
	c.turn = math.Max(0, c.w[len(l.ps)])
	if drop := largestDrop(c.w); drop > maxBarrier {
		return &fast.NotErgodic{Reason: fmt.Sprintf("a barrier of height %.4g (in units of the noise) cannot be crossed within floating-point range", drop),
			Mend: "treat the wells as separate"}
	}
	// log of I(y) = int_y^{y+l} exp(W(y)-W(z)) dz, from the last panel back.
	share := -math.Expm1(-c.turn)
	logI := make([]float64, l.nodes())
	first := 0.0 // I(0)
	g, cum := make([]float64, n), make([]float64, n)
	for i, p := range l.ps {
		for j := range g {
			first += l.cheb.weights[j] * math.Exp(-c.w[i]-p.cumW[j]) * p.jac[j]
		}
	}
	next := math.Log(first)
	for i := len(l.ps) - 1; i >= 0; i-- {
		p := l.ps[i]
		var total float64
		for j := range g {
			k := n - 1 - j
			g[j] = math.Exp(-p.cumW[k]) * p.jac[k]
			total += l.cheb.weights[j] * g[j]
		}
		l.cheb.apply(l.cheb.cum, g, cum)
		for j := range cum {
			inner := share * cum[n-1-j] * math.Exp(p.cumW[j])
			logI[i*n+j] = logAdd(math.Log(inner), next+p.cumW[j]-p.dW)
		}
		next = logAdd(math.Log(share*total), next-p.dW)
	}
	l.each(func(_ int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			logI[j] -= math.Log(p.a[j-lo])
		}
	})
	l.normalize(logI)
	l.shape = c
	return nil
}

func largestDrop(w []float64) float64 {
	top, drop := math.Inf(-1), 0.0
	for _, x := range w {
		top = math.Max(top, x)
		drop = math.Max(drop, top-x)
	}
	return drop
}

// logAdd is log(exp(a)+exp(b)).
func logAdd(a, b float64) float64 {
	if a < b {
		a, b = b, a
	}
	if math.IsInf(b, -1) {
		return a
	}
	return a + math.Log1p(math.Exp(b-a))
}

// slope implements shape. Left of the top of W, psi = -(P - C exp(-W)) with
// P = exp(-W(y)) int_0^y (2 r/a) exp(W); right of it psi = Q + C exp(T-W) with
// Q the integral from y to the end.
func (c *circle) slope(l *level, r []float64) ([]float64, int) {
	n := l.cheb.n
	psi, hom := make([]float64, len(r)), make([]float64, len(r))
	g, cum := make([]float64, n), make([]float64, n)
	load := func(i int) (total, abs float64) {
		p := l.ps[i]
		for j := range g {
			g[j] = 2 * r[i*n+j] / p.a[j] * math.Exp(p.cumW[j]) * p.jac[j]
			total += l.cheb.weights[j] * g[j]
			abs += l.cheb.weights[j] * math.Abs(g[j])
		}
		return total, abs
	}
	var acc, size float64
	for i := 0; i < c.split; i++ {
		p := l.ps[i]
		total, abs := load(i)
		l.cheb.apply(l.cheb.cum, g, cum)
		for j := range cum {
			psi[i*n+j] = -math.Exp(-p.cumW[j]) * (acc + cum[j])
			hom[i*n+j] = math.Exp(-c.w[i] - p.cumW[j])
		}
		acc = math.Exp(-p.dW) * (acc + total)
		size = math.Exp(-p.dW) * (size + abs)
	}
	left, sizeLeft := acc, size
	acc, size = 0, 0
	for i := len(l.ps) - 1; i >= c.split; i-- {
		p := l.ps[i]
		total, abs := load(i)
		for j := 0; j < n/2; j++ {
			g[j], g[n-1-j] = g[n-1-j], g[j]
		}
		l.cheb.apply(l.cheb.cum, g, cum)
		start := math.Exp(p.dW) * acc
		for j := range cum {
			psi[i*n+j] = math.Exp(-p.cumW[j]) * (start + cum[n-1-j])
			hom[i*n+j] = math.Exp(c.turn - c.w[i] - p.cumW[j])
		}
		acc = start + total
		size = math.Exp(p.dW)*size + abs
	}
	constant := c.constant(l, psi, hom, left+acc, sizeLeft+size)
	for j := range psi {
		psi[j] += constant * hom[j]
	}
	return psi, 0
}

// constant fixes the homogeneous part, either by continuity at the top of W or
// by the condition that Phi is periodic, whichever is better conditioned: the
// first loses its digits without tilt, the second under a strong one.
func (c *circle) constant(l *level, psi, hom []float64, jump, size float64) float64 {
	const unit = 1e-16
	var s, abs, h float64
	for i, p := range l.ps {
		for j, w := range l.cheb.weights {
			k := i*l.cheb.n + j
			s += w * p.jac[j] * psi[k]
			abs += w * p.jac[j] * math.Abs(psi[k])
			h += w * p.jac[j] * hom[k]
		}
	}
	top := math.Exp(c.w[c.split] - c.turn)
	share := -math.Expm1(-c.turn)
	errJump := unit * top * size / share
	if share > 0 && errJump < unit*abs/h {
		return -top * jump / share
	}
	return -s / h
}

// rotation is the shape of a circle without noise: the law is 1/|f|.
type rotation struct{}

func newRotation(l *level) {
	logRho := make([]float64, l.nodes())
	l.each(func(_ int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			logRho[j] = -math.Log(math.Abs(p.f[j-lo]))
		}
	})
	l.normalize(logRho)
	l.shape = rotation{}
}

func (rotation) slope(l *level, r []float64) ([]float64, int) {
	psi := make([]float64, len(r))
	l.each(func(_ int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			psi[j] = -r[j] / p.f[j-lo]
		}
	})
	return psi, 0
}
