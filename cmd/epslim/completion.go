package main

import (
	"strings"

	"github.com/spf13/cobra"

	"epslim/generator/ito"
	"epslim/solver/ensemble"
)

// completeModels completes the names of model files.
func completeModels(_ *cobra.Command, _ []string, _ string) ([]string, cobra.ShellCompDirective) {
	return []string{"ito"}, cobra.ShellCompDirectiveFilterFileExt
}

// outline reads the names of the model that stands on the command line.
func outline(args []string) (ito.Outline, bool) {
	if len(args) == 0 || args[0] == "-" {
		return ito.Outline{}, false
	}
	src, err := readFile(args[0])
	if err != nil {
		return ito.Outline{}, false
	}
	return ito.ReadOutline(src), true
}

// completeSet offers the parameters and functions of the model for --set.
func completeSet(_ *cobra.Command, args []string, _ string) ([]string, cobra.ShellCompDirective) {
	o, ok := outline(args)
	if !ok {
		return nil, cobra.ShellCompDirectiveNoFileComp
	}
	var out []string
	for _, n := range append(append([]string(nil), o.Parameters...), o.Functions...) {
		out = append(out, n+"=")
	}
	return out, cobra.ShellCompDirectiveNoSpace | cobra.ShellCompDirectiveNoFileComp
}

// completeAt offers the slow variables, then the parameters, that a point
// does not have yet.
func completeAt(_ *cobra.Command, args []string, typed string) ([]string, cobra.ShellCompDirective) {
	o, ok := outline(args)
	if !ok {
		return nil, cobra.ShellCompDirectiveNoFileComp
	}
	done := ""
	if i := strings.LastIndexByte(typed, ','); i >= 0 {
		done = typed[:i+1]
	}
	var out []string
	for _, n := range append(append([]string(nil), o.Slow...), o.Parameters...) {
		if !strings.Contains(","+done, ","+n+"=") {
			out = append(out, done+n+"=")
		}
	}
	return out, cobra.ShellCompDirectiveNoSpace | cobra.ShellCompDirectiveNoFileComp
}

// completions registers what can be completed for the flags a command has.
func completions(root *cobra.Command) {
	fixed := func(values ...string) func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
		return cobra.FixedCompletions(values, cobra.ShellCompDirectiveNoFileComp)
	}
	_ = root.RegisterFlagCompletionFunc("set", completeSet)
	for _, c := range root.Commands() {
		if c.ValidArgsFunction == nil {
			c.ValidArgsFunction = completeModels
		}
		if f := c.Flags().Lookup("format"); f != nil {
			values := strings.FieldsFunc(f.Usage, func(r rune) bool { return r == ' ' || r == ',' })
			var list []string
			for _, v := range values {
				if v != "or" {
					list = append(list, v)
				}
			}
			_ = c.RegisterFlagCompletionFunc("format", fixed(list...))
		}
		if c.Flags().Lookup("at") != nil {
			_ = c.RegisterFlagCompletionFunc("at", completeAt)
		}
		if c.Flags().Lookup("without") != nil {
			_ = c.RegisterFlagCompletionFunc("without", fixed("grid", "full", "ensemble"))
		}
		for _, name := range []string{"scheme", "limit-scheme"} {
			if c.Flags().Lookup(name) != nil {
				_ = c.RegisterFlagCompletionFunc(name, fixed(schemeNames()...))
			}
		}
		for _, name := range []string{"times", "long", "histogram", "target", "budget", "checkpoint-every", "eps", "paths", "time", "step", "seed", "workers", "cells"} {
			if c.Flags().Lookup(name) != nil {
				_ = c.RegisterFlagCompletionFunc(name, fixed())
			}
		}
	}
}

func schemeNames() []string {
	var out []string
	for _, s := range ensemble.Schemes() {
		out = append(out, s.Name)
	}
	return out
}
