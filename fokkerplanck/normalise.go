package fokkerplanck

import (
	"fmt"
	"math"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// normalisable tells whether a positive density has finite mass on the
// domain. On bounded domains a density without poles has; on unbounded ones
// the decay of log p along many rays decides, which needs numbers: the mass
// beyond radius R behaves like the integral of p(R) R^(n-1), finite when
// log p falls faster than -n log R.
func (d *Diffusion) normalisable(p algebra.Expr) (Truth, string) {
	unbounded := []int{}
	for i, v := range d.Slow {
		if v.Kind == ito.Line || v.Kind == ito.HalfLine {
			unbounded = append(unbounded, i)
		}
	}
	if len(unbounded) == 0 {
		return Yes, "the domain is bounded and the density has no pole for the declared signs"
	}
	q, err := p.SubsFunc(d.Formulas)
	if err == nil {
		q, err = q.Subs(d.Values)
	}
	if err != nil || symbolsLeft(q, d.names()) || hasFunctions(q, d) {
		if _, isConst := p.IsConstant(); isConst {
			return No, "a constant has infinite mass on an unbounded domain"
		}
		return Unknown, "the decay at infinity depends on functions or parameters without values"
	}
	logp, err := d.Ring.Call("log", q)
	if err != nil {
		return Unknown, "the sign of the density is not known"
	}
	return d.decay(logp, unbounded)
}

func hasFunctions(e algebra.Expr, d *Diffusion) bool {
	_, err := e.EvalFloat(pointOf(d, nil))
	return err != nil && len(e.Symbols()) == 0
}

func pointOf(d *Diffusion, x []float64) map[string]float64 {
	at := map[string]float64{}
	for i, v := range d.Slow {
		at[v.Name] = 0.5
		if x != nil {
			at[v.Name] = x[i]
		}
	}
	return at
}

// decay follows log p outwards along rays, and towards the finite ends of
// half-lines.
func (d *Diffusion) decay(logp algebra.Expr, unbounded []int) (Truth, string) {
	n := len(unbounded)
	worst := math.Inf(-1)
	for _, ray := range directions(n) {
		if !d.admissible(ray, unbounded) {
			continue
		}
		slope, err := d.slope(logp, unbounded, ray, []float64{1e3, 1e5, 1e7})
		if err != nil {
			return Unknown, "the decay at infinity could not be evaluated"
		}
		worst = math.Max(worst, slope)
	}
	for _, i := range unbounded {
		if d.Slow[i].Kind != ito.HalfLine {
			continue
		}
		slope, err := d.slope(logp, []int{i}, []float64{1}, []float64{1e-4, 1e-6, 1e-8})
		if err != nil {
			return Unknown, "the behaviour at the end of the half-line could not be evaluated"
		}
		if slope < -1+1e-6 {
			return No, fmt.Sprintf("p behaves like %s^(%.4g) at %s = 0, which is not integrable", d.Slow[i].Name, slope, d.Slow[i].Name)
		}
	}
	switch {
	case worst < -float64(n)-1e-3:
		if worst < -1e3 {
			return Yes, "log p falls faster than any power along every ray tried"
		}
		return Yes, fmt.Sprintf("p falls like R^(%.4g) or faster along every ray tried, faster than R^(-%d)", worst, n)
	case worst > -float64(n)-1e-6:
		return No, fmt.Sprintf("along some ray p behaves like R^(%.4g), which is not integrable in %d dimension(s)", worst, n)
	}
	return Unknown, fmt.Sprintf("p falls like R^(%.6g): too close to the borderline R^(-%d)", worst, n)
}

func (d *Diffusion) admissible(ray []float64, unbounded []int) bool {
	for k, i := range unbounded {
		if d.Slow[i].Kind == ito.HalfLine && ray[k] <= 0 {
			return false
		}
	}
	return true
}

// slope estimates d log p / d log R at the last of the radii, where it has
// settled. What is in closed form is differenced over a decade, which averages
// bounded oscillations; integrals are differentiated instead of evaluated.
func (d *Diffusion) slope(logp algebra.Expr, unbounded []int, ray, radii []float64) (float64, error) {
	closed, integrals := d.Ring.Int(0), d.Ring.Int(0)
	for _, t := range logp.Summands() {
		if t.HasIntegral() {
			integrals = integrals.Add(t)
		} else {
			closed = closed.Add(t)
		}
	}
	at := func(R float64) map[string]float64 {
		p := pointOf(d, nil)
		for k, i := range unbounded {
			p[d.Slow[i].Name] = R * ray[k]
		}
		return p
	}
	radial := d.Ring.Int(0) // R d/dR of the integrals
	for _, i := range unbounded {
		x, _ := d.Ring.Symbol(d.Slow[i].Name)
		radial = radial.Add(x.Mul(integrals.Diff(d.Slow[i].Name)))
	}
	best := math.NaN()
	for _, R := range radii {
		a, err := closed.EvalFloat(at(R))
		if err != nil {
			return 0, err
		}
		b, err := closed.EvalFloat(at(R * 10))
		if err != nil {
			return 0, err
		}
		best = (b - a) / math.Ln10
		const samples = 7
		for k := 0; k < samples && !radial.IsZero(); k++ {
			v, err := radial.EvalFloat(at(R * math.Pow(10, (float64(k)+0.5)/samples)))
			if err != nil {
				return 0, err
			}
			best += v / samples
		}
		if best < -1e4 {
			return -1e4, nil
		}
	}
	return best, nil
}

// directions are unit vectors spread over the sphere of n dimensions.
func directions(n int) [][]float64 {
	if n == 1 {
		return [][]float64{{1}, {-1}}
	}
	var out [][]float64
	rec := func(v []float64) {
		s := 0.0
		for _, x := range v {
			s += x * x
		}
		if s == 0 {
			return
		}
		u := make([]float64, n)
		for i := range v {
			u[i] = v[i] / math.Sqrt(s)
		}
		out = append(out, u)
	}
	if n == 2 {
		for k := 0; k < 48; k++ {
			a := 2 * math.Pi * (float64(k) + 0.137) / 48
			rec([]float64{math.Cos(a), math.Sin(a)})
		}
		for _, v := range [][]float64{{1, 0}, {-1, 0}, {0, 1}, {0, -1}} {
			rec(v)
		}
		return out
	}
	total := 1
	for i := 0; i < n; i++ {
		total *= 3
	}
	for k := 0; k < total && k < 2187; k++ {
		v := make([]float64, n)
		m := k
		for i := range v {
			v[i] = float64(m%3 - 1)
			m /= 3
		}
		rec(v)
	}
	return out
}

// numeric evaluates a number.
func numeric(e algebra.Expr) (float64, error) { return e.EvalFloat(map[string]float64{}) }
