package constraints

import (
	"sync"
	"sync/atomic"
)

// parallel runs f(0..n-1) on a number of workers; f must write only what
// belongs to its index, so that the result doesn't depend on the workers.
func parallel(workers, n int, f func(i int)) {
	workers = max(1, min(workers, n))
	if workers == 1 {
		for i := range n {
			f(i)
		}
		return
	}
	var next atomic.Int64
	var wg sync.WaitGroup
	for range workers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for {
				i := int(next.Add(1)) - 1
				if i >= n {
					return
				}
				f(i)
			}
		}()
	}
	wg.Wait()
}
