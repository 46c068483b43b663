package corpus

import (
	"encoding/json"
	"testing"
)

// ISO 8601 reduced precision; 2000 is a leap year and 1900 was none (the rule
// of the Gregorian calendar).
func TestParseDate(t *testing.T) {
	for text, want := range map[string]string{
		"": "", "2019": "2019", "2019-01": "2019-01", "2019-01-31": "2019-01-31", "2000-02-29": "2000-02-29",
		"1900-02-29": "error", "2019-13": "error", "2019-00": "error", "2019-04-31": "error", "19": "error", "2019-1-1": "error", "2019/01/01": "error", "0000": "",
	} {
		d, err := ParseDate(text)
		if got := d.String(); (err != nil) != (want == "error") || err == nil && got != want {
			t.Errorf("%q: %q, %v; want %q", text, got, err, want)
		}
	}
}

func TestPeriods(t *testing.T) {
	d := Date{2019, 8, 31}
	for grain, want := range map[Grain]string{ByMonth: "2019-08", ByQuarter: "2019-Q3", ByYear: "2019"} {
		got, ok := d.Period(grain)
		if got != want || !ok {
			t.Errorf("%s: %q, %v", grain, got, ok)
		}
		p, err := ParsePeriod(got)
		if err != nil || p.String() != got {
			t.Errorf("%s reads back as %s (%v)", got, p, err)
		}
	}
	if _, ok := (Date{Year: 2019}).Period(ByMonth); ok {
		t.Error("a year tells no month")
	}
	p, _ := ParsePeriod("2019-Q4")
	if p.Next().String() != "2020-Q1" || p.Last.String() != "2019-12-31" {
		t.Errorf("after %s comes %s; its last day is %s", p, p.Next(), p.Last)
	}
	if _, err := ParsePeriod("2019-Q5"); err == nil {
		t.Error("there is no fifth quarter")
	}
	first, last := (Date{Year: 2020, Month: 2}).Bounds()
	if first.String() != "2020-02-01" || last.String() != "2020-02-29" {
		t.Errorf("February 2020: %s to %s", first, last)
	}
}

func TestSpanCheck(t *testing.T) {
	const text = "é5°"
	for _, c := range []struct {
		s  Span
		ok bool
	}{{Span{0, 2}, true}, {Span{1, 2}, false}, {Span{0, 6}, false}, {Span{2, 2}, true}, {Span{3, 2}, false}, {Span{0, len(text)}, true}} {
		if err := c.s.Check(text); (err == nil) != c.ok {
			t.Errorf("%v: %v", c.s, err)
		}
	}
	if !(Span{0, 3}).Overlaps(Span{2, 4}) || (Span{0, 2}).Overlaps(Span{2, 4}) || !(Span{0, 4}).Contains(Span{1, 4}) {
		t.Error("half-open spans")
	}
}

func TestRecordJSON(t *testing.T) {
	o := Tagged{Occurrence: Occurrence{ID: "1", Source: "s", Date: Date{2019, 1, 0}, Aircraft: Aircraft{Make: "Larkin"}, Narratives: []Narrative{}}, Tags: []Tag{}, Chain: Chain{Links: []Link{}}}
	data, err := json.Marshal(o)
	if err != nil {
		t.Fatal(err)
	}
	const want = `{"id":"1","source":"s","date":"2019-01","make":"Larkin","narratives":[],"rulebook":"","tags":[],"chain":{"links":[]}}`
	if string(data) != want {
		t.Errorf("%s\nwant\n%s", data, want)
	}
	var back Tagged
	if err := json.Unmarshal(data, &back); err != nil || back.Date != o.Date || back.Make != "Larkin" {
		t.Errorf("read back %+v, %v", back, err)
	}
}
