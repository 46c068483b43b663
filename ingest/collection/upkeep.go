package collection

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"catena/index"
	"catena/ingest"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// Checked is what Check looked at, and what it found wrong, in words.
type Checked struct {
	Occurrences, Revisions, Tags int
	Faults                       []string
	More                         int // faults beyond those told
}

// mostFaults is how many faults are told.
const mostFaults = 50

func (k *Checked) fault(format string, args ...any) {
	if len(k.Faults) == mostFaults {
		k.More++
		return
	}
	k.Faults = append(k.Faults, fmt.Sprintf(format, args...))
}

// Check looks at the whole collection: SQLite's own check of pages and of
// references between tables; every occurrence and every earlier content
// against the hash that it was stored under, with all tags inside their texts
// and chains made of tags; every set-aside row; and the index, which must hold
// each occurrence and nothing else. It changes nothing.
func (c *Collection) Check(ctx context.Context, progress func(n int)) (*Checked, error) {
	k := &Checked{}
	faults, err := c.Store.Integrity(ctx)
	if err != nil {
		return nil, err
	}
	k.Faults = append(k.Faults, faults...)
	last, err := c.Store.Change(ctx)
	if err != nil {
		return nil, err
	}
	keys := map[int64]bool{}
	for r, err := range c.Store.Each(ctx, store.Select{}) {
		if err != nil {
			if ctx.Err() != nil {
				return nil, ctx.Err()
			}
			k.fault("%v", err) // a row that cannot be read ends the reading
			break
		}
		keys[r.Key] = true
		k.Occurrences++
		k.Tags += len(r.Tags)
		c.checkOne(k, r, last)
		if progress != nil && k.Occurrences%1000 == 0 {
			progress(k.Occurrences)
		}
	}
	for r, err := range c.Store.EachRevision(ctx) {
		if err != nil {
			return nil, err
		}
		k.Revisions++
		var o corpus.Occurrence
		if err := json.Unmarshal(r.Record, &o); err != nil {
			k.fault("an earlier content of occurrence %d cannot be read: %v", r.Key, err)
		} else if hash := ingest.ContentHash(&o); !bytes.Equal(hash[:], r.Hash) {
			k.fault("an earlier content of %s %s is not as it was stored", o.Source, o.ID)
		}
	}
	if faults, err = c.Store.CheckSetAside(ctx); err != nil {
		return nil, err
	}
	for _, f := range faults {
		k.fault("%s", f)
	}
	return k, c.checkIndex(k, keys, last)
}

func (c *Collection) checkOne(k *Checked, r *store.Row, last int64) {
	name := r.Occurrence.Source + " " + r.ID
	if hash := ingest.ContentHash(&r.Occurrence); !bytes.Equal(hash[:], r.Hash) {
		k.fault("%s: the content is not as it was stored", name)
	}
	if r.Change < 1 || r.Change > last {
		k.fault("%s: change %d of %d", name, r.Change, last)
	}
	tree := c.Classifier.Book().Tree
	for _, t := range r.Tags {
		if _, ok := tree.Factor(t.Factor); !ok {
			k.fault("%s: a tag of %q, which the catalogue does not have", name, t.Factor)
		}
	}
	for _, l := range r.Chain.Links {
		if l.Tag < 0 || l.Tag >= len(r.Tags) || r.Tags[l.Tag].Factor != l.Factor || r.Tags[l.Tag].Assertion != corpus.Affirmed {
			k.fault("%s: the chain has a link %s without its tag", name, l.Factor)
		}
	}
}

// checkIndex compares the index with the keys of the database.
func (c *Collection) checkIndex(k *Checked, keys map[int64]bool, last int64) error {
	x := c.index
	if x == nil {
		var err error
		x, err = index.OpenReader(c.indexDir(), index.Options{})
		switch {
		case errors.Is(err, index.ErrBusy):
			return err
		case err != nil:
			k.fault("index: %v; it is built anew by the next search or load", err)
			return nil
		}
		defer x.Close()
	}
	if x.Change() != last {
		k.fault("index: it reflects change %d of %d; the next search or load brings it up to date", x.Change(), last)
		return nil
	}
	found, err := x.Keys()
	if err != nil {
		k.fault("index: %v", err)
		return nil
	}
	strangers := 0
	for _, key := range found {
		if !keys[key] {
			strangers++
		}
	}
	if missing := len(keys) - (len(found) - strangers); missing > 0 || strangers > 0 {
		k.fault("index: %d occurrences are missing in it, %d in it are none", missing, strangers)
	}
	return nil
}

