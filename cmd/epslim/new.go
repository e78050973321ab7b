package main

import (
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"epslim/generator/ito"
)

func (a *app) newCommand() *cobra.Command {
	var kind, title string
	var force bool
	var kinds, lines []string
	for _, t := range ito.Templates() {
		kinds = append(kinds, t.Kind)
		lines = append(lines, fmt.Sprintf("  %-8s %s", t.Kind, t.Summary))
	}
	cmd := &cobra.Command{
		Use:   "new NAME",
		Short: "A commented model file to start from",
		Long:  "Write NAME.ito, a commented model to start from. The kinds:\n\n" + strings.Join(lines, "\n"),
		Example: `  epslim new crawler
  epslim new furrow --kind channel --title "A tracer in a furrow"`,
		Args: oneName,
		RunE: func(_ *cobra.Command, args []string) error {
			file := args[0]
			if filepath.Ext(file) != ".ito" && file != "-" {
				file += ".ito"
			}
			if title == "" {
				title = strings.TrimSuffix(filepath.Base(file), ".ito")
				if file == "-" {
					title = "A " + kind
				}
			}
			text, err := ito.NewModel(kind, title)
			if err != nil {
				return err
			}
			if file == "-" {
				_, err := a.out.Write(text)
				return err
			}
			if err := write(file, text, force); err != nil {
				return err
			}
			a.remark("%s written; try: epslim derive %s", file, quote(file))
			return nil
		},
		ValidArgsFunction: cobra.NoFileCompletions,
	}
	cmd.Flags().StringVar(&kind, "kind", kinds[0], strings.Join(kinds, ", "))
	cmd.Flags().StringVar(&title, "title", "", "title of the model (default: its name)")
	cmd.Flags().BoolVar(&force, "force", false, "replace the file if it exists")
	_ = cmd.RegisterFlagCompletionFunc("kind", cobra.FixedCompletions(kinds, cobra.ShellCompDirectiveNoFileComp))
	return cmd
}

func (a *app) formatCommand() *cobra.Command {
	var inPlace, list bool
	cmd := &cobra.Command{
		Use:   "format FILE...",
		Short: "Canonical layout of model files, comments kept",
		Long:  "Print a model file in its canonical layout, or rewrite files in place.",
		Example: `  epslim format crawler.ito
  epslim format --write models/*.ito`,
		Args: someFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			for _, name := range args {
				src, label, err := a.source(name)
				if err != nil {
					return err
				}
				text, err := ito.Format(label, src)
				if err != nil {
					return a.modelError(err)
				}
				same := string(text) == string(src)
				switch {
				case list:
					if !same {
						fmt.Fprintln(a.out, name)
					}
				case inPlace && name != "-":
					if !same {
						if err := write(name, text, true); err != nil {
							return err
						}
					}
				default:
					if _, err := a.out.Write(text); err != nil {
						return err
					}
				}
			}
			return nil
		},
		ValidArgsFunction: completeModels,
	}
	cmd.Flags().BoolVar(&inPlace, "write", false, "rewrite the files instead of printing them")
	cmd.Flags().BoolVar(&list, "list", false, "print the names of the files whose layout differs")
	return cmd
}
