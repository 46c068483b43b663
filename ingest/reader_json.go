package ingest

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"strings"

	"catena/ingest/corpus"
)

// jsonReader reads objects: one a line, one after another over any number of
// lines, or the elements of one array.
type jsonReader struct {
	w     *window
	lim   limits
	table *columnTable
	shape jsonShape
	after bool // the array has ended

	wrapped bool // the array stands inside an object, of which the rest is passed over
}

// jsonShape is how the objects stand in the file.
type jsonShape int

const (
	perLine jsonShape = iota // NDJSON: one object a line
	inArray                  // one array of objects
	inFlow                   // objects over several lines each, no array
)

func newJSONReader(w *window, lim limits) (rowReader, error) {
	j := &jsonReader{w: w, lim: lim, table: newColumnTable(), shape: sniffJSON(w.bytes())}
	if j.shape == inArray {
		w.take(len(w.bytes()) - len(bytes.TrimLeft(w.bytes(), jsonSpace)) + 1)
	} else if at := wrappedList(w.bytes()); at > 0 {
		j.shape, j.wrapped = inArray, true
		w.take(at)
	}
	return j, nil
}

// wrappedList finds a list of records inside an object that is none itself,
// as in {"count": 2, "results": [{"id": ...}, ...]}, and returns where its
// first element begins, or 0. A file of one object a line has none.
func wrappedList(head []byte) int {
	n, _ := lineEnd(head)
	first := jsonText{s: string(head[:n])}
	if rest := bytes.TrimLeft(head[n:], jsonSpace); len(rest) > 0 && first.skip() == nil && first.end() == nil {
		return 0
	}
	d := json.NewDecoder(bytes.NewReader(head))
	type open struct {
		object bool
		key    string // of the value at hand
		named  bool   // key has been read, its value has not
	}
	var path []open
	candidate := 0 // where the list begins whose first element is being read
	for depth := 0; len(path) < maxDepth; depth = len(path) {
		token, err := d.Token()
		if err != nil {
			return 0
		}
		var top *open
		if depth > 0 {
			top = &path[depth-1]
		}
		switch t := token.(type) {
		case json.Delim:
			switch t {
			case '{', '[':
				list := t == '[' && depth > 0 && top.object && recordKeys[top.key] == ""
				if top != nil {
					top.named = false
				}
				path = append(path, open{object: t == '{'})
				if list {
					candidate = int(d.InputOffset())
				}
			default:
				if path = path[:depth-1]; len(path) == 0 {
					return 0 // what follows is another value
				}
			}
		default:
			if !top.object {
				continue
			}
			if top.named {
				top.named = false
				continue
			}
			top.key, top.named = token.(string), true
			if !recordMaking(top.key) {
				continue
			}
			if depth < 3 || path[depth-2].object || candidate == 0 {
				return 0 // a record that is not in a list
			}
			return candidate
		}
	}
	return 0
}

// recordMaking tells whether a key is one that makes a record usable.
func recordMaking(key string) bool {
	field := recordKeys[key]
	if field == "" {
		field, _ = lookupHeader(key)
	}
	return field == "id" || field == "date" || field == toNarratives || strings.HasPrefix(field, toNarrative)
}

// jsonSpace is the white space of RFC 8259.
const jsonSpace = " \t\r\n"

// looksJSON tells whether a file that begins like this is JSON. A table whose
// first header stands in brackets is not.
func looksJSON(head []byte) bool {
	head = bytes.TrimLeft(head, jsonSpace)
	if len(head) == 0 {
		return false
	}
	rest := bytes.TrimLeft(head[1:], jsonSpace)
	switch head[0] {
	case '{':
		return true
	case '[':
		return len(rest) == 0 || bytes.IndexByte([]byte(`{[]"-0123456789`), rest[0]) >= 0
	}
	return false
}

