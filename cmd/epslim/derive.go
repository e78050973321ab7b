package main

import (
	"errors"
	"fmt"
	"runtime/debug"

	"github.com/spf13/cobra"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/present"
	"epslim/generator/ito"
)

func (a *app) deriveCommand() *cobra.Command {
	var format string
	var opt derivation.Options
	cmd := &cobra.Command{
		Use:   "derive FILE",
		Short: "Derive the limiting SDE and its stationary density",
		Example: `  epslim derive crawler.ito
  epslim derive crawler.ito --format json --at "x=0.3,y=0.2"`,
		Args: oneFile,
		RunE: func(cmd *cobra.Command, args []string) error {
			render, ok := formats[format]
			if !ok {
				return fmt.Errorf("--format is %q; it can be text, json, latex or markdown", format)
			}
			sys, err := a.read(args[0])
			if err != nil {
				return err
			}
			// A derivation is over before collecting garbage pays.
			defer debug.SetGCPercent(debug.SetGCPercent(800))
			res, err := derivation.Run(cmd.Context(), sys, opt)
			if err != nil {
				return a.deriveError(err)
			}
			text, err := render(res, a.provenance(cmd, sys, args[0]), colour(a.out))
			if err != nil {
				return err
			}
			if _, err := a.out.Write(text); err != nil {
				return err
			}
			return outcome(res)
		},
	}
	cmd.Flags().StringVar(&format, "format", "text", "text, json, latex or markdown")
	cmd.Flags().StringArrayVar(&opt.At, "at", nil, "a point \"x=0.3,y=0.2\" at which numbers are wanted; repeatable")
	cmd.Flags().BoolVar(&opt.MovingFrame, "moving-frame", false, "subtract a large mean drift instead of refusing the model")
	cmd.Flags().IntVar(&opt.Next, "order", 0, "also derive the corrections up to this power of the small parameter")
	return cmd
}

// rendering is how a derivation is printed.
type rendering func(r *derivation.Result, p present.Provenance, colour bool) ([]byte, error)

// formats are the renderings of a derivation.
var formats = map[string]rendering{
	"text": func(r *derivation.Result, _ present.Provenance, colour bool) ([]byte, error) {
		return present.Text(r, present.TextSettings{Colour: colour}), nil
	},
	"json": func(r *derivation.Result, _ present.Provenance, _ bool) ([]byte, error) {
		return present.JSON(r, version)
	},
	"latex": func(r *derivation.Result, p present.Provenance, _ bool) ([]byte, error) {
		return present.LaTeX(r, p, present.LatexSettings{}), nil
	},
	"markdown": func(r *derivation.Result, p present.Provenance, _ bool) ([]byte, error) {
		return present.Markdown(r, p), nil
	},
}

func (a *app) deriveError(err error) error {
	var list ito.ErrorList
	if errors.As(err, &list) {
		return a.modelError(err)
	}
	return err
}

// outcome is the exit status of a derivation.
func outcome(res *derivation.Result) error {
	if res.Refused != nil {
		return status(exitRefused)
	}
	for _, v := range res.Claims {
		if v.Verdict == derivation.Refuted {
			return status(exitFailed)
		}
	}
	for _, c := range res.Certificates {
		if c.Status == derivation.Failed {
			return status(exitFailed)
		}
	}
	return nil
}
