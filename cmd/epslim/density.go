package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"path/filepath"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/plots"
	"epslim/cmd/epslim/present"
	"epslim/solver/density"
	"epslim/solver/multigrid"
)

type densityFlags struct {
	format, cells, figure, csv, npz string
	force, exit                     bool
	workers, decay                  int
}

func (a *app) densityCommand() *cobra.Command {
	var f densityFlags
	cmd := &cobra.Command{
		Use:   "density FILE",
		Short: "Stationary density: closed form and grid",
		Long: `Solve the stationary Fokker-Planck equation of the limit by finite volumes, and
compare with the closed form on two grids where there is one.`,
		Example: `  epslim density crawler.ito
  epslim density crawler.ito --cells 256 --figure density.svg --csv density.csv
  epslim density crawler.ito --decay 4`,
		Args: oneFile,
		RunE: func(cmd *cobra.Command, args []string) error { return a.density(cmd, args[0], f) },
	}
	cmd.Flags().StringVar(&f.format, "format", "text", "text or json")
	cmd.Flags().StringVar(&f.cells, "cells", "", "cells along each axis, such as 256 or 256,128 (default by dimension: 1024, 128, 40)")
	cmd.Flags().StringVar(&f.figure, "figure", "", "draw the density to a file that ends in .svg, .png, .pdf or .tex")
	cmd.Flags().StringVar(&f.csv, "csv", "", "write the density and the current to a table")
	cmd.Flags().StringVar(&f.npz, "npz", "", "write the density and the current as NumPy arrays")
	cmd.Flags().IntVar(&f.decay, "decay", 0, "print this many of the slowest decay rates, the spectral gap first")
	cmd.Flags().BoolVar(&f.exit, "exit", false, "print the mean exit time through absorbing sides instead of the stationary density")
	cmd.Flags().BoolVar(&f.force, "force", false, "replace files that exist")
	cmd.Flags().IntVar(&f.workers, "workers", 0, "goroutines (0: one a processor); results do not depend on it")
	return cmd
}

func (a *app) density(cmd *cobra.Command, file string, f densityFlags) error {
	if err := oneOf("--format", f.format, "text", "json"); err != nil {
		return err
	}
	cells, err := parseCells(f.cells)
	if err != nil {
		return err
	}
	if err := a.targets(f.force, f.figure, f.csv, f.npz); err != nil {
		return err
	}
	if f.figure != "" {
		if err := figureName(f.figure); err != nil {
			return err
		}
	}
	if err := f.check(); err != nil {
		return err
	}
	sys, err := a.read(file)
	if err != nil {
		return err
	}
	res, err := derivation.Run(cmd.Context(), sys, derivation.Options{SkipClaims: true})
	if err != nil {
		return a.deriveError(err)
	}
	prov := a.provenance(cmd, sys, file)
	if res.Refused != nil {
		return a.refused(res, prov, f.format)
	}
	relax, err := a.relax(cmd.Context(), res, cells, f)
	if err != nil {
		return a.densityError(err)
	}
	if f.exit {
		return a.tellRelaxation(res, relax, f.format)
	}
	d, err := a.solveDensity(cmd.Context(), res, cells, f.workers)
	if err != nil {
		return a.densityError(err)
	}
	for _, w := range d.Warnings {
		a.remark("%s", w)
	}
	if err := a.densityFiles(res, d, prov, f); err != nil {
		return err
	}
	if f.format == "json" {
		out := densityJSON(res, d)
		out.Rates = decayJSON(relax)
		if err := a.printJSON(out); err != nil {
			return err
		}
	} else if _, err := a.out.Write(present.StoryText(withRelaxation(densityStory(res, d), relax), present.TextSettings{Colour: colour(a.out)})); err != nil {
		return err
	}
	return densityOutcome(cmd.Context(), d)
}

// solveDensity runs the grids with a progress line.
func (a *app) solveDensity(ctx context.Context, res *derivation.Result, cells []int, workers int) (*numbers.Density, error) {
	p := a.progress()
	defer p.clear()
	return numbers.StationaryDensity(ctx, res, numbers.DensityOptions{
		Cells: cells,
		Settings: density.Settings{Workers: workers, Progress: func(q density.Progress) {
			p.show("%s %d, residual %.2g", q.Stage, q.Iteration, q.Residual)
		}},
	})
}

func (a *app) densityError(err error) error {
	if why := numbers.NoDensity(err); why != "" {
		fmt.Fprintln(a.err, "epslim:", why)
		return status(exitRefused)
	}
	return a.deriveError(err)
}

func densityOutcome(ctx context.Context, d *numbers.Density) error {
	if ctx.Err() != nil {
		return ctx.Err()
	}
	if ok, _ := d.Verdict(); !ok || !solved(d.Result) {
		return status(exitFailed)
	}
	return nil
}

// solved accepts a solver that ran into rounding on its way to the tolerance.
func solved(r *density.Result) bool {
	return r.Outcome == multigrid.Converged || r.Residual < 1e-8
}

