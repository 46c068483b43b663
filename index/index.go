package index

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"github.com/blevesearch/bleve/v2"
	"github.com/blevesearch/bleve/v2/document"
	_ "github.com/blevesearch/bleve/v2/index/scorch"
	api "github.com/blevesearch/bleve_index_api"

	"catena/ingest/corpus"
)

// Errors that callers branch on. The first three are mended by building the
// index anew.
var (
	ErrMissing = errors.New("the index is missing")
	ErrDamaged = errors.New("the index is damaged")
	ErrFormat  = errors.New("the index was made by another version")
	ErrBusy    = errors.New("the index is being written by another process")
)

// format changes whenever documents would be indexed in another way.
const format = 2

// Options say how to open an index.
type Options struct {
	Wait time.Duration // how long to wait for another process; 0 for two seconds
}

// Index is an open index. Put is for one goroutine at a time; Search for many.
type Index struct {
	bleve    bleve.Index
	analyzer *analyzer
	change   int64
}

// Doc is an occurrence to index. Key is its key in the database.
type Doc struct {
	Key        int64
	Occurrence *corpus.Occurrence
}

// internal keys of the index, written with the documents that they tell of
var (
	stateKey = []byte("catena/state")
)

type state struct {
	Format int   `json:"format"`
	Change int64 `json:"change"`
}

// Open opens an index for writing and makes it where it is missing.
func Open(dir string, o Options) (*Index, error) {
	x, err := open(dir, o, false)
	if !errors.Is(err, ErrMissing) {
		return x, err
	}
	if err := os.MkdirAll(filepath.Dir(dir), 0o755); err != nil {
		return nil, fmt.Errorf("make index: %w", err)
	}
	b, err := bleve.NewUsing(dir, bleve.NewIndexMapping(), "scorch", "scorch", nil)
	if err != nil {
		return nil, fmt.Errorf("make index: %w", err)
	}
	x = &Index{bleve: b, analyzer: newAnalyzer()}
	batch := b.NewBatch()
	if err = x.mark(batch, 0); err == nil {
		err = b.Batch(batch)
	}
	if err != nil {
		b.Close()
		return nil, fmt.Errorf("make index: %w", err)
	}
	return x, nil
}

// OpenReader opens an index for searching only. While another process writes
// to it, the error is ErrBusy.
func OpenReader(dir string, o Options) (*Index, error) { return open(dir, o, true) }

func open(dir string, o Options, readOnly bool) (x *Index, err error) {
	if o.Wait == 0 {
		o.Wait = 2 * time.Second
	}
	if _, err := os.Stat(dir); errors.Is(err, os.ErrNotExist) {
		return nil, fmt.Errorf("open index: %w", ErrMissing)
	}
	defer recovered(&err)
	b, err := bleve.OpenUsing(dir, map[string]any{"bolt_timeout": o.Wait.String(), "read_only": readOnly})
	switch {
	case err == nil:
	case strings.Contains(err.Error(), "timeout"):
		return nil, fmt.Errorf("open index: %w", ErrBusy)
	case errors.Is(err, os.ErrPermission):
		return nil, fmt.Errorf("open index: %w", err)
	default:
		return nil, fmt.Errorf("open index: %w: %w", ErrDamaged, err)
	}
	data, err := b.GetInternal(stateKey)
	var s state
	if err == nil {
		err = json.Unmarshal(data, &s)
	}
	switch {
	case err != nil:
		b.Close()
		return nil, fmt.Errorf("open index: %w: %w", ErrDamaged, err)
	case s.Format != format:
		b.Close()
		return nil, fmt.Errorf("open index: %w", ErrFormat)
	}
	return &Index{bleve: b, analyzer: newAnalyzer(), change: s.Change}, nil
}

// recovered turns a panic of the library, which a damaged file can cause,
// into ErrDamaged.
func recovered(err *error) {
	if p := recover(); p != nil {
		*err = fmt.Errorf("%w: %v", ErrDamaged, p)
	}
}

// Close closes the index.
func (x *Index) Close() error { return x.bleve.Close() }

// Change is the last change of the database that the index reflects.
func (x *Index) Change() int64 { return x.change }

// Count is the number of documents.
func (x *Index) Count() (uint64, error) { return x.bleve.DocCount() }

func (x *Index) mark(b *bleve.Batch, change int64) error {
	data, err := json.Marshal(state{format, change})
	if err != nil {
		return err
	}
	b.SetInternal(stateKey, data)
	return nil
}

