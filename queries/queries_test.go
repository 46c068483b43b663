package queries

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"catena/classify/catalogue"
	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries/filter"
	"catena/queries/table"
)

// records makes a stream of what the store would give.
func records(all ...store.Counted) Records {
	return func(yield func(*store.Counted, error) bool) {
		for i := range all {
			all[i].Key = int64(i + 1)
			if !yield(&all[i], nil) {
				return
			}
		}
	}
}

func event(source, date, place string, told ...string) store.Counted {
	d, err := corpus.ParseDate(date)
	if err != nil {
		panic(err)
	}
	return store.Counted{Usable: true, Told: told, Path: told, Occurrence: corpus.Occurrence{
		Source: source, Date: d, Place: place, Event: "incident", Narratives: []corpus.Narrative{{Kind: "factual"}}}}
}

func exposure(t *testing.T, covers, period string, hours float64, strata map[string]string) corpus.Exposure {
	t.Helper()
	p, err := corpus.ParsePeriod(period)
	if err != nil {
		t.Fatal(err)
	}
	return corpus.Exposure{Covers: covers, Period: p, Hours: hours, Departures: math.NaN(), Strata: strata}
}

func options(by string, factors ...string) TrendOptions {
	return TrendOptions{Scope: Scope{Tree: catalogue.Builtin()}, Factors: factors, By: by, Per: "hours", Scale: 100_000, Level: 0.95}
}

// cellOf finds a cell by the row's key and the column's name.
func cellOf(t *testing.T, x *table.Table, key, column string) table.Cell {
	t.Helper()
	c := slices.IndexFunc(x.Columns, func(c table.Column) bool { return c.Name == column })
	for _, r := range x.Rows {
		if r[0] == table.Cell(key) && c >= 0 {
			return r[c]
		}
	}
	t.Fatalf("no row %q or column %q in %v", key, column, x.Rows)
	return nil
}

func noted(x *table.Table, part string) bool {
	return slices.ContainsFunc(x.Notes, func(n string) bool { return strings.Contains(n, part) })
}

func TestTrendCountsAndShares(t *testing.T) {
	silent := event("a", "2021-03-01", "x")
	silent.Usable = false
	inferred := event("a", "2021-04-01", "x")
	inferred.Inferred = []string{"below-vmc"}
	x, err := Trend(records(
		event("a", "2019-05-01", "x", "below-vmc"), event("a", "2019-06", "x"), event("a", "2021-01-01", "x", "slow-airspeed", "stall"),
		silent, inferred, event("a", "2020", "x", "slow-airspeed"),
	), nil, options("quarter", "slow-airspeed"))
	if err != nil {
		t.Fatal(err)
	}
	// a child counts under its parent; empty quarters have rows; a year is not spread over quarters
	for key, want := range map[string][2]int{"2019-Q2": {1, 0}, "2019-Q3": {0, 0}, "2021-Q1": {1, 0}, "2021-Q2": {1, 1}, "undated": {1, 0}} {
		if got := cellOf(t, x, key, "count"); got != want[0] {
			t.Errorf("%s: count %v, want %d", key, got, want[0])
		}
		if got := cellOf(t, x, key, "inferred"); got != want[1] {
			t.Errorf("%s: inferred %v, want %d", key, got, want[1])
		}
	}
	if got := cellOf(t, x, "2021-Q1", "share"); got != 1.0 {
		t.Errorf("the share is %v; an occurrence without a narrative is no part of its denominator", got)
	}
	if len(x.Rows) != 10 || !noted(x, "1 occurrence with a date too coarse") || !noted(x, "small numbers: 10 of 10") {
		t.Errorf("%d rows, notes %q", len(x.Rows), x.Notes)
	}
	if r := cellOf(t, x, "2019-Q2", "rate").(float64); !math.IsNaN(r) {
		t.Errorf("a rate of %v without exposure", r)
	}
}

