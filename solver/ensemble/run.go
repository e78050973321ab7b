package ensemble

import (
	"context"
	"errors"
	"fmt"
	"os"
	"sync"
	"sync/atomic"
	"time"
)

// Run simulates the paths and returns their statistics. When ctx ends early the
// result of the finished paths is returned together with an error that wraps the
// error of ctx; the result is nil only when nothing could be started.
func Run(ctx context.Context, m *Model, s Settings) (*Result, error) {
	p, err := newPlan(m, &s, 1)
	if err != nil {
		return nil, err
	}
	total, err := p.resumed()
	if err != nil {
		return nil, err
	}
	return p.run(ctx, total)
}

// resumed returns the tally to go on from: that of the checkpoint where there is
// one to resume, an empty one otherwise.
func (p *plan) resumed() (*Tally, error) {
	if !p.s.Resume || p.s.Checkpoint == "" {
		return newTally(p.m, p.s), nil
	}
	saved, err := LoadPart(p.s.Checkpoint)
	switch {
	case errors.Is(err, os.ErrNotExist):
		return newTally(p.m, p.s), nil
	case err != nil:
		return nil, err
	case saved.Key != p.fingerprint():
		return nil, fmt.Errorf("ensemble: the checkpoint %s belongs to another model or other settings", p.s.Checkpoint)
	}
	return saved.Tally, nil
}

// run adds the paths of the settings that are not in total to it.
func (p *plan) run(ctx context.Context, total *Tally) (*Result, error) {
	c := &campaign{p: p, key: p.fingerprint(), total: total, started: time.Now(), lastSave: time.Now()}
	c.next.Store(p.s.From / block)
	runErr := c.work(ctx)
	if p.s.Checkpoint != "" {
		if err := c.save(); err != nil {
			return nil, err
		}
	}
	r, err := c.result()
	if err != nil {
		return nil, err
	}
	return r, runErr
}

// campaign is one call of Run at work.
type campaign struct {
	p        *plan
	key      string
	mu       sync.Mutex // guards total, lastSave and err
	total    *Tally
	lastSave time.Time
	err      error
	next     atomic.Uint64 // number of the next block
	paths    atomic.Uint64 // done by this call
	steps    atomic.Uint64
	started  time.Time
}

const flushEvery = 200 * time.Millisecond

func (c *campaign) work(ctx context.Context) error {
	before := c.total.Paths()
	runCtx, cancel := context.WithCancel(ctx)
	defer cancel()
	var wg sync.WaitGroup
	for range c.p.s.workers() {
		wg.Go(func() {
			if err := c.worker(runCtx); err != nil {
				c.mu.Lock()
				if c.err == nil && !errors.Is(err, context.Canceled) && !errors.Is(err, context.DeadlineExceeded) {
					c.err = err
				}
				c.mu.Unlock()
				cancel()
			}
		})
	}
	finished := make(chan struct{})
	go func() { wg.Wait(); close(finished) }()
	tick := time.NewTicker(500 * time.Millisecond)
	defer tick.Stop()
	for {
		select {
		case <-finished:
			c.report(before)
			if c.err != nil {
				return c.err
			}
			if err := ctx.Err(); err != nil && c.total.Paths() < c.p.s.To-c.p.s.From {
				return fmt.Errorf("ensemble: stopped after %d of %d paths: %w", c.total.Paths(), c.p.s.To-c.p.s.From, err)
			}
			return nil
		case <-tick.C:
			c.report(before)
		}
	}
}

func (c *campaign) report(before uint64) {
	if c.p.s.Progress == nil {
		return
	}
	p := Progress{Done: before + c.paths.Load(), Total: c.p.s.To - c.p.s.From, Steps: c.steps.Load(), Elapsed: time.Since(c.started)}
	if sec := p.Elapsed.Seconds(); sec > 0 {
		p.StepsPerSec = float64(p.Steps) / sec
	}
	if p.StepsPerSec > 0 {
		left := float64(p.Total-p.Done) * float64(c.p.steps) / p.StepsPerSec
		p.Remaining = time.Duration(left * float64(time.Second))
	}
	c.p.s.Progress(p)
}

// worker simulates blocks until there are none left.
func (c *campaign) worker(ctx context.Context) error {
	s := c.p.s
	r := newRunner(c.p)
	local := newTally(c.p.m, s)
	flushed := time.Now()
	for {
		b := c.next.Add(1) - 1
		from, to := max(s.From, b*block), min(s.To, (b+1)*block)
		if from >= to || ctx.Err() != nil {
			break
		}
		for _, gap := range c.missing(from, to) {
			if err := r.run(ctx, b, int(gap.From-b*block), int(gap.To-b*block)); err != nil {
				return errors.Join(err, c.flush(local))
			}
			if err := r.commit(local); err != nil {
				return err
			}
			c.paths.Add(gap.To - gap.From)
			c.steps.Add((gap.To - gap.From) * c.p.steps)
		}
		if time.Since(flushed) > flushEvery {
			if err := c.flush(local); err != nil {
				return err
			}
			local = newTally(c.p.m, s)
			flushed = time.Now()
		}
	}
	return c.flush(local)
}

// missing returns the paths of [from, to) that the total does not have.
func (c *campaign) missing(from, to uint64) []Interval {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.total.missing(from, to)
}

// flush moves a worker's tally to the total and writes a checkpoint when one is due.
func (c *campaign) flush(local *Tally) error {
	c.mu.Lock()
	defer c.mu.Unlock()
	if err := c.total.Merge(local); err != nil {
		return err
	}
	every := c.p.s.CheckpointEvery
	if every == 0 {
		every = 10 * time.Second
	}
	if c.p.s.Checkpoint == "" || time.Since(c.lastSave) < every {
		return nil
	}
	c.lastSave = time.Now()
	return c.save()
}

func (c *campaign) save() error {
	return (&Part{Format: partFormat, Key: c.key, Tally: c.total}).Save(c.p.s.Checkpoint)
}

func (c *campaign) result() (*Result, error) {
	r, err := c.p.result(c.total)
	if err != nil {
		return nil, err
	}
	if sec := time.Since(c.started).Seconds(); sec > 0 {
		r.PathStepsPerSecond = float64(c.steps.Load()) / sec
	}
	return r, nil
}
