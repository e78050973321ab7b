package multigrid

import (
	"context"
	"math"
	"time"
)

// rowSum adds up what body returns for every row, in the order of the rows,
// whatever the number of workers.
func (s *Solver) rowSum(body func(r int) float64) float64 {
	s.m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			s.part[r] = body(r)
		}
	})
	var t float64
	for _, v := range s.part[:s.m.Layout.Rows] {
		t += v
	}
	return t
}

func dotRow(a, b []float64) float64 {
	b = b[:len(a)]
	var s0, s1, s2, s3 float64
	i := 0
	for ; i+4 <= len(a); i += 4 {
		s0 += float64(a[i] * b[i])
		s1 += float64(a[i+1] * b[i+1])
		s2 += float64(a[i+2] * b[i+2])
		s3 += float64(a[i+3] * b[i+3])
	}
	for ; i < len(a); i++ {
		s0 += float64(a[i] * b[i])
	}
	return (s0 + s1) + (s2 + s3)
}

func (s *Solver) row(v []float64, r int) []float64 {
	return v[s.m.Layout.Row(r):][:s.m.Layout.Nx]
}

func (s *Solver) dot(a, b []float64) float64 {
	return s.rowSum(func(r int) float64 { return dotRow(s.row(a, r), s.row(b, r)) })
}

// scaledNorm returns |D^-1 b|.
func (s *Solver) scaledNorm(b []float64) float64 {
	return math.Sqrt(s.rowSum(func(r int) float64 {
		var t float64
		inv := s.row(s.inv, r)
		for i, v := range s.row(b, r) {
			w := v * inv[i]
			t += w * w
		}
		return t
	}))
}

// apply computes y = D^-1 A x for an unscaled x.
func (s *Solver) apply(y, x []float64) {
	if s.h.adjoint {
		s.m.ApplyAdjoint(y, x, s.h.shift)
	} else {
		s.m.Apply(y, x, s.h.shift)
	}
	s.m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			inv := s.row(s.inv, r)
			yy := s.row(y, r)
			for i := range yy {
				yy[i] *= inv[i]
			}
		}
	})
}

// residual writes D^-1 (b - A x) and returns its norm; b nil stands for zero.
func (s *Solver) residual(r, x, b []float64) float64 {
	s.apply(r, x)
	return math.Sqrt(s.rowSum(func(q int) float64 {
		rr := s.row(r, q)
		if b == nil {
			for i := range rr {
				rr[i] = -rr[i]
			}
		} else {
			inv, bb := s.row(s.inv, q), s.row(b, q)
			for i := range rr {
				rr[i] = float64(bb[i]*inv[i]) - rr[i]
			}
		}
		return dotRow(rr, rr)
	}))
}

// precondition writes the result of one cycle on r.
func (s *Solver) precondition(z, r []float64, norm float64) {
	l := s.h.levels[0]
	n := s.m.Layout.Nx
	up := math.Sqrt(float64(s.m.Grid.Cells())) / norm
	s.m.Each(func(_, lo, hi int) {
		for q := lo; q < hi; q++ {
			b := l.b[s.m.Layout.Row(q):][:n]
			for i, v := range s.row(r, q) {
				b[i] = float32(v * up)
			}
		}
	})
	s.h.cycle(0, l.x, l.b, s.kind, true)
	down := 1 / up
	s.m.Each(func(_, lo, hi int) {
		for q := lo; q < hi; q++ {
			x, zz := l.x[s.m.Layout.Row(q):][:n], s.row(z, q)
			for i := range zz {
				zz[i] = float64(x[i]) * down
			}
		}
	})
}

