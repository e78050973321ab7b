package spectral

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"epslim/perturb/cell/quadrature/fast"
)

// space is the basis of one domain, orthonormal in L2 of a probability weight,
// with phi_0 = 1.
type space struct {
	domain fast.Domain
	first  int // index of its first coordinate
	n, q   int
	// nodes[c][j] is coordinate c of quadrature node j; root[j] the square root
	// of its weight; basis[j*n+m] is phi_m times root.
	nodes [][]float64
	root  []float64
	basis []float64
	// deriv differentiates coefficient vectors along each coordinate.
	deriv []sparse
	// deriv2 are the second derivatives on a sphere.
	deriv2 map[[2]int]sparse
	// slopes, when not nil, are the first and second derivatives of the basis at
	// the nodes (times root), for a basis that is not closed under d/dy.
	slopes [2][]float64
	// logSlope is the derivative of the log weight at the nodes; nil when the
	// weight is uniform. Needed at walls only.
	logSlope []float64
	// values evaluates the basis at a point of the domain; density the weight.
	values  func(y []float64) []float64
	density func(y []float64) float64
	// wall says that the second derivative must be integrated by parts, parts
	// that it is better done so.
	wall, parts bool
	// multiply, when not nil, gives exact sparse products for polynomials.
	multiply func(powers []int) sparse
	// fill makes nodes, root and basis when they are first needed; nil when
	// they are there.
	fill  func()
	cache map[string]sparse
	// bad is the first place at which a factor had no finite value.
	bad   *fast.Undefined
	about string
}

// fourier is the real Fourier basis 1, sqrt2 cos, sqrt2 sin, ... with k modes.
func fourier(d fast.Domain, first, k int) *space {
	a, b := d.Ends()
	n, q := 2*k+1, 4*k+32
	s := &space{domain: d, first: first, n: n, q: q, cache: map[string]sparse{}, about: fmt.Sprintf("Fourier %d", k)}
	w := 2 * math.Pi / (b - a)
	s.values = func(y []float64) []float64 {
		out := make([]float64, n)
		out[0] = 1
		for j := 1; j <= k; j++ {
			sin, cos := math.Sincos(float64(j) * w * (y[0] - a))
			out[2*j-1], out[2*j] = math.Sqrt2*cos, math.Sqrt2*sin
		}
		return out
	}
	s.density = func([]float64) float64 { return 1 / (b - a) }
	s.nodes = [][]float64{make([]float64, q)}
	s.root, s.basis = make([]float64, q), make([]float64, q*n)
	for j := 0; j < q; j++ {
		y := a + (b-a)*float64(j)/float64(q)
		s.nodes[0][j], s.root[j] = y, 1/math.Sqrt(float64(q))
		for m, v := range s.values([]float64{y}) {
			s.basis[j*n+m] = v * s.root[j]
		}
	}
	d1 := newSparse(n)
	for j := 1; j <= k; j++ {
		// d cos = -jw sin, d sin = jw cos
		d1[2*j] = []entry{{Col: 2*j - 1, V: -float64(j) * w}}
		d1[2*j-1] = []entry{{Col: 2 * j, V: float64(j) * w}}
	}
	s.deriv = []sparse{d1}
	return s
}

// measure is a discrete probability measure on a line.
type measure struct {
	y, w []float64
	// logSlope is the derivative of the log density, nil when uniform.
	logSlope func(y float64) float64
	density  func(y float64) float64
	heavy    bool // falls off like a power
	about    string
}

// affine returns the measure of shift + scale*y.
func (m *measure) affine(shift, scale float64) *measure {
	out := &measure{y: make([]float64, len(m.y)), w: m.w, heavy: m.heavy, about: fmt.Sprintf("%s, moved by %.3g and stretched by %.3g", m.about, shift, scale)}
	for i, y := range m.y {
		out.y[i] = shift + scale*y
	}
	if m.density != nil {
		out.density = func(y float64) float64 { return m.density((y-shift)/scale) / scale }
	}
	if m.logSlope != nil {
		out.logSlope = func(y float64) float64 { return m.logSlope((y-shift)/scale) / scale }
	}
	return out
}

func (m *measure) moments() (mean, sd float64) {
	for i, y := range m.y {
		mean += m.w[i] * y
	}
	for i, y := range m.y {
		sd += m.w[i] * (y - mean) * (y - mean)
	}
	return mean, math.Sqrt(sd)
}

