package survey

import (
	"context"
	"fmt"
	"runtime"
	"sync"
)

// each calls do(k) for k = 0 … n−1 on some workers (0: one a core), and after each
// call done(k), never two of these at once. do writes into its own slot, so that
// the result does not depend on the number of workers. A cancelled context stops
// it between two calls.
func each(ctx context.Context, n, workers int, do, done func(k int)) error {
	if workers < 1 {
		workers = runtime.GOMAXPROCS(0)
	}
	next := make(chan int)
	var wg sync.WaitGroup
	var one sync.Mutex
	for range min(workers, n) {
		wg.Go(func() {
			for k := range next {
				do(k)
				one.Lock()
				done(k)
				one.Unlock()
			}
		})
	}
feed:
	for k := range n {
		if ctx.Err() != nil {
			break
		}
		select {
		case next <- k:
		case <-ctx.Done():
			break feed
		}
	}
	close(next)
	wg.Wait()
	if err := ctx.Err(); err != nil {
		return fmt.Errorf("stopped before the end: %w", err)
	}
	return nil
}

// together makes one error of those that are not nil, or none.
func together(errs []error) error {
	var failed []error
	for _, e := range errs {
		failed = append(failed, split(e)...)
	}
	if failed == nil {
		return nil
	}
	return &Failed{Of: len(errs), Errs: failed}
}

// split takes joined errors apart; nil gives none.
func split(err error) []error {
	if err == nil {
		return nil
	}
	if j, ok := err.(interface{ Unwrap() []error }); ok {
		return j.Unwrap()
	}
	return []error{err}
}
