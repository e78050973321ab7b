package spectral

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"epslim/perturb/cell/quadrature/fast"
)

// Every matrix of the sphere against point values: products with the
// coordinates and first and second derivatives of the extension of degree 0.
func TestSphereMatrices(t *testing.T) {
	const degree = 7
	s := sphere(fast.Domain{Kind: fast.Sphere}, 0, degree)
	rng := rand.New(rand.NewPCG(1, 2))
	u := make([]float64, s.n)
	for i := range u {
		if int(math.Sqrt(float64(i))) <= degree-2 { // so that nothing is cut
			u[i] = rng.NormFloat64()
		}
	}
	value := func(c []float64, y []float64) float64 {
		r := math.Sqrt(y[0]*y[0] + y[1]*y[1] + y[2]*y[2])
		return dot(c, harmonics(degree, []float64{y[0] / r, y[1] / r, y[2] / r}))
	}
	y := []float64{0.36, -0.48, 0.8}
	for i := 0; i < 3; i++ {
		p := []int{0, 0, 0}
		p[i] = 1
		near(t, "product", value(s.multiply(p).apply(u), y), y[i]*value(u, y), 1e-13)
		const h = 1e-3
		move := func(a, b float64, j int) float64 {
			z := append([]float64{}, y...)
			z[i] += a
			z[j] += b
			return value(u, z)
		}
		d := (8*(move(h, 0, 0)-move(-h, 0, 0)) - (move(2*h, 0, 0) - move(-2*h, 0, 0))) / (12 * h)
		near(t, "derivative", value(s.deriv[i].apply(u), y), d, 1e-8)
		for j := 0; j < 3; j++ {
			dd := (move(h, h, j) - move(h, -h, j) - move(-h, h, j) + move(-h, -h, j)) / (4 * h * h)
			if i == j {
				dd = (16*(move(h, 0, 0)+move(-h, 0, 0)) - move(2*h, 0, 0) - move(-2*h, 0, 0) - 30*move(0, 0, 0)) / (12 * h * h)
			}
			near(t, "second derivative", value(s.deriv2[[2]int{i, j}].apply(u), y), dd, 2e-3)
		}
	}
	// Orthonormality at the nodes of the product rule.
	s.ready()
	g := s.project(onesOf(s.q))
	for i, row := range g {
		if len(row) != 1 || row[0].Col != i || math.Abs(row[0].V-1) > 1e-12 {
			t.Fatalf("row %d of the Gram matrix: %v", i, row)
		}
	}
}

func onesOf(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = 1
	}
	return v
}

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if math.Abs(got-want) > tol*math.Max(1, math.Abs(want)) {
		t.Errorf("%s: %.12g, want %.12g", what, got, want)
	}
}

// Orthonormal polynomials of the normal law are the Hermite polynomials:
// recurrence coefficients sqrt(k), derivative sqrt(k) p_{k-1}.
func TestHermite(t *testing.T) {
	f := newFitter(&fast.Problem{Domains: []fast.Domain{{}}})
	if err := f.gaussian(context.Background(), 0, 1.5, 0.3); err != nil {
		t.Fatal(err)
	}
	a, b := stieltjes(f.laws[0], 60)
	for k := 0; k < 60; k++ {
		near(t, "a", a[k], 1.5, 1e-12)
		near(t, "b", b[k+1], 0.3*math.Sqrt(float64(k+1)), 1e-12)
	}
	s, err := polynomial(fast.Domain{}, 0, f.laws[0], 40)
	if err != nil {
		t.Fatal(err)
	}
	for r, row := range s.deriv[0] {
		if r == 39 {
			break
		}
		if len(row) != 1 || row[0].Col != r+1 {
			t.Fatalf("row %d of the derivative: %v", r, row)
		}
		near(t, "derivative", row[0].V, math.Sqrt(float64(r+1))/0.3, 1e-11)
	}
}