func TestRatesOnlyWhereExposureCovers(t *testing.T) {
	voluntary := event("talk", "2021-02-01", "x", "stall")
	voluntary.Occurrence.Event = "report"
	all := records(event("a", "2021-01-15", "North", "stall"), event("a", "2021-02-15", "South"), event("b", "2021-02-15", "North", "stall"), voluntary)
	north, south := map[string]string{"place": "North"}, map[string]string{"place": "South"}
	hours := []corpus.Exposure{
		exposure(t, "a", "2021-01", 400, north), exposure(t, "a", "2021-02", 600, north), exposure(t, "a", "2021-02", 1000, south), exposure(t, "talk", "2021-02", 5, nil),
	}
	for _, c := range []struct {
		name, by, only, key string
		rate                float64 // NaN for none
		note                string
	}{
		{"a source without exposure", "month", "source != talk", "2021-02", math.NaN(), `holds "b" too`},
		{"its own source", "month", "source = a", "2021-01", 250 * 100_000 / 100_000, "rates are per 100,000 hours"},
		{"two strata add up", "month", "source = a", "2021-02", 0, ""},
		{"one stratum", "month", "source = a and place = South", "2021-02", 0, ""},
		{"a field that exposure is not divided by", "month", "source = a and operation = training", "2021-01", math.NaN(), ""},
		{"a filter of occurrences only", "month", "source = a and not injury = fatal", "2021-01", 250, ""},
		{"a year covered in part", "year", "source = a", "2021", math.NaN(), "do not cover the whole"},
		{"by stratum", "place", "source = a", "North", 100, ""},
		{"by another field", "operation", "source = a", "unknown", math.NaN(), "not divided by operation"},
		{"voluntary reports not by default", "month", "source = talk or source = a", "2021-02", math.NaN(), "voluntary reports"},
		{"voluntary reports by name", "month", "source = talk", "2021-02", 20000, "better reporting"},
		{"voluntary reports beside others", "source", "source = talk or source = a", "talk", math.NaN(), ""},
		{"their neighbours have a rate", "source", "source = talk or source = a", "a", 50, ""},
	} {
		o := options(c.by, "stall")
		var err error
		if o.Only, err = filter.Parse(c.only, filter.Vocabulary{Factors: o.Tree.IDs()}); err != nil {
			t.Fatal(err)
		}
		x, err := Trend(all, hours, o)
		if err != nil {
			t.Fatal(err)
		}
		if c.note != "" && !noted(x, c.note) {
			t.Errorf("%s: notes %q, want %q", c.name, x.Notes, c.note)
		}
		if len(x.Rows) == 0 {
			continue // the filter lets nothing through
		}
		got := cellOf(t, x, c.key, "rate").(float64)
		if math.IsNaN(got) != math.IsNaN(c.rate) || !math.IsNaN(got) && math.Abs(got-c.rate) > 1e-9 {
			t.Errorf("%s: rate %v, want %v (notes %q)", c.name, got, c.rate, x.Notes)
		}
	}
}

func TestBreaksAreNamed(t *testing.T) {
	var all []store.Counted
	add := func(n int, year, operation, kind string) {
		for range n {
			e := event("agency", year, "")
			e.Occurrence.Operation, e.Occurrence.Narratives[0].Kind = operation, kind
			all = append(all, e)
		}
	}
	add(47, "2009", "charter", "cause")
	add(790, "2010", "private", "cause")
	add(760, "2011", "private", "cause")
	add(700, "2012", "private", "remarks")
	x, err := Trend(records(all...), nil, options("year"))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		"breaks between 2009 (47 records) and 2010 (790 records)", "another mix of operation in 2010", "another mix of kind of text in 2012",
	} {
		if !noted(x, want) {
			t.Errorf("notes %q, want %q", x.Notes, want)
		}
	}
	if noted(x, "between 2010") || noted(x, "between 2011") {
		t.Errorf("a good year is called a break: %q", x.Notes)
	}
}

func TestScopeDates(t *testing.T) {
	s := Scope{From: corpus.Date{Year: 2020}, To: corpus.Date{Year: 2021, Month: 6}, Tree: catalogue.Builtin()}
	for date, want := range map[string]bool{"2020-01-01": true, "2019-12-31": false, "2021-06-30": true, "2021-07": false, "2021": false, "2020": true, "": false} {
		d, err := corpus.ParseDate(date)
		if err != nil {
			t.Fatal(err)
		}
		if got := s.within(d); got != want {
			t.Errorf("%q within: %v, want %v", date, got, want)
		}
	}
}

