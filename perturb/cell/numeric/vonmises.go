package numeric

import (
	"epslim/generator/algebra"
	"epslim/perturb/cell"
)

// vonMises is a single fast angle with constant noise in a potential of one
// harmonic: its law is exp(kappa cos(w y)) or exp(kappa sin(w y)), whose
// averages are ratios of modified Bessel functions (Abramowitz and Stegun
// 9.6.34; K.V. Mardia, P.E. Jupp, Directional Statistics (2000), section 3.5;
// from memory).
type vonMises struct {
	r     *algebra.Ring
	name  string       // the angle
	y     algebra.Expr // its symbol
	w     algebra.Expr // frequency of the potential
	kappa algebra.Expr
	sine  bool         // the exponent is kappa sin(w y)
	a     algebra.Expr // diffusion
	f     algebra.Expr // drift
	m     algebra.Expr // the law without its factor
	i0    algebra.Expr
}

// findVonMises recognises the law, or returns nil.
func findVonMises(p *cell.Process) *vonMises {
	if len(p.Fast) != 1 || p.Fast[0].Kind != cell.Circle && p.Fast[0].Kind != cell.Periodic {
		return nil
	}
	r := p.Ring
	v := &vonMises{r: r, name: p.Fast[0].Name, a: p.Diffusion(0, 0), f: p.Drift(0)}
	if v.a.IsZero() || v.a.DependsOn(v.name) {
		return nil
	}
	ratio, err := v.f.Mul(r.Int(2)).Div(v.a)
	if err != nil {
		return nil
	}
	parts, err := ratio.SplitReal(v.name)
	if err != nil || len(parts) != 1 || len(parts[0].Atoms) != 1 {
		return nil
	}
	atom, c := parts[0].Atoms[0], parts[0].Coef
	if atom.Kind != algebra.AtomSin && atom.Kind != algebra.AtomCos {
		return nil
	}
	v.y, _ = r.Symbol(v.name)
	v.w = atom.Frequency
	if v.kappa, err = c.Div(v.w); err != nil {
		return nil
	}
	other := "cos"
	if atom.Kind == algebra.AtomCos {
		v.sine, other = true, "sin"
	} else {
		v.kappa = v.kappa.Neg()
	}
	wave, err := r.Call(other, v.w.Mul(v.y))
	if err != nil {
		return nil
	}
	if v.m, err = r.Call("exp", v.kappa.Mul(wave)); err != nil {
		return nil
	}
	if v.i0, err = r.Call("besseli", r.Int(0), v.kappa); err != nil {
		return nil
	}
	return v
}

// mean is the average of a trigonometric polynomial over the law, flat over
// the uniform law; ok is false for anything else.
func (v *vonMises) mean(e algebra.Expr) (law, flat algebra.Expr, ok bool) {
	law, flat = v.r.Int(0), v.r.Int(0)
	parts, err := e.SplitReal(v.name)
	if err != nil {
		return law, flat, false
	}
	for _, p := range parts {
		switch {
		case len(p.Atoms) == 0:
			law, flat = law.Add(p.Coef), flat.Add(p.Coef)
			continue
		case len(p.Atoms) > 1 || p.Atoms[0].Kind != algebra.AtomCos && p.Atoms[0].Kind != algebra.AtomSin:
			return law, flat, false
		}
		ratio, err := p.Atoms[0].Frequency.Div(v.w)
		if err != nil {
			return law, flat, false
		}
		q, isNumber := ratio.IsConstant()
		if !isNumber {
			return law, flat, false
		}
		if !q.IsInt() {
			continue // the law has the period of its potential
		}
		n := q.Num().Int64()
		b, ok := v.harmonic(int(n), p.Atoms[0].Kind == algebra.AtomSin)
		if !ok {
			return law, flat, false
		}
		law = law.Add(p.Coef.Mul(b))
	}
	return law, flat, true
}

