package fit

import (
	"context"
	"sync"
)

// Work says how a long computation is shared out, and who watches it. The zero
// value is one goroutine that nobody watches.
type Work struct {
	Workers int // goroutines; less than one counts as one

	// Progress, if not nil, hears how much is done, now and then, from one
	// goroutine at a time. What is counted stands with the function that takes
	// the Work.
	Progress func(done, total int)
}

// Each calls the function that newWorker returns, one per goroutine, once for
// every i in [0, n), in order of i but at the same time, until one call fails or
// ctx ends; it returns the first error. size is the share of i in Progress, nil
// where every i is one.
func (w Work) Each(ctx context.Context, n int, size func(i int) int, newWorker func() func(i int) error) error {
	if size == nil {
		size = func(int) int { return 1 }
	}
	var (
		wg          sync.WaitGroup
		mu          sync.Mutex
		next, done  int
		total, told int
		first       error
	)
	for i := range n {
		total += size(i)
	}
	// take notes that item i (-1 none) ended in err, and returns the next, or -1.
	take := func(i int, err error) int {
		mu.Lock()
		defer mu.Unlock()
		if i >= 0 {
			done += size(i)
		}
		if w.Progress != nil && done > told && ((done-told)*progressSteps >= total || done == total) {
			told = done
			w.Progress(done, total)
		}
		if first == nil {
			first = err
		}
		if first == nil {
			first = ctx.Err()
		}
		if first != nil || next == n {
			return -1
		}
		next++
		return next - 1
	}
	for range max(1, w.Workers) {
		wg.Go(func() {
			work := newWorker()
			for i := take(-1, nil); i >= 0; {
				i = take(i, work(i))
			}
		})
	}
	wg.Wait()
	return first
}

// progressSteps is how often Progress hears of a computation, about.
const progressSteps = 500