func TestChains(t *testing.T) {
	broken := event("a", "2021", "x", "power-loss", "recovered")
	broken.BrokenBy = "recovered"
	x, err := Chains(records(event("a", "2021", "x", "power-loss", "stall"), event("a", "2021", "x", "power-loss", "stall"), broken, event("a", "2021", "x", "stall")),
		ChainOptions{Scope: Scope{Tree: catalogue.Builtin()}, Most: 1, Level: 0.95})
	if err != nil {
		t.Fatal(err)
	}
	if len(x.Rows) != 1 || fmt.Sprint(x.Rows[0][:2]) != "[power-loss > stall 2]" || !noted(x, "of the 3 chains") || !noted(x, "1 chain more") {
		t.Errorf("rows %v, notes %q", x.Rows, x.Notes)
	}
}

func TestCheckExposure(t *testing.T) {
	for name, c := range map[string]struct {
		rows []corpus.Exposure
		want string
	}{
		"side by side":      {[]corpus.Exposure{exposure(t, "a", "2021-01", 1, nil), exposure(t, "a", "2021-02", 1, nil)}, ""},
		"a month in a year": {[]corpus.Exposure{exposure(t, "a", "2021-02", 1, nil), exposure(t, "a", "2021", 1, nil)}, "overlaps"},
		"other strata":      {[]corpus.Exposure{exposure(t, "a", "2021", 1, map[string]string{"place": "x"}), exposure(t, "a", "2021-02", 1, map[string]string{"place": "y"})}, ""},
		"another source":    {[]corpus.Exposure{exposure(t, "a", "2021", 1, nil), exposure(t, "b", "2021-02", 1, nil)}, ""},
	} {
		err := CheckExposure(c.rows)
		if (err == nil) != (c.want == "") || err != nil && !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}

// Halving the asymmetric moment lowers the speed at which full rudder still
// balances it by the square root of two (common practice, no source): at
// Vmc/sqrt(2) full rudder gives half of the moment.
func TestBalance(t *testing.T) {
	for _, c := range []struct{ v, vmc, want float64 }{{84 / math.Sqrt2, 84, 0.5}, {42, 84, 0.25}, {71, 84, 0.71443}, {84, 84, 0}, {90, 84, 0}, {0, 84, 0}} {
		got, ok := Balance(&corpus.Quantity{Kind: "airspeed", Value: c.v, Unit: "kt", Limit: c.vmc, LimitKind: "vmc"})
		if math.Abs(got-c.want) > 1e-5 || ok != (c.want > 0) {
			t.Errorf("%v against %v: %v, want %v", c.v, c.vmc, got, c.want)
		}
	}
	if _, ok := Balance(&corpus.Quantity{Kind: "airspeed", Value: 50, Limit: 60, LimitKind: "stall"}); ok {
		t.Error("a stall speed has no balance ratio")
	}
}

func TestRaisesVmc(t *testing.T) {
	tag := func(factor, quote string, a corpus.Assertion) corpus.Tag {
		return corpus.Tag{Factor: factor, Quote: quote, Assertion: a}
	}
	got := RaisesVmc([]corpus.Tag{
		tag("wrong-bank", "wings were held level", corpus.Affirmed), tag("not-secured", "did not feather the propeller", corpus.Affirmed),
		tag("not-secured", "gear was left down", corpus.Affirmed), tag("weight-balance", "aft of the limit", corpus.Denied),
	})
	if want := "wings held level, propeller not feathered"; strings.Join(got, ", ") != want {
		t.Errorf("%v, want %s", got, want)
	}
}

// A text that stops in mid-sentence is counted where it tells the factor, and
// stands in no share.
func TestCutOffStandsInNoShare(t *testing.T) {
	cut := event("s", "2020-01-01", "", "stall")
	cut.CutOff = true
	silent := event("s", "2020-02-01", "")
	silent.CutOff = true
	got, err := Trend(records(cut, silent, event("s", "2020-03-01", "", "stall"), event("s", "2020-04-01", "")), nil,
		TrendOptions{Scope: Scope{Tree: catalogue.Builtin()}, Factors: []string{"stall"}, By: "year", Per: "hours", Scale: 1, Level: 0.95})
	if err != nil {
		t.Fatal(err)
	}
	if r := got.Rows[0]; r[2] != 2 || r[7] != 0.5 {
		t.Errorf("count %v, share %v; want 2 and 1 of 2", r[2], r[7])
	}
	if !strings.Contains(strings.Join(got.Notes, "\n"), "2 narratives stop in mid-sentence") {
		t.Errorf("notes %q", got.Notes)
	}
}
