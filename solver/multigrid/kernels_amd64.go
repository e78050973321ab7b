//go:build !race

package multigrid

import "golang.org/x/sys/cpu"

var hasAVX2 = cpu.X86.HasAVX2

//go:noescape
func relaxAVX2(x, b *float32, coef, nb *[]float32, pairs, n, first int)

//go:noescape
func relaxZeroAVX2(x, b *float32, n, first int)

//go:noescape
func normaliseAVX2(dst *float32, v, w *float64, n int)

//go:noescape
func residualAVX2(r, x, b, w *float32, coef, nb *[]float32, pairs, n int)

//go:noescape
func pairSumAVX2(dst, a, b *float32, n int)

//go:noescape
func spreadAVX2(f, t *float32, n int, quarter, threeQuarters float32)

//go:noescape
func blendAVX2(t, a, b *float32, n int, u, w float32)

// The functions ending in Fast do the leading part of the portable kernels of
// the same names with vector instructions, in the same order of operations and
// without fused multiplication, so the bits are the same. They return how many
// cells they did.

func relaxFast(x, b []float32, coef, nb [][]float32, first int) int {
	n := len(x) &^ 15
	if !hasAVX2 || n == 0 {
		return 0
	}
	relaxAVX2(&x[0], &b[0], &coef[0], &nb[0], len(coef)/2, n, first)
	return n
}

func residualFast(r, x, b, w []float32, coef, nb [][]float32) int {
	n := len(r) &^ 15
	if !hasAVX2 || n == 0 {
		return 0
	}
	residualAVX2(&r[0], &x[0], &b[0], &w[0], &coef[0], &nb[0], len(coef)/2, n)
	return n
}

func pairSumFast(dst, a, b []float32) int {
	n := min(len(dst), len(a)/2) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	pairSumAVX2(&dst[0], &a[0], &b[0], n)
	return n
}

// spreadFast needs readable cells on both sides of t.
func spreadFast(f, t []float32) int {
	n := len(t) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	spreadAVX2(&f[0], &t[0], n, 0.25, 0.75)
	return n
}

func blendFast(t, a, b []float32, u, w float32) int {
	n := len(t) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	blendAVX2(&t[0], &a[0], &b[0], n, u, w)
	return n
}

func relaxZeroFast(x, b []float32, first int) int {
	n := len(x) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	relaxZeroAVX2(&x[0], &b[0], n, first)
	return n
}

func normaliseFast(dst []float32, v, w []float64) int {
	n := len(dst) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	normaliseAVX2(&dst[0], &v[0], &w[0], n)
	return n
}
