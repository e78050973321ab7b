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

// decay follows log p outwards along rays.
func (d *Diffusion) decay(logp algebra.Expr, unbounded []int) (Truth, string) {
	n := len(unbounded)
	worst := math.Inf(-1)
	for _, ray := range directions(n) {
		if !d.admissible(ray, unbounded) {
			continue
		}
		slope, err := d.slope(logp, unbounded, ray)
		if err != nil {
			return Unknown, "the decay at infinity could not be evaluated: " + err.Error()
		}
		worst = math.Max(worst, slope)
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

// slope estimates d log p / d log R far out, where it has settled.
func (d *Diffusion) slope(logp algebra.Expr, unbounded []int, ray []float64) (float64, error) {
	value := func(R float64) (float64, error) {
		at := pointOf(d, nil)
		for k, i := range unbounded {
			at[d.Slow[i].Name] = R * ray[k]
		}
		return logp.EvalFloat(at)
	}
	// Averages over a decade wash out bounded oscillations.
	best := math.NaN()
	for _, R := range []float64{1e3, 1e5, 1e7} {
		a, err := value(R)
		if err != nil {
			return 0, err
		}
		b, err := value(R * 10)
		if err != nil {
			return 0, err
		}
		best = (b - a) / math.Ln10
		if math.IsInf(b, -1) || best < -1e4 {
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
