package table

import (
	"errors"
	"fmt"
	"io"
	"maps"
	"math"
	"slices"
	"strings"
)

// Cell is a value of a table: string, int, float64, or nil for unknown; Write
// refuses any other type. A NaN or an infinity is unknown too.
type Cell any

// Column is a column's name and the unit of its numbers: count, share (a
// fraction, shown in percent), rate, hours, departures, or "" for none. The
// columns X_low and X_high hold the limits of column X.
type Column struct {
	Name string `json:"name"`
	Unit string `json:"unit"`
}

// Test is the result of a statistical test. NaN stands for what the test does
// not give.
type Test struct {
	Name                   string
	Statistic, P, Estimate float64
	Low, High              float64
	Convention             string // which of several usual ways it follows
}

// Table is the answer to a question.
type Table struct {
	Title   string
	Columns []Column
	Rows    [][]Cell
	Tests   []Test
	Notes   []string
}

// Options say how a table is shown.
type Options struct {
	Width int       // columns of the terminal; 0 for 100
	Notes io.Writer // where title, tests and notes go that a form has no room for (CSV); nil for nowhere
}

// ErrFormat is a form that is not known.
var ErrFormat = errors.New("no such form of output")

// formats are the forms, by the name that --as takes.
var formats = map[string]func(io.Writer, *Table, Options) error{
	"text": writeText,
	"csv":  writeCSV,
	"json": writeJSON,
	"md":   writeMarkdown,
}

// Write writes a table in a form.
func Write(w io.Writer, t *Table, format string, o Options) error {
	write, ok := formats[format]
	if !ok {
		return fmt.Errorf("%w: %q; there are %s", ErrFormat, format, strings.Join(slices.Sorted(maps.Keys(formats)), ", "))
	}
	for n, row := range t.Rows {
		if len(row) != len(t.Columns) {
			return fmt.Errorf("table %q: row %d has %d cells for %d columns", t.Title, n+1, len(row), len(t.Columns))
		}
		for i, c := range row {
			switch c.(type) {
			case nil, string, int, float64:
			default:
				return fmt.Errorf("table %q: row %d, column %q: a cell cannot hold a %T", t.Title, n+1, t.Columns[i].Name, c)
			}
		}
	}
	if o.Width <= 0 {
		o.Width = 100
	}
	if err := write(w, t, o); err != nil {
		return fmt.Errorf("write table: %w", err)
	}
	return nil
}

// unknown tells whether a cell holds nothing.
func unknown(c Cell) bool {
	if f, ok := c.(float64); ok {
		return math.IsNaN(f) || math.IsInf(f, 0)
	}
	return c == nil
}
