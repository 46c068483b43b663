package collection

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"sync"

	"catena/index"
	"catena/ingest"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// LoadOptions say how to read files.
type LoadOptions struct {
	Source    string          // names the source of all occurrences
	Dates     string          // order of dates of three numbers: dmy, mdy or ymd
	Delimiter string          // what stands between the cells of a table, one of ingest.Delimiters; "" to see from the header
	In        io.Reader       // the stream to read; nil for the file at the path
	Size      int64           // of the stream in bytes, 0 where not known
	Map       *ingest.MapFile // a person's map, remembered for files of the same columns
	Forget    bool            // the remembered map
	Name      string          // what to call the path where rows are traced back; "" for the path
	// Progress is told, after each batch, how far the file has been read, in
	// bytes on disk; size is 0 where it is not known.
	Progress func(path string, rows int, read, size int64)
	// Aside is told of each row that was set aside.
	Aside func(*corpus.SetAside)
}

// FileSummary is what became of the rows of one file: Rows is the sum of the
// four counts after it.
type FileSummary struct {
	Path       string `json:"path"`
	Rows       int    `json:"rows"`
	Stored     int    `json:"stored"`
	Unchanged  int    `json:"unchanged"`
	Revised    int    `json:"revised"`
	SetAside   int    `json:"set_aside"`
	Narratives int    `json:"narratives"` // usable narratives among the occurrences read
	Dated      int    `json:"dated"`      // occurrences read with a date

	Barred  int           `json:"-"` // of the unchanged: rows whose reference a person removed
	Charset string        `json:"-"` // what the file's text was decoded from
	Changed bool          `json:"-"` // the file changed while it was read
	Unread  []string      `json:"-"` // sheets of a workbook that are not read
	Unknown []ingest.Word `json:"-"` // words kept for want of a word of the record
	Map     *ingest.Map   `json:"-"`
	// Sources names the sources that the rows belong to, in order of first
	// appearance, at most the first few.
	Sources []string `json:"-"`
}

// Limits of the queues. A queue holds at most queued occurrences, some two
// megabytes of usual narratives; a batch is one transaction.
const (
	queued     = 256
	batchRows  = 1000
	batchBytes = 8 << 20
)

// Load reads one file into the collection: stored, tagged and indexed. A row
// that cannot become an occurrence is set aside and counted. When the context
// ends, what is written stays, whole; loading the file again goes on from there.
func (c *Collection) Load(ctx context.Context, path string, opts LoadOptions) (sum FileSummary, err error) {
	sum.Path = path
	x, err := c.Index(ctx)
	if err != nil {
		return sum, err
	}
	spool := filepath.Join(c.Dir, spoolName)
	if err := clearSpool(spool); err != nil {
		return sum, err
	}
	with := ingest.Options{Source: opts.Source, Dates: opts.Dates, Delimiter: opts.Delimiter, SpoolDir: spool, Size: opts.Size, Map: opts.Map}
	if !opts.Forget {
		with.Recall = c.Recall(ctx)
	}
	before := stamp(path, opts.In)
	f, err := ingest.Open(ctx, path, opts.In, with)
	if err != nil {
		return sum, err
	}
	defer f.Close()
	sum.Map = f.Map()
	if err := c.rememberMap(ctx, f.HeaderName(), opts); err != nil {
		return sum, err
	}
	l := &loading{c: c, file: f, opts: opts, sum: &sum}
	l.how = store.Reading{Header: f.Header(), Dates: f.Map().DateOrder, Source: opts.Source}
	if l.how.Header != nil { // else each row names its own columns
		l.how.Fields = string(f.TOML())
	}
	err = l.run(ctx, x)
	sum.Charset, sum.Unread, sum.Unknown = f.Charset(), f.Unread(), f.Unknown()
	sum.Changed = stamp(path, opts.In) != before
	if err != nil {
		return sum, fmt.Errorf("load %s: %w", path, err)
	}
	return sum, nil
}

// stamp tells one state of a file on disk from another; "" for streams.
func stamp(path string, in io.Reader) string {
	if in != nil {
		return ""
	}
	info, err := os.Stat(path)
	if err != nil {
		return fmt.Sprint(err)
	}
	return fmt.Sprint(info.Size(), info.ModTime())
}

