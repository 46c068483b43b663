package ingest

import (
	"bufio"
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
	"sync/atomic"

	"github.com/klauspost/compress/gzip"

	"catena/ingest/corpus"
)

// Options say how to read a file. The zero value reads any file.
type Options struct {
	Source   string // names the source of all occurrences, over what the rows say
	Dates    string // order of dates of three numbers: dmy, mdy, ymd, or "" to see from the values
	MaxRow   int    // bytes of one row held in memory; 0 for DefaultMaxRow
	SpoolDir string // where larger rows go, as temporary files; "" for the system's folder
	// Delimiter is what stands between the cells of a table: one of Delimiters,
	// or "" to see from the header.
	Delimiter string
	Table     bool  // it is delimited text, whatever its name and beginning look like
	Size      int64 // bytes of the stream, for progress; 0 where not known

	// Map is a person's map for the file; nil to see from the headers, or to
	// take what Recall returns for the name that the automatic map has.
	Map    *MapFile
	Recall func(name string) (*MapFile, error)
}

// DefaultMaxRow is the row limit: a long final report is a few hundred
// kilobytes, so a row of more is an export gone wrong.
const DefaultMaxRow = 4 << 20

// The sample that Open looks at before the first row is returned.
const (
	sampleRows  = 2_000
	sampleBytes = 4 << 20
)

// Item is what became of one row: an occurrence or a row set aside, never
// both. All of it belongs to the caller, also a spooled row's file.
type Item struct {
	Source     corpus.Source
	Occurrence *corpus.Occurrence
	SetAside   *corpus.SetAside
	Raw        []byte // the row as read, in UTF-8, without the line break that ends it; empty for a spooled row
}

// File is an open file of occurrences. It is for one goroutine, but BytesRead
// may be called from any.
type File struct {
	ctx    context.Context // ends the reading, as it would a copy between streams
	path   string
	opts   Options
	closer []io.Closer
	disk   *countingReader
	size   int64
	text   *charsetReader

	window *window
	reader rowReader
	mapper *mapper
	header string // names the header: what the automatic map calls the source
	sample []row  // rows read by Open and not yet returned
	fault  error  // what ended the reading
	rows   int    // rows returned
}

// Open opens the stream in, called path, or, without one, the file at path,
// and finds out its format and map. It refuses a folder, an empty file, a file that is no table
// of reports, and a table whose columns or dates cannot be made out; the
// error says what to try.
func Open(ctx context.Context, path string, in io.Reader, opts Options) (*File, error) {
	if opts.MaxRow <= 0 {
		opts.MaxRow = DefaultMaxRow
	}
	if opts.Dates != "" && orderWords(opts.Dates) == "" {
		return nil, fmt.Errorf("order of dates %q: want dmy, mdy or ymd", opts.Dates)
	}
	f := &File{ctx: ctx, path: path, opts: opts}
	err := f.open(in)
	if err != nil {
		f.Close()
		return nil, fmt.Errorf("open %s: %w", f.name(), err)
	}
	return f, nil
}

// name is the path as errors show it.
func (f *File) name() string {
	if f.path == "-" {
		return "standard input"
	}
	return fmt.Sprintf("%q", f.path)
}

// open reads as far as the end of the sample.
func (f *File) open(in io.Reader) error {
	in, err := f.input(in)
	if err != nil {
		return err
	}
	packed := bufio.NewReaderSize(in, windowSize)
	head, _ := packed.Peek(windowSize)
	lim := limits{f.opts.MaxRow, f.opts.SpoolDir, delimiterOf(f.opts.Delimiter)}
	if f.opts.Delimiter != "" && lim.delimiter == 0 {
		return fmt.Errorf("no delimiter is called %q; there are %s", f.opts.Delimiter, strings.Join(Delimiters, ", "))
	}
	if looksXLSX(head) {
		return f.openWorkbook(packed, lim)
	}
	if err := refuse(head); err != nil {
		return noReports{err}
	}
	f.text = newCharsetReader(packed)
	w := newWindow(f.text)
	f.window = w
	if err := begin(w); err != nil {
		return err
	}
	if err := refuseText(w.bytes()); err != nil {
		return noReports{err}
	}
	format := formatOf(f.path, w.bytes())
	if lim.delimiter != 0 || f.opts.Table {
		format = formats[len(formats)-1] // then it is a table
	}
	if f.reader, err = format.open(w, lim); err != nil {
		var spooled errSpooled
		if errors.As(err, &spooled) {
			os.Remove(spooled.path)
		}
		return err
	}
	if err := f.readSample(); err != nil {
		return err
	}
	return f.makeMap(format.name)
}

