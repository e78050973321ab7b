package ensemble

import (
	"context"
	"sync"
	"sync/atomic"
)

// blockWorker simulates blocks and keeps what it finds to itself.
type blockWorker interface {
	// runBlock simulates lanes lo to hi of the block and adds them to the
	// worker's tally, or nothing when it returns an error.
	runBlock(ctx context.Context, number uint64, lo, hi int) error
}

// forBlocks runs the paths of the settings on s.Workers workers and then collects
// them. It returns the first error; what was finished is collected in any case.
func forBlocks(ctx context.Context, s Settings, fresh func() blockWorker, collect func(blockWorker)) error {
	var next atomic.Uint64
	next.Store(s.From / block)
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	var wg sync.WaitGroup
	workers := make([]blockWorker, s.workers())
	for i := range workers {
		workers[i] = fresh()
		wg.Go(func() {
			for ctx.Err() == nil {
				b := next.Add(1) - 1
				from, to := max(s.From, b*block), min(s.To, (b+1)*block)
				if from >= to {
					return
				}
				if err := workers[i].runBlock(ctx, b, int(from-b*block), int(to-b*block)); err != nil {
					cancel(err)
					return
				}
			}
		})
	}
	wg.Wait()
	for _, w := range workers {
		collect(w)
	}
	return context.Cause(ctx)
}
