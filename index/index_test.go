package index

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"github.com/blevesearch/bleve/v2"

	"catena/ingest/corpus"
)

// reports are invented texts; the key is the index in the list plus one.
var reports = []corpus.Occurrence{
	{ID: "a", Source: "tarnwick", Place: "Tarnwick", Aircraft: corpus.Aircraft{Make: "Larkin", Model: "120"}, Date: corpus.Date{Year: 2021, Month: 5, Day: 3},
		Narratives: []corpus.Narrative{{Kind: "factual", Text: "The aircraft’s left engine lost power after take-off. It landed on the runway again."}}},
	{ID: "b", Source: "hangar-talk", Date: corpus.Date{Year: 2022},
		Narratives: []corpus.Narrative{{Kind: "reporter", Text: "ACFT LOST PWR ON L ENG AFTER TKOF. RETURNED TO RWY."}, {Kind: "synopsis", Text: "Rudder was held at 71 kt."}}},
	{ID: "c", Source: "tarnwick", Date: corpus.Date{Year: 2023, Month: 2},
		Narratives: []corpus.Narrative{{Kind: "remarks", Text: "Glider stalled in the turn – no damage."}}},
}

func fetch(key int64) ([]corpus.Narrative, error) {
	if key < 1 || int(key) > len(reports) {
		return nil, fmt.Errorf("no occurrence %d", key)
	}
	return reports[key-1].Narratives, nil
}

func fill(t testing.TB, dir string) *Index {
	t.Helper()
	x, err := Open(dir, Options{})
	if err != nil {
		t.Fatal(err)
	}
	var docs []Doc
	for i := range reports {
		docs = append(docs, Doc{int64(i + 1), &reports[i]})
	}
	if err := x.Put(context.Background(), docs, 7); err != nil {
		t.Fatal(err)
	}
	return x
}

func TestSearch(t *testing.T) {
	x := fill(t, filepath.Join(t.TempDir(), "x"))
	defer x.Close()
	day := func(s string) corpus.Date {
		d, err := corpus.ParseDate(s)
		if err != nil {
			t.Fatal(err)
		}
		return d
	}
	for _, c := range []struct {
		name string
		q    Query
		want string
	}{
		{"abbreviations meet long forms", Query{Text: "aircraft engine takeoff"}, "1 2"},
		{"and the other way round", Query{Text: "ACFT RWY"}, "1 2"},
		{"stems", Query{Text: "landing"}, "1"},
		{"all words", Query{Text: "engine rudder"}, "2"},
		{"a phrase", Query{Text: `"left engine"`}, "1 2"},
		{"a phrase in the wrong order", Query{Text: `"engine left"`}, ""},
		{"a phrase over a function word", Query{Text: `"stalled in the turn"`}, "3"},
		{"excluded", Query{Text: "engine -rudder"}, "1"},
		{"either", Query{Text: "rudder OR glider"}, "2 3"},
		{"a beginning", Query{Text: "glid*"}, "3"},
		{"knots by any name", Query{Text: `"71 knots"`}, "2"},
		{"make", Query{Text: "larkin"}, "1"},
		{"nothing", Query{Text: "helicopter"}, ""},
		{"everything", Query{}, "1 2 3"},
		{"a field", Query{Fields: map[string]string{"source": "Tarnwick"}}, "1 3"},
		{"dates", Query{From: day("2022"), To: day("2022-12")}, "2"},
		{"a date too coarse is not known to lie within", Query{From: day("2022-02")}, "3"},
		{"keys", Query{Text: "engine", Keys: func(k int64) bool { return k == 2 }}, "2"},
	} {
		c.q.Size = 10
		r, err := x.Search(context.Background(), c.q, fetch)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		var keys []string
		for _, h := range r.Hits {
			keys = append(keys, fmt.Sprint(h.Key))
			for _, s := range h.Snippets {
				text := reports[h.Key-1].Narratives[s.Narrative].Text
				for _, l := range append(slices.Clone(s.Highlights), s.Span) {
					if err := l.Check(text); err != nil {
						t.Errorf("%s: %v", c.name, err)
					}
				}
			}
		}
		slices.Sort(keys)
		if got := strings.Join(keys, " "); got != c.want || r.Total != len(keys) {
			t.Errorf("%s: found %q of %d, want %q", c.name, got, r.Total, c.want)
		}
	}
}

