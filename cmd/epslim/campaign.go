package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/ito"
	"epslim/solver/ensemble"
)

const campaignFormat = "epslim-campaign/1"

// campaign describes the parts of a run: what it takes to resume the run or
// to merge its slices. It lies in the file named by --checkpoint; the part of
// system k, 0 for the limit, lies beside it in the file with ".k" added.
type campaign struct {
	Format  string        `json:"format"`
	Version string        `json:"version"`
	File    string        `json:"file"`
	SHA256  string        `json:"sha256"`
	Model   string        `json:"model"`
	Set     []string      `json:"set"`
	Run     ensembleFlags `json:"run"`
}

func newCampaign(sys *ito.System, file string, set []string, f ensembleFlags) campaign {
	return campaign{campaignFormat, version, baseName(file), sys.SHA256, sys.Source, append([]string{}, set...), f}
}

// key is what must agree between the slices of one run.
func (c campaign) key() string {
	c.Run.Paths, c.Version, c.File, c.Run.Budget = "", "", "", ""
	data, _ := json.Marshal(c) // of plain fields: cannot fail
	return string(data)
}

func loadCampaign(name string) (campaign, error) {
	var c campaign
	data, err := os.ReadFile(name)
	if err != nil {
		return c, err
	}
	if err := json.Unmarshal(data, &c); err != nil || c.Format != campaignFormat {
		return c, fmt.Errorf("%s is not a checkpoint of an ensemble (format %s)", name, campaignFormat)
	}
	return c, nil
}

// begin puts the description in place. A checkpoint that exists is kept unless
// the run resumes it or force is set.
func (c campaign) begin(name string, resume, force bool, systems int) error {
	old, err := loadCampaign(name)
	switch {
	case err == nil && resume:
		if old.key() != c.key() {
			return fmt.Errorf("the checkpoint %s belongs to another model or other options", name)
		}
		return nil
	case errors.Is(err, fs.ErrNotExist):
	case !force && err == nil:
		return fmt.Errorf("%s exists; use --resume to go on from it, or --force to begin anew", name)
	case !force:
		return err
	}
	for k := range systems {
		part := partName(name, k)
		if !force {
			if err := vacant(part); err != nil {
				return err
			}
		}
		if err := os.Remove(part); err != nil && !errors.Is(err, fs.ErrNotExist) {
			return err
		}
	}
	data, err := json.MarshalIndent(c, "", "  ")
	if err != nil {
		return err
	}
	return write(name, append(data, '\n'), force)
}

func partName(name string, system int) string { return fmt.Sprintf("%s.%d", name, system) }

func (a *app) mergeCommand() *cobra.Command {
	var o ensembleOutput
	cmd := &cobra.Command{
		Use:   "merge FILE...",
		Short: "Unite the slices of an ensemble that were run apart",
		Long: `Unite the checkpoints of runs over disjoint ranges of paths, wherever they were
made. The result is that of the unbroken run, byte for byte.`,
		Example: `  epslim ensemble crawler.ito --paths 0:10000 --checkpoint a
  epslim ensemble crawler.ito --paths 10000:20000 --checkpoint b
  epslim merge a b --csv means.csv`,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return fmt.Errorf("merge takes the names given to --checkpoint")
			}
			return nil
		},
		RunE:              func(cmd *cobra.Command, args []string) error { return a.merge(cmd.Context(), args, o) },
		ValidArgsFunction: func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) { return nil, 0 },
	}
	o.bind(cmd)
	return cmd
}

func (a *app) merge(ctx context.Context, files []string, o ensembleOutput) error {
	if err := o.check(a); err != nil {
		return err
	}
	if len(a.set) > 0 {
		return fmt.Errorf("merge takes the parameters from the checkpoints; --set cannot be given")
	}
	var first campaign
	for i, f := range files {
		c, err := loadCampaign(f)
		switch {
		case err != nil:
			return err
		case i == 0:
			first = c
		case c.key() != first.key():
			return fmt.Errorf("%s belongs to another model or other options than %s", f, files[0])
		}
	}
	run, err := first.Run.settings()
	if err != nil {
		return err
	}
	parts, err := mergeParts(files, len(run.eps)+1)
	if err != nil {
		return err
	}
	done := parts[0].Tally.Done
	for k := 1; k < len(done); k++ {
		a.remark("the paths %d to %d are missing", done[k-1].To, done[k].From-1)
	}
	for k, p := range parts[1:] {
		if p.Tally.Paths() < parts[0].Tally.Paths() && run.target == nil {
			a.remark("eps = %g has %d paths only; --resume finishes its runs", run.eps[k], p.Tally.Paths())
		}
	}
	run.from, run.to = done[0].From, done[len(done)-1].To
	if run.bias {
		a.remark("the bias of the step is not estimated for merged slices")
	}
	sys, err := ito.Parse(first.File, []byte(first.Model), ito.Options{Set: first.Set})
	if err != nil {
		return a.modelError(err)
	}
	res, err := derivation.Run(ctx, sys, derivation.Options{SkipClaims: true})
	if err != nil {
		return a.deriveError(err)
	}
	if res.Refused != nil {
		return a.refused(res, first.provenance(run), o.format)
	}
	st, s, law, err := a.study(ctx, res, run)
	if err != nil {
		return a.deriveError(err)
	}
	c, err := st.Evaluate(s, parts)
	if err != nil {
		return err
	}
	return a.tell(res, run, c, law, first.provenance(run), o)
}

// mergeParts unites the parts of each system.
func mergeParts(files []string, systems int) ([]*ensemble.Part, error) {
	var out []*ensemble.Part
	for k := range systems {
		var list []*ensemble.Part
		for _, f := range files {
			p, err := ensemble.LoadPart(partName(f, k))
			if errors.Is(err, fs.ErrNotExist) {
				return nil, fmt.Errorf("%s: the part %s is missing; finish the run with --resume", f, filepath.Base(partName(f, k)))
			}
			if err != nil {
				return nil, err
			}
			list = append(list, p)
		}
		p, err := ensemble.MergeParts(list...)
		if err != nil {
			return nil, err
		}
		if p.Tally.Paths() == 0 {
			return nil, fmt.Errorf("%s has no finished paths; finish the run with --resume", partName(files[0], k))
		}
		out = append(out, p)
	}
	return out, nil
}
