package ensemble

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
	"time"

	"epslim/solver/kernel"
)

// everything is a run that exercises all statistics.
func everything() (*Model, Settings) {
	m := crawler(0.2)
	m.Variables[1].Domain = Domain{Kind: Reflecting, Hi: 1}
	m.Variables[0].Domain = Domain{Kind: Absorbing, Lo: -2, Hi: 0.3}
	return m, Settings{
		To: 1700, Time: 0.3, Times: []float64{0.1, 0.25}, Step: 2e-3, Seed: 7,
		Histograms: []HistogramSpec{{Observables: []string{"x", "y"}, Lo: []float64{-2, 0}, Hi: []float64{0.3, 1}, Cells: []int{5, 4}}},
		LongTime:   &LongTime{Burn: 0.1, Batches: 4, Histograms: []HistogramSpec{{Observables: []string{"y"}, Lo: []float64{0}, Hi: []float64{1}, Cells: []int{8}}}},
	}
}

// part runs the settings and returns the bytes of the finished part.
func part(t *testing.T, m *Model, s Settings) []byte {
	t.Helper()
	s.Checkpoint = filepath.Join(t.TempDir(), "part")
	run(t, m, s)
	data, err := os.ReadFile(s.Checkpoint)
	if err != nil {
		t.Fatal(err)
	}
	return data
}

func parse(t *testing.T, data []byte) *Part {
	t.Helper()
	name := filepath.Join(t.TempDir(), "part")
	if err := os.WriteFile(name, data, 0o600); err != nil {
		t.Fatal(err)
	}
	p, err := LoadPart(name)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func TestSameBytesForAnyNumberOfWorkersAndKernels(t *testing.T) {
	m, s := everything()
	want := part(t, m, s)
	for _, w := range []int{2, 3} {
		s.Workers = w
		if !bytes.Equal(part(t, m, s), want) {
			t.Errorf("%d workers: other bytes", w)
		}
	}
	for _, im := range kernel.Implementations() {
		s.Implementation = &im
		if !bytes.Equal(part(t, m, s), want) {
			t.Errorf("%s kernels: other bytes", im.Name())
		}
	}
	s.Seed++
	if bytes.Equal(part(t, m, s), want) {
		t.Error("another seed gives the same bytes")
	}
	blow := Settings{To: 2000, Time: 1.5, Step: 0.01, Scheme: "euler", Seed: 9}
	want = part(t, exploding(), blow)
	blow.Workers = 3
	if !bytes.Equal(part(t, exploding(), blow), want) {
		t.Error("blown-up paths: other bytes with 3 workers")
	}
}

func TestSlicesMergeToTheSameBytes(t *testing.T) {
	for _, c := range []string{"everything", "blow-up"} {
		m, s := everything()
		if c == "blow-up" {
			m, s = exploding(), Settings{To: 1700, Time: 1.5, Step: 0.01, Scheme: "euler", Seed: 9}
		}
		want := part(t, m, s)
		var parts []*Part
		for _, cut := range []Interval{{1000, 1001}, {0, 700}, {1001, 1700}, {700, 1000}} {
			s.From, s.To = cut.From, cut.To
			parts = append(parts, parse(t, part(t, m, s)))
		}
		merged, err := MergeParts(parts...)
		if err != nil {
			t.Fatal(err)
		}
		got, err := json.Marshal(merged)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(append(got, '\n'), want) {
			t.Errorf("%s: merged slices differ from the whole run", c)
		}
		if _, err := MergeParts(parts[0], parts[0]); err == nil {
			t.Error("paths counted twice are not refused")
		}
		r, err := ResultOf(m, s, merged)
		if err != nil || r.Paths != 1700 {
			t.Errorf("result of the merged parts: %v, %v", r, err)
		}
		s.Seed++
		if _, err := ResultOf(m, s, merged); err == nil {
			t.Error("a part of another seed is not refused")
		}
	}
}

func TestInterruptedRunKeepsWhatIsFinishedAndResumes(t *testing.T) {
	m, s := everything()
	s.To = 6000
	want := part(t, m, s)
	s.Checkpoint = filepath.Join(t.TempDir(), "part")
	s.Resume = true
	for round := 0; ; round++ {
		ctx, cancel := context.WithTimeout(context.Background(), 20*time.Millisecond)
		r, err := Run(ctx, m, s)
		cancel()
		if err == nil {
			break
		}
		if !errors.Is(err, context.DeadlineExceeded) || r == nil {
			t.Fatalf("result %v, error %v", r, err)
		}
		if round > 500 {
			t.Fatal("no progress")
		}
	}
	got, err := os.ReadFile(s.Checkpoint)
	if err != nil || !bytes.Equal(got, want) {
		t.Errorf("the resumed run differs from the unbroken one (%v)", err)
	}
	// A longer range goes on from the shorter one, inside a block too.
	s.To = 6100
	run(t, m, s)
	got, _ = os.ReadFile(s.Checkpoint)
	s.Checkpoint, s.Resume = "", false
	if !bytes.Equal(got, part(t, m, s)) {
		t.Error("a prolonged run differs from an unbroken one")
	}
}

// The test binary runs itself as the process that is killed.
func TestKilledRunResumes(t *testing.T) {
	m, s := everything()
	s.To = 20000
	s.CheckpointEvery = time.Millisecond
	if name := os.Getenv("ENSEMBLE_TEST_CHECKPOINT"); name != "" {
		s.Checkpoint = name
		run(t, m, s)
		return
	}
	want := part(t, m, s)
	s.Checkpoint = filepath.Join(t.TempDir(), "part")
	cmd := exec.Command(os.Args[0], "-test.run=^TestKilledRunResumes$")
	cmd.Env = append(os.Environ(), "ENSEMBLE_TEST_CHECKPOINT="+s.Checkpoint)
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	for range 2000 {
		if _, err := os.Stat(s.Checkpoint); err == nil {
			break
		}
		time.Sleep(2 * time.Millisecond)
	}
	if err := cmd.Process.Kill(); err != nil && !errors.Is(err, os.ErrProcessDone) {
		t.Fatal(err)
	}
	_ = cmd.Wait()
	p, err := LoadPart(s.Checkpoint)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("killed after %d of %d paths", p.Tally.Paths(), s.To)
	s.Resume = true
	run(t, m, s)
	if got, err := os.ReadFile(s.Checkpoint); err != nil || !bytes.Equal(got, want) {
		t.Errorf("the run resumed after a kill differs from the unbroken one (%v)", err)
	}
}
