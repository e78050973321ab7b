package quadrature

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// primitive integrates psi outwards from the left end of panel start.
func (l *level) primitive(psi []float64, start int) []float64 {
	n := l.cheb.n
	v := make([]float64, len(psi))
	work := make([]float64, n)
	acc := 0.0
	for i := start; i < len(l.ps); i++ {
		total := l.weighted(psi[i*n:(i+1)*n], l.ps[i], work)
		l.cheb.apply(l.cheb.cum, work, v[i*n:(i+1)*n])
		for j := i * n; j < (i+1)*n; j++ {
			v[j] += acc
		}
		acc += total
	}
	acc = 0
	for i := start - 1; i >= 0; i-- {
		total := l.weighted(psi[i*n:(i+1)*n], l.ps[i], work)
		acc -= total
		l.cheb.apply(l.cheb.cum, work, v[i*n:(i+1)*n])
		for j := i * n; j < (i+1)*n; j++ {
			v[j] += acc
		}
	}
	return v
}

// weighted fills work with psi*jac and returns its integral over the panel.
func (l *level) weighted(psi []float64, p *panel, work []float64) float64 {
	var total float64
	for j, x := range psi {
		work[j] = x * p.jac[j]
		total += l.cheb.weights[j] * work[j]
	}
	return total
}

// locate finds the panel of a place.
func (l *level) locate(y float64) (i int, x float64) {
	lo, hi := 0, len(l.ps)
	for hi-lo > 1 {
		mid := (lo + hi) / 2
		if y < l.ps[mid].left() {
			hi = mid
		} else {
			lo = mid
		}
	}
	return lo, l.ps[lo].coordinate(y)
}

// inside maps a place of the declared domain to the mesh.
func (l *level) inside(y float64) float64 {
	if l.mirror {
		y = -y
	}
	if l.iv.period > 0 {
		first := l.ps[0].left()
		y = first + math.Mod(y-first, l.iv.period)
		if y < first {
			y += l.iv.period
		}
	}
	return y
}

// At implements fast.Level. Beyond the mesh the function goes on linearly in
// the coordinate of the last panel.
func (l *level) At(u fast.Vector, y [][]float64) ([]float64, error) {
	v := u.(*vec).v
	n := l.cheb.n
	out := make([]float64, len(y[0]))
	for k, x := range y[0] {
		i, t := l.locate(l.inside(x))
		s := v[i*n : (i+1)*n]
		if t >= -1 && t <= 1 {
			out[k] = l.cheb.at(s, t)
			continue
		}
		e := math.Copysign(1, t)
		end, in := l.cheb.at(s, e), l.cheb.at(s, e*0.99)
		out[k] = end + (end-in)/0.01*(math.Abs(t)-1)
	}
	return out, nil
}

// Density implements fast.Level.
func (l *level) Density(y [][]float64) ([]float64, error) {
	n := l.cheb.n
	logs := make([]float64, n)
	out := make([]float64, len(y[0]))
	for k, x := range y[0] {
		z := l.inside(x)
		if !l.iv.periodic && (z < l.iv.lo || z > l.iv.hi) {
			continue
		}
		i, t := l.locate(z)
		for j := range logs {
			logs[j] = math.Log(l.rho[i*n+j])
		}
		if t >= -1 && t <= 1 {
			out[k] = math.Exp(l.cheb.at(logs, t))
			continue
		}
		e := math.Copysign(1, t)
		end, in := l.cheb.at(logs, e), l.cheb.at(logs, e*0.99)
		out[k] = math.Exp(end + (end-in)/0.01*(math.Abs(t)-1))
		if math.IsNaN(out[k]) {
			out[k] = 0
		}
	}
	return out, nil
}

// String implements fast.Level.
func (l *level) String() string {
	return fmt.Sprintf("%d panels of %d nodes", len(l.ps), l.cheb.n)
}

// Unknowns implements fast.Level.
func (l *level) Unknowns() int { return l.nodes() }

// resolves reports whether the mesh is fine enough for a coefficient.
func (l *level) resolves(c *fast.Coefficient) bool {
	src := c
	if l.mirror {
		src = mirrored(c)
	}
	for i, p := range l.ps {
		if p.fixed {
			continue
		}
		var x coefficientStat
		if err := l.b.stat(src, p, &x); err != nil {
			return true // the error is reported when the coefficient is used
		}
		share := 0.0
		for _, w := range l.wq[i*l.cheb.n : (i+1)*l.cheb.n] {
			share += w
		}
		if !x.resolved && share > 1e-16 {
			return false
		}
	}
	return true
}
