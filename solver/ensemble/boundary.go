package ensemble

import (
	"math"

	"epslim/solver/kernel"
)

// countLeft counts the lanes that count and were reflected.
func (r *runner) countLeft(raw []float64, q reflection) uint64 {
	n := r.random.Outside(raw, q.lo, q.hi)
	if n == 0 || r.lo == 0 && r.hi == block {
		return uint64(n)
	}
	n = 0
	for _, x := range raw[r.lo:r.hi] {
		if !(x >= q.lo && x <= q.hi) {
			n++
		}
	}
	return uint64(n)
}

// removeBlownUp marks the lanes that are not finite; r.next holds the state
// before the step. Such a lane is put back to its start and simulated on without
// being counted.
func (r *runner) removeBlownUp(t, h float64) {
	d := len(r.state)
	x := make([]float64, d)
	for lane := range block {
		for i := range x {
			x[i] = r.state[i][lane]
		}
		if finite(x) {
			continue
		}
		if r.status[lane] == alive {
			r.status[lane] = blownUp
			if lane >= r.lo && lane < r.hi {
				for i := range x {
					x[i] = r.next[i][lane]
				}
				r.events = append(r.events, Event{r.first + uint64(lane), r.p.s.Seed, t, append([]float64(nil), x...), h})
			}
		}
		for i, v := range r.p.m.Variables {
			r.state[i][lane] = v.Start
		}
	}
}

// absorb stops the lanes that have met an absorbing end during the step from t
// on. A path that is inside at both ends of the step has met an end in between
// with the probability exp(-2 a b/(sigma^2 h)) of a Brownian bridge, a and b
// being its distances from that end (E. Gobet, Stoch. Proc. Appl. 87 (2000)
// 167-197). The exit time is placed in the middle of the step.
func (r *runner) absorb(st *stepper, t float64) {
	for _, lane := range r.stopped {
		for i := range r.state {
			r.state[i][lane] = r.frozen[i][lane]
		}
	}
	for n, q := range st.absorb {
		r.random.Uniforms(&r.aux, r.uniform)
		before, after := r.next[q.variable], r.state[q.variable]
		variance := r.extra[len(st.reflect)+n]
		for lane := range block {
			if r.status[lane] != alive {
				continue
			}
			side := exitSide(before[lane]-q.lo, after[lane]-q.lo, q.hi-before[lane], q.hi-after[lane], variance[lane]*st.h, r.uniform[lane])
			if side == alive {
				continue
			}
			r.status[lane], r.exitTime[lane], r.exitVar[lane] = side, t+st.h/2, n
			r.stopped = append(r.stopped, lane)
			end := q.lo
			if side == exitUpper {
				end = q.hi
			}
			for i := range r.state {
				r.frozen[i][lane] = r.state[i][lane]
			}
			r.frozen[q.variable][lane] = end
			r.state[q.variable][lane] = end
		}
	}
}

// exitSide decides whether a step has met an end: a0, a1 are the distances from
// the lower end before and after it, b0, b1 those from the upper end.
func exitSide(a0, a1, b0, b1, variance, u float64) uint8 {
	switch {
	case a1 <= 0:
		return exitLower
	case b1 <= 0:
		return exitUpper
	case variance <= 0:
		return alive
	}
	lower, upper := 2*a0*a1/variance, 2*b0*b1/variance
	if min(lower, upper) > 40 {
		return alive
	}
	p, q := kernel.Exp(-lower), kernel.Exp(-upper)
	switch {
	case u < p:
		return exitLower
	case u < p+q:
		return exitUpper
	}
	return alive
}

// wrapState brings the periodic variables back to their domain.
func (r *runner) wrapState(st *stepper) {
	for _, w := range st.wrap {
		hi := w.lo + w.length
		for k, x := range r.state[w.variable] {
			if x >= w.lo && x < hi {
				continue
			}
			y := x - float64(w.length*math.Floor((x-w.lo)/w.length)) // not fused
			if !(y >= w.lo && y < hi) {
				y = w.lo
			}
			r.state[w.variable][k] = y
		}
	}
}
