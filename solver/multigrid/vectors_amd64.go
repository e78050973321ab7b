//go:build !race

package multigrid

//go:noescape
func scaleDotsAVX2(y, inv, a, b *float64, n int, sums *[12]float64)

//go:noescape
func subtractAVX2(r, v, h *float64, alpha float64, n int, sums *[8]float64)

//go:noescape
func stepAVX2(ptr *[7]*float64, coef *[3]float64, n int, sums *[8]float64)

//go:noescape
func narrowAVX2(dst *float32, src *float64, scale float64, n int)

//go:noescape
func widenAVX2(dst *float64, src *float32, scale float64, n int)

// The fast variants do the leading cells of the portable kernels with the same
// four lanes of sums and return how many they did.
func scaleDotsFast(y, inv, a, b []float64, sums *[12]float64) int {
	n := len(y) &^ 3
	if !hasAVX2 || n == 0 {
		return 0
	}
	scaleDotsAVX2(&y[0], &inv[0], &a[0], &b[0], n, sums)
	return n
}

func subtractFast(r, v, h []float64, alpha float64, sums *[8]float64) int {
	n := len(r) &^ 3
	if !hasAVX2 || n == 0 {
		return 0
	}
	subtractAVX2(&r[0], &v[0], &h[0], alpha, n, sums)
	return n
}

func stepFast(x, a, c, r, t, p, v []float64, coef *[3]float64, sums *[8]float64) int {
	n := len(x) &^ 3
	if !hasAVX2 || n == 0 {
		return 0
	}
	stepAVX2(&[7]*float64{&x[0], &a[0], &c[0], &r[0], &t[0], &p[0], &v[0]}, coef, n, sums)
	return n
}

func narrowFast(dst []float32, src []float64, scale float64) int {
	n := len(dst) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	narrowAVX2(&dst[0], &src[0], scale, n)
	return n
}

func widenFast(dst []float64, src []float32, scale float64) int {
	n := len(dst) &^ 7
	if !hasAVX2 || n == 0 {
		return 0
	}
	widenAVX2(&dst[0], &src[0], scale, n)
	return n
}
