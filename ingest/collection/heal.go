package collection

import (
	"context"
	"errors"
	"fmt"
	"os"

	"catena/index"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// An index batch is small enough to hold in memory twice and large enough
// that its fixed cost does not show (measured: between 1,000 and 5,000
// narratives of 1.7 kB the rate is the same, the memory is not).
const (
	indexBatchDocs  = 1000
	indexBatchBytes = 8 << 20
)

// Index returns the index, in step with the database: a missing, damaged or
// foreign one is built anew, one that is behind is brought up to date. While
// another process writes, the index may lag behind and a note says so.
func (c *Collection) Index(ctx context.Context) (*index.Index, error) {
	if c.index != nil && c.opts.Write {
		// a load that was broken off leaves the index behind; another must
		// not go on from there, or the changes between would stay unknown
		return c.index, c.catchUp(ctx)
	}
	if c.index != nil {
		return c.index, nil
	}
	if c.opts.Write {
		err := c.heal(ctx)
		return c.index, err
	}
	want, err := c.Store.Change(ctx)
	if err != nil {
		return nil, err
	}
	c.index, err = index.OpenReader(c.indexDir(), index.Options{})
	switch {
	case err == nil && c.index.Change() == want:
		return c.index, nil
	case err != nil && !mendable(err):
		return nil, err
	}
	behind := c.index
	writer, lockErr := Open(ctx, c.Dir, Options{Write: true, Command: "mending the index", Now: c.opts.Now, Note: c.opts.Note})
	if errors.Is(lockErr, ErrHeld) && behind != nil {
		c.opts.Note("a load is running: its latest rows may not be found yet")
		return c.index, nil
	}
	if behind != nil {
		behind.Close()
		c.index = nil
	}
	if lockErr != nil {
		return nil, lockErr
	}
	_, err = writer.Index(ctx)
	if err = errors.Join(err, writer.Close()); err != nil {
		return nil, err
	}
	c.index, err = index.OpenReader(c.indexDir(), index.Options{})
	return c.index, err
}

// catchUp feeds the open index with what the database has beyond it.
func (c *Collection) catchUp(ctx context.Context) error {
	want, err := c.Store.Change(ctx)
	if err != nil || c.index.Change() == want {
		return err
	}
	return c.replay(ctx, c.index, want)
}

// mendable tells whether building the index anew can help.
func mendable(err error) bool {
	return errors.Is(err, index.ErrMissing) || errors.Is(err, index.ErrDamaged) || errors.Is(err, index.ErrFormat)
}

// heal opens the index for writing and brings it in step with the database.
func (c *Collection) heal(ctx context.Context) error {
	want, err := c.Store.Change(ctx)
	if err != nil {
		return err
	}
	x, err := index.Open(c.indexDir(), index.Options{})
	switch {
	case err == nil && x.Change() > want:
		// the database went back (a restored backup, say)
		err = index.ErrDamaged
		x.Close()
	case err == nil:
		c.index = x
		return c.catchUp(ctx)
	}
	if !mendable(err) {
		return err
	}
	c.opts.Note(fmt.Sprintf("building the index anew (%v)", err))
	return c.rebuild(ctx, want)
}

// rebuild makes a new index beside the old one and puts it in its place when
// it is whole.
func (c *Collection) rebuild(ctx context.Context, want int64) error {
	fresh := c.indexDir() + ".new"
	if err := os.RemoveAll(fresh); err != nil {
		return fmt.Errorf("build the index: %w", err)
	}
	x, err := index.Open(fresh, index.Options{})
	if err != nil {
		return fmt.Errorf("build the index: %w", err)
	}
	err = c.replay(ctx, x, want)
	if err = errors.Join(err, x.Close()); err != nil {
		return err
	}
	if err := os.RemoveAll(c.indexDir()); err != nil {
		return fmt.Errorf("build the index: %w", err)
	}
	if err := os.Rename(fresh, c.indexDir()); err != nil {
		return fmt.Errorf("build the index: %w", err)
	}
	c.index, err = index.Open(c.indexDir(), index.Options{})
	return err
}

// replay feeds the index with every change that it does not reflect.
func (c *Collection) replay(ctx context.Context, x *index.Index, want int64) error {
	// what was removed goes first: the mark of the changes stays where it is
	gone, err := c.Store.RemovedKeys(ctx, x.Change())
	if err != nil {
		return err
	}
	if len(gone) > 0 {
		if err := x.Delete(gone, x.Change()); err != nil {
			return err
		}
	}
	f := newFeeder(x)
	for r, err := range c.Store.Each(ctx, store.Select{ByChange: true, After: x.Change()}) {
		if err != nil {
			return err
		}
		if err := f.add(ctx, r.Key, &r.Occurrence, r.Change); err != nil {
			return err
		}
	}
	return f.flush(ctx, want)
}

// feeder gathers documents into index batches.
type feeder struct {
	index  *index.Index
	docs   []index.Doc
	bytes  int
	change int64 // the highest change gathered
}

func newFeeder(x *index.Index) *feeder { return &feeder{index: x} }

// add takes an occurrence; changes come in rising order.
func (f *feeder) add(ctx context.Context, key int64, o *corpus.Occurrence, change int64) error {
	f.docs = append(f.docs, index.Doc{Key: key, Occurrence: o})
	f.change = change
	for _, n := range o.Narratives {
		f.bytes += len(n.Text)
	}
	if len(f.docs) < indexBatchDocs && f.bytes < indexBatchBytes {
		return nil
	}
	return f.flush(ctx, change)
}

// flush writes what is gathered; the index then reflects the given change.
func (f *feeder) flush(ctx context.Context, change int64) error {
	if len(f.docs) == 0 && f.index.Change() >= change {
		return nil
	}
	if err := f.index.Put(ctx, f.docs, change); err != nil {
		return fmt.Errorf("write to the index: %w", err)
	}
	f.docs, f.bytes = f.docs[:0:0], 0
	return nil
}
