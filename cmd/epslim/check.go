package main

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/present"
	"epslim/generator/ito"
	"epslim/solver/ensemble"
)

// The verdicts on what is no claim.
const (
	passed  = "holds"
	failed  = "fails"
	skipped = "skipped"
)

// check is one row of the table of verdicts.
type check struct {
	Kind    string `json:"kind"` // "certificate", "claim", "grid", "full", "ensemble"
	What    string `json:"what"`
	Verdict string `json:"verdict"`
	Detail  string `json:"detail"`
	more    [][]present.Span
	fails   bool
}

type checkFlags struct {
	format, cells string
	without       []string
	run           ensembleFlags
}

func (a *app) checkCommand() *cobra.Command {
	var f checkFlags
	cmd := &cobra.Command{
		Use:   "check FILE",
		Short: "Certificates, claims, grid and ensembles: a table of verdicts",
		Long: `Put every result to the test: the exact certificates of the derivation, the
claims of the model, the stationary density on two grids against its closed form,
the slow marginal of the full Fokker-Planck equation at decreasing eps, and ensembles of the full system at decreasing eps against the limit.
The exit status is 1 when something fails.`,
		Example: `  epslim check crawler.ito
  epslim check crawler.ito --without ensemble --format json`,
		Args: oneFile,
		RunE: func(cmd *cobra.Command, args []string) error { return a.check(cmd, args[0], f) },
	}
	cmd.Flags().StringVar(&f.format, "format", "text", "text or json")
	cmd.Flags().StringVar(&f.cells, "cells", "", "cells along each axis of the grid")
	cmd.Flags().StringSliceVar(&f.without, "without", nil, "leave out: grid, full, ensemble")
	f.run.bind(cmd, "8192")
	return cmd
}

func (a *app) check(cmd *cobra.Command, file string, f checkFlags) error {
	if err := oneOf("--format", f.format, "text", "json"); err != nil {
		return err
	}
	skip := map[string]bool{}
	for _, w := range f.without {
		if err := oneOf("--without", w, "grid", "full", "ensemble"); err != nil {
			return err
		}
		skip[w] = true
	}
	cells, err := parseCells(f.cells)
	if err != nil {
		return err
	}
	run, err := f.run.settings()
	if err != nil {
		return err
	}
	sys, err := a.read(file)
	if err != nil {
		return err
	}
	ctx := cmd.Context()
	res, err := derivation.Run(ctx, sys, derivation.Options{})
	if err != nil {
		return a.deriveError(err)
	}
	if res.Refused != nil {
		return a.refused(res, a.provenance(cmd, sys, file), f.format)
	}
	rows := algebraChecks(res)
	if !skip["grid"] && ctx.Err() == nil {
		rows = append(rows, a.gridCheck(ctx, res, cells, run.workers)...)
	}
	if !skip["full"] && ctx.Err() == nil {
		rows = append(rows, a.fullCheck(ctx, res, run)...)
	}
	if !skip["ensemble"] && ctx.Err() == nil {
		rows = append(rows, a.ensembleCheck(ctx, res, run)...)
	}
	if err := a.printChecks(res, rows, f.format); err != nil {
		return err
	}
	if ctx.Err() != nil {
		return ctx.Err()
	}
	for _, r := range rows {
		if r.fails {
			return status(exitFailed)
		}
	}
	return nil
}

// algebraChecks are the certificates and the claims.
func algebraChecks(res *derivation.Result) []check {
	var rows []check
	for _, c := range res.Certificates {
		rows = append(rows, check{Kind: "certificate", What: c.What, Verdict: string(c.Status), Detail: c.Detail, fails: c.Status == derivation.Failed})
	}
	for _, v := range res.Claims {
		detail := v.Reason
		if w := v.Witness; w != nil && w.Slip != "" {
			detail += "; likely slip: " + w.Slip
		}
		rows = append(rows, check{Kind: "claim", What: v.Claim.Label(), Verdict: v.Verdict, Detail: detail,
			more: present.WitnessSpans(res, v), fails: v.Verdict == derivation.Refuted})
	}
	return rows
}

// gridCheck compares the finite-volume density with the closed form.
func (a *app) gridCheck(ctx context.Context, res *derivation.Result, cells []int, workers int) []check {
	row := check{Kind: "grid", What: "stationary density"}
	d, err := a.solveDensity(ctx, res, cells, workers)
	switch {
	case err != nil && numbers.NoDensity(err) != "":
		row.Verdict, row.Detail = skipped, numbers.NoDensity(err)
		return []check{row}
	case err != nil:
		row.Verdict, row.Detail = skipped, short(err)
		return []check{row}
	}
	return []check{gridVerdict(d)}
}

// gridVerdict is the row of a grid solution.
func gridVerdict(d *numbers.Density) check {
	row := check{Kind: "grid", What: "stationary density"}
	ok, why := d.Verdict()
	row.Verdict, row.Detail = passed, why
	if d.Difference == nil {
		row.Verdict = passed
		row.Detail = fmt.Sprintf("%s grid: residual %.2g, mass %.12g, smallest value positive; no closed form to compare with", d.Result.Grid, d.Result.Residual, d.Result.Mass())
	}
	if !solved(d.Result) {
		ok, row.Detail = false, fmt.Sprintf("the solver ended with %s, residual %.2g", d.Result.Outcome, d.Result.Residual)
	}
	if len(d.Warnings) > 0 {
		row.Detail += "; " + strings.Join(d.Warnings, "; ")
	}
	if !ok {
		row.Verdict, row.fails = failed, true
	}
	return row
}

