package multigrid

import (
	"context"
	"math"
	"time"
)

// rowSums adds up the triples that body returns for every row, in the order of
// the rows, whatever the number of workers.
func (s *Solver) rowSums(body func(r int) (a, b, c float64)) (a, b, c float64) {
	s.m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			s.part[3*r], s.part[3*r+1], s.part[3*r+2] = body(r)
		}
	})
	for r := 0; r < s.m.Layout.Rows; r++ {
		a += s.part[3*r]
		b += s.part[3*r+1]
		c += s.part[3*r+2]
	}
	return a, b, c
}

func (s *Solver) row(v []float64, r int) []float64 {
	return v[s.m.Layout.Row(r):][:s.m.Layout.Nx]
}

// norm returns |v|.
func (s *Solver) norm(v []float64) float64 {
	t, _, _ := s.rowSums(func(r int) (float64, float64, float64) {
		a := s.row(v, r)
		rr, _ := subtract(a, a, a, 0)
		return rr, 0, 0
	})
	return math.Sqrt(t)
}

// scaledNorm returns |D^-1 b|.
func (s *Solver) scaledNorm(b []float64) float64 {
	t, _, _ := s.rowSums(func(r int) (float64, float64, float64) {
		var t float64
		inv := s.row(s.inv, r)
		for i, v := range s.row(b, r) {
			w := v * inv[i]
			t += float64(w * w)
		}
		return t, 0, 0
	})
	return math.Sqrt(t)
}

// apply computes y = D^-1 A x and returns y.a, y.b and y.y.
func (s *Solver) apply(y, x, a, b []float64) (ya, yb, yy float64) {
	s.m.WrapAll(x)
	return s.rowSums(func(r int) (float64, float64, float64) {
		if s.h.adjoint {
			s.m.ApplyAdjointRow(y, x, r, s.h.shift)
		} else {
			s.m.ApplyRow(y, x, r, s.h.shift)
		}
		return scaleDots(s.row(y, r), s.row(s.inv, r), s.row(a, r), s.row(b, r))
	})
}

// residual writes D^-1 (b - A x) and returns its norm; b nil stands for zero.
func (s *Solver) residual(r, x, b []float64) float64 {
	s.apply(r, x, x, x)
	t, _, _ := s.rowSums(func(q int) (float64, float64, float64) {
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
		t, _ := subtract(rr, rr, rr, 0)
		return t, 0, 0
	})
	return math.Sqrt(t)
}

// precondition writes the result of one cycle on r, whose norm must be known.
func (s *Solver) precondition(z, r []float64, norm float64) {
	l := s.h.levels[0]
	n := s.m.Layout.Nx
	up := math.Sqrt(float64(s.m.Grid.Cells())) / norm
	s.m.Each(func(_, lo, hi int) {
		for q := lo; q < hi; q++ {
			narrow(l.b[s.m.Layout.Row(q):][:n], s.row(r, q), up)
		}
	})
	s.h.cycle(0, l.x, l.b, s.kind, true)
	s.m.Each(func(_, lo, hi int) {
		for q := lo; q < hi; q++ {
			widen(s.row(z, q), l.x[s.m.Layout.Row(q):][:n], 1/up)
		}
	})
}

// iterate runs BiCGStab (van der Vorst, SIAM J. Sci. Stat. Comput. 13 (1992)
// 631-644), preconditioned from the right, restarting from the true residual
// after a breakdown, a change of the smoother or when the recursive residual
// has drifted.
func (s *Solver) iterate(ctx context.Context, x, b []float64, rel float64) Stats {
	start := time.Now()
	st := Stats{Levels: len(s.h.levels), Setup: s.setup}
	limit := s.settings.MaxIterations
	if limit == 0 {
		limit = 200
	}
	// The scale of the residual: of the right-hand side, or of the solution of
	// the homogeneous problem, which may shrink on the way from a bad guess.
	scale := func() float64 {
		if b != nil {
			return s.scaledNorm(b)
		}
		return s.norm(x)
	}
	r := s.work[0]
	norm, unit := s.residual(r, x, b), scale()
	st.Start = norm / unit
	tol := rel * unit
	best, futile := norm, 0
	for norm > tol && st.Iterations < limit && ctx.Err() == nil && futile < 3 {
		s.bicgstab(ctx, x, r, tol, unit, limit, &st)
		norm, unit = s.residual(r, x, b), scale()
		tol = rel * unit
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
	norm := s.norm(r)
	pNorm := norm
	first, firstNorm := st.Iterations, norm
	rho := norm * norm
	for st.Iterations < limit && ctx.Err() == nil {
		s.precondition(ph, p, pNorm)
		denom, _, _ := s.apply(v, ph, shadow, shadow)
		alpha := rho / denom
		if !finite(alpha) {
			return
		}
		ss, sh0, _ := s.rowSums(func(q int) (float64, float64, float64) {
			a, b := subtract(s.row(r, q), s.row(v, q), s.row(shadow, q), alpha)
			return a, b, 0
		})
		sNorm := math.Sqrt(ss)
		if math.IsNaN(sNorm) {
			return
		}
		if sNorm <= tol {
			s.m.Each(func(_, lo, hi int) {
				for q := lo; q < hi; q++ {
					subtract(s.row(x, q), s.row(ph, q), s.row(ph, q), -alpha)
				}
			})
			s.note(st, sNorm/unit)
			return
		}
		s.precondition(sh, r, sNorm)
		ts, th, tt := s.apply(t, sh, r, shadow)
		omega := ts / tt
		newRho := sh0 - omega*th
		beta := newRho / rho * alpha / omega
		if !finite(omega) || !finite(beta) {
			return
		}
		rr, pp, _ := s.rowSums(func(q int) (float64, float64, float64) {
			a, b := step(s.row(x, q), s.row(ph, q), s.row(sh, q), s.row(r, q), s.row(t, q), s.row(p, q), s.row(v, q), alpha, omega, beta)
			return a, b, 0
		})
		norm, pNorm, rho = math.Sqrt(rr), math.Sqrt(pp), newRho
		s.note(st, norm/unit)
		if norm <= tol || !finite(norm) || rho == 0 || norm > 1e3*firstNorm {
			return
		}
		if s.slow(st.Iterations-first, norm/firstNorm, tol/firstNorm) {
			s.kind = lineCycle
			return
		}
	}
}

func finite(v float64) bool { return v-v == 0 }

func (s *Solver) note(st *Stats, residual float64) {
	st.Iterations++
	st.History = append(st.History, residual)
	if s.settings.Progress != nil {
		s.settings.Progress(st.Iterations, residual)
	}
}

// slow decides whether to leave the point smoother: when at the rate measured
// so far more than twice as many iterations again would be needed.
func (s *Solver) slow(done int, reduction, goal float64) bool {
	if s.settings.Smoother != Auto || s.kind.line || done < slowAfter {
		return false
	}
	if reduction >= 1 {
		return true
	}
	need := math.Log(goal) / math.Log(reduction) * float64(done)
	return need-float64(done) > 2*slowAfter
}
