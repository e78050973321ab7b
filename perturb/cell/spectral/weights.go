package spectral

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/mat"

	"epslim/perturb/cell/quadrature"
	"epslim/perturb/cell/quadrature/fast"
)

// fitter chooses the weight of every coordinate that is not periodic.
type fitter struct {
	p      *fast.Problem
	owner  []int // domain of a coordinate
	open   []int // coordinates on lines, half-lines and reflecting intervals
	centre []float64
	laws   map[int]*measure
	wall   map[int]bool
	exact  bool // linear drift, constant noise: nothing to improve
}

func newFitter(p *fast.Problem) *fitter {
	f := &fitter{p: p, laws: map[int]*measure{}, wall: map[int]bool{}}
	c := 0
	for k, d := range p.Domains {
		for i := 0; i < d.Coordinates(); i++ {
			f.owner = append(f.owner, k)
			start := 0.0
			switch d.Kind {
			case fast.HalfLine:
				start = 1
			case fast.Reflecting:
				start = (d.A + d.B) / 2
			}
			f.centre = append(f.centre, start)
		}
		if !d.IsPeriodic() && d.Kind != fast.Sphere {
			f.open = append(f.open, c)
		}
		c += d.Coordinates()
	}
	return f
}

func (f *fitter) domain(i int) fast.Domain { return f.p.Domains[f.owner[i]] }

// samples are values of the other coordinates to average over: the centre for
// open ones, points all around for periodic ones and spheres.
func (f *fitter) samples() [][]float64 {
	out := [][]float64{append([]float64{}, f.centre...)}
	c := 0
	for _, d := range f.p.Domains {
		var choices [][]float64
		switch {
		case d.Kind == fast.Sphere:
			choices = [][]float64{{1, 0, 0}, {-1, 0, 0}, {0, 1, 0}, {0, -1, 0}, {0, 0, 1}, {0, 0, -1}}
		case d.IsPeriodic():
			a, b := d.Ends()
			for k := 0; k < 6; k++ {
				choices = append(choices, []float64{a + (b-a)*(float64(k)+0.3)/6})
			}
		}
		if choices != nil && len(out) < 200 {
			var next [][]float64
			for _, y := range out {
				for _, v := range choices {
					z := append([]float64{}, y...)
					copy(z[c:], v)
					next = append(next, z)
				}
			}
			out = next
		}
		c += d.Coordinates()
	}
	return out
}

// frozen is a coefficient as a function of coordinate i alone.
func (f *fitter) frozen(c fast.Coefficient, i int) func(float64) float64 {
	points := f.samples()
	return func(y float64) float64 {
		s := 0.0
		for _, p := range points {
			p[i] = y
			s += c.At(p...)
		}
		return s / float64(len(points))
	}
}

// slopeIn is the derivative of a coefficient in coordinate j at the centre.
func (f *fitter) slopeIn(c fast.Coefficient, j int) float64 {
	h := 1e-3
	g := f.frozen(c, j)
	y := f.centre[j]
	return (8*(g(y+h)-g(y-h)) - (g(y+2*h) - g(y-2*h))) / (12 * h)
}

// autonomous returns the one-dimensional problem of a coordinate whose own
// equation does not contain the others, nil where there is none.
func (f *fitter) autonomous(i int) *fast.Problem {
	d := f.domain(i)
	if d.Kind == fast.Sphere {
		return nil
	}
	for _, c := range []fast.Coefficient{f.p.Drift[i], f.p.Diffusion[i][i]} {
		for t := 0; t < 8; t++ {
			y, z := probe(f.p, t), probe(f.p, t+9)
			z[i] = y[i]
			if c.At(y...) != c.At(z...) {
				return nil
			}
		}
	}
	base := probe(f.p, 0)
	alone := func(c fast.Coefficient) fast.Coefficient {
		if c.IsZero() {
			return fast.Constant(0)
		}
		return fast.Func1(c.Label(), func(v float64) float64 {
			y := append([]float64{}, base...)
			y[i] = v
			return c.At(y...)
		})
	}
	return &fast.Problem{Domains: []fast.Domain{d}, Drift: []fast.Coefficient{alone(f.p.Drift[i])},
		Diffusion: [][]fast.Coefficient{{alone(f.p.Diffusion[i][i])}}}
}