func TestHighlightsAreBytesOfTheNarrative(t *testing.T) {
	x := fill(t, filepath.Join(t.TempDir(), "x"))
	defer x.Close()
	r, err := x.Search(context.Background(), Query{Text: "aircraft engine rudder OR power", Size: 5}, fetch)
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	for _, h := range r.Hits {
		for _, s := range h.Snippets {
			for _, l := range s.Highlights {
				got = append(got, l.Of(reports[h.Key-1].Narratives[s.Narrative].Text))
			}
		}
	}
	slices.Sort(got)
	if want := []string{"ACFT", "ENG", "PWR", "Rudder", "aircraft’s", "engine", "power"}; !reflect.DeepEqual(got, want) {
		t.Errorf("highlights %q, want %q", got, want)
	}
}

func TestChangeAndReplacement(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "x")
	x := fill(t, dir)
	changed := reports[0]
	changed.Narratives = []corpus.Narrative{{Text: "A bird was struck."}}
	if err := x.Put(context.Background(), []Doc{{1, &changed}}, 9); err != nil {
		t.Fatal(err)
	}
	if err := x.Delete([]int64{3}, 10); err != nil {
		t.Fatal(err)
	}
	if err := x.Close(); err != nil {
		t.Fatal(err)
	}
	x, err := OpenReader(dir, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer x.Close()
	if n, err := x.Count(); n != 2 || x.Change() != 10 || err != nil {
		t.Errorf("%d documents at change %d (%v), want 2 at 10", n, x.Change(), err)
	}
	r, err := x.Search(context.Background(), Query{Text: "engine", Size: 5}, fetch)
	if err != nil || r.Total != 1 {
		t.Errorf("the replaced text is still found: %+v, %v", r, err)
	}
}

