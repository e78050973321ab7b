package cell

import (
	"fmt"
	"math"
	"math/big"

	"epslim/generator/algebra"
)

// checkOne examines a single autonomous fast variable through its speed
// density m = exp(int 2f/a) / a: zeros of the noise, and the behaviour of m
// and of the integrands at both ends (Karlin and Taylor, A Second Course in
// Stochastic Processes, ch. 15; from memory).
func (p *Process) checkOne(x *Existence, n Numbers, i int, integrands []algebra.Expr) (algebra.Expr, string, error) {
	v := p.Fast[i]
	f, a := p.Drift(i), p.Diffusion(i, i)
	if a.IsZero() {
		if v.Kind == Line && !f.Diff(v.Name).IsZero() && !f.Diff(v.Name).DependsOn(v.Name) {
			return p.checkLinear(x, n, []int{i}) // relaxes to a point
		}
		return p.checkRotor(x, n, i)
	}
	if err := p.checkNoise(x, n, i); err != nil {
		return algebra.Expr{}, "", err
	}
	switch v.Kind {
	case Circle, Periodic:
		if f.IsZero() && !a.DependsOn(v.Name) {
			return p.Ring.Int(1), "diffusion on the circle", nil
		}
		if !f.DependsOn(v.Name) && !a.DependsOn(v.Name) {
			return p.Ring.Int(1), "diffusion on the circle with turning", nil
		}
		d := p.speedDensity(i)
		if d.Valid() {
			if s, err := d.ShiftedBy(v.Name, p.period(i)); err == nil && s.Equal(d) {
				return d, "diffusion on the circle in a potential", nil
			}
		}
		return algebra.Expr{}, "diffusion on the circle", nil
	}
	for _, e := range p.ends(i) {
		if err := p.checkEnd(x, n, i, e, integrands); err != nil {
			return algebra.Expr{}, "", err
		}
	}
	return p.speedDensity(i), p.family(i), nil
}

// checkRotor is the circle without noise: one stationary law when the drift
// has no zero.
func (p *Process) checkRotor(x *Existence, n Numbers, i int) (algebra.Expr, string, error) {
	v := p.Fast[i]
	f := p.Drift(i)
	fail := func() *NotErgodic {
		return &NotErgodic{
			Text:   fmt.Sprintf("the fast variable %s has no noise and its drift %s vanishes somewhere: it comes to rest there, and the point where it rests is not unique", v.Name, f),
			Mend:   fmt.Sprintf("give %s noise at the leading order", v.Name),
			Detail: map[string]algebra.Expr{"drift of " + v.Name: f},
		}
	}
	if v.Kind != Circle && v.Kind != Periodic {
		n := fail()
		n.Text = fmt.Sprintf("the fast variable %s has no noise, and on an interval or line a drift alone leaves no unique stationary law", v.Name)
		return algebra.Expr{}, "", n
	}
	if !f.DependsOn(v.Name) {
		if err := x.require(n, f, "!=", "the rotation of "+v.Name, fail); err != nil {
			return algebra.Expr{}, "", err
		}
		return p.Ring.Int(1), "noise-free rotation", nil
	}
	s := f.Sign()
	if s != algebra.Positive && s != algebra.Negative {
		lo, hi, err := p.sampleRange(n, i, f)
		if err == nil && lo*hi <= 0 {
			return algebra.Expr{}, "", fail()
		}
		x.Conditions = append(x.Conditions, Condition{f, "!=", "the rotation of " + v.Name + " must not stop"})
	}
	d, err := p.Ring.Int(1).Div(f)
	if err != nil {
		return algebra.Expr{}, "", err
	}
	return d, "noise-free rotation", nil
}

func (p *Process) period(i int) algebra.Expr {
	if v := p.Fast[i]; v.Kind == Periodic {
		return v.B.Sub(v.A)
	}
	return p.Ring.Pi().Mul(p.Ring.Int(2))
}

