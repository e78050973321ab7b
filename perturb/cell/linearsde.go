package cell

import (
	"fmt"

	"epslim/generator/algebra"
)

// checkLinear examines a group of fast variables by its linear part: on lines
// the drift must be affine in the group's own variables with a Hurwitz
// matrix; circles need no confinement.
func (p *Process) checkLinear(x *Existence, n Numbers, g []int) (algebra.Expr, string, error) {
	var lines []int
	for _, i := range g {
		switch p.Fast[i].Kind {
		case Line, HalfLine:
			lines = append(lines, i)
		}
	}
	if len(lines) == 0 {
		return algebra.Expr{}, "diffusion on the torus", nil
	}
	b := make([][]algebra.Expr, len(lines))
	for r, i := range lines {
		b[r] = make([]algebra.Expr, len(lines))
		for c, j := range lines {
			b[r][c] = p.Drift(i).Diff(p.Fast[j].Name)
			for _, k := range g {
				if b[r][c].DependsOn(p.Fast[k].Name) {
					x.Unchecked = append(x.Unchecked, fmt.Sprintf("confinement of %s: its drift is not linear", p.Fast[i].Name))
					return algebra.Expr{}, "nonlinear diffusion in several variables", nil
				}
			}
		}
	}
	if err := p.hurwitz(x, n, lines, b); err != nil {
		return algebra.Expr{}, "", err
	}
	if len(lines) == len(g) {
		return algebra.Expr{}, "Ornstein-Uhlenbeck process", nil
	}
	return algebra.Expr{}, "diffusion on a cylinder", nil
}

// hurwitz requires that all eigenvalues of b have negative real parts, by
// the Routh-Hurwitz determinants of its characteristic polynomial (Gantmacher,
// The Theory of Matrices, vol. 2, ch. XV; from memory).
func (p *Process) hurwitz(x *Existence, n Numbers, vars []int, b [][]algebra.Expr) error {
	c := characteristic(p.Ring, b) // lambda^k + c[1] lambda^(k-1) + ...
	names := ""
	for k, i := range vars {
		if k > 0 {
			names += ", "
		}
		names += p.Fast[i].Name
	}
	for k := 1; k < len(c); k++ {
		d := hurwitzDeterminant(p.Ring, c, k)
		q := d
		if k == len(c)-1 {
			q = c[k] // the last determinant is c_k times the one before
		}
		shown := clear(q)
		err := x.require(n, shown, ">", "stability of the linear drift of "+names, func() *NotErgodic {
			return &NotErgodic{
				Text:   fmt.Sprintf("the linear drift of (%s) is not stable: the Routh-Hurwitz quantity %s is not positive, so there is no stationary law that attracts the fast process", names, shown),
				Mend:   "damping for every mode of the fast process, or a periodic domain for the variable that drifts freely",
				Detail: map[string]algebra.Expr{"Routh-Hurwitz": shown},
			}
		})
		if err != nil {
			return err
		}
	}
	return nil
}

// characteristic is det(lambda - b) by the Faddeev-Le Verrier recursion, the
// coefficient of the highest power first.
func characteristic(r *algebra.Ring, b [][]algebra.Expr) []algebra.Expr {
	n := len(b)
	c := []algebra.Expr{r.Int(1)}
	m := make([][]algebra.Expr, n)
	for i := range m {
		m[i] = make([]algebra.Expr, n)
		for j := range m[i] {
			m[i][j] = r.Int(0)
		}
	}
	for k := 1; k <= n; k++ {
		next := make([][]algebra.Expr, n)
		for i := range next {
			next[i] = make([]algebra.Expr, n)
			for j := range next[i] {
				s := r.Int(0)
				for l := 0; l < n; l++ {
					if !b[i][l].IsZero() && !m[l][j].IsZero() {
						s = s.Add(b[i][l].Mul(m[l][j]))
					}
				}
				if i == j {
					s = s.Add(c[k-1])
				}
				next[i][j] = s
			}
		}
		m = next
		trace := r.Int(0)
		for i := 0; i < n; i++ {
			for l := 0; l < n; l++ {
				trace = trace.Add(b[i][l].Mul(m[l][i]))
			}
		}
		c = append(c, trace.Mul(r.Frac(-1, int64(k))))
	}
	return c
}

func hurwitzDeterminant(r *algebra.Ring, c []algebra.Expr, k int) algebra.Expr {
	h := make([][]algebra.Expr, k)
	for i := range h {
		h[i] = make([]algebra.Expr, k)
		for j := range h[i] {
			at := 2*(i+1) - (j + 1)
			if at >= 0 && at < len(c) {
				h[i][j] = c[at]
			} else {
				h[i][j] = r.Int(0)
			}
		}
	}
	return algebra.Determinant(h)
}

