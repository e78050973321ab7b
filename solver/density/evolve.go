package density

import (
	"context"
	"fmt"
	"math"
	"time"

	"epslim/solver/grid"
	"epslim/solver/multigrid"
	"epslim/solver/volume"
)

// TimeSettings steers Evolve. The zero value is usable.
type TimeSettings struct {
	// Tolerance is the largest L1 difference between one step and two half steps
	// that is accepted; 0 means 1e-4. The method is of first order, so halving
	// the tolerance reduces the error of the result by about its square root.
	Tolerance float64
	MaxSteps  int // accepted and rejected ones; 0 means 100000
}

// Snapshot is the density at one time.
type Snapshot struct {
	Time float64
	P    []float64
	Mass float64 // what absorbing sides have left
}

// Evolution is a relaxation in time.
type Evolution struct {
	Grid      *grid.Grid
	Operator  *volume.Operator
	Snapshots []Snapshot // at the times asked for that were reached
	Steps     int
	Rejected  int
	Outcome   multigrid.Outcome
	Elapsed   time.Duration
}

// Evolve solves dp/dt = -div J from the density start (in grid order, of any
// mass) and returns it at the given increasing times. The implicit Euler method
// is used, whose matrix V + tau M is an M-matrix with the column sums of V: it
// keeps positivity and mass for every step size. Steps are chosen by comparing
// one step with two of half the size; the two are kept.
func Evolve(ctx context.Context, g *grid.Grid, c volume.Coefficients, start []float64, times []float64, s Settings, ts TimeSettings) (*Evolution, error) {
	if len(start) != g.Cells() {
		return nil, fmt.Errorf("start density has %d values for %d cells", len(start), g.Cells())
	}
	for k, v := range start {
		if !(v >= 0) || math.IsInf(v, 1) {
			return nil, fmt.Errorf("start density is %g at %s", v, g.Describe(k))
		}
	}
	last := 0.0
	for i, t := range times {
		if !(t >= last) || math.IsInf(t, 1) {
			return nil, fmt.Errorf("output time %d is %g; times must be finite, not negative and increasing", i, t)
		}
		last = t
	}
	begin := time.Now()
	m, err := assemble(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	if ts.Tolerance == 0 {
		ts.Tolerance = 1e-4
	}
	if ts.MaxSteps == 0 {
		ts.MaxSteps = 100000
	}
	e := &evolver{m: m, c: c, s: s, ts: ts, volume: volumes(m), solvers: map[float64]*linear{}, out: &Evolution{Grid: g, Operator: m}}
	e.p, e.full, e.half, e.rhs = m.Layout.Vector(), m.Layout.Vector(), m.Layout.Vector(), m.Layout.Vector()
	m.Layout.Pack(e.p, start)
	err = e.run(ctx, times)
	e.out.Elapsed = time.Since(begin)
	return e.out, err
}

type evolver struct {
	m                  *volume.Operator
	c                  volume.Coefficients
	s                  Settings
	ts                 TimeSettings
	volume             []float64
	solvers            map[float64]*linear
	p, full, half, rhs []float64
	out                *Evolution
}

func (e *evolver) run(ctx context.Context, times []float64) error {
	now, level := 0.0, 4
	for _, t := range times {
		if span := t - now; span > 0 {
			clear(e.solvers)
			// The step is span/2^level; done counts steps of the present size.
			done := 0
			for done < 1<<level {
				if e.out.Steps+e.out.Rejected >= e.ts.MaxSteps {
					e.out.Outcome = multigrid.IterationLimit
					return nil
				}
				tau := span / float64(int(1)<<level)
				err, outcome, fail := e.try(ctx, tau)
				if fail != nil {
					return fail
				}
				if outcome == multigrid.Cancelled {
					e.out.Outcome = outcome
					return nil
				}
				if err > e.ts.Tolerance && level < 40 {
					e.out.Rejected++
					level++
					done *= 2
					continue
				}
				e.p, e.half = e.half, e.p
				e.out.Steps++
				done++
				e.s.progress(Progress{"time step", e.out.Steps, now + tau*float64(done)})
				if err < e.ts.Tolerance/4 && done%2 == 0 && level > 0 {
					level--
					done /= 2
				}
			}
			now = t
		}
		e.out.Snapshots = append(e.out.Snapshots, Snapshot{t, unpack(e.m.Grid, e.m, e.p), e.m.Mass(e.p)})
	}
	return nil
}

// try makes one step into full and two half steps into half and returns their
// distance.
func (e *evolver) try(ctx context.Context, tau float64) (float64, multigrid.Outcome, error) {
	o, err := e.step(ctx, e.full, e.p, tau)
	if err != nil || o == multigrid.Cancelled {
		return 0, o, err
	}
	if o, err = e.step(ctx, e.half, e.p, tau/2); err != nil || o == multigrid.Cancelled {
		return 0, o, err
	}
	mid := append([]float64(nil), e.half...)
	if o, err = e.step(ctx, e.half, mid, tau/2); err != nil || o == multigrid.Cancelled {
		return 0, o, err
	}
	var d float64
	for i, v := range e.volume {
		d += v * math.Abs(e.full[i]-e.half[i])
	}
	return d, o, nil
}

// step solves (M + V/tau) x = V p / tau.
func (e *evolver) step(ctx context.Context, x, p []float64, tau float64) (multigrid.Outcome, error) {
	sv := e.solvers[tau]
	if sv == nil {
		if len(e.solvers) >= 4 {
			clear(e.solvers)
		}
		var err error
		if sv, err = newLinear(ctx, e.m, e.c, 1/tau, false, e.s); err != nil {
			return 0, err
		}
		e.solvers[tau] = sv
	}
	for i, v := range e.volume {
		e.rhs[i] = v * p[i] / tau
		x[i] = p[i]
	}
	o, _ := sv.solve(ctx, x, e.rhs)
	if o == multigrid.IterationLimit {
		return o, fmt.Errorf("time step %g: %v", tau, o)
	}
	for i, v := range x {
		if v < 0 && e.m.Report.Monotone { // rounding of the iteration
			x[i] = 0
		}
	}
	return o, nil
}
