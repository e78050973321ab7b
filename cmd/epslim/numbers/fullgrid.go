package numbers

import (
	"context"
	"errors"
	"fmt"
	"math"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/solver/density"
	"epslim/solver/fastslow"
	"epslim/solver/grid"
	"epslim/solver/kernel"
	"epslim/solver/volume"
)

// FullGrid compares the slow marginal of the full Fokker-Planck equation at
// several eps with the stationary density of the limit, on one grid.
type FullGrid struct {
	Grid     *grid.Grid
	Modes    int       // functions of the fast variables
	Eps      []float64 // in the order given
	Distance []float64 // L1, from the limit
	Floor    float64   // error of the grid, from the one with half the cells at the smallest eps
	Rate     float64   // least-squares slope of log distance over log eps above the floor; NaN without two points there
	Tail     []float64 // weight of the last functions of the basis
}

// NotOnGrid says why the full equation is not solved for a model.
type NotOnGrid struct{ Why string }

func (e *NotOnGrid) Error() string { return e.Why }

// fullSize is how the full equation is discretised. The refinement of the
// limit's grid is odd, so that centres of cells coincide.
type fullSize struct {
	cells, refine int
	waves, modes  int // of a fast variable: Fourier waves, Hermite polynomials
}

// fullSizes chooses what takes about a second.
func fullSizes(sys *ito.System) fullSize {
	switch {
	case len(sys.Slow) == 2:
		return fullSize{cells: 20, refine: 5, waves: 3, modes: 8}
	case len(sys.Fast) > 1:
		return fullSize{cells: 320, refine: 3, waves: 2, modes: 5}
	}
	return fullSize{cells: 640, refine: 3, waves: 8, modes: 20}
}

const fullMemory = 512 << 20 // bytes for the factored matrix

// SolveFull solves the full equation at each eps.
func SolveFull(ctx context.Context, res *derivation.Result, eps []float64, workers int) (*FullGrid, error) {
	sys := res.System
	if err := fullApplies(sys); err != nil {
		return nil, err
	}
	size := fullSizes(sys)
	n := size.cells
	law, err := StationaryDensity(ctx, res, DensityOptions{Cells: []int{n * size.refine}, Settings: density.Settings{Workers: workers}})
	if err != nil {
		return nil, err
	}
	f := &FullGrid{}
	smallest := 0
	for k, e := range eps {
		r, d, err := fullDistance(ctx, res, law, e, n)
		if err != nil {
			return nil, err
		}
		f.Grid, f.Modes = r.Slow, r.Size
		f.Eps, f.Distance = append(f.Eps, e), append(f.Distance, d)
		f.Tail = append(f.Tail, r.Tail)
		if e < eps[smallest] {
			smallest = k
		}
	}
	_, coarse, err := fullDistance(ctx, res, law, eps[smallest], n/2)
	if err != nil {
		return nil, err
	}
	// The fluxes are of second order at least, so the error falls to a quarter.
	f.Floor = math.Abs(coarse-f.Distance[smallest]) / 3
	f.fit()
	return f, nil
}

// fullApplies reports what the solver does not take.
func fullApplies(sys *ito.System) error {
	no := func(format string, args ...any) error { return &NotOnGrid{fmt.Sprintf(format, args...)} }
	if n, m := len(sys.Slow), len(sys.Fast); n > 2 || n+m > 4 {
		return no("%d slow and %d fast variables; at most 2 slow ones and 4 together are solved on a grid", n, m)
	}
	for _, v := range sys.Slow {
		switch v.Domain.Kind {
		case ito.Circle, ito.Periodic, ito.Line:
		default:
			return no("the slow variable %s is neither periodic nor on the line", v.Name)
		}
	}
	for _, v := range sys.Fast {
		switch v.Domain.Kind {
		case ito.Circle, ito.Periodic:
		case ito.Line:
			c, ok := sys.Equation(v.Name).Drift.Coefficients(v.Name)
			if !ok || len(c) != 2 {
				return no("the drift of the fast variable %s is not linear in it", v.Name)
			}
		default:
			return no("the fast variable %s is neither on a circle nor on the line", v.Name)
		}
	}
	return nil
}