// sniffJSON tells the shape. Objects stand in flow only when the first line
// holds no whole object and the next does not begin one, so that a broken
// first line costs that line only.
func sniffJSON(head []byte) jsonShape {
	head = bytes.TrimLeft(head, jsonSpace)
	if head[0] == '[' {
		return inArray
	}
	n, more := lineEnd(head)
	p := jsonText{s: string(head[:n])}
	if !more || p.skip() == nil && p.end() == nil {
		return perLine
	}
	if next := bytes.TrimLeft(head[n:], jsonSpace); len(next) == 0 || next[0] == '{' {
		return perLine
	}
	return inFlow
}

func (j *jsonReader) columns() *columnTable { return j.table }

func (j *jsonReader) next() (row, error) {
	var r row
	var err error
	if j.shape == perLine {
		r, err = j.line()
	} else {
		r, err = j.element()
	}
	if err == nil && r.reason == "" {
		j.decode(&r)
	}
	return r, err
}

// line returns the next line that is not blank.
func (j *jsonReader) line() (row, error) {
	reach := j.lim.maxRow + 2 // two bytes more than a row, for its line break
	for {
		data := j.w.bytes()
		n, whole := lineEnd(data[:min(len(data), reach)])
		if !whole && len(data) < reach && !j.w.ended() {
			if !j.w.double(reach) && j.w.fault() != nil {
				return row{}, j.w.fault()
			}
			continue
		}
		if len(data) == 0 {
			return row{}, io.EOF
		}
		r := row{line: j.w.line}
		if len(withoutBreak(data[:n])) > j.lim.maxRow {
			path, size, err := j.w.spool(j.lim.dir, lineEnd)
			r.spool, r.reason = path, j.lim.tooLarge(size)
			return r, err
		}
		r.raw = withoutBreak(bytes.Clone(j.w.take(n)))
		if whole {
			j.w.take(1)
		}
		if len(bytes.Trim(r.raw, jsonSpace)) > 0 {
			return r, nil
		}
	}
}

// element returns the next element of the array or the flow.
func (j *jsonReader) element() (row, error) {
	first, err := j.begin()
	if err != nil {
		return row{}, err
	}
	switch {
	case j.after && j.wrapped:
		return row{}, j.passOver()
	case j.after:
		return j.rest("more text after the end of the array")
	case j.shape == inArray && first == ']':
		j.w.take(1)
		j.after = true
		return j.element()
	case bytes.IndexByte([]byte(`{["-0123456789tfn`), first) < 0:
		return j.rest(fmt.Sprintf("broken JSON: %q where a value should begin", first))
	}
	r := row{line: j.w.line}
	var scan elementScan
	size, done := 0, false
	for !done && size <= j.lim.maxRow {
		n := 0
		n, done = scan.end(j.w.bytes()[size:])
		if size += n; !done && !j.w.more() {
			if j.w.fault() != nil {
				return row{}, j.w.fault()
			}
			break
		}
	}
	switch {
	case size > j.lim.maxRow:
		return j.spoolElement(r, &scan, size, done)
	case !done && !scan.bare:
		return j.rest("broken JSON: the value that begins here never ends")
	}
	r.raw = bytes.Clone(j.w.take(size))
	return r, nil
}

// begin passes over white space and commas and returns the byte that the next
// element begins with.
func (j *jsonReader) begin() (byte, error) {
	for {
		data := j.w.bytes()
		left := bytes.TrimLeft(data, jsonSpace+",")
		j.w.take(len(data) - len(left))
		switch {
		case len(left) > 0:
			return left[0], nil
		case j.w.more():
		case j.w.fault() != nil:
			return 0, j.w.fault()
		case j.shape == inArray && !j.after:
			return 0, fmt.Errorf("the array is not closed; the file may be cut short")
		default:
			return 0, io.EOF
		}
	}
}

// spoolElement spools an element of which size bytes are scanned.
func (j *jsonReader) spoolElement(r row, scan *elementScan, size int, done bool) (row, error) {
	first := true
	path, total, err := j.w.spool(j.lim.dir, func(b []byte) (int, bool) {
		if first {
			first = false
			return size, done
		}
		n := 0
		n, done = scan.end(b)
		return n, done
	})
	r.spool, r.reason = path, j.lim.tooLarge(total)
	if !done {
		r.reason = fmt.Sprintf("broken JSON: the value that begins here never ends, %d bytes to the end of the file", total)
		j.after = true
	}
	return r, err
}

