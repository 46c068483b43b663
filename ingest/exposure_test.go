package ingest

import (
	"math"
	"strings"
	"testing"
)

func TestReadExposure(t *testing.T) {
	_, err := ReadExposure(strings.NewReader("\ufeffperiod,hours,place,covers\n2021-05,\"1,410.5\",Tarnwick,tarnwick\n\n2021-Q3,,Sellow,\n"), "h.csv", "sellow", []string{"place"})
	if err == nil || !strings.Contains(err.Error(), "h.csv:4: neither hours nor departures") {
		t.Errorf("an amount without a number: %v", err)
	}
	got, err := ReadExposure(strings.NewReader("period,hours,place,covers\n2021-05,\"1,410.5\",Tarnwick,tarnwick\n2021-Q3,7,Sellow,\n"), "h.csv", "sellow", []string{"place"})
	if err != nil {
		t.Fatal(err)
	}
	a, b := got[0], got[1]
	if a.Hours != 1410.5 || !math.IsNaN(a.Departures) || a.Covers != "tarnwick" || a.Strata["place"] != "Tarnwick" || a.Period.String() != "2021-05" {
		t.Errorf("first row: %+v", a)
	}
	if b.Covers != "sellow" || b.Period.String() != "2021-Q3" || b.Period.Last.String() != "2021-09-30" {
		t.Errorf("second row: %+v", b)
	}
}

func TestReadExposureRefuses(t *testing.T) {
	for name, c := range map[string]struct{ text, want string }{
		"empty":          {"", "the file is empty"},
		"no period":      {"hours,covers\n1,a\n", "no column period"},
		"no amount":      {"period,covers\n2021,a\n", "no column hours or departures"},
		"no source":      {"period,hours\n2021,1\n", "no column covers"},
		"unknown column": {"period,hours,covers,mood\n", `column "mood"`},
		"column twice":   {"period,hours,hours,covers\n", "stands twice"},
		"bad period":     {"period,hours,covers\n2021-13,1,a\n", `h.csv:2: period: period "2021-13"`},
		"bad hours":      {"period,hours,covers\n2021,many,a\n", `h.csv:2: hours: "many"`},
		"below zero":     {"period,hours,covers\n2021,-1,a\n", `"-1" is no amount`},
		"twice":          {"period,hours,covers\n2021,1,a\n2022,1,a\n2021,2,a\n", "h.csv:4: the same period and stratum as line 2"},
		"ragged":         {"period,hours,covers\n2021,1\n", "h.csv:2: 2 cells, the header has 3"},
		"no rows":        {"period,hours,covers\n", "a header and no rows"},
	} {
		if _, err := ReadExposure(strings.NewReader(c.text), "h.csv", "", []string{"place"}); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}

func FuzzExposure(f *testing.F) {
	f.Add("period,hours,covers\n2021,1,a\n")
	f.Add("period,departures,covers,place\n2021-Q4,\"1,000\",a,\"x\ny\"\n")
	f.Fuzz(func(t *testing.T, s string) {
		rows, err := ReadExposure(strings.NewReader(s), "f", "", []string{"place"})
		if err != nil {
			return
		}
		for _, e := range rows {
			if e.Covers == "" || e.Hours < 0 || e.Departures < 0 || e.Period.First.Check() != nil {
				t.Errorf("%+v from %q", e, s)
			}
		}
	})
}
