package fokkerplanck

import (
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// gaussian is the stationary density of a linear drift f = B x + b with
// constant A on the whole space: covariance C from B C + C B^T + A = 0, mean
// from B m + b = 0 (Risken 1989, section 6.5).
func (d *Diffusion) gaussian() (algebra.Expr, bool) {
	n := len(d.Slow)
	r := d.Ring
	names := d.names()
	for _, v := range d.Slow {
		if v.Kind != ito.Line {
			return algebra.Expr{}, false
		}
	}
	b := make([][]algebra.Expr, n)
	shift := make([]algebra.Expr, n)
	for i := range b {
		for j := range d.A[i] {
			if dependsOnAny(d.A[i][j], names) {
				return algebra.Expr{}, false
			}
		}
		shift[i] = d.Drift[i]
		b[i] = make([]algebra.Expr, n)
		for j, v := range names {
			b[i][j] = d.Drift[i].Diff(v)
			if dependsOnAny(b[i][j], names) {
				return algebra.Expr{}, false
			}
			x, _ := r.Symbol(v)
			shift[i] = shift[i].Sub(b[i][j].Mul(x))
		}
	}
	c, ok := lyapunov(r, b, d.A)
	if !ok {
		return algebra.Expr{}, false
	}
	for i := range shift {
		shift[i] = shift[i].Neg()
	}
	mean, err := algebra.SolveLinear(b, shift)
	if err != nil || len(mean.Free) > 0 {
		return algebra.Expr{}, false
	}
	// exp(-1/2 (x-m)^T C^-1 (x-m))
	y := make([]algebra.Expr, n)
	for i, v := range names {
		x, _ := r.Symbol(v)
		y[i] = x.Sub(mean.X[i])
	}
	z, err := algebra.SolveLinear(c, y)
	if err != nil || len(z.Free) > 0 {
		return algebra.Expr{}, false
	}
	q := r.Int(0)
	for i := range y {
		q = q.Add(y[i].Mul(z.X[i]))
	}
	p, err := r.Call("exp", q.Mul(r.Frac(-1, 2)))
	if err != nil || !d.Residual(p).IsZero() {
		return algebra.Expr{}, false
	}
	return p, true
}

func dependsOnAny(e algebra.Expr, names []string) bool {
	for _, n := range names {
		if e.DependsOn(n) {
			return true
		}
	}
	return false
}

// lyapunov solves B C + C B^T + A = 0 for symmetric C.
func lyapunov(r *algebra.Ring, b, a [][]algebra.Expr) ([][]algebra.Expr, bool) {
	n := len(b)
	at := map[[2]int]int{}
	var pairs [][2]int
	for i := 0; i < n; i++ {
		for j := i; j < n; j++ {
			at[[2]int{i, j}], at[[2]int{j, i}] = len(pairs), len(pairs)
			pairs = append(pairs, [2]int{i, j})
		}
	}
	m := make([][]algebra.Expr, len(pairs))
	rhs := make([]algebra.Expr, len(pairs))
	for row, p := range pairs {
		m[row] = make([]algebra.Expr, len(pairs))
		for k := range m[row] {
			m[row][k] = r.Int(0)
		}
		i, j := p[0], p[1]
		for k := 0; k < n; k++ {
			c := at[[2]int{k, j}]
			m[row][c] = m[row][c].Add(b[i][k])
			c = at[[2]int{i, k}]
			m[row][c] = m[row][c].Add(b[j][k])
		}
		rhs[row] = a[i][j].Neg()
	}
	sol, err := algebra.SolveLinear(m, rhs)
	if err != nil || len(sol.Free) > 0 {
		return nil, false
	}
	c := make([][]algebra.Expr, n)
	for i := range c {
		c[i] = make([]algebra.Expr, n)
		for j := range c[i] {
			c[i][j] = sol.X[at[[2]int{i, j}]]
		}
	}
	return c, true
}
