package derivation

import (
	"context"
	"fmt"
	"math"
	"math/big"

	"epslim/fokkerplanck"
	"epslim/generator/algebra"
	"epslim/generator/ito"
)

// The verdicts on claims.
const (
	Proven    = "proven"    // by exact algebra
	Agrees    = "agrees"    // numerically, in extended precision
	Refuted   = "refuted"   // with a witness
	Undecided = "undecided" // neither
)

// Verdict is what was found about a claim.
type Verdict struct {
	Claim   *ito.Claim
	Verdict string
	Reason  string
	Witness *Witness
}

// Witness shows a refuted claim: the values at a point, their difference, and
// the likely slip where it can be told.
type Witness struct {
	At         map[string]string
	Claimed    string
	Derived    string
	Difference algebra.Expr // claimed minus derived; for densities div J / p
	Slip       string
}

// judge decides one claim.
func (res *Result) judge(ctx context.Context, c *ito.Claim) Verdict {
	index := func(name string) int {
		for i, v := range res.System.Slow {
			if v.Name == name {
				return i
			}
		}
		return -1
	}
	lim := res.Limit
	switch c.Kind {
	case ito.ClaimDrift:
		i := index(c.Names[0])
		return res.compare(ctx, c, c.Right, lim.Drift[i], func() string { return res.driftSlip(i, c.Right) })
	case ito.ClaimDiffusion:
		i, j := index(c.Names[0]), index(c.Names[1])
		return res.compare(ctx, c, c.Right, lim.Diffusion[i][j], func() string { return res.diffusionSlip(i, j, c.Right) })
	case ito.ClaimDensity:
		return res.judgeDensity(ctx, c)
	case ito.ClaimMean:
		s, err := res.solveCell(ctx, c.Left)
		if err != nil {
			return Verdict{Claim: c, Verdict: Undecided, Reason: "the average could not be found: " + err.Error()}
		}
		return res.compare(ctx, c, c.Right, s, func() string { return ratioSlip(c.Right, s) })
	case ito.ClaimInvariant:
		return res.judgeInvariant(c)
	case ito.ClaimCorrector:
		return res.judgeCorrector(ctx, c, index(c.Names[0]))
	case ito.ClaimNoise:
		return res.judgeNoise(ctx, c, index(c.Names[0]))
	}
	return Verdict{Claim: c, Verdict: Undecided, Reason: "this kind of claim is not known"}
}

// compare tests claimed = derived with names first, then with the formulas.
func (res *Result) compare(ctx context.Context, c *ito.Claim, claimed, derived algebra.Expr, slip func() string) Verdict {
	diff := claimed.Sub(derived)
	if res.Route.IsNumerical(diff) {
		return res.compareNumbers(ctx, c, claimed, derived, slip)
	}
	switch diff.ZeroTest() {
	case algebra.VerdictZero:
		return Verdict{Claim: c, Verdict: Proven, Reason: "equal by exact algebra"}
	case algebra.VerdictUndecided:
		return Verdict{Claim: c, Verdict: Agrees, Reason: "equal in extended precision at random points; the canonical form does not decide it"}
	}
	if f, err := diff.SubsFunc(res.System.Definitions()); err == nil {
		switch f.ZeroTest() {
		case algebra.VerdictZero:
			return Verdict{Claim: c, Verdict: Proven, Reason: "equal by exact algebra for the formulas given, not for arbitrary functions"}
		case algebra.VerdictUndecided:
			return Verdict{Claim: c, Verdict: Agrees, Reason: "equal in extended precision for the formulas given"}
		}
	}
	w := res.witness(claimed, derived)
	w.Difference = diff
	w.Slip = slip()
	return Verdict{Claim: c, Verdict: Refuted, Reason: "differs from the derived " + derived.String(), Witness: w}
}