func TestOpenErrors(t *testing.T) {
	dir := t.TempDir()
	if _, err := OpenReader(filepath.Join(dir, "none"), Options{}); !errors.Is(err, ErrMissing) {
		t.Errorf("missing: %v", err)
	}
	broken := filepath.Join(dir, "broken")
	fill(t, broken).Close()
	if err := os.WriteFile(filepath.Join(broken, "index_meta.json"), []byte("{"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(broken, Options{}); !errors.Is(err, ErrDamaged) {
		t.Errorf("broken meta file: %v", err)
	}
	cut := filepath.Join(dir, "cut")
	fill(t, cut).Close()
	bolt := filepath.Join(cut, "store", "root.bolt")
	if err := os.Truncate(bolt, 100); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(cut, Options{}); !errors.Is(err, ErrDamaged) {
		t.Errorf("cut store: %v", err)
	}
	foreign := filepath.Join(dir, "foreign")
	b, err := bleve.New(foreign, bleve.NewIndexMapping())
	if err != nil {
		t.Fatal(err)
	}
	if err := b.SetInternal(stateKey, []byte(`{"format":99}`)); err != nil {
		t.Fatal(err)
	}
	b.Close()
	if _, err := Open(foreign, Options{}); !errors.Is(err, ErrFormat) {
		t.Errorf("another format: %v", err)
	}
	held := fill(t, filepath.Join(dir, "held"))
	defer held.Close()
	if _, err := OpenReader(filepath.Join(dir, "held"), Options{Wait: 50_000_000}); !errors.Is(err, ErrBusy) {
		t.Errorf("held by a writer: %v", err)
	}
}

func TestParseQueryFaults(t *testing.T) {
	for q, want := range map[string]string{
		`"left engine`:              "character 1: the phrase is not closed",
		`OR rudder`:                 "character 1: OR stands between",
		`rudder OR`:                 "character 8: OR wants a word",
		`ru*der`:                    "character 3: * stands at the end",
		`r*`:                        "at least two letters",
		`é "x`:                      "character 3: the phrase",
		`rudder OR -x`:              "cannot be a choice",
		strings.Repeat("a ", 70):    "more than 64 words",
		strings.Repeat("abc", 1000): "longer than",
	} {
		if _, err := parseQuery(q); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %q", q, err, want)
		}
	}
}

func FuzzQuery(f *testing.F) {
	for _, s := range []string{"", `a "b c" -d OR e*`, `"`, "-", "OR", "é*", "\xff"} {
		f.Add(s)
	}
	x := &Index{analyzer: newAnalyzer()}
	f.Fuzz(func(t *testing.T, s string) {
		if _, err := x.build(Query{Text: s}); err != nil {
			var q *QueryError
			if !errors.As(err, &q) || q.At < 0 || q.At > len(s) || q.Error() == "" {
				t.Errorf("%q: %v", s, err)
			}
		}
	})
}

func FuzzAnalyzer(f *testing.F) {
	f.Add("ACFT’s L ENG at 71kts – É")
	a := newAnalyzer()
	f.Fuzz(func(t *testing.T, s string) {
		last := 0
		for _, tok := range a.Analyze([]byte(s)) {
			if tok.Start < 0 || tok.End > len(s) || tok.Start >= tok.End || tok.Position <= last || len(tok.Term) == 0 {
				t.Fatalf("token %+v after position %d in %q", tok, last, s)
			}
			last = tok.Position
		}
	})
}

// The yardstick is bleve's own English analyser, in the same run.
func BenchmarkBuild(b *testing.B) {
	sentence := "After take-off number %d the left engine lost power and the pilot's airspeed decayed before %s was reached. "
	var docs []Doc
	size := 0
	for i := range 2000 {
		var text strings.Builder
		for k := range 16 {
			fmt.Fprintf(&text, sentence, i*k%977, []string{"Tarnwick", "the runway", "blue line", "circuit height"}[(i+k)%4])
		}
		size += text.Len()
		docs = append(docs, Doc{int64(i + 1), &corpus.Occurrence{ID: fmt.Sprint(i), Narratives: []corpus.Narrative{{Text: text.String()}}}})
	}
	b.Run("catena", func(b *testing.B) {
		for b.Loop() {
			x, err := Open(filepath.Join(b.TempDir(), "x"), Options{})
			if err != nil {
				b.Fatal(err)
			}
			for i := 0; i < len(docs); i += 1000 {
				if err := x.Put(context.Background(), docs[i:i+1000], int64(i)); err != nil {
					b.Fatal(err)
				}
			}
			x.Close()
		}
		b.ReportMetric(float64(len(docs)*b.N)/b.Elapsed().Seconds(), "narratives/s")
	})
	b.Run("yardstick", func(b *testing.B) {
		for b.Loop() {
			m := bleve.NewIndexMapping()
			m.DefaultAnalyzer = "en"
			x, err := bleve.New(filepath.Join(b.TempDir(), "x"), m)
			if err != nil {
				b.Fatal(err)
			}
			for i := 0; i < len(docs); i += 1000 {
				batch := x.NewBatch()
				for _, d := range docs[i : i+1000] {
					if err := batch.Index(docID(d.Key), map[string]any{"text": d.Occurrence.Narratives[0].Text}); err != nil {
						b.Fatal(err)
					}
				}
				if err := x.Batch(batch); err != nil {
					b.Fatal(err)
				}
			}
			x.Close()
		}
		b.ReportMetric(float64(len(docs)*b.N)/b.Elapsed().Seconds(), "narratives/s")
	})
}