func parseCells(s string) ([]int, error) {
	if s == "" {
		return nil, nil
	}
	var out []int
	for _, p := range strings.FieldsFunc(s, func(c rune) bool { return c == ',' || c == 'x' }) {
		n, err := strconv.Atoi(strings.TrimSpace(p))
		if err != nil || n < 4 {
			return nil, fmt.Errorf("--cells is %q; it takes numbers of at least 4, such as 256 or 256,128", s)
		}
		out = append(out, n)
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("--cells is %q; it takes numbers such as 256 or 256,128", s)
	}
	return out, nil
}

// oneOf checks the value of a flag.
func oneOf(flag, value string, allowed ...string) error {
	for _, v := range allowed {
		if v == value {
			return nil
		}
	}
	return fmt.Errorf("%s is %q; it can be %s", flag, value, strings.Join(allowed[:len(allowed)-1], ", ")+" or "+allowed[len(allowed)-1])
}

// figureName checks the ending of a figure's name before long work begins.
func figureName(name string) error {
	switch strings.ToLower(filepath.Ext(name)) {
	case ".svg", ".png", ".pdf", ".tex":
		return nil
	}
	return fmt.Errorf("%s: figures end in .svg, .png, .pdf or .tex", name)
}

// targets complains about files in the way before long work begins.
func (a *app) targets(force bool, names ...string) error {
	for _, n := range names {
		if n == "" || force {
			continue
		}
		if err := vacant(n); err != nil {
			return err
		}
	}
	return nil
}

// refused prints the refusal of a derivation in a format.
func (a *app) refused(res *derivation.Result, p present.Provenance, format string) error {
	text := present.Text(res, present.TextSettings{Colour: colour(a.out)})
	if format == "json" {
		var err error
		if text, err = present.JSON(res, version); err != nil {
			return err
		}
	}
	if _, err := a.out.Write(text); err != nil {
		return err
	}
	return status(exitRefused)
}

func (a *app) densityFiles(res *derivation.Result, d *numbers.Density, prov present.Provenance, f densityFlags) error {
	if f.figure != "" {
		files, err := plots.Encode(plots.Density(res, d, plots.Meta(prov)), f.figure)
		if err != nil {
			return err
		}
		for _, x := range files {
			if err := write(filepath.Join(filepath.Dir(f.figure), x.Name), x.Data, f.force); err != nil {
				return err
			}
		}
	}
	if f.csv != "" {
		if err := write(f.csv, plots.DensityCSV(d.Result, d.Difference, d.Current, prov.OneLine()), f.force); err != nil {
			return err
		}
	}
	if f.npz == "" {
		return nil
	}
	var b bytes.Buffer
	meta := map[string]string{"provenance": prov.OneLine(), "model": prov.Model}
	if err := density.WriteNPZ(&b, meta, d.Result, d.Result.Columns(d.Current, d.Difference)); err != nil {
		return err
	}
	return write(f.npz, b.Bytes(), f.force)
}

// printJSON writes an object, indented.
func (a *app) printJSON(v any) error {
	var raw, b bytes.Buffer
	enc := json.NewEncoder(&raw)
	enc.SetEscapeHTML(false)
	if err := enc.Encode(v); err != nil {
		return err
	}
	if err := json.Indent(&b, bytes.TrimSpace(raw.Bytes()), "", "  "); err != nil {
		return err
	}
	b.WriteByte('\n')
	_, err := a.out.Write(b.Bytes())
	return err
}

// finite is a number, or nil for what JSON cannot write.
func finite(x float64) *float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return nil
	}
	return &x
}

// densityResult is the machine-readable result of the density command.
type densityResult struct {
	Format     string   `json:"format"`
	Cells      []int    `json:"cells"`
	ClosedForm *string  `json:"closed_form"`
	Mass       float64  `json:"mass"`
	Minimum    float64  `json:"minimum"`
	Residual   float64  `json:"residual"`
	L1         *float64 `json:"l1_error"`
	Order      *float64 `json:"observed_order"`
	CurrentMax float64  `json:"current_max"`
	Entropy    *float64 `json:"entropy_production"`
	Seconds    float64  `json:"seconds"`
	Iterations int      `json:"iterations"`

	Rates []decayRate `json:"decay_rates,omitempty"`
}

func densityJSON(res *derivation.Result, d *numbers.Density) densityResult {
	lo, _ := d.Result.Minimum()
	out := densityResult{
		Format: present.Format, Cells: d.Result.Grid.Shape(), Mass: d.Result.Mass(), Minimum: lo, Residual: d.Result.Residual,
		CurrentMax: d.Current.Max, Entropy: finite(d.Entropy), Seconds: d.Result.Seconds(), Iterations: d.Result.Iterations,
		Order: finite(d.Order),
	}
	if p := res.Stationary.Density; p.Valid() {
		s := p.String()
		out.ClosedForm = &s
	}
	if d.Difference != nil {
		out.L1 = finite(d.Difference.L1)
	}
	return out
}
