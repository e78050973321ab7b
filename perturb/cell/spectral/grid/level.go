package grid

import (
	"context"
	"fmt"
	"math"
	"sort"

	"epslim/perturb/cell/quadrature/fast"
	"epslim/perturb/cell/spectral/internal/band"
)

// mesh is the problem on one grid. Cells are numbered with the last axis
// fastest.
type mesh struct {
	axes   []*axis
	n      int
	at     [][]float64 // coordinates of all cells, for block evaluation
	lu     band.Factors
	rho    []float64 // masses of the cells
	one    []float64 // solution for a constant right-hand side
	pinned int
}

func newMesh(ctx context.Context, p *fast.Problem, axes []*axis) (*mesh, error) {
	m := &mesh{axes: axes, n: 1}
	for _, a := range axes {
		m.n *= a.n
	}
	m.at = make([][]float64, len(axes))
	for i := range m.at {
		m.at[i] = make([]float64, m.n)
	}
	index := make([]int, len(axes))
	for c := 0; c < m.n; c++ {
		m.split(c, index)
		for i, a := range axes {
			m.at[i][c] = a.y[index[i]]
		}
	}
	// L0 with one diagonal element changed is regular where the process is
	// ergodic.
	a, err := m.matrix(p.Generator(), mirror)
	if err != nil {
		return nil, err
	}
	m.pinned = m.n/2 + axes[len(axes)-1].n/2
	if m.pinned >= m.n {
		m.pinned = m.n / 2
	}
	shift := 0.0
	for _, e := range a[m.pinned] {
		shift = math.Max(shift, math.Abs(e.V))
	}
	for k, e := range a[m.pinned] {
		if e.Col == m.pinned {
			a[m.pinned][k].V -= shift
		}
	}
	natural := make([]int, m.n)
	for i := range natural {
		natural[i] = i
	}
	if m.lu, err = band.Factorize(ctx, a, natural); err != nil {
		if err == band.ErrSingular {
			return nil, &fast.NotErgodic{Reason: fmt.Sprintf("the generator on a grid of %d cells has more than one null function", m.n)}
		}
		return nil, err
	}
	rhs := make([]float64, m.n)
	rhs[m.pinned] = 1
	m.rho = m.lu.SolveTransposed(rhs)
	var total float64
	for _, v := range m.rho {
		total += v
	}
	for i := range m.rho {
		m.rho[i] /= total
		rhs[i] = 1
	}
	m.one = m.lu.Solve(rhs)
	return m, nil
}

func (m *mesh) split(c int, index []int) {
	for k := len(m.axes) - 1; k >= 0; k-- {
		index[k] = c % m.axes[k].n
		c /= m.axes[k].n
	}
}

func (m *mesh) values(c *fast.Coefficient) ([]float64, error) {
	v := make([]float64, m.n)
	c.Values(v, m.at)
	for k, x := range v {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			at := make([]float64, len(m.at))
			for i := range at {
				at[i] = m.at[i][k]
			}
			return nil, &fast.Undefined{Coefficient: c.Label(), At: at, Value: x}
		}
	}
	return v, nil
}

// matrix discretizes an operator.
func (m *mesh) matrix(op fast.Operator, g ghost) (band.Matrix, error) {
	rows := make([]map[int]float64, m.n)
	for i := range rows {
		rows[i] = map[int]float64{}
	}
	index := make([]int, len(m.axes))
	for t := range op {
		c, err := m.values(&op[t].Coefficient)
		if err != nil {
			return nil, err
		}
		for i := 0; i < m.n; i++ {
			m.split(i, index)
			m.spread(op[t].Order, index, 0, 0, c[i], g, rows[i])
		}
	}
	out := make(band.Matrix, m.n)
	for i, row := range rows {
		for c, v := range row {
			out[i] = append(out[i], band.Entry{Col: c, V: v})
		}
		sort.Slice(out[i], func(a, b int) bool { return out[i][a].Col < out[i][b].Col })
	}
	return out, nil
}

func (m *mesh) spread(order, index []int, k, col int, w float64, g ghost, row map[int]float64) {
	if k == len(m.axes) {
		row[col] += w
		return
	}
	o := 0
	if order != nil {
		o = order[k]
	}
	for _, p := range m.axes[k].stencil(index[k], o, g) {
		m.spread(order, index, k+1, col*m.axes[k].n+p.j, w*p.w, g, row)
	}
}

func (m *mesh) apply(op fast.Operator, u []float64) ([]float64, error) {
	out := make([]float64, m.n)
	index := make([]int, len(m.axes))
	for t := range op {
		c, err := m.values(&op[t].Coefficient)
		if err != nil {
			return nil, err
		}
		for i := range out {
			m.split(i, index)
			out[i] += c[i] * m.derivative(op[t].Order, index, 0, 0, u)
		}
	}
	return out, nil
}

func (m *mesh) derivative(order, index []int, k, cell int, u []float64) float64 {
	if k == len(m.axes) {
		return u[cell]
	}
	o := 0
	if order != nil {
		o = order[k]
	}
	var s float64
	for _, p := range m.axes[k].stencil(index[k], o, extrapolate) {
		s += p.w * m.derivative(order, index, k+1, cell*m.axes[k].n+p.j, u)
	}
	return s
}

