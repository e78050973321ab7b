package multigrid

import (
	"math/rand/v2"
	"testing"
)

// The vector kernels give the bits of the portable ones: the portable code is
// reached by calling it one cell at a time, on rows too short for vectors.
func TestKernelBits(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	random := func(n int) []float32 {
		v := make([]float32, n)
		for i := range v {
			v[i] = rng.Float32()*2 - 1
		}
		return v
	}
	for _, n := range []int{1, 7, 16, 37, 64, 131} {
		for _, count := range []int{2, 4, 6, 8, 18} {
			x, b, w := random(n+4), random(n), random(n)
			var coef, nb, nbCopy [][]float32
			y := append([]float32(nil), x...)
			for c := 0; c < count; c++ {
				coef = append(coef, random(n))
				if c < 2 {
					nb, nbCopy = append(nb, x[1+2*c:][:n]), append(nbCopy, y[1+2*c:][:n])
				} else {
					q := random(n)
					nb, nbCopy = append(nb, q), append(nbCopy, q)
				}
			}
			for first := 0; first < 2; first++ {
				relaxRow(x[2:n+2], b, coef, nb, first)
				for i := first; i < n; i += 2 {
					y[2+i] = gather(b[i], coef, nbCopy, i)
				}
				for i := range x {
					if x[i] != y[i] {
						t.Fatalf("relax n=%d count=%d first=%d cell %d: %v, portable %v", n, count, first, i, x[i], y[i])
					}
				}
			}
			r := make([]float32, n)
			residualRow(r, x[2:n+2], b, w, coef, nb)
			for i := range r {
				if want := float32(w[i] * (gather(b[i], coef, nb, i) - x[2+i])); r[i] != want {
					t.Fatalf("residual n=%d count=%d cell %d: %v, portable %v", n, count, i, r[i], want)
				}
			}
		}
		a, b := random(n), random(n)
		dst := make([]float32, (n+1)/2)
		pairSum(dst, a, b)
		for i := range dst {
			want := a[2*i] + b[2*i]
			if 2*i+1 < n {
				want += a[2*i+1] + b[2*i+1]
			}
			if dst[i] != want {
				t.Fatalf("pairSum n=%d cell %d", n, i)
			}
		}
		ext, f := random(n+2), random(2*n)
		g := append([]float32(nil), f...)
		spreadRow(f, ext)
		for i := 0; i < n; i++ {
			lo := g[2*i] + (0.75*ext[i+1] + float32(0.25*ext[i]))
			hi := g[2*i+1] + (0.75*ext[i+1] + float32(0.25*ext[i+2]))
			if f[2*i] != lo || f[2*i+1] != hi {
				t.Fatalf("spread n=%d cell %d: %v %v, want %v %v", n, i, f[2*i], f[2*i+1], lo, hi)
			}
		}
		for first := 0; first < 2; first++ {
			z := random(n)
			relaxZero(z, a, first)
			for i := range z {
				if i&1 == first && z[i] != a[i] || i&1 != first && z[i] != 0 {
					t.Fatalf("relaxZero n=%d cell %d", n, i)
				}
			}
		}
		s := make([]float32, n)
		blendRow(s, a, b, 0.3, 0.7)
		for i := range s {
			if want := float32(float32(0.3)*a[i]) + float32(float32(0.7)*b[i]); s[i] != want {
				t.Fatalf("blend n=%d cell %d", n, i)
			}
		}
	}
}

// The double precision kernels give the bits of their definition in four lanes.
func TestVectorBits(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	random := func(n int) []float64 {
		v := make([]float64, n)
		for i := range v {
			v[i] = rng.Float64()*2 - 1
		}
		return v
	}
	clone := func(v []float64) []float64 { return append([]float64(nil), v...) }
	sum := func(n int, term func(i int) float64) float64 {
		var s [4]float64
		for i := 0; i < n; i++ {
			s[i&3] += term(i)
		}
		return (s[0] + s[1]) + (s[2] + s[3])
	}
	for _, n := range []int{1, 4, 11, 40} {
		y, inv, a, b := random(n), random(n), random(n), random(n)
		y0 := clone(y)
		ya, yb, yy := scaleDots(y, inv, a, b)
		for i := range y {
			if y[i] != y0[i]*inv[i] {
				t.Fatal("scaleDots")
			}
		}
		if ya != sum(n, func(i int) float64 { return y[i] * a[i] }) || yb != sum(n, func(i int) float64 { return y[i] * b[i] }) || yy != sum(n, func(i int) float64 { return y[i] * y[i] }) {
			t.Fatal("scaleDots sums")
		}
		r, v, h := random(n), random(n), random(n)
		r0 := clone(r)
		rr, rh := subtract(r, v, h, 0.3)
		for i := range r {
			if r[i] != r0[i]-float64(0.3*v[i]) {
				t.Fatal("subtract")
			}
		}
		if rr != sum(n, func(i int) float64 { return r[i] * r[i] }) || rh != sum(n, func(i int) float64 { return r[i] * h[i] }) {
			t.Fatal("subtract sums")
		}
		x, c, tt, p := random(n), random(n), random(n), random(n)
		x0, p0, r1 := clone(x), clone(p), clone(r)
		rr, pp := step(x, a, c, r, tt, p, v, 0.2, 0.7, 1.1)
		for i := range x {
			w := r1[i] - float64(0.7*tt[i])
			if x[i] != x0[i]+(float64(0.2*a[i])+float64(0.7*c[i])) || r[i] != w || p[i] != w+float64(1.1*(p0[i]-float64(0.7*v[i]))) {
				t.Fatal("step")
			}
		}
		if rr != sum(n, func(i int) float64 { return r[i] * r[i] }) || pp != sum(n, func(i int) float64 { return p[i] * p[i] }) {
			t.Fatal("step sums")
		}
		f, g := make([]float32, n), make([]float64, n)
		narrow(f, x, 3)
		widen(g, f, 0.25)
		for i := range f {
			if f[i] != float32(x[i]*3) || g[i] != float64(f[i])*0.25 {
				t.Fatal("narrow or widen")
			}
		}
	}
}
