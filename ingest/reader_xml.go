package ingest

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"strings"
)

// xmlReader reads one record an element. It frames the elements itself, so
// that a broken one costs one row and a huge one no memory, and leaves what
// is in them to encoding/xml, which expands no entities of a document's own.
type xmlReader struct {
	w      *window
	lim    limits
	table  *columnTable
	record string // the name of a record's element
	level  int    // how many elements stand around it
	depth  int    // elements open at the window's first byte
}

const (
	// xmlSample is how much of the file is looked at to find the records.
	xmlSample = 1 << 20
	// maxXMLDepth is deeper than any export nests.
	maxXMLDepth = 64
)

func newXMLReader(w *window, lim limits) (rowReader, error) {
	w.fill(xmlSample)
	x := &xmlReader{w: w, lim: lim, table: newColumnTable()}
	x.record, x.level = findRecordElement(w.bytes())
	if x.record == "" {
		return nil, fmt.Errorf("XML without an element that holds an id, a date or a narrative, in its attributes or in elements below it")
	}
	return x, nil
}

// looksXML tells whether a file that begins like this is XML. Web pages have
// been refused before.
func looksXML(head []byte) bool {
	head = bytes.TrimLeft(head, jsonSpace)
	return len(head) > 1 && head[0] == '<' && (head[1] == '?' || head[1] == '!' || xmlNameByte(head[1]))
}

func xmlNameByte(c byte) bool {
	return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c == '_' || c == ':' || c >= 0x80
}

// findRecordElement finds the element whose attributes and direct children
// have the most known header words; of equals the outer one.
func findRecordElement(head []byte) (name string, level int) {
	type place struct {
		level int
		name  string
	}
	known := map[place]map[string]bool{}
	var order []place
	note := func(p place, word string) {
		field, _ := lookupHeader(word)
		if field == "" {
			return
		}
		if known[p] == nil {
			known[p] = map[string]bool{}
			order = append(order, p)
		}
		known[p][field] = true
	}
	d := xml.NewDecoder(bytes.NewReader(head))
	d.Strict = false
	d.CharsetReader = decodedAlready
	var open []place
	for len(open) < maxXMLDepth {
		token, err := d.RawToken()
		if err != nil {
			break // the end of what is looked at, most often inside a record
		}
		switch t := token.(type) {
		case xml.StartElement:
			if len(open) > 0 {
				note(open[len(open)-1], t.Name.Local)
			}
			p := place{len(open), t.Name.Local}
			for _, a := range t.Attr {
				note(p, a.Name.Local)
			}
			open = append(open, p)
		case xml.EndElement:
			if len(open) > 0 {
				open = open[:len(open)-1]
			}
		}
	}
	most := 0
	for _, p := range order {
		if n := len(known[p]); n > most || n == most && p.level < level {
			name, level, most = p.name, p.level, n
		}
	}
	return name, level
}

// decodedAlready takes the place of a document's own character set: the text
// has been decoded before it was looked at.
func decodedAlready(_ string, in io.Reader) (io.Reader, error) { return in, nil }

func (x *xmlReader) columns() *columnTable { return x.table }

func (x *xmlReader) next() (row, error) {
	for {
		r, found, err := x.element()
		if err != nil {
			return r, err
		}
		if found {
			if r.reason == "" {
				x.decode(&r)
			}
			return r, nil
		}
	}
}

// element takes the next piece of markup with the text before it. If it
// begins a record, it takes the whole record and found is true.
func (x *xmlReader) element() (r row, found bool, err error) {
	for { // text between the elements
		data := x.w.bytes()
		if i := bytes.IndexByte(data, '<'); i >= 0 {
			x.w.take(i)
			break
		}
		x.w.take(len(data))
		if !x.w.more() {
			return row{}, false, x.end()
		}
	}
	r.line = x.w.line
	var scan xmlScan
	size, record := 0, false
	frame := recordFrame{name: x.record}
	for {
		n, event := scan.step(x.w.bytes()[size:])
		size += n
		if !record && event != xmlMore {
			record = x.depth == x.level && (event == xmlOpened || event == xmlEmpty) && scan.local() == x.record
		}
		done := event != xmlMore && (!record || frame.closes(event, &scan))
		switch {
		case size > x.lim.maxRow && (record || event == xmlMore):
			return x.spoolElement(r, &scan, &frame, size, done)
		case done && record:
			r.raw = bytes.Clone(x.w.take(size))
			return r, true, nil
		case done:
			switch event {
			case xmlOpened:
				x.depth++
			case xmlClosed:
				x.depth = max(0, x.depth-1)
			}
			x.w.take(size)
			return row{}, false, nil
		case event == xmlMore && !x.w.more():
			if err := x.w.fault(); err != nil {
				return row{}, false, err
			}
			r.reason = "XML cut short: what begins here never ends"
			r.raw = bytes.Clone(x.w.take(size))
			return r, true, nil
		}
	}
}

