package collection

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"catena/classify"
	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/index"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// Options say how to open a collection.
type Options struct {
	Write    bool             // take the writer's lock; makes the folder where it is missing
	Command  string           // what is being done, told to those who wait
	Patience time.Duration    // how long to wait for another writer
	Rules    string           // folder of the user's rules; "" for the remembered one, "-" for none
	Now      func() time.Time // the clock; nil for time.Now
	Note     func(string)     // told what the user should know (waiting, healing); nil for nobody
}

// Collection is an open collection.
type Collection struct {
	Dir        string
	Store      *store.Store
	Classifier *classify.Classifier
	opts       Options
	unlock     func()
	index      *index.Index // nil until it is first needed
}

// databaseName and indexName are the parts of a collection's folder. Beside
// them stand writer.lock, writer.json while someone writes, and spool for
// rows too large for memory.
const (
	databaseName = "catena.db"
	indexName    = "index"
	spoolName    = "spool"
)

// Open opens the collection in dir. Without Write a missing one is
// store.ErrMissing; with Write and another writer at work the error is
// ErrHeld once the patience is over.
func Open(ctx context.Context, dir string, opts Options) (_ *Collection, err error) {
	if opts.Now == nil {
		opts.Now = time.Now
	}
	if opts.Note == nil {
		opts.Note = func(string) {}
	}
	c := &Collection{Dir: dir, opts: opts, unlock: func() {}}
	defer func() {
		if err != nil {
			c.Close()
			err = fmt.Errorf("open collection %q: %w", dir, err)
		}
	}()
	if opts.Write {
		if err := os.MkdirAll(filepath.Join(dir, spoolName), 0o755); err != nil {
			return nil, err
		}
		unlock, err := lock(ctx, dir, opts.Command, opts.Patience, opts.Now, opts.Note)
		if err != nil {
			return nil, err
		}
		c.unlock = unlock
	}
	if c.Store, err = store.Open(ctx, filepath.Join(dir, databaseName), !opts.Write); err != nil {
		return nil, err
	}
	book, err := c.book(ctx)
	if err != nil {
		return nil, err
	}
	c.Classifier = classify.New(book)
	return c, nil
}

// book loads the built-in rule book and the user's folder over it. A folder
// named when writing is remembered for later runs.
func (c *Collection) book(ctx context.Context) (*rulebook.Book, error) {
	folder := c.opts.Rules
	if folder == "" {
		var err error
		if folder, err = c.Store.State(ctx, "rules"); err != nil {
			return nil, err
		}
	} else if c.opts.Write {
		if folder != "-" {
			abs, err := filepath.Abs(folder)
			if err != nil {
				return nil, err
			}
			folder = abs
		}
		if err := c.Store.SetState(ctx, "rules", folder); err != nil {
			return nil, err
		}
	}
	return LoadBook(folder)
}

// LoadBook loads the built-in rule book with the rule files of a folder over
// it; "" and "-" stand for no folder.
func LoadBook(folder string) (*rulebook.Book, error) {
	if folder == "" || folder == "-" {
		return rulebook.Builtin()
	}
	if info, err := os.Stat(folder); err != nil {
		return nil, fmt.Errorf("rule folder: %w", err)
	} else if !info.IsDir() {
		return nil, fmt.Errorf("rule folder %q is a file", folder)
	}
	book, err := rulebook.Load(catalogue.Builtin(), os.DirFS(folder))
	if err != nil {
		return nil, fmt.Errorf("rule folder %q: %w", folder, err)
	}
	return book, nil
}

// Close gives everything back. Closing twice does no harm.
func (c *Collection) Close() error {
	var errs []error
	if c.index != nil {
		errs = append(errs, c.index.Close())
	}
	if c.Store != nil {
		errs = append(errs, c.Store.Close())
	}
	c.unlock()
	c.index, c.Store, c.unlock = nil, nil, func() {}
	return errors.Join(errs...)
}

func (c *Collection) indexDir() string { return filepath.Join(c.Dir, indexName) }

// Narratives fetches the texts of an occurrence, for the snippets of hits.
func (c *Collection) Narratives(ctx context.Context) func(key int64) ([]corpus.Narrative, error) {
	return func(key int64) ([]corpus.Narrative, error) {
		r, err := c.Store.One(ctx, key)
		if err != nil {
			return nil, err
		}
		return r.Narratives, nil
	}
}
