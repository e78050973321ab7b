package density

import (
	"context"
	"fmt"
	"os"
	"strconv"
	"strings"
	"time"

	"epslim/solver/grid"
	"epslim/solver/multigrid"
	"epslim/solver/volume"
)

// Method selects the linear solver.
type Method int

// The methods.
const (
	Auto      Method = iota // Direct in one dimension, on small grids and where Multigrid fails; else Multigrid
	Direct                  // elimination without subtractions
	Multigrid               // BiCGStab preconditioned by multigrid
)

// String returns the name used in reports.
func (m Method) String() string {
	return [...]string{"automatic", "direct elimination", "multigrid"}[m]
}

// Settings steers all computations of this package. The zero value is usable.
type Settings struct {
	Workers       int   // goroutines; 0 means one a processor. No result depends on it.
	MemoryLimit   int64 // bytes; 0 means what the machine reports as available, negative means none
	Method        Method
	Smoother      multigrid.Smoother
	Tolerance     float64 // of the scaled residual; 0 means the default of multigrid.Settings
	MaxIterations int     // 0 means the default of multigrid.Settings
	Progress      func(Progress)

	// Window marks the sides that stand in for infinity: Window[d][0] the
	// lower, Window[d][1] the upper side of axis d. If the density there is not
	// negligible Stationary returns a *WindowError with the result.
	Window [grid.MaxDim][2]bool
	// WindowTolerance is the largest value of density at the side times length
	// of the axis that counts as negligible; 0 means 1e-6.
	WindowTolerance float64
}

// Progress reports on a long computation.
type Progress struct {
	Stage     string  // "coefficients", "solve", "time step"
	Iteration int     // or time step
	Residual  float64 // or present time
}

func (s Settings) progress(p Progress) {
	if s.Progress != nil {
		s.Progress(p)
	}
}

// Result is a stationary density and how it was found.
type Result struct {
	Grid       *grid.Grid
	P          []float64 // density in every cell, first axis fastest, of mass one
	Operator   *volume.Operator
	Method     Method
	Outcome    multigrid.Outcome
	Residual   float64 // |D^-1 M p / q|/sqrt(cells): relative residual of a cell, q the size of p
	Start      float64 // the same for the first guess
	Iterations int
	Levels     int
	Smoother   multigrid.Smoother
	History    []float64
	Transient  int // cells outside the recurrent class, where the density is zero
	Assembly   time.Duration
	Setup      time.Duration // coarse grids and first guess
	Solve      time.Duration
	padded     []float64
}

// Seconds returns the time of assembly and solution together.
func (r *Result) Seconds() float64 { return (r.Assembly + r.Setup + r.Solve).Seconds() }

// AbsorbingError reports a domain that loses all mass.
type AbsorbingError struct{ Sides []string }

func (e *AbsorbingError) Error() string {
	return fmt.Sprintf("no stationary density: the absorbing side at %s takes all the mass in the end", strings.Join(e.Sides, " and "))
}

// WindowError reports a window that cuts the mass.
type WindowError struct {
	Axis  string
	Side  string  // "lower" or "upper"
	At    float64 // place of the side
	Value float64 // density of the marginal at the side times length of the axis
}

func (e *WindowError) Error() string {
	return fmt.Sprintf("the window cuts the mass: at the %s side %s=%.6g the marginal density times the length of the window is %.2g; widen the window", e.Side, e.Axis, e.At, e.Value)
}

// directFlops is the work up to which elimination is at least as fast as
// multigrid.
const directFlops = 4e7

// Memory returns the bytes that Stationary takes on g with multigrid.
func Memory(g *grid.Grid, diagonal bool) int64 {
	d := int64(g.Dim())
	links := d
	if !diagonal {
		links += d * (d - 1)
	}
	solve := 16*links + 10*8 + (8*links+20)*4/3 + 8
	return max(solve*int64(g.Cells()), volume.Memory(g, diagonal))
}

// AvailableMemory returns the bytes the machine reports as available, or zero
// when it does not say.
func AvailableMemory() int64 {
	text, err := os.ReadFile("/proc/meminfo")
	if err != nil {
		return 0
	}
	for _, line := range strings.Split(string(text), "\n") {
		if f := strings.Fields(line); len(f) >= 2 && f[0] == "MemAvailable:" {
			kb, err := strconv.ParseInt(f[1], 10, 64)
			if err != nil {
				return 0
			}
			return kb << 10
		}
	}
	return 0
}

func (s Settings) memoryLimit() int64 {
	switch {
	case s.MemoryLimit < 0:
		return 0
	case s.MemoryLimit == 0:
		return AvailableMemory()
	}
	return s.MemoryLimit
}

// assemble checks the memory and builds the operator.
func assemble(ctx context.Context, g *grid.Grid, c volume.Coefficients, s Settings) (*volume.Operator, error) {
	if limit := s.memoryLimit(); limit > 0 {
		if need := Memory(g, true); need > limit {
			return nil, &volume.MemoryError{Cells: g.Cells(), Need: need, Limit: limit}
		}
	}
	s.progress(Progress{Stage: "coefficients"})
	return volume.Assemble(ctx, g, c, volume.Settings{Workers: s.Workers, MemoryLimit: s.memoryLimit()})
}

