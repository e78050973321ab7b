package quadrature

import "math"

// chebyshev holds the matrices of one number of nodes on [-1, 1]. The nodes
// are the Chebyshev points of the first kind, so no panel evaluates a
// coefficient at its ends.
type chebyshev struct {
	n       int
	nodes   []float64
	weights []float64 // Fejer's first rule
	coef    []float64 // n x n: values to Chebyshev coefficients
	cum     []float64 // n x n: values to the integral from -1 to each node
	diff    []float64 // n x n: values to the derivative at the nodes
	bary    []float64 // weights of the barycentric formula
}

func newChebyshev(n int) *chebyshev {
	c := &chebyshev{n: n, nodes: make([]float64, n), weights: make([]float64, n),
		bary: make([]float64, n), coef: make([]float64, n*n), cum: make([]float64, n*n), diff: make([]float64, n*n)}
	for j := range c.nodes {
		sin, cos := math.Sincos(math.Pi * (float64(j) + 0.5) / float64(n))
		c.nodes[j], c.bary[j] = -cos, sin*float64(1-2*(j%2))
	}
	for k := 0; k < n; k++ {
		for j := 0; j < n; j++ {
			s := 2.0
			if k == 0 {
				s = 1
			}
			theta := math.Pi * (float64(n-1-j) + 0.5) / float64(n)
			c.coef[k*n+j] = s / float64(n) * math.Cos(float64(k)*theta)
		}
	}
	for i, x := range c.nodes {
		integrals, derivatives := chebyshevIntegrals(n, x), chebyshevDerivatives(n, x)
		for j := 0; j < n; j++ {
			var si, sd float64
			for k := 0; k < n; k++ {
				si += integrals[k] * c.coef[k*n+j]
				sd += derivatives[k] * c.coef[k*n+j]
			}
			c.cum[i*n+j], c.diff[i*n+j] = si, sd
		}
	}
	full := chebyshevIntegrals(n, 1)
	for j := 0; j < n; j++ {
		for k := 0; k < n; k++ {
			c.weights[j] += full[k] * c.coef[k*n+j]
		}
	}
	return c
}

// chebyshevIntegrals returns the integrals of T_0 .. T_{n-1} from -1 to x.
func chebyshevIntegrals(n int, x float64) []float64 {
	t := chebyshevValues(n+1, x)
	out := make([]float64, n)
	out[0] = x + 1
	if n > 1 {
		out[1] = (x*x - 1) / 2
	}
	for k := 2; k < n; k++ {
		kk := float64(k)
		v := t[k+1]/(2*(kk+1)) - t[k-1]/(2*(kk-1))
		s := 1.0
		if k%2 == 0 {
			s = -1
		}
		// T_{k+-1}(-1) = (-1)^(k+1)
		lo := s/(2*(kk+1)) - s/(2*(kk-1))
		out[k] = v - lo
	}
	return out
}

func chebyshevValues(n int, x float64) []float64 {
	t := make([]float64, n)
	t[0] = 1
	if n > 1 {
		t[1] = x
	}
	for k := 2; k < n; k++ {
		t[k] = 2*x*t[k-1] - t[k-2]
	}
	return t
}

func chebyshevDerivatives(n int, x float64) []float64 {
	t := chebyshevValues(n, x)
	d := make([]float64, n)
	if n > 1 {
		d[1] = 1
	}
	for k := 2; k < n; k++ {
		d[k] = 2*t[k-1] + 2*x*d[k-1] - d[k-2]
	}
	return d
}

func (c *chebyshev) apply(m, v, dst []float64) {
	for i := 0; i < c.n; i++ {
		var s float64
		row := m[i*c.n : (i+1)*c.n]
		for j, x := range v {
			s += row[j] * x
		}
		dst[i] = s
	}
}

// tail returns the size of the last coefficients and the largest one.
func (c *chebyshev) tail(v []float64) (tail, largest float64) {
	for k := 0; k < c.n; k++ {
		var s float64
		row := c.coef[k*c.n : (k+1)*c.n]
		for j, x := range v {
			s += row[j] * x
		}
		s = math.Abs(s)
		largest = math.Max(largest, s)
		if k >= c.n-3 {
			tail = math.Max(tail, s)
		}
	}
	return tail, largest
}

// at evaluates the interpolant of v at x in [-1, 1] (barycentric formula).
func (c *chebyshev) at(v []float64, x float64) float64 {
	var num, den float64
	for j, xj := range c.nodes {
		if x == xj {
			return v[j]
		}
		w := c.bary[j] / (x - xj)
		num += w * v[j]
		den += w
	}
	return num / den
}