// checkNoise looks for zeros of the noise inside the domain.
func (p *Process) checkNoise(x *Existence, n Numbers, i int) error {
	v := p.Fast[i]
	f, a := p.Drift(i), p.Diffusion(i, i)
	if !a.DependsOn(v.Name) {
		return x.require(n, a, "!=", "noise of "+v.Name, func() *NotErgodic {
			return &NotErgodic{Text: fmt.Sprintf("the noise of %s vanishes", v.Name)}
		})
	}
	for _, g := range a.Factors() {
		if !g.DependsOn(v.Name) || g.Sign()&algebra.Zero == 0 {
			continue
		}
		c, ok := g.Coefficients(v.Name)
		if ok && len(c) == 2 {
			root, err := c[0].Neg().Div(c[1])
			if err != nil {
				continue
			}
			inside := p.inside(n, i, root)
			if inside == algebra.Negative {
				continue
			}
			at, err := f.Subs(map[string]algebra.Expr{v.Name: root})
			if err == nil && at.IsZero() && inside == algebra.Positive {
				return &NotErgodic{
					Text:   fmt.Sprintf("noise and drift of %s vanish together at %s = %s: the process cannot cross that point, so there are several stationary laws (the point itself and what lives on either side)", v.Name, v.Name, root),
					Mend:   fmt.Sprintf("declare %s on one side of the point (a half-line or an interval), or add noise that does not vanish there", v.Name),
					Detail: map[string]algebra.Expr{v.Name: root},
				}
			}
			if inside == algebra.Positive && err == nil {
				x.Unchecked = append(x.Unchecked, fmt.Sprintf("the noise of %s vanishes at %s, where the drift is %s: one-way crossing", v.Name, root, at))
			}
			continue
		}
		if q, ok := p.harmonic(i, g); ok {
			err := x.require(n, q, ">", "noise of "+v.Name+" at every "+v.Name, func() *NotErgodic {
				return &NotErgodic{
					Text:   fmt.Sprintf("the noise of %s vanishes where %s = 0", v.Name, g),
					Mend:   "keep the noise away from zero, or restrict the domain to one side of the point",
					Detail: map[string]algebra.Expr{"must be positive": q},
				}
			})
			if err != nil && p.trapped(n, i, g) != "" {
				return err
			}
			continue
		}
		lo, hi, err := p.sampleRange(n, i, g)
		switch {
		case err == nil && lo > 0 || err == nil && hi < 0:
			if !g.Sign().Is(algebra.NonZero) {
				x.Conditions = append(x.Conditions, Condition{g, "!=", "noise of " + v.Name + " at every " + v.Name})
			}
		case err == nil && (v.Kind == Circle || v.Kind == Periodic):
			x.Conditions = append(x.Conditions, Condition{g, "!=", "noise of " + v.Name + " at every " + v.Name})
			if bad := p.trapped(n, i, g); bad != "" {
				return &NotErgodic{
					Text: fmt.Sprintf("the noise of %s vanishes at %s, and so does its drift: the process cannot cross that point", v.Name, bad),
					Mend: "keep the noise away from zero, or restrict the domain to one side of the point",
				}
			}
		default:
			x.Conditions = append(x.Conditions, Condition{g, "!=", "noise of " + v.Name + " at every " + v.Name})
		}
	}
	return nil
}

// harmonic recognises c0 + c1 cos(k y) + s1 sin(k y) on a circle and returns
// c0^2 - c1^2 - s1^2, which is positive when it has no zero.
func (p *Process) harmonic(i int, g algebra.Expr) (algebra.Expr, bool) {
	v := p.Fast[i]
	if v.Kind != Circle && v.Kind != Periodic {
		return algebra.Expr{}, false
	}
	parts, err := g.SplitReal(v.Name)
	if err != nil {
		return algebra.Expr{}, false
	}
	q := p.Ring.Int(0)
	var freq algebra.Expr
	for _, t := range parts {
		switch {
		case len(t.Atoms) == 0:
			q = q.Add(t.Coef.Mul(t.Coef))
		case len(t.Atoms) == 1 && (t.Atoms[0].Kind == algebra.AtomCos || t.Atoms[0].Kind == algebra.AtomSin):
			if freq.Valid() && !freq.Equal(t.Atoms[0].Frequency) {
				return algebra.Expr{}, false
			}
			freq = t.Atoms[0].Frequency
			q = q.Sub(t.Coef.Mul(t.Coef))
		default:
			return algebra.Expr{}, false
		}
	}
	return q, freq.Valid()
}

// inside tells whether a point is in the open domain (Positive), outside or
// at an end (Negative), or not known.
func (p *Process) inside(n Numbers, i int, at algebra.Expr) algebra.Sign {
	v := p.Fast[i]
	switch v.Kind {
	case Line, Circle, Periodic:
		return algebra.Positive
	case HalfLine:
		s := n.sign(at)
		switch {
		case s == algebra.Positive:
			return algebra.Positive
		case s.Is(algebra.NonPositive):
			return algebra.Negative
		}
	case Reflecting:
		l, h := n.sign(at.Sub(v.A)), n.sign(v.B.Sub(at))
		switch {
		case l == algebra.Positive && h == algebra.Positive:
			return algebra.Positive
		case l.Is(algebra.NonPositive) || h.Is(algebra.NonPositive):
			return algebra.Negative
		}
	}
	return algebra.AnyReal
}

