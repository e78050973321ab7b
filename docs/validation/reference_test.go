package validation

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"sort"
	"strings"
	"testing"
)

// notCovered lists what the program does not find yet: a case, or one check of
// a case. What passes must be taken out of this table.
var notCovered = map[string]string{
	"b606: mean drift": "the mean drift is given by the name of an integral, not by a formula or a number",
}

// tolerance for numbers, times max(1, |value|). The files hold 16 digits.
const tolerance = 1e-12

// refCase is a reference case as it stands in its file.
type refCase struct {
	ID, Source, Notes string
	Expect            struct {
		Regime       string
		ScoreRegime  *bool `json:"score_regime"`
		Exact        bool
		Drift        map[string]*string
		Diffusion    map[string]*string
		Density      *string
		Reversible   *bool
		Normalizable *bool
		Current      map[string]string
		TimeScale    string            `json:"time_scale"`
		MeanDrift    map[string]string `json:"mean_drift"`
	}
	Points []refPoint
	Wrong  []struct{ Claim, Expr, Why string }
	// DensityOptional: the density exists in closed form, but the limit is
	// irreversible, so that the program need not find it, only confirm it.
	DensityOptional bool `json:"density_optional"`
	// Multivalued: reversibility cannot be told with functions left as names.
	Multivalued bool
}

type refPoint struct {
	Set          map[string]json.Number
	Functions    map[string]string
	At           map[string]json.Number
	Drift        map[string]*float64
	Diffusion    map[string]*float64
	MeanDrift    map[string]float64 `json:"mean_drift"`
	Normalizable *bool
	Reversible   *bool
	Tolerance    float64
}

// outcome of one case: table rows, and what did not agree.
type outcome struct {
	title string
	rows  []row
	fails []failure
}

// failure is a check that did not agree.
type failure struct{ check, detail string }

func (o *outcome) fail(check, format string, args ...any) {
	o.fails = append(o.fails, failure{check, fmt.Sprintf(format, args...)})
}

func (o *outcome) add(quantity, expected, obtained, agreement string) {
	o.rows = append(o.rows, row{quantity, expected, obtained, agreement})
}

func loadCases() ([]*refCase, error) {
	files, err := filepath.Glob("cases/*.json")
	if err != nil {
		return nil, err
	}
	var out []*refCase
	for _, f := range files {
		b, err := os.ReadFile(f)
		if err != nil {
			return nil, err
		}
		c := &refCase{}
		if err := json.Unmarshal(b, c); err != nil {
			return nil, fmt.Errorf("%s: %w", f, err)
		}
		out = append(out, c)
	}
	return out, nil
}

func TestReferenceCases(t *testing.T) {
	runAll(t)
	if len(all.cases) != 64 {
		t.Fatalf("%d cases, want 64", len(all.cases))
	}
	for _, c := range all.cases {
		t.Run(c.ID, func(t *testing.T) {
			open := map[string]bool{}
			for _, f := range all.outcomes[c.ID].fails {
				key := c.ID + ": " + f.check
				switch {
				case notCovered[c.ID] != "":
					open[c.ID] = true
				case notCovered[key] != "":
					open[key] = true
				default:
					t.Errorf("%s: %s", f.check, f.detail)
				}
			}
			for key, why := range notCovered {
				if (key == c.ID || strings.HasPrefix(key, c.ID+": ")) && !open[key] {
					t.Errorf("%q is listed as not covered (%s), but passes: take it out of the table", key, why)
				}
			}
		})
	}
	for key := range notCovered {
		id, _, _ := strings.Cut(key, ":")
		if _, err := os.Stat("cases/" + id + ".json"); err != nil {
			t.Errorf("notCovered names an unknown case %q", id)
		}
	}
}

// check compares everything a case says.
func (c *refCase) check() *outcome {
	o := &outcome{}
	model, err := readModel(c.ID)
	if err != nil {
		o.fail("runs", "%v", err)
		return o
	}
	if reason, ok := strings.CutPrefix(c.Expect.Regime, "refused:"); ok {
		c.checkRefusal(o, model, reason)
		return o
	}
	full, claims := c.withClaims(model)
	f, err := derive(c.ID, full, nil, nil)
	if err != nil {
		o.fail("runs", "%s", firstLine(err))
		return o
	}
	o.title = f.result.System.Title
	if f.Refused != nil {
		o.fail("not refused", "refused: %s", f.Refused.Reason)
		return o
	}
	c.checkClaims(o, f, claims)
	c.checkLabels(o, f)
	c.checkStationary(o, f)
	for i := range c.Points {
		c.checkPoint(o, model, i)
	}
	c.pointRow(o)
	return o
}

