package spectral

import (
	"fmt"
	"math"

	"epslim/perturb/cell/quadrature/fast"
)

// arctangent is the basis for a weight that falls off like a power, which has
// too few moments for polynomials: 1, y and the higher powers that are square
// integrable, then polynomials in arctan(y/scale), all made orthonormal. Those
// converge fast for functions with an expansion in 1/y at infinity.
func arctangent(d fast.Domain, first int, m *measure, n int) (*space, error) {
	n = min(n, 64) // convergence is algebraic; more does not pay
	centre, scale := m.quartiles()
	s := &space{domain: d, first: first, cache: map[string]sparse{}}
	s.nodes = [][]float64{m.y}
	s.q = len(m.y)
	s.root = make([]float64, s.q)
	angle := &measure{y: make([]float64, s.q), w: m.w}
	for j, y := range m.y {
		s.root[j] = math.Sqrt(m.w[j])
		angle.y[j] = math.Atan((y - centre) / scale)
	}
	a, b := stieltjes(angle, n)
	grown := m.growth()
	// raw returns the functions before they are made orthonormal and their
	// first two derivatives.
	raw := func(y float64) (v [3][]float64) {
		x := (y - centre) / scale
		p, dp, ddp := recurrence2(a, b, n, math.Atan(x))
		v[0], v[1], v[2] = []float64{1}, []float64{0}, []float64{0}
		for k := 1; k <= grown; k++ {
			c := float64(k)
			v[0] = append(v[0], math.Pow(x, c))
			v[1] = append(v[1], c*math.Pow(x, c-1)/scale)
			second := 0.0
			if k > 1 {
				second = c * (c - 1) * math.Pow(x, c-2) / (scale * scale)
			}
			v[2] = append(v[2], second)
		}
		w := 1 / (1 + x*x)
		for k := 1; k < n-grown; k++ {
			v[0] = append(v[0], p[k])
			v[1] = append(v[1], dp[k]*w/scale)
			v[2] = append(v[2], (ddp[k]-2*x*dp[k])*w*w/(scale*scale))
		}
		return v
	}
	var tables [3][][]float64 // by order of derivative, by function
	for o := range tables {
		tables[o] = make([][]float64, n)
		for k := range tables[o] {
			tables[o][k] = make([]float64, s.q)
		}
	}
	for j, y := range m.y {
		v := raw(y)
		for o := range v {
			for k, x := range v[o] {
				tables[o][k][j] = x * s.root[j]
			}
		}
	}
	combine := orthonormalize(tables)
	s.n = len(combine)
	s.basis = make([]float64, s.q*s.n)
	s.slopes[0], s.slopes[1] = make([]float64, s.q*s.n), make([]float64, s.q*s.n)
	d1 := make([]float64, s.n*s.n)
	for r := 0; r < s.n; r++ {
		for j := 0; j < s.q; j++ {
			s.basis[j*s.n+r] = tables[0][r][j]
			s.slopes[0][j*s.n+r], s.slopes[1][j*s.n+r] = tables[1][r][j], tables[2][r][j]
		}
		for c := 0; c < s.n; c++ {
			d1[r*s.n+c] = dot(tables[0][r], tables[1][c])
		}
	}
	s.deriv = []sparse{fromDense(s.n, d1)}
	s.values = func(y []float64) []float64 {
		v := raw(y[0])[0]
		out := make([]float64, s.n)
		for r, row := range combine {
			out[r] = dot(row, v[:len(row)])
		}
		return out
	}
	s.density = func(y []float64) float64 {
		if m.density == nil {
			return math.NaN()
		}
		return m.density(y[0])
	}
	if m.logSlope != nil {
		s.parts = true // in the strong form rounding grows like the fourth power of the degree
		s.logSlope = make([]float64, s.q)
		for j, y := range m.y {
			s.logSlope[j] = m.logSlope(y)
		}
	}
	s.about = fmt.Sprintf("powers and polynomials of the arctangent %d for the %s", s.n, m.about)
	return s, nil
}

// quartiles returns the median and half the distance of the quartiles.
func (m *measure) quartiles() (median, half float64) {
	var q [3]float64
	acc := 0.0
	k := 0
	for i, w := range m.w {
		acc += w
		for k < 3 && acc >= 0.25*float64(k+1) {
			q[k] = m.y[i]
			k++
		}
	}
	return q[1], math.Max((q[2]-q[0])/2, 1e-300)
}

// growth is the largest power (up to 4) whose square has a finite average: the
// terms of the sum must die out towards both ends.
func (m *measure) growth() int {
	p := 0
	for p < 4 {
		var whole, outer float64
		for i, w := range m.w {
			t := w * math.Pow(m.y[i], 2*float64(p+1))
			whole += t
			if i < len(m.w)/20 || i >= len(m.w)-len(m.w)/20 {
				outer += t
			}
		}
		if !(outer < 1e-13*whole) {
			break
		}
		p++
	}
	return p
}

// orthonormalize is Gram-Schmidt, twice, on the functions tables[0], applied to
// their derivatives along with them; it returns the rows of the combinations.
func orthonormalize(tables [3][][]float64) [][]float64 {
	values := tables[0]
	combine := make([][]float64, len(values))
	for k := range values {
		row := make([]float64, k+1)
		row[k] = 1
		for pass := 0; pass < 2; pass++ {
			for r := 0; r < k; r++ {
				c := dot(values[r], values[k])
				for _, t := range tables {
					for j, x := range t[r] {
						t[k][j] -= c * x
					}
				}
				for i, x := range combine[r] {
					row[i] -= c * x
				}
			}
		}
		norm := math.Sqrt(dot(values[k], values[k]))
		for _, t := range tables {
			for j := range t[k] {
				t[k][j] /= norm
			}
		}
		for i := range row {
			row[i] /= norm
		}
		combine[k] = row
	}
	return combine
}

// recurrence2 is recurrence with the second derivative.
func recurrence2(a, b []float64, n int, y float64) (p, dp, ddp []float64) {
	p, dp = recurrence(a, b, n, y)
	ddp = make([]float64, n)
	for k := 0; k+1 < n; k++ {
		v := 2*dp[k] + (y-a[k])*ddp[k]
		if k > 0 {
			v -= b[k] * ddp[k-1]
		}
		ddp[k+1] = v / b[k+1]
	}
	return p, dp, ddp
}
