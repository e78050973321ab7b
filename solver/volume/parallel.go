package volume

import (
	"runtime"
	"sync"
)

// Parallel splits 0..n-1 into contiguous pieces, one a worker, and runs body on
// them at the same time. Bodies must write to disjoint places; what they
// compute must not depend on where the pieces end.
func Parallel(workers, n int, body func(worker, lo, hi int)) {
	if workers > n {
		workers = n
	}
	if workers <= 1 {
		body(0, 0, n)
		return
	}
	var wg sync.WaitGroup
	wg.Add(workers - 1)
	for w := 1; w < workers; w++ {
		go func() {
			defer wg.Done()
			body(w, n*w/workers, n*(w+1)/workers)
		}()
	}
	body(0, 0, n/workers)
	wg.Wait()
}

// workerCount returns the number of goroutines for a setting, where 0 means
// one a processor.
func workerCount(setting int) int {
	if setting <= 0 {
		return runtime.GOMAXPROCS(0)
	}
	return setting
}