// openWorkbook reads a workbook as far as the end of the sample.
func (f *File) openWorkbook(in io.Reader, lim limits) error {
	book, err := newXLSXReader(in, lim)
	if err != nil {
		return err
	}
	f.closer = append(f.closer, book)
	f.reader = book
	if err := f.readSample(); err != nil {
		return err
	}
	return f.makeMap("xlsx")
}

// input opens the path and undoes gzip, told by its first two bytes.
func (f *File) input(in io.Reader) (io.Reader, error) {
	f.size = f.opts.Size
	if in == nil && f.path == "-" {
		return nil, fmt.Errorf("nothing to read from")
	}
	if in == nil {
		file, err := os.Open(f.path)
		if err != nil {
			return nil, plain(err)
		}
		f.closer = append(f.closer, file)
		info, err := file.Stat()
		switch {
		case err != nil:
			return nil, plain(err)
		case info.IsDir():
			return nil, fmt.Errorf("a folder, not a file")
		case info.Mode().IsRegular():
			f.size = info.Size()
		}
		in = file
	}
	f.disk = &countingReader{in: in}
	buffered := bufio.NewReaderSize(f.disk, windowSize)
	if magic, _ := buffered.Peek(2); string(magic) != "\x1F\x8B" {
		return buffered, nil
	}
	unpacked, err := gzip.NewReader(buffered)
	if err != nil {
		return nil, fmt.Errorf("unpack gzip: %w", err)
	}
	bounded := &boundedReader{in: unpacked, packed: f.disk.n.Load}
	f.closer = append(f.closer, bounded)
	return bounded, nil
}

// plain drops the operation and path from an error of the file system; the
// caller's message names them.
func plain(err error) error {
	var path *os.PathError
	if errors.As(err, &path) {
		return path.Err
	}
	return err
}

// begin cuts the byte-order mark off and passes over white space until the
// window holds text; an error means that there is none.
func begin(w *window) error {
	w.fill(windowSize)
	if bytes.HasPrefix(w.bytes(), byteOrderMark) {
		w.take(len(byteOrderMark))
	}
	for len(bytes.TrimSpace(w.bytes())) == 0 {
		w.take(len(w.bytes()))
		if w.fill(windowSize); len(w.bytes()) > 0 {
			continue
		}
		if err := w.fault(); err != nil {
			return err
		}
		what := "an empty file"
		if w.line > 1 {
			what = "a file of white space only"
		}
		return noReports{fmt.Errorf("%s: check that it was downloaded or exported whole", what)}
	}
	return nil
}

// readSample reads the rows that the map is made from.
func (f *File) readSample() error {
	size := 0
	for len(f.sample) < sampleRows && size < sampleBytes {
		if err := f.ctx.Err(); err != nil {
			return err
		}
		r, err := f.read()
		if err != nil {
			return nil // Next returns it behind the sample
		}
		f.sample = append(f.sample, r)
		size += len(r.raw)
	}
	return nil
}

// makeMap maps the columns and decides the order of dates.
func (f *File) makeMap(format string) error {
	names := f.reader.columns().names
	f.mapper = newMapper(format, names, nil)
	f.header = f.mapper.Name
	told := f.opts.Map
	if told == nil && f.opts.Recall != nil {
		var err error
		if told, err = f.opts.Recall(f.header); err != nil {
			return err
		}
	}
	switch {
	case told != nil:
		if err := told.covers(names); err != nil {
			return err
		}
		f.mapper = mapWith(format, names, nil, told)
		if f.opts.Dates == "" {
			f.opts.Dates = told.Dates
		}
	case format != "json" && format != "text":
		f.dropSharedIDs()
		f.mapByValues()
	}
	if !f.mapper.known() && (format != "json" || len(names) > 0) {
		return noReports{fmt.Errorf("no column is known for an id, a date or a narrative among %s: name the columns as in an occurrence record (id, date, narrative), or say with --map which is which (--write-map writes one to correct)",
			listNames(names))}
	}
	return f.orderDates()
}