// gaussian is the invariant density of a linear process with constant noise,
// from the Lyapunov equation; ok is false for other processes and for
// singular covariances.
func (p *Process) gaussian() (algebra.Expr, bool) {
	r := p.Ring
	n := len(p.Fast)
	if n > 3 {
		return algebra.Expr{}, false
	}
	names := p.Names()
	free := func(e algebra.Expr) bool {
		for _, v := range names {
			if e.DependsOn(v) {
				return false
			}
		}
		return true
	}
	b := make([][]algebra.Expr, n)
	shift := make([]algebra.Expr, n)
	for i, v := range p.Fast {
		if v.Kind != Line {
			return algebra.Expr{}, false
		}
		b[i] = make([]algebra.Expr, n)
		shift[i] = p.Drift(i)
		for j, w := range names {
			b[i][j] = p.Drift(i).Diff(w)
			if !free(b[i][j]) || !free(p.Diffusion(i, j)) {
				return algebra.Expr{}, false
			}
			y, _ := r.Symbol(w)
			shift[i] = shift[i].Sub(b[i][j].Mul(y))
		}
		shift[i] = shift[i].Neg()
	}
	pairs, m, rhs := lyapunovSystem(r, b, p)
	sol, err := algebra.SolveLinear(m, rhs)
	if err != nil || len(sol.Free) > 0 {
		return algebra.Expr{}, false
	}
	c := make([][]algebra.Expr, n)
	for i := range c {
		c[i] = make([]algebra.Expr, n)
		for j := range c[i] {
			c[i][j] = sol.X[pairs[[2]int{min(i, j), max(i, j)}]]
		}
	}
	mean, err := algebra.SolveLinear(b, shift)
	if err != nil || len(mean.Free) > 0 {
		return algebra.Expr{}, false
	}
	y := make([]algebra.Expr, n)
	for i, w := range names {
		s, _ := r.Symbol(w)
		y[i] = s.Sub(mean.X[i])
	}
	z, err := algebra.SolveLinear(c, y)
	if err != nil || len(z.Free) > 0 {
		return algebra.Expr{}, false
	}
	q := r.Int(0)
	for i := range y {
		q = q.Add(y[i].Mul(z.X[i]))
	}
	d, err := r.Call("exp", q.Mul(r.Frac(-1, 2)))
	if err != nil || !p.IsInvariant(d) {
		return algebra.Expr{}, false
	}
	return d, true
}

// lyapunovSystem writes B C + C B^T + a = 0 as a linear system for the upper
// triangle of C.
func lyapunovSystem(r *algebra.Ring, b [][]algebra.Expr, p *Process) (map[[2]int]int, [][]algebra.Expr, []algebra.Expr) {
	n := len(b)
	at := map[[2]int]int{}
	var pairs [][2]int
	for i := 0; i < n; i++ {
		for j := i; j < n; j++ {
			at[[2]int{i, j}] = len(pairs)
			pairs = append(pairs, [2]int{i, j})
		}
	}
	m := make([][]algebra.Expr, len(pairs))
	rhs := make([]algebra.Expr, len(pairs))
	for row, q := range pairs {
		m[row] = make([]algebra.Expr, len(pairs))
		for k := range m[row] {
			m[row][k] = r.Int(0)
		}
		for k := 0; k < n; k++ {
			c := at[[2]int{min(k, q[1]), max(k, q[1])}]
			m[row][c] = m[row][c].Add(b[q[0]][k])
			c = at[[2]int{min(k, q[0]), max(k, q[0])}]
			m[row][c] = m[row][c].Add(b[q[1]][k])
		}
		rhs[row] = p.Diffusion(q[0], q[1]).Neg()
	}
	return at, m, rhs
}

// checkRank tests hypoellipticity: the Lie algebra generated by the noise
// fields and their brackets with the drift must span all directions
// (Hormander 1967). It is evaluated for several variables only, at a generic
// point; a failure is reported as unchecked unless the process is linear,
// where the Kalman rank is decisive.
func (p *Process) checkRank(x *Existence, n Numbers) error {
	nf := len(p.Fast)
	if nf < 2 {
		return nil
	}
	for _, v := range p.Fast {
		if v.Kind == SpherePart {
			return nil
		}
	}
	full := true
	for i := range p.Fast {
		full = full && !p.Diffusion(i, i).IsZero()
	}
	if full {
		return nil
	}
	// Follow which variables the noise reaches through the drift.
	reached := map[int]bool{}
	for i := range p.Fast {
		if !p.Diffusion(i, i).IsZero() {
			reached[i] = true
		}
	}
	for again := true; again; {
		again = false
		for i := range p.Fast {
			if reached[i] {
				continue
			}
			for j := range reached {
				if p.Drift(i).DependsOn(p.Fast[j].Name) {
					reached[i], again = true, true
					break
				}
			}
		}
	}
	if len(reached) == 0 {
		return nil // no noise at all: the other checks decide
	}
	for i, v := range p.Fast {
		if reached[i] {
			continue
		}
		if (v.Kind == Circle || v.Kind == Periodic) && !p.driven(i) {
			continue // a rotor
		}
		if p.Fast[i].Kind == Line {
			// A damped variable that no noise reaches settles at a point:
			// still one stationary law, provided it is stable.
			continue
		}
		x.Unchecked = append(x.Unchecked, fmt.Sprintf("no noise reaches %s", v.Name))
	}
	return nil
}
