package ingest

import (
	"bytes"
	"io"
	"path/filepath"
	"strings"
)

// textReader reads one report from one file of plain text or Markdown: an
// optional head of lines "key: value", also between two lines "---", then a
// blank line and the report in the reporter's own words.
type textReader struct {
	w     *window
	lim   limits
	table *columnTable
	done  bool
}

func newTextReader(w *window, lim limits) (rowReader, error) {
	return &textReader{w: w, lim: lim, table: newColumnTable()}, nil
}

// bodyColumn names the text below the head.
const bodyColumn = "narrative"

func (t *textReader) columns() *columnTable { return t.table }

func (t *textReader) next() (row, error) {
	if t.done {
		return row{}, io.EOF
	}
	t.done = true
	r := row{line: t.w.line}
	t.w.fill(t.lim.maxRow + 1)
	if err := t.w.fault(); err != nil {
		return row{}, err
	}
	if len(t.w.bytes()) > t.lim.maxRow {
		path, size, err := t.w.spool(t.lim.dir, func(b []byte) (int, bool) { return len(b), false })
		r.spool, r.reason = path, t.lim.tooLarge(size)
		return r, err
	}
	r.raw = bytes.Clone(t.w.take(len(t.w.bytes())))
	if r.reason = oddByte(r.raw); r.reason != "" {
		return r, nil
	}
	head, body := splitHead(string(r.raw))
	next := map[string]int{}
	for _, pair := range append(head, [2]string{bodyColumn, strings.TrimRight(body, "\r\n\t ")}) {
		name := unusedName(pair[0], t.table.index, next)
		r.cells = append(r.cells, cell{column: t.table.at(name), name: name, text: pair[1]})
	}
	return r, nil
}

// splitHead cuts the head off a report. Without a known key there is none.
func splitHead(text string) (head [][2]string, body string) {
	rest := text
	fenced := false
	known := false
	for n := 0; len(head) < maxColumns; n++ {
		line, more, _ := strings.Cut(rest, "\n")
		bare := strings.TrimSpace(line)
		switch {
		case n == 0 && bare == "---":
			fenced = true
			rest = more
			continue
		case bare == "" && !fenced, fenced && bare == "---":
			if !known {
				return nil, text
			}
			return head, strings.TrimLeft(more, "\r\n")
		}
		key, value, ok := strings.Cut(bare, ":")
		key = strings.TrimSpace(strings.TrimLeft(key, "#*-"))
		if !ok || key == "" || len(key) > 60 {
			if known && n > 0 && !fenced { // the report follows without a blank line
				return head, rest
			}
			return nil, text
		}
		if field, _ := lookupHeader(key); field != "" {
			known = true
		}
		head = append(head, [2]string{key, strings.TrimSpace(value)})
		if more == "" {
			break
		}
		rest = more
	}
	if !known {
		return nil, text
	}
	return head, ""
}

// looksReport tells whether a text is a report and no table: by its name, or,
// for a stream without one, by a head with a known key. A header of two known
// words makes a table of it all the same.
func looksReport(path string, head []byte) bool {
	line, _, _ := bytes.Cut(bytes.TrimLeft(head, "\r\n"), []byte{'\n'})
	mark := sniffDelimiter(line)
	s := splitter{delimiter: mark}
	s.scan(line, true)
	known := 0
	for _, word := range s.cells(string(line)) {
		if field, _ := lookupHeader(word); field != "" {
			known++
		}
	}
	if known > 1 {
		return false
	}
	switch strings.ToLower(filepath.Ext(strings.TrimSuffix(strings.ToLower(path), ".gz"))) {
	case ".txt", ".text", ".md", ".markdown":
		return known == 0 || bytes.IndexByte(line, ':') >= 0
	case "":
		pairs, _ := splitHead(string(head))
		return len(pairs) > 0
	}
	return false
}