// dropSharedIDs maps anew where columns look like ids by their header and are none by
// their values: one row in ten, or more, has the value of another row and
// another narrative. Such rows are parts of one event (a recommendation each,
// say) and must not be taken for revisions of one another.
func (f *File) dropSharedIDs() {
	shared := map[string]string{}
	for {
		id := slices.IndexFunc(f.mapper.plans, func(p plan) bool { return p.field == "id" })
		if id < 0 {
			return
		}
		texts := map[string]string{}
		rows, clashes := 0, 0
		for _, r := range f.sample {
			value, text := "", ""
			for _, c := range r.cells {
				switch {
				case c.column == id:
					value = c.text
				case c.column >= 0 && c.column < len(f.mapper.plans) && strings.HasPrefix(f.mapper.plans[c.column].field, narrativeOf):
					text += c.text
				}
			}
			if value == "" {
				continue
			}
			rows++
			if first, seen := texts[value]; seen && first != text {
				clashes++
			} else {
				texts[value] = text
			}
		}
		if clashes*10 < rows || clashes < 3 {
			return
		}
		name := f.mapper.Columns[id].Column
		shared[name] = fmt.Sprintf("no id: %d of %d rows share a value and tell something else", clashes, rows)
		f.mapper = newMapper(f.mapper.format, f.reader.columns().names, shared)
	}
}

// mapByValues finds a narrative and a date, where no header names one, by
// what stands in the columns: long texts, and dates in nine rows of ten.
func (f *File) mapByValues() {
	kinds := map[string]int{}
	for _, p := range f.mapper.plans {
		field, _, _ := strings.Cut(p.field, ".")
		kinds[field]++
	}
	type column struct{ filled, dates, length int }
	columns := make([]column, len(f.mapper.plans))
	for _, r := range f.sample {
		for _, c := range r.cells {
			text := strings.TrimSpace(c.text)
			if c.column < 0 || c.column >= len(columns) || placeholder(text) {
				continue
			}
			at := &columns[c.column]
			at.filled++
			at.length += len(text)
			if p, ok := partsOf(text); ok && (p.n == 3 || p.month > 0) {
				at.dates++
			}
		}
	}
	longest, dated := -1, -1
	for i, c := range columns {
		if f.mapper.plans[i].field != toExtra || c.filled == 0 {
			continue
		}
		if c.length/c.filled >= longText && (longest < 0 || c.length > columns[longest].length) {
			longest = i
		}
		if c.dates*10 >= c.filled*9 && c.filled*2 >= len(f.sample) && dated < 0 {
			dated = i
		}
	}
	if kinds["narrative"] == 0 && longest >= 0 {
		f.mapper.assign(longest, narrativeOf+f.mapper.plain, "by its long texts")
	}
	if kinds["date"] == 0 && dated >= 0 {
		f.mapper.assign(dated, "date", "by its values")
	}
}

// longText is how long the texts of a column are, in bytes on average, to be
// taken for narratives.
const longText = 150

// listNames writes the first few of a list of names.
func listNames(names []string) string {
	const most = 12
	var b strings.Builder
	for i, name := range names[:min(len(names), most)] {
		if i > 0 {
			b.WriteString(", ")
		}
		fmt.Fprintf(&b, "%q", brief(name))
	}
	if len(names) > most {
		fmt.Fprintf(&b, " and %d more", len(names)-most)
	}
	return b.String()
}

// orderDates decides whether day or month comes first in the date column.
func (f *File) orderDates() error {
	i := f.mapper.dateColumn()
	if i < 0 {
		return nil
	}
	column := &f.mapper.Columns[i]
	if f.opts.Dates != "" {
		f.mapper.DateOrder = f.opts.Dates
		column.Note = orderWords(f.opts.Dates) + ", as told"
		return nil
	}
	var seen dateEvidence
	for _, r := range f.sample {
		for _, c := range r.cells {
			if c.column != i {
				continue
			}
			if err := seen.add(strings.TrimSpace(c.text), r.line); err != nil {
				return fmt.Errorf("column %q: %w", column.Column, err)
			}
		}
	}
	order, err := seen.order()
	if err != nil {
		return fmt.Errorf("column %q: %w", column.Column, err)
	}
	if f.mapper.DateOrder = order; order != "" {
		column.Note = orderWords(order) + ", as the values show"
	}
	return nil
}

