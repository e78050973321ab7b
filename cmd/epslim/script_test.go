package main

import (
	"bytes"
	"context"
	"errors"
	"flag"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "rewrite the expected outputs in the scripts")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"epslim": main})
}

// The scripts hold commands, files and expected output together. "exits N
// command..." runs a command and checks its exit status.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:           "testdata/script",
		UpdateScripts: *update,
		Setup: func(e *testscript.Env) error {
			e.Setenv("NO_COLOR", "1")
			// For scripts that empty the search path.
			for _, d := range filepath.SplitList(e.Getenv("PATH")) {
				if _, err := os.Stat(filepath.Join(d, "epslim")); err == nil {
					e.Setenv("EPSLIM", filepath.Join(d, "epslim"))
				}
			}
			return nil
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits":   exits,
			"widest":  widest,
			"largest": largestFile,
			"killed":  killed,
		},
	})
}

func exits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits STATUS COMMAND...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	err = ts.Exec(args[1], args[2:]...)
	got := 0
	var x *exec.ExitError
	switch {
	case errors.As(err, &x):
		got = x.ExitCode()
	case err != nil:
		ts.Fatalf("%v", err)
	}
	if got != want {
		ts.Fatalf("exit status %d, want %d", got, want)
	}
}

// killed starts a command, kills it without warning as soon as a file exists,
// and fails when the command was done before that.
func killed(ts *testscript.TestScript, _ bool, args []string) {
	if len(args) < 2 {
		ts.Fatalf("usage: killed FILE COMMAND...")
	}
	name, err := exec.LookPath(args[1])
	ts.Check(err)
	cmd := exec.Command(name, args[2:]...)
	cmd.Dir = ts.MkAbs(".")
	ts.Check(cmd.Start())
	ended := make(chan error, 1)
	go func() { ended <- cmd.Wait() }()
	for {
		if _, err := os.Stat(ts.MkAbs(args[0])); err == nil {
			ts.Check(cmd.Process.Kill())
			if err := <-ended; err == nil {
				ts.Fatalf("the command was done before it could be killed")
			}
			return
		}
		select {
		case err := <-ended:
			ts.Fatalf("the command ended (%v) before %s existed", err, args[0])
		case <-time.After(5 * time.Millisecond):
		}
	}
}

// widest checks that no line of the last standard output has more than the
// given number of columns.
func widest(ts *testscript.TestScript, _ bool, args []string) {
	limit, err := strconv.Atoi(args[0])
	ts.Check(err)
	for i, l := range strings.Split(ts.ReadFile("stdout"), "\n") {
		if n := len([]rune(l)); n > limit {
			ts.Fatalf("line %d has %d columns: %s", i+1, n, l)
		}
	}
}

// largestFile writes a file of the given number of bytes.
func largestFile(ts *testscript.TestScript, _ bool, args []string) {
	n, err := strconv.Atoi(args[1])
	ts.Check(err)
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), bytes.Repeat([]byte("# gel\n"), n/6+1), 0o644))
}

// A command that is interrupted exits with 130 and says so.
func TestInterrupted(t *testing.T) {
	const model = "slow x\nfast y\ndx = y/eps dt\ndy = -y/eps^2 dt + 1/eps dW1\nstart x = 0\n"
	for _, args := range [][]string{
		{"ensemble", "-", "--paths", "100000000", "--time", "1000"},
		{"check", "-", "--paths", "100000000", "--time", "1000"},
		{"derive", "-"},
	} {
		ctx, cancel := context.WithCancel(context.Background())
		cancel()
		var out, errs bytes.Buffer
		if code := run(ctx, args, strings.NewReader(model), &out, &errs); code != exitInterrupted {
			t.Errorf("%v: exit status %d, want %d\n%s%s", args, code, exitInterrupted, out.String(), errs.String())
		}
		if !strings.Contains(errs.String(), "interrupted") {
			t.Errorf("%v: no word of the interruption in %q", args, errs.String())
		}
	}
}
