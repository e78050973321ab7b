package perturb

import (
	"context"
	"math/big"

	"epslim/generator/algebra"
)

// Correction is a further operator of the effective equation
//
//	dv/dt = (L_0 + sum_i delta^i L_i) v,  v = <u>,
//
// where delta is the spacing of the powers of the small parameter. It acts on
// v through the name of u0. Its first- and second-order parts correct drift
// and diffusion; Higher tells that it also has derivatives of third or higher
// order, so that it is no diffusion by itself.
type Correction struct {
	Power     *big.Rat // relative to the limit
	Generator algebra.Expr
	Drift     []algebra.Expr
	Diffusion [][]algebra.Expr
	Higher    algebra.Expr // the part of third and higher order; zero if none
	Residual  algebra.Expr // what its corrector leaves of its equation: zero
}

// corrections continues the hierarchy beyond the limit, up to the given power
// relative to it. With correctors w_j of average zero,
//
//	L_lead w_j = -sum_k L_k w_(j-k) + sum_i w_(j-P-i)[L_i v] + L_(j-P) v,
//
// so the average of sum_k L_k w_(j-k) is the operator L_(j-P): the time
// derivatives drop out of the solvability condition, since they act on
// functions of average zero.
func (e *expansion) corrections(ctx context.Context, top int, upTo *big.Rat) error {
	e.out.UpTo = upTo
	w := []algebra.Expr{e.u[0]}
	eff := []algebra.Expr{}
	for j := 1; ; j++ {
		rel := new(big.Rat).Mul(e.step, new(big.Rat).SetInt64(int64(j-top)))
		if rel.Cmp(upTo) > 0 {
			return nil
		}
		source := e.Ring.Int(0)
		for k, p := range e.Gen.Parts {
			if i := j - e.shift[k]; k > 0 && i >= 0 && !w[i].IsZero() {
				source = source.Add(p.Op.Apply(w[i]))
			}
		}
		// time derivatives of lower correctors
		for i, l := range eff {
			if n := j - top - i; n >= 1 && n < len(w) && !l.IsZero() {
				d, err := e.actOn(w[n], l)
				if err != nil {
					return err
				}
				source = source.Sub(d)
			}
		}
		s, err := e.solve(ctx, source)
		if err != nil {
			return err
		}
		mean, _, err := e.settle(ctx, s.Mean)
		if err != nil {
			return err
		}
		if j >= top {
			eff = append(eff, mean)
		}
		if j > top && !mean.IsZero() {
			c := Correction{Power: rel, Generator: mean, Residual: e.out.Process.Residual(source, s)}
			if err := e.readCorrection(&c); err != nil {
				return err
			}
			e.out.Corrections = append(e.out.Corrections, c)
		}
		phi := s.Phi
		if !phi.IsZero() {
			m, err := e.solve(ctx, phi)
			if err != nil {
				return err
			}
			phi = phi.Sub(m.Mean)
		}
		w = append(w, phi)
	}
}

// actOn puts an operator on u0 into the place of u0: w[L u0].
func (e *expansion) actOn(w, l algebra.Expr) (algebra.Expr, error) {
	ts, err := w.Derivatives(e.out.U0)
	if err != nil {
		return w, err
	}
	out := e.Ring.Int(0)
	for _, t := range ts {
		d := l
		for i, n := range t.Index {
			d = d.DiffN(e.Slow[i], n)
		}
		out = out.Add(t.Coef.Mul(d))
	}
	return out, nil
}

// readCorrection splits the operator by order.
func (e *expansion) readCorrection(c *Correction) error {
	ts, err := c.Generator.Derivatives(e.out.U0)
	if err != nil {
		return err
	}
	low := e.Ring.Int(0)
	c.Higher = e.Ring.Int(0)
	for _, t := range ts {
		v := t.Coef.Mul(e.derivative(t.Index))
		if sumIndex(t.Index) > 2 {
			c.Higher = c.Higher.Add(v)
		} else {
			low = low.Add(v)
		}
	}
	if low.IsZero() {
		c.Drift, c.Diffusion = e.zeros()
		return nil
	}
	c.Drift, c.Diffusion, err = e.coefficients(low)
	return err
}

func (e *expansion) zeros() ([]algebra.Expr, [][]algebra.Expr) {
	n := len(e.Slow)
	d := make([]algebra.Expr, n)
	a := make([][]algebra.Expr, n)
	for i := range d {
		d[i] = e.Ring.Int(0)
		a[i] = make([]algebra.Expr, n)
		for j := range a[i] {
			a[i][j] = e.Ring.Int(0)
		}
	}
	return d, a
}