// iterate runs BiCGStab (van der Vorst, SIAM J. Sci. Stat. Comput. 13 (1992)
// 631-644), preconditioned from the right, restarting from the true residual
// after a breakdown, a change of the smoother or when the recursive residual
// has drifted.
func (s *Solver) iterate(ctx context.Context, x, b []float64, tol, unit float64) Stats {
	start := time.Now()
	st := Stats{Levels: len(s.h.levels), Setup: s.setup}
	limit := s.settings.MaxIterations
	if limit == 0 {
		limit = 200
	}
	r := s.work[0]
	norm := s.residual(r, x, b)
	st.Start = norm / unit
	best, futile := norm, 0
	for norm > tol && st.Iterations < limit && ctx.Err() == nil && futile < 3 {
		s.bicgstab(ctx, x, r, tol, unit, limit, &st)
		norm = s.residual(r, x, b)
		if norm < 0.5*best {
			best, futile = norm, 0
		} else {
			futile++
		}
	}
	st.Residual = norm / unit
	switch {
	case norm <= tol:
		st.Outcome = Converged
	case ctx.Err() != nil:
		st.Outcome = Cancelled
	case futile >= 3 && st.Residual < 1e-9:
		st.Outcome = Stagnated
	default:
		st.Outcome = IterationLimit
	}
	st.Smoother = Point
	if s.kind.line {
		st.Smoother = Line
	}
	st.Solve = time.Since(start)
	return st
}

// bicgstab adds corrections to x until the recursive residual r is below tol or
// a restart is due.
func (s *Solver) bicgstab(ctx context.Context, x, r []float64, tol, unit float64, limit int, st *Stats) {
	shadow, p, v, t, ph, sh := s.work[1], s.work[2], s.work[3], s.work[4], s.work[5], s.work[6]
	copy(shadow, r)
	copy(p, r)
	norm := math.Sqrt(s.dot(r, r))
	first, firstNorm := st.Iterations, norm
	rho := norm * norm
	for st.Iterations < limit && ctx.Err() == nil {
		s.precondition(ph, p, math.Sqrt(s.dot(p, p)))
		s.apply(v, ph)
		denom := s.dot(shadow, v)
		if denom == 0 || math.IsNaN(denom) {
			return
		}
		alpha := rho / denom
		sNorm := math.Sqrt(s.rowSum(func(q int) float64 {
			rr, vv := s.row(r, q), s.row(v, q)
			for i := range rr {
				rr[i] -= float64(alpha * vv[i])
			}
			return dotRow(rr, rr)
		}))
		if math.IsNaN(sNorm) {
			return
		}
		if sNorm <= tol {
			s.each(func(q int) {
				xx, a := s.row(x, q), s.row(ph, q)
				for i := range xx {
					xx[i] += float64(alpha * a[i])
				}
			})
			s.note(st, sNorm/unit)
			return
		}
		s.precondition(sh, r, sNorm)
		s.apply(t, sh)
		tt, ts, st0 := s.dot(t, t), s.dot(t, r), s.dot(shadow, t)
		if tt == 0 || math.IsNaN(tt) {
			return
		}
		omega := ts / tt
		newRho := s.dot(shadow, r) - omega*st0
		beta := newRho / rho * alpha / omega
		norm = math.Sqrt(s.rowSum(func(q int) float64 {
			xx, a, c, rr, tt, pp, vv := s.row(x, q), s.row(ph, q), s.row(sh, q), s.row(r, q), s.row(t, q), s.row(p, q), s.row(v, q)
			for i := range xx {
				xx[i] += float64(alpha*a[i]) + float64(omega*c[i])
				rr[i] -= float64(omega * tt[i])
				pp[i] = rr[i] + float64(beta*(pp[i]-float64(omega*vv[i])))
			}
			return dotRow(rr, rr)
		}))
		rho = newRho
		s.note(st, norm/unit)
		if norm <= tol || math.IsNaN(norm) || rho == 0 || omega == 0 {
			return
		}
		if s.slow(st.Iterations-first, norm/firstNorm, tol/firstNorm) {
			s.kind = cycleKind{line: true, gamma: 2}
			return
		}
		if norm > 1e3*firstNorm {
			return
		}
	}
}

func (s *Solver) each(body func(r int)) {
	s.m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			body(r)
		}
	})
}

func (s *Solver) note(st *Stats, residual float64) {
	st.Iterations++
	st.History = append(st.History, residual)
	if s.settings.Progress != nil {
		s.settings.Progress(st.Iterations, residual)
	}
}

// slow decides whether to leave the point smoother: when at the rate measured
// so far more than as many iterations again would be needed.
func (s *Solver) slow(done int, reduction, goal float64) bool {
	if s.settings.Smoother != Auto || s.kind.line || done < slowAfter {
		return false
	}
	if reduction >= 1 {
		return true
	}
	need := math.Log(goal) / math.Log(reduction) * float64(done)
	return need-float64(done) > slowAfter
}
