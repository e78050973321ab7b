package numeric

import (
	"epslim/generator/algebra"
	"epslim/perturb/cell"
)

// symmetry is a transformation of the fast variables that leaves L0 alone:
// y_i -> Sign_i y_i + shift_i. A function that changes sign under it has
// average zero, and so has its corrector.
type symmetry struct {
	sign  []int          // +1 or -1 for each fast variable
	shift []algebra.Expr // for circles: 0 or half a period
}

// findSymmetries tries all changes of sign of up to four fast variables, each
// circle also shifted by half a period.
func findSymmetries(p *cell.Process) []symmetry {
	n := len(p.Fast)
	if n > 4 {
		return nil
	}
	var out []symmetry
	total := 1
	for range p.Fast {
		total *= 4
	}
	for code := 1; code < total; code++ {
		s := symmetry{make([]int, n), make([]algebra.Expr, n)}
		ok := true
		c := code
		for i, v := range p.Fast {
			s.sign[i], s.shift[i] = 1, p.Ring.Int(0)
			if c&1 == 1 {
				s.sign[i] = -1
				switch v.Kind {
				case cell.HalfLine:
					ok = false
				case cell.Reflecting:
					// reflection about the middle of the interval
					s.shift[i] = v.A.Add(v.B)
				case cell.Periodic:
					s.shift[i] = v.A.Add(v.B)
				}
			}
			if c>>1&1 == 1 {
				switch v.Kind {
				case cell.Circle:
					s.shift[i] = s.shift[i].Add(p.Ring.Pi())
				case cell.Periodic:
					s.shift[i] = s.shift[i].Add(v.B.Sub(v.A).Mul(p.Ring.Frac(1, 2)))
				default:
					ok = false
				}
			}
			c >>= 2
		}
		if ok && s.keeps(p) {
			out = append(out, s)
		}
	}
	return out
}

// image substitutes the transformation into an expression.
func (s symmetry) image(p *cell.Process, e algebra.Expr) (algebra.Expr, bool) {
	with := map[string]algebra.Expr{}
	for i, v := range p.Fast {
		y, _ := p.Ring.Symbol(v.Name)
		with[v.Name] = y.Mul(p.Ring.Int(int64(s.sign[i]))).Add(s.shift[i])
	}
	f, err := e.Subs(with)
	return p.Reduce(f), err == nil
}

// keeps reports whether L0 commutes with the transformation.
func (s symmetry) keeps(p *cell.Process) bool {
	for i := range p.Fast {
		f, ok := s.image(p, p.Drift(i))
		if !ok || !f.Equal(p.Reduce(p.Drift(i).Mul(p.Ring.Int(int64(s.sign[i]))))) {
			return false
		}
		for j := i; j < len(p.Fast); j++ {
			a, ok := s.image(p, p.Diffusion(i, j))
			if !ok || !a.Equal(p.Reduce(p.Diffusion(i, j).Mul(p.Ring.Int(int64(s.sign[i]*s.sign[j]))))) {
				return false
			}
		}
	}
	return true
}

// parityOf is the parity of a product of atoms under symmetry i.
func (r *Route) parityOf(part algebra.RealPart, i int) int {
	s := r.syms[i]
	parity := 1
	explicit := r.p.Ring.Int(1)
	for _, a := range part.Atoms {
		n := r.byPhi[a.Func]
		if a.Kind != algebra.AtomFunc || n == nil {
			explicit = explicit.Mul(a.Expr)
			continue
		}
		k := n.parity[i]
		// derivatives in reflected variables change sign
		for j, d := range a.Deriv {
			for f, v := range r.p.Fast {
				if n.PhiArgs[j] == v.Name && d%2 == 1 {
					k *= s.sign[f]
				}
			}
		}
		if q, ok := a.Power.IsConstant(); !ok || !q.IsInt() {
			return 0
		} else if q.Num().Bit(0) == 0 {
			k *= k
		}
		parity *= k
	}
	if parity == 0 {
		return 0
	}
	image, ok := s.image(r.p, explicit)
	if !ok {
		return 0
	}
	explicit = r.p.Reduce(explicit)
	switch {
	case image.Equal(explicit):
		return parity
	case image.Equal(explicit.Neg()):
		return -parity
	}
	return 0
}
