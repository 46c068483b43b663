package collection

import (
	"context"
	"fmt"
	"runtime"
	"sync"

	"catena/ingest/corpus"
	"catena/ingest/store"
)

// Retag tags the occurrences whose tags another rule book or engine made, or
// all of them with again. It becomes visible in one step: a transaction that
// is broken off leaves the old tags. It returns how many were tagged.
func (c *Collection) Retag(ctx context.Context, again bool, progress func(n int)) (int, error) {
	sel := store.Select{Outdated: c.Classifier.Version()}
	if again {
		sel = store.Select{}
	}
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	type task struct {
		row    *store.Row
		tagged corpus.Tagged
		done   chan struct{}
	}
	work, order := make(chan *task, queued), make(chan *task, queued)
	var wg sync.WaitGroup
	wg.Add(1)
	go func() {
		defer wg.Done()
		defer close(work)
		defer close(order)
		for r, err := range c.Store.Each(ctx, sel) {
			if err != nil {
				cancel(err)
				return
			}
			t := &task{row: r, done: make(chan struct{})}
			select {
			case order <- t:
				work <- t
			case <-ctx.Done():
				return
			}
		}
	}()
	for range max(1, runtime.GOMAXPROCS(0)) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for t := range work {
				t.tagged = c.Classifier.Tag(&t.row.Occurrence)
				close(t.done)
			}
		}()
	}
	n := 0
	b, err := c.Store.Begin(ctx)
	if err == nil {
		for t := range order {
			<-t.done
			if err = b.Retag(t.row.Key, &t.tagged); err != nil {
				break
			}
			n++
			if progress != nil && n%500 == 0 {
				progress(n)
			}
		}
	}
	if err != nil {
		cancel(err)
		for range order { // let the reader end
		}
	}
	wg.Wait()
	if err == nil {
		err = context.Cause(ctx)
	}
	if err != nil {
		if b != nil {
			b.Rollback()
		}
		return 0, fmt.Errorf("tag: %w", err)
	}
	return n, b.Commit()
}
