package quadrature

import (
	"fmt"
	"math"
	"sort"

	"epslim/perturb/cell/quadrature/fast"
)

// noiseZero is a place where the noise vanishes inside the domain.
type noiseZero struct {
	y     float64
	drift float64 // 0 where it vanishes too
}

// scanPoints samples a domain densely; unbounded ends are reached by sinh.
func scanPoints(d fast.Domain, n int) []float64 {
	lo, hi := d.Ends()
	out := make([]float64, 0, n+1)
	for i := 0; i <= n; i++ {
		u := float64(i) / float64(n)
		switch d.Kind {
		case fast.Line:
			out = append(out, math.Sinh(24*u-12))
		case fast.HalfLine:
			out = append(out, math.Exp(40*u-20))
		default:
			// Interior points only: the ends are classified on their own.
			if !d.IsPeriodic() && (i == 0 || i == n) {
				continue
			}
			out = append(out, lo+(hi-lo)*u)
		}
	}
	return out
}

// findNoiseZeros looks for interior zeros of a: minima that reach zero. a is
// not negative, so its zeros are minima. none is true when the noise is absent
// altogether.
func findNoiseZeros(d fast.Domain, drift, diff *fast.Coefficient) (zeros []noiseZero, none bool) {
	y := scanPoints(d, 960)
	a := make([]float64, len(y))
	diff.Values(a, [][]float64{y})
	largest := 0.0
	for _, v := range a {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			largest = math.Max(largest, v)
		}
	}
	if largest == 0 {
		return nil, true
	}
	n := len(y)
	for i := 0; i < n; i++ {
		l, r := i-1, i+1
		if d.IsPeriodic() {
			// y[0] and y[n-1] are the same point.
			if i == n-1 {
				continue
			}
			if l < 0 {
				l = n - 2
			}
		} else if l < 0 || r >= n {
			continue
		}
		if !(a[i] <= a[l] && a[i] <= a[r]) || (a[i] == a[l] && a[i] > 0) {
			continue
		}
		yl := y[l]
		if l > i {
			yl -= y[n-1] - y[0]
		}
		z, az := minimize(func(x float64) float64 { return diff.At(x) }, yl, y[i], y[r])
		scale := math.Max(a[l], a[r])
		if z0 := snap(z, y[r]-yl); z0 != z {
			if v := diff.At(z0); v <= az {
				z, az = z0, v
			}
		}
		if az > 1e-12*scale {
			continue
		}
		f := drift.At(z)
		fs := math.Max(math.Abs(drift.At(yl)), math.Abs(drift.At(y[r])))
		if math.Abs(f) < 1e-5*fs {
			f = 0
		}
		if k := len(zeros); k > 0 && math.Abs(zeros[k-1].y-z) < 1e-6*(y[r]-yl) {
			continue
		}
		zeros = append(zeros, noiseZero{y: z, drift: f})
	}
	sort.Slice(zeros, func(i, j int) bool { return zeros[i].y < zeros[j].y })
	return zeros, false
}

// NoiseZeros returns the places inside a one-dimensional domain where the noise
// vanishes (none when it vanishes everywhere).
func NoiseZeros(d fast.Domain, drift, noise func(y float64) float64) []float64 {
	f, a := fast.Func1("drift", drift), fast.Func1("noise^2", noise)
	zeros, none := findNoiseZeros(d, &f, &a)
	if none {
		return nil
	}
	var out []float64
	for _, z := range zeros {
		out = append(out, z.y)
	}
	return out
}

// snap moves a place found to half precision to a round one nearby.
func snap(z, width float64) float64 {
	for _, unit := range []float64{1, 0.5, 0.25, 0.1, 0.01, math.Pi / 6, math.Pi / 4} {
		if r := math.Round(z/unit) * unit; math.Abs(r-z) < 1e-5*width {
			return r
		}
	}
	return z
}

// minimize is golden-section search on [lo, hi].
func minimize(f func(float64) float64, lo, mid, hi float64) (x, v float64) {
	const g = 0.3819660112501051
	x, v = mid, f(mid)
	for i := 0; i < 120 && hi-lo > 4e-16*math.Max(math.Abs(lo), math.Abs(hi)); i++ {
		var t float64
		if hi-x > x-lo {
			t = x + g*(hi-x)
		} else {
			t = x - g*(x-lo)
		}
		ft := f(t)
		if ft <= v {
			if t > x {
				lo = x
			} else {
				hi = x
			}
			x, v = t, ft
		} else if t > x {
			hi = t
		} else {
			lo = t
		}
	}
	return x, v
}

// carrier finds the interval that carries the stationary law of a process
// whose noise vanishes at the given places.
func carrier(d fast.Domain, zeros []noiseZero, test func(interval) error) (interval, []string, error) {
	lo, hi := d.Ends()
	if len(zeros) == 0 {
		iv := interval{lo: lo, hi: hi, periodic: d.IsPeriodic()}
		if iv.periodic {
			iv.period = hi - lo
		}
		return iv, nil, nil
	}
	var pieces []interval
	if d.IsPeriodic() {
		for i, z := range zeros {
			end := zeros[0].y + hi - lo
			if i+1 < len(zeros) {
				end = zeros[i+1].y
			}
			pieces = append(pieces, interval{lo: z.y, hi: end, period: hi - lo})
		}
	} else {
		a := lo
		for _, z := range zeros {
			pieces = append(pieces, interval{lo: a, hi: z.y})
			a = z.y
		}
		pieces = append(pieces, interval{lo: a, hi: hi})
	}
	return closedPiece(d, zeros, pieces, test)
}

