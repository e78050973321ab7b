package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/figure"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/page"
	"epslim/cmd/epslim/plots"
	"epslim/cmd/epslim/present"
	"epslim/solver/ensemble"
)

type reportFlags struct {
	out, format, cells string
	without            []string
	force              bool
	run                ensembleFlags
}

func (a *app) reportCommand() *cobra.Command {
	var f reportFlags
	cmd := &cobra.Command{
		Use:   "report FILE",
		Short: "The whole story as one HTML page, or as a LaTeX article with figures",
		Long: `Write the model, the derivation, the stationary density, the checks and the figures
as one self-contained HTML page, or as a LaTeX article.`,
		Example: `  epslim report crawler.ito --out crawler-report
  epslim report crawler.ito --out paper --format article`,
		Args: oneFile,
		RunE: func(cmd *cobra.Command, args []string) error { return a.report(cmd, args[0], f) },
	}
	cmd.Flags().StringVar(&f.out, "out", "", "folder to write (default: the name of the model and -report)")
	cmd.Flags().StringVar(&f.format, "format", "html", "html or article")
	cmd.Flags().StringVar(&f.cells, "cells", "", "cells along each axis of the grid")
	cmd.Flags().StringSliceVar(&f.without, "without", nil, "leave out: grid, full, ensemble")
	cmd.Flags().BoolVar(&f.force, "force", false, "replace files in a folder that exists")
	f.run.bind(cmd, "20000")
	return cmd
}

// findings is everything a report shows.
type findings struct {
	res    *derivation.Result
	prov   present.Provenance
	checks []check
	grid   *numbers.Density
	gridNo string // why there is no grid solution
	study  *ensemble.Convergence
	run    ensembleRun
}