// mapState names the state that holds the map for a header.
func mapState(header string) string { return "map " + header }

// Recall returns what finds the remembered map for a header, nil for none.
func (c *Collection) Recall(ctx context.Context) func(string) (*ingest.MapFile, error) {
	return func(header string) (*ingest.MapFile, error) {
		text, err := c.Store.State(ctx, mapState(header))
		if err != nil || text == "" {
			return nil, err
		}
		return ingest.ParseMap("the map remembered for "+header, []byte(text))
	}
}

// rememberMap keeps the map that a person gave, or forgets it.
func (c *Collection) rememberMap(ctx context.Context, header string, opts LoadOptions) error {
	switch {
	case opts.Map != nil:
		return c.Store.SetState(ctx, mapState(header), opts.Map.Text)
	case opts.Forget:
		return c.Store.SetState(ctx, mapState(header), "")
	}
	return nil
}

// clearSpool removes what a crash left behind.
func clearSpool(dir string) error {
	old, err := os.ReadDir(dir)
	if err != nil {
		return fmt.Errorf("read the spool folder: %w", err)
	}
	for _, e := range old {
		if err := os.Remove(filepath.Join(dir, e.Name())); err != nil {
			return fmt.Errorf("clear the spool folder: %w", err)
		}
	}
	return nil
}

// loading is the state of one Load.
type loading struct {
	c     *Collection
	file  *ingest.File
	opts  LoadOptions
	sum   *FileSummary
	how   store.Reading
	noted bool // how has been kept
}

// job is one row on its way. Whoever works on it closes done.
type job struct {
	item  ingest.Item
	put   store.Put
	known bool // the content is stored already
	err   error
	done  chan struct{}
}

// indexed is what the index is fed with.
type indexed struct {
	key, change int64
	occurrence  *corpus.Occurrence
}

// run joins the stages. The first fault ends all of them; each stage ends
// when the queue before it is closed or the context is over.
func (l *loading) run(ctx context.Context, x *index.Index) error {
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	work := make(chan *job, queued)  // to the classifiers
	order := make(chan *job, queued) // the same jobs, to the writer, in order
	feed := make(chan []indexed, 2)  // committed batches, to the index
	var wg sync.WaitGroup
	stage := func(run func() error) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			if err := run(); err != nil {
				cancel(err)
			}
		}()
	}
	// a file that cannot be read on is no reason to give up what was read
	// from it: the fault is told when the rest has been written
	var broken error
	stage(func() error {
		defer close(work)
		defer close(order)
		if err := l.read(ctx, work, order); err != nil && ctx.Err() == nil {
			broken = err
		}
		return nil
	})
	for range max(1, runtime.GOMAXPROCS(0)) {
		stage(func() error {
			for j := range work {
				l.tag(ctx, j)
				close(j.done)
			}
			return nil
		})
	}
	stage(func() error {
		defer close(feed)
		return l.write(ctx, order, feed)
	})
	stage(func() error { return l.index(ctx, x, feed) })
	wg.Wait()
	if err := context.Cause(ctx); err != nil {
		return err
	}
	return broken
}

func (l *loading) read(ctx context.Context, work, order chan<- *job) error {
	for {
		item, err := l.file.Next()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		j := &job{item: item, done: make(chan struct{})}
		select {
		case order <- j:
		case <-ctx.Done():
			return ctx.Err()
		}
		select {
		case work <- j:
		case <-ctx.Done():
			close(j.done)
			return ctx.Err()
		}
	}
}

// tag classifies one row, unless its content is stored already.
func (l *loading) tag(ctx context.Context, j *job) {
	o := j.item.Occurrence
	if o == nil || ctx.Err() != nil {
		j.err = ctx.Err()
		return
	}
	j.put.Hash = ingest.ContentHash(o)
	j.put.Source, j.put.Raw = j.item.Source, j.item.Raw
	if l.opts.Name != "" {
		j.put.Source.File = l.opts.Name
	}
	if j.known, j.err = l.c.Store.Known(ctx, o.Source, o.ID, j.put.Hash); j.err != nil || j.known {
		return
	}
	j.put.Tagged = l.c.Classifier.Tag(o)
}

