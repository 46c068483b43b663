package table

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

// writeCSV writes RFC 4180 with full precision: a header and the rows, so that
// every program can read it. Title, tests and notes go to Options.Notes. Text
// that a spreadsheet would run as a formula gets an apostrophe before it;
// numbers stay as they are.
func writeCSV(w io.Writer, t *Table, o Options) error {
	c := csv.NewWriter(w)
	c.UseCRLF = true
	var row []string
	for _, col := range t.Columns {
		row = append(row, defused(col.Name))
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
	return writeBeside(o.Notes, t)
}

// writeBeside writes what stands beside the rows, a line each.
func writeBeside(w io.Writer, t *Table) error {
	var b strings.Builder
	if t.Title != "" {
		fmt.Fprintf(&b, "table: %s\n", Clean(t.Title))
	}
	for _, x := range t.Tests {
		fmt.Fprintf(&b, "test: %s\n", testText(x))
	}
	for _, n := range t.Notes {
		fmt.Fprintf(&b, "note: %s\n", Clean(n))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func csvText(c Cell) string {
	if unknown(c) {
		return ""
	}
	switch v := c.(type) {
	case int:
		return strconv.Itoa(v)
	case float64:
		return plainNumber(v)
	}
	return defused(fmt.Sprint(c))
}

// plainNumber writes a number in the fewest digits that read back as the same,
// with an exponent only where JSON has one too: 2632000, not 2.632e+06.
func plainNumber(v float64) string {
	if a := math.Abs(v); a != 0 && (a < 1e-6 || a >= 1e21) {
		return strconv.FormatFloat(v, 'e', -1, 64)
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

// defused puts an apostrophe before text that a spreadsheet takes for a
// formula (common practice, no source).
func defused(s string) string {
	if s != "" && strings.IndexByte("=+-@\t\r", s[0]) >= 0 {
		return "'" + s
	}
	return s
}
