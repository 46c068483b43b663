package table

import (
	"encoding/csv"
	"encoding/json"
	"errors"
	"flag"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the golden files anew")

// example holds one of everything, hostile text included.
func example() *Table {
	nan := math.NaN()
	return &Table{
		Title:   "slow-airspeed by year | <b>",
		Columns: []Column{{"period", ""}, {"count", "count"}, {"exposure", "hours"}, {"rate", "rate"}, {"rate_low", "rate"}, {"rate_high", "rate"}, {"share", "share"}, {"share_low", "share"}, {"share_high", "share"}, {"signal", ""}},
		Rows: [][]Cell{
			{"2019", 1037, 12345.6, 3.875379, 3.159909, 4.704447, 37.0 / 412, 0.0658, 0.1214, nil},
			{"=1+1", 0, nan, nan, nan, nan, nil, nil, nil, nil},
			{"a\x1b[31mb\u202ec", 5, 100.0, 0.05, 0.012, 0.0999, 1.0, 0.5655, 1.0, nil},
		},
		Tests: []Test{{Name: "trend", Statistic: nan, P: 0.04, Estimate: -4.785, Low: -5.603, High: -3.96, Convention: "two-sided"}},
		Notes: []string{"small numbers: 1 of 3 rows", strings.Repeat("a long note ", 15)},
	}
}

func TestGolden(t *testing.T) {
	for _, format := range []string{"text", "csv", "json", "md"} {
		var b strings.Builder
		if err := Write(&b, example(), format, Options{Width: 90}); err != nil {
			t.Fatal(err)
		}
		path := filepath.Join("testdata", "example."+format)
		if *update {
			if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if b.String() != string(want) {
			t.Errorf("%s:\n%s\nwant\n%s", format, b.String(), want)
		}
	}
}

func TestTextFitsAndIsSafe(t *testing.T) {
	for _, width := range []int{60, 90, 140} {
		var b strings.Builder
		if err := Write(&b, example(), "text", Options{Width: width}); err != nil {
			t.Fatal(err)
		}
		for _, line := range strings.Split(b.String(), "\n") {
			if n := len([]rune(line)); n > width {
				t.Errorf("%d columns in a terminal of %d: %q", n, width, line)
			}
		}
		if strings.ContainsAny(b.String(), "\x1b\u202e") {
			t.Error("control characters reach the terminal")
		}
		if strings.Contains(b.String(), "signal") {
			t.Error("a column in which nothing is known is shown")
		}
	}
}

func TestCSVKeepsPrecisionAndDefusesFormulas(t *testing.T) {
	var b, notes strings.Builder
	if err := Write(&b, example(), "csv", Options{Notes: &notes}); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(strings.NewReader(b.String())).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if rows[1][3] != "3.875379" || rows[2][0] != "'=1+1" || rows[2][3] != "" || !strings.Contains(notes.String(), "small numbers") {
		t.Errorf("rows %q, notes %q", rows, notes.String())
	}
}

func TestJSONShape(t *testing.T) {
	var b strings.Builder
	if err := Write(&b, &Table{}, "json", Options{}); err != nil {
		t.Fatal(err)
	}
	if got, want := strings.TrimSpace(b.String()), `{"title":"","columns":[],"rows":[],"tests":[],"notes":[]}`; got != want {
		t.Errorf("an empty table is %s, want %s", got, want)
	}
	b.Reset()
	if err := Write(&b, example(), "json", Options{}); err != nil {
		t.Fatal(err)
	}
	var back struct {
		Rows  [][]any
		Tests []map[string]any
	}
	if err := json.Unmarshal([]byte(b.String()), &back); err != nil {
		t.Fatal(err)
	}
	if back.Rows[1][3] != nil || back.Rows[0][3] != 3.875379 || back.Tests[0]["statistic"] != nil || back.Tests[0]["p"] != 0.04 {
		t.Errorf("read back %v %v", back.Rows, back.Tests)
	}
}

func TestWriteRefuses(t *testing.T) {
	if err := Write(&strings.Builder{}, example(), "pdf", Options{}); !errors.Is(err, ErrFormat) || !strings.Contains(err.Error(), "csv, json, md, text") {
		t.Errorf("an unknown form: %v", err)
	}
	bad := example()
	bad.Rows[0] = bad.Rows[0][:3]
	if err := Write(&strings.Builder{}, bad, "text", Options{}); err == nil {
		t.Error("a ragged table must be refused")
	}
}