// sampleRange evaluates g over the domain of variable i with the given
// numbers; an error means that numbers are missing.
func (p *Process) sampleRange(n Numbers, i int, g algebra.Expr) (lo, hi float64, err error) {
	g, err = g.SubsFunc(n.Formulas)
	if err != nil {
		return 0, 0, err
	}
	if g, err = g.Subs(n.Values); err != nil {
		return 0, 0, err
	}
	lo, hi = math.Inf(1), math.Inf(-1)
	for k := 0; k <= 720; k++ {
		y, err := p.samplePoint(n, i, (float64(k)+0.5)/721)
		if err != nil {
			return 0, 0, err
		}
		w, err := g.EvalFloat(map[string]float64{p.Fast[i].Name: y})
		if err != nil {
			return 0, 0, err
		}
		lo, hi = math.Min(lo, w), math.Max(hi, w)
	}
	return lo, hi, nil
}

// samplePoint maps t in (0, 1) to the domain of variable i.
func (p *Process) samplePoint(n Numbers, i int, t float64) (float64, error) {
	v := p.Fast[i]
	switch v.Kind {
	case Line:
		return math.Tan(math.Pi * (t - 0.5)), nil
	case HalfLine:
		return t / (1 - t), nil
	case Circle:
		return 2 * math.Pi * t, nil
	}
	a, err := n.number(v.A)
	if err != nil {
		return 0, err
	}
	b, err := n.number(v.B)
	return a + (b-a)*t, err
}

// trapped looks for a point where noise factor and drift vanish together.
func (p *Process) trapped(n Numbers, i int, g algebra.Expr) string {
	f, err := p.Drift(i).SubsFunc(n.Formulas)
	if err != nil {
		return ""
	}
	if f, err = f.Subs(n.Values); err != nil {
		return ""
	}
	if g, err = g.Subs(n.Values); err != nil {
		return ""
	}
	name := p.Fast[i].Name
	for k := 0; k <= 720; k++ {
		y, err := p.samplePoint(n, i, float64(k)/720)
		if err != nil {
			return ""
		}
		at := map[string]float64{name: y}
		a, err1 := g.EvalFloat(at)
		b, err2 := f.EvalFloat(at)
		if err1 == nil && err2 == nil && math.Abs(a) < 1e-3 && math.Abs(b) < 1e-3 {
			return fmt.Sprintf("%s = %.4g", name, y)
		}
	}
	return ""
}

// end is one end of the domain in a local coordinate that goes to zero from
// above, or to infinity.
type end struct {
	label    string
	infinity bool
	sub      algebra.Expr // the variable in terms of itself as local coordinate
	flip     bool         // the local coordinate runs against the variable
}

func (p *Process) ends(i int) []end {
	v := p.Fast[i]
	y, _ := p.Ring.Symbol(v.Name)
	switch v.Kind {
	case Line:
		return []end{{"infinity", true, y, false}, {"minus infinity", true, y.Neg(), true}}
	case HalfLine:
		return []end{{"zero", false, y, false}, {"infinity", true, y, false}}
	case Reflecting:
		return []end{{"the lower end", false, v.A.Add(y), false}, {"the upper end", false, v.B.Sub(y), true}}
	}
	return nil
}

