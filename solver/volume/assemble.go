package volume

import (
	"context"
	"fmt"
	"math"

	"epslim/solver/grid"
)

// Settings steers the assembly. The zero value uses all processors and no
// memory limit.
type Settings struct {
	Workers     int   // goroutines; 0 means one a processor. The result does not depend on it.
	MemoryLimit int64 // bytes the operator may take; 0 means no limit
}

// CoefficientError reports a coefficient that no diffusion process can have.
type CoefficientError struct {
	Quantity string  // "drift x", "diffusion x,y"
	Place    string  // "x=0.5, y=0.25"
	Value    float64 // what was found there
	Reason   string
}

func (e *CoefficientError) Error() string {
	return fmt.Sprintf("%s is %g at %s: %s", e.Quantity, e.Value, e.Place, e.Reason)
}

// MemoryError reports a grid that does not fit.
type MemoryError struct {
	Cells       int
	Need, Limit int64
}

func (e *MemoryError) Error() string {
	return fmt.Sprintf("a grid of %d cells needs about %s, more than the limit of %s", e.Cells, bytesText(e.Need), bytesText(e.Limit))
}

func bytesText(n int64) string {
	switch {
	case n >= 1<<30:
		return fmt.Sprintf("%.1f GiB", float64(n)/(1<<30))
	case n >= 1<<20:
		return fmt.Sprintf("%.0f MiB", float64(n)/(1<<20))
	}
	return fmt.Sprintf("%d bytes", n)
}

// Memory returns the bytes an operator on g takes while it is assembled.
func Memory(g *grid.Grid, diagonal bool) int64 {
	d := int64(g.Dim())
	perCell := 2*d + d // links and the diffusion at the centres
	if !diagonal {
		e := int64(entries(g.Dim()))
		perCell = 2*(d+d*(d-1)) + (1+d+d*(d-1)/2)*(d+e)
	}
	return 8 * perCell * int64(g.Cells())
}

// Assemble builds the operator of drift and diffusion on a grid. It returns a
// *CoefficientError for a value that is not finite or a diffusion that is
// negative, a *MemoryError before allocating too much, and the error of the
// context when that is cancelled.
func Assemble(ctx context.Context, g *grid.Grid, c Coefficients, s Settings) (*Operator, error) {
	a := &assembly{ctx: ctx, g: g, dim: g.Dim(), workers: workerCount(s.Workers), c: c}
	diagonal, err := a.isDiagonal()
	if err != nil {
		return nil, err
	}
	if need := Memory(g, diagonal); s.MemoryLimit > 0 && need > s.MemoryLimit {
		return nil, &MemoryError{g.Cells(), need, s.MemoryLimit}
	}
	m := &Operator{Grid: g, Layout: NewLayout(g, 1), workers: a.workers}
	a.m = m
	block := Block64(2*a.dim, m.Layout.Len)
	for d := 0; d < a.dim; d++ {
		var step [grid.MaxDim]int
		step[d] = 1
		m.Links = append(m.Links, Link{step, block[2*d], block[2*d+1]})
	}
	m.finish()
	if diagonal {
		err = a.assembleDiagonal()
	} else {
		err = a.assembleFull()
	}
	if err == nil && g.HasAbsorbing() {
		err = a.absorb()
	}
	if err != nil {
		return nil, err
	}
	a.report(diagonal)
	for li := range m.Links {
		for r := 0; r < m.Layout.Rows; r++ {
			m.Layout.Wrap(m.Links[li].Out, r)
			m.Layout.Wrap(m.Links[li].Back, r)
		}
	}
	return m, nil
}

type assembly struct {
	ctx     context.Context
	g       *grid.Grid
	dim     int
	workers int
	c       Coefficients
	m       *Operator
	pairs   []pair // coordinate planes, when A is not diagonal
}

// isDiagonal asks the coefficients, or probes up to 64 cell centres a
// direction.
func (a *assembly) isDiagonal() (bool, error) {
	if a.dim == 1 {
		return true, nil
	}
	if d, ok := a.c.(DiagonalDiffusion); ok {
		return d.IsDiagonal(), nil
	}
	ev := a.evaluator()
	shape := a.g.Shape()
	pick := func(n int) []int {
		step := (n + 63) / 64
		var s []int
		for i := 0; i < n; i += step {
			s = append(s, i)
		}
		return s
	}
	outer := []int{0}
	if a.dim == 3 {
		outer = pick(shape[2])
	}
	for _, k := range outer {
		for _, j := range pick(shape[1]) {
			if err := ev.row(0, j+shape[1]*k, shape[0]); err != nil {
				return false, err
			}
			for e, col := range ev.diffusion {
				if isDiagonalEntry(a.dim, e) {
					continue
				}
				for _, v := range col[:shape[0]] {
					if v != 0 {
						return false, nil
					}
				}
			}
		}
	}
	return true, nil
}

