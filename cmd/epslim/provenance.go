package main

import (
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"epslim/cmd/epslim/present"
	"epslim/generator/ito"
)

// provenance describes an output: the version, the model, the effective
// options and the command that repeats it. Files are named without folders.
func (a *app) provenance(cmd *cobra.Command, sys *ito.System, file string) present.Provenance {
	p := present.Provenance{Version: version, SHA256: sys.SHA256, Model: sys.Source}
	words := []string{"epslim", cmd.Name(), quote(baseName(file))}
	cmd.Flags().VisitAll(func(f *pflag.Flag) {
		if f.Name == "help" || f.Name == "quiet" || f.Name == "force" || f.Name == "workers" {
			return
		}
		values := []string{f.Value.String()}
		if s, ok := f.Value.(pflag.SliceValue); ok {
			values = s.GetSlice()
		}
		for _, v := range values {
			if isFileFlag(f.Name) {
				v = baseName(v)
			}
			if f.Changed {
				words = append(words, "--"+f.Name, quote(v))
			}
			if v != "" {
				p.Options = append(p.Options, present.Option{Name: f.Name, Value: v})
			}
		}
	})
	p.Command = strings.Join(words, " ")
	return p
}

// isFileFlag tells the flags whose value is a path.
func isFileFlag(name string) bool {
	switch name {
	case "figure", "csv", "npz", "out", "output":
		return true
	}
	return false
}

func baseName(file string) string {
	if file == "-" || file == "" {
		return file
	}
	return filepath.Base(file)
}

// quote makes a word safe for a shell where it needs to be.
func quote(s string) string {
	plain := s != ""
	for _, c := range s {
		plain = plain && (c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || strings.ContainsRune("-_./=:,+", c))
	}
	if plain {
		return s
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}
