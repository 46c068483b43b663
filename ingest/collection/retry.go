package collection

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"slices"

	"catena/ingest"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// Retry reads the rows that were set aside once more, each with the header of
// its file: by the map, order of dates and source that are told now, else by
// those that the file was read with. What becomes an occurrence leaves the
// set-aside rows in the same step; the others stay, with the reason of this
// try. The summaries are by file.
func (c *Collection) Retry(ctx context.Context, opts LoadOptions) ([]FileSummary, error) {
	r := &retry{c: c, opts: opts, readings: map[string]*reading{}}
	if err := clearSpool(filepath.Join(c.Dir, spoolName)); err != nil {
		return nil, err
	}
	for more := true; more; {
		batch, err := r.take(ctx)
		if err != nil {
			return r.sums, err
		}
		if more = len(batch) > 0; !more {
			break
		}
		if err := r.write(ctx, batch); err != nil {
			return r.sums, err
		}
	}
	_, err := c.Index(ctx)
	return r.sums, err
}

// retry is the state of one Retry.
type retry struct {
	c        *Collection
	opts     LoadOptions
	after    int64 // key of the set-aside row looked at last
	readings map[string]*reading
	sums     []FileSummary
}

// reading is how the rows of one file are read.
type reading struct {
	header []byte
	opts   ingest.Options
	sum    int // index into sums
}

// take reads the next set-aside rows that are small enough to be read again.
func (r *retry) take(ctx context.Context) ([]*store.KeptAside, error) {
	var batch []*store.KeptAside
	size := 0
	for a, err := range r.c.Store.EachSetAside(ctx, r.after, ingest.DefaultMaxRow+1) {
		if err != nil {
			return nil, err
		}
		if a.Size > ingest.DefaultMaxRow {
			r.after = a.Key
			continue
		}
		batch = append(batch, a)
		r.after = a.Key
		if size += len(a.Raw); len(batch) == batchRows || size > batchBytes {
			break
		}
	}
	return batch, nil
}

func (r *retry) write(ctx context.Context, batch []*store.KeptAside) error {
	b, err := r.c.Store.Begin(ctx)
	if err != nil {
		return err
	}
	for _, a := range batch {
		if err := r.one(ctx, b, a); err != nil {
			b.Rollback()
			return err
		}
	}
	return b.Commit()
}

// one reads a row again and writes what it has become.
func (r *retry) one(ctx context.Context, b *store.Batch, a *store.KeptAside) error {
	how, err := r.reading(ctx, a.File)
	if err != nil {
		return err
	}
	sum := &r.sums[how.sum]
	sum.Rows++
	o, charset, reason := how.occurrence(ctx, a)
	if err := ctx.Err(); err != nil {
		return err
	}
	if o == nil {
		sum.SetAside++
		a.Reason = reason
		if r.opts.Aside != nil {
			r.opts.Aside(&a.SetAside)
		}
		return b.AsideReason(a.Key, reason)
	}
	put := store.Put{Tagged: r.c.Classifier.Tag(o), Hash: ingest.ContentHash(o), Raw: a.Raw}
	put.Source = a.SetAside.Source
	_, fate, err := b.Put(&put, sum.Map.Name)
	if err != nil {
		return err
	}
	sum.count(o)
	if charset != "UTF-8" {
		sum.Charset = charset
	}
	switch fate {
	case store.Stored:
		sum.Stored++
	case store.Revised:
		sum.Revised++
	default:
		sum.Unchanged++
	}
	return b.DropAside(a.Key)
}

// reading finds how a file is to be read.
func (r *retry) reading(ctx context.Context, path string) (*reading, error) {
	if how := r.readings[path]; how != nil {
		return how, nil
	}
	was, err := r.c.Store.Reading(ctx, path)
	if err != nil {
		return nil, err
	}
	how := &reading{header: was.Header, sum: len(r.sums)}
	how.opts = ingest.Options{Table: len(was.Header) > 0, Source: was.Source, Dates: was.Dates, SpoolDir: filepath.Join(r.c.Dir, spoolName), Map: r.opts.Map}
	if how.opts.Map == nil && was.Fields != "" {
		if how.opts.Map, err = ingest.ParseMap("the map that read "+path, []byte(was.Fields)); err != nil {
			return nil, err
		}
	}
	if how.opts.Map == nil {
		how.opts.Recall = r.c.Recall(ctx)
	}
	if r.opts.Map != nil && r.opts.Map.Dates != "" {
		how.opts.Dates = r.opts.Map.Dates
	}
	if r.opts.Dates != "" {
		how.opts.Dates = r.opts.Dates
	}
	if r.opts.Source != "" {
		how.opts.Source = r.opts.Source
	}
	r.readings[path] = how
	r.sums = append(r.sums, FileSummary{Path: path, Map: &ingest.Map{}, Charset: "UTF-8"})
	return how, nil
}

// occurrence reads one row under its file's header.
func (how *reading) occurrence(ctx context.Context, a *store.KeptAside) (o *corpus.Occurrence, charset, reason string) {
	text := a.Raw
	if len(how.header) > 0 {
		text = slices.Concat(how.header, []byte{'\n'}, a.Raw, []byte{'\n'})
	}
	f, err := ingest.Open(ctx, a.File, bytes.NewReader(text), how.opts)
	if err != nil {
		return nil, "", reasonOf(err, a.Reason)
	}
	defer f.Close()
	item, err := f.Next()
	switch {
	case err != nil:
		return nil, "", reasonOf(err, a.Reason)
	case item.SetAside != nil:
		return nil, "", item.SetAside.Reason
	}
	// a row that is now read as several must not lose any of them
	if _, err := f.Next(); !errors.Is(err, io.EOF) {
		return nil, "", a.Reason
	}
	return item.Occurrence, f.Charset(), ""
}

// reasonOf is why a row cannot even be opened by itself: most often as before.
func reasonOf(err error, before string) string {
	if errors.Is(err, ingest.ErrNoReports) {
		return before
	}
	return fmt.Sprint(err)
}
