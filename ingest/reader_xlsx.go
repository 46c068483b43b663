package ingest

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"os"
	"strings"
	"unicode/utf8"

	"github.com/xuri/excelize/v2"
)

// xlsxReader reads the rows of one sheet of a workbook: the sheet with the
// most known words in its header. Row numbers of the sheet stand for lines.
type xlsxReader struct {
	book   *excelize.File
	rows   *excelize.Rows
	lim    limits
	table  *columnTable
	header []byte // the header row or rows, as CSV
	sheet  string
	others []string // sheets that are not read
	ahead  []string // the row behind the header, when it has been read to see what it is
	line   int      // of the row read last
}

const (
	// maxWorkbook bounds what a workbook may unpack to; its sheets go through
	// temporary files.
	maxWorkbook = 4 << 30
	// maxPackedWorkbook bounds the file itself, which the library holds.
	maxPackedWorkbook = 256 << 20
	// maxHeaderRow is how far down a header may stand, below titles and the like.
	maxHeaderRow = 20
)

// isoDates makes cells that hold a date by the system's short form read the
// same everywhere.
var isoDates = excelize.Options{ShortDatePattern: "yyyy-mm-dd", LongDatePattern: "yyyy-mm-dd"}

// looksXLSX tells whether an archive that begins like this is a workbook.
func looksXLSX(head []byte) bool {
	return bytes.HasPrefix(head, []byte(zipMagic)) &&
		(bytes.Contains(head, []byte("xl/")) || bytes.Contains(head, []byte("[Content_Types].xml")) && !bytes.Contains(head, []byte("word/")) && !bytes.Contains(head, []byte("ppt/")))
}

// newXLSXReader opens a workbook, which must be seekable as its directory
// stands at its end.
func newXLSXReader(in io.Reader, lim limits) (x *xlsxReader, err error) {
	defer func() { // a workbook is taken apart by a library that trusts it
		if fault := recover(); fault != nil {
			x, err = nil, fmt.Errorf("a broken workbook: %v", fault)
		}
	}()
	opts := isoDates
	opts.UnzipSizeLimit, opts.UnzipXMLSizeLimit, opts.TmpDir = maxWorkbook, 16<<20, lim.dir
	packed := io.LimitedReader{R: in, N: maxPackedWorkbook + 1}
	book, err := excelize.OpenReader(&packed, opts)
	switch {
	case packed.N == 0:
		return nil, fmt.Errorf("a workbook of more than %d bytes: save the sheet as CSV", maxPackedWorkbook)
	case err != nil:
		return nil, fmt.Errorf("a broken workbook (%w): save it again, or as CSV", err)
	}
	x = &xlsxReader{book: book, lim: lim, table: newColumnTable()}
	if err := x.pickSheet(); err != nil {
		book.Close()
		return nil, err
	}
	return x, nil
}

// pickSheet opens the sheet whose header knows the most words.
func (x *xlsxReader) pickSheet() error {
	best, most, row := "", -1, 0
	sheets := x.book.GetSheetList()
	for _, name := range sheets {
		n, known := x.headerRow(name)
		if n > 0 && known > most {
			best, most, row = name, known, n
		}
	}
	if best == "" {
		return fmt.Errorf("a workbook without any row")
	}
	for _, name := range sheets {
		if name != best {
			x.others = append(x.others, name)
		}
	}
	x.sheet = best
	var err error
	if x.rows, err = x.book.Rows(best); err != nil {
		return fmt.Errorf("sheet %q: %w", best, err)
	}
	var names []string
	for x.line < row {
		if names, err = x.columnsOfNext(); err != nil {
			return err
		}
	}
	if len(names) > maxColumns {
		return fmt.Errorf("header: %d columns, more than the limit of %d", len(names), maxColumns)
	}
	x.header = asCSV(names)
	below, err := x.columnsOfNext()
	switch {
	case err == io.EOF:
	case err != nil:
		return err
	default:
		below = padded(below, len(names))
		if twoHeaderRows(names, below) {
			x.header = append(append(x.header, '\n'), asCSV(below)...)
			names = joinHeaderRows(names, below)
		} else {
			x.ahead = below
		}
	}
	x.table.header(names)
	return nil
}