// fullBases chooses the functions of each fast variable. On the line they are
// those of the Ornstein-Uhlenbeck process with the drift and the noise of the
// variable.
func fullBases(sys *ito.System, eps float64, size fullSize) ([]fastslow.Basis, error) {
	var out []fastslow.Basis
	for _, v := range sys.Fast {
		switch v.Domain.Kind {
		case ito.Circle:
			out = append(out, fastslow.Circle{Waves: size.waves})
			continue
		case ito.Periodic:
			a, err := number(sys, v.Domain.A)
			if err != nil {
				return nil, err
			}
			b, err := number(sys, v.Domain.B)
			if err != nil {
				return nil, err
			}
			out = append(out, fastslow.Circle{Period: b - a, Waves: size.waves})
			continue
		}
		e := sys.Equation(v.Name)
		c, _ := e.Drift.Coefficients(v.Name)
		a := algebra.Expr{}
		for _, s := range e.Noise {
			if q := s.Mul(s); a.Valid() {
				a = a.Add(q)
			} else {
				a = q
			}
		}
		// Rate and noise may depend on the slow variables, the variance not.
		width, err := ratioAt(sys, a, c[1], eps)
		if err != nil {
			return nil, err
		}
		if !(width < 0) {
			return nil, &NotOnGrid{fmt.Sprintf("the variance of the fast variable %s under its own drift and noise is not a positive constant", v.Name)}
		}
		center, err := ratioAt(sys, c[0], c[1], eps)
		if err != nil {
			return nil, err
		}
		if math.IsNaN(center) {
			center = 0
		}
		l, err := fastslow.NewLine(-center, math.Sqrt(-width/2), size.modes)
		if err != nil {
			return nil, err
		}
		out = append(out, l)
	}
	return out, nil
}

// ratioAt is the value of a ratio of numbers, parameters and eps, and NaN when
// it depends on a variable.
func ratioAt(sys *ito.System, num, den algebra.Expr, eps float64) (float64, error) {
	e, err := num.Div(den)
	if err != nil {
		return 0, err
	}
	if err := sys.NeedNumbers(nil, e); err != nil {
		return 0, err
	}
	if len(e.Functions()) > 0 {
		return math.NaN(), nil
	}
	for _, v := range append(append([]*ito.Variable(nil), sys.Slow...), sys.Fast...) {
		if e.DependsOn(v.Name) {
			return math.NaN(), nil
		}
	}
	f, err := e.Subs(sys.Values())
	if err != nil {
		return 0, err
	}
	return f.EvalFloat(map[string]float64{sys.Small: eps})
}

// fullCoefficients compiles drift and diffusion of the full system, slow
// variables first.
func fullCoefficients(sys *ito.System, eps float64) (volume.Coefficients, error) {
	vars := append(append([]*ito.Variable(nil), sys.Slow...), sys.Fast...)
	var names []string
	var drift, diffusion []algebra.Expr
	for _, v := range vars {
		names = append(names, v.Name)
		drift = append(drift, sys.Equation(v.Name).Drift)
	}
	for i, v := range vars {
		for _, w := range vars[i:] {
			a, b := sys.Equation(v.Name).Noise, sys.Equation(w.Name).Noise
			sum := drift[0].Sub(drift[0])
			for k := range a {
				sum = sum.Add(a[k].Mul(b[k]))
			}
			diffusion = append(diffusion, sum)
		}
	}
	l := NewLowering(sys, kernel.NewBuilder(), names)
	l.SetConstant(sys.Small, eps)
	nodes, err := l.Nodes(append(drift, diffusion...)...)
	if err != nil {
		return nil, err
	}
	p, err := l.Builder.Compile(nodes...)
	if err != nil {
		return nil, err
	}
	return &Coefficients{program: p, scratch: p.NewScratch(), dim: len(vars)}, nil
}

// fullDistance solves at one eps on n cells along each slow axis, and returns
// the L1 distance of the slow marginal from the limit's density.
func fullDistance(ctx context.Context, res *derivation.Result, law *Density, eps float64, n int) (*fastslow.Result, float64, error) {
	sys := res.System
	dim := len(sys.Slow)
	cells := make([]int, dim)
	for d := range cells {
		cells[d] = n
	}
	g, err := law.Window.Grid(sys, cells)
	if err != nil {
		return nil, 0, err
	}
	bases, err := fullBases(sys, eps, fullSizes(sys))
	if err != nil {
		return nil, 0, err
	}
	c, err := fullCoefficients(sys, eps)
	if err != nil {
		return nil, 0, err
	}
	r, err := fastslow.Solve(ctx, g, bases, c, fastslow.Settings{MemoryLimit: fullMemory})
	var size *fastslow.SizeError
	if errors.As(err, &size) {
		return nil, 0, &NotOnGrid{size.Error()}
	}
	if err != nil {
		return nil, 0, err
	}
	exact := law.at(g)
	d := 0.0
	for k, w := range g.Volumes() {
		d += w * math.Abs(r.Marginal[k]-exact[k])
	}
	return r, d, nil
}

