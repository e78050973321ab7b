package spectral

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/integrate/quad"

	"epslim/perturb/cell/quadrature/fast"
)

// sphereIndex numbers the real harmonics: l*l + l + m, with m < 0 for the sine
// of |m| phi and m > 0 for the cosine.
func sphereIndex(l, m int) int { return l*l + l + m }

// sphere is the basis of real spherical harmonics up to degree n, normalized
// to mean square one over the sphere.
func sphere(d fast.Domain, first, degree int) *space {
	const pad = 8 // so that products of up to that degree are exact after the cut
	big := degree + pad
	n := (degree + 1) * (degree + 1)
	x := [3]sparse{}
	x[0], x[1], x[2] = sphereProducts(big)
	rot := sphereRotations(big)
	// D = -y x (y x grad): D_i = -eps_ijk y_j L_k with L = y x grad.
	deriv := make([]sparse, 3)
	for i := 0; i < 3; i++ {
		j, k := (i+1)%3, (i+2)%3
		full := newSparse((big+1)*(big+1)).plus(-1, x[j].times(rot[k])).plus(1, x[k].times(rot[j]))
		deriv[i] = full
	}
	s := &space{domain: d, first: first, n: n, cache: map[string]sparse{}, about: fmt.Sprintf("spherical harmonics %d", degree)}
	s.multiply = func(p []int) sparse {
		m := identity((big + 1) * (big + 1))
		for c := 0; c < 3; c++ {
			for k := 0; k < p[c]; k++ {
				m = x[c].times(m)
			}
		}
		return m.cut(n)
	}
	s.deriv = []sparse{deriv[0].cut(n), deriv[1].cut(n), deriv[2].cut(n)}
	s.values = func(y []float64) []float64 { return harmonics(degree, y) }
	s.density = func([]float64) float64 { return 1 / (4 * math.Pi) }
	s.fill = func() { s.sphereNodes(degree) }
	// Products of derivatives must be formed before the cut.
	seconds := map[[2]int]sparse{}
	for i := 0; i < 3; i++ {
		for j := 0; j < 3; j++ {
			seconds[[2]int{i, j}] = deriv[i].times(deriv[j]).plus(-1, x[i].times(deriv[j])).cut(n)
		}
	}
	s.deriv2 = seconds
	return s
}

// sphereNodes is the product rule of Gauss-Legendre in c and equal steps in the
// azimuth.
func (s *space) sphereNodes(degree int) {
	nc, np := degree+degree/2+10, 2*degree+degree+20
	z, w := make([]float64, nc), make([]float64, nc)
	quad.Legendre{}.FixedLocations(z, w, -1, 1)
	s.q = nc * np
	s.nodes = [][]float64{make([]float64, s.q), make([]float64, s.q), make([]float64, s.q)}
	s.root, s.basis = make([]float64, s.q), make([]float64, s.q*s.n)
	for i := range z {
		for k := 0; k < np; k++ {
			j := i*np + k
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / float64(np))
			r := math.Sqrt(1 - z[i]*z[i])
			s.nodes[0][j], s.nodes[1][j], s.nodes[2][j] = r*cos, r*sin, z[i]
			s.root[j] = math.Sqrt(w[i] / 2 / float64(np))
			for m, v := range harmonics(degree, []float64{r * cos, r * sin, z[i]}) {
				s.basis[j*s.n+m] = v * s.root[j]
			}
		}
	}
}

// harmonics evaluates the basis at a point.
func harmonics(degree int, y []float64) []float64 {
	out := make([]float64, (degree+1)*(degree+1))
	// q[l] = sqrt((2l+1)(l-m)!/(l+m)!) P_l^m(c)/sin^m, times Re and Im (a+ib)^m.
	re, im := 1.0, 0.0
	start := 1.0
	for m := 0; m <= degree; m++ {
		if m > 0 {
			re, im = re*y[0]-im*y[1], re*y[1]+im*y[0]
			start *= math.Sqrt(float64(2*m+1) / float64(2*m))
		}
		prev, cur := 0.0, start
		for l := m; l <= degree; l++ {
			if m == 0 {
				out[sphereIndex(l, 0)] = cur
			} else {
				out[sphereIndex(l, m)] = math.Sqrt2 * cur * re
				out[sphereIndex(l, -m)] = math.Sqrt2 * cur * im
			}
			prev, cur = cur, (y[2]*cur-climb(l, m)*prev)/climb(l+1, m)
		}
	}
	return out
}

// climb is the coefficient in c Y_l^m = climb(l+1,m) Y_{l+1}^m + climb(l,m)
// Y_{l-1}^m for normalized harmonics.
func climb(l, m int) float64 {
	return math.Sqrt(float64(l*l-m*m) / float64((2*l-1)*(2*l+1)))
}

// complexMatrix is a matrix in the complex basis, by (row, column).
type complexMatrix map[[2]int]complex128

