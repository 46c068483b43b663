package text

import (
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/jdkato/prose/v2"
)

func sentencesOf(t *testing.T, s string) []string {
	t.Helper()
	var out []string
	for _, x := range NewLexicon().Analyse(s).Sentences {
		out = append(out, x.Of(s))
	}
	return out
}

func TestSentences(t *testing.T) {
	for _, c := range []struct {
		name string
		want []string // joined by a space they are the text
	}{
		{"plain", []string{"The trainer swung.", "It stopped on the grass."}},
		{"number of an engine", []string{"The No. 2 engine ran rough.", "The crew shut it down."}},
		{"approximate figure", []string{"It climbed to approx. 400 ft. above the field and levelled."}},
		{"feet end a sentence", []string{"He levelled at 400 ft.", "The tower called."}},
		{"decimals", []string{"The tank held 2.5 gal. of fuel.", "That was too little."}},
		{"initials", []string{"The owner, J. Harrow, flew it.", "He had 300 hours."}},
		{"capitals", []string{"ACFT SWERVED R.", "STOPPED IN GRASS."}},
		{"question", []string{"Was it the wind?", "Nobody knew."}},
		{"quotation", []string{`He said "my controls."`, "She let go."}},
	} {
		if got := sentencesOf(t, strings.Join(c.want, " ")); !slices.Equal(got, c.want) {
			t.Errorf("%s: got %q, want %q", c.name, got, c.want)
		}
	}
	glued := "TUG MOVED OFF TOO SOON.GLIDER TIPPED."
	if got := sentencesOf(t, glued); len(got) != 2 {
		t.Errorf("a full stop glued to the next word: got %q", got)
	}
	if got := sentencesOf(t, "First line of a list\n\n2. Second item"); len(got) != 2 {
		t.Errorf("a blank line must end a sentence: got %q", got)
	}
}

func words(l *Lexicon, s string) string {
	var out []string
	for _, t := range l.Analyse(s).Tokens {
		if w := l.Name(t.Word); w != "" {
			out = append(out, w)
		} else {
			out = append(out, s[t.Start:t.End])
		}
	}
	return strings.Join(out, " ")
}

func TestNormalForm(t *testing.T) {
	l := NewLexicon()
	l.Words("did can takeoff engine left rudder aircraft pilot")
	for text, want := range map[string]string{
		"take-off, TAKE OFF, takeoff, TKOF": "takeoff takeoff takeoff takeoff",
		"didn't can't didn’t":               "did not can not did not",
		"the pilot's ACFT":                  "the pilot aircraft",
		"L ENG and R RUDDER":                "left engine and right rudder",
		"RWY 25 L IN USE":                   "runway 25 L in USE",
		"No. 1, #2, number one, NR1":        "no1 no2 no1 no1",
		"no one noticed":                    "no one noticed",
		"carburettor":                       "carburetor",
		"71kts and 71 KIAS":                 "71 knots and 71 knots",
		"1,200 ft at 2.5 nm":                "1,200 feet at 2.5 nm",
	} {
		if got := words(l, text); got != want {
			t.Errorf("%q: got %q, want %q", text, got, want)
		}
	}
}

func TestCapitals(t *testing.T) {
	for text, want := range map[string]bool{
		"ACFT LOST PWR ON CLB OUT. RETURNED.": true, "The ACFT lost power.": false, "OK": false, "": false,
	} {
		if got := NewLexicon().Analyse(text).Capitals; got != want {
			t.Errorf("%q: capitals %v, want %v", text, got, want)
		}
	}
}

