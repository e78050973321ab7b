package main

import (
	"context"
	"fmt"
	"slices"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/numbers"
	"epslim/cmd/epslim/present"
	"epslim/solver/density"
	"epslim/solver/multigrid"
)

const maxDecay = 50

// check refuses what cannot be asked for together.
func (f densityFlags) check() error {
	if f.decay < 0 || f.decay > maxDecay {
		return fmt.Errorf("--decay is %d; between 1 and %d rates are possible", f.decay, maxDecay)
	}
	if f.exit && (f.figure != "" || f.csv != "" || f.npz != "") {
		return fmt.Errorf("--exit prints numbers only; figures and tables are of the stationary density")
	}
	return nil
}

// relax finds decay rates and exit times where they are asked for.
func (a *app) relax(ctx context.Context, res *derivation.Result, cells []int, f densityFlags) (*numbers.Relaxation, error) {
	if f.decay == 0 && !f.exit {
		return nil, nil
	}
	p := a.progress()
	defer p.clear()
	return numbers.Relax(ctx, res, numbers.DensityOptions{
		Cells: cells,
		Settings: density.Settings{Workers: f.workers, Progress: func(q density.Progress) {
			p.show("%s %d, residual %.2g", q.Stage, q.Iteration, q.Residual)
		}},
	}, f.decay, f.exit)
}

type decayRate struct {
	Real      float64 `json:"real"`
	Imaginary float64 `json:"imaginary"`
	Residual  float64 `json:"residual"`
}

func decayJSON(r *numbers.Relaxation) []decayRate {
	if r == nil {
		return nil
	}
	var out []decayRate
	for _, x := range r.Rates {
		out = append(out, decayRate{real(x.Value), imag(x.Value), x.Residual})
	}
	return out
}

// withRelaxation adds what was found to a story.
func withRelaxation(st *present.Story, r *numbers.Relaxation) *present.Story {
	if r == nil {
		return st
	}
	if len(r.Rates) > 0 {
		t := present.Table{Head: []string{"rate", "oscillation", "relaxation time", "estimated relative error"}}
		for _, x := range r.Rates {
			t.Rows = append(t.Rows, [][]present.Span{textCell("%.8g", real(x.Value)), textCell("%.6g", imag(x.Value)), textCell("%.6g", 1/real(x.Value)), textCell("%.1g", x.Residual)})
		}
		st.Sections = append(st.Sections, present.Section{ID: "decay", Title: fmt.Sprintf("Slowest decay rates (%s cells)", r.Grid), Blocks: []present.Block{t}})
	}
	if r.Exit != nil {
		t := present.Table{}
		row := func(name, format string, args ...any) {
			t.Rows = append(t.Rows, [][]present.Span{textCell("%s", name), textCell(format, args...)})
		}
		start, longest, at := exitTimes(r)
		row("from the start", "%.8g, at %s", start, r.Grid.PointText(r.Start))
		row("longest", "%.8g, from %s", longest, r.Grid.PointText(at))
		row("solver", "%s, residual %.2g", r.Exit.Outcome, r.Exit.Residual)
		st.Sections = append(st.Sections, present.Section{ID: "exit", Title: fmt.Sprintf("Mean exit time (%s cells)", r.Grid), Blocks: []present.Block{t}})
	}
	return st
}

// exitTimes are the mean exit times from the cell of the start and from the
// cell from which it is longest.
func exitTimes(r *numbers.Relaxation) (start, longest float64, at []float64) {
	v := r.Exit.Values
	longest = slices.Max(v)
	return v[r.Grid.CellAt(r.Start...)], longest, r.Grid.CenterOf(slices.Index(v, longest))
}

// tellRelaxation prints exit times, and decay rates where they are asked for.
func (a *app) tellRelaxation(res *derivation.Result, r *numbers.Relaxation, format string) error {
	var err error
	if format == "json" {
		start, longest, _ := exitTimes(r)
		err = a.printJSON(struct {
			Format   string      `json:"format"`
			Cells    []int       `json:"cells"`
			Start    []float64   `json:"start"`
			Exit     float64     `json:"mean_exit_time"`
			Longest  float64     `json:"longest_mean_exit_time"`
			Residual float64     `json:"residual"`
			Rates    []decayRate `json:"decay_rates,omitempty"`
		}{present.Format, r.Grid.Shape(), r.Start, start, longest, r.Exit.Residual, decayJSON(r)})
	} else {
		st := withRelaxation(&present.Story{Title: res.System.Title}, r)
		_, err = a.out.Write(present.StoryText(st, present.TextSettings{Colour: colour(a.out)}))
	}
	if err == nil && r.Exit.Outcome != multigrid.Converged && r.Exit.Residual > 1e-8 {
		return status(exitFailed)
	}
	return err
}
