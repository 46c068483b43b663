package table

import (
	"fmt"
	"strings"
	"testing"

	"github.com/jedib0t/go-pretty/v6/text"
)

// wide has more columns than a window takes, none of them to be shortened.
func wide(columns int) *Table {
	x := &Table{Rows: [][]Cell{{}, {}}}
	for i := range columns {
		x.Columns = append(x.Columns, Column{Name: fmt.Sprintf("column%02d", i)})
		x.Rows[0] = append(x.Rows[0], fmt.Sprintf("%03d-checklist", i))
		x.Rows[1] = append(x.Rows[1], fmt.Sprintf("%03d-skipped", i))
	}
	return x
}

func TestWideTablesGoOnBelow(t *testing.T) {
	for _, width := range []int{20, 40, 80, 100} {
		var b strings.Builder
		if err := Write(&b, wide(15), "text", Options{Width: width}); err != nil {
			t.Fatal(err)
		}
		for _, line := range strings.Split(b.String(), "\n") {
			if n := text.StringWidth(line); n > width {
				t.Errorf("%d columns in a window of %d: %q", n, width, line)
			}
		}
		if width < 40 { // there words must be cut
			continue
		}
		for i := range 15 {
			if cell := fmt.Sprintf("%03d-checklist", i); !strings.Contains(b.String(), cell) {
				t.Errorf("width %d: %s is lost or cut", width, cell)
			}
		}
		if got := strings.Count(b.String(), "000-checklist"); got != strings.Count(b.String(), "column00") || got < 2 {
			t.Errorf("width %d: the first column is not repeated in each part", width)
		}
	}
}

// A factor's name is not cut while other columns can give room.
func TestNamesStayWhole(t *testing.T) {
	x := &Table{
		Columns: []Column{{Name: "factor"}, {Name: "meaning"}},
		Rows:    [][]Cell{{"a-name-of-exactly-30-letters-x", "a long meaning that can be broken at any of its many blanks"}},
	}
	var b strings.Builder
	if err := Write(&b, x, "text", Options{Width: 60}); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(b.String(), "a-name-of-exactly-30-letters-x") {
		t.Errorf("the name is cut:\n%s", b.String())
	}
}

// Letters two columns wide are counted as two.
func TestWideLetters(t *testing.T) {
	x := &Table{Columns: []Column{{Name: "place"}, {Name: "n", Unit: "count"}}, Rows: [][]Cell{{"漢字漢字", 1}, {"ab", 2}}}
	var b strings.Builder
	if err := Write(&b, x, "text", Options{}); err != nil {
		t.Fatal(err)
	}
	want := "place     n\n-----------\n漢字漢字  1\nab        2\n"
	if b.String() != want {
		t.Errorf("got\n%s\nwant\n%s", b.String(), want)
	}
}

// A row of hyphens is no rule and keeps its length.
func TestHyphensInACell(t *testing.T) {
	x := &Table{Columns: []Column{{Name: "x"}}, Rows: [][]Cell{{"----"}}}
	var b strings.Builder
	if err := Write(&b, x, "text", Options{}); err != nil {
		t.Fatal(err)
	}
	if want := "x\n----\n----\n"; b.String() != want {
		t.Errorf("got %q, want %q", b.String(), want)
	}
}

func TestEmptyTables(t *testing.T) {
	for name, x := range map[string]*Table{"nothing": {}, "no rows": {Columns: []Column{{Name: "period"}}}, "no columns": {Rows: [][]Cell{{}, {}}}} {
		for _, format := range []string{"text", "md", "csv", "json"} {
			if err := Write(&strings.Builder{}, x, format, Options{}); err != nil {
				t.Errorf("%s as %s: %v", name, format, err)
			}
		}
	}
}

func TestCellsOfOtherTypesAreRefused(t *testing.T) {
	x := &Table{Columns: []Column{{Name: "n"}}, Rows: [][]Cell{{int64(1)}}}
	err := Write(&strings.Builder{}, x, "csv", Options{})
	if err == nil || !strings.Contains(err.Error(), `column "n": a cell cannot hold a int64`) {
		t.Errorf("an int64: %v", err)
	}
}