// claim is a formula to be proven, or a slip to be refuted.
type claim struct {
	label, expr, why string
	wrong            bool
}

// withClaims appends the expected formulas and the plausible slips to the
// model as claims.
func (c *refCase) withClaims(model string) (string, []claim) {
	var list []claim
	for _, n := range keys(c.Expect.Drift) {
		if e := c.Expect.Drift[n]; e != nil {
			list = append(list, claim{label: "drift " + n, expr: *e})
		}
	}
	for _, n := range keys(c.Expect.Diffusion) {
		if e := c.Expect.Diffusion[n]; e != nil {
			list = append(list, claim{label: "diffusion " + strings.ReplaceAll(n, ",", " "), expr: *e})
		}
	}
	if c.Expect.Density != nil {
		list = append(list, claim{label: "density", expr: *c.Expect.Density})
	}
	for _, w := range c.Wrong {
		list = append(list, claim{label: w.Claim, expr: w.Expr, why: w.Why, wrong: true})
	}
	var b strings.Builder
	b.WriteString(strings.TrimRight(model, "\n"))
	b.WriteByte('\n')
	for _, l := range list {
		fmt.Fprintf(&b, "claim %s = %s\n", l.label, l.expr)
	}
	return b.String(), list
}

func (c *refCase) checkClaims(o *outcome, f *finding, claims []claim) {
	refuted, wrong := 0, 0
	verdicts := f.Claims[len(f.Claims)-len(claims):]
	for i, l := range claims {
		v := verdicts[i]
		if l.wrong {
			wrong++
			if v.Verdict == "refuted" {
				refuted++
			} else {
				o.fail("slips refuted", "the slip %s = %s (%s) is %s", l.label, l.expr, l.why, v.Verdict)
			}
			continue
		}
		if v.Verdict != "proven" && (c.Expect.Exact || v.Verdict != "agrees") {
			o.fail("formulas", "%s = %s is %s: %s", l.label, l.expr, v.Verdict, v.Reason)
		}
		o.add(l.label, code(f.short(l.expr)), code(f.obtained(l.label)), v.Verdict)
	}
	if wrong > 0 {
		o.add("plausible slips", fmt.Sprintf("%d refuted", wrong), fmt.Sprintf("%d refuted", refuted), agreement(wrong == refuted))
	}
}

// short writes v for v(x,y), as the model language allows.
func (f *finding) short(expr string) string {
	for _, v := range f.result.System.Functions {
		expr = strings.ReplaceAll(expr, v.Name+"("+strings.Join(v.Args, ",")+")", v.Name)
	}
	return expr
}

// obtained is the program's own formula for what a label names.
func (f *finding) obtained(label string) string {
	words := strings.Fields(label)
	var e *string
	switch words[0] {
	case "drift":
		e = f.Limit.Drift[words[1]]
	case "diffusion":
		e = entry(f.Limit.Diffusion, words[1]+","+words[2])
	case "density":
		e = f.Stationary.Density
	}
	if e == nil {
		return ""
	}
	return *e
}

func (c *refCase) checkLabels(o *outcome, f *finding) {
	x := &c.Expect
	if x.ScoreRegime == nil && f.Regime != x.Regime && !deterministic(x.Diffusion) {
		o.fail("regime", "regime is %s, want %s", f.Regime, x.Regime)
	}
	if f.Exact && f.Method != "closure" && f.Method != "quadrature" {
		o.fail("exactness", "the result of the %s route is said to be exact", f.Method)
	}
	if x.Exact && !f.Exact {
		o.fail("exactness", "the result is not exact (method %s)", f.Method)
	}
	want := x.TimeScale
	if want == "" {
		want = "1"
	}
	if f.TimeScale != want {
		o.fail("time scale", "time scale is %s, want %s", f.TimeScale, want)
	}
	if x.TimeScale != "" {
		o.add("time scale", code(want), code(f.TimeScale), agreement(f.TimeScale == want))
	}
	for _, c := range f.Certificates {
		if c.Status == "failed" {
			o.fail("certificates", "certificate %s: %s", c.What, c.Detail)
		}
	}
	for i, terms := range f.result.Limit.Terms {
		if f.result.Limit.Method != "closure" {
			break
		}
		sum := f.result.System.Ring.Int(0)
		for _, t := range terms {
			sum = sum.Add(t.Value)
		}
		if d := f.result.Limit.Drift[i]; !sum.Equal(d) {
			o.fail("terms", "the terms of drift %s add up to %s, not to %s", f.result.System.Slow[i].Name, sum, d)
		}
	}
}

