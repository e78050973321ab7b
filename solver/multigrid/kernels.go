package multigrid

// relaxRow updates every second cell of a row, from first (0 or 1) on:
// x[i] = b[i] + sum_c coef[c][i]*nb[c][i]. All slices start at the first cell
// of the row; neighbours are displaced views of x.
func relaxRow(x, b []float32, coef, nb [][]float32, first int) {
	n := len(x)
	switch len(coef) {
	case 4:
		b = b[:n]
		c0, c1, c2, c3 := coef[0][:n], coef[1][:n], coef[2][:n], coef[3][:n]
		x0, x1, x2, x3 := nb[0][:n], nb[1][:n], nb[2][:n], nb[3][:n]
		for i := first; i < n; i += 2 {
			x[i] = b[i] + (float32(c0[i]*x0[i]) + float32(c1[i]*x1[i])) + (float32(c2[i]*x2[i]) + float32(c3[i]*x3[i]))
		}
	case 6:
		b = b[:n]
		c0, c1, c2, c3, c4, c5 := coef[0][:n], coef[1][:n], coef[2][:n], coef[3][:n], coef[4][:n], coef[5][:n]
		x0, x1, x2, x3, x4, x5 := nb[0][:n], nb[1][:n], nb[2][:n], nb[3][:n], nb[4][:n], nb[5][:n]
		for i := first; i < n; i += 2 {
			x[i] = b[i] + (float32(c0[i]*x0[i]) + float32(c1[i]*x1[i])) + (float32(c2[i]*x2[i]) + float32(c3[i]*x3[i])) + (float32(c4[i]*x4[i]) + float32(c5[i]*x5[i]))
		}
	default:
		for i := first; i < n; i += 2 {
			s := b[i]
			for c := 0; c+1 < len(coef); c += 2 {
				s += float32(coef[c][i]*nb[c][i]) + float32(coef[c+1][i]*nb[c+1][i])
			}
			x[i] = s
		}
	}
}

// residualRow writes w[i]*(b[i] + sum_c coef[c][i]*nb[c][i] - x[i]).
func residualRow(r, x, b, w []float32, coef, nb [][]float32) {
	n := len(r)
	x, b, w = x[:n], b[:n], w[:n]
	switch len(coef) {
	case 4:
		c0, c1, c2, c3 := coef[0][:n], coef[1][:n], coef[2][:n], coef[3][:n]
		x0, x1, x2, x3 := nb[0][:n], nb[1][:n], nb[2][:n], nb[3][:n]
		for i := range r {
			s := b[i] + (float32(c0[i]*x0[i]) + float32(c1[i]*x1[i])) + (float32(c2[i]*x2[i]) + float32(c3[i]*x3[i]))
			r[i] = float32(w[i] * (s - x[i]))
		}
	case 6:
		c0, c1, c2, c3, c4, c5 := coef[0][:n], coef[1][:n], coef[2][:n], coef[3][:n], coef[4][:n], coef[5][:n]
		x0, x1, x2, x3, x4, x5 := nb[0][:n], nb[1][:n], nb[2][:n], nb[3][:n], nb[4][:n], nb[5][:n]
		for i := range r {
			s := b[i] + (float32(c0[i]*x0[i]) + float32(c1[i]*x1[i])) + (float32(c2[i]*x2[i]) + float32(c3[i]*x3[i])) + (float32(c4[i]*x4[i]) + float32(c5[i]*x5[i]))
			r[i] = float32(w[i] * (s - x[i]))
		}
	default:
		for i := range r {
			s := b[i]
			for c := 0; c+1 < len(coef); c += 2 {
				s += float32(coef[c][i]*nb[c][i]) + float32(coef[c+1][i]*nb[c+1][i])
			}
			r[i] = float32(w[i] * (s - x[i]))
		}
	}
}
