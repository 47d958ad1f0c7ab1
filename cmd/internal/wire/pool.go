package wire

import (
	"context"
	"sync"
)

// each calls work(i) for i in [0, n) on the given number of goroutines and
// returns the error of the smallest i that failed. Results must be stored by
// index, so that the order of finishing changes nothing.
func each(ctx context.Context, workers, n int, work func(ctx context.Context, i int) error) error {
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	errs := make([]error, n)
	next := make(chan int)
	var wg sync.WaitGroup
	for w := 0; w < min(workers, n); w++ {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for i := range next {
				if errs[i] = work(ctx, i); errs[i] != nil {
					cancel()
				}
			}
		}()
	}
feed:
	for i := 0; i < n; i++ {
		select {
		case next <- i:
		case <-ctx.Done():
			break feed
		}
	}
	close(next)
	wg.Wait()
	// A cancelled neighbour is a consequence; the cause comes first.
	var cancelled error
	for _, err := range errs {
		if err == nil {
			continue
		}
		if err == context.Canceled {
			cancelled = err
			continue
		}
		return err
	}
	if cancelled == nil {
		cancelled = ctx.Err()
	}
	return cancelled
}

// meter adds up progress from several goroutines.
type meter struct {
	mu    sync.Mutex
	p     Progress
	tell  func(Progress)
	scale float64
}

func (m *meter) stage(s string) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.p.Stage = s
}

func (m *meter) expect(units float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.p.Total += units
}

func (m *meter) did(units float64) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.p.Done += units
	if m.p.Total < m.p.Done {
		m.p.Total = m.p.Done
	}
	if m.tell != nil {
		m.tell(m.p)
	}
}
