//go:build unix

// Command sidebyside measures the ensemble engine beside peer programs on the
// same work and prints the tables of docs/performance-mc.md as Markdown:
//
//	go run ./solver/ensemble/sidebyside [-rounds 5] [-python python3] [-skip numpy,numba]
//
// It needs gcc, libsleef-dev and, for two of the peers, Python with NumPy and
// Numba; peers that cannot be built or run are left out with the reason. Each
// round runs every program once, in the same order, pinned to one core; medians
// of processor time are printed.
package main

import (
	"context"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"time"

	"epslim/solver/ensemble"
	"epslim/solver/kernel"
)

type options struct {
	rounds  int
	paths   uint64
	python  string
	skip    []string
	sources string
}

func main() {
	var o options
	var paths int
	var skip string
	flag.IntVar(&o.rounds, "rounds", 5, "rounds of the whole list")
	flag.IntVar(&paths, "paths", 100000, "paths of our own runs; the peers have 100000")
	flag.StringVar(&o.python, "python", "python3", "the Python that has NumPy and Numba")
	flag.StringVar(&skip, "skip", "", "programs to leave out, separated by commas")
	flag.StringVar(&o.sources, "sources", "solver/ensemble/sidebyside/testdata", "folder of the peers")
	child := flag.String("child", "", "internal: measure one model with one implementation, as model/implementation")
	flag.Parse()
	o.paths, o.skip = uint64(max(1, paths)), strings.Split(skip, ",")
	var err error
	if *child != "" {
		err = measureChild(*child, o.paths)
	} else {
		err = sideBySide(o)
	}
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
}

// program is one column of the table: a command that prints ns per path-step.
type program struct {
	name  string
	make  func(dir string) ([]string, error) // the command without the model
	times map[int][]float64
}

func peers(o options) []*program {
	compiled := func(name, source string, flags ...string) *program {
		return &program{name: name, make: func(dir string) ([]string, error) {
			out := filepath.Join(dir, name)
			args := append([]string{"-O3", "-march=native", "-ffast-math"}, flags...)
			var libraries []string
			for len(args) > 0 && strings.HasPrefix(args[len(args)-1], "-l") {
				libraries, args = append(libraries, args[len(args)-1]), args[:len(args)-1]
			}
			args = append(append(args, filepath.Join(o.sources, source), "-o", out), append(libraries, "-lm")...)
			if text, err := exec.Command("gcc", args...).CombinedOutput(); err != nil {
				return nil, fmt.Errorf("gcc %s: %w: %s", strings.Join(args, " "), err, text)
			}
			return []string{out}, nil
		}}
	}
	python := func(name string) *program {
		return &program{name: name, make: func(string) ([]string, error) {
			return []string{o.python, filepath.Join(o.sources, "mc_py.py"), name}, nil
		}}
	}
	list := []*program{
		compiled("hand-avx512", "mc_hand.c", "-fno-associative-math", "-fno-finite-math-only", "-DVL=8", "-DUN=1"),
		compiled("hand-avx2", "mc_hand.c", "-fno-associative-math", "-fno-finite-math-only", "-DVL=4", "-DUN=1"),
		compiled("sleef-u10", "mc_sleef.c", "-fno-associative-math", "-fno-finite-math-only", "-lsleef"),
		compiled("libmvec-512", "mc_mvec2.c", "-mprefer-vector-width=512", "-lmvec"),
		compiled("scalar-c", "mc_scalar.c"),
		python("numpy"), python("numba"),
	}
	for _, im := range kernel.Implementations() {
		list = append(list, ours(im.Name(), o))
	}
	return list
}

// ours runs this program itself, so that it is pinned and timed like the peers.
func ours(name string, o options) *program {
	return &program{name: "epslim-" + name, make: func(string) ([]string, error) {
		self, err := os.Executable()
		return []string{self, "-paths", strconv.FormatUint(o.paths, 10), "-child", name}, err
	}}
}

var perStep = regexp.MustCompile(`(?:cpu |)([0-9.]+) (?:\[[^]]*\] )?ns/path-step`)

// time1 runs a command for one model and returns the ns per path-step it prints.
func (p *program) time1(command []string, model int) error {
	args := append([]string{"-c", "0"}, command...)
	if strings.HasPrefix(p.name, "epslim") {
		args[len(args)-1] += "/" + strconv.Itoa(model)
	} else {
		args = append(args, strconv.Itoa(model), "1")
	}
	text, err := exec.Command("taskset", args...).CombinedOutput()
	if err != nil {
		return fmt.Errorf("%w: %s", err, text)
	}
	m := perStep.FindAllStringSubmatch(string(text), -1)
	if m == nil {
		return fmt.Errorf("no time in %q", text)
	}
	ns, err := strconv.ParseFloat(m[len(m)-1][1], 64)
	if err != nil {
		return err
	}
	p.times[model] = append(p.times[model], ns)
	return nil
}