func (a *app) report(cmd *cobra.Command, file string, f reportFlags) error {
	if err := oneOf("--format", f.format, "html", "article"); err != nil {
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
	if f.out == "" {
		f.out = strings.TrimSuffix(baseName(file), ".ito") + "-report"
		if file == "-" {
			f.out = "report"
		}
	}
	if !f.force {
		if err := vacant(f.out); err != nil {
			return err
		}
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
	fs := &findings{res: res, prov: a.provenance(cmd, sys, file), run: run}
	if res.Refused == nil {
		a.find(ctx, fs, cells, skip)
	}
	if ctx.Err() != nil {
		return ctx.Err()
	}
	if err := os.MkdirAll(f.out, 0o755); err != nil {
		return err
	}
	if f.format == "html" {
		err = a.reportHTML(fs, f)
	} else {
		err = a.reportArticle(ctx, fs, f)
	}
	if err != nil {
		return err
	}
	if res.Refused != nil {
		return status(exitRefused)
	}
	for _, c := range fs.checks {
		if c.fails {
			return status(exitFailed)
		}
	}
	return nil
}

// find runs the numerical checks.
func (a *app) find(ctx context.Context, fs *findings, cells []int, skip map[string]bool) {
	fs.checks = algebraChecks(fs.res)
	if !skip["grid"] {
		d, err := a.solveDensity(ctx, fs.res, cells, fs.run.workers)
		if err != nil {
			fs.gridNo = short(err)
			fs.checks = append(fs.checks, check{Kind: "grid", What: "stationary density", Verdict: skipped, Detail: fs.gridNo})
		} else {
			fs.grid = d
			fs.checks = append(fs.checks, gridVerdict(d))
		}
	}
	if !skip["full"] && ctx.Err() == nil {
		fs.checks = append(fs.checks, a.fullCheck(ctx, fs.res, fs.run)...)
	}
	if !skip["ensemble"] && ctx.Err() == nil {
		run, left, err := affordable(fs.res, fs.run)
		if left != "" {
			a.remark("%s", left)
		}
		var c *ensemble.Convergence
		if err == nil {
			fs.run = run
			c, err = a.runStudy(ctx, fs.res, fs.run)
		}
		if err != nil {
			fs.checks = append(fs.checks, check{Kind: "ensemble", What: "means", Verdict: skipped, Detail: short(err)})
		} else {
			fs.study = c
			fs.checks = append(fs.checks, studyVerdicts(c)...)
		}
	}
}

// picture is a figure with the name of its files and its caption.
type picture struct {
	name, caption string
	plot          *figure.Plot
}

func (fs *findings) pictures() []picture {
	var out []picture
	meta := plots.Meta(fs.prov)
	if fs.grid != nil {
		caption := "Stationary density."
		if plots.Flows(fs.res, fs.grid) {
			caption = "Stationary density with its current."
		}
		out = append(out, picture{"density", caption, plots.Density(fs.res, fs.grid, meta)})
		if p := plots.Difference(fs.res, fs.grid, meta); p != nil {
			out = append(out, picture{"difference", "Grid solution minus closed form.", p})
		}
	}
	if fs.study != nil {
		out = append(out, picture{"convergence", "Distance of the means of the full system from those of the limit, with two standard errors.", plots.EpsConvergence(fs.res, fs.study, meta)})
	}
	return out
}

// story is the derivation with the numerical sections.
func (fs *findings) story() *present.Story {
	st := present.Tell(fs.res)
	var kept []present.Section
	for _, s := range st.Sections {
		if s.ID != "certificates" && s.ID != "claims" {
			kept = append(kept, s)
		}
	}
	st.Sections = kept
	if fs.grid != nil {
		for _, s := range densityStory(fs.res, fs.grid).Sections {
			if s.ID == "grid" {
				s.Title = "Stationary density on a grid"
				st.Sections = append(st.Sections, s)
			}
		}
	}
	if fs.study != nil {
		st.Sections = append(st.Sections, ensembleStory(fs.res, fs.run, fs.study).Sections...)
	}
	if len(fs.checks) > 0 {
		st.Sections = append(st.Sections, present.Section{ID: "checks", Title: "Checks", Blocks: []present.Block{checkTable(fs.res, fs.checks)}})
	}
	return st
}

func title(fs *findings) string {
	if t := strings.TrimSpace(fs.res.System.Title); t != "" {
		return t
	}
	return "Limit of a fast-slow system"
}

func (a *app) reportHTML(fs *findings, f reportFlags) error {
	doc := &page.Document{Title: title(fs), Subtitle: "The limit of a fast-slow stochastic system", Contents: true}
	for _, m := range plots.Meta(fs.prov) {
		if m.Name != "model" {
			doc.Meta = append(doc.Meta, page.Field{Name: m.Name, Value: m.Value})
		}
	}
	doc.Body = append(doc.Body, page.Section{Title: "The model as typed", ID: "typed", Body: []page.Block{page.CodeBlock{Text: fs.prov.Model, Label: "model file"}}})
	doc.Body = append(doc.Body, fs.story().Page()...)
	figures := page.Section{Title: "Figures", ID: "figures"}
	for _, p := range fs.pictures() {
		svg, err := p.plot.SVG()
		if err != nil {
			return err
		}
		figures.Body = append(figures.Body, page.Figure{SVG: svg, Caption: []page.Inline{page.Text(p.caption)}, ID: "fig-" + p.name})
	}
	if len(figures.Body) > 0 {
		doc.Body = append(doc.Body, figures)
	}
	doc.Body = append(doc.Body, repeatSection(fs.prov))
	html, err := doc.HTML()
	if err != nil {
		return err
	}
	name := filepath.Join(f.out, "index.html")
	if err := write(name, html, f.force); err != nil {
		return err
	}
	a.remark("%s written", name)
	return nil
}

// repeatSection says how to make the report again and how to cite.
func repeatSection(p present.Provenance) page.Section {
	t := page.Table{Head: []page.Cell{page.C("what"), page.C("value")}}
	add := func(k, v string) { t.Rows = append(t.Rows, []page.Cell{page.C(k), {page.Code(v)}}) }
	add("version", "epslim "+p.Version)
	add("SHA-256 of the model", p.SHA256)
	for _, o := range p.Options {
		add(o.Name, o.Value)
	}
	return page.Section{Title: "How to repeat and to cite", ID: "repeat", Body: []page.Block{
		page.P(page.Text("This command makes the same page again:")),
		page.CodeBlock{Text: p.Command, Label: "command"},
		t,
		page.P(page.Text("Cite the program as: the epslim authors, epslim, version " + p.Version + ", together with the hash of the model file.")),
	}}
}

func (a *app) reportArticle(ctx context.Context, fs *findings, f reportFlags) error {
	var b strings.Builder
	b.WriteString("\\documentclass[a4paper]{article}\n\\usepackage[T1]{fontenc}\n\\usepackage[utf8]{inputenc}\n\\usepackage{amsmath,amssymb}\n\\usepackage{graphicx}\n")
	st := fs.story()
	fmt.Fprintf(&b, "\\title{%s}\n\\author{}\n\\date{}\n\\begin{document}\n\\maketitle\n\\input{derivation}\n", present.TeXText(title(fs)))
	st.Title = ""
	files := map[string][]byte{"derivation.tex": present.StoryLaTeX(st, fs.prov, present.LatexSettings{})}
	var names []string
	for _, p := range fs.pictures() {
		pdf, err := p.plot.PDF()
		if err != nil {
			return err
		}
		files[p.name+".pdf"] = pdf
		names = append(names, p.name+".pdf")
		fmt.Fprintf(&b, "\\begin{figure}[htbp]\n\\centering\n\\includegraphics{%s}\n\\caption{%s}\\label{fig:epslim:%s}\n\\end{figure}\n", p.name, present.TeXText(p.caption), p.name)
	}
	b.WriteString("\\end{document}\n")
	files["article.tex"] = []byte(b.String())
	for _, n := range append(names, "derivation.tex", "article.tex") {
		if err := write(filepath.Join(f.out, n), files[n], f.force); err != nil {
			return err
		}
	}
	a.remark("%s written", filepath.Join(f.out, "article.tex"))
	return a.typeset(ctx, f.out)
}

// typeset makes the PDF where pdflatex is installed.
func (a *app) typeset(ctx context.Context, dir string) error {
	bin, err := exec.LookPath("pdflatex")
	if errors.Is(err, exec.ErrNotFound) {
		a.remark("pdflatex was not found, so there is no PDF; article.tex can be compiled elsewhere")
		return nil
	}
	if err != nil {
		return err
	}
	for pass := 0; pass < 2; pass++ {
		c := exec.CommandContext(ctx, bin, "-interaction=nonstopmode", "-halt-on-error", "article.tex")
		c.Dir = dir
		// The date in the file is that of no clock.
		c.Env = append(os.Environ(), "SOURCE_DATE_EPOCH=0", "FORCE_SOURCE_DATE=1")
		if out, err := c.CombinedOutput(); err != nil {
			return fmt.Errorf("pdflatex failed; see %s: %w\n%s", filepath.Join(dir, "article.log"), err, lastLines(string(out), 6))
		}
	}
	for _, ext := range []string{"aux", "log"} {
		_ = os.Remove(filepath.Join(dir, "article."+ext))
	}
	return nil
}

func lastLines(s string, n int) string {
	lines := strings.Split(strings.TrimSpace(s), "\n")
	return strings.Join(lines[max(len(lines)-n, 0):], "\n")
}