// harmonic is <cos(n w y)> or <sin(n w y)>.
func (v *vonMises) harmonic(n int, sin bool) (algebra.Expr, bool) {
	sign := int64(0)
	switch {
	case !v.sine && !sin:
		sign = 1
	case v.sine && !sin: // cos(n pi/2)
		sign = [4]int64{1, 0, -1, 0}[((n%4)+4)%4]
	case v.sine && sin: // sin(n pi/2)
		sign = [4]int64{0, 1, 0, -1}[((n%4)+4)%4]
	}
	if sign == 0 {
		return v.r.Int(0), true
	}
	b, err := v.r.Call("besseli", v.r.Int(int64(n)), v.kappa)
	if err != nil {
		return b, false
	}
	b, err = b.Mul(v.r.Int(sign)).Div(v.i0)
	return b, err == nil
}

// primitive is P with (g - <g>) m = (P m)', a trigonometric polynomial.
func (v *vonMises) primitive(g algebra.Expr) (algebra.Expr, bool) {
	law, _, ok := v.mean(g)
	if !ok {
		return g, false
	}
	u, err := v.r.Potential([]algebra.Expr{g.Sub(law).Mul(v.m)}, []string{v.name})
	if err != nil {
		return g, false
	}
	p, err := u.Div(v.m)
	if err != nil {
		return g, false
	}
	_, _, ok = v.mean(p)
	return p, ok
}

// withCorrector is <h Phi^(k)> for k = 0, 1, 2, where L0 Phi = <g> - g. With
// (g - <g>) m = (P m)' the corrector has
//
//	Phi' = -2/(a m) (P m + C),  C = -flat(P)/I0,
//
// C from its periodicity, and averages follow by integration by parts.
func (v *vonMises) withCorrector(h, g algebra.Expr, k int) (algebra.Expr, bool) {
	p, ok := v.primitive(g)
	if !ok {
		return h, false
	}
	_, flatP, _ := v.mean(p)
	c, err := flatP.Neg().Div(v.i0)
	if err != nil {
		return h, false
	}
	two, err := v.r.Int(2).Div(v.a)
	if err != nil {
		return h, false
	}
	switch k {
	case 0:
		q, ok := v.primitive(h)
		if !ok {
			return h, false
		}
		lawPQ, _, ok1 := v.mean(p.Mul(q))
		_, flatQ, ok2 := v.mean(q)
		last, err := c.Mul(flatQ).Div(v.i0)
		return two.Mul(lawPQ.Add(last)), ok1 && ok2 && err == nil
	case 1:
		lawHP, _, ok1 := v.mean(h.Mul(p))
		_, flatH, ok2 := v.mean(h)
		last, err := c.Mul(flatH).Div(v.i0)
		return two.Mul(lawHP.Add(last)).Neg(), ok1 && ok2 && err == nil
	case 2:
		// Phi'' = (2/a) (<g> - g - f Phi')
		lawG, _, ok1 := v.mean(g)
		lawH, _, ok2 := v.mean(h)
		lawHG, _, ok3 := v.mean(h.Mul(g))
		first, ok4 := v.withCorrector(h.Mul(v.f), g, 1)
		return two.Mul(lawH.Mul(lawG).Sub(lawHG).Sub(first)), ok1 && ok2 && ok3 && ok4
	}
	return h, false
}

// average is the closed form of the average of a part, if it has one.
func (r *Route) average(part algebra.RealPart) (algebra.Expr, bool) {
	v := r.circle
	if v == nil {
		return algebra.Expr{}, false
	}
	h := r.p.Ring.Int(1)
	var phi *Name
	order := 0
	for _, a := range part.Atoms {
		n := r.byPhi[a.Func]
		if a.Kind != algebra.AtomFunc || n == nil {
			h = h.Mul(a.Expr)
			continue
		}
		if q, ok := a.Power.IsConstant(); phi != nil || !ok || !q.IsInt() || q.Num().Int64() != 1 {
			return algebra.Expr{}, false
		}
		phi = n
		for i, d := range a.Deriv {
			if n.PhiArgs[i] == v.name {
				order = d
			} else if d != 0 {
				return algebra.Expr{}, false // a slow derivative of the corrector
			}
		}
	}
	if phi == nil {
		law, _, ok := v.mean(h)
		return law, ok
	}
	if len(phi.Of.Functions()) > 0 && r.dependsOnPhi(phi.Of) {
		return algebra.Expr{}, false
	}
	return v.withCorrector(h, phi.Of, order)
}

func (r *Route) dependsOnPhi(e algebra.Expr) bool {
	for _, f := range e.Functions() {
		if r.byPhi[f] != nil {
			return true
		}
	}
	return false
}