// checkEnd requires that m, and m times each integrand, are integrable at an
// end. With 2f/a ~ s eta^k and a ~ eta^q: for k = -1, m ~ eta^(s-q); for
// k < -1 at zero or k > -1 at infinity the exponential decides by the sign
// of s.
func (p *Process) checkEnd(x *Existence, n Numbers, i int, e end, integrands []algebra.Expr) error {
	v := p.Fast[i]
	local := func(g algebra.Expr) (algebra.Expr, error) {
		return g.Subs(map[string]algebra.Expr{v.Name: e.sub})
	}
	f, err1 := local(p.Drift(i))
	a, err2 := local(p.Diffusion(i, i))
	if err1 != nil || err2 != nil {
		x.Unchecked = append(x.Unchecked, "the behaviour of "+v.Name+" at "+e.label)
		return nil
	}
	if e.flip {
		f = f.Neg()
	}
	q, _, ok := a.Leading(v.Name, e.infinity)
	ratio, err := f.Mul(p.Ring.Int(2)).Div(a)
	if err != nil || !ok {
		x.Unchecked = append(x.Unchecked, "the behaviour of "+v.Name+" at "+e.label)
		return nil
	}
	k, s, ok := ratio.Leading(v.Name, e.infinity)
	if !ok {
		x.Unchecked = append(x.Unchecked, "the behaviour of "+v.Name+" at "+e.label)
		return nil
	}
	what := fmt.Sprintf("%s at %s", v.Name, e.label)
	fail := func(why string) func() *NotErgodic {
		return func() *NotErgodic {
			return &NotErgodic{
				Text:   fmt.Sprintf("the stationary density of %s is not integrable at %s: %s", v.Name, e.label, why),
				Mend:   "a stronger restoring drift, or a bounded or periodic domain",
				Detail: map[string]algebra.Expr{"2 f/a of " + v.Name: ratio},
			}
		}
	}
	minusOne := big.NewRat(-1, 1)
	c := k.Cmp(minusOne)
	switch {
	case !ratio.IsZero() && (e.infinity && c > 0 || !e.infinity && c < 0):
		// exp(s eta^(k+1)/(k+1)) must decay.
		need := s
		if e.infinity {
			need = s.Neg()
		}
		return x.require(n, need, ">", "confinement of "+what, fail("the drift does not pull back there"))
	case ratio.IsZero() || c != 0:
		s = p.Ring.Int(0) // the exponential tends to a constant
	}
	base := s.Sub(p.Ring.Rat(q))
	sign := p.Ring.Int(1)
	if e.infinity {
		sign = sign.Neg()
	}
	need := base.Add(p.Ring.Int(1)).Mul(sign)
	if err := x.require(n, clear(need), ">", "mass of "+what, fail(fmt.Sprintf("it behaves like a power %s there", base))); err != nil {
		return err
	}
	for _, g := range integrands {
		h, err := local(g)
		if err != nil {
			continue
		}
		d, _, ok := h.Leading(v.Name, e.infinity)
		if !ok {
			continue
		}
		if e.infinity && d.Sign() <= 0 || !e.infinity && d.Sign() >= 0 {
			continue
		}
		need := base.Add(p.Ring.Rat(d)).Add(p.Ring.Int(1)).Mul(sign)
		err = x.require(n, clear(need), ">", "a finite average of "+g.String(), func() *NotErgodic {
			return &NotErgodic{
				Text:   fmt.Sprintf("the stationary law of %s exists, but the average of %s that the limit needs diverges at %s", v.Name, g, e.label),
				Mend:   "lighter tails of the fast process, or a bounded amplitude",
				Detail: map[string]algebra.Expr{"exponent": base},
			}
		})
		if err != nil {
			return err
		}
	}
	return nil
}

// clear multiplies a condition by its denominator where that is known to be
// positive: 2 k/D - 2 > 0 reads k - D > 0.
func clear(e algebra.Expr) algebra.Expr {
	num, den := e.NumDen()
	switch den.Sign() {
	case algebra.Positive:
		e = num
	case algebra.Negative:
		e = num.Neg()
	}
	return e.Primitive()
}

// speedDensity is exp(int 2f/a)/a in closed form, or not Valid.
func (p *Process) speedDensity(i int) algebra.Expr {
	f, a := p.Drift(i), p.Diffusion(i, i)
	name := p.Fast[i].Name
	ratio, err := f.Mul(p.Ring.Int(2)).Div(a)
	if err != nil {
		return algebra.Expr{}
	}
	h := ratio
	if da := a.Diff(name); !da.IsZero() {
		l, err := da.Div(a)
		if err != nil {
			return algebra.Expr{}
		}
		h = h.Sub(l)
	}
	var inside map[string]algebra.Expr
	if v := p.Fast[i]; v.Kind == Reflecting || v.Kind == Periodic {
		inside = map[string]algebra.Expr{name: v.A.Add(v.B).Mul(p.Ring.Frac(1, 2))}
	}
	u, err := p.Ring.PotentialIn([]algebra.Expr{h}, []string{name}, inside)
	if err != nil {
		return algebra.Expr{}
	}
	d, err := p.Ring.Call("exp", u)
	if err != nil {
		return algebra.Expr{}
	}
	return d
}

// family names well-known one-dimensional processes.
func (p *Process) family(i int) string {
	name := p.Fast[i].Name
	f, okf := p.Drift(i).Coefficients(name)
	a, oka := p.Diffusion(i, i).Coefficients(name)
	if !okf || !oka || len(f) > 2 || len(a) > 3 {
		return "one-dimensional diffusion"
	}
	switch p.Fast[i].Kind {
	case Line:
		if len(a) == 1 {
			return "Ornstein-Uhlenbeck process"
		}
		return "Pearson diffusion"
	case HalfLine:
		if len(a) == 2 && a[0].IsZero() {
			return "square-root diffusion"
		}
	case Reflecting:
		if len(a) == 3 {
			return "Jacobi diffusion"
		}
		return "reflected diffusion"
	}
	return "one-dimensional diffusion"
}
