package ingest

import (
	"bytes"
	"encoding/hex"
	"reflect"
	"testing"

	"pgregory.net/rapid"

	"catena/ingest/corpus"
)

func TestAppendRecord(t *testing.T) {
	o := &corpus.Occurrence{
		ID: "A1", Source: "hangar", Date: corpus.Date{Year: 2019, Month: 3}, Place: "Vell <field> & more",
		Aircraft:   corpus.Aircraft{Make: "Zephyrine", Engines: 2},
		Narratives: []corpus.Narrative{{Kind: "factual", Text: "Bounced \"twice\"\n\t."}},
		Extra:      map[string]string{"b": "2", "a": "1"},
	}
	got, err := AppendRecord([]byte("before "), o)
	want := `before {"id":"A1","source":"hangar","date":"2019-03","place":"Vell <field> & more","make":"Zephyrine","engines":2,` +
		`"narratives":[{"kind":"factual","text":"Bounced \"twice\"\n\t."}],"extra":{"a":"1","b":"2"}}` + "\n"
	if err != nil || string(got) != want {
		t.Errorf("got  %s (%v)\nwant %s", got, err, want)
	}
	if got, _ := AppendRecord(nil, &corpus.Occurrence{ID: "A1"}); string(got) != `{"id":"A1","source":"","narratives":[]}`+"\n" {
		t.Errorf("without narratives: %s", got)
	}
}

func TestContentHash(t *testing.T) {
	o := corpus.Occurrence{ID: "A1", Source: "hangar"}
	h := ContentHash(&o)
	// printf '{"id":"A1","source":"hangar","narratives":[]}\n' | sha256sum
	if got := hex.EncodeToString(h[:4]); got != "b4e19da2" {
		t.Errorf("got %s", got)
	}
	o.Extra = map[string]string{"a": "1"}
	if ContentHash(&o) == h {
		t.Error("an extra cell does not change the hash")
	}
}

// anyOccurrence draws an occurrence that a file could hold.
func anyOccurrence(t *rapid.T) *corpus.Occurrence {
	text := rapid.String()
	some := rapid.StringN(1, 12, -1)
	pick := func(words []string) string { return rapid.SampledFrom(append(words, "")).Draw(t, "word") }
	aircraft := rapid.Custom(func(t *rapid.T) corpus.Aircraft {
		return corpus.Aircraft{Make: text.Draw(t, "make"), Model: text.Draw(t, "model"), Category: text.Draw(t, "category"),
			Engines: rapid.IntRange(0, 8).Draw(t, "engines"), EngineType: text.Draw(t, "engine type")}
	})
	o := &corpus.Occurrence{
		ID: some.Draw(t, "id"), Source: some.Draw(t, "source"), Place: text.Draw(t, "place"), Country: text.Draw(t, "country"),
		Aircraft: aircraft.Draw(t, "first"), Operation: text.Draw(t, "operation"), Phase: text.Draw(t, "phase"),
		Injury: pick(severity["injury"]), Damage: pick(severity["damage"]), Event: pick(severity["event"]),
		Narratives: []corpus.Narrative{},
	}
	if year := rapid.IntRange(0, 9999).Draw(t, "year"); year > 0 {
		o.Date = corpus.Date{Year: year, Month: rapid.IntRange(0, 12).Draw(t, "month")}
		if o.Date.Month > 0 {
			o.Date.Day = rapid.IntRange(0, 28).Draw(t, "day")
		}
	}
	for range rapid.IntRange(0, 3).Draw(t, "narratives") {
		o.Narratives = append(o.Narratives, corpus.Narrative{Kind: rapid.SampledFrom(narrativeKinds).Draw(t, "kind"), Text: text.Draw(t, "text")})
	}
	for range rapid.IntRange(0, 2).Draw(t, "further") {
		o.Further = append(o.Further, aircraft.Draw(t, "further"))
	}
	for range rapid.IntRange(0, 2).Draw(t, "codes") {
		o.Codes = append(o.Codes, corpus.Code{Scheme: text.Draw(t, "scheme"), Code: text.Draw(t, "code"), Label: text.Draw(t, "label")})
	}
	if extra := rapid.MapOfN(text, text, 0, 3).Draw(t, "extra"); len(extra) > 0 {
		o.Extra = extra
	}
	return o
}

// What AppendRecord writes is read as the same occurrences, alone or in an
// array, and written again as the same bytes.
func TestRecordsRoundTrip(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		var lines []byte
		var want []*corpus.Occurrence
		for range rapid.IntRange(1, 4).Draw(rt, "records") {
			o := anyOccurrence(rt)
			want = append(want, o)
			var err error
			if lines, err = AppendRecord(lines, o); err != nil {
				rt.Fatal(err)
			}
		}
		array := append(append([]byte("["), bytes.ReplaceAll(bytes.TrimSuffix(lines, []byte("\n")), []byte("\n"), []byte(",\n"))...), ']')
		for _, text := range [][]byte{lines, array} {
			items, _, err := tryAll(t, string(text), Options{SpoolDir: "/nonexistent"})
			if err != nil || len(items) != len(want) {
				rt.Fatalf("%d items, %v", len(items), err)
			}
			var again []byte
			for i, it := range items {
				if !reflect.DeepEqual(it.Occurrence, want[i]) {
					rt.Fatalf("got  %+v %+v\nwant %+v", it.Occurrence, it.SetAside, want[i])
				}
				again, _ = AppendRecord(again, it.Occurrence)
			}
			if !bytes.Equal(again, lines) {
				rt.Fatalf("written again:\n%s\nnot\n%s", again, lines)
			}
		}
	})
}
