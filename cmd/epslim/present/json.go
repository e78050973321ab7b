// Package present renders derivations: the machine-readable result, text for
// terminals, Markdown, LaTeX and HTML. It imports cmd/epslim/page,
// cmd/epslim/derivation and what that is made of.
package present

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"math/big"
	"strings"

	"epslim/cmd/epslim/derivation"
	"epslim/fokkerplanck"
	"epslim/generator/algebra"
	"epslim/perturb"
)

// Format is the name of the machine-readable format.
const Format = "epslim/1"

// object is a JSON object whose members keep their order.
type object []member

type member struct {
	name  string
	value any
}

func (o object) MarshalJSON() ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, m := range o {
		if i > 0 {
			b.WriteByte(',')
		}
		k, err := json.Marshal(m.name)
		if err != nil {
			return nil, err
		}
		v, err := marshal(m.value)
		if err != nil {
			return nil, err
		}
		b.Write(k)
		b.WriteByte(':')
		b.Write(v)
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

func marshal(v any) ([]byte, error) {
	var b bytes.Buffer
	enc := json.NewEncoder(&b)
	enc.SetEscapeHTML(false)
	if err := enc.Encode(v); err != nil {
		return nil, err
	}
	return bytes.TrimRight(b.Bytes(), "\n"), nil
}

// JSON is the machine-readable result, indented, with a final newline.
func JSON(res *derivation.Result, version string) ([]byte, error) {
	var o object
	if res.Refused != nil {
		o = refusal(res.Refused)
	} else {
		o = full(res, version)
	}
	raw, err := marshal(o)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	if err := json.Indent(&b, raw, "", "  "); err != nil {
		return nil, err
	}
	b.WriteByte('\n')
	return b.Bytes(), nil
}

func refusal(r *perturb.Refusal) object {
	detail := object{}
	for _, k := range r.DetailNames() {
		detail = append(detail, member{k, r.Detail[k].String()})
	}
	return object{
		{"format", Format},
		{"refused", object{
			{"reason", string(r.Reason)},
			{"order", json.Number(decimal(r.Order))},
			{"text", r.Text},
			{"mend", r.Mend},
			{"detail", detail},
		}},
	}
}

// decimal writes a power of the small parameter as a JSON number.
func decimal(q *big.Rat) string {
	if q.IsInt() {
		return q.Num().String()
	}
	f, _ := q.Float64()
	return fmt.Sprintf("%g", f)
}

func full(res *derivation.Result, version string) object {
	lim := res.Limit
	o := object{
		{"format", Format},
		{"version", version},
		{"model", model(res)},
		{"regime", lim.Regime},
		{"time_scale", res.TimeScale()},
		{"method", lim.Method},
		{"exact", res.Exact},
		{"generator", generatorParts(res)},
		{"fast_process", fastProcess(res)},
		{"cell", byVariable(res, lim.Cell)},
		{"limit", limitObject(res)},
		{"stationary", stationary(res)},
		{"conditions", list(res.Conditions)},
		{"certificates", certificates(res)},
		{"claims", claims(res)},
	}
	if lim.Frame != nil {
		o = append(o, member{"frame", object{
			{"power", json.Number(decimal(lim.Frame.Power))},
			{"velocity", byVariable(res, lim.Frame.Velocity)},
			{"deviation", lim.Frame.Short},
		}})
	}
	if len(lim.Corrections) > 0 {
		o = append(o, member{"corrections", corrections(res)})
	}
	o = append(o, member{"routes_tried", list(lim.WhyNot)})
	if as := res.Averages(context.Background()); len(as) > 0 {
		o = append(o, member{"averages", averages(as)})
	}
	return append(o, member{"values", values(res)})
}

// averages are the quantities known by name only, with their numbers.
func averages(as []derivation.Average) []object {
	out := []object{}
	for _, a := range as {
		o := object{{"name", a.Name}, {"average_of", a.Of.String()}, {"corrector", a.Corrector}}
		switch {
		case a.Zero:
			o = append(o, member{"value", 0}, member{"error", 0})
		case a.Known:
			o = append(o, member{"value", a.Value}, member{"error", a.Error})
		default:
			o = append(o, member{"value", nil}, member{"error", nil})
		}
		out = append(out, o)
	}
	return out
}

// corrections are the operators beyond the limit.
func corrections(res *derivation.Result) []object {
	out := []object{}
	for _, c := range res.Limit.Corrections {
		diff := object{}
		for i, v := range res.System.Slow {
			for j := i; j < len(res.System.Slow); j++ {
				diff = append(diff, member{v.Name + "," + res.System.Slow[j].Name, closedForm(res, c.Diffusion[i][j])})
			}
		}
		out = append(out, object{
			{"power", json.Number(decimal(c.Power))},
			{"drift", byVariable(res, c.Drift)},
			{"diffusion", diff},
			{"higher", closedForm(res, c.Higher)},
		})
	}
	return out
}

func list(s []string) []string {
	if s == nil {
		return []string{}
	}
	return s
}

func slowNames(res *derivation.Result) []string {
	out := []string{}
	for _, v := range res.System.Slow {
		out = append(out, v.Name)
	}
	return out
}

func model(res *derivation.Result) object {
	fast := []string{}
	for _, v := range res.System.Fast {
		fast = append(fast, v.Name)
	}
	params := object{}
	for _, p := range res.System.Parameters {
		if p.Value == nil {
			params = append(params, member{p.Name, nil})
			continue
		}
		f, _ := p.Value.Float64()
		params = append(params, member{p.Name, f})
	}
	return object{
		{"title", res.System.Title},
		{"small", res.System.Small},
		{"slow", slowNames(res)},
		{"fast", fast},
		{"parameters", params},
		{"sha256", res.System.SHA256},
	}
}

func generatorParts(res *derivation.Result) []object {
	out := []object{}
	for _, p := range res.Generator.Parts {
		out = append(out, object{{"power", json.Number(decimal(p.Power))}, {"operator", p.Op.String()}})
	}
	return out
}

func closedForm(res *derivation.Result, e algebra.Expr) any {
	if !e.Valid() || res.Route != nil && res.Route.IsNumerical(e) {
		return nil
	}
	return e.String()
}

func fastProcess(res *derivation.Result) object {
	x := res.Limit.Existence
	if x == nil {
		return object{{"name", ""}, {"invariant_density", nil}}
	}
	return object{{"name", x.Name}, {"invariant_density", closedForm(res, x.Density)}}
}

func byVariable(res *derivation.Result, es []algebra.Expr) object {
	o := object{}
	for i, v := range res.System.Slow {
		if i < len(es) {
			o = append(o, member{v.Name, closedForm(res, es[i])})
		}
	}
	return o
}

func limitObject(res *derivation.Result) object {
	lim := res.Limit
	diff := object{}
	noise := object{}
	terms := object{}
	for i, v := range res.System.Slow {
		for j := i; j < len(res.System.Slow); j++ {
			diff = append(diff, member{v.Name + "," + res.System.Slow[j].Name, closedForm(res, lim.Diffusion[i][j])})
		}
		if res.Noise != nil {
			row := []any{}
			for _, s := range res.Noise[i] {
				row = append(row, closedForm(res, s))
			}
			noise = append(noise, member{v.Name, row})
		}
		ts := []object{}
		for _, t := range lim.Terms[i] {
			ts = append(ts, object{{"origin", t.Origin}, {"term", closedForm(res, t.Value)}})
		}
		terms = append(terms, member{v.Name, ts})
	}
	return object{
		{"drift", byVariable(res, lim.Drift)},
		{"diffusion", diff},
		{"noise", noise},
		{"drift_stratonovich", byVariable(res, res.Stratonovich)},
		{"terms", terms},
	}
}

func truth(t fokkerplanck.Truth) any {
	switch t {
	case fokkerplanck.Yes:
		return true
	case fokkerplanck.No:
		return false
	}
	return nil
}

func stationary(res *derivation.Result) object {
	s := res.Stationary
	o := object{
		{"reversible", truth(s.Reversible)},
		{"density", closedForm(res, s.Density)},
		{"normalizable", truth(s.Normal)},
	}
	if s.Current != nil {
		o = append(o, member{"current", byVariable(res, s.Current)})
	} else {
		o = append(o, member{"current", nil})
	}
	o = append(o, member{"why", s.Why})
	if s.Curl.Valid() && !s.Curl.IsZero() {
		o = append(o, member{"curl", object{{strings.Join(s.CurlAt[:], ","), s.Curl.String()}}})
	}
	return o
}

func certificates(res *derivation.Result) []object {
	out := []object{}
	for _, c := range res.Certificates {
		out = append(out, object{{"what", c.What}, {"status", string(c.Status)}, {"detail", c.Detail}})
	}
	return out
}

func claims(res *derivation.Result) []object {
	out := []object{}
	for _, v := range res.Claims {
		o := object{{"claim", v.Claim.Label()}, {"verdict", v.Verdict}, {"reason", v.Reason}}
		if v.Witness == nil {
			o = append(o, member{"witness", nil})
		} else {
			o = append(o, member{"witness", witness(res, v.Witness)})
		}
		out = append(out, o)
	}
	return out
}

func witness(res *derivation.Result, w *derivation.Witness) object {
	at := object{}
	for _, k := range sortedKeys(w.At) {
		at = append(at, member{k, json.Number(w.At[k])})
	}
	o := object{{"at", at}}
	for _, m := range []struct{ name, text string }{{"claimed", w.Claimed}, {"derived", w.Derived}} {
		if m.text == "" || m.text == "?" {
			o = append(o, member{m.name, nil})
		} else {
			o = append(o, member{m.name, json.Number(m.text)})
		}
	}
	o = append(o, member{"difference", closedForm(res, w.Difference)})
	return append(o, member{"slip", w.Slip})
}

func values(res *derivation.Result) []object {
	out := []object{}
	for _, v := range res.Values {
		at, drift, diff := object{}, object{}, object{}
		for i, s := range res.System.Slow {
			at = append(at, member{s.Name, v.At.Slow[i].Float})
			drift = append(drift, member{s.Name, v.Drift[i]})
			for j := i; j < len(res.System.Slow); j++ {
				diff = append(diff, member{s.Name + "," + res.System.Slow[j].Name, v.Diffusion[i][j]})
			}
		}
		for _, k := range sortedKeys(v.At.Parameters) {
			at = append(at, member{k, v.At.Parameters[k].Float})
		}
		o := object{{"at", at}, {"drift", drift}, {"diffusion", diff}, {"error", v.Error}}
		if v.SmallEnough > 0 {
			o = append(o, member{"eps_for_one_percent", v.SmallEnough})
		}
		out = append(out, o)
	}
	return out
}