func isDiagonalEntry(dim, e int) bool {
	for d := 0; d < dim; d++ {
		if Entry(dim, d, d) == e {
			return true
		}
	}
	return false
}

// each runs body for all rows on all workers; the error of the lowest row wins.
func (a *assembly) each(body func(ev *evaluator, r int) error) error {
	workers := a.workers
	if a.g.Cells() < 1<<12 {
		workers = 1
	}
	errs := make([]error, a.m.Layout.Rows)
	calls := make([]int, workers)
	Parallel(workers, a.m.Layout.Rows, func(w, lo, hi int) {
		ev := a.evaluator()
		for r := lo; r < hi; r++ {
			if a.ctx.Err() != nil {
				errs[r] = a.ctx.Err()
				break
			}
			if errs[r] = body(ev, r); errs[r] != nil {
				break
			}
		}
		calls[w] = ev.calls
	})
	for _, n := range calls {
		a.m.Report.Evaluations += n
	}
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// lastOf returns how many links of row r along axis d exist: all cells, or all
// but the last along an axis that is not periodic.
func (a *assembly) linksOf(d, r int) int {
	nx := a.m.Layout.Nx
	if d == 0 {
		if nx == 1 || !a.m.Layout.PeriodicX {
			return nx - 1
		}
		return nx
	}
	if a.m.UpperRow(d, r) < 0 || a.g.Axis(d).Cells() == 1 {
		return 0
	}
	return nx
}

// distanceOf returns the distance between the centres joined by the links of
// row r along an axis beyond the first.
func (a *assembly) distanceOf(d, r int) float64 {
	j, k := a.m.Layout.RowCoordinates(r)
	return a.g.Axis(d).Distance([]int{0, j, k}[d])
}

// fluxPair returns the two coefficients of the fitted flux through a unit area
// between cells whose centres lie dist apart: f and af are drift and diffusion
// at the face, al and ar the diffusion in the cells.
//
// In the form (1/2h)[B(-z) A_l p_l - B(z) A_r p_r] with z = 2 f h / A the
// diffusion is inside the derivative, as Ito's calculus has it. Where it
// changes by a large factor within one cell the equivalent form with
// f - A'/2 is used, which has the upwind flux as its limit for A = 0.
func fluxPair(f, af, al, ar, dist float64) (out, back, z float64) {
	lo, hi := min(af, al, ar), max(af, al, ar)
	if hi <= 4*lo {
		if lo == 0 {
			return max(f, 0), max(-f, 0), math.Copysign(math.Inf(1), f)
		}
		z = 2 * f * dist / af
		bm, bp := bernoulliPair(z)
		c := 0.5 / dist
		return c * bm * al, c * bp * ar, z
	}
	g := f - (ar-al)/(2*dist)
	return driftDiffusion(g, af, dist)
}

// driftDiffusion is the fitted flux of g p - (a/2) dp/dx.
func driftDiffusion(g, a, dist float64) (out, back, z float64) {
	if a <= 1e-300 || math.Abs(g)*dist > 1e15*a {
		return max(g, 0), max(-g, 0), math.Copysign(math.Inf(1), g)
	}
	z = 2 * g * dist / a
	bm, bp := bernoulliPair(z)
	c := 0.5 * a / dist
	return c * bm, c * bp, z
}

// assembleDiagonal builds the links along the axes for a diagonal A.
func (a *assembly) assembleDiagonal() error {
	m, l := a.m, &a.m.Layout
	center := Block64(a.dim, l.Len) // A_dd at the cell centres
	err := a.each(func(ev *evaluator, r int) error {
		if err := ev.row(0, r, l.Nx); err != nil {
			return err
		}
		for d := range center {
			copy(center[d][l.Row(r):], ev.diffusion[Entry(a.dim, d, d)][:l.Nx])
			l.Wrap(center[d], r)
		}
		return nil
	})
	if err != nil {
		return err
	}
	return a.each(func(ev *evaluator, r int) error {
		s := l.Row(r)
		for d := 0; d < a.dim; d++ {
			n := a.linksOf(d, r)
			if n == 0 {
				continue
			}
			if err := ev.row(1<<d, r, n); err != nil {
				return err
			}
			step := 0
			if d == 0 {
				step = 1
			}
			u := l.Row(m.UpperRow(d, r)) + step
			f, af := ev.drift[d][:n], ev.diffusion[Entry(a.dim, d, d)][:n]
			al, ar := center[d][s:][:n], center[d][u:][:n]
			out, back := m.Links[d].Out[s:][:n], m.Links[d].Back[s:][:n]
			dist, area := 0.0, m.rowVolume[r]
			if d > 0 {
				dist = a.distanceOf(d, r)
				area /= a.widthOf(d, r)
			}
			for i := range out {
				h, w := dist, area
				if d == 0 {
					h = a.g.Axis(0).Distance(i)
				} else {
					w *= m.width[i]
				}
				o, b, _ := fluxPair(f[i], af[i], al[i], ar[i], h)
				out[i], back[i] = w*o, w*b
			}
		}
		return nil
	})
}

func (a *assembly) widthOf(d, r int) float64 {
	j, k := a.m.Layout.RowCoordinates(r)
	return a.g.Axis(d).Width([]int{0, j, k}[d])
}

// absorb fills the outflow through absorbing sides: half a cell away the
// density is zero.
func (a *assembly) absorb() error {
	m, l := a.m, &a.m.Layout
	m.Kill = l.Vector()
	for d := 0; d < a.dim; d++ {
		for side, rule := range [2]grid.Side{a.g.Axis(d).Lower, a.g.Axis(d).Upper} {
			if rule == grid.Absorbing {
				m.KillAt[d][side] = l.Vector()
			}
		}
	}
	return a.each(func(ev *evaluator, r int) error {
		j, k := l.RowCoordinates(r)
		for d := 0; d < a.dim; d++ {
			axis := a.g.Axis(d)
			for side, rule := range [2]grid.Side{axis.Lower, axis.Upper} {
				last := (axis.Cells() - 1) * side
				if rule != grid.Absorbing || (d > 0 && [3]int{0, j, k}[d] != last) {
					continue
				}
				first, n := 0, l.Nx
				if d == 0 {
					first, n = last, 1
				}
				if err := a.absorbSide(ev, r, d, side, first, n); err != nil {
					return err
				}
			}
		}
		return nil
	})
}

func (a *assembly) absorbSide(ev *evaluator, r, d, side, first, n int) error {
	m, l := a.m, &a.m.Layout
	e := Entry(a.dim, d, d)
	axis := a.g.Axis(d)
	fill := func(edge bool) error {
		j, k := l.RowCoordinates(r)
		for q := 0; q < a.dim; q++ {
			for i := 0; i < n; i++ {
				cell := [3]int{first + i, j, k}[q]
				ev.points[q][i] = a.g.Axis(q).Center(cell)
				if q == d && edge {
					ev.points[q][i] = a.g.Axis(q).Edges[cell+side]
				}
			}
		}
		return ev.eval(n)
	}
	if err := fill(false); err != nil {
		return err
	}
	inner := append([]float64(nil), ev.diffusion[e][:n]...)
	if err := fill(true); err != nil {
		return err
	}
	last := (axis.Cells() - 1) * side
	dist := 0.5 * axis.Width(last)
	for i := 0; i < n; i++ {
		area := m.rowVolume[r]
		if d > 0 {
			area *= m.width[first+i] / axis.Width(last)
		}
		f := ev.drift[d][i]
		if side == 0 {
			f = -f
		}
		o, _, _ := fluxPair(f, ev.diffusion[e][i], inner[i], ev.diffusion[e][i], dist)
		m.Kill[l.Row(r)+first+i] += area * o
		m.KillAt[d][side][l.Row(r)+first+i] += area * o
	}
	return nil
}

// report counts what the links look like: the Peclet number of a link is
// recovered from the ratio of its coefficients.
func (a *assembly) report(diagonal bool) {
	m, l := a.m, &a.m.Layout
	rep := &m.Report
	rep.Diagonal = diagonal
	for d := 0; d < a.dim; d++ {
		rep.axes = append(rep.axes, a.g.Axis(d).Name)
	}
	parts := make([]Report, l.Rows)
	m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			a.reportRow(&parts[r], r)
		}
	})
	for r := range parts {
		rep.merge(&parts[r])
	}
	rep.Monotone = rep.Negative == 0
}

func (a *assembly) reportRow(rep *Report, r int) {
	m, l := a.m, &a.m.Layout
	s := l.Row(r)
	for li := range m.Links {
		link := &m.Links[li]
		n := l.Nx
		if li < a.dim {
			n = a.linksOf(li, r)
		} else if m.UpperRow(li, r) < 0 {
			continue
		}
		for i := 0; i < n; i++ {
			o, b := link.Out[s+i], link.Back[s+i]
			rep.TotalLinks++
			if o > 0 && b > 0 && o < 8*b && b < 8*o {
				continue // an ordinary link
			}
			place := func() string { return a.g.Describe(r*l.Nx + i) }
			if o < 0 || b < 0 {
				if rep.Negative == 0 {
					rep.NegativeAt = place()
				}
				rep.Negative++
				continue
			}
			if o == 0 || b == 0 {
				if li < a.dim {
					rep.ZeroLinks++
					if rep.NoNoise[li] == 0 {
						rep.NoNoiseAt[li] = place()
					}
					rep.NoNoise[li]++
				}
				continue
			}
			if z := math.Abs(math.Log(o / b)); z > rep.MaxPeclet {
				rep.MaxPeclet, rep.PecletAt = z, place()
			}
		}
	}
}
