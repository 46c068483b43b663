package table

import (
	"encoding/csv"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// writeCSV writes RFC 4180 with full precision. Text that a spreadsheet would
// run as a formula gets an apostrophe before it; numbers stay as they are.
func writeCSV(w io.Writer, t *Table, o Options) error {
	c := csv.NewWriter(w)
	c.UseCRLF = true
	var row []string
	for _, col := range t.Columns {
		row = append(row, col.Name)
	}
	if err := c.Write(row); err != nil {
		return err
	}
	for _, r := range t.Rows {
		row = row[:0]
		for _, cell := range r {
			row = append(row, csvText(cell))
		}
		if err := c.Write(row); err != nil {
			return err
		}
	}
	c.Flush()
	if err := c.Error(); err != nil || o.Notes == nil {
		return err
	}
	for _, n := range t.Notes {
		if _, err := fmt.Fprintf(o.Notes, "note: %s\n", Clean(n)); err != nil {
			return err
		}
	}
	return nil
}

func csvText(c Cell) string {
	if unknown(c) {
		return ""
	}
	switch v := c.(type) {
	case int:
		return strconv.Itoa(v)
	case float64:
		return strconv.FormatFloat(v, 'g', -1, 64)
	}
	s := fmt.Sprint(c)
	if s != "" && strings.IndexByte("=+-@\t\r", s[0]) >= 0 {
		s = "'" + s
	}
	return s
}
