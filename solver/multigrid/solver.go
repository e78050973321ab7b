package multigrid

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"epslim/solver/volume"
)

// Outcome says how a solve ended.
type Outcome int

// The outcomes.
const (
	Converged      Outcome = iota // the residual is below the tolerance
	Stagnated                     // rounding or the method allows no further reduction
	IterationLimit                // stopped at the largest number of iterations
	Cancelled                     // stopped by the context; the last iterate is kept
	Metastable                    // the residual is small but the weights of parts that hardly exchange mass have not settled
)

var outcomes = [...]struct {
	name   string
	usable bool // the result may be used, its residual says how well
}{
	Converged:      {"converged", true},
	Stagnated:      {"no further reduction of the residual possible", true},
	IterationLimit: {"stopped at the iteration limit", false},
	Cancelled:      {"interrupted; the last iterate is kept", false},
	Metastable:     {"the weights of parts that hardly exchange mass have not settled", false},
}

// String returns a sentence fragment for reports.
func (o Outcome) String() string {
	if o < 0 || int(o) >= len(outcomes) {
		return fmt.Sprintf("Outcome(%d)", int(o))
	}
	return outcomes[o].name
}

// Smoother selects what damps the short waves.
type Smoother int

// The smoothers.
const (
	Auto  Smoother = iota // Point first, Line when convergence is slow
	Point                 // Gauss-Seidel in colours
	Line                  // zebra line Gauss-Seidel along every axis
)

// String names the smoother in reports.
func (s Smoother) String() string { return [...]string{"auto", "point", "line"}[s] }

// Settings steers a solve. The zero value is usable.
type Settings struct {
	Tolerance     float64 // on the scaled residual: |D^-1 M p|/|p| for stationary problems, |D^-1 r|/|D^-1 b| for others, D the diagonal; 0 means 1e-14 for stationary problems, 1e-12 for others
	MaxIterations int     // of BiCGStab, two cycles each; 0 means 200
	Smoother      Smoother
	Progress      func(iteration int, residual float64) // called after every iteration; may be nil
}

// Stats is the diagnosis of a solve.
type Stats struct {
	Outcome    Outcome
	Iterations int       // BiCGStab iterations, all smoothers together
	Residual   float64   // scaled residual at the end, computed anew
	Start      float64   // scaled residual of the first guess
	History    []float64 // after every iteration
	Smoother   Smoother  // the one in use at the end
	Levels     int
	// WeightChange is the L1 change of the weights of blocks of cells in the last
	// aggregation step, an estimate of the error that a small residual hides
	// when parts of the density hardly exchange mass.
	WeightChange float64
	Setup        time.Duration // coarse operators and first guess
	Solve        time.Duration
}

// Solver holds the hierarchy for one operator and one shift.
type Solver struct {
	m        *volume.Operator
	h        *hierarchy
	kind     cycleKind
	settings Settings
	inv      []float64 // 1/diagonal
	setup    time.Duration
	work     [7][]float64
	part     []float64
}

// slowAfter is the number of point-smoothed iterations after which Auto looks
// whether lines would be better.
const slowAfter = 4

// New builds the hierarchy for M + shift V, or its transpose. The coefficients
// are evaluated on every coarse grid. In the singular case (shift zero and no
// absorbing side) it returns a *volume.ReducibleError when the stationary
// density is not unique.
func New(ctx context.Context, m *volume.Operator, c volume.Coefficients, shift float64, adjoint bool, s Settings) (*Solver, error) {
	if shift < 0 {
		return nil, fmt.Errorf("multigrid: negative shift %g", shift)
	}
	start := time.Now()
	if shift == 0 && m.Kill == nil {
		if adjoint {
			return nil, errors.New("multigrid: the transposed problem without shift or absorbing side is singular")
		}
		if _, err := volume.SingleClass(m); err != nil {
			return nil, err
		}
	}
	kind := pointCycle(m.Grid)
	if s.Smoother == Line {
		kind = lineCycle
	}
	h, err := newHierarchy(ctx, m, c, shift, adjoint, kind)
	if err != nil {
		return nil, err
	}
	sv := &Solver{m: m, h: h, kind: kind, settings: s}
	l := h.levels[0]
	sv.inv = l.scale
	for i, v := range sv.inv {
		if v > 0 {
			sv.inv[i] = 1 / v
		}
	}
	l.scale = nil
	copy(sv.work[:], volume.Block64(len(sv.work), m.Layout.Len))
	sv.part = make([]float64, 3*m.Layout.Rows)
	sv.setup = time.Since(start)
	return sv, nil
}

// Stationary solves M p = 0 from the first guess of the full multigrid pass. The result is scaled
// to mass one.
func (s *Solver) Stationary(ctx context.Context) ([]float64, Stats) {
	p := s.m.Layout.Vector()
	for r := 0; r < s.m.Layout.Rows; r++ {
		x := s.h.levels[0].x[s.m.Layout.Row(r):][:s.m.Layout.Nx]
		dst := s.row(p, r)
		for i, v := range x {
			dst[i] = float64(v)
		}
	}
	tol := s.settings.Tolerance
	if tol == 0 {
		tol = 1e-14
	}
	st := s.iterate(ctx, p, nil, tol)
	if s.m.Report.Monotone {
		volume.Positive(s.m, p)
		s.weigh(ctx, p, tol, &st)
	}
	mass := s.m.Mass(p)
	for i := range p {
		p[i] /= mass
	}
	return p, st
}

// weighRounds bounds the number of aggregation steps.
const weighRounds = 12

// weighTolerance is the L1 change of the block weights below which they count
// as settled; weighLimit the one above which they are not known.
const (
	weighTolerance = 1e-10
	weighLimit     = 1e-6
)

// weigh alternates aggregation with further iterations until the weights of
// the blocks stay. For densities that hang together the first step changes
// nothing and costs about a sweep.
func (s *Solver) weigh(ctx context.Context, p []float64, tol float64, st *Stats) {
	keep := append([]float64(nil), p...)
	for round := 0; round < weighRounds && st.Outcome != Cancelled && st.Outcome != IterationLimit && ctx.Err() == nil; round++ {
		copy(keep, p)
		change, err := volume.Rebalance(s.m, p)
		if err != nil || math.IsNaN(change) {
			copy(p, keep)
			return
		}
		st.WeightChange = change
		if change < weighTolerance {
			copy(p, keep)
			return
		}
		more := s.iterate(ctx, p, nil, tol)
		volume.Positive(s.m, p)
		st.Iterations += more.Iterations
		st.History = append(st.History, more.History...)
		st.Residual, st.Outcome = more.Residual, more.Outcome
		st.Solve += more.Solve
	}
	if st.WeightChange > weighLimit && st.Outcome == Converged {
		st.Outcome = Metastable
	}
}

// Solve improves x until (M + shift V) x = b, or the transposed system, holds to the
// tolerance relative to the scaled right-hand side.
func (s *Solver) Solve(ctx context.Context, x, b []float64) Stats {
	tol := s.settings.Tolerance
	if tol == 0 {
		tol = 1e-12
	}
	if s.scaledNorm(b) == 0 {
		clear(x)
		return Stats{Levels: len(s.h.levels)}
	}
	return s.iterate(ctx, x, b, tol)
}
