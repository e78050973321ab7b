package derivation

import (
	"context"

	"epslim/generator/algebra"
)

// Average is an average over the fast process that the result knows by name
// only: Name = <Of>, where Of may contain correctors, which are named too.
type Average struct {
	Name      string
	Corrector string
	Of        algebra.Expr
	Args      []string // slow variables it depends on
	Zero      bool     // it vanishes by a symmetry of the fast process
	// Value with its error, for the declared values of the parameters; Known
	// is false for averages that depend on the slow variables and where values
	// are missing.
	Value, Error float64
	Known        bool
}

// Averages lists the named averages that the limit contains, in order of
// introduction, and the correctors they need.
func (res *Result) Averages(ctx context.Context) []Average {
	if res.Route == nil || res.Limit == nil {
		return nil
	}
	need := map[string]bool{}
	var visit func(e algebra.Expr)
	visit = func(e algebra.Expr) {
		for _, n := range res.Route.Names() {
			if need[n.Mean] {
				continue
			}
			uses := e.DependsOn(n.Mean)
			for _, f := range e.Functions() {
				uses = uses || f == n.Mean || f == n.Phi
			}
			if uses {
				need[n.Mean] = true
				visit(n.Of)
			}
		}
	}
	for i, f := range res.Limit.Drift {
		visit(f)
		for _, a := range res.Limit.Diffusion[i] {
			visit(a)
		}
	}
	known := map[string]bool{"pi": true}
	for n := range res.System.Values() {
		known[n] = true
	}
	var out []Average
	for _, n := range res.Route.Names() {
		if !need[n.Mean] {
			continue
		}
		a := Average{Name: n.Mean, Corrector: n.Phi, Of: n.Of, Args: n.MeanArgs, Zero: n.Zero}
		if s, ok := res.System.Ring.Symbol(n.Mean); ok && len(n.MeanArgs) == 0 && !n.Zero && res.missing(s, known) == nil {
			if v, de, err := res.Route.At(nil, false).Value(ctx, s); err == nil {
				a.Value, a.Error, a.Known = v, de, true
			}
		}
		out = append(out, a)
	}
	return out
}
