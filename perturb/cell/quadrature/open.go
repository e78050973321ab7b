package quadrature

import "math"

// open is the shape of an interval, half-line or line: no current.
type open struct{ split int }

// newOpen sets the density exp(W) 2/a and finds the median panel.
func newOpen(l *level) {
	w := levels(l.ps)
	logRho := make([]float64, l.nodes())
	l.each(func(i int, p *panel, lo, hi int) {
		for j := lo; j < hi; j++ {
			logRho[j] = w[i] + p.cumW[j-lo] + math.Log(2/p.a[j-lo])
		}
	})
	l.normalize(logRho)
	n, acc, split := l.cheb.n, 0.0, 0
	for i := range l.ps {
		for _, m := range l.wq[i*n : (i+1)*n] {
			acc += m
		}
		split = i
		if acc >= 0.5 {
			break
		}
	}
	l.shape = &open{split: split}
}

// slope implements shape: Phi' = -+ 2/(a rho) times the integral of r rho from
// the nearer side.
func (o *open) slope(l *level, r []float64) ([]float64, int) {
	n := l.cheb.n
	psi := make([]float64, len(r))
	g, cum := make([]float64, n), make([]float64, n)
	acc := l.tail(r, 0).value
	for i := 0; i <= o.split; i++ {
		p := l.ps[i]
		total := o.panel(l, r, i, g)
		l.cheb.apply(l.cheb.cum, g, cum)
		for j := range cum {
			psi[i*n+j] = -quotient(2*(acc+cum[j]), p.a[j]*l.rho[i*n+j])
		}
		acc += total
	}
	acc = l.tail(r, 1).value
	for i := len(l.ps) - 1; i > o.split; i-- {
		p := l.ps[i]
		total := o.panel(l, r, i, g)
		// The integral from a node to the right end is the mirrored one.
		for j := 0; j < n/2; j++ {
			g[j], g[n-1-j] = g[n-1-j], g[j]
		}
		l.cheb.apply(l.cheb.cum, g, cum)
		for j := range cum {
			psi[i*n+j] = quotient(2*(acc+cum[n-1-j]), p.a[j]*l.rho[i*n+j])
		}
		acc += total
	}
	return psi, o.split
}

func (o *open) panel(l *level, r []float64, i int, g []float64) float64 {
	n, p := l.cheb.n, l.ps[i]
	var total float64
	for j := range g {
		g[j] = r[i*n+j] * l.rho[i*n+j] * p.jac[j]
		total += l.cheb.weights[j] * g[j]
	}
	return total
}

// quotient is x/y, and 0 where both have underflowed.
func quotient(x, y float64) float64 {
	if y == 0 {
		return 0
	}
	return x / y
}