func (m *mesh) mean(u []float64) (mean, size float64) {
	for i, v := range u {
		mean += m.rho[i] * v
		size += math.Abs(m.rho[i] * v)
	}
	return mean, size
}

// solve returns Phi: with the pinned matrix P and Phi = 0 at the pinned cell,
// P Phi = L Phi = lambda - g.
func (m *mesh) solve(g []float64) []float64 {
	rhs := make([]float64, m.n)
	for i, v := range g {
		rhs[i] = -v
	}
	z := m.lu.Solve(rhs)
	lambda := -z[m.pinned] / m.one[m.pinned]
	for i := range z {
		z[i] += lambda * m.one[i]
	}
	mean, _ := m.mean(z)
	for i := range z {
		z[i] -= mean
	}
	return z
}

// level is a pair of grids; a function is its values on both.
type level struct{ coarse, fine *mesh }

type vector [2][]float64

func (l *level) both(f func(m *mesh, k int) ([]float64, error)) (fast.Vector, error) {
	var v vector
	var err error
	for k, m := range []*mesh{l.coarse, l.fine} {
		if v[k], err = f(m, k); err != nil {
			return nil, err
		}
	}
	return v, nil
}

// Coefficient implements fast.Level.
func (l *level) Coefficient(c *fast.Coefficient) (fast.Vector, error) {
	return l.both(func(m *mesh, _ int) ([]float64, error) { return m.values(c) })
}

// Sum implements fast.Level.
func (l *level) Sum(factors []float64, u []fast.Vector) (fast.Vector, error) {
	return l.both(func(m *mesh, k int) ([]float64, error) {
		out := make([]float64, m.n)
		for i, w := range u {
			for j, x := range w.(vector)[k] {
				out[j] += factors[i] * x
			}
		}
		return out, nil
	})
}

// Apply implements fast.Level.
func (l *level) Apply(op fast.Operator, u fast.Vector) (fast.Vector, error) {
	for _, t := range op {
		for _, o := range t.Order {
			if o > 2 {
				return nil, &fast.Unsupported{Method: "grid", Reason: "derivatives of third order"}
			}
		}
	}
	return l.both(func(m *mesh, k int) ([]float64, error) { return m.apply(op, u.(vector)[k]) })
}

// Product implements fast.Level.
func (l *level) Product(u, v fast.Vector) (fast.Vector, error) {
	return l.both(func(m *mesh, k int) ([]float64, error) {
		out := make([]float64, m.n)
		for i, x := range u.(vector)[k] {
			out[i] = x * v.(vector)[k][i]
		}
		return out, nil
	})
}

// Mean implements fast.Level: extrapolated from the two grids.
func (l *level) Mean(u fast.Vector) (fast.Value, error) {
	c, _ := l.coarse.mean(u.(vector)[0])
	f, size := l.fine.mean(u.(vector)[1])
	r := 1e-13 * size
	return fast.Value{Value: f + (f-c)/3, Scale: size, Error: r, Rounding: r}, nil
}

// Solve implements fast.Level.
func (l *level) Solve(u fast.Vector) (fast.Vector, error) {
	return l.both(func(m *mesh, k int) ([]float64, error) { return m.solve(u.(vector)[k]), nil })
}

// At implements fast.Level: linear interpolation on the finer grid.
func (l *level) At(u fast.Vector, y [][]float64) ([]float64, error) {
	return l.fine.interpolate(u.(vector)[1], y), nil
}

func (m *mesh) interpolate(u []float64, y [][]float64) []float64 {
	out := make([]float64, len(y[0]))
	for k := range out {
		cells, weights := []int{0}, []float64{1}
		for i, a := range m.axes {
			t := a.toT(y[i][k])
			if a.periodic {
				t = math.Mod(t, float64(a.n))
				if t < 0 {
					t += float64(a.n)
				}
			} else {
				t = math.Min(math.Max(t, 0), float64(a.n-1))
			}
			j := int(t)
			var nc []int
			var nw []float64
			for s, w := range []float64{1 - (t - float64(j)), t - float64(j)} {
				if w == 0 {
					continue
				}
				q := (j + s) % a.n
				for c := range cells {
					nc, nw = append(nc, cells[c]*a.n+q), append(nw, weights[c]*w)
				}
			}
			cells, weights = nc, nw
		}
		for c, cell := range cells {
			out[k] += weights[c] * u[cell]
		}
	}
	return out
}

// Density implements fast.Level.
func (l *level) Density(y [][]float64) ([]float64, error) {
	m := l.fine
	d := make([]float64, m.n)
	index := make([]int, len(m.axes))
	for c := range d {
		m.split(c, index)
		v := 1.0
		for i, a := range m.axes {
			v *= a.step * a.dy[index[i]]
		}
		d[c] = m.rho[c] / v
	}
	return m.interpolate(d, y), nil
}

// String implements fast.Level.
func (l *level) String() string {
	s := ""
	for i, a := range l.fine.axes {
		if i > 0 {
			s += " x "
		}
		s += fmt.Sprint(a.n)
	}
	return s + " cells"
}

// Unknowns implements fast.Level.
func (l *level) Unknowns() int { return l.fine.n }