// Map is what the columns are taken for. It must not be changed.
func (f *File) Map() *Map { return &f.mapper.Map }

// Charset names the character set that the rows read so far were decoded
// from.
func (f *File) Charset() string {
	if f.text == nil { // a workbook
		return charsetUTF8
	}
	return f.text.name
}

// Word is a word of a file that the record has no word for.
type Word struct {
	Field, Word string
	Count       int
}

// Unknown lists words read so far that are kept as they are for want of a
// word of the record, the most frequent first.
func (f *File) Unknown() []Word {
	var list []Word
	for field, words := range f.mapper.unknown {
		for w, n := range words {
			list = append(list, Word{field, w, n})
		}
	}
	slices.SortFunc(list, func(a, b Word) int {
		return cmp.Or(cmp.Compare(b.Count, a.Count), cmp.Compare(a.Field, b.Field), cmp.Compare(a.Word, b.Word))
	})
	return list
}

// Unread names the sheets of a workbook that are not read.
func (f *File) Unread() []string {
	if x, ok := f.reader.(*xlsxReader); ok {
		return x.others
	}
	return nil
}

// HeaderName names the file's header, the same for every file of the same
// columns, whatever map is used.
func (f *File) HeaderName() string { return f.header }

// Header is the header row as read, nil for formats that have none. Set above
// a row that was set aside, it makes that row a file again.
func (f *File) Header() []byte {
	switch r := f.reader.(type) {
	case *delimitedReader:
		return r.header
	case *xlsxReader:
		return r.header
	}
	return nil
}

// Next returns the next row, and io.EOF after the last. Any other error means
// that nothing more can be read; it names the file and the line.
func (f *File) Next() (Item, error) {
	if err := f.ctx.Err(); err != nil {
		return Item{}, fmt.Errorf("read %s: %w", f.name(), err)
	}
	r, err := f.row()
	if err == io.EOF {
		return Item{}, err
	}
	if err != nil {
		return Item{}, fmt.Errorf("read %s: %w", f.name(), err)
	}
	f.rows++
	item := Item{Source: corpus.Source{File: f.path, Row: f.rows, Line: r.line}, Raw: r.raw}
	if r.reason == "" {
		f.mapper.extend(f.reader.columns().names)
		item.Occurrence, r.reason = f.mapper.occurrence(r.cells, f.opts.Source)
	}
	if r.reason != "" {
		item.SetAside = &corpus.SetAside{Source: item.Source, Reason: r.reason, Raw: r.raw, Spool: r.spool}
	}
	return item, nil
}

// row returns the next row of the sample or behind it.
func (f *File) row() (row, error) {
	if len(f.sample) > 0 {
		r := f.sample[0]
		f.sample[0] = row{}
		f.sample = f.sample[1:]
		return r, nil
	}
	return f.read()
}

// read reads one row behind the sample and remembers what ended the reading.
func (f *File) read() (row, error) {
	if f.fault != nil {
		return row{}, f.fault
	}
	r, err := f.reader.next()
	if err != nil && err != io.EOF && f.window != nil {
		err = fmt.Errorf("line %d: %w", f.window.line, err)
	}
	f.fault = err
	return r, err
}

// BytesRead is how far the file has been read, in bytes on disk; packed ones
// for a packed file. Next runs a little behind it.
func (f *File) BytesRead() int64 { return f.disk.n.Load() }

// Size is the file's size on disk in bytes, 0 where there is none to know.
func (f *File) Size() int64 { return f.size }

// Close closes the file and removes spooled rows that Next did not return.
func (f *File) Close() error {
	for _, r := range f.sample {
		if r.spool != "" {
			os.Remove(r.spool)
		}
	}
	f.sample = nil
	var err error
	for i := len(f.closer) - 1; i >= 0; i-- {
		err = errors.Join(err, f.closer[i].Close())
	}
	f.closer = nil
	return err
}

// countingReader counts the bytes that pass.
type countingReader struct {
	in io.Reader
	n  atomic.Int64
}

func (c *countingReader) Read(p []byte) (int, error) {
	n, err := c.in.Read(p)
	c.n.Add(int64(n))
	return n, err
}
