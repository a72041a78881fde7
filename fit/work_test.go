package fit

import (
	"context"
	"errors"
	"sync/atomic"
	"testing"
)

func TestWorkEach(t *testing.T) {
	for workers := range 5 {
		var calls, made atomic.Int64
		last, monotone := 0, true
		w := Work{Workers: workers, Progress: func(done, total int) {
			monotone = monotone && done > last && total == 3*2000
			last = done
		}}
		err := w.Each(context.Background(), 2000, func(int) int { return 3 }, func() func(int) error {
			made.Add(1)
			return func(int) error { calls.Add(1); return nil }
		})
		if err != nil || calls.Load() != 2000 || made.Load() != int64(max(1, workers)) {
			t.Errorf("%d workers: %d calls from %d, %v", workers, calls.Load(), made.Load(), err)
		}
		if !monotone || last != 6000 {
			t.Errorf("%d workers: progress ends at %d of 6000, growing all the time: %t", workers, last, monotone)
		}
	}
}

func TestWorkEachStops(t *testing.T) {
	failure := errors.New("broken")
	var calls atomic.Int64
	err := Work{Workers: 2}.Each(context.Background(), 1e6, nil, func() func(int) error {
		return func(i int) error {
			calls.Add(1)
			if i == 10 {
				return failure
			}
			return nil
		}
	})
	if !errors.Is(err, failure) || calls.Load() > 1000 {
		t.Errorf("%v after %d calls, want a stop at the failure", err, calls.Load())
	}
	ctx, cancel := context.WithCancel(context.Background())
	err = Work{Workers: 2}.Each(ctx, 1e6, nil, func() func(int) error {
		return func(i int) error {
			if i == 10 {
				cancel()
			}
			return nil
		}
	})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want canceled", err)
	}
}
