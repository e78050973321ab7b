package fokkerplanck

import (
	"fmt"
	"math"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// positive tells whether a density is positive and finite inside the domain:
// by the declared signs, else by its values where there are numbers. The
// conditions are the factors whose zeros would spoil it.
func (d *Diffusion) positive(p algebra.Expr) (Truth, string, []string) {
	if p.Sign() == algebra.Positive {
		return Yes, "", nil
	}
	var conds []string
	if _, fs, ok := p.FactorPowers(); ok {
		for _, f := range fs {
			if f.Base.Sign()&algebra.Zero != 0 && (f.Exp.Sign() < 0 || !f.Exp.IsInt() || f.Exp.Num().Bit(0) == 1) {
				conds = append(conds, f.Base.String()+" != 0")
			}
		}
	}
	t, why := d.sampleSigns(p)
	if t == Yes {
		// The numbers are good; the condition still belongs to the formula.
		return Yes, "", conds
	}
	return t, why, conds
}

// sampleSigns looks at the values of p on a lattice of points of the domain.
func (d *Diffusion) sampleSigns(p algebra.Expr) (Truth, string) {
	q, err := p.SubsFunc(d.Formulas)
	if err == nil {
		q, err = q.Subs(d.Values)
	}
	if err != nil || symbolsLeft(q, d.names()) || len(q.Functions()) > 0 || q.HasIntegral() {
		return Unknown, ""
	}
	n := map[int]int{1: 181, 2: 27, 3: 9}[len(d.Slow)]
	if n == 0 {
		n = 5
	}
	total := 1
	for range d.Slow {
		total *= n
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for k := 0; k < total; k++ {
		at := map[string]float64{}
		m := k
		for _, v := range d.Slow {
			x, ok := d.place(v, (float64(m%n)+0.5)/float64(n))
			if !ok {
				return Unknown, ""
			}
			at[v.Name] = x
			m /= n
		}
		y, err := q.EvalFloat(at)
		if err != nil {
			return No, "it has no positive value at " + d.placeText(at)
		}
		lo, hi = math.Min(lo, y), math.Max(hi, y)
		if lo < 0 && hi > 0 {
			return No, "it changes sign near " + d.placeText(at)
		}
	}
	return Yes, ""
}

// place maps t in (0, 1) into the domain of a variable.
func (d *Diffusion) place(v Variable, t float64) (float64, bool) {
	switch v.Kind {
	case ito.Line:
		return 8*t - 4, true
	case ito.HalfLine:
		return t / (1 - t), true
	case ito.Circle:
		return 2 * math.Pi * t, true
	}
	number := func(e algebra.Expr) (float64, bool) {
		f, err := e.Subs(d.Values)
		if err != nil {
			return 0, false
		}
		x, err := f.EvalFloat(nil)
		return x, err == nil
	}
	a, ok1 := number(v.A)
	b, ok2 := number(v.B)
	return a + (b-a)*t, ok1 && ok2
}

func (d *Diffusion) placeText(at map[string]float64) string {
	s := ""
	for i, v := range d.Slow {
		if i > 0 {
			s += ", "
		}
		s += fmt.Sprintf("%s = %.4g", v.Name, at[v.Name])
	}
	return s
}
