package collection

import (
	"context"
	"fmt"
	"runtime"
	"sync"

	"catena/classify/catalogue"
	"catena/ingest/corpus"
	"catena/ingest/doubles"
	"catena/ingest/store"
)

// FindDoubles looks for pairs of occurrences that may tell one event and keeps
// them in place of those found before; people's decisions stay. It returns
// how the search went. Without changes since the last search it does nothing,
// unless again is set.
func (c *Collection) FindDoubles(ctx context.Context, again bool) (found *doubles.Found, err error) {
	change, err := c.Store.Change(ctx)
	if err != nil {
		return nil, err
	}
	seen, err := c.Store.DoublesSeen(ctx)
	if err != nil || seen == change && !again {
		return nil, err
	}
	records, change, err := c.tellings(ctx)
	if err != nil {
		return nil, fmt.Errorf("look for doubles: %w", err)
	}
	f := doubles.Find(records, doubles.Options{})
	if err := c.Store.PutDoubles(ctx, f.Pairs, change); err != nil {
		return nil, fmt.Errorf("look for doubles: %w", err)
	}
	return &f, nil
}

// tellings gathers what bears on doubles, 300 bytes or so of each occurrence.
func (c *Collection) tellings(ctx context.Context) (records []doubles.Record, change int64, err error) {
	type job struct {
		at      int
		telling *store.Telling
	}
	work := make(chan job, queued)
	var mu sync.Mutex
	var wg sync.WaitGroup
	for range max(1, runtime.GOMAXPROCS(0)) {
		wg.Go(func() {
			for j := range work {
				r := doubles.Told(j.telling.Key, &j.telling.Occurrence, j.telling.Tags, failedSide(j.telling.Tags))
				mu.Lock()
				records[j.at] = r
				mu.Unlock()
			}
		})
	}
	n := 0
	for t, fault := range c.Store.EachTelling(ctx, &change) {
		if err = fault; err != nil {
			break
		}
		mu.Lock()
		records = append(records, doubles.Record{})
		mu.Unlock()
		work <- job{n, t}
		n++
	}
	close(work)
	wg.Wait()
	return records, change, err
}

// failedSide is the side of the first trigger that has one: that of the engine
// that failed.
func failedSide(tags []corpus.Tag) string {
	for _, t := range tags {
		if f, ok := catalogue.Builtin().Factor(t.Factor); ok && t.Side != "" && f.Kind == catalogue.Trigger {
			return t.Side
		}
	}
	return ""
}
