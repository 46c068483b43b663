package classify

import (
	"reflect"
	"strings"
	"sync"
	"testing"
	"unicode/utf8"

	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

func classifier(t testing.TB) *Classifier {
	t.Helper()
	book, err := rulebook.Builtin()
	if err != nil {
		t.Fatal(err)
	}
	return New(book)
}

func TestExamplesOfTheBook(t *testing.T) {
	for _, fault := range CheckExamples(classifier(t).Book()) {
		t.Error(fault)
	}
}

func tagged(t *testing.T, narratives ...corpus.Narrative) corpus.Tagged {
	t.Helper()
	return classifier(t).Tag(&corpus.Occurrence{ID: "x", Narratives: narratives})
}

func TestAssertions(t *testing.T) {
	for _, c := range []struct{ text, factor, want string }{
		{"The glider stalled at sixty feet.", "stall", "affirmed"},
		{"The glider did not stall.", "stall", "denied"},
		{"It did not recover from the stall.", "stall", "affirmed"},
		{"The aircraft entered a stall but did not spin.", "stall", "affirmed"},
		{"No evidence of a loss of engine power was found.", "power-loss", "denied"},
		{"A loss of engine power was ruled out.", "power-loss", "denied"},
		{"The engine may have lost power.", "power-loss", "possible"},
		{"A loss of power could not be ruled out.", "power-loss", "possible"},
		{"Pilots should expect a loss of power here.", "power-loss", "advised"},
		{"If the engine fails, lower the nose.", "power-loss", "advised"},
		{"On an earlier flight the engine had lost power.", "power-loss", "elsewhere"},
		{"The student failed to maintain airspeed.", "slow-airspeed", "affirmed"},
		{"At no time did the student fail to maintain airspeed.", "slow-airspeed", "denied"},
		{"Had he lowered the nose, he would have avoided a stall; the airplane stalled at forty feet.", "stall", "advised"},
		{"Not only did the airspeed decay, the wing stalled too.", "stall", "affirmed"},
		// traps of the words
		{"Day VMC prevailed and the flight was below cloud.", "below-vmc", ""},
		{"The compressor stalled with a bang.", "stall", ""},
		{"The stall warning sounded.", "stall", ""},
		{"We lost approach control on the second frequency.", "control-lost-in-flight", ""},
		{"The tug rolled back against the chocks.", "power-rollback", ""},
		{"A simulated engine failure was given at circuit height.", "power-loss", ""},
	} {
		got := ""
		for _, tag := range tagged(t, corpus.Narrative{Kind: "factual", Text: c.text}).Tags {
			if tag.Factor == c.factor {
				got = string(tag.Assertion)
				break
			}
		}
		if got != c.want {
			t.Errorf("%s in %q: %q, want %q", c.factor, c.text, got, c.want)
		}
	}
}

func TestCauseStatementAffirmsWhatItOffers(t *testing.T) {
	text := "A possible loss of power on the left engine."
	for kind, want := range map[string]corpus.Assertion{"cause": corpus.Affirmed, "factual": corpus.Possible} {
		tags := tagged(t, corpus.Narrative{Kind: kind, Text: text}).Tags
		if len(tags) == 0 || tags[0].Assertion != want {
			t.Errorf("%s: %+v, want %s", kind, tags, want)
		}
	}
}

func path(c corpus.Chain) string {
	var out []string
	for _, l := range c.Links {
		out = append(out, l.Factor)
	}
	return strings.Join(out, " ")
}

func TestChainOrder(t *testing.T) {
	for _, c := range []struct{ text, want, outcome, broken string }{
		{"The left engine quit. The airspeed decayed and the aircraft stalled.", "power-loss-total slow-airspeed stall", "stall", ""},
		{"The aircraft stalled due to the student's failure to maintain airspeed.", "slow-airspeed stall", "stall", ""},
		{"After the engine failure the airspeed decayed.", "power-loss slow-airspeed", "", ""},
		{"The aircraft stalled. The instructor regained control.", "stall recovered", "stall", "recovered"},
		{"The student lost directional control on the landing roll.", "directional-control-lost control-lost-on-ground", "control-lost-on-ground", ""},
		{"The wing did not stall.", "", "", ""},
	} {
		got := tagged(t, corpus.Narrative{Kind: "factual", Text: c.text}).Chain
		if path(got) != c.want || got.Outcome != c.outcome || got.BrokenBy != c.broken {
			t.Errorf("%q: %q, outcome %q, broken by %q; want %q, %q, %q", c.text, path(got), got.Outcome, got.BrokenBy, c.want, c.outcome, c.broken)
		}
	}
}

func TestCauseStatementIsFoldedIn(t *testing.T) {
	got := tagged(t,
		corpus.Narrative{Kind: "cause", Text: "The pilot's failure to maintain airspeed, which resulted in a stall."},
		corpus.Narrative{Kind: "factual", Text: "The right engine failed at 300 feet. The aircraft entered a stall."})
	if want := "power-loss slow-airspeed stall"; path(got.Chain) != want {
		t.Errorf("chain %q, want %q", path(got.Chain), want)
	}
	for _, l := range got.Chain.Links {
		if tag := got.Tags[l.Tag]; tag.Factor != l.Factor || tag.Assertion != corpus.Affirmed {
			t.Errorf("link %+v points at %+v", l, tag)
		}
	}
}

// Engine No. 1 of a twin is the left one (common practice, no source).
func TestSides(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine quit.": "left", "R ENG FAILED AFTER TKOF.": "right", "The No. 1 engine lost power.": "left",
		"Loss of power on the right engine.": "right", "The engine quit.": "", "The left and the right engine lost power.": "",
	} {
		tags := tagged(t, corpus.Narrative{Text: text}).Tags
		if len(tags) == 0 || tags[0].Side != want {
			t.Errorf("%q: %+v, want side %q", text, tags, want)
		}
	}
}