// fullCheck compares the slow marginal of the full Fokker-Planck equation with
// the limit's density.
func (a *app) fullCheck(ctx context.Context, res *derivation.Result, run ensembleRun) []check {
	row := check{Kind: "full", What: "slow marginal at finite " + res.System.Small, Verdict: skipped}
	f, err := numbers.SolveFull(ctx, res, run.eps, workers(run.workers))
	switch {
	case err != nil && ctx.Err() != nil:
		row.Detail = "interrupted"
		return []check{row}
	case err != nil && numbers.NoDensity(err) != "":
		row.Detail = numbers.NoDensity(err)
		return []check{row}
	case err != nil:
		row.Detail = short(err)
		return []check{row}
	}
	v, why := f.Verdict()
	row.Detail = why
	switch v {
	case numbers.FullAgrees:
		row.Verdict = passed
	case numbers.FullOpen:
		row.Verdict = derivation.Undecided
	case numbers.FullDiffers:
		row.Verdict, row.fails = failed, true
	}
	return []check{row}
}

// ensembleCheck compares means of the full system with those of the limit.
func (a *app) ensembleCheck(ctx context.Context, res *derivation.Result, run ensembleRun) []check {
	row := check{Kind: "ensemble", What: "means"}
	run, left, err := affordable(res, run)
	if err != nil {
		row.Verdict, row.Detail = skipped, short(err)
		return []check{row}
	}
	if left != "" {
		a.remark("%s", left)
	}
	c, err := a.runStudy(ctx, res, run)
	if err != nil {
		row.Verdict, row.Detail = skipped, short(err)
		return []check{row}
	}
	return studyVerdicts(c)
}

// checkBudget is the number of path-steps that a check may spend on one system:
// a few seconds of one processor.
const checkBudget = 3e8

// affordable leaves out the values of eps that would take too long, and says
// so.
func affordable(res *derivation.Result, run ensembleRun) (ensembleRun, string, error) {
	eps, err := numbers.Affordable(res, run.eps, run.time, run.to-run.from, checkBudget)
	if err != nil {
		return run, "", err
	}
	if len(eps) == 0 {
		return run, "", fmt.Errorf("every eps of %v would take more than %.0e steps; use fewer paths, a shorter time or a larger eps", run.eps, checkBudget)
	}
	left := ""
	if len(eps) < len(run.eps) {
		left = fmt.Sprintf("ensembles at eps = %v only: the others would take more than %.0e steps", eps, checkBudget)
	}
	run.eps = eps
	return run, left, nil
}

// studyVerdicts are the rows of a study.
func studyVerdicts(c *ensemble.Convergence) []check {
	var rows []check
	for _, g := range numbers.Judge(c) {
		r := check{Kind: "ensemble", What: "mean of " + g.Observable, Verdict: passed, Detail: g.Why}
		if !g.OK {
			r.Verdict, r.fails = failed, true
		}
		rows = append(rows, r)
	}
	return rows
}

// short is the first line of an error; errors of models say what is missing
// in their message.
func short(err error) string {
	var list ito.ErrorList
	if errors.As(err, &list) && len(list) > 0 {
		return list[0].Message
	}
	line, _, _ := strings.Cut(err.Error(), "\n")
	return line
}

func (a *app) printChecks(res *derivation.Result, rows []check, format string) error {
	ok := true
	for _, r := range rows {
		ok = ok && !r.fails
	}
	if format == "json" {
		return a.printJSON(struct {
			Format  string  `json:"format"`
			Version string  `json:"version"`
			SHA256  string  `json:"sha256"`
			OK      bool    `json:"ok"`
			Checks  []check `json:"checks"`
		}{present.Format, version, res.System.SHA256, ok, rows})
	}
	count := map[string]int{}
	for _, r := range rows {
		switch {
		case r.fails:
			count["fail"]++
		case r.Verdict == skipped || r.Verdict == derivation.Undecided:
			count["open"]++
		default:
			count["hold"]++
		}
	}
	sum := fmt.Sprintf("%d hold, %d fail", count["hold"], count["fail"])
	if n := count["open"]; n > 0 {
		sum += fmt.Sprintf(", %d not decided or skipped", n)
	}
	st := &present.Story{Title: res.System.Title, Sections: []present.Section{{ID: "checks", Title: "Checks", Blocks: []present.Block{checkTable(res, rows)}},
		{ID: "sum", Title: sum + ".", Blocks: nil}}}
	_, err := a.out.Write(present.StoryText(st, present.TextSettings{Colour: colour(a.out)}))
	return err
}

// checkTable sets the rows of a check.
func checkTable(res *derivation.Result, rows []check) present.Table {
	t := present.Table{Head: []string{"verdict", "kind", "what", "why"}}
	for _, r := range rows {
		kind := present.Good
		switch {
		case r.fails:
			kind = present.Bad
		case r.Verdict == skipped || r.Verdict == derivation.Undecided:
			kind = present.Strong
		}
		t.Rows = append(t.Rows, [][]present.Span{{{Text: r.Verdict, Kind: kind}}, {{Text: r.Kind}}, present.Rich(res, r.What), present.Rich(res, r.Detail)})
		for _, m := range r.more {
			t.Rows = append(t.Rows, [][]present.Span{nil, nil, nil, m})
		}
	}
	return t
}
