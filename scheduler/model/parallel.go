package model

import "sync"

// Parallel runs f(0..n-1) on the given number of workers. Each index runs
// once; f writes only what belongs to its index, so that the result doesn't
// depend on the number of workers.
func Parallel(workers, n int, f func(i int)) {
	if workers <= 1 || n <= 1 {
		for i := range n {
			f(i)
		}
		return
	}
	var wg sync.WaitGroup
	var mu sync.Mutex
	next := 0
	for range min(workers, n) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for {
				mu.Lock()
				i := next
				next++
				mu.Unlock()
				if i >= n {
					return
				}
				f(i)
			}
		}()
	}
	wg.Wait()
}
