package ingest

import (
	"bytes"
	"fmt"
	"io"
	"slices"
	"strings"
)

// delimitedReader reads tables of cells between commas, tabs, semicolons or
// bars, quoted as RFC 4180 has it. Like encoding/csv with LazyQuotes it takes
// a stray quote for text; unlike it, line breaks inside a quoted cell stay as
// they were written and a quote that is never closed costs one row only.
type delimitedReader struct {
	w      *window
	lim    limits
	split  splitter
	table  *columnTable
	header []byte // the header row or rows as read
	ahead  *row   // read to see whether it is a second header row, and is none

	unclosed int // rows set aside for a quote that is never closed
}

// maxUnclosed is how many unclosed quotes a file may have before each line is
// taken for a row: each costs a look at up to a whole row limit of bytes, and
// a file with more of them does not use quotes for quoting.
const maxUnclosed = 20

// newDelimitedReader reads the header row.
func newDelimitedReader(w *window, lim limits) (rowReader, error) {
	d := &delimitedReader{w: w, lim: lim, table: newColumnTable()}
	d.split.delimiter = sniffDelimiter(w.bytes())
	mark, told := separatorLine(w.bytes())
	if told {
		n, _ := lineEnd(w.bytes())
		w.take(n)
	}
	if lim.delimiter != 0 {
		mark, told = lim.delimiter, true
	}
	if told {
		d.split.delimiter = mark
	}
	first, err := d.headerRow()
	if err != nil {
		return nil, err
	}
	d.header = first.raw
	names := d.split.cells(string(first.raw))
	second, err := d.record()
	switch {
	case err != nil: // next tells
	case second.reason != "":
		d.ahead = &second
	default:
		if below := d.split.cells(string(second.raw)); twoHeaderRows(names, below) {
			names = joinHeaderRows(names, below)
			d.header = slices.Concat(first.raw, []byte{'\n'}, second.raw)
		} else {
			d.ahead = &second
		}
	}
	if told { // and must be told again where rows are read again
		d.header = slices.Concat([]byte("sep="), []byte{mark, '\n'}, d.header)
	}
	d.table.header(names)
	return d, nil
}

// headerRow reads the first row; an error says why it can be no header.
func (d *delimitedReader) headerRow() (row, error) {
	r, err := d.record()
	switch {
	case err == io.EOF:
		return row{}, fmt.Errorf("no header row")
	case err != nil:
		return row{}, err
	case r.spool != "":
		return row{}, errSpooled{r.spool, fmt.Errorf("header: %s", r.reason)}
	case r.reason != "":
		return row{}, fmt.Errorf("header: %s", r.reason)
	case len(d.split.spans) > maxColumns:
		return row{}, fmt.Errorf("header: %d columns, more than the limit of %d", len(d.split.spans), maxColumns)
	}
	return r, nil
}

// twoHeaderRows tells whether a row of groups, each over one or more columns,
// stands above the names of the columns: the same width, a group that spans
// columns, and more known words in the lower row than in the upper.
func twoHeaderRows(upper, lower []string) bool {
	if len(upper) != len(lower) {
		return false
	}
	spanning := false
	above, below := map[string]bool{}, map[string]bool{}
	for i, name := range lower {
		up := strings.TrimSpace(upper[i])
		spanning = spanning || i > 0 && up != "" && up == strings.TrimSpace(upper[i-1])
		if field, _ := lookupHeader(up); field != "" {
			above[field] = true
		}
		if field, _ := lookupHeader(name); field != "" {
			below[field] = true
		}
	}
	return spanning && len(below) >= len(above)+2
}

// joinHeaderRows names each column by its group and its own name.
func joinHeaderRows(upper, lower []string) []string {
	names := make([]string, len(lower))
	for i := range lower {
		group, name := strings.TrimSpace(upper[i]), strings.TrimSpace(lower[i])
		switch {
		case group == "":
			names[i] = name
		case name == "":
			names[i] = group
		default:
			names[i] = group + " / " + name
		}
	}
	return names
}

// errSpooled is an error that leaves a spooled row behind for Open to remove.
type errSpooled struct {
	path string
	error
}

func (d *delimitedReader) columns() *columnTable { return d.table }

func (d *delimitedReader) next() (row, error) {
	r, err := d.nextRecord()
	if err != nil || r.reason != "" {
		return r, err
	}
	if r.reason = oddByte(r.raw); r.reason != "" {
		return r, nil
	}
	if i := bytes.IndexByte(r.raw, 0); i >= 0 {
		r.reason = fmt.Sprintf("NUL at byte %d of the row", i+1)
		return r, nil
	}
	texts := d.split.cells(string(r.raw))
	if r.reason = ragged(texts, len(d.table.names)); r.reason != "" {
		return r, nil
	}
	r.cells = make([]cell, len(d.table.names))
	for i, name := range d.table.names {
		r.cells[i] = cell{column: i, name: name, text: decodeEntities(texts[i])}
	}
	return r, nil
}

