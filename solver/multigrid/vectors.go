package multigrid

// The vector kernels of BiCGStab, fused so that every vector passes through
// the memory once. Sums run in four lanes, cell i in lane i mod 4, which are
// added in the order (0+1)+(2+3); rows are added in their order.

func lanes(s []float64) float64 { return (s[0] + s[1]) + (s[2] + s[3]) }

// scaleDots multiplies y by inv and returns y.a, y.b and y.y.
func scaleDots(y, inv, a, b []float64) (ya, yb, yy float64) {
	var s [12]float64
	for i := scaleDotsFast(y, inv, a, b, &s); i < len(y); i++ {
		v := y[i] * inv[i]
		y[i] = v
		k := i & 3
		s[k] += float64(v * a[i])
		s[4+k] += float64(v * b[i])
		s[8+k] += float64(v * v)
	}
	return lanes(s[:4]), lanes(s[4:8]), lanes(s[8:])
}

// subtract computes r -= alpha*v and returns r.r and r.h.
func subtract(r, v, h []float64, alpha float64) (rr, rh float64) {
	var s [8]float64
	for i := subtractFast(r, v, h, alpha, &s); i < len(r); i++ {
		w := r[i] - float64(alpha*v[i])
		r[i] = w
		k := i & 3
		s[k] += float64(w * w)
		s[4+k] += float64(w * h[i])
	}
	return lanes(s[:4]), lanes(s[4:])
}

// step computes x += alpha*a + omega*c, r -= omega*t, p = r + beta*(p - omega*v)
// and returns r.r and p.p.
func step(x, a, c, r, t, p, v []float64, alpha, omega, beta float64) (rr, pp float64) {
	var s [8]float64
	for i := stepFast(x, a, c, r, t, p, v, &[3]float64{alpha, omega, beta}, &s); i < len(x); i++ {
		x[i] += float64(alpha*a[i]) + float64(omega*c[i])
		q := r[i] - float64(omega*t[i])
		r[i] = q
		w := q + float64(beta*(p[i]-float64(omega*v[i])))
		p[i] = w
		k := i & 3
		s[k] += float64(q * q)
		s[4+k] += float64(w * w)
	}
	return lanes(s[:4]), lanes(s[4:])
}

// narrow writes src*scale in single precision.
func narrow(dst []float32, src []float64, scale float64) {
	for i := narrowFast(dst, src, scale); i < len(dst); i++ {
		dst[i] = float32(src[i] * scale)
	}
}

// widen writes src*scale in double precision.
func widen(dst []float64, src []float32, scale float64) {
	for i := widenFast(dst, src, scale); i < len(dst); i++ {
		dst[i] = float64(src[i]) * scale
	}
}
