package queries

import (
	"strings"
	"testing"

	"catena/ingest/corpus"
	"catena/ingest/store"
)

func pair(a, b int64, decision ...bool) store.Pair {
	p := store.Pair{Double: corpus.Double{A: a, B: b, Probability: 0.9}}
	if len(decision) > 0 {
		p.Decision = &store.Decision{A: a, B: b, Same: decision[0]}
	}
	return p
}

// An event counts once, with the factors of all who tell it; an undecided pair
// counts twice, and the table says so.
func TestDoublesCountOnce(t *testing.T) {
	all := []store.Counted{
		event("agency", "2021-03", "Sellow", "power-loss"),
		event("school", "2021-03-09", "Sellow", "wrong-rudder"),
		event("school", "2021-04-01", "Sellow", "power-loss"),
		event("agency", "2021-04-01", "Sellow", "power-loss"),
		event("agency", "2021-05-01", "Sellow"),
	}
	o := options("year", "power-loss", "wrong-rudder")
	o.Doubles = NewDoubles([]store.Pair{pair(1, 2, true), pair(3, 4), pair(3, 5, false)}, false)
	x, err := Trend(records(all...), nil, o)
	if err != nil {
		t.Fatal(err)
	}
	counts := map[string]any{}
	for _, r := range x.Rows {
		counts[r[1].(string)] = r[2]
	}
	if counts["power-loss"] != 3 || counts["wrong-rudder"] != 1 {
		t.Errorf("counts %v, want 3 and 1", counts)
	}
	notes := strings.Join(x.Notes, "\n")
	for _, want := range []string{"1 event is told by 2 occurrences", "1 undecided pair of occurrences here", "of the 4 of 4 with a usable narrative"} {
		if !strings.Contains(notes, want) {
			t.Errorf("no note says %q:\n%s", want, notes)
		}
	}
	// the day is known from the finer telling
	o.By = "month"
	if x, err = Trend(records(all...), nil, o); err != nil || cellOf(t, x, "2021-03", "count") != any(1) {
		t.Errorf("March: %v, %v", x.Rows, err)
	}
	// each source by itself has its own telling
	o.By, o.Factors = "source", nil
	if x, err = Trend(records(all...), nil, o); err != nil || cellOf(t, x, "agency", "count") != any(3) || cellOf(t, x, "school", "count") != any(2) {
		t.Errorf("by source: %v, %v", x.Rows, err)
	}
	o.By, o.Doubles = "year", NewDoubles(nil, true)
	if x, err = Trend(records(all...), nil, o); err != nil || !strings.Contains(strings.Join(x.Notes, "\n"), "have changed since doubles were looked for") {
		t.Errorf("a search that is behind is not told: %v, %v", x.Notes, err)
	}
}

func TestDoublesChainAndContradict(t *testing.T) {
	pairs := []store.Pair{pair(1, 2, true), pair(4, 5, true), pair(2, 4, true), pair(1, 5), pair(1, 9)}
	d := NewDoubles(pairs, false)
	for _, k := range []int64{1, 2, 4, 5} {
		if d.Event(k) != 1 {
			t.Errorf("event of %d is %d, want 1", k, d.Event(k))
		}
	}
	if u := d.Undecided(); len(u) != 1 || u[0] != [2]int64{1, 9} {
		t.Errorf("undecided %v; who is one event already needs no decision", u)
	}
	if _, bad := Contradiction(pairs); bad {
		t.Error("no contradiction there")
	}
	if x, bad := Contradiction(append(pairs, pair(2, 5, false))); !bad || x.A != 2 || x.B != 5 {
		t.Errorf("contradiction %v, %v", x, bad)
	}
}
