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
// all of them with again. Where only rules have changed, it leaves those alone
// that the change does not touch: the result is that of tagging everything
// anew. It becomes visible in one step: a transaction that is broken off
// leaves the old tags. It returns how many were tagged.
func (c *Collection) Retag(ctx context.Context, again bool, progress func(n int)) (int, error) {
	sel := store.Select{Outdated: c.Classifier.Version()}
	changed, err := c.changes(ctx)
	if err != nil {
		return 0, fmt.Errorf("tag: %w", err)
	}
	if again {
		sel = store.Select{}
	}
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	type task struct {
		row    *store.Row
		tagged *corpus.Tagged // nil where the change does not touch it
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
				if factors, known := changed[t.row.Rulebook]; again || !known || c.Classifier.Touches(&t.row.Tagged, factors) {
					tagged := c.Classifier.Tag(&t.row.Occurrence)
					t.tagged = &tagged
				}
				close(t.done)
			}
		}()
	}
	n, seen := 0, 0
	b, err := c.Store.Begin(ctx)
	if err == nil {
		err = b.Rulebook(c.Classifier.Version(), c.Classifier.Parts())
	}
	if err == nil {
		for t := range order {
			<-t.done
			if t.tagged != nil {
				err = b.Retag(t.row.Key, t.tagged)
				n++
			} else {
				err = b.Untouched(t.row.Key, c.Classifier.Version())
			}
			if err != nil {
				break
			}
			if seen++; progress != nil && seen%500 == 0 {
				progress(seen)
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

// changes tells, for each earlier version of the rule book that is known, the
// factors whose rules have changed since; a version is left out where more
// than rules has changed.
func (c *Collection) changes(ctx context.Context) (map[string]map[string]bool, error) {
	versions, err := c.Store.Rulebooks(ctx)
	if err != nil {
		return nil, err
	}
	out := map[string]map[string]bool{}
	for version, parts := range versions {
		if factors, ok := c.Classifier.Changed(parts); ok {
			out[version] = factors
		}
	}
	return out, nil
}
