package fokkerplanck

import (
	"context"
	"fmt"

	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// Admissible tells why a solution of div J = 0 is nevertheless no stationary
// density of the diffusion, or returns the empty string: it must be
// single-valued on periodic variables, and in one dimension without a period
// carry no current.
func (d *Diffusion) Admissible(ctx context.Context, p algebra.Expr) string {
	for _, v := range d.Slow {
		if v.Kind == ito.Absorbing {
			return fmt.Sprintf("mass leaves through the absorbing sides of %s", v.Name)
		}
	}
	if t, why, _ := d.positive(p); t == No {
		return why
	}
	if t, v, _ := d.singleValued(p); t == No {
		return fmt.Sprintf("it does not return to its value over a period of %s", v)
	}
	if len(d.Slow) != 1 {
		return ""
	}
	if k := d.Slow[0].Kind; k == ito.Periodic || k == ito.Circle {
		return ""
	}
	j := d.Current(p)[0]
	if !d.vanishes(ctx, j) && j.ZeroTest() == algebra.VerdictNonZero {
		if f, err := j.SubsFunc(d.Formulas); err == nil && f.IsZero() {
			return ""
		}
		return fmt.Sprintf("it carries the current %s, which a one-dimensional domain without a period does not allow", j)
	}
	return ""
}
