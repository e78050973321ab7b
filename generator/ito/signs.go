package ito

import (
	"math"
	"strconv"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// signs compares the formulas of functions with their declared assumptions:
// exactly, and at sampled points when everything has a number.
func (r *reader) signs() {
	for _, f := range r.system.Functions {
		e := r.entities[f.Name]
		if !f.Body.Valid() || f.Sign == algebra.AnyReal {
			continue
		}
		if s := f.Body.Sign(); s&f.Sign == 0 {
			r.failIn(e.src, e.value.Where(), diagnostic.BrokenSign, "the function "+quote(f.Name)+" is declared "+e.sign.word+", and its formula is never "+e.sign.word)
			continue
		} else if s.Is(f.Sign) {
			continue
		}
		r.sampleSign(f, e)
	}
}

// samples are fractions of an interval; irrational steps keep clear of the zeros
// that symmetric formulas have at simple fractions, and the fractions find them.
func samples() (list []float64) {
	for i := range 25 {
		list = append(list, float64(i)/24)
	}
	for i := range 12 {
		list = append(list, math.Mod(0.1234+float64(i)*0.6180339887498949, 1))
	}
	return list
}

const samplePoints = 1500 // for each function

// sampleSign evaluates the formula over the domain of its arguments. A formula
// that never has its sign there is an error, and so is one of the file that
// breaks it somewhere in a bounded box. On an unbounded domain, or for a formula
// set by an option, breaking it somewhere is a warning: the box that matters is
// not known, and what was derived may hold there all the same.
func (r *reader) sampleSign(f *Function, e *entity) {
	axes := make([]axis, len(f.Args))
	bounded, limited := true, true
	for i, a := range f.Args {
		v := r.system.Variable(a)
		if v == nil {
			return
		}
		var ok bool
		if axes[i], ok = r.axis(v); !ok {
			return
		}
		bounded = bounded && axes[i].bounded
		limited = limited && axes[i].limited
	}
	agrees, witness := false, ""
	slow := &slowSample{r: r, f: f, left: slowSamples}
	r.eachSample(f.Args, axes, func(point map[string]float64) bool {
		x := numeric{r: r, at: point, steps: numericSteps, ok: true}
		v, scale := x.eval(e.value)
		ok := x.ok
		if !ok {
			v, ok = slow.at(point)
			scale = math.Abs(v)
		}
		switch {
		case !ok:
		case !breaks(f.Sign, v, scale, bounded):
			agrees = true
		case witness == "":
			witness = short(v) + " at "
			for i, a := range f.Args {
				if i > 0 {
					witness += ", "
				}
				witness += a + " = " + short(point[a])
			}
		}
		return !agrees || witness == ""
	})
	if witness == "" {
		return
	}
	message := "the function " + quote(f.Name) + " is declared " + e.sign.word + ", and its formula has the value " + witness + r.valuesText(e.value)
	d := e.src.Diagnostic(e.value.Where(), diagnostic.BrokenSign, message)
	if agrees && (!limited || e.src != r.file.Source) {
		r.system.Warnings = append(r.system.Warnings, d)
		return
	}
	r.errs = append(r.errs, d)
}

// slowSample evaluates the canonical form of a formula in extended precision. It
// serves formulas that the quick evaluation does not know, such as those with
// derivatives, at few points.
type slowSample struct {
	r    *reader
	f    *Function
	left int
	body algebra.Expr
}

const slowSamples = 40

func (s *slowSample) at(point map[string]float64) (float64, bool) {
	if s.left == 0 {
		return 0, false
	}
	s.left--
	if !s.body.Valid() {
		body, err := s.f.Body.SubsFunc(s.r.system.Definitions())
		if err == nil {
			body, err = body.Subs(s.r.system.Values())
		}
		if err != nil {
			s.left = 0
			return 0, false
		}
		s.body = body
	}
	v, err := s.body.EvalFloat(point)
	return v, err == nil
}

// eachSample visits points of a box until visit returns false: a grid for one or
// two arguments, a walk through all axes at once for more.
func (r *reader) eachSample(names []string, axes []axis, visit func(map[string]float64) bool) {
	n := 1
	for _, a := range axes {
		n = min(n*len(a.points), samplePoints)
	}
	grid := len(axes) == 1 || len(axes) == 2 && len(axes[0].points)*len(axes[1].points) <= samplePoints
	point := map[string]float64{}
	for k := range n {
		rest := k
		for i, name := range names {
			points := axes[i].points
			if grid {
				point[name] = points[rest%len(points)]
				rest /= len(points)
			} else {
				point[name] = points[(k*(2*i+1)+k/len(points))%len(points)]
			}
		}
		if !visit(point) {
			return
		}
	}
}

// breaks tells whether a value certainly has a sign that was excluded.
func breaks(s algebra.Sign, v, scale float64, closed bool) bool {
	noise := 1e-10 * scale
	switch {
	case s&algebra.Negative == 0 && v < -noise:
		return true
	case s&algebra.Positive == 0 && v > noise:
		return true
	case s&algebra.Zero == 0 && closed && scale > 0 && math.Abs(v) <= 1e-13*scale:
		return true
	}
	return false
}

func short(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }

// axis is a set of points of a variable's domain.
type axis struct {
	points  []float64
	bounded bool // the domain is bounded
	limited bool // it is, or has a window
}

// axis returns the inside of an interval with walls, all of a periodic one, the
// window of an unbounded one. It fails when a bound has no number.
func (r *reader) axis(v *Variable) (a axis, ok bool) {
	lo, hi := -5.0, 5.0
	var b *syntax.Bounds
	switch d := v.Domain; {
	case d.Kind == Circle:
		lo, hi, a.bounded = 0, 2*math.Pi, true
	case d.Kind.Interval():
		b, a.bounded = d.interval, true
	case d.window != nil:
		b = d.window
	case d.Kind == HalfLine:
		lo, hi = 0, 10
	}
	a.limited = a.bounded || b != nil
	if b != nil {
		var okA, okB bool
		lo, okA = r.number(b.A, nil)
		hi, okB = r.number(b.B, nil)
		if !okA || !okB || lo >= hi {
			return a, false
		}
	}
	inside := v.Domain.Kind == Reflecting || v.Domain.Kind == Absorbing || v.Domain.Kind == HalfLine
	for _, s := range samples() {
		if inside && (s == 0 || s == 1) {
			continue
		}
		a.points = append(a.points, lo+(hi-lo)*s)
	}
	return a, true
}

// outside tells why a number is not in the domain of a variable, or returns "".
func (r *reader) outside(v *Variable, x float64) string {
	d := v.Domain
	switch {
	case d.Kind == HalfLine && x < 0:
		return "lies outside the half-line (0, inf)"
	case d.Kind == OnSphere && math.Abs(x) > 1:
		return "is no component of a unit vector"
	case d.Kind.Interval() && d.interval != nil:
		a, okA := r.number(d.interval.A, nil)
		b, okB := r.number(d.interval.B, nil)
		slack := 1e-12 * math.Max(1, b-a)
		if okA && okB && (x < a-slack || x > b+slack) {
			return "lies outside the interval [" + d.interval.A.String() + ", " + d.interval.B.String() + "]" + r.valuesText(d.interval.A, d.interval.B)
		}
	}
	return ""
}