// Speeds are compared only airborne, with thrust asymmetric, in one unit.
func TestBelowByNumbers(t *testing.T) {
	for text, want := range map[string]float64{
		"The left engine quit. Vmc is 84 knots. The airspeed fell to 71 knots and the nose swung.":             71,
		"The left engine quit. The published Vmca was 84 kt. The speed was 90 knots.":                          0,
		"Vmc is 84 knots. The airspeed was 71 knots. Then the left engine quit.":                               0,
		"The left engine quit on the take-off roll at 71 knots. Vmc is 84 knots.":                              0,
		"The left engine quit. Vmc is 84 knots. The airspeed fell to 71 mph.":                                  0,
		"The left engine quit. Vmc is 84 knots. At no time did the speed fall to 71 knots.":                    0,
		"The left engine quit. Vmc is 84 knots, or Vmc is 88 knots by the newer book. The speed was 80 knots.": 0,
	} {
		got := 0.0
		for _, tag := range tagged(t, corpus.Narrative{Text: text}).Tags {
			if q := tag.Quantity; tag.Factor == "below-vmc" && tag.Basis == corpus.Inferred && q.Limit == 84 && q.LimitKind == "vmc" {
				got = q.Value
			}
		}
		if got != want {
			t.Errorf("%q: %v, want %v", text, got, want)
		}
	}
	single := corpus.Occurrence{Aircraft: corpus.Aircraft{Engines: 1}, Narratives: []corpus.Narrative{{Text: "The left engine quit. Vmc is 84 knots. The airspeed fell to 71 knots."}}}
	for _, tag := range classifier(t).Tag(&single).Tags {
		if tag.Basis == corpus.Inferred {
			t.Errorf("a single has no dead side: %+v", tag)
		}
	}
}

// Common practice, no source: a failed left engine yaws and rolls the aircraft
// left; rudder on the live side is right, on the dead side wrong.
func TestDeadSide(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine quit. The aircraft yawed left. The student pressed the left pedal.":    "roll-toward-dead-engine rudder-wrong-side",
		"The left engine quit. The aircraft rolled right. The student pressed the right pedal.": "",
		"The No. 2 engine failed. The right wing dropped.":                                      "roll-toward-dead-engine",
		"Both engines quit, first the left engine, and the right engine failed. It yawed left.": "",
		"The left engine failed in reverse. The aircraft yawed left.":                           "",
	} {
		var got []string
		for _, tag := range tagged(t, corpus.Narrative{Text: text}).Tags {
			if tag.Basis == corpus.Inferred {
				got = append(got, tag.Factor)
			}
		}
		if strings.Join(got, " ") != want {
			t.Errorf("%q: %v, want %s", text, got, want)
		}
	}
}

func TestNothingFoundIsEmptyNotNull(t *testing.T) {
	got := tagged(t)
	if got.Tags == nil || got.Chain.Links == nil || got.Rulebook == "" {
		t.Errorf("%+v", got)
	}
}

// The same book and text give the same tags, from any number of goroutines.
func TestConcurrentUse(t *testing.T) {
	c := classifier(t)
	o := &corpus.Occurrence{Narratives: []corpus.Narrative{{Text: "The glider stalled. The engine may have lost power, and control was lost in cloud. We recovered."}}}
	want := c.Tag(o)
	var wg sync.WaitGroup
	for range 8 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for range 50 {
				if got := c.Tag(o); !reflect.DeepEqual(got, want) {
					t.Errorf("%+v, want %+v", got, want)
					return
				}
			}
		}()
	}
	wg.Wait()
}

func FuzzTag(f *testing.F) {
	for _, s := range []string{"The left engine quit; it may have stalled.", "ACFT LOST PWR\nL ENG – NO STALL", "\xff stall n't", strings.Repeat("no stall ", 60)} {
		f.Add(s)
	}
	c := classifier(f)
	f.Fuzz(func(t *testing.T, s string) {
		got := c.Tag(&corpus.Occurrence{Narratives: []corpus.Narrative{{Text: s}}})
		for _, tag := range got.Tags {
			if tag.Start < 0 || tag.End > len(s) || tag.Quote != s[tag.Start:tag.End] || tag.Strength < 0 || tag.Strength > 1 {
				t.Fatalf("%+v in %q", tag, s)
			}
			if utf8.ValidString(s) {
				if err := tag.Check(s); err != nil {
					t.Fatal(err)
				}
			}
		}
		for _, l := range got.Chain.Links {
			if l.Tag < 0 || l.Tag >= len(got.Tags) || got.Tags[l.Tag].Assertion != corpus.Affirmed {
				t.Fatalf("link %+v of %+v", l, got.Tags)
			}
		}
	})
}

// The yardstick is plain tokenising of the same text in the same run.
func BenchmarkTag(b *testing.B) {
	c := classifier(b)
	text := strings.Repeat("After take-off number four the pilot turned toward the field and spoke to the tower about the weather. ", 14) +
		"The left engine lost power, the airspeed decayed and the airplane stalled, but the instructor regained control."
	o := &corpus.Occurrence{Narratives: []corpus.Narrative{{Text: text}}}
	c.Tag(o) // loads the model
	b.Run("tokens", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		for b.Loop() {
			c.book.Lexicon.Analyse(text)
		}
	})
	b.Run("tags", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		for b.Loop() {
			c.Tag(o)
		}
	})
}