// exists refuses when a coordinate that does not depend on the others has no
// unique stationary law.
func (f *fitter) exists(ctx context.Context) error {
	for i := range f.owner {
		p := f.autonomous(i)
		if p == nil {
			continue
		}
		_, err := quadrature.New(ctx, p, quadrature.Settings{})
		var ne *fast.NotErgodic
		var u *fast.Undefined
		if errors.As(err, &ne) || errors.As(err, &u) {
			return err
		}
	}
	return ctx.Err()
}

// walls refuses when a surface y_i = c cannot be crossed: noise and drift of
// y_i vanish there together, whatever the other coordinates.
func (f *fitter) walls() error {
	for i := range f.owner {
		d := f.domain(i)
		if d.Kind == fast.Sphere || f.p.Diffusion[i][i].IsZero() {
			continue
		}
		drift, noise := f.frozen(f.p.Drift[i], i), f.frozen(f.p.Diffusion[i][i], i)
		for _, c := range quadrature.NoiseZeros(d, drift, noise) {
			if f.closed(i, c) {
				return &fast.NotErgodic{
					Reason: fmt.Sprintf("noise and drift of %s vanish together at %.6g whatever the other variables do, so the two sides do not mix", d.Name(0), c),
					Mend:   "restrict the domain to one side or add noise that crosses"}
			}
		}
	}
	return nil
}

// closed reports whether noise and drift of coordinate i vanish at c for all
// probed values of the others.
func (f *fitter) closed(i int, c float64) bool {
	for _, k := range []fast.Coefficient{f.p.Drift[i], f.p.Diffusion[i][i]} {
		for t := 0; t < 12; t++ {
			y := probe(f.p, t)
			y[i] = c
			at := k.At(y...)
			y[i] = c + 0.3
			off := math.Abs(k.At(y...))
			y[i] = c - 0.3
			off = math.Max(off, math.Abs(k.At(y...)))
			if math.Abs(at) > 1e-6*off {
				return false
			}
		}
	}
	return true
}

// fit chooses all weights.
func (f *fitter) fit(ctx context.Context) error {
	if err := f.exists(ctx); err != nil {
		return err
	}
	if err := f.walls(); err != nil {
		return err
	}
	done, err := f.linear(ctx)
	if err != nil || done {
		return err
	}
	for sweep := 0; sweep < 3; sweep++ {
		for _, i := range f.open {
			if err := f.coordinate(ctx, i); err != nil {
				return err
			}
		}
		moved := false
		for _, i := range f.open {
			mean, sd := f.laws[i].moments()
			moved = moved || math.Abs(mean-f.centre[i]) > 0.1*sd
			f.centre[i] = mean
		}
		if !moved {
			break
		}
	}
	return nil
}

func (f *fitter) coordinate(ctx context.Context, i int) error {
	drift, diff := f.frozen(f.p.Drift[i], i), f.frozen(f.p.Diffusion[i][i], i)
	d := f.domain(i)
	var cause error
	if c := f.centre[i]; diff(c) != 0 || diff(c+0.37) != 0 || diff(c-0.21) != 0 {
		if cause = f.law(ctx, i, drift, diff, "law of "+d.Name(0)+" with the others held"); cause == nil {
			return nil
		}
	} else if f.driven(ctx, i) == nil {
		return nil
	}
	if ctx.Err() != nil {
		return ctx.Err()
	}
	if d.Kind == fast.Reflecting {
		f.laws[i], f.wall[i] = uniform(d.A, d.B), true
		return nil
	}
	var no *fast.Unsupported
	if errors.As(cause, &no) {
		return cause
	}
	if d.Kind == fast.HalfLine {
		return f.law(ctx, i, func(y float64) float64 { return 2 - y }, func(y float64) float64 { return 2 * y }, "Gamma law")
	}
	return f.gaussian(ctx, i, f.centre[i], 1)
}

// law takes the stationary law of a one-dimensional diffusion as weight.
func (f *fitter) law(ctx context.Context, i int, drift, diff func(float64) float64, about string) error {
	d := f.domain(i)
	p := &fast.Problem{Domains: []fast.Domain{d}, Drift: []fast.Coefficient{fast.Func1("drift", drift)},
		Diffusion: [][]fast.Coefficient{{fast.Func1("noise^2", diff)}}}
	l, err := quadrature.NewLaw(ctx, p)
	if err != nil {
		return err
	}
	f.laws[i] = &measure{y: l.Y, w: l.Weight, density: l.Density, about: about, heavy: l.PowerTail,
		logSlope: func(y float64) float64 { return (2*drift(y) - slopeOf(diff, y, d)) / diff(y) }}
	f.wall[i] = l.Touches[0] || l.Touches[1]
	return nil
}