// compareNumbers tests a claim about a quantity known by numbers only, at
// sample points.
func (res *Result) compareNumbers(ctx context.Context, c *ito.Claim, claimed, derived algebra.Expr, slip func() string) Verdict {
	worst := 0.0
	for k := 0; k < 4; k++ {
		p := res.Route.Sample(k)
		for i, v := range res.System.Slow {
			p.Bind(v.Name, big.NewFloat(res.inDomain(v, k, i)))
		}
		v, de, err := p.Value(ctx, derived)
		if err != nil {
			return Verdict{Claim: c, Verdict: Undecided, Reason: "the derived quantity could not be evaluated: " + err.Error()}
		}
		w, dw, err := p.Value(ctx, claimed)
		if err != nil {
			return Verdict{Claim: c, Verdict: Undecided, Reason: "the claimed quantity could not be evaluated: " + err.Error()}
		}
		scale := math.Max(math.Abs(v), math.Abs(w))
		if math.Abs(v-w) > 100*(de+dw)+1e-9*scale+1e-12 {
			at := map[string]string{}
			for n, x := range p.Values() {
				if f, _ := x.Float64(); claimed.Sub(derived).DependsOn(n) || res.System.Variable(n) != nil {
					at[n] = fmt.Sprintf("%.6g", f)
				}
			}
			return Verdict{Claim: c, Verdict: Refuted, Reason: "differs numerically from the derived quantity", Witness: &Witness{
				At: at, Claimed: fmt.Sprintf("%.10g", w), Derived: fmt.Sprintf("%.10g", v), Slip: slip(),
			}}
		}
		if scale > 0 {
			worst = math.Max(worst, math.Abs(v-w)/scale)
		}
	}
	return Verdict{Claim: c, Verdict: Agrees, Reason: fmt.Sprintf("equal at sample points to %.1g relative", math.Max(worst, 1e-16))}
}

// witness evaluates both sides at a point of the domain where they differ,
// with the model's values and formulas; a function without a formula takes
// some value of its own there, which is shown.
func (res *Result) witness(claimed, derived algebra.Expr) *Witness {
	var best *Witness
	for k := 0; k < 6; k++ {
		w, ok := res.witnessAt(claimed, derived, k)
		if best == nil {
			best = w
		}
		if ok {
			return w
		}
	}
	return best
}

func (res *Result) witnessAt(claimed, derived algebra.Expr, k int) (*Witness, bool) {
	w := &Witness{At: map[string]string{}}
	p := res.Route.Sample(k)
	for i, v := range res.System.Slow {
		p.Bind(v.Name, big.NewFloat(res.inDomain(v, k, i)))
	}
	defs := res.System.Definitions()
	diff := claimed.Sub(derived)
	var vals [2]float64
	sides := [2]algebra.Expr{claimed, derived}
	bind := algebra.Binding{Values: p.Values(), Arbitrary: true, Seed: uint64(k)}
	for i, e := range sides {
		f, err := e.SubsFunc(defs)
		if err != nil {
			return w, false
		}
		v, err := f.EvalBig(bind, 120)
		if err != nil {
			return w, false
		}
		vals[i], _ = v.Float64()
	}
	w.Claimed, w.Derived = fmt.Sprintf("%.10g", vals[0]), fmt.Sprintf("%.10g", vals[1])
	for _, s := range diff.Symbols() {
		if v, ok := p.Values()[s]; ok && res.System.Small != s {
			f, _ := v.Float64()
			w.At[s] = fmt.Sprintf("%.6g", f)
		}
	}
	if _, uses, err := diff.NameFunctions(nil); err == nil {
		for _, u := range uses {
			if _, ok := defs[u.Name]; ok {
				continue
			}
			e := u.Expr
			if v, err := e.EvalBig(bind, 120); err == nil {
				f, _ := v.Float64()
				w.At[e.String()] = fmt.Sprintf("%.6g", f)
			}
		}
	}
	return w, math.Abs(vals[0]-vals[1]) > 1e-9*(math.Abs(vals[0])+math.Abs(vals[1]))
}

