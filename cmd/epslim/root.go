package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"epslim/generator/algebra"
	"epslim/generator/ito"
	"epslim/generator/ito/diagnostic"
)

// version of the program, embedded in every output.
const version = "0.1.0"

// The exit statuses, the same for every command.
const (
	exitDone        = 0
	exitFailed      = 1 // a claim or a check failed
	exitWrong       = 2 // the model file or the command line is wrong
	exitRefused     = 3 // the model has no such limit
	exitInterrupted = 130
)

// status is an error that only carries an exit status: everything there is
// to say has been printed.
type status int

func (s status) Error() string { return fmt.Sprintf("exit status %d", int(s)) }

// app holds the streams and the options common to all commands.
type app struct {
	in       io.Reader
	out, err io.Writer
	set      []string
	quiet    bool
}

// usageError is a command line that cannot be understood: it is followed by
// the usage of the command.
type usageError struct {
	err error
	cmd *cobra.Command
}

func (u *usageError) Error() string { return u.err.Error() }
func (u *usageError) Unwrap() error { return u.err }

// run is the whole program; it returns the exit status.
func run(ctx context.Context, args []string, in io.Reader, out, errs io.Writer) (code int) {
	defer func() {
		// A fault of the program must not look like one of the model.
		if x := recover(); x != nil {
			if e, ok := x.(error); ok && ctx.Err() != nil && errors.Is(e, ctx.Err()) {
				fmt.Fprintln(errs, "epslim: interrupted")
				code = exitInterrupted
				return
			}
			if e, ok := x.(error); ok && errors.Is(e, algebra.ErrTooLarge) {
				fmt.Fprintln(errs, "epslim: the result is too long to be arranged for reading:", e)
				code = exitWrong
				return
			}
			fmt.Fprintf(errs, "epslim: internal error: %v\nThis is a fault of the program; please report it with the model file.\n", x)
			code = exitWrong
		}
	}()
	a := &app{in: in, out: out, err: errs}
	root := a.root()
	root.SetArgs(args)
	root.SetIn(in)
	root.SetOut(out)
	root.SetErr(errs)
	err := root.ExecuteContext(ctx)
	var s status
	var u *usageError
	switch {
	case err == nil:
		return exitDone
	case errors.As(err, &s):
		return int(s)
	case errors.Is(err, context.Canceled) || ctx.Err() != nil:
		fmt.Fprintln(errs, "epslim: interrupted")
		return exitInterrupted
	case errors.As(err, &u):
		fmt.Fprintf(errs, "epslim: %v\n\n%s", u, u.cmd.UsageString())
		return exitWrong
	}
	fmt.Fprintln(errs, "epslim:", strings.TrimRight(err.Error(), "\n"))
	return exitWrong
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "epslim",
		Short: "The limit eps -> 0 of fast-slow stochastic systems, derived, explained and checked",
		Long: `The limit eps -> 0 of fast-slow stochastic systems: from a model file to the
limiting stochastic differential equation and its stationary density, with the
derivation shown and checked.`,
		Example: `  epslim new crawler
  epslim derive crawler.ito`,
		Version:                    version,
		SilenceUsage:               true,
		SilenceErrors:              true,
		SuggestionsMinimumDistance: 3,
	}
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error {
		return &usageError{nearFlag(cmd, err), cmd}
	})
	root.PersistentFlags().StringArrayVar(&a.set, "set", nil, "set a parameter (D=1.5) or a function (\"v(x,y)=1+x^2\"); repeatable")
	root.PersistentFlags().BoolVar(&a.quiet, "quiet", false, "print results only")
	root.AddCommand(a.deriveCommand(), a.densityCommand(), a.checkCommand(), a.ensembleCommand(), a.mergeCommand(), a.reportCommand(), a.newCommand(), a.formatCommand())
	root.SetUsageTemplate(usage)
	root.SetHelpTemplate(help)
	completions(root)
	return root
}

// nearFlag adds the flag that was probably meant.
func nearFlag(cmd *cobra.Command, err error) error {
	name, ok := strings.CutPrefix(err.Error(), "unknown flag: --")
	if !ok {
		return err
	}
	name, _, _ = strings.Cut(name, "=")
	var names []string
	cmd.Flags().VisitAll(func(f *pflag.Flag) { names = append(names, f.Name) })
	if near := diagnostic.Nearest(name, names); near != "" {
		return fmt.Errorf("%w; did you mean --%s?", err, near)
	}
	return err
}

// help begins with the examples, because that is what a reader looks for.
const help = `{{with .Example}}Examples:
{{.}}

{{end}}{{with (or .Long .Short)}}{{. | trimTrailingWhitespaces}}

{{end}}{{if or .Runnable .HasSubCommands}}{{.UsageString}}{{end}}`

// usage is how a command is called.
const usage = `Usage:{{if .Runnable}}
  {{.UseLine}}{{end}}{{if .HasAvailableSubCommands}}
  {{.CommandPath}} COMMAND

Commands:{{range .Commands}}{{if (or .IsAvailableCommand (eq .Name "help"))}}
  {{rpad .Name .NamePadding }} {{.Short}}{{end}}{{end}}{{end}}{{if .HasAvailableLocalFlags}}

Flags:
{{.LocalFlags.FlagUsages | trimTrailingWhitespaces}}{{end}}{{if .HasAvailableInheritedFlags}}

Common flags:
{{.InheritedFlags.FlagUsages | trimTrailingWhitespaces}}{{end}}
`

// source reads a file, or standard input for "-", and returns the name that
// messages use.
func (a *app) source(name string) (src []byte, label string, err error) {
	if name == "-" {
		src, err = io.ReadAll(io.LimitReader(a.in, 16<<20))
		return src, "standard input", err
	}
	src, err = readFile(name)
	return src, name, err
}

// read reads a model; "-" is standard input. Errors have been printed when it
// returns a status.
func (a *app) read(name string) (*ito.System, error) {
	src, label, err := a.source(name)
	if err != nil {
		return nil, err
	}
	sys, err := ito.Parse(label, src, ito.Options{Set: a.set})
	if err != nil {
		return nil, a.modelError(err)
	}
	for _, w := range sys.Warnings {
		a.remark("%s", strings.TrimRight(w.Error(), "\n"))
	}
	return sys, nil
}

// readFile reads at most a little more than the reader accepts.
func readFile(name string) ([]byte, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return io.ReadAll(io.LimitReader(f, 16<<20))
}

// modelError prints the errors of a model file as they are.
func (a *app) modelError(err error) error {
	var list ito.ErrorList
	if errors.As(err, &list) {
		fmt.Fprint(a.err, list.Error())
		if s := list.Error(); len(s) > 0 && s[len(s)-1] != '\n' {
			fmt.Fprintln(a.err)
		}
		return status(exitWrong)
	}
	return err
}

// The arguments of the commands.
func oneFile(cmd *cobra.Command, args []string) error {
	if len(args) != 1 {
		return fmt.Errorf("%s takes one model file, or - for standard input; %d names were given", cmd.Name(), len(args))
	}
	return nil
}

func oneName(cmd *cobra.Command, args []string) error {
	if len(args) != 1 {
		return fmt.Errorf("%s takes one name for the model file; %d were given", cmd.Name(), len(args))
	}
	return nil
}

func someFiles(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return fmt.Errorf("%s takes at least one model file, or - for standard input", cmd.Name())
	}
	return nil
}