func (f *fitter) gaussian(ctx context.Context, i int, mean, sd float64) error {
	return f.law(ctx, i, func(y float64) float64 { return (mean - y) / (sd * sd) }, func(float64) float64 { return 2 },
		fmt.Sprintf("Gaussian with mean %.4g and deviation %.4g", mean, sd))
}

// hyperbolic takes the law exp(-a sqrt(d^2+(y-mean)^2)), whose tails are
// exponential, with a given deviation and (up to 6) kurtosis.
func (f *fitter) hyperbolic(ctx context.Context, i int, mean, sd, kurtosis float64) error {
	d := f.domain(i)
	about := fmt.Sprintf("hyperbolic law with mean %.4g and deviation %.4g", mean, sd)
	shape := func(z float64) error { // z = a d; small: double exponential, large: Gaussian
		return f.law(ctx, i, func(y float64) float64 { return -z * y / math.Sqrt(1+y*y) }, func(float64) float64 { return 2 }, about)
	}
	lo, hi := math.Log(0.1), math.Log(60.)
	for k := 0; k < 12; k++ {
		mid := (lo + hi) / 2
		if err := shape(math.Exp(mid)); err != nil {
			return err
		}
		if f.laws[i].kurtosis() > kurtosis {
			lo = mid
		} else {
			hi = mid
		}
	}
	if err := shape(math.Exp(lo)); err != nil {
		return fmt.Errorf("spectral: weight of %s: %w", d.Name(0), err)
	}
	_, s := f.laws[i].moments()
	f.laws[i] = f.laws[i].affine(mean, sd/s)
	return nil
}

// driven handles a position without noise of its own that is carried by a
// velocity j: dy_i = c y_j dt, dy_j = (F(y_i) - gamma y_j) dt + noise a. The
// law of the position is exp(int 2 gamma F/(a c)).
func (f *fitter) driven(ctx context.Context, i int) error {
	for _, j := range f.open {
		if j == i {
			continue
		}
		noise := f.frozen(f.p.Diffusion[j][j], j)(f.centre[j])
		c, gamma := f.slopeIn(f.p.Drift[i], j), -f.slopeIn(f.p.Drift[j], j)
		if c == 0 || gamma <= 0 || noise <= 0 {
			continue
		}
		force := f.frozen(f.p.Drift[j], i)
		sign := math.Copysign(1, c)
		if err := f.law(ctx, i, func(y float64) float64 { return sign * force(y) }, func(float64) float64 { return noise * math.Abs(c) / gamma },
			fmt.Sprintf("Gibbs law of %s at the temperature of %s", f.domain(i).Name(0), f.domain(j).Name(0))); err == nil {
			return nil
		}
	}
	return errors.New("spectral: no velocity found")
}

func uniform(a, b float64) *measure {
	m := &measure{y: make([]float64, 500), w: make([]float64, 500), about: "uniform law",
		density: func(float64) float64 { return 1 / (b - a) }}
	quad.Legendre{}.FixedLocations(m.y, m.w, a, b)
	for i := range m.w {
		m.w[i] /= b - a
	}
	return m
}

// linear recognizes a linear drift with constant noise on the lines and takes
// the Gaussian of the Lyapunov equation; it refuses when that does not exist.
func (f *fitter) linear(ctx context.Context) (bool, error) {
	n := len(f.open)
	if n == 0 {
		return true, nil
	}
	for _, i := range f.open {
		if f.domain(i).Kind != fast.Line {
			return false, nil
		}
	}
	a, b, q, ok := f.linearParts()
	if !ok {
		return false, nil
	}
	var eigen mat.Eigen
	if !eigen.Factorize(a, mat.EigenNone) {
		return false, nil
	}
	for _, v := range eigen.Values(nil) {
		if real(v) > -1e-12*mat.Norm(a, 2) {
			return false, &fast.NotErgodic{Reason: fmt.Sprintf("the drift matrix of the fast variables has the eigenvalue %.6g, which does not decay", v),
				Mend: "damping, or a circle for a variable that is an angle"}
		}
	}
	s, err := lyapunov(a, q)
	if err != nil {
		return false, err
	}
	var mean mat.VecDense
	if err := mean.SolveVec(a, b); err != nil {
		return false, nil
	}
	for k, i := range f.open {
		if v := s.At(k, k); v <= 1e-14*mat.Max(q)/mat.Norm(a, 2) {
			return false, &fast.Unsupported{Method: "spectral", Reason: "noise does not reach " + f.domain(i).Name(0) + ", so the law has no density"}
		}
	}
	spread := correlationSpread(s)
	for k, i := range f.open {
		f.centre[i] = -mean.AtVec(k)
		if err := f.gaussian(ctx, i, f.centre[i], math.Sqrt(spread*s.At(k, k))); err != nil {
			return false, err
		}
	}
	f.exact = true
	return true, nil
}