// recordFrame finds the end of a record by the tags of its own name only, so
// that a tag inside that is never closed costs no other record.
type recordFrame struct {
	name string
	open int
}

// closes takes a tag and tells whether the record ends with it.
func (f *recordFrame) closes(event xmlEvent, scan *xmlScan) bool {
	if scan.local() == f.name {
		switch event {
		case xmlOpened:
			f.open++
		case xmlClosed:
			f.open--
		}
	}
	return f.open <= 0
}

// end tells how the file ends.
func (x *xmlReader) end() error {
	switch {
	case x.w.fault() != nil:
		return x.w.fault()
	case x.depth > 0:
		x.depth = 0
		return fmt.Errorf("the XML is not closed; the file may be cut short")
	}
	return io.EOF
}

// spoolElement spools an element of which size bytes are scanned; done says
// that it ends with them.
func (x *xmlReader) spoolElement(r row, scan *xmlScan, frame *recordFrame, size int, done bool) (row, bool, error) {
	path, total, err := x.w.spool(x.lim.dir, func(b []byte) (int, bool) {
		at := size // behind what is scanned
		size = 0
		for at < len(b) && !done {
			n, event := scan.step(b[at:])
			at += n
			done = event != xmlMore && frame.closes(event, scan)
		}
		return at, done
	})
	r.spool, r.reason = path, x.lim.tooLarge(total)
	return r, true, err
}

// decode reads the element of a row into cells, or gives the row a reason.
// A cell is named by the elements around it, the record's own left out, as in
// "aircraft / make"; what repeats is numbered. Text and markup inside an
// element that is a narrative belong to it.
func (x *xmlReader) decode(r *row) {
	if r.reason = oddByte(r.raw); r.reason != "" {
		return
	}
	d := xml.NewDecoder(bytes.NewReader(r.raw))
	d.CharsetReader = decodedAlready
	e := elementDecoder{table: x.table, used: map[string]bool{}, next: map[string]int{}}
	for {
		token, err := d.Token()
		if err == io.EOF {
			break
		}
		if err == nil {
			err = e.token(token)
		}
		if err != nil {
			r.reason = "broken XML: " + strings.TrimPrefix(err.Error(), "XML syntax error on ")
			return
		}
	}
	r.cells = e.cells
}

// elementDecoder turns the tokens of one record into cells.
type elementDecoder struct {
	table *columnTable
	cells []cell
	used  map[string]bool // names of the cells
	next  map[string]int
	open  []openElement
}

// openElement is one element of the path to the token at hand, the record's
// own first.
type openElement struct {
	name    string // joined with those around it; "" for the record
	text    []byte
	parent  bool // has elements below it
	telling bool // is a narrative
}

func (e *elementDecoder) token(token xml.Token) error {
	switch t := token.(type) {
	case xml.StartElement:
		return e.start(t)
	case xml.CharData:
		if n := len(e.open); n > 0 {
			e.open[n-1].text = append(e.open[n-1].text, t...)
		}
	case xml.EndElement:
		e.finish()
	}
	return nil
}

func (e *elementDecoder) start(t xml.StartElement) error {
	if len(e.open) == maxXMLDepth {
		return fmt.Errorf("more than %d elements in one another", maxXMLDepth)
	}
	name, within := "", false
	if n := len(e.open); n > 0 {
		above := &e.open[n-1]
		above.parent, within = true, above.telling
		name = t.Name.Local
		if above.name != "" {
			name = above.name + " / " + name
		}
	}
	// <narrative kind="cause"> is a narrative of that kind.
	for _, a := range t.Attr {
		if a.Name.Local != "kind" && a.Name.Local != "type" && a.Name.Local != "name" {
			continue
		}
		if field, _ := lookupHeader(name + " " + a.Value); strings.HasPrefix(field, narrativeOf) && name != "" {
			name += " " + a.Value
		}
	}
	for _, a := range t.Attr {
		if a.Name.Space == "xmlns" || a.Name.Local == "xmlns" || within {
			continue
		}
		joined := a.Name.Local
		if name != "" {
			joined = name + " / " + joined
		}
		e.add(joined, a.Value)
	}
	field, _ := lookupHeader(name)
	telling := within || name != "" && (field == toNarrative || strings.HasPrefix(field, narrativeOf))
	e.open = append(e.open, openElement{name: name, telling: telling})
	return nil
}

func (e *elementDecoder) finish() {
	n := len(e.open) - 1
	if n < 0 {
		return
	}
	done := &e.open[n]
	e.open = e.open[:n]
	text := string(done.text)
	if n > 0 && e.open[n-1].telling {
		e.open[n-1].text = append(e.open[n-1].text, text...)
		return
	}
	if strings.TrimSpace(text) == "" {
		if !done.parent {
			e.add(done.name, "")
		}
		return
	}
	if !done.telling || done.parent {
		text = strings.TrimSpace(text) // indentation
	}
	e.add(done.name, text)
}