// inDomain is a point of the domain of a slow variable, the k-th of a
// sequence.
func (res *Result) inDomain(v *ito.Variable, k, i int) float64 {
	t := math.Mod(0.31+0.382*float64(k)+0.236*float64(i), 1)
	number := func(e algebra.Expr) (float64, bool) {
		if !e.Valid() {
			return 0, false
		}
		f, err := e.Subs(res.System.Values())
		if err != nil {
			return 0, false
		}
		x, err := f.EvalFloat(nil)
		return x, err == nil
	}
	for _, pair := range [][2]algebra.Expr{{v.Domain.A, v.Domain.B}, {v.Domain.WindowA, v.Domain.WindowB}} {
		a, ok1 := number(pair[0])
		b, ok2 := number(pair[1])
		if ok1 && ok2 {
			x := a + (b-a)*t
			return math.Round(x*1e4) / 1e4
		}
	}
	if v.Domain.Kind == ito.HalfLine {
		return 0.2 + 2*t
	}
	return math.Round((4*t-2)*1e4) / 1e4
}

// ratioSlip recognises a wrong constant factor.
func ratioSlip(claimed, derived algebra.Expr) string {
	if derived.IsZero() {
		return ""
	}
	if claimed.IsZero() {
		return "the quantity is not zero"
	}
	q, err := claimed.Div(derived)
	if err != nil {
		return ""
	}
	k, ok := q.IsConstant()
	if !ok {
		return ""
	}
	switch {
	case k.Cmp(big.NewRat(-1, 1)) == 0:
		return "the sign"
	case k.Sign() < 0:
		return "a sign and a factor of " + k.RatString()
	}
	return "a factor of " + k.RatString()
}

// driftSlip names the likely slip in a claimed drift.
func (res *Result) driftSlip(i int, claimed algebra.Expr) string {
	derived := res.Limit.Drift[i]
	if s := ratioSlip(claimed, derived); s != "" && !claimed.IsZero() {
		return s
	}
	if res.Stratonovich != nil && claimed.Equal(res.Stratonovich[i]) {
		return "the Stratonovich drift is given where the Ito drift is meant"
	}
	if res.Stratonovich != nil {
		// the Ito-to-Stratonovich correction with the wrong sign
		twice := derived.Add(derived.Sub(res.Stratonovich[i]))
		if claimed.Equal(twice) {
			return "the Ito-Stratonovich correction is added once more"
		}
	}
	missing := derived.Sub(claimed)
	for _, t := range res.Limit.Terms[i] {
		switch {
		case missing.Equal(t.Value):
			return "a missing term: " + t.Origin
		case missing.Equal(t.Value.Mul(res.System.Ring.Int(2))):
			return "the sign of the term: " + t.Origin
		}
		if q, err := missing.Div(t.Value); err == nil {
			if k, ok := q.IsConstant(); ok {
				one := big.NewRat(1, 1)
				return fmt.Sprintf("a factor of %s in the term: %s", one.Sub(one, k).RatString(), t.Origin)
			}
		}
	}
	if claimed.IsZero() {
		return "the noise-induced drift is left out"
	}
	return ""
}

func (res *Result) diffusionSlip(i, j int, claimed algebra.Expr) string {
	derived := res.Limit.Diffusion[i][j]
	half := res.System.Ring.Frac(1, 2)
	if claimed.Equal(derived.Mul(half)) {
		return "a factor of 1/2: the diffusivity A/2 is given where A = sigma sigma^T is meant"
	}
	if res.Noise != nil && i == j && len(res.Noise[i]) == 1 && claimed.Equal(res.Noise[i][0]) {
		return "sigma is given where A = sigma sigma^T is meant"
	}
	if i != j && claimed.IsZero() {
		return "a missing cross term: the variables share noise"
	}
	return ratioSlip(claimed, derived)
}

// judgeDensity tests a claimed density by the stationary equation itself.
func (res *Result) judgeDensity(ctx context.Context, c *ito.Claim) Verdict {
	p := c.Right
	if p.IsZero() {
		return Verdict{Claim: c, Verdict: Refuted, Reason: "zero is no density", Witness: &Witness{Difference: p}}
	}
	for _, level := range []struct {
		formulas bool
		note     string
	}{{false, ""}, {true, " for the formulas given"}} {
		if level.formulas && len(res.Diffusion.Formulas) == 0 {
			continue
		}
		v, ok := res.densityAt(ctx, c, p, level.formulas, level.note)
		if ok {
			return v
		}
	}
	r := res.densityResidual(p, false, false)
	w := res.witness(r, res.System.Ring.Int(0))
	w.Difference = r
	if d := res.Stationary.Density; d.Valid() {
		w.Slip = res.densitySlip(p, d)
		return Verdict{Claim: c, Verdict: Refuted, Reason: "the stationary Fokker-Planck equation is not satisfied; the density is " + d.String(), Witness: w}
	}
	return Verdict{Claim: c, Verdict: Refuted, Reason: "the stationary Fokker-Planck equation is not satisfied: div J / p is not zero", Witness: w}
}