func sideBySide(o options) error {
	dir, err := os.MkdirTemp("", "sidebyside")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	var list []*program
	commands := map[*program][]string{}
	for _, p := range peers(o) {
		if slices.Contains(o.skip, p.name) {
			continue
		}
		p.times = map[int][]float64{}
		command, err := p.make(dir)
		if err != nil {
			fmt.Fprintf(os.Stderr, "left out: %s: %v\n", p.name, err)
			continue
		}
		commands[p] = command
		list = append(list, p)
	}
	for round := range o.rounds {
		for _, p := range slices.Clone(list) {
			for model := 1; model <= 2; model++ {
				if err := p.time1(commands[p], model); err != nil {
					fmt.Fprintf(os.Stderr, "left out: %s: %v\n", p.name, err)
					list = slices.DeleteFunc(list, func(q *program) bool { return q == p })
					break
				}
			}
		}
		fmt.Fprintf(os.Stderr, "round %d of %d\n", round+1, o.rounds)
	}
	printPeers(list)
	if err := printModels(o); err != nil {
		return err
	}
	return printScaling(o)
}

func median(x []float64) float64 {
	y := slices.Sorted(slices.Values(x))
	return y[len(y)/2]
}

func printPeers(list []*program) {
	fmt.Printf("%s, %s\n\n", runtime.Version(), time.Now().UTC().Format("2006-01"))
	fmt.Print("| program | M1, ns per path-step | M2 |")
	var our []*program
	for _, p := range list {
		if strings.HasPrefix(p.name, "epslim") {
			our = append(our, p)
			fmt.Printf(" M1/%s | M2/%s |", p.name, p.name)
		}
	}
	fmt.Printf("\n|%s\n", strings.Repeat(" --- |", 3+2*len(our)))
	for _, p := range list {
		fmt.Printf("| %s |", p.name)
		for model := 1; model <= 2; model++ {
			x := p.times[model]
			fmt.Printf(" %.2f [%.2f..%.2f] |", median(x), slices.Min(x), slices.Max(x))
		}
		for _, q := range our {
			fmt.Printf(" %.2f | %.2f |", median(p.times[1])/median(q.times[1]), median(p.times[2])/median(q.times[2]))
		}
		fmt.Println()
	}
}

func cpuSeconds() float64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	return float64(u.Utime.Sec+u.Stime.Sec) + 1e-6*float64(u.Utime.Usec+u.Stime.Usec)
}

func measureChild(what string, paths uint64) error {
	name, number, _ := strings.Cut(what, "/")
	m := models()[number]
	if m == nil {
		return fmt.Errorf("no model %q", number)
	}
	for _, im := range kernel.Implementations() {
		if im.Name() == name {
			ns, err := measure(m, im, paths, 1)
			if err != nil {
				return err
			}
			fmt.Printf("epslim-%s M%s %.3f ns/path-step\n", name, number, ns)
			return nil
		}
	}
	return fmt.Errorf("this processor has no implementation %q", name)
}

// measure returns the processor time of a path-step of 1000 Euler steps of 1e-4.
func measure(m *ensemble.Model, im kernel.Implementation, paths uint64, workers int) (float64, error) {
	start := cpuSeconds()
	_, err := ensemble.Run(context.Background(), m, ensemble.Settings{To: paths, Time: 0.1, Step: 1e-4, Scheme: "euler", Seed: 42, Workers: workers, Implementation: &im})
	return (cpuSeconds() - start) * 1e9 / float64(paths) / 1000, err
}

// printModels measures ten models of different shape.
func printModels(o options) error {
	fmt.Print("\n| model | operations | normals | ns per path-step | ns per operation |\n| --- | --- | --- | --- | --- |\n")
	im := kernel.Implementations()[0]
	for _, name := range modelNames() {
		m := models()[name]
		var ns []float64
		for range max(1, o.rounds) {
			x, err := measure(m, im, 20480, 1)
			if err != nil {
				return err
			}
			ns = append(ns, x)
		}
		operations, normals, err := m.StepSize("euler", 1e-4)
		if err != nil {
			return err
		}
		t := median(ns)
		fmt.Printf("| %s | %d | %d | %.2f | %.3f |\n", name, operations, normals, t, t/float64(operations+normals))
	}
	return nil
}

// printScaling measures one and two workers: the best time on the wall, which a
// busy machine spoils, and the processor time, which shows what sharing costs.
func printScaling(o options) error {
	fmt.Print("\n| model | workers | wall ns per path-step, best | speed-up | processor ns per path-step, median |\n| --- | --- | --- | --- | --- |\n")
	im := kernel.Implementations()[0]
	for _, name := range []string{"1", "2"} {
		var wall [3]float64
		var cpu [3][]float64
		for range max(1, o.rounds) {
			for workers := 1; workers <= 2; workers++ {
				start := time.Now()
				ns, err := measure(models()[name], im, o.paths, workers)
				if err != nil {
					return err
				}
				cpu[workers] = append(cpu[workers], ns)
				ns = float64(time.Since(start).Nanoseconds()) / float64(o.paths) / 1000
				if wall[workers] == 0 || ns < wall[workers] {
					wall[workers] = ns
				}
			}
		}
		for workers := 1; workers <= 2; workers++ {
			fmt.Printf("| M%s | %d | %.2f | %.2f | %.2f |\n", name, workers, wall[workers], wall[1]/wall[workers], median(cpu[workers]))
		}
	}
	return nil
}