// nextRecord is the row read ahead, or the next of the stream.
func (d *delimitedReader) nextRecord() (row, error) {
	if d.ahead == nil {
		return d.record()
	}
	r := *d.ahead
	d.ahead = nil
	if r.reason == "" {
		d.split.scan(r.raw, true)
	}
	return r, nil
}

// ragged tells why the cells do not fit the header, or "". Blank cells past
// the header's end say nothing and are let go.
func ragged(texts []string, width int) string {
	n := len(texts)
	for n > width && strings.TrimSpace(texts[n-1]) == "" {
		n--
	}
	if n == width {
		return ""
	}
	return fmt.Sprintf("%d cells where the header has %d", n, width)
}

// record returns the next record that is not a blank line. The splitter's
// spans belong to it when it has no reason.
func (d *delimitedReader) record() (row, error) {
	for {
		r, err := d.anyRecord()
		if err != nil || r.reason != "" || len(bytes.TrimSpace(r.raw)) > 0 || len(d.split.spans) > 1 {
			return r, err
		}
	}
}

// anyRecord returns the next record, blank or not.
func (d *delimitedReader) anyRecord() (row, error) {
	// Two bytes more than a row may have, for its line break.
	reach := d.lim.maxRow + 2
	for {
		data := d.w.bytes()
		data = data[:min(len(data), reach)]
		last := d.w.ended() && len(data) == len(d.w.bytes())
		if last && len(data) == 0 {
			return row{}, io.EOF
		}
		found := d.find(data, last)
		full := len(data) == reach
		switch {
		case found.outcome == complete && len(withoutBreak(data[:found.end])) <= d.lim.maxRow:
			r := row{line: d.w.line}
			r.raw = withoutBreak(bytes.Clone(d.w.take(found.end)))
			return r, nil
		case found.outcome == unclosed || found.outcome == open && (full || last):
			return d.setUnclosedAside(data, found.quote, last)
		case found.outcome == complete:
			return d.setLargeAside(found.end - 1)
		case full:
			return d.setLargeAside(len(data))
		}
		if !d.w.double(reach) && d.w.fault() != nil {
			return row{}, d.w.fault()
		}
	}
}

// find looks for the first record of data, or, after too many unclosed
// quotes, for its first line.
func (d *delimitedReader) find(data []byte, last bool) finding {
	if d.unclosed < maxUnclosed {
		return d.split.scan(data, last)
	}
	n, done := lineEnd(data)
	if !done && !last {
		return finding{outcome: partial}
	}
	if done {
		n++
	}
	found := d.split.scan(data[:n], true)
	if found.outcome == complete {
		return found
	}
	return finding{outcome: unclosed, quote: found.quote}
}

// setUnclosedAside sets the lines from the record's start to the unclosed
// quote aside, so that reading goes on behind them; last says that nothing
// follows data.
func (d *delimitedReader) setUnclosedAside(data []byte, quote int, last bool) (row, error) {
	n, done := lineEnd(data[quote:])
	if n += quote; !done && !last {
		return d.setLargeAside(quote)
	}
	d.unclosed++
	r := row{line: d.w.line}
	opened := r.line + bytes.Count(data[:quote], []byte{'\n'})
	r.reason = fmt.Sprintf("quote opened on line %d is never closed", opened)
	r.raw = withoutBreak(bytes.Clone(d.w.take(n)))
	if done {
		d.w.take(1)
	}
	return r, nil
}

// setLargeAside spools the next known bytes and what follows them up to the
// line break. Quotes are not heeded in what follows: a quote in an endless
// line must not take the rest of the file with it.
func (d *delimitedReader) setLargeAside(known int) (row, error) {
	r := row{line: d.w.line}
	path, size, err := d.w.spool(d.lim.dir, func(b []byte) (int, bool) {
		skip := min(known, len(b))
		known -= skip
		n, done := lineEnd(b[skip:])
		return skip + n, done
	})
	if err != nil {
		return row{}, err
	}
	if len(d.w.bytes()) > 0 { // the line break
		d.w.take(1)
	}
	r.spool, r.reason = path, d.lim.tooLarge(size)
	return r, nil
}

// splitter finds the records and cells of delimited text.
type splitter struct {
	delimiter byte
	spans     []cellSpan // the cells of the record found last
}

// cellSpan is where a cell's text stands in the record.
type cellSpan struct {
	start, end int
	quotes     bool // the text holds quotes that may stand doubled
}

// outcome says how a scan for a record ended.
type outcome int