// passOver reads to the end of the file.
func (j *jsonReader) passOver() error {
	for {
		j.w.take(len(j.w.bytes()))
		if j.w.more() {
			continue
		}
		if err := j.w.fault(); err != nil {
			return err
		}
		return io.EOF
	}
}

// rest sets all the remaining bytes aside as one row: behind a fault between
// the elements nothing tells where the next one begins.
func (j *jsonReader) rest(reason string) (row, error) {
	j.after = true
	r := row{line: j.w.line, reason: reason + "; set aside from here to the end of the file"}
	j.w.fill(j.lim.maxRow + 1)
	if err := j.w.fault(); err != nil {
		return row{}, err
	}
	if n := len(j.w.bytes()); n <= j.lim.maxRow {
		r.raw = bytes.Clone(j.w.take(n))
		return r, nil
	}
	path, _, err := j.w.spool(j.lim.dir, func(b []byte) (int, bool) { return len(b), false })
	r.spool = path
	return r, err
}

// elementScan finds the end of one JSON value by its quotes and brackets,
// chunk by chunk, without checking it.
type elementScan struct {
	begun   bool
	bare    bool // a number or a word, which ends where something else begins
	depth   int  // open brackets
	inText  bool
	escaped bool
}

// end returns how many bytes of b belong to the value and whether it ends
// there. The next call goes on behind those bytes.
func (e *elementScan) end(b []byte) (int, bool) {
	if !e.begun && len(b) > 0 {
		e.begun = true
		e.bare = bytes.IndexByte([]byte(`{["`), b[0]) < 0
	}
	if e.bare {
		if i := bytes.IndexAny(b, ",]}"+jsonSpace); i >= 0 {
			return i, true
		}
		return len(b), false
	}
	for i, c := range b {
		switch {
		case e.escaped:
			e.escaped = false
		case e.inText:
			e.escaped = c == '\\'
			e.inText = c != '"'
		case c == '"':
			e.inText = true
		case c == '{' || c == '[':
			e.depth++
		case c == '}' || c == ']':
			e.depth--
		}
		if e.depth <= 0 && !e.inText && (c == '"' || c == '}' || c == ']') {
			return i + 1, true
		}
	}
	return len(b), false
}

// decode reads the object of a row into cells, or gives the row a reason.
func (j *jsonReader) decode(r *row) {
	if r.reason = oddByte(r.raw); r.reason != "" {
		return
	}
	p := jsonText{s: string(r.raw)}
	if p.peek() != '{' {
		r.reason = "not a JSON object"
		if err := p.skip(); err != nil {
			r.reason = err.Error()
		}
		return
	}
	d := recordDecoder{p: p, table: j.table, cells: make([]cell, 0, 16)}
	err := d.p.object(d.member)
	if err == nil && d.p.peek() == ',' {
		d.p.at++ // a line cut out of an array
	}
	if err == nil {
		err = d.p.end()
	}
	if err != nil {
		r.reason = err.Error()
		return
	}
	r.cells = d.cells
}

// recordDecoder turns the members of one object into cells.
type recordDecoder struct {
	p     jsonText
	table *columnTable
	cells []cell
	next  map[string]int // key -> number of its next repetition
}

// member reads one value. The nested keys of the occurrence record go into
// parts; any other nested value stays JSON.
func (d *recordDecoder) member(key string) error {
	c := cell{column: d.table.at(key), name: key}
	if d.has(c) { // repeated: the first is the field, this one is extra
		if d.next == nil {
			d.next = map[string]int{}
		}
		n := max(2, d.next[key])
		d.next[key] = n + 1
		c.column, c.name = -1, fmt.Sprintf("%s (%d)", key, n)
	} else if read := d.partReader(key); read != nil {
		c.parts = &parts{}
		d.cells = append(d.cells, c)
		return read(c.parts)
	}
	var ok bool
	var err error
	if c.text, c.nested, ok, err = d.p.any(); ok {
		d.cells = append(d.cells, c)
	}
	return err
}

