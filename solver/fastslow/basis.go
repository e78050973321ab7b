package fastslow

import (
	"fmt"
	"math"
)

// Basis is a family of functions of one fast variable. Its quadrature nodes
// carry the test functions psi_k with two derivatives and the trial functions
// phi_m times the quadrature weight.
type Basis interface {
	// Size returns the number of functions; the first test function is one.
	Size() int
	// Nodes returns the quadrature points.
	Nodes() []float64
	// Test returns psi_k and its first two derivatives at y.
	Test(k int, y float64) (v, d1, d2 float64)
	// Trial returns phi_m at node q times the weight of the node.
	Trial(m, q int) float64
}

// Circle is the real Fourier basis on a circle: 1, cos, sin, cos 2, sin 2, ...
// up to the given number of waves. Quadrature with 4*Waves+4 equal steps
// integrates products of two basis functions with a coefficient of up to
// 2*Waves+3 waves exactly.
type Circle struct {
	Period float64 // 0 means 2 pi
	Waves  int
}

func (c Circle) rate() float64 {
	if c.Period == 0 {
		return 1
	}
	return 2 * math.Pi / c.Period
}

// Size implements Basis.
func (c Circle) Size() int { return 2*c.Waves + 1 }

// Nodes implements Basis.
func (c Circle) Nodes() []float64 {
	n := 4*c.Waves + 4
	y := make([]float64, n)
	for i := range y {
		y[i] = 2 * math.Pi / c.rate() * float64(i) / float64(n)
	}
	return y
}

// Test implements Basis.
func (c Circle) Test(k int, y float64) (v, d1, d2 float64) {
	if k == 0 {
		return 1, 0, 0
	}
	w := c.rate() * float64((k+1)/2)
	sin, cos := math.Sincos(w * y)
	if k%2 == 1 {
		return cos, -w * sin, -w * w * cos
	}
	return sin, w * cos, -w * w * sin
}

// Trial implements Basis.
func (c Circle) Trial(m, q int) float64 {
	nodes := c.Nodes()
	v, _, _ := c.Test(m, nodes[q])
	if m > 0 {
		v *= 2
	}
	return v / float64(len(nodes))
}

// Line is the Hermite basis on the real line: test functions are the normalized
// Hermite polynomials of (y-Center)/Width, trial functions the same times the
// Gaussian density with that mean and standard deviation. It suits fast
// processes of Ornstein-Uhlenbeck kind and converges for densities with tails
// no heavier than those of a Gaussian of sqrt(2) times the width.
type Line struct {
	Center, Width float64
	Modes         int
	nodes, weight []float64
}

// NewLine returns the basis with its Gauss-Hermite rule of 2*modes+4 points.
func NewLine(center, width float64, modes int) (*Line, error) {
	if !(width > 0) || modes < 1 {
		return nil, fmt.Errorf("Hermite basis: width %g and %d modes; both must be positive", width, modes)
	}
	l := &Line{Center: center, Width: width, Modes: modes}
	l.nodes, l.weight = gaussHermite(2*modes + 4)
	return l, nil
}

// Size implements Basis.
func (l *Line) Size() int { return l.Modes }

// Nodes implements Basis.
func (l *Line) Nodes() []float64 {
	y := make([]float64, len(l.nodes))
	for i, z := range l.nodes {
		y[i] = l.Center + l.Width*z
	}
	return y
}

// hermite returns the orthonormal Hermite polynomials of degrees k, k-1 and k-2.
func hermite(k int, z float64) (h, h1, h2 float64) {
	h = 1
	for j := 1; j <= k; j++ {
		h, h1, h2 = (z*h-math.Sqrt(float64(j-1))*h1)/math.Sqrt(float64(j)), h, h1
	}
	return h, h1, h2
}

// Test implements Basis; h_k' = sqrt(k) h_{k-1}.
func (l *Line) Test(k int, y float64) (v, d1, d2 float64) {
	h, h1, h2 := hermite(k, (y-l.Center)/l.Width)
	return h, math.Sqrt(float64(k)) * h1 / l.Width, math.Sqrt(float64(k)*float64(max(k-1, 0))) * h2 / (l.Width * l.Width)
}

// Trial implements Basis.
func (l *Line) Trial(m, q int) float64 {
	h, _, _ := hermite(m, l.nodes[q])
	return h * l.weight[q]
}

// gaussHermite returns nodes and weights of the rule for the standard Gaussian
// density, by Newton's method on the orthonormal polynomials with bisection
// between the zeros of the polynomial of one degree less (interlacing; Szego,
// Orthogonal Polynomials, section 3.3).
func gaussHermite(n int) (nodes, weights []float64) {
	roots := []float64{0}
	for k := 2; k <= n; k++ {
		edge := 2*math.Sqrt(float64(k)) + 2
		bounds := append(append([]float64{-edge}, roots...), edge)
		next := make([]float64, k)
		for i := range next {
			lo, hi := bounds[i], bounds[i+1]
			flo, _, _ := hermite(k, lo)
			for step := 0; step < 200 && hi-lo > 4e-16*(1+math.Abs(lo)); step++ {
				mid := 0.5 * (lo + hi)
				f, _, _ := hermite(k, mid)
				if (f > 0) == (flo > 0) {
					lo = mid
				} else {
					hi = mid
				}
			}
			next[i] = 0.5 * (lo + hi)
		}
		roots = next
	}
	weights = make([]float64, n)
	for i, z := range roots {
		_, h1, _ := hermite(n, z) // weight 1/(n h_{n-1}^2)
		weights[i] = 1 / (float64(n) * h1 * h1)
	}
	return roots, weights
}
