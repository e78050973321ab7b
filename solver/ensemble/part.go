package ensemble

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
)

const partFormat = "epslim-ensemble/1"

// Part is the finished part of a run: a checkpoint, or the slice of a campaign
// that is spread over several machines.
type Part struct {
	Format string
	Key    string // of the model and the settings that shape the result
	Tally  *Tally
}

// Save writes the part to a temporary file beside the target, forces it to disk
// and renames it, so that a reader finds the old part or the new one, whole.
func (p *Part) Save(name string) (err error) {
	data, err := json.Marshal(p)
	if err != nil {
		return fmt.Errorf("ensemble: %w", err)
	}
	f, err := os.CreateTemp(filepath.Dir(name), filepath.Base(name)+".tmp*")
	if err != nil {
		return fmt.Errorf("ensemble: cannot write the checkpoint: %w", err)
	}
	defer func() {
		if err != nil {
			os.Remove(f.Name())
			err = fmt.Errorf("ensemble: cannot write the checkpoint: %w", err)
		}
	}()
	_, err = f.Write(append(data, '\n'))
	err = errors.Join(err, f.Sync(), f.Close())
	if err != nil {
		return err
	}
	return os.Rename(f.Name(), name)
}

// LoadPart reads a part. The error wraps os.ErrNotExist when there is none.
func LoadPart(name string) (*Part, error) {
	data, err := os.ReadFile(name)
	if err != nil {
		return nil, fmt.Errorf("ensemble: %w", err)
	}
	var p Part
	if err := json.Unmarshal(data, &p); err != nil {
		return nil, fmt.Errorf("ensemble: %s is not a part of a run: %w", name, err)
	}
	if p.Format != partFormat || p.Tally == nil {
		return nil, fmt.Errorf("ensemble: %s is not a part of a run of format %s", name, partFormat)
	}
	return &p, nil
}

// MergeParts unites parts of one campaign over disjoint ranges of paths. The
// result does not depend on their order.
func MergeParts(parts ...*Part) (*Part, error) {
	if len(parts) == 0 {
		return nil, errors.New("ensemble: no parts to merge")
	}
	data, err := json.Marshal(parts[0])
	if err != nil {
		return nil, fmt.Errorf("ensemble: %w", err)
	}
	var sum Part
	if err := json.Unmarshal(data, &sum); err != nil {
		return nil, fmt.Errorf("ensemble: %w", err)
	}
	for i, p := range parts[1:] {
		if p.Key != sum.Key {
			return nil, fmt.Errorf("ensemble: part %d belongs to another model or other settings than part 1", i+2)
		}
		if err := sum.Tally.Merge(p.Tally); err != nil {
			return nil, fmt.Errorf("%w (part %d)", err, i+2)
		}
	}
	return &sum, nil
}

// ResultOf evaluates a part, which must belong to the model and the settings; the
// range of paths and the number of workers do not matter.
func ResultOf(m *Model, s Settings, part *Part) (*Result, error) {
	if s.To <= s.From {
		s.From, s.To = 0, 1
	}
	p, err := newPlan(m, &s, 1)
	if err != nil {
		return nil, err
	}
	if part.Key != p.fingerprint() {
		return nil, errors.New("ensemble: the part belongs to another model or other settings")
	}
	return p.result(part.Tally)
}

// fingerprint identifies what the paths and their statistics are: the compiled
// programs, the domains, the start, the seed, the times and the histograms, but
// not the range of paths.
func (p *plan) fingerprint() string {
	h := sha256.New()
	fmt.Fprintf(h, "%s\n%d\n%s\n", partFormat, p.s.Seed, p.observe)
	for _, g := range p.segments {
		fmt.Fprintf(h, "%x %x %d %v\n", g.from, g.to, g.steps, g.observed)
	}
	done := map[*stepper]bool{}
	for _, g := range p.segments {
		if !done[g.stepper] {
			fmt.Fprintf(h, "%s%v\n", g.stepper.program, g.stepper.rows)
			done[g.stepper] = true
		}
	}
	for _, v := range p.m.Variables {
		fmt.Fprintf(h, "%q %v %x %x %x\n", v.Name, v.Domain.Kind, v.Domain.Lo, v.Domain.Hi, v.Start)
	}
	fmt.Fprintf(h, "%q %v\n", p.m.ObservableNames(), p.s.Histograms)
	if l := p.s.LongTime; l != nil {
		fmt.Fprintf(h, "%x %d %d %v\n", l.Burn, l.every(), l.batches(), l.Histograms)
	}
	return hex.EncodeToString(h.Sum(nil))
}
