package multigrid

import (
	"context"
	"flag"
	"fmt"
	"runtime"
	"runtime/debug"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

// The campaign measures what docs/performance-fv.md reports:
//
//	go test ./solver/multigrid -run Campaign -campaign "A1:2:64,128;A2:3:96" -v
//
// Each entry is problem:dimension:cells along an axis. Times are processor
// times of this process, which a shared machine does not disturb much, and
// wall times beside them.
var (
	campaign        = flag.String("campaign", "", "problems to measure, as A1:2:64,128;A2:3:96")
	campaignWorkers = flag.Int("campaign.workers", 1, "goroutines")
	campaignReps    = flag.Int("campaign.reps", 5, "repetitions; medians are shown")
)

func cpuSeconds() float64 {
	var r syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &r); err != nil {
		return 0
	}
	return float64(r.Utime.Sec+r.Stime.Sec) + 1e-6*float64(r.Utime.Usec+r.Stime.Usec)
}

type stopwatch struct {
	cpu  float64
	wall time.Time
}

func startWatch() stopwatch { return stopwatch{cpuSeconds(), time.Now()} }

func (s stopwatch) read() (cpu, wall float64) {
	return cpuSeconds() - s.cpu, time.Since(s.wall).Seconds()
}

func median(v []float64) float64 {
	v = slices.Clone(v)
	slices.Sort(v)
	return v[len(v)/2]
}

func TestCampaign(t *testing.T) {
	if *campaign == "" {
		t.Skip("give -campaign to measure")
	}
	runtime.GOMAXPROCS(max(1, *campaignWorkers))
	fmt.Printf("| problem | cells | iterations | assembly cpu s | setup cpu s | solve cpu s | setup+solve cpu s | wall s | matvec ms | matvecs | residual | reduction of M p0, p0 = 1/A | live bytes/unknown |\n|%s\n", strings.Repeat(" --- |", 13))
	for _, entry := range strings.Split(*campaign, ";") {
		part := strings.Split(entry, ":")
		dim, err := strconv.Atoi(part[1])
		if err != nil {
			t.Fatal(err)
		}
		p := map[string]swirlProblem{"A1": {0, 1}, "A2": {20, 1}, "S200": {200, 1}, "S2000": {2000, 1}, "S20000": {20000, 1}, "S2e6": {2e6, 1},
			"R0.1": {20, 0.1}, "R0.01": {20, 0.01}, "R1e-4": {20, 1e-4}, "R1e4": {20, 1e4}}[part[0]]
		for _, size := range strings.Split(part[2], ",") {
			n, err := strconv.Atoi(size)
			if err != nil {
				t.Fatal(err)
			}
			measure(t, part[0], p, dim, n)
		}
	}
}

func measure(t *testing.T, name string, p swirlProblem, dim, n int) {
	ctx := context.Background()
	g := square(t, dim, n, grid.Reflecting)
	var asm, setup, solve, total, wall, mv []float64
	var st Stats
	var reduction, bytes float64
	for rep := 0; rep < *campaignReps; rep++ {
		debug.FreeOSMemory()
		w := startWatch()
		m, err := volume.Assemble(ctx, g, p, volume.Settings{Workers: *campaignWorkers})
		if err != nil {
			t.Fatal(err)
		}
		c, _ := w.read()
		asm = append(asm, c)
		w = startWatch()
		sv, err := New(ctx, m, p, 0, false, Settings{})
		if err != nil {
			t.Fatal(err)
		}
		c1, w1 := w.read()
		w = startWatch()
		var x []float64
		x, st = sv.Stationary(ctx)
		c2, w2 := w.read()
		setup, solve, total, wall = append(setup, c1), append(solve, c2), append(total, c1+c2), append(wall, w1+w2)
		var ms runtime.MemStats
		runtime.GC()
		runtime.ReadMemStats(&ms)
		bytes = float64(ms.HeapAlloc) / float64(g.Cells())
		y := m.Layout.Vector()
		m.Apply(y, x, 0)
		w = startWatch()
		const times = 5
		for i := 0; i < times; i++ {
			m.Apply(y, x, 0)
		}
		_, mvWall := w.read()
		c, _ = w.read()
		mv = append(mv, min(c, mvWall*float64(*campaignWorkers))/times)
		reduction = outflow(m, x) / outflow(m, inverseDiffusion(m, p))
		runtime.KeepAlive(sv)
	}
	fmt.Printf("| %s | %s | %d %v | %.4f | %.4f | %.4f | %.4f | %.4f | %.3f | %.0f | %.1e | %.1e | %.0f |\n", name, g, st.Iterations, st.Smoother, median(asm), median(setup), median(solve), median(total), median(wall),
		median(mv)*1e3, median(total)/median(mv), st.Residual, reduction, bytes)
}

// inverseDiffusion is the first guess of the programs compared with, 1/A_xx.
func inverseDiffusion(m *volume.Operator, p swirlProblem) []float64 {
	x := m.Layout.Vector()
	pt := make([][]float64, m.Grid.Dim())
	f := make([][]float64, m.Grid.Dim())
	a := make([][]float64, m.Grid.Dim()*(m.Grid.Dim()+1)/2)
	for i := range pt {
		pt[i], f[i] = make([]float64, 1), make([]float64, 1)
	}
	for i := range a {
		a[i] = make([]float64, 1)
	}
	for k := 0; k < m.Grid.Cells(); k++ {
		for d, v := range m.Grid.CenterOf(k) {
			pt[d][0] = v
		}
		if err := p.Eval(pt, f, a); err != nil {
			panic(err)
		}
		x[m.Layout.Row(k/m.Layout.Nx)+k%m.Layout.Nx] = 1 / a[0][0]
	}
	mass := m.Mass(x)
	for i := range x {
		x[i] /= mass
	}
	return x
}

// outflow returns |M p| over the cells.
func outflow(m *volume.Operator, x []float64) float64 {
	y := m.Layout.Vector()
	m.Apply(y, x, 0)
	s := &Solver{m: m, part: make([]float64, 3*m.Layout.Rows)}
	return s.norm(y)
}