func checkDoc(t *testing.T, l *Lexicon, s string) {
	t.Helper()
	d := l.Analyse(s)
	last := 0
	for i, tok := range d.Tokens {
		if tok.Start < 0 || tok.End > len(s) || tok.Start >= tok.End {
			t.Fatalf("token %d: %d-%d in %d bytes", i, tok.Start, tok.End, len(s))
		}
		if tok.Start < last {
			t.Fatalf("token %d begins at %d, before the token before it (%d)", i, tok.Start, last)
		}
		last = tok.Start
		if utf8.ValidString(s) && (!utf8.RuneStart(s[tok.Start]) || tok.End < len(s) && !utf8.RuneStart(s[tok.End])) {
			t.Fatalf("token %d cuts a character: %q", i, s[tok.Start:tok.End])
		}
	}
	next := 0
	for i, x := range d.Sentences {
		if x.First != next || x.Last <= x.First {
			t.Fatalf("sentence %d covers tokens %d-%d, want it to begin at %d", i, x.First, x.Last, next)
		}
		next = x.Last
		if utf8.ValidString(s) {
			if err := x.Check(s); err != nil {
				t.Fatalf("sentence %d: %v", i, err)
			}
		}
		if d.Sentence(x.First) != i || d.Sentence(x.Last-1) != i {
			t.Fatalf("sentence %d is not found by its tokens", i)
		}
	}
	if next != len(d.Tokens) {
		t.Fatalf("%d of %d tokens stand in sentences", next, len(d.Tokens))
	}
}

func FuzzAnalyse(f *testing.F) {
	for _, s := range []string{"", "Don’t. No. 1 #2 71kts", "ÉTÉ 5° – “x”", "\xff\xfe n't", "a.b.C d", "L R L ENG", strings.Repeat("(", 50)} {
		f.Add(s)
	}
	l := NewLexicon()
	l.Words("engine left takeoff")
	f.Fuzz(func(t *testing.T, s string) {
		checkDoc(t, l, s)
		if d := l.Analyse(s); len(d.Tokens) > 0 && len(s) < 500 {
			d.Tag(0) // any bytes: no panic
		}
	})
}

// The decoder must agree with the library whose model it reads. The library
// breaks ties by map order, so a word in a thousand may differ.
func TestTagsAgreeWithProse(t *testing.T) {
	const s = "The student held the wrong rudder and the airplane rolled left toward the dead engine . " +
		"We lowered the nose quickly , regained control at two hundred feet and returned for a normal landing . " +
		"No evidence of a mechanical fault was found during the later inspection ."
	doc, err := prose.NewDocument(s, prose.WithExtraction(false), prose.WithSegmentation(false))
	if err != nil {
		t.Fatal(err)
	}
	var words, want []string
	for _, tok := range doc.Tokens() {
		words, want = append(words, tok.Text), append(want, tok.Tag)
	}
	differ := 0
	for i, tag := range loadTagger().tag(words) {
		if string(tag) != want[i] {
			differ++
			t.Logf("%q: %s here, %s there", words[i], tag, want[i])
		}
	}
	if differ > 1 {
		t.Errorf("%d of %d words are tagged otherwise than by the library", differ, len(words))
	}
}

func TestTagIsDeterministic(t *testing.T) {
	l := NewLexicon()
	l.Words("stalled stall")
	const s = "THE GLIDER STALLED AT TEN FEET. It did not stall again, and the stall was gentle."
	first := l.Analyse(s)
	for range 20 {
		again := l.Analyse(s)
		for i := range first.Tokens {
			if first.Tag(i) != again.Tag(i) {
				t.Fatalf("token %d: %s, then %s", i, first.Tag(i), again.Tag(i))
			}
		}
	}
	if tag := first.Tag(2); !tag.Verb() {
		t.Errorf("STALLED is tagged %s in a text of capitals, want a verb", tag)
	}
}

func BenchmarkAnalyse(b *testing.B) {
	l := NewLexicon()
	l.Words("engine left takeoff rudder stalled")
	s := strings.Repeat("After take-off the left engine lost power and the pilot's airspeed decayed; he didn't lower the nose. ", 17)
	b.SetBytes(int64(len(s)))
	for b.Loop() {
		l.Analyse(s)
	}
}
