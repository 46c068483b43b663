package ingest

import (
	"fmt"
	"strings"
	"unicode/utf8"

	"catena/ingest/corpus"
)

// row is one record as a reader found it.
type row struct {
	line   int
	raw    []byte // as read, without the line break or comma that ends it
	spool  string // the file that holds a row over the limit; raw is then nil
	reason string // why the row is set aside; "" when cells hold its content
	cells  []cell
}

// cell is one named value of a row.
type cell struct {
	column int    // index into the column table; -1 for a name that it has no room for
	name   string // as in the table
	text   string // the decoded text; compact JSON for a nested value
	nested bool   // text is JSON
	parts  *parts // what a nested key of the occurrence record holds
}

// parts are the nested values of the occurrence record.
type parts struct {
	narratives []corpus.Narrative
	codes      []corpus.Code
	aircraft   []corpus.Aircraft
	extra      []cell
}

// rowReader yields the rows of one file in their order.
type rowReader interface {
	// next returns the next row and io.EOF after the last. Any other error
	// is a fault: nothing can be read after it.
	next() (row, error)
	// columns are the columns seen so far; later rows may add to them.
	columns() *columnTable
}

// limits bound what one row may take.
type limits struct {
	maxRow int    // bytes held in memory
	dir    string // where larger rows are spooled

	delimiter byte // of a table, as a person told it; 0 to see from the header
}

// tooLarge is the reason for a row over the limit.
func (l limits) tooLarge(size int64) string {
	return fmt.Sprintf("a row of %d bytes, more than the limit of %d", size, l.maxRow)
}

// oddByte tells why raw cannot be read as text, or "".
func oddByte(raw []byte) string {
	if utf8.Valid(raw) {
		return ""
	}
	at := 0
	for at < len(raw) {
		r, n := utf8.DecodeRune(raw[at:])
		if r == utf8.RuneError && n == 1 {
			break
		}
		at += n
	}
	return fmt.Sprintf("not UTF-8 at byte %d of the row", at+1)
}

// columnTable names the columns of a file. No two have the same name: a
// repeated name gets a number and an empty one its place.
type columnTable struct {
	names []string
	index map[string]int
	next  map[string]int // name -> the number that its next repetition tries first
}

// maxColumns bounds the table for files in which every row has new keys.
const maxColumns = 10_000

func newColumnTable() *columnTable {
	return &columnTable{index: map[string]int{}, next: map[string]int{}}
}

// header adds the columns of a header row.
func (t *columnTable) header(cells []string) {
	for i, name := range cells {
		name = strings.TrimSpace(strings.ToValidUTF8(name, "\uFFFD"))
		if name == "" {
			name = fmt.Sprintf("column %d", i+1)
		}
		t.add(unusedName(name, t.index, t.next))
	}
}

// unusedName is name, or name with the first number that makes it new among
// the keys of used. The map next remembers how far each name has counted.
func unusedName[V any](name string, used map[string]V, next map[string]int) string {
	if _, taken := used[name]; !taken {
		return name
	}
	for n := max(2, next[name]); ; n++ {
		numbered := fmt.Sprintf("%s (%d)", name, n)
		if _, taken := used[numbered]; !taken {
			next[name] = n + 1
			return numbered
		}
	}
}

func (t *columnTable) add(name string) int {
	t.index[name] = len(t.names)
	t.names = append(t.names, name)
	return len(t.names) - 1
}

// at finds or adds the column of a name; -1 when the table is full.
func (t *columnTable) at(name string) int {
	if i, ok := t.index[name]; ok {
		return i
	}
	if len(t.names) == maxColumns {
		return -1
	}
	return t.add(strings.Clone(name))
}