// has tells whether the record has a cell of the same column already. Records
// have few keys, so looking through them is cheaper than a map; the bound
// keeps a record of endless keys from taking quadratic time.
func (d *recordDecoder) has(c cell) bool {
	if c.column < 0 {
		return false
	}
	for _, have := range d.cells[:min(len(d.cells), 256)] {
		if have.column == c.column {
			return true
		}
	}
	return false
}

// partReader returns what reads the value of a nested key of the occurrence
// record, or nil for any other key or form of value.
func (d *recordDecoder) partReader(key string) func(*parts) error {
	c := d.p.peek()
	switch {
	case key == "narratives" && c == '[':
		return d.narratives
	case key == "codes" && c == '[':
		return d.codes
	case key == "aircraft" && c == '[':
		return d.aircraft
	case key == "extra" && c == '{':
		return d.extra
	}
	return nil
}

func (d *recordDecoder) narratives(to *parts) error {
	return d.list(to, "narratives", func(name string) error {
		var n corpus.Narrative
		if d.p.peek() == '"' {
			text, err := d.p.text()
			to.narratives = append(to.narratives, corpus.Narrative{Kind: plainKind, Text: text})
			return err
		}
		err := d.fields(to, name, map[string]*string{"kind": &n.Kind, "text": &n.Text})
		if kind := narrativeKind(n.Kind); kind != n.Kind {
			if n.Kind != "" {
				to.extra = append(to.extra, cell{name: name + ".kind", text: n.Kind})
			}
			n.Kind = kind
		}
		to.narratives = append(to.narratives, n)
		return err
	})
}

func (d *recordDecoder) codes(to *parts) error {
	return d.list(to, "codes", func(name string) error {
		var c corpus.Code
		if d.p.peek() == '"' {
			text, err := d.p.text()
			to.codes = append(to.codes, corpus.Code{Label: text})
			return err
		}
		err := d.fields(to, name, map[string]*string{"scheme": &c.Scheme, "code": &c.Code, "label": &c.Label})
		to.codes = append(to.codes, c)
		return err
	})
}

func (d *recordDecoder) aircraft(to *parts) error {
	return d.list(to, "aircraft", func(name string) error {
		var a corpus.Aircraft
		var engines string
		err := d.fields(to, name, map[string]*string{
			"make": &a.Make, "model": &a.Model, "category": &a.Category,
			"engines": &engines, "engine_type": &a.EngineType,
		})
		if n, whole, bad := parseEngines(engines); bad == "" && whole {
			a.Engines = n
		} else if engines != "" {
			to.extra = append(to.extra, cell{name: name + ".engines", text: engines})
		}
		to.aircraft = append(to.aircraft, a)
		return err
	})
}

func (d *recordDecoder) extra(to *parts) error {
	return d.p.object(func(key string) error {
		text, nested, ok, err := d.p.any()
		if ok {
			to.extra = append(to.extra, cell{name: key, text: text, nested: nested})
		}
		return err
	})
}

// list reads an array whose elements are objects or texts; anything else goes
// to extra under the element's name, such as "codes[2]".
func (d *recordDecoder) list(to *parts, key string, element func(name string) error) error {
	i := 0
	return d.p.array(func() error {
		name := fmt.Sprintf("%s[%d]", key, i)
		i++
		if c := d.p.peek(); c == '{' || c == '"' && key != "aircraft" {
			return element(name)
		}
		return d.asExtra(to, name)
	})
}

// fields reads an object into the named fields; other keys, and values that
// repeat or are nested, go to extra.
func (d *recordDecoder) fields(to *parts, name string, fields map[string]*string) error {
	return d.p.object(func(key string) error {
		field := fields[key]
		if c := d.p.peek(); field == nil || c == '{' || c == '[' {
			return d.asExtra(to, name+"."+key)
		}
		delete(fields, key)
		text, _, err := d.p.scalar()
		*field = text
		return err
	})
}

// asExtra keeps a value that has no field of its own.
func (d *recordDecoder) asExtra(to *parts, name string) error {
	text, nested, ok, err := d.p.any()
	if ok {
		to.extra = append(to.extra, cell{name: name, text: text, nested: nested})
	}
	return err
}