func (s Settings) multigrid() multigrid.Settings {
	ms := multigrid.Settings{Tolerance: s.Tolerance, MaxIterations: s.MaxIterations, Smoother: s.Smoother}
	if s.Progress != nil {
		ms.Progress = func(it int, res float64) { s.Progress(Progress{"solve", it, res}) }
	}
	return ms
}

func (s Settings) useDirect(m *volume.Operator) bool {
	if s.Method != Auto {
		return s.Method == Direct
	}
	flops, _ := volume.EliminationCost(m)
	return m.Grid.Dim() == 1 || flops < directFlops
}

// Stationary computes the stationary density of dX = f dt + sigma dW on g.
//
// Errors: *volume.CoefficientError, *volume.MemoryError, *AbsorbingError,
// *volume.ReducibleError (several recurrent classes), *WindowError (with the
// result), or the error of the context when it was cancelled before there was
// anything to keep. A solve that was interrupted later or did not converge is
// not an error: see Result.Outcome.
func Stationary(ctx context.Context, g *grid.Grid, c volume.Coefficients, s Settings) (*Result, error) {
	if err := absorbingSides(g); err != nil {
		return nil, err
	}
	start := time.Now()
	m, err := assemble(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	r := &Result{Grid: g, Operator: m, Assembly: time.Since(start)}
	member, err := volume.SingleClass(m)
	if err != nil {
		return nil, err
	}
	if s.useDirect(m) {
		err = r.direct(member)
	} else {
		err = r.multigrid(ctx, c, s)
		if err == nil && s.Method == Auto && r.fallBack(s) {
			err = r.direct(member)
		}
	}
	if err != nil {
		return nil, err
	}
	r.finish(member)
	return r, r.checkWindow(s)
}

// fallbackFlops is the work that elimination may take after multigrid has
// failed, some tens of seconds.
const fallbackFlops = 4e10

// fallBack reports whether elimination should replace a solve that did not
// converge. That happens where the density falls into parts which exchange
// mass at rates near the rounding unit: elimination without subtractions gives
// the weights of such parts to full relative accuracy.
func (r *Result) fallBack(s Settings) bool {
	if r.Outcome == multigrid.Converged || r.Outcome == multigrid.Cancelled {
		return false
	}
	flops, bytes := volume.EliminationCost(r.Operator)
	limit := s.memoryLimit()
	return flops < fallbackFlops && (limit == 0 || bytes < float64(limit))
}

func absorbingSides(g *grid.Grid) error {
	var e AbsorbingError
	for _, a := range g.Axes() {
		if a.Lower == grid.Absorbing {
			e.Sides = append(e.Sides, fmt.Sprintf("%s=%.6g", a.Name, a.Lo()))
		}
		if a.Upper == grid.Absorbing {
			e.Sides = append(e.Sides, fmt.Sprintf("%s=%.6g", a.Name, a.Hi()))
		}
	}
	if len(e.Sides) > 0 {
		return &e
	}
	return nil
}

func (r *Result) direct(member []bool) error {
	start := time.Now()
	e, err := volume.EliminateClass(r.Operator, member)
	if err != nil {
		return err
	}
	r.padded = r.Operator.Layout.Vector()
	e.Stationary(r.padded)
	mass := r.Operator.Mass(r.padded)
	for i := range r.padded {
		r.padded[i] /= mass
	}
	r.Method, r.Outcome, r.Levels, r.Solve = Direct, multigrid.Converged, 1, r.Solve+time.Since(start)
	return nil
}

func (r *Result) multigrid(ctx context.Context, c volume.Coefficients, s Settings) error {
	sv, err := multigrid.New(ctx, r.Operator, c, 0, false, s.multigrid())
	if err != nil {
		return err
	}
	p, st := sv.Stationary(ctx)
	r.padded = p
	r.Method, r.Outcome, r.Residual, r.Start = Multigrid, st.Outcome, st.Residual, st.Start
	r.Iterations, r.Levels, r.Smoother, r.History = st.Iterations, st.Levels, st.Smoother, st.History
	r.Setup, r.Solve = st.Setup, st.Solve
	return nil
}

// finish makes transient cells empty and unpacks the density.
func (r *Result) finish(member []bool) {
	m := r.Operator
	l := &m.Layout
	for k, in := range member {
		if !in {
			r.padded[l.Row(k/l.Nx)+k%l.Nx] = 0
			r.Transient++
		}
	}
	if mass := m.Mass(r.padded); mass > 0 {
		for i := range r.padded {
			r.padded[i] /= mass
		}
	}
	for q := 0; q < l.Rows; q++ {
		l.Wrap(r.padded, q)
	}
	r.P = make([]float64, r.Grid.Cells())
	l.Unpack(r.P, r.padded)
	if r.Method == Direct {
		r.Residual = r.relativeResidual()
	}
}

func (r *Result) checkWindow(s Settings) error {
	tol := s.WindowTolerance
	if tol == 0 {
		tol = 1e-6
	}
	for d, sides := range r.Boundary() {
		axis := r.Grid.Axis(d)
		for q, b := range sides {
			if s.Window[d][q] && b.Level > tol {
				return &WindowError{axis.Name, []string{"lower", "upper"}[q], []float64{axis.Lo(), axis.Hi()}[q], b.Level}
			}
		}
	}
	return nil
}
