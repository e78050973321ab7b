//go:build unix

package ensemble

import (
	"context"
	"syscall"
	"testing"

	"epslim/solver/kernel"
)

// cpuSeconds is the processor time of this process, which a busy machine
// stretches less than the time on the wall.
func cpuSeconds(b *testing.B) float64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		b.Fatal(err)
	}
	return float64(u.Utime.Sec+u.Stime.Sec) + 1e-6*float64(u.Utime.Usec+u.Stime.Usec)
}

// BenchmarkRun measures whole runs of the two models of docs/performance-mc.md
// with Euler steps on one worker: 1000 steps of 1e-4.
func BenchmarkRun(b *testing.B) {
	for _, c := range []struct {
		name  string
		model *Model
	}{{"M1", crawler(0.1)}, {"M2", crawlerLimit()}} {
		for _, im := range kernel.Implementations() {
			paths := uint64(50 * kernel.BlockSize)
			if im.Name() == "portable" {
				paths /= 10
			}
			b.Run(c.name+"/"+im.Name(), func(b *testing.B) {
				s := Settings{To: paths, Time: 0.1, Step: 1e-4, Scheme: "euler", Seed: 1, Implementation: &im}
				start := cpuSeconds(b)
				for b.Loop() {
					if _, err := Run(context.Background(), c.model, s); err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric((cpuSeconds(b)-start)*1e9/float64(b.N)/float64(paths)/1000, "cpu-ns/path-step")
			})
		}
	}
}