// correlationSpread is the factor on the variances that makes a law with
// covariance s square integrable relative to the product of Gaussians: with the
// largest eigenvalue m of the correlation matrix it must exceed m/2.
func correlationSpread(s *mat.Dense) float64 {
	n, _ := s.Dims()
	r := mat.NewSymDense(n, nil)
	for i := 0; i < n; i++ {
		for j := i; j < n; j++ {
			r.SetSym(i, j, (s.At(i, j)+s.At(j, i))/2/math.Sqrt(s.At(i, i)*s.At(j, j)))
		}
	}
	var e mat.EigenSym
	if !e.Factorize(r, false) {
		return 1
	}
	return math.Max(1, 0.75*e.Values(nil)[n-1])
}

// linearParts returns drift = A y + b and the noise matrix on the open
// coordinates when the drift is affine in them and free of the others.
func (f *fitter) linearParts() (a *mat.Dense, b *mat.VecDense, q *mat.Dense, ok bool) {
	n := len(f.open)
	a, b, q = mat.NewDense(n, n, nil), mat.NewVecDense(n, nil), mat.NewDense(n, n, nil)
	points := f.samples()
	at := func(c fast.Coefficient, p []float64, y []float64) float64 {
		z := append([]float64{}, p...)
		for k, i := range f.open {
			z[i] = y[k]
		}
		return c.At(z...)
	}
	zero := make([]float64, n)
	probes := [][]float64{}
	for t := 0; t < 6; t++ {
		y := make([]float64, n)
		for k := range y {
			y[k] = 3 * math.Sin(float64(7*t+3*k+1)*1.7)
		}
		probes = append(probes, y)
	}
	for r, i := range f.open {
		b.SetVec(r, at(f.p.Drift[i], points[0], zero))
		for k := range f.open {
			y := make([]float64, n)
			y[k] = 1
			a.Set(r, k, at(f.p.Drift[i], points[0], y)-b.AtVec(r))
			q.Set(r, k, at(f.p.Diffusion[i][f.open[k]], points[0], zero))
		}
		for _, y := range probes {
			want, size := b.AtVec(r), math.Abs(b.AtVec(r))
			for k, v := range y {
				want += a.At(r, k) * v
				size += math.Abs(a.At(r, k) * v)
			}
			for _, p := range points {
				if !(math.Abs(at(f.p.Drift[i], p, y)-want) <= 1e-11*size) {
					return nil, nil, nil, false
				}
				for k, j := range f.open {
					if !(math.Abs(at(f.p.Diffusion[i][j], p, y)-q.At(r, k)) <= 1e-11*math.Abs(q.At(r, k))) {
						return nil, nil, nil, false
					}
				}
			}
		}
	}
	return a, b, q, true
}

// lyapunov solves A S + S A' + Q = 0.
func lyapunov(a, q *mat.Dense) (*mat.Dense, error) {
	n, _ := a.Dims()
	big := mat.NewDense(n*n, n*n, nil)
	rhs := mat.NewVecDense(n*n, nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			r := i*n + j
			rhs.SetVec(r, -q.At(i, j))
			for k := 0; k < n; k++ {
				big.Set(r, k*n+j, big.At(r, k*n+j)+a.At(i, k))
				big.Set(r, i*n+k, big.At(r, i*n+k)+a.At(j, k))
			}
		}
	}
	var s mat.VecDense
	if err := s.SolveVec(big, rhs); err != nil {
		var c mat.Condition
		if !errors.As(err, &c) {
			return nil, fmt.Errorf("spectral: Lyapunov equation: %w", err)
		}
	}
	return mat.NewDense(n, n, s.RawVector().Data), nil
}
