package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"

	"epslim/generator/ito"
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

// run is the whole program; it returns the exit status.
func run(ctx context.Context, args []string, in io.Reader, out, errs io.Writer) int {
	a := &app{in: in, out: out, err: errs}
	root := a.root()
	root.SetArgs(args)
	root.SetIn(in)
	root.SetOut(out)
	root.SetErr(errs)
	err := root.ExecuteContext(ctx)
	var s status
	switch {
	case err == nil:
		return exitDone
	case errors.As(err, &s):
		return int(s)
	case errors.Is(err, context.Canceled) || ctx.Err() != nil:
		fmt.Fprintln(errs, "epslim: interrupted")
		return exitInterrupted
	}
	fmt.Fprintln(errs, "epslim:", err)
	return exitWrong
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:           "epslim",
		Short:         "The limit eps -> 0 of fast-slow stochastic systems, derived, explained and checked",
		Version:       version,
		SilenceUsage:  true,
		SilenceErrors: true,
	}
	root.PersistentFlags().StringArrayVar(&a.set, "set", nil, "set a parameter (D=1.5) or a function (\"v(x,y)=1+x^2\"); repeatable")
	root.PersistentFlags().BoolVar(&a.quiet, "quiet", false, "print results only")
	root.AddCommand(a.deriveCommand(), a.densityCommand(), a.checkCommand(), a.ensembleCommand())
	return root
}

// read reads a model; "-" is standard input. Errors have been printed when it
// returns a status.
func (a *app) read(name string) (*ito.System, error) {
	var src []byte
	var err error
	if name == "-" {
		src, err = io.ReadAll(io.LimitReader(a.in, 16<<20))
		name = "standard input"
	} else {
		src, err = readFile(name)
	}
	if err != nil {
		return nil, err
	}
	sys, err := ito.Parse(name, src, ito.Options{Set: a.set})
	if err != nil {
		return nil, a.modelError(err)
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