// closedPiece lists the stationary laws: point masses where drift and noise
// vanish together, and pieces that nothing leaves.
func closedPiece(d fast.Domain, zeros []noiseZero, pieces []interval, test func(interval) error) (interval, []string, error) {
	name := d.Name(0)
	var laws, notes []string
	for _, z := range zeros {
		if z.drift == 0 {
			laws = append(laws, fmt.Sprintf("a point mass at %s = %.6g", name, z.y))
			notes = append(notes, fmt.Sprintf("noise and drift vanish together at %s = %.6g: nothing crosses", name, z.y))
		} else {
			notes = append(notes, fmt.Sprintf("noise vanishes at %s = %.6g and the drift %.6g carries across one way", name, z.y, z.drift))
		}
	}
	n := len(zeros)
	var found []interval
	var why error
	for i, p := range pieces {
		var atLo, atHi float64 // drift at the ends that are zeros of the noise
		if d.IsPeriodic() {
			atLo, atHi = zeros[i].drift, zeros[(i+1)%n].drift
		} else {
			if i > 0 {
				atLo = zeros[i-1].drift
			}
			if i < n {
				atHi = zeros[i].drift
			}
		}
		if atLo < 0 || atHi > 0 {
			continue
		}
		if err := test(p); err != nil {
			why = err
			continue
		}
		found = append(found, p)
		laws = append(laws, fmt.Sprintf("one on %s < %s < %s", ends(p.lo), name, ends(p.hi)))
	}
	switch {
	case len(laws) == 1 && len(found) == 1:
		return found[0], notes, nil
	case len(laws) == 0 && d.IsPeriodic() && why == nil:
		return interval{}, notes, &fast.Unsupported{Method: "quadrature", Reason: "the noise vanishes on the circle where the drift carries round it; " + notes[0]}
	case len(laws) == 0 && why != nil:
		return interval{}, notes, why
	case len(laws) == 0:
		return interval{}, notes, &fast.NotErgodic{Reason: "every part of the domain is left for good: " + notes[0]}
	case len(laws) == 1:
		return interval{}, notes, &fast.NotErgodic{Reason: "everything is drawn to a place without noise and without drift", Components: laws,
			Mend: "add noise that does not vanish at " + name + fmt.Sprintf(" = %.6g", zeros[0].y)}
	}
	return interval{}, notes, &fast.NotErgodic{Reason: "there is more than one stationary law; " + notes[0], Components: laws,
		Mend: "restrict the domain to one component or add noise that crosses"}
}

func ends(x float64) string {
	if math.IsInf(x, 0) {
		return fmt.Sprint(x)
	}
	return fmt.Sprintf("%.6g", x)
}

// endReport classifies one end of an interval from the powers of the speed
// and scale densities there (Feller).
type endReport struct {
	kind     endKind
	speed    float64 // decay rate of m |dy/dt| in log distance; > 0 when integrable
	scale    float64 // the same for the scale density
	followed bool    // the density fell below the cutoff: integrable
}

func (e endReport) String() string {
	switch {
	case e.kind == endRegular:
		return "regular end, reflecting"
	case e.followed:
		return "density vanishes faster than any power"
	case e.speed > 0 && e.scale > 0:
		return fmt.Sprintf("regular end (reached; reflects), speed density exponent %.6g", e.speed)
	case e.speed > 0 && e.kind == endSingular:
		return fmt.Sprintf("entrance or natural end (not reached), speed density exponent %.6g", e.speed)
	case e.speed > 0:
		return fmt.Sprintf("natural end, density falls like a power with exponent %.6g", -1-e.speed)
	case e.scale > 0:
		return "attracting end: the process is drawn to it and the speed measure is infinite"
	default:
		return "null end: not attracting, but the speed measure is infinite"
	}
}

// classify reads the exponents at an end off the outermost panel.
func (b *builder) classify(ps []*panel, side int) endReport {
	r := endReport{kind: b.ends[side]}
	if r.kind == endRegular {
		return r
	}
	if b.dropped[side] {
		r.followed, r.speed = true, math.Inf(1)
		return r
	}
	i, at, in := 0, -1.0, 0.0
	if side == 1 {
		i, at = len(ps)-1, 1
	}
	p := ps[i]
	span := math.Abs(p.t1-p.t0) / 2 // distance in t from the centre to the end
	u, s := make([]float64, len(p.y)), make([]float64, len(p.y))
	for j := range u {
		u[j] = p.cumW[j] + math.Log(2/p.a[j]) + math.Log(p.d[j])
		s[j] = -p.cumW[j] + math.Log(p.d[j])
	}
	r.speed = (b.cheb.at(u, in) - b.cheb.at(u, at)) / span
	r.scale = (b.cheb.at(s, in) - b.cheb.at(s, at)) / span
	return r
}

// exists turns the classification into an outcome.
func exists(d fast.Domain, iv interval, ends2 [2]endReport) error {
	for side, r := range ends2 {
		if r.kind == endRegular || r.followed || r.speed > 1e-7 {
			continue
		}
		place := ends(iv.lo)
		if side == 1 {
			place = ends(iv.hi)
		}
		e := &fast.NotErgodic{Reason: fmt.Sprintf("the stationary density of %s is not integrable at %s (%v)", d.Name(0), place, r)}
		if r.kind == endInfinite {
			e.Reason += fmt.Sprintf("; it goes like |%s|^%.6g", d.Name(0), -1-r.speed)
			e.Mend = "a drift that confines, or a circle in the place of the line"
		} else {
			e.Reason += fmt.Sprintf("; it goes like the distance to the power %.6g", r.speed-1)
			e.Mend = "noise or drift that keeps the process away from that end"
		}
		return e
	}
	return nil
}