// Put indexes documents in one batch, replacing those of the same key. The
// index then reflects the given change.
func (x *Index) Put(ctx context.Context, docs []Doc, change int64) (err error) {
	if err := ctx.Err(); err != nil {
		return err
	}
	defer recovered(&err)
	b := x.bleve.NewBatch()
	for _, d := range docs {
		if err := b.IndexAdvanced(x.document(d)); err != nil {
			return fmt.Errorf("index occurrence %d: %w", d.Key, err)
		}
	}
	if err := x.mark(b, change); err != nil {
		return err
	}
	if err := x.bleve.Batch(b); err != nil {
		return fmt.Errorf("write index: %w", err)
	}
	x.change = change
	return nil
}

// Delete takes documents out.
func (x *Index) Delete(keys []int64, change int64) (err error) {
	defer recovered(&err)
	b := x.bleve.NewBatch()
	for _, k := range keys {
		b.Delete(docID(k))
	}
	if err := x.mark(b, change); err != nil {
		return err
	}
	if err := x.bleve.Batch(b); err != nil {
		return fmt.Errorf("write index: %w", err)
	}
	x.change = change
	return nil
}

// Keys lists the keys of all documents, in no order.
func (x *Index) Keys() (keys []int64, err error) {
	defer recovered(&err)
	advanced, err := x.bleve.Advanced()
	if err != nil {
		return nil, fmt.Errorf("read index: %w", err)
	}
	r, err := advanced.Reader()
	if err != nil {
		return nil, fmt.Errorf("read index: %w", err)
	}
	defer r.Close()
	all, err := r.DocIDReaderAll()
	if err != nil {
		return nil, fmt.Errorf("read index: %w", err)
	}
	defer all.Close()
	for {
		n, err := all.Next()
		if err != nil {
			return nil, fmt.Errorf("read index: %w", err)
		}
		if n == nil {
			return keys, nil
		}
		id, err := r.ExternalID(n)
		if err != nil {
			return nil, fmt.Errorf("read index: %w", err)
		}
		keys = append(keys, keyOf(id))
	}
}

// docID is the key in decimal digits of fixed width, so that ties in a
// ranking stand in the order of the database.
func docID(key int64) string { return fmt.Sprintf("%015d", key) }

func keyOf(id string) int64 {
	n, err := strconv.ParseInt(id, 10, 64)
	if err != nil {
		return 0
	}
	return n
}

// Names of the fields of a document.
const (
	textField  = "text"
	aboutField = "about" // make, model, place: searched beside the text
	firstField = "first" // first and last day that the date can mean
	lastField  = "last"
	sortField  = "date"
)

// keywords are the fields that can be filtered by their exact value.
func keywords(o *corpus.Occurrence) map[string]string {
	return map[string]string{
		"source": o.Source, "id": o.ID, "place": o.Place, "country": o.Country, "make": o.Make, "model": o.Model, "category": o.Category,
		"engine_type": o.EngineType, "operation": o.Operation, "phase": o.Phase, "injury": o.Injury, "damage": o.Damage, "event": o.Event,
	}
}

// document builds the index's document by hand: reflection over a mapping
// costs more than the analysis of a short narrative.
func (x *Index) document(d Doc) *document.Document {
	doc := document.NewDocument(docID(d.Key))
	o := d.Occurrence
	for n, t := range o.Narratives {
		doc.AddField(document.NewTextFieldCustom(textField, []uint64{uint64(n)}, []byte(t.Text), api.IndexField|api.IncludeTermVectors, x.analyzer))
	}
	for name, value := range keywords(o) {
		if value != "" {
			doc.AddField(document.NewTextFieldCustom(name, nil, []byte(value), api.IndexField|api.SkipFreqNorm, whole{}))
		}
	}
	if about := strings.TrimSpace(strings.Join([]string{o.Make, o.Model, o.Place}, " ")); about != "" {
		doc.AddField(document.NewTextFieldCustom(aboutField, nil, []byte(about), api.IndexField, x.analyzer))
	}
	if first, last := o.Date.Bounds(); first != (corpus.Date{}) {
		doc.AddField(document.NewNumericFieldWithIndexingOptions(firstField, nil, dayNumber(first), api.IndexField))
		doc.AddField(document.NewNumericFieldWithIndexingOptions(lastField, nil, dayNumber(last), api.IndexField))
		doc.AddField(document.NewTextFieldCustom(sortField, nil, []byte(o.Date.String()), api.IndexField|api.SkipFreqNorm|api.DocValues, whole{}))
	}
	return doc
}

// dayNumber counts days, so that dates compare as numbers.
func dayNumber(d corpus.Date) float64 {
	return float64(time.Date(d.Year, time.Month(d.Month), d.Day, 0, 0, 0, 0, time.UTC).Unix() / 86400)
}
