package table

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestCellText(t *testing.T) {
	for _, c := range []struct {
		cell Cell
		unit string
		want string
	}{
		{nil, "count", "–"},
		{math.NaN(), "rate", "–"},
		{math.Inf(1), "rate", "–"},
		{1234567, "count", "1,234,567"},
		{-1234, "", "-1,234"},
		{999, "count", "999"},
		{2632000.0, "hours", "2,632,000"},
		{1e30, "hours", "1,000,000,000,000,000,019,884,624,838,656"}, // the float64 nearest to 1e30
		{0.09, "share", "9.0%"},
		{1.0, "share", "100.0%"},
		{0.0, "rate", "0.0"},
		{-0.00000001, "rate", "0.000000"}, // no sign is left of nothing
		{3.8753799, "rate", "3.88"},
		{12345.6, "rate", "12,346"},
		{24.88, "rate", "24.9"},
		{0.05, "rate", "0.050"},
		{0.000031, "rate", "0.000031"}, // a small rate is not none
		{"a\x1b[31m", "", "a\uFFFD[31m"},
	} {
		if got := cellText(c.cell, c.unit); got != c.want {
			t.Errorf("%v in %q = %q, want %q", c.cell, c.unit, got, c.want)
		}
	}
}

func TestLimitsBehindAFigure(t *testing.T) {
	for _, c := range []struct {
		low, high Cell
		unit      string
		want      string
	}{
		{0.066, 0.121, "share", " (6.6-12.1)"},
		{3.1599, 4.7044, "rate", " (3.16-4.70)"},
		{-5.6, -3.9, "rate", " (-5.60 to -3.90)"},
		{-1.0, 2.0, "rate", " (-1.00 to 2.00)"},
		{1.1, math.Inf(1), "", " (1.10 or more)"},
		{nil, math.NaN(), "rate", ""},
		{1.1, nil, "rate", " (1.10-–)"},
	} {
		if got := limits(c.low, c.high, c.unit); got != c.want {
			t.Errorf("%v to %v in %q = %q, want %q", c.low, c.high, c.unit, got, c.want)
		}
	}
}

// Limits are folded only where a column has both; chart_low and chart_high are
// no limits of a column "chart" that is not there.
func TestFolding(t *testing.T) {
	s := forPeople(&Table{
		Columns: []Column{{"rate", "rate"}, {"rate_low", "rate"}, {"rate_high", "rate"}, {"chart_low", "rate"}, {"chart_high", "rate"}, {"share", "share"}, {"share_low", "share"}},
		Rows:    [][]Cell{{1.0, 0.5, 2.0, 0.1, 9.0, 0.5, 0.25}},
	})
	if got, want := strings.Join(s.header, "|"), "rate (range)|chart low|chart high|share|share low"; got != want {
		t.Errorf("header %q, want %q", got, want)
	}
	if got, want := strings.Join(s.rows[0], "|"), "1.00 (0.50-2.00)|0.10|9.00|50.0%|25.0%"; got != want {
		t.Errorf("row %q, want %q", got, want)
	}
}

// Whatever a narrative or a file's header holds, no form for people lets a
// control character through, and a line of the table stays a line.
func TestHostileTextIsHarmless(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		hostile := rapid.OneOf(rapid.String(), rapid.StringOf(rapid.SampledFrom([]rune("\x00\x07\x08\x1b[31m\u0085\u009b\u202e\u2066\u2028\r\n\t|`<b>"))))
		x := &Table{
			Title:   hostile.Draw(t, "title"),
			Columns: []Column{{hostile.Draw(t, "column"), ""}, {"n", "count"}},
			Rows:    [][]Cell{{hostile.Draw(t, "cell"), 1}},
			Tests:   []Test{{Name: hostile.Draw(t, "test"), Convention: hostile.Draw(t, "convention")}},
			Notes:   []string{hostile.Draw(t, "note")},
		}
		for _, format := range []string{"text", "md"} {
			var b strings.Builder
			if err := Write(&b, x, format, Options{}); err != nil {
				t.Fatal(err)
			}
			if i := strings.IndexFunc(b.String(), func(r rune) bool {
				return r != '\n' && strings.ContainsRune(Clean(string(r)), '\uFFFD') && r != '\uFFFD'
			}); i >= 0 {
				t.Fatalf("%s lets %q through", format, b.String()[i:])
			}
		}
	})
}