// Remove takes an occurrence out of the database and of the index, with
// everything that belongs to it; only its reference is noted, so that it is
// not read in again. A collection opened for writing is needed.
func (c *Collection) Remove(ctx context.Context, key int64, r store.Removal) error {
	err := c.Store.Remove(ctx, key, r)
	if err != nil && !errors.Is(err, store.ErrLogBusy) {
		return err
	}
	// an index keeps deleted documents in its segments: build it anew
	want, changeErr := c.Store.Change(ctx)
	if changeErr != nil {
		return changeErr
	}
	if c.index != nil {
		if err := c.index.Close(); err != nil {
			return err
		}
		c.index = nil
	}
	return errors.Join(c.rebuild(ctx, want), err)
}

// Restore puts a backup in the place of the collection in dir, or makes one
// there. The backup is checked first, and nothing is changed unless it is
// sound. A database that is there already must be asked for with replace; it
// is kept beside as catena.db.before-restore.
func Restore(ctx context.Context, dir, backup string, replace bool, opts Options) error {
	fail := func(err error) error { return fmt.Errorf("restore %s: %w", backup, err) }
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return fail(err)
	}
	if opts.Now == nil || opts.Note == nil {
		return fail(errors.New("no clock or no one to tell"))
	}
	unlock, err := lock(ctx, dir, opts.Command, opts.Patience, opts.Now, opts.Note)
	if err != nil {
		return fail(err)
	}
	defer unlock()
	target, fresh := filepath.Join(dir, databaseName), filepath.Join(dir, databaseName+".restoring")
	_, err = os.Stat(target)
	exists := err == nil
	if exists && !replace {
		return fail(fmt.Errorf("%s: %w", target, os.ErrExist))
	}
	defer os.Remove(fresh)
	if err := copyFile(fresh, backup); err != nil {
		return fail(err)
	}
	if err := checkBackup(ctx, fresh); err != nil {
		return fail(err)
	}
	if exists {
		if err := setAsideDatabase(ctx, target, opts.Note); err != nil {
			return fail(err)
		}
	}
	// the index goes first: one of another content must not be taken for that
	// of the restored database
	if err := os.RemoveAll(filepath.Join(dir, indexName)); err != nil {
		return fail(err)
	}
	if err := os.Rename(fresh, target); err != nil {
		return fail(err)
	}
	return nil
}

// checkBackup opens a copy of a backup, brings its format up to date and lets
// SQLite look at it.
func checkBackup(ctx context.Context, path string) error {
	s, err := store.Open(ctx, path, false)
	if err != nil {
		return err
	}
	faults, err := s.Integrity(ctx)
	if err = errors.Join(err, s.Close()); err != nil {
		return err
	}
	for _, rest := range []string{"-wal", "-shm"} {
		if err := os.Remove(path + rest); err != nil && !errors.Is(err, os.ErrNotExist) {
			return err
		}
	}
	if len(faults) > 0 {
		return fmt.Errorf("the backup is damaged: %s", faults[0])
	}
	return nil
}

// setAsideDatabase keeps the present database under another name, whole: what
// stands in its log is moved into it first.
func setAsideDatabase(ctx context.Context, path string, note func(string)) error {
	kept := path + ".before-restore"
	note("the database that was here is kept as " + kept)
	for _, rest := range []string{"", "-wal"} {
		if err := os.Remove(kept + rest); err != nil && !errors.Is(err, os.ErrNotExist) {
			return err
		}
	}
	s, err := store.Open(ctx, path, false)
	if err != nil { // damaged: keep what there is, the log beside it
		if err := os.Rename(path+"-wal", kept+"-wal"); err != nil && !errors.Is(err, os.ErrNotExist) {
			return err
		}
		os.Remove(path + "-shm")
		return os.Rename(path, kept)
	}
	if err := s.Close(); err != nil { // the last one to close empties the log
		return err
	}
	if info, err := os.Stat(path + "-wal"); err == nil && info.Size() > 0 {
		return fmt.Errorf("others read the collection: close them and try again")
	}
	for _, rest := range []string{"-wal", "-shm"} {
		if err := os.Remove(path + rest); err != nil && !errors.Is(err, os.ErrNotExist) {
			return err
		}
	}
	if err := os.Link(path, kept); err != nil { // no links on this disk: copy
		return copyFile(kept, path)
	}
	return nil
}

// copyFile copies a file and makes it durable.
func copyFile(to, from string) (err error) {
	in, err := os.Open(from)
	if err != nil {
		return err
	}
	defer in.Close()
	out, err := os.OpenFile(to, os.O_WRONLY|os.O_CREATE|os.O_TRUNC, 0o644)
	if err != nil {
		return err
	}
	_, err = io.Copy(out, in)
	if err == nil {
		err = out.Sync()
	}
	return errors.Join(err, out.Close())
}