// deterministic tells that A vanishes, where averaging and homogenization are
// two names of the same thing.
func deterministic(a map[string]*string) bool {
	for _, e := range a {
		if e == nil || *e != "0" {
			return false
		}
	}
	return true
}

func (c *refCase) checkStationary(o *outcome, f *finding) {
	x := &c.Expect
	if x.Reversible != nil {
		got, soft := f.Stationary.Reversible, c.Multivalued
		if got == nil && !soft || got != nil && *got != *x.Reversible {
			o.fail("reversible", "reversible is %s, want %s", truth(got), truth(x.Reversible))
		}
		if got != nil {
			o.add("reversible", truth(x.Reversible), truth(got), agreement(*got == *x.Reversible))
		}
	}
	if x.Normalizable != nil {
		got := f.Stationary.Normalizable
		if got != nil && *got != *x.Normalizable {
			o.fail("normalizable", "normalizable is %s, want %s", truth(got), truth(x.Normalizable))
		}
		if got != nil {
			o.add("normalizable", truth(x.Normalizable), truth(got), agreement(*got == *x.Normalizable))
		}
	}
	c.checkCurrent(o, f)
}

// checkCurrent compares the stationary current by a claim on a quantity that
// does not depend on the fast process, which is its own average.
func (c *refCase) checkCurrent(o *outcome, f *finding) {
	if len(c.Expect.Current) == 0 {
		return
	}
	model, err := readModel(c.ID)
	if err != nil {
		o.fail("runs", "%v", err)
		return
	}
	for _, n := range keys(c.Expect.Current) {
		want, got := c.Expect.Current[n], f.Stationary.Current[n]
		if got == nil {
			o.fail("current", "no current of %s", n)
			continue
		}
		g, err := derive(c.ID, fmt.Sprintf("%s\nclaim mean %s = %s\n", model, *got, want), nil, nil)
		if err != nil {
			o.fail("runs", "%v", err)
			continue
		}
		v := g.Claims[len(g.Claims)-1].Verdict
		if v != "proven" {
			o.fail("current", "current of %s is %s, want %s: %s", n, *got, want, v)
		}
		o.add("current "+n, code(want), code(*got), v)
	}
}

func (c *refCase) checkPoint(o *outcome, model string, i int) {
	p := &c.Points[i]
	f, err := derive(c.ID, model, p.settings(), []string{p.at()})
	if err != nil {
		o.fail("numbers", "point %d: %s", i, firstLine(err))
		return
	}
	if len(f.Values) != 1 {
		o.fail("numbers", "point %d: no values", i)
		return
	}
	compare := func(what string, want, got *float64) {
		if want == nil {
			return
		}
		if got == nil || !near(*got, *want, c.pointTolerance(p)) {
			o.fail("numbers", "point %d: %s is %s, want %.17g", i, what, show(got), *want)
		}
	}
	for _, n := range keys(p.Drift) {
		compare("drift "+n, p.Drift[n], f.Values[0].Drift[n])
	}
	for _, n := range keys(p.Diffusion) {
		compare("diffusion "+n, p.Diffusion[n], entry(f.Values[0].Diffusion, n))
	}
	st := f.Stationary
	if p.Reversible != nil && st.Reversible != nil && *st.Reversible != *p.Reversible {
		o.fail("reversible at a point", "point %d: reversible is %s, want %s", i, truth(st.Reversible), truth(p.Reversible))
	}
	if p.Normalizable != nil && st.Normalizable != nil && *st.Normalizable != *p.Normalizable {
		o.fail("normalizable at a point", "point %d: normalizable is %s, want %s", i, truth(st.Normalizable), truth(p.Normalizable))
	}
}