// headerRow is the number of the row of a sheet that knows the most words, of
// its first rows, and how many it knows; 0 for a sheet without rows.
func (x *xlsxReader) headerRow(sheet string) (row, known int) {
	rows, err := x.book.Rows(sheet)
	if err != nil {
		return 0, 0
	}
	defer rows.Close()
	known = -1
	for n := 1; n <= maxHeaderRow && rows.Next(); n++ {
		cells, err := rows.Columns(isoDates)
		if err != nil {
			break
		}
		words := 0
		for _, c := range cells {
			if field, _ := lookupHeader(c); field != "" && len(c) < 100 {
				words++
			}
		}
		if words > known && strings.TrimSpace(strings.Join(cells, "")) != "" {
			row, known = n, words
		}
	}
	return row, known
}

// columnsOfNext returns the cells of the sheet's next row.
func (x *xlsxReader) columnsOfNext() (cells []string, err error) {
	defer func() {
		if fault := recover(); fault != nil {
			err = fmt.Errorf("a broken workbook: %v", fault)
		}
	}()
	if !x.rows.Next() {
		if err := x.rows.Error(); err != nil {
			return nil, fmt.Errorf("sheet %q: %w", x.sheet, err)
		}
		return nil, io.EOF
	}
	x.line++
	cells, err = x.rows.Columns(isoDates)
	if err != nil {
		return nil, fmt.Errorf("sheet %q, row %d: %w", x.sheet, x.line, err)
	}
	return cells, nil
}

func (x *xlsxReader) columns() *columnTable { return x.table }

func (x *xlsxReader) next() (row, error) {
	for {
		texts := x.ahead
		if x.ahead = nil; texts == nil {
			var err error
			if texts, err = x.columnsOfNext(); err != nil {
				return row{}, err
			}
		}
		if strings.TrimSpace(strings.Join(texts, "")) == "" {
			continue
		}
		return x.row(texts)
	}
}

// row is a row of cells; its raw form is a line of CSV, so that with the
// header above it a row that was set aside makes a file again.
func (x *xlsxReader) row(texts []string) (row, error) {
	texts = padded(texts, len(x.table.names))
	r := row{line: x.line, raw: asCSV(texts)}
	if len(r.raw) > x.lim.maxRow {
		path, err := spoolBytes(x.lim.dir, r.raw)
		r.spool, r.reason, r.raw = path, x.lim.tooLarge(int64(len(r.raw))), nil
		return r, err
	}
	if r.reason = ragged(texts, len(x.table.names)); r.reason != "" {
		return r, nil
	}
	r.cells = make([]cell, len(x.table.names))
	for i, name := range x.table.names {
		text := texts[i]
		if !utf8.ValidString(text) {
			r.reason, r.cells = "not UTF-8 in column "+name, nil
			return r, nil
		}
		r.cells[i] = cell{column: i, name: name, text: decodeEntities(text)}
	}
	return r, nil
}

// padded adds blank cells up to a width: a workbook leaves them out.
func padded(texts []string, width int) []string {
	for len(texts) < width {
		texts = append(texts, "")
	}
	return texts
}

// asCSV is a row as RFC 4180 has it, without its line break.
func asCSV(cells []string) []byte {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	w.Write(cells) // writing to memory does not fail
	w.Flush()
	return bytes.TrimSuffix(b.Bytes(), []byte{'\n'})
}

// spoolBytes writes a row that is too large to a temporary file.
func spoolBytes(dir string, b []byte) (string, error) {
	out, err := os.CreateTemp(dir, "row-*")
	if err != nil {
		return "", fmt.Errorf("set a large row aside: %w", err)
	}
	_, err = out.Write(b)
	if closing := out.Close(); err == nil {
		err = closing
	}
	if err != nil {
		os.Remove(out.Name())
		return "", fmt.Errorf("set a large row aside: %w", err)
	}
	return out.Name(), nil
}

// Close removes the workbook's temporary files.
func (x *xlsxReader) Close() error {
	if x.rows != nil {
		x.rows.Close()
	}
	return x.book.Close()
}