func (m *measure) kurtosis() float64 {
	mean, sd := m.moments()
	var s float64
	for i, y := range m.y {
		d := (y - mean) / sd
		s += m.w[i] * d * d * d * d
	}
	return s
}

// stieltjes returns the recurrence of the orthonormal polynomials of a
// measure: y p_k = b_{k+1} p_{k+1} + a_k p_k + b_k p_{k-1}.
func stieltjes(m *measure, n int) (a, b []float64) {
	a, b = make([]float64, n), make([]float64, n+1)
	size := len(m.y)
	// Vectors carry the square root of the weight, so nothing overflows.
	prev, cur := make([]float64, size), make([]float64, size)
	for i, w := range m.w {
		cur[i] = math.Sqrt(w)
	}
	for k := 0; k < n; k++ {
		var s float64
		for i, v := range cur {
			s += m.y[i] * v * v
		}
		a[k] = s
		next := prev
		var norm float64
		for i, v := range cur {
			next[i] = (m.y[i]-s)*v - b[k]*prev[i]
			norm += next[i] * next[i]
		}
		b[k+1] = math.Sqrt(norm)
		for i := range next {
			next[i] /= b[k+1]
		}
		prev, cur = cur, next
	}
	return a, b
}

// polynomial is the basis of the first n orthonormal polynomials of a measure.
func polynomial(d fast.Domain, first int, m *measure, n int) (*space, error) {
	q := n + n/2 + 12
	a, b := stieltjes(m, q)
	j := mat.NewSymDense(q, nil)
	for k := 0; k < q; k++ {
		j.SetSym(k, k, a[k])
		if k+1 < q {
			j.SetSym(k, k+1, b[k+1])
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(j, false) {
		return nil, fmt.Errorf("spectral: no Gauss nodes for the weight of %s", d.Name(0))
	}
	s := &space{domain: d, first: first, n: n, q: q, cache: map[string]sparse{}, about: fmt.Sprintf("polynomials %d for the %s", n, m.about)}
	s.nodes = [][]float64{eigen.Values(nil)}
	s.root, s.basis = make([]float64, q), make([]float64, q*n)
	slopes := make([]float64, q*n)
	for i, y := range s.nodes[0] {
		p, dp := recurrence(a, b, q, y)
		var sum float64
		for _, v := range p {
			sum += v * v
		}
		s.root[i] = 1 / math.Sqrt(sum)
		for k := 0; k < n; k++ {
			s.basis[i*n+k], slopes[i*n+k] = p[k]*s.root[i], dp[k]*s.root[i]
		}
	}
	d1 := make([]float64, n*n)
	for i := 0; i < q; i++ {
		for r := 0; r < n; r++ {
			v := s.basis[i*n+r]
			for c := r + 1; c < n; c++ { // the derivative lowers the degree
				d1[r*n+c] += v * slopes[i*n+c]
			}
		}
	}
	s.deriv = []sparse{fromDense(n, d1)}
	s.values = func(y []float64) []float64 {
		p, _ := recurrence(a, b, n, y[0])
		return p
	}
	s.density = func(y []float64) float64 {
		if m.density == nil {
			return math.NaN()
		}
		return m.density(y[0])
	}
	if m.logSlope != nil {
		s.logSlope = make([]float64, q)
		for i, y := range s.nodes[0] {
			s.logSlope[i] = m.logSlope(y)
		}
	}
	return s, nil
}

// recurrence evaluates orthonormal polynomials and their derivatives.
func recurrence(a, b []float64, n int, y float64) (p, dp []float64) {
	p, dp = make([]float64, n), make([]float64, n)
	p[0] = 1
	for k := 0; k+1 < n; k++ {
		v, dv := (y-a[k])*p[k], p[k]+(y-a[k])*dp[k]
		if k > 0 {
			v -= b[k] * p[k-1]
			dv -= b[k] * dp[k-1]
		}
		p[k+1], dp[k+1] = v/b[k+1], dv/b[k+1]
	}
	return p, dp
}

// degree of a basis function: of the polynomial, the mode or the harmonic.
func (s *space) degree(i int) int {
	switch {
	case s.domain.Kind == fast.Sphere:
		return int(math.Sqrt(float64(i) + 0.5))
	case s.domain.IsPeriodic():
		return (i + 1) / 2
	}
	return i
}

// ready makes sure that the quadrature nodes exist.
func (s *space) ready() {
	if s.fill != nil {
		s.fill()
		s.fill = nil
	}
}