// at is the density at the centres of a grid over the same window, with mass
// one there: in closed form where there is one, and from the cells of the fine
// grid that hold the centres elsewhere.
func (d *Density) at(g *grid.Grid) []float64 {
	values := d.Result.P
	if d.Difference != nil {
		values = d.Difference.Exact
	}
	shape := d.Result.Grid.Shape()
	out := make([]float64, g.Cells())
	volumes := g.Volumes()
	mass := 0.0
	for k := range out {
		// The fine axes are uniform and multiples of those of g. A centre on an
		// edge takes the mean of the cells on both sides.
		x := g.CenterOf(k)
		var lo, hi []int
		for a, n := range shape {
			axis := d.Result.Grid.Axis(a)
			u := (x[a] - axis.Lo()) / (axis.Hi() - axis.Lo()) * float64(n)
			lo = append(lo, min(max(int(math.Ceil(u-1e-6))-1, 0), n-1))
			hi = append(hi, min(int(math.Floor(u+1e-6)), n-1))
		}
		for corner := range 1 << len(shape) {
			cell := make([]int, len(shape))
			for a := range cell {
				cell[a] = lo[a]
				if corner>>a&1 == 1 {
					cell[a] = hi[a]
				}
			}
			out[k] += values[d.Result.Grid.Index(cell...)] / float64(int(1)<<len(shape))
		}
		mass += out[k] * volumes[k]
	}
	for k := range out {
		out[k] /= mass
	}
	return out
}

// fit finds the rate in eps from the distances that stand out of the error of
// the grid.
func (f *FullGrid) fit() {
	var n, sx, sy, sxx, sxy float64
	for k, d := range f.Distance {
		if d <= fullNoise*f.Floor {
			continue
		}
		x, y := math.Log(f.Eps[k]), math.Log(d)
		n, sx, sy, sxx, sxy = n+1, sx+x, sy+y, sxx+x*x, sxy+x*y
	}
	f.Rate = math.NaN()
	if q := n*sxx - sx*sx; n >= 2 && q > 0 {
		f.Rate = (n*sxy - sx*sy) / q
	}
}

// What a verdict asks for.
const (
	fullNoise = 3    // distances below this many errors of the grid say nothing about eps
	fullTail  = 1e-3 // a larger weight of the last functions, beyond a quarter of the distance, means that there are too few
	fullClose = 0.02 // a distance that does not fall is a failure above this
)

// FullVerdict is the judgement of a comparison.
type FullVerdict uint8

const (
	FullAgrees FullVerdict = iota
	FullOpen
	FullDiffers
)

// Verdict judges the comparison; why is one line.
func (f *FullGrid) Verdict() (v FullVerdict, why string) {
	list := ""
	worst, last, tail := 0.0, 0, 0.0
	for k, d := range f.Distance {
		if k > 0 {
			list += ", "
		}
		list += fmt.Sprintf("%.2g at eps = %g", d, f.Eps[k])
		worst = math.Max(worst, d)
		if f.Tail[k] > math.Max(fullTail, d/4) {
			tail = math.Max(tail, f.Tail[k])
		}
		if f.Eps[k] < f.Eps[last] {
			last = k
		}
	}
	why = fmt.Sprintf("%s cells, %d functions of the fast variables: L1 distance from the limit %s; error of the grid %.1g", f.Grid, f.Modes, list, f.Floor)
	end := f.Distance[last]
	switch {
	case tail > 0:
		return FullOpen, fmt.Sprintf("%s; the functions of the fast variables do not suffice (weight of the last %.1g)", why, tail)
	case worst <= math.Max(fullNoise*f.Floor, roundingLevel):
		return FullAgrees, why + "; no dependence on eps beyond it"
	case f.Rate > 0.4:
		return FullAgrees, fmt.Sprintf("%s; observed rate %.2f", why, f.Rate)
	case end <= fullNoise*f.Floor && end < worst/2:
		return FullAgrees, why + "; the smallest eps agrees within it"
	case end > fullClose && end > 2*fullNoise*f.Floor && f.Rate < 0.25:
		return FullDiffers, fmt.Sprintf("%s; observed rate %.2f", why, f.Rate)
	}
	return FullOpen, fmt.Sprintf("%s; no clear rate in eps", why)
}
