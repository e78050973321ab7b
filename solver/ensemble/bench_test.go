package ensemble

import (
	"context"
	"testing"

	"epslim/solver/kernel"
)

// BenchmarkRun measures whole runs of the two models of docs/performance-mc.md
// with Euler steps on one worker.
func BenchmarkRun(b *testing.B) {
	for _, c := range []struct {
		name  string
		model *Model
	}{{"M1", crawler(0.1)}, {"M2", crawlerLimit()}} {
		for _, im := range kernel.Implementations() {
			b.Run(c.name+"/"+im.Name(), func(b *testing.B) {
				s := Settings{To: 2048, Time: 0.1, Step: 1e-4, Scheme: "euler", Seed: 1, Implementation: &im}
				for b.Loop() {
					if _, err := Run(context.Background(), c.model, s); err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/2048/1000, "ns/path-step")
			})
		}
	}
}