// write stores the rows in order, a batch to a transaction.
func (l *loading) write(ctx context.Context, order <-chan *job, feed chan<- []indexed) error {
	for more := true; more; {
		b, err := l.c.Store.Begin(ctx)
		if err != nil {
			return err
		}
		if err := b.Rulebook(l.c.Classifier.Version(), l.c.Classifier.Parts()); err != nil {
			b.Rollback()
			return err
		}
		if err := l.noteReading(b); err != nil {
			b.Rollback()
			return err
		}
		var written []indexed
		var spools []string
		sum := *l.sum
		size := 0
		for n := 0; more && n < batchRows && size < batchBytes; n++ {
			j, ok := <-order
			if !ok {
				more = false
				break
			}
			<-j.done
			doc, err := l.writeOne(b, &sum, j)
			if err != nil {
				b.Rollback()
				return err
			}
			if doc != nil {
				written = append(written, *doc)
			}
			if a := j.item.SetAside; a != nil && a.Spool != "" {
				spools = append(spools, a.Spool)
			}
			size += len(j.item.Raw)
		}
		if err := ctx.Err(); err != nil {
			b.Rollback()
			return err
		}
		if err := b.Commit(); err != nil {
			return err
		}
		*l.sum = sum
		for _, s := range spools {
			os.Remove(s) // it stands in the database now
		}
		if l.opts.Progress != nil {
			l.opts.Progress(sum.Path, sum.Rows, l.file.BytesRead(), l.file.Size())
		}
		if len(written) > 0 {
			select {
			case feed <- written:
			case <-ctx.Done():
				return ctx.Err()
			}
		}
	}
	return nil
}

// noteReading keeps, with the first batch, what it takes to read rows of the
// file again that are set aside.
func (l *loading) noteReading(b *store.Batch) error {
	if l.noted {
		return nil
	}
	l.noted = true
	path := l.sum.Path
	if l.opts.Name != "" {
		path = l.opts.Name
	}
	return b.Reading(path, l.sum.Map.Name, l.how)
}

// writeOne stores one row and counts it; it returns what the index must learn.
func (l *loading) writeOne(b *store.Batch, sum *FileSummary, j *job) (*indexed, error) {
	if j.err != nil {
		return nil, j.err
	}
	sum.Rows++
	mapName := l.sum.Map.Name
	if a := j.item.SetAside; a != nil {
		sum.SetAside++
		if l.opts.Aside != nil {
			l.opts.Aside(a)
		}
		_, err := b.SetAside(a, mapName)
		return nil, err
	}
	o := j.item.Occurrence
	sum.count(o)
	if j.known {
		sum.Unchanged++
		return nil, nil
	}
	key, fate, err := b.Put(&j.put, mapName)
	if err != nil {
		return nil, err
	}
	switch fate {
	case store.Stored:
		sum.Stored++
	case store.Revised:
		sum.Revised++
	case store.Barred:
		sum.Unchanged++
		sum.Barred++
		return nil, nil
	default:
		sum.Unchanged++
		return nil, nil
	}
	return &indexed{key, b.Change(), o}, nil
}

func (s *FileSummary) count(o *corpus.Occurrence) {
	if o.Usable() {
		s.Narratives++
	}
	if o.Date.Precision() != corpus.Unknown {
		s.Dated++
	}
	for _, known := range s.Sources {
		if known == o.Source {
			return
		}
	}
	if len(s.Sources) < 8 {
		s.Sources = append(s.Sources, o.Source)
	}
}

// index feeds the index with what is committed.
func (l *loading) index(ctx context.Context, x *index.Index, feed <-chan []indexed) error {
	f := newFeeder(x)
	for batch := range feed {
		for _, d := range batch {
			if err := f.add(ctx, d.key, d.occurrence, d.change); err != nil {
				return err
			}
		}
	}
	if ctx.Err() != nil {
		return nil // the next run brings it up to date
	}
	return f.flush(ctx, f.change)
}