// densityAt proves a density at one level of detail; ok is false when the
// equation is not satisfied there.
func (res *Result) densityAt(ctx context.Context, c *ito.Claim, p algebra.Expr, formulas bool, note string) (Verdict, bool) {
	r := res.densityResidual(p, formulas, false)
	var z algebra.Verdict
	switch {
	case !res.Route.IsNumerical(r):
		z = r.ZeroTest()
	case res.Diffusion.Vanishes(ctx, r):
		z = algebra.VerdictUndecided
		note = " with numerical averages"
	default:
		z = algebra.VerdictNonZero
	}
	if z == algebra.VerdictNonZero {
		return Verdict{}, false
	}
	d := res.Diffusion
	if why := d.Admissible(ctx, p); why != "" {
		w := &Witness{Difference: res.System.Ring.Int(0), Slip: why}
		return Verdict{Claim: c, Verdict: Refuted, Reason: "the stationary equation holds, but " + why, Witness: w}, true
	}
	v := Verdict{Claim: c, Verdict: Proven, Reason: "div J = 0 by exact algebra" + note}
	if z == algebra.VerdictUndecided {
		v.Verdict, v.Reason = Agrees, "div J = 0 in extended precision"+note
	}
	if res.Stationary.Reversible == fokkerplanck.No {
		v.Reason += " (with a current: the limit is irreversible)"
	}
	return v, true
}

func (res *Result) densitySlip(claimed, derived algebra.Expr) string {
	one := res.System.Ring.Int(1)
	if inv, err := one.Div(derived); err == nil && claimed.Equal(inv) {
		return "the inverse of the density is given"
	}
	return ""
}

func (res *Result) judgeInvariant(c *ito.Claim) Verdict {
	p := res.Limit.Process
	if p.IsInvariant(c.Right) {
		return Verdict{Claim: c, Verdict: Proven, Reason: "the adjoint of the fast generator annihilates it"}
	}
	v := Verdict{Claim: c, Verdict: Refuted, Reason: "the adjoint of the fast generator does not annihilate it", Witness: &Witness{Difference: p.AdjointOn(c.Right)}}
	if d := res.Limit.Existence.Density; d.Valid() {
		v.Reason += "; the invariant density is " + d.String()
	}
	return v
}

// judgeCorrector compares up to a function of the slow variables.
func (res *Result) judgeCorrector(ctx context.Context, c *ito.Claim, i int) Verdict {
	diff := res.Limit.Process.Reduce(c.Right.Sub(res.Limit.Cell[i]))
	for _, v := range res.System.Fast {
		if diff.DependsOn(v.Name) {
			return res.compare(ctx, c, c.Right, res.Limit.Cell[i], func() string { return ratioSlip(c.Right, res.Limit.Cell[i]) })
		}
	}
	return Verdict{Claim: c, Verdict: Proven, Reason: "equal up to a shift that does not depend on the fast variables"}
}

func (res *Result) judgeNoise(ctx context.Context, c *ito.Claim, i int) Verdict {
	if res.Noise == nil || c.Index < 1 || c.Index > len(res.Noise[i]) {
		return Verdict{Claim: c, Verdict: Undecided, Reason: fmt.Sprintf("the smallest noise factor has no column %d", c.Index)}
	}
	s := res.Noise[i][c.Index-1]
	if c.Right.Equal(s.Neg()) {
		return Verdict{Claim: c, Verdict: Proven, Reason: "equal up to the sign of the column, which does not change the law"}
	}
	return res.compare(ctx, c, c.Right, s, func() string { return ratioSlip(c.Right, s) })
}

// solveCell averages a function over the fast process.
func (res *Result) solveCell(ctx context.Context, f algebra.Expr) (algebra.Expr, error) {
	s, err := res.Limit.Average(ctx, f)
	return s, err
}