const (
	complete outcome = iota // the record ends at finding.end
	partial                 // more bytes are needed; no quote is open
	open                    // more bytes are needed; a quote is open
	unclosed                // a quote is open that cannot be meant to
)

type finding struct {
	outcome outcome
	end     int // bytes of the record with its line break
	quote   int // where the open quote stands
}

// scan finds the first record of data; last says that nothing follows data.
//
// A quote right behind a delimiter or a line break, on a later line than the
// quote that opened the cell, begins a cell of another row: the first quote
// was never closed. encoding/csv would swallow the row between.
func (s *splitter) scan(data []byte, last bool) finding {
	s.spans = s.spans[:0]
	at := 0
	for {
		if at < len(data) && data[at] == '"' {
			quote := at
			end, found := s.quoted(data, at+1, last)
			if found.outcome != complete {
				found.quote = quote
				return found
			}
			at = end
		} else {
			end := at
			for end < len(data) && data[end] != s.delimiter && data[end] != '\n' {
				end++
			}
			if end == len(data) && !last {
				return finding{outcome: partial}
			}
			text := end
			if atBreak := end == len(data) || data[end] == '\n'; atBreak && text > at && data[text-1] == '\r' {
				text--
			}
			s.spans = append(s.spans, cellSpan{at, text, false})
			at = end
		}
		if at == len(data) {
			return finding{end: at}
		}
		at++ // the delimiter or the line break
		if data[at-1] == '\n' {
			return finding{end: at}
		}
	}
}

// quoted reads a quoted cell whose text begins at start. It returns where the
// delimiter or line break behind the cell stands.
func (s *splitter) quoted(data []byte, start int, last bool) (int, finding) {
	quotes := false
	at := start
	for {
		i := bytes.IndexByte(data[at:], '"')
		if i < 0 {
			return 0, finding{outcome: open}
		}
		text := at + i // where the text ends, if this quote closes the cell
		at = text + 1
		if rest := data[at:]; len(rest) == 0 || len(rest) == 1 && rest[0] == '\r' {
			if !last {
				return 0, finding{outcome: open}
			}
			s.spans = append(s.spans, cellSpan{start, text, quotes})
			return len(data), finding{}
		}
		behind := at
		if data[behind] == '\r' {
			behind++
		}
		switch {
		case data[at] == '"':
			at++
			quotes = true
		case data[at] == s.delimiter:
			s.spans = append(s.spans, cellSpan{start, text, quotes})
			return at, finding{}
		case data[behind] == '\n':
			s.spans = append(s.spans, cellSpan{start, text, quotes})
			return behind, finding{}
		case text > start && (data[text-1] == s.delimiter || data[text-1] == '\n') &&
			bytes.IndexByte(data[start:text], '\n') >= 0:
			return 0, finding{outcome: unclosed}
		}
	}
}

// cells cuts the record that scan found last into its texts.
func (s *splitter) cells(record string) []string {
	texts := make([]string, len(s.spans))
	for i, span := range s.spans {
		texts[i] = record[span.start:span.end]
		if span.quotes {
			texts[i] = strings.ReplaceAll(texts[i], `""`, `"`)
		}
	}
	return texts
}

// delimiters are those that a table may use, the most common first.
var delimiters = []byte{',', '\t', ';', '|'}

// Delimiters are the names of those that a table may use.
var Delimiters = []string{"comma", "tab", "semicolon", "pipe"}

// delimiterOf is the delimiter of a name, 0 where there is none.
func delimiterOf(name string) byte {
	if i := slices.Index(Delimiters, name); i >= 0 {
		return delimiters[i]
	}
	return 0
}

// sniffDelimiter picks the delimiter under which the header has the most
// known words, or, when no word is known, the most cells.
func sniffDelimiter(head []byte) byte {
	head = bytes.TrimLeft(head, "\r\n")
	best, mostKnown, mostCells := delimiters[0], -1, 0
	for _, d := range delimiters {
		s := splitter{delimiter: d}
		s.scan(head, true) // the cells before an unclosed quote tell enough
		known := 0
		for _, word := range s.cells(string(head)) {
			if field, _ := lookupHeader(word); field != "" {
				known++
			}
		}
		if known > mostKnown || known == mostKnown && len(s.spans) > mostCells {
			best, mostKnown, mostCells = d, known, len(s.spans)
		}
	}
	return best
}

// separatorLine reads the first line "sep=;" that a spreadsheet program may
// put above the header.
func separatorLine(head []byte) (byte, bool) {
	n, _ := lineEnd(head)
	line := bytes.TrimSuffix(head[:n], []byte{'\r'})
	if len(line) == 5 && bytes.EqualFold(line[:4], []byte("sep=")) && bytes.IndexByte(delimiters, line[4]) >= 0 {
		return line[4], true
	}
	return 0, false
}
