package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

func open(t *testing.T) *Store {
	t.Helper()
	s, err := Open(context.Background(), filepath.Join(t.TempDir(), "c.db"), false)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

// sample is an occurrence with every field set.
func sample(id, text string) *Put {
	p := &Put{
		Tagged: corpus.Tagged{
			Occurrence: corpus.Occurrence{
				ID: id, Source: "tarnwick", Date: corpus.Date{Year: 2021, Month: 5}, Place: "Tarnwick", Country: "Norland",
				Aircraft:  corpus.Aircraft{Make: "Marrow", Model: "Twin 44", Category: "airplane", Engines: 2, EngineType: "piston"},
				Further:   []corpus.Aircraft{{Make: "Larkin", Model: "120"}},
				Operation: "training", Phase: "APR", Injury: "none", Damage: "minor", Event: "incident",
				Narratives: []corpus.Narrative{{Kind: "factual", Text: text}, {Kind: "cause", Text: "Speed – not held."}},
				Codes:      []corpus.Code{{Scheme: "cictt", Code: "LOC-I", Label: "x"}}, Extra: map[string]string{"b": "2", "a": "<1>"},
			},
			Rulebook: "v1",
			Tags: []corpus.Tag{{Factor: "stall", Assertion: corpus.Affirmed, Basis: corpus.Told, Span: corpus.Span{Start: 0, End: 3},
				Quote: text[:3], Rule: "stall/x", Strength: 0.5, Side: "left", Actor: "pilot", Quantity: &corpus.Quantity{Kind: "airspeed", Value: 71, Unit: "kt"}}},
			Chain: corpus.Chain{Links: []corpus.Link{{Factor: "stall", Order: "text"}}, Outcome: "stall"},
		},
		Hash: sha256.Sum256([]byte(id + text)), Source: corpus.Source{File: "a.csv", Row: 1, Line: 2}, Raw: []byte("raw " + text),
	}
	return p
}

func put(t *testing.T, s *Store, puts ...*Put) (fates []Fate) {
	t.Helper()
	b, err := s.Begin(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range puts {
		_, fate, err := b.Put(p, "map")
		if err != nil {
			t.Fatal(err)
		}
		fates = append(fates, fate)
	}
	if err := b.Commit(); err != nil {
		t.Fatal(err)
	}
	return fates
}

func all(t *testing.T, s *Store, sel Select) (rows []*Row) {
	t.Helper()
	for r, err := range s.Each(context.Background(), sel) {
		if err != nil {
			t.Fatal(err)
		}
		rows = append(rows, r)
	}
	return rows
}

func TestPutThenReadBack(t *testing.T) {
	s := open(t)
	p := sample("T21-1", "Stalled on base.")
	put(t, s, p)
	rows := all(t, s, Select{})
	if len(rows) != 1 || !reflect.DeepEqual(rows[0].Tagged, p.Tagged) || rows[0].Source != p.Source {
		t.Errorf("read back %+v, want %+v", rows, p.Tagged)
	}
	raw, err := s.Raw(context.Background(), rows[0].Key)
	if err != nil || string(raw) != "raw Stalled on base." {
		t.Errorf("raw row %q, %v", raw, err)
	}
}

func TestFates(t *testing.T) {
	s := open(t)
	first, second := sample("T21-1", "Stalled on base."), sample("T21-1", "Stalled on final.")
	if got := put(t, s, first, first, second, first); !reflect.DeepEqual(got, []Fate{Stored, Unchanged, Revised, Unchanged}) {
		t.Errorf("fates %v", got)
	}
	before, _ := s.Change(context.Background())
	// the whole file again: nothing may change
	if got := put(t, s, first, second); !reflect.DeepEqual(got, []Fate{Unchanged, Unchanged}) {
		t.Errorf("fates of a second reading %v", got)
	}
	if after, _ := s.Change(context.Background()); after != before || before != 2 {
		t.Errorf("change number %d, then %d; want 2 and 2", before, after)
	}
	if got := all(t, s, Select{}); len(got) != 1 || got[0].Narratives[0].Text != "Stalled on final." {
		t.Errorf("current content: %+v", got)
	}
	totals, err := s.Totals(context.Background())
	if err != nil || totals.Revisions != 1 || totals.Narratives != 2 {
		t.Errorf("totals %+v, %v", totals, err)
	}
}

func TestBatchIsAllOrNothing(t *testing.T) {
	s := open(t)
	b, err := s.Begin(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := b.Put(sample("T21-1", "Stalled."), "map"); err != nil {
		t.Fatal(err)
	}
	if got := all(t, s, Select{}); len(got) != 0 {
		t.Errorf("%d occurrences are visible before the commit", len(got))
	}
	b.Rollback()
	if got := all(t, s, Select{}); len(got) != 0 {
		t.Errorf("%d occurrences are left after a rollback", len(got))
	}
}

func TestEachByChange(t *testing.T) {
	s := open(t)
	put(t, s, sample("a", "one."), sample("b", "two."), sample("a", "three."))
	var ids []string
	for _, r := range all(t, s, Select{ByChange: true, After: 1}) {
		ids = append(ids, fmt.Sprint(r.ID, r.Change))
	}
	if got := strings.Join(ids, " "); got != "b2 a3" {
		t.Errorf("after change 1: %s, want b2 a3", got)
	}
	if got := all(t, s, Select{Outdated: "v1"}); len(got) != 0 {
		t.Errorf("%d are outdated, want none", len(got))
	}
}

func TestRetagKeepsContentAndChange(t *testing.T) {
	s := open(t)
	put(t, s, sample("a", "Stalled."))
	before := all(t, s, Select{})[0]
	b, _ := s.Begin(context.Background())
	if err := b.Retag(before.Key, &corpus.Tagged{Rulebook: "v2", Tags: []corpus.Tag{}, Chain: corpus.Chain{Links: []corpus.Link{}}}); err != nil {
		t.Fatal(err)
	}
	if err := b.Commit(); err != nil {
		t.Fatal(err)
	}
	after := all(t, s, Select{})[0]
	if len(after.Tags) != 0 || after.Rulebook != "v2" || after.Change != before.Change || after.Narratives[0] != before.Narratives[0] {
		t.Errorf("after tagging again: %+v", after)
	}
}

func TestSetAsideOnce(t *testing.T) {
	s := open(t)
	spool := filepath.Join(t.TempDir(), "row")
	big := bytes.Repeat([]byte("x"), partSize+7)
	if err := os.WriteFile(spool, big, 0o600); err != nil {
		t.Fatal(err)
	}
	rows := []*corpus.SetAside{
		{Source: corpus.Source{File: "a.csv", Row: 3, Line: 4}, Reason: "date", Raw: []byte("bad,row")},
		{Source: corpus.Source{File: "a.csv", Row: 4, Line: 5}, Reason: "too large", Spool: spool},
		{Source: corpus.Source{File: "renamed.csv", Row: 3, Line: 4}, Reason: "date", Raw: []byte("bad,row")},
	}
	b, _ := s.Begin(context.Background())
	var fresh []bool
	for _, a := range rows {
		isNew, err := b.SetAside(a, "map")
		if err != nil {
			t.Fatal(err)
		}
		fresh = append(fresh, isNew)
	}
	if err := b.Commit(); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(fresh, []bool{true, true, false}) {
		t.Errorf("new: %v", fresh)
	}
	var kept []*KeptAside
	for a, err := range s.EachSetAside(context.Background(), 0, math.MaxInt64) {
		if err != nil {
			t.Fatal(err)
		}
		kept = append(kept, a)
	}
	if len(kept) != 2 || string(kept[0].Raw) != "bad,row" || !bytes.Equal(kept[1].Raw, big) || kept[1].Size != int64(len(big)) {
		t.Errorf("kept %d rows", len(kept))
	}
}

func TestCount(t *testing.T) {
	s := open(t)
	p := sample("a", "Stalled.")
	p.Tags = append(p.Tags, corpus.Tag{Factor: "spin", Assertion: corpus.Denied, Basis: corpus.Told}, corpus.Tag{Factor: "below-vmc", Assertion: corpus.Affirmed, Basis: corpus.Inferred})
	put(t, s, p)
	for c, err := range s.Count(context.Background()) {
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(c.Told, []string{"stall"}) || !reflect.DeepEqual(c.Inferred, []string{"below-vmc"}) || !c.Usable ||
			!reflect.DeepEqual(c.Path, []string{"stall"}) || c.Occurrence.Narratives[1].Kind != "cause" || c.Occurrence.Extra["a"] != "<1>" {
			t.Errorf("counted %+v", c)
		}
	}
}

func TestExposureReplacesAndChecks(t *testing.T) {
	s := open(t)
	ctx := context.Background()
	period, err := corpus.ParsePeriod("2021-05")
	if err != nil {
		t.Fatal(err)
	}
	e := corpus.Exposure{Period: period, Covers: "tarnwick", Hours: 410.5, Departures: math.NaN(), Strata: map[string]string{"place": "Tarnwick"}}
	fine := func([]corpus.Exposure) error { return nil }
	if err := s.PutExposure(ctx, []corpus.Exposure{e}, fine); err != nil {
		t.Fatal(err)
	}
	e.Hours = 420
	if err := s.PutExposure(ctx, []corpus.Exposure{e}, fine); err != nil {
		t.Fatal(err)
	}
	clash := errors.New("clash")
	other := e
	other.Hours = 7
	if err := s.PutExposure(ctx, []corpus.Exposure{other}, func([]corpus.Exposure) error { return clash }); !errors.Is(err, clash) {
		t.Errorf("a failing check gives %v", err)
	}
	got, err := s.Exposure(ctx)
	if err != nil || len(got) != 1 || got[0].Hours != 420 || !math.IsNaN(got[0].Departures) || got[0].Strata["place"] != "Tarnwick" {
		t.Errorf("exposure %+v, %v", got, err)
	}
}

func TestOpenRefuses(t *testing.T) {
	ctx := context.Background()
	dir := t.TempDir()
	if _, err := Open(ctx, filepath.Join(dir, "none.db"), true); !errors.Is(err, ErrMissing) {
		t.Errorf("missing: %v", err)
	}
	exec := func(name, script string) string {
		path := filepath.Join(dir, name)
		db, err := sql.Open("sqlite", path)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		if _, err := db.Exec(script); err != nil {
			t.Fatal(err)
		}
		return path
	}
	if _, err := Open(ctx, exec("foreign.db", "CREATE TABLE x (y)"), false); !errors.Is(err, ErrForeign) {
		t.Errorf("foreign: %v", err)
	}
	newer := exec("newer.db", fmt.Sprintf("PRAGMA application_id = %d; PRAGMA user_version = 99", applicationID))
	if _, err := Open(ctx, newer, false); !errors.Is(err, ErrNewer) || !strings.Contains(err.Error(), "update the program") {
		t.Errorf("newer: %v", err)
	}
	text := filepath.Join(dir, "text.db")
	if err := os.WriteFile(text, bytes.Repeat([]byte("no database "), 1000), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(ctx, text, false); !errors.Is(err, ErrForeign) {
		t.Errorf("text file: %v", err)
	}
}