// sphereProducts are the matrices of multiplication by a, b and c.
func sphereProducts(degree int) (a, b, c sparse) {
	// Complex harmonics with the Condon-Shortley phase:
	// (a + i b) Y_l^m = -up Y_{l+1}^{m+1} + down Y_{l-1}^{m+1}
	// (D.A. Varshalovich et al., Quantum Theory of Angular Momentum, section
	// 5.6, from memory; the tests check every matrix against point values).
	n := (degree + 1) * (degree + 1)
	plus, z := complexMatrix{}, complexMatrix{}
	for l := 0; l <= degree; l++ {
		for m := -l; m <= l; m++ {
			from := sphereIndex(l, m)
			if l+1 <= degree {
				z[[2]int{sphereIndex(l+1, m), from}] = complex(climb(l+1, m), 0)
				plus[[2]int{sphereIndex(l+1, m+1), from}] = complex(-math.Sqrt(float64((l+m+1)*(l+m+2))/float64((2*l+1)*(2*l+3))), 0)
			}
			if l-1 >= 0 {
				if m <= l-1 && m >= -(l-1) {
					z[[2]int{sphereIndex(l-1, m), from}] = complex(climb(l, m), 0)
				}
				if m+1 <= l-1 {
					plus[[2]int{sphereIndex(l-1, m+1), from}] = complex(math.Sqrt(float64((l-m)*(l-m-1))/float64((2*l-1)*(2*l+1))), 0)
				}
			}
		}
	}
	minus := complexMatrix{}
	for k, v := range plus {
		minus[[2]int{k[1], k[0]}] = v // adjoint; entries are real
	}
	xa, xb := complexMatrix{}, complexMatrix{}
	for k, v := range plus {
		xa[k] += v / 2
		xb[k] += v / 2i
	}
	for k, v := range minus {
		xa[k] += v / 2
		xb[k] -= v / 2i
	}
	return realBasis(degree, n, xa), realBasis(degree, n, xb), realBasis(degree, n, z)
}

// sphereRotations are L = y x grad: L_z = d/dphi and so on.
func sphereRotations(degree int) [3]sparse {
	n := (degree + 1) * (degree + 1)
	lx, ly, lz := complexMatrix{}, complexMatrix{}, complexMatrix{}
	// Angular momentum J = -i L, with the standard phases (used above too):
	// J+- Y_l^m = sqrt(l(l+1) - m(m+-1)) Y_l^{m+-1}.
	for l := 0; l <= degree; l++ {
		for m := -l; m <= l; m++ {
			from := sphereIndex(l, m)
			lz[[2]int{from, from}] = complex(0, float64(m))
			if m+1 <= l {
				v := complex(math.Sqrt(float64(l*(l+1)-m*(m+1))), 0)
				to := sphereIndex(l, m+1)
				lx[[2]int{to, from}] += 1i * v / 2
				ly[[2]int{to, from}] += 1i * v / 2i
			}
			if m-1 >= -l {
				v := complex(math.Sqrt(float64(l*(l+1)-m*(m-1))), 0)
				to := sphereIndex(l, m-1)
				lx[[2]int{to, from}] += 1i * v / 2
				ly[[2]int{to, from}] -= 1i * v / 2i
			}
		}
	}
	return [3]sparse{realBasis(degree, n, lx), realBasis(degree, n, ly), realBasis(degree, n, lz)}
}

// realBasis transforms a real operator from complex harmonics (Condon-Shortley
// phase) to the real ones: R_{l,m} = ((-1)^m Y^m + Y^-m)/sqrt2 and R_{l,-m} =
// ((-1)^m Y^m - Y^-m)/(i sqrt2), m > 0.
func realBasis(degree, n int, m complexMatrix) sparse {
	type part struct {
		index int
		v     complex128
	}
	// Column of the complex harmonic in terms of the real ones:
	// Y^m = (-1)^m (R_m + i R_-m)/sqrt2, Y^-m = (R_m - i R_-m)/sqrt2.
	toReal := func(i int) []part {
		l := int(math.Sqrt(float64(i)))
		k := i - l*l - l
		h := complex(1/math.Sqrt2, 0)
		switch {
		case k == 0:
			return []part{{i, 1}}
		case k > 0:
			s := complex(1-2*float64(k%2), 0)
			return []part{{sphereIndex(l, k), s * h}, {sphereIndex(l, -k), s * h * 1i}}
		default:
			return []part{{sphereIndex(l, -k), h}, {sphereIndex(l, k), -h * 1i}}
		}
	}
	// Entries in order, so that sums do not depend on the map.
	keys := make([][2]int, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	sort.Slice(keys, func(i, j int) bool {
		return keys[i][0] < keys[j][0] || keys[i][0] == keys[j][0] && keys[i][1] < keys[j][1]
	})
	acc := make([]map[int]complex128, n)
	for _, k := range keys {
		v := m[k]
		// M = sum v |Y_row><Y_col|; <Y_col| brings the conjugate.
		for _, r := range toReal(k[0]) {
			for _, c := range toReal(k[1]) {
				if acc[r.index] == nil {
					acc[r.index] = map[int]complex128{}
				}
				acc[r.index][c.index] += v * r.v * complex(real(c.v), -imag(c.v))
			}
		}
	}
	out := newSparse(n)
	for r, row := range acc {
		for c := 0; c < n; c++ {
			if v, ok := row[c]; ok && math.Abs(real(v)) > 1e-15 {
				out[r] = append(out[r], entry{Col: c, V: real(v)})
			}
		}
	}
	return out
}
