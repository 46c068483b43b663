package table

import (
	"encoding/csv"
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestCSVText(t *testing.T) {
	for _, c := range []struct {
		cell Cell
		want string
	}{
		{nil, ""},
		{math.NaN(), ""},
		{math.Inf(-1), ""},
		{2632000.0, "2632000"},
		{0.00003, "0.00003"},
		{3e-9, "3e-09"},
		{1e21, "1e+21"},
		{-4.785, "-4.785"}, // a number is never taken for a formula
		{-3, "-3"},
		{math.Nextafter(0.3, 1), "0.30000000000000004"},
		{"=1+1", "'=1+1"},
		{"+1", "'+1"},
		{"-1", "'-1"},
		{"@x", "'@x"},
		{"\tx", "'\tx"},
		{"\rx", "'\rx"},
		{"1=1", "1=1"},
	} {
		if got := csvText(c.cell); got != c.want {
			t.Errorf("%#v = %q, want %q", c.cell, got, c.want)
		}
	}
}

func TestCSVNumbersReadBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64().Draw(t, "v")
		got, err := strconv.ParseFloat(plainNumber(v), 64)
		if err != nil || got != v {
			t.Fatalf("%v is written %q, which reads back as %v (%v)", v, plainNumber(v), got, err)
		}
	})
}

// The body is rows only; what else the table says goes to the notes, a line
// each. A header can come from a user's file, so it is defused as well.
func TestCSVBodyAndWhatStandsBeside(t *testing.T) {
	x := example()
	x.Columns[0].Name = "=HYPERLINK(1)"
	var b, beside strings.Builder
	if err := Write(&b, x, "csv", Options{Notes: &beside}); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(strings.NewReader(b.String())).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 1+len(x.Rows) || rows[0][0] != "'=HYPERLINK(1)" {
		t.Errorf("rows %q", rows)
	}
	for _, want := range []string{"table: slow-airspeed by year | <b>\n", "test: trend: p 0.04 estimate -4.785 (-5.603 to -3.96); two-sided\n", "note: small numbers: 1 of 3 rows\n"} {
		if !strings.Contains(beside.String(), want) {
			t.Errorf("beside the rows stands %q, want %q", beside.String(), want)
		}
	}
}