func (e *elementDecoder) add(name, text string) {
	if name == "" {
		if strings.TrimSpace(text) == "" {
			return
		}
		name = "text"
	}
	if e.used[name] {
		name = unusedName(name, e.used, e.next)
	}
	e.used[name] = true
	e.cells = append(e.cells, cell{column: e.table.at(name), name: name, text: decodeEntities(text)})
}

// xmlScan finds the ends of tags, comments and the like, chunk by chunk,
// without checking what is in them.
type xmlScan struct {
	state   int
	name    []byte // of the tag begun last, cut where it is long
	naming  bool   // the name goes on
	slash   bool   // the last byte of the tag was a slash
	quote   byte
	nesting int    // square brackets of a document type
	tail    []byte // the last two bytes of a comment or the like
}

const (
	inXMLText = iota
	inXMLMark // behind "<"
	inXMLTag
	inXMLEndTag
	inXMLInstruction
	inXMLBang // behind "<!"
	inXMLComment
	inXMLData
	inXMLDoctype
)

// xmlEvent is what step stopped at.
type xmlEvent int

const (
	xmlMore   xmlEvent = iota // the end of the bytes
	xmlOpened                 // a start tag
	xmlEmpty                  // an element of one tag
	xmlClosed                 // an end tag
	xmlOther                  // anything else: text, a comment, an instruction
)

// maxXMLName bounds what is remembered of a name.
const maxXMLName = 256

// local is the tag's name without its namespace.
func (s *xmlScan) local() string {
	name := string(s.name)
	return name[strings.LastIndexByte(name, ':')+1:]
}

// step reads to the end of the next piece of markup.
func (s *xmlScan) step(b []byte) (int, xmlEvent) {
	for i := 0; i < len(b); i++ {
		c := b[i]
		switch s.state {
		case inXMLText:
			skip := bytes.IndexByte(b[i:], '<')
			if skip < 0 {
				return len(b), xmlMore
			}
			i += skip
			s.state = inXMLMark
			s.name, s.naming, s.slash = s.name[:0], true, false
		case inXMLMark:
			switch c {
			case '/':
				s.state = inXMLEndTag
			case '?':
				s.begin(inXMLInstruction)
			case '!':
				s.begin(inXMLBang)
			default:
				s.state = inXMLTag
				s.naming = true
				i--
			}
		case inXMLTag:
			if s.inTag(c) {
				s.state = inXMLText
				if s.slash {
					return i + 1, xmlEmpty
				}
				return i + 1, xmlOpened
			}
		case inXMLEndTag:
			if s.inTag(c) {
				s.state = inXMLText
				return i + 1, xmlClosed
			}
		default:
			if s.inOther(c) {
				s.state = inXMLText
				return i + 1, xmlOther
			}
		}
	}
	return len(b), xmlMore
}

func (s *xmlScan) begin(state int) {
	s.state, s.tail, s.nesting, s.quote = state, s.tail[:0], 0, 0
}

// inTag takes a byte of a start tag and tells whether the tag ends with it.
func (s *xmlScan) inTag(c byte) bool {
	if s.quote != 0 {
		if c == s.quote {
			s.quote = 0
		}
		return false
	}
	if c == '>' {
		return true
	}
	s.slash = c == '/'
	switch {
	case c == '"' || c == '\'':
		s.quote = c
	case bytes.IndexByte([]byte("/"+jsonSpace), c) >= 0:
		s.naming = false
	case s.naming && len(s.name) < maxXMLName:
		s.name = append(s.name, c)
	}
	return false
}

// inOther takes a byte of an instruction, a comment, character data or a
// document type and tells whether it ends with it.
func (s *xmlScan) inOther(c byte) bool {
	ends := false
	switch s.state {
	case inXMLInstruction:
		ends = c == '>' && bytes.HasSuffix(s.tail, []byte("?"))
	case inXMLComment:
		ends = c == '>' && bytes.HasSuffix(s.tail, []byte("--"))
	case inXMLData:
		ends = c == '>' && bytes.HasSuffix(s.tail, []byte("]]"))
	case inXMLBang:
		switch {
		case c == '-' && string(s.tail) == "-":
			s.begin(inXMLComment)
			return false
		case c == '[' && len(s.tail) == 0:
			s.begin(inXMLData)
			return false
		case c != '-':
			s.begin(inXMLDoctype)
		}
	case inXMLDoctype:
		switch {
		case s.quote != 0:
			if c == s.quote {
				s.quote = 0
			}
		case c == '"' || c == '\'':
			s.quote = c
		case c == '[':
			s.nesting++
		case c == ']':
			s.nesting--
		case c == '>':
			ends = s.nesting <= 0
		}
	}
	if len(s.tail) == 2 {
		s.tail = append(s.tail[:0], s.tail[1], c)
	} else {
		s.tail = append(s.tail, c)
	}
	return ends
}
