package validation

import (
	"context"
	"fmt"
	"strings"
	"testing"
)

// published is a model whose limit, or parts of it, stands in the literature.
// The expected formulas are typed from the source, in its own form; where the
// source gives a diffusivity D_eff, A is typed as 2*(D_eff).
type published struct {
	title, source, model string
	checks               []check
}

// check is one published value: a claim label and the formula.
type check struct{ label, formula string }

// openPublished lists the published values that the program does not confirm
// yet, by title and label.
var openPublished = map[string]string{}

func TestPublished(t *testing.T) {
	runAll(t)
	for _, p := range publishedResults {
		t.Run(strings.ReplaceAll(p.title, " ", "_"), func(t *testing.T) {
			for _, r := range all.pub[p.title] {
				key := p.title + ": " + r.quantity
				good := r.agreement == "proven" || r.agreement == "agrees"
				switch why, open := openPublished[key]; {
				case open && good:
					t.Errorf("%q is listed as open (%s), but %s: take it out of the table", key, why, r.agreement)
				case !open && !good:
					t.Errorf("%s = %s: %s; the program finds %s", r.quantity, r.expected, r.agreement, r.obtained)
				}
			}
		})
	}
}

// run gives one row for each check.
func (p *published) run() []row {
	var b strings.Builder
	b.WriteString(strings.TrimSpace(p.model))
	b.WriteByte('\n')
	for _, c := range p.checks {
		fmt.Fprintf(&b, "claim %s = %s\n", c.label, c.formula)
	}
	var rows []row
	f, err := derive(p.title, b.String(), nil, nil)
	for i, c := range p.checks {
		r := row{quantity: c.label, expected: code(c.formula)}
		switch {
		case err != nil:
			r.agreement = firstLine(err)
		case f.Refused != nil:
			r.agreement = "refused: " + f.Refused.Reason
		default:
			r.agreement = f.Claims[i].Verdict
			r.obtained = code(f.published(i, c.label))
		}
		rows = append(rows, r)
	}
	return rows
}

// published is the program's own formula for a claim of any kind.
func (f *finding) published(i int, label string) string {
	res := f.result
	c := res.System.Claims[i]
	word, _, _ := strings.Cut(label, " ")
	switch word {
	case "mean":
		if m, err := res.Limit.Average(context.Background(), c.Left); err == nil {
			return m.String()
		}
	case "invariant":
		if x := res.Limit.Existence; x != nil && x.Density.Valid() {
			return x.Density.String()
		}
	case "noise":
		for j, v := range res.System.Slow {
			if v.Name == c.Names[0] && c.Index <= len(res.Noise[j]) {
				return res.Noise[j][c.Index-1].String()
			}
		}
	default:
		return f.obtained(label)
	}
	return ""
}
