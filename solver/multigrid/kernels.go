package multigrid

// relaxRow updates every second cell of a row, from first (0 or 1) on:
// x[i] = b[i] + sum_c coef[c][i]*nb[c][i]. All slices start at the first cell
// of the row; neighbours are displaced views of x. Their number is even.
func relaxRow(x, b []float32, coef, nb [][]float32, first int) {
	for i := relaxFast(x, b, coef, nb, first) + first; i < len(x); i += 2 {
		x[i] = gather(b[i], coef, nb, i)
	}
}

// gather adds the neighbours of cell i in pairs.
func gather(s float32, coef, nb [][]float32, i int) float32 {
	for c := 0; c+1 < len(coef); c += 2 {
		s += float32(coef[c][i]*nb[c][i]) + float32(coef[c+1][i]*nb[c+1][i])
	}
	return s
}

// residualRow writes w[i]*(b[i] + sum_c coef[c][i]*nb[c][i] - x[i]).
func residualRow(r, x, b, w []float32, coef, nb [][]float32) {
	for i := residualFast(r, x, b, w, coef, nb); i < len(r); i++ {
		r[i] = float32(w[i] * (gather(b[i], coef, nb, i) - x[i]))
	}
}

// pairSum adds two rows and then neighbouring cells in pairs; an odd last cell
// stays alone.
func pairSum(dst, a, b []float32) {
	n := len(a)
	for i := pairSumFast(dst, a, b); i < len(dst); i++ {
		dst[i] = a[2*i] + b[2*i]
		if 2*i+1 < n {
			dst[i] += a[2*i+1] + b[2*i+1]
		}
	}
}

// spreadRow interpolates t, which lies within a longer slice with one more
// value at either end, to pairs of cells a quarter of the distance from the
// coarse centre, and adds that to f.
func spreadRow(f []float32, ext []float32) {
	t := ext[1 : len(ext)-1]
	for i := spreadFast(f, t); i < len(t); i++ {
		m := 0.75 * ext[i+1]
		f[2*i] += m + float32(0.25*ext[i])
		f[2*i+1] += m + float32(0.25*ext[i+2])
	}
}

// blendRow writes u*a + w*b.
func blendRow(t, a, b []float32, u, w float32) {
	for i := blendFast(t, a, b, u, w); i < len(t); i++ {
		t[i] = float32(u*a[i]) + float32(w*b[i])
	}
}

// relaxZero is relaxRow for neighbours that are all zero; the cells of the other
// colour become zero.
func relaxZero(x, b []float32, first int) {
	for i := relaxZeroFast(x, b, first); i < len(x); i++ {
		x[i] = 0
		if i&1 == first {
			x[i] = b[i]
		}
	}
}

// normaliseRow writes v*w in single precision.
func normaliseRow(dst []float32, v, w []float64) {
	for i := normaliseFast(dst, v, w); i < len(dst); i++ {
		dst[i] = float32(v[i] * w[i])
	}
}