// pointTolerance is the tolerance of the file for cases without a closed form.
func (c *refCase) pointTolerance(p *refPoint) float64 {
	if c.Expect.Exact {
		return tolerance
	}
	return p.Tolerance
}

func (c *refCase) pointRow(o *outcome) {
	n, tol := 0, tolerance
	for i := range c.Points {
		n += len(c.Points[i].Drift) + len(c.Points[i].Diffusion)
		tol = math.Max(tol, c.pointTolerance(&c.Points[i]))
	}
	if n == 0 {
		return
	}
	good := true
	for _, f := range o.fails {
		good = good && f.check != "numbers"
	}
	o.add(fmt.Sprintf("drift and A at %d points", len(c.Points)),
		fmt.Sprintf("%d numbers", n), "within "+number(tol), agreement(good))
}

func (c *refCase) checkRefusal(o *outcome, model, reason string) {
	points := c.Points
	if len(points) == 0 {
		points = []refPoint{{}}
	}
	for i := range points {
		p := &points[i]
		f, err := derive(c.ID, model, p.settings(), nil)
		if err != nil {
			o.fail("numbers", "point %d: %s", i, firstLine(err))
			return
		}
		o.title = f.result.System.Title
		if f.Refused == nil || f.Refused.Reason != reason {
			o.fail("refused", "point %d: not refused as %s", i, reason)
			return
		}
		for _, n := range keys(p.MeanDrift) {
			got, err := c.evaluate(model, f.Refused.Detail[n], p)
			if err != nil {
				o.fail("mean drift", "point %d: mean drift of %s: %s", i, n, firstLine(err))
			} else if !near(got, p.MeanDrift[n], p.Tolerance) {
				o.fail("mean drift", "point %d: mean drift of %s is %.12g, want %.12g", i, n, got, p.MeanDrift[n])
			}
		}
	}
	o.add("refused", code(reason), code(reason), agreement(true))
}

// evaluate gives the value of a slow expression at a point, through a model
// whose limit has it as a drift.
func (c *refCase) evaluate(model, expr string, p *refPoint) (float64, error) {
	var b strings.Builder
	for _, l := range strings.Split(model, "\n") {
		w := strings.Fields(l)
		if len(w) > 0 && (w[0] == "slow" || w[0] == "param" || w[0] == "function" || w[0] == "let") {
			b.WriteString(l + "\n")
			if w[0] == "slow" {
				fmt.Fprintf(&b, "d%s = 0 dt\n", w[1])
			}
		}
	}
	fmt.Fprintf(&b, "slow value_\nfast fast_\ndvalue_ = (%s) dt\ndfast_ = -fast_/eps dt + 1/sqrt(eps) dW1\n", expr)
	f, err := derive(c.ID, b.String(), p.settings(), []string{p.at() + ",value_=0"})
	if err != nil {
		return 0, err
	}
	v := f.Values[0].Drift["value_"]
	if v == nil {
		return 0, fmt.Errorf("no value")
	}
	return *v, nil
}

func (p *refPoint) at() string {
	var out []string
	for _, n := range keys(p.At) {
		out = append(out, n+"="+p.At[n].String())
	}
	return strings.Join(out, ",")
}

func (p *refPoint) settings() []string {
	var out []string
	for _, n := range keys(p.Set) {
		out = append(out, n+"="+p.Set[n].String())
	}
	for _, n := range keys(p.Functions) {
		out = append(out, n+"="+p.Functions[n])
	}
	return out
}

func near(got, want, tol float64) bool {
	return math.Abs(got-want) <= tol*math.Max(1, math.Abs(want))
}

func show(f *float64) string {
	if f == nil {
		return "absent"
	}
	return fmt.Sprintf("%.17g", *f)
}

func truth(b *bool) string {
	if b == nil {
		return "unknown"
	}
	return fmt.Sprint(*b)
}

func agreement(ok bool) string {
	if ok {
		return "agrees"
	}
	return "DISAGREES"
}

func keys[T any](m map[string]T) []string {
	var out []string
	for k := range m {
		out = append(out, k)
	}
	sort.Strings(out)
	return out
}
