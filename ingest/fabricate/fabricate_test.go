package fabricate

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"regexp"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"

	"catena/classify/catalogue"
	"catena/ingest/corpus"
)

// headline are the factors that a corpus must hold in every assertion.
var headline = []string{
	"wrong-rudder", "checklist-skipped", "power-rollback", "slow-airspeed", "below-vmc", "power-loss",
	"simulated-failure", "stall", "directional-control-lost", "control-lost-in-flight", "control-lost-on-ground", "recovered",
}

var assertions = []corpus.Assertion{corpus.Affirmed, corpus.Denied, corpus.Possible, corpus.Advised, corpus.Elsewhere}

// bytesOf is the corpus of the options as it would be written.
func bytesOf(t *testing.T, o Options) []byte {
	t.Helper()
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	for occurrence, truth := range New(o).All() {
		if err := e.Encode([]any{occurrence, truth}); err != nil {
			t.Fatal(err)
		}
	}
	return b.Bytes()
}

func TestSameOptionsSameBytes(t *testing.T) {
	for _, o := range []Options{
		{Seed: 3, Count: 300},
		{Seed: 3, Count: 300, Doubles: 0.2, MeanBytes: 1685, IDs: ScenarioIDs},
		{Seed: 4, Count: 300, Doubles: 0.4, Edited: 0.5},
	} {
		first := bytesOf(t, o)
		if !bytes.Equal(first, bytesOf(t, o)) {
			t.Errorf("%+v: two makers differ", o)
		}
		o.Seed++
		if bytes.Equal(first, bytesOf(t, o)) {
			t.Errorf("%+v: another seed makes the same", o)
		}
	}
}

// checkTruth fails where a truth does not belong to its occurrence.
func checkTruth(t interface{ Errorf(string, ...any) }, o corpus.Occurrence, truth Truth) {
	if truth.ID != o.ID || truth.Source != o.Source {
		t.Errorf("truth of %s/%s beside %s/%s", truth.Source, truth.ID, o.Source, o.ID)
	}
	for _, n := range o.Narratives {
		if !utf8.ValidString(n.Text) || n.Text == "" {
			t.Errorf("%s: narrative is empty or no UTF-8", o.ID)
		}
		if strings.ContainsAny(n.Text, "[]{}<>|") || strings.Contains(n.Text, "  ") || strings.Contains(n.Text, " .") || strings.Contains(n.Text, "..") {
			t.Errorf("%s: grammar shows through: %s", o.ID, n.Text)
		}
	}
	affirmed := map[string]bool{}
	for _, g := range truth.Tags {
		if g.Narrative < 0 || g.Narrative >= len(o.Narratives) {
			t.Errorf("%s: tag in narrative %d of %d", o.ID, g.Narrative, len(o.Narratives))
			continue
		}
		text := o.Narratives[g.Narrative].Text
		if err := g.Span.Check(text); err != nil {
			t.Errorf("%s: %v", o.ID, err)
		} else if g.Quote == "" || g.Of(text) != g.Quote || strings.TrimSpace(g.Quote) != g.Quote {
			t.Errorf("%s: quote %q at %v of %q", o.ID, g.Quote, g.Span, text)
		}
		if g.Assertion == corpus.Affirmed {
			affirmed[g.Factor] = true
		}
	}
	for _, g := range truth.Tags {
		if g.Assertion != corpus.Denied && g.Assertion != corpus.Possible {
			continue
		}
		for f := range affirmed {
			if family[f]&family[g.Factor] != 0 {
				t.Errorf("%s: %s is %s while %s is affirmed", o.ID, g.Factor, g.Assertion, f)
			}
		}
	}
	if len(affirmed) != len(truth.Sequence) {
		t.Errorf("%s: affirmed %v, sequence %v", o.ID, affirmed, truth.Sequence)
	}
}

func TestTruthBelongsToText(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		o := Options{
			Seed:      rapid.Uint64().Draw(t, "seed"),
			Count:     rapid.IntRange(0, 60).Draw(t, "count"),
			MeanBytes: rapid.SampledFrom([]int{0, 0, 1, 500, 1685, 6000}).Draw(t, "bytes"),
			Doubles:   rapid.Float64Range(0, 0.5).Draw(t, "doubles"),
			Edited:    rapid.Float64Range(0, 1).Draw(t, "edited"),
			IDs:       rapid.SampledFrom([]IDs{"", RunningIDs, ScenarioIDs}).Draw(t, "ids"),
		}
		m := New(o)
		for range 60 {
			occurrence, truth := m.Next()
			checkTruth(t, occurrence, truth)
		}
	})
}

func TestSequenceIsTheChainInTime(t *testing.T) {
	m := New(Options{Seed: 11, Count: 3000})
	late := 0
	for range 3000 {
		p := m.draw()
		o, truth := m.tell(p, m.drawVoice(p))
		var want []string
		for _, s := range p.chain {
			want = append(want, s.factor)
		}
		told := 0 // every factor of the sequence stands in the chain, in order
		for _, f := range truth.Sequence {
			i := slices.Index(want[told:], f)
			if i < 0 {
				t.Fatalf("%s: sequence %v, chain %v", o.ID, truth.Sequence, want)
			}
			told += i + 1
		}
		if truth.Voice != Remark && len(truth.Sequence) != len(want) {
			t.Errorf("%s (%s): told %v of %v", o.ID, truth.Voice, truth.Sequence, want)
		}
		var text []string // first mentions in order of the text
		for _, g := range truth.Tags {
			if g.Assertion == corpus.Affirmed && !slices.Contains(text, g.Factor) {
				text = append(text, g.Factor)
			}
		}
		if !slices.Equal(text, truth.Sequence) {
			late++
		}
	}
	if late == 0 {
		t.Error("no narrative tells a factor out of its time")
	}
}

func TestEveryFactorInEveryAssertion(t *testing.T) {
	tree := catalogue.Builtin()
	seen := map[string]int{}
	voices := map[Voice]bool{}
	for _, truth := range New(Options{Seed: 5, Count: 20000}).All() {
		voices[truth.Voice] = true
		for _, g := range truth.Tags {
			seen[g.Factor+" "+string(g.Assertion)]++
			if _, ok := tree.Factor(g.Factor); !ok {
				t.Fatalf("factor %q stands in no catalogue", g.Factor)
			}
		}
	}
	for _, f := range headline {
		for _, a := range assertions {
			if seen[f+" "+string(a)] == 0 {
				t.Errorf("%s is never %s", f, a)
			}
		}
	}
	for f := range affirmedKey {
		if seen[f+" affirmed"] == 0 {
			t.Errorf("%s is never affirmed", f)
		}
	}
	if len(voices) != 4 {
		t.Errorf("voices %v, want four", voices)
	}
}

func TestAThirdCarryATrap(t *testing.T) {
	const n = 10000
	with, words := 0, map[string]int{}
	for _, truth := range New(Options{Seed: 2, Count: n}).All() {
		trapped := len(truth.Traps) > 0
		for _, g := range truth.Tags {
			trapped = trapped || g.Assertion != corpus.Affirmed
		}
		for _, w := range truth.Traps {
			words[w]++
		}
		if trapped {
			with++
		}
	}
	if share := float64(with) / n; share < 0.26 || share > 0.40 {
		t.Errorf("share of narratives with a trap = %.3f, want about a third", share)
	}
	for _, w := range lexicalTraps {
		if words[w.factor] == 0 {
			t.Errorf("trap %s is never set", w.factor)
		}
	}
}

// expansions counts the wordings of a clause, slots counted once.
func expansions(list []node) int {
	n := 1
	for _, x := range list {
		sum := 0
		for _, c := range x.choices {
			sum += expansions(c)
		}
		n *= max(sum, 1)
	}
	return n
}

func TestGrammarIsRich(t *testing.T) {
	count := func(key string, f form) (clauses, wordings int) {
		g := language.groups[key]
		if g == nil {
			t.Fatalf("no heading %q", key)
		}
		for _, c := range g[f] {
			wordings += expansions(c.body)
		}
		return len(g[f]), wordings
	}
	for _, f := range []form{formInvestigator, formFirst} {
		if n, _ := count("opening", f); n < 12 {
			t.Errorf("form %d has %d openings, want 12", f, n)
		}
		for _, factor := range headline {
			for _, a := range assertions {
				if _, n := count(factor+" "+string(a), f); n < 10 {
					t.Errorf("%s %s has %d wordings in form %d, want 10", factor, a, n, f)
				}
			}
		}
	}
}

func TestLongNarrativesDoNotLookAlike(t *testing.T) {
	texts, starts := map[string]int{}, map[string]int{}
	long := 0
	for o, truth := range New(Options{Seed: 9, Count: 10000}).All() {
		text := o.Narratives[0].Text
		if truth.Voice == Remark {
			continue
		}
		long++
		texts[text]++
		starts[text[:60]]++
	}
	if len(texts) != long {
		t.Errorf("%d of %d long narratives are the same as another", long-len(texts), long)
	}
	if share := float64(len(starts)) / float64(long); share < 0.5 {
		t.Errorf("only %.2f of the first sixty bytes differ", share)
	}
}

func TestMeanBytes(t *testing.T) {
	for _, want := range []int{900, 1685, 2500} {
		const n = 6000
		sum := 0
		for o := range New(Options{Seed: 4, Count: n, MeanBytes: want}).All() {
			for _, x := range o.Narratives {
				sum += len(x.Text)
			}
		}
		if mean := float64(sum) / n; math.Abs(mean-float64(want)) > 0.06*float64(want) {
			t.Errorf("mean length %.0f bytes, want %d within 6%%", mean, want)
		}
	}
}

func TestRemarksAreCutAtTheSameLength(t *testing.T) {
	cut := 0
	for o, truth := range New(Options{Seed: 6, Count: 8000}).All() {
		if text := o.Narratives[0].Text; truth.Voice == Remark && !strings.HasSuffix(text, ".") {
			cut++
			if n := utf8.RuneCountInString(text); n != cutAt {
				t.Errorf("%s: cut at %d characters: %s", o.ID, n, text)
			}
		}
	}
	if cut == 0 {
		t.Error("no remark is cut off")
	}
}

func TestDates(t *testing.T) {
	from, to := corpus.Date{Year: 2021, Month: 3, Day: 10}, corpus.Date{Year: 2021, Month: 5}
	_, end := to.Bounds()
	last, coarse := corpus.Date{}, 0
	for o := range New(Options{Seed: 1, Count: 900, From: from, To: to}).All() {
		if o.Date.Precision() == corpus.ToMonth {
			coarse++
			continue
		}
		if o.Date.Compare(from) < 0 || o.Date.Compare(end) > 0 {
			t.Fatalf("date %s lies outside %s to %s", o.Date, from, to)
		}
		if o.Date.Compare(last) < 0 {
			t.Fatalf("date %s comes after %s", o.Date, last)
		}
		last = o.Date
	}
	if coarse == 0 || coarse > 90 {
		t.Errorf("%d of 900 dates are coarse, want a few", coarse)
	}
	if last.Compare(corpus.Date{Year: 2021, Month: 5, Day: 29}) < 0 {
		t.Errorf("last date %s, want the end of May", last)
	}
}

func TestShiftsPlantATrend(t *testing.T) {
	omitted := func(shifts []Shift, year int) (n int) {
		o := Options{Seed: 8, Count: 20000, Shifts: shifts}
		for occurrence, truth := range New(o).All() {
			if occurrence.Place == "Sellow" && occurrence.Date.Year == year &&
				slices.ContainsFunc(truth.Sequence, func(f string) bool { return strings.HasPrefix(f, "checklist-") && f != "checklist-used" }) {
				n++
			}
		}
		return n
	}
	if before, after := omitted(nil, 2021), omitted(nil, 2025); after < 2*before {
		t.Errorf("omitted checks at Sellow: %d in 2021, %d in 2025; want a rise", before, after)
	}
	if before, after := omitted([]Shift{}, 2021), omitted([]Shift{}, 2025); after > before*3/2 {
		t.Errorf("without shifts: %d in 2021, %d in 2025; want them level", before, after)
	}
}

// An edited double keeps much of the wording, never all of it, and what shows
// its factors.
func TestEditedDoubles(t *testing.T) {
	earlier := map[string]corpus.Occurrence{}
	n := 0
	for o, truth := range New(Options{Seed: 12, Count: 4000, MeanBytes: 1685, Doubles: 0.1, Edited: 1}).All() {
		if truth.DoubleOf != "" {
			n++
			checkTruth(t, o, truth)
			first := earlier[truth.DoubleOf].Narratives[0].Text
			kept := 0
			for _, s := range strings.SplitAfter(first, ". ") {
				if strings.Contains(o.Narratives[0].Text, s) {
					kept += len(s)
				}
			}
			if first == o.Narratives[0].Text && len(first) > 400 || kept == 0 && len(first) > 1200 {
				t.Errorf("%s keeps %d of %d bytes of %s", o.ID, kept, len(first), truth.DoubleOf)
			}
		}
		earlier[o.ID] = o
	}
	if n < 250 {
		t.Errorf("%d edited doubles of 4,000, want about 400", n)
	}
}

func TestDoubles(t *testing.T) {
	const n = 4000
	earlier := map[string]corpus.Occurrence{}
	doubles := 0
	for o, truth := range New(Options{Seed: 12, Count: n, Doubles: 0.1}).All() {
		if truth.DoubleOf != "" {
			doubles++
			first, ok := earlier[truth.DoubleOf]
			if !ok || first.Source == o.Source || first.Date != o.Date || first.Place != o.Place || first.Model != o.Model {
				t.Fatalf("%s retells %s: %+v after %+v", o.ID, truth.DoubleOf, o, first)
			}
			if first.Narratives[0].Text == o.Narratives[0].Text {
				t.Errorf("%s repeats %s word by word", o.ID, truth.DoubleOf)
			}
		}
		earlier[o.ID] = o
	}
	if share := float64(doubles) / n; share < 0.07 || share > 0.12 {
		t.Errorf("share of doubles %.3f, want about 0.1", share)
	}
}

func TestIDs(t *testing.T) {
	for ids, pattern := range map[IDs]string{
		RunningIDs:  `^F-\d{6}$`,
		ScenarioIDs: `^(T|S|HT-)\d\d-[2-9]\d\d$`,
	} {
		seen := map[string]bool{}
		for o := range New(Options{Seed: 1, Count: 2000, IDs: ids}).All() {
			key := o.Source + "/" + o.ID
			if seen[key] || !regexp.MustCompile(pattern).MatchString(o.ID) {
				t.Errorf("id %s stands twice or has no form %s", key, pattern)
			}
			seen[key] = true
		}
	}
}

func TestNobodyReportsAFatalAccidentInPerson(t *testing.T) {
	for o, truth := range New(Options{Seed: 13, Count: 8000, Doubles: 0.3}).All() {
		if (o.Injury == "fatal" || o.Injury == "serious") && truth.Voice.voluntary() {
			t.Fatalf("%s: %s in voice %s", o.ID, o.Injury, truth.Voice)
		}
		if truth.Voice.voluntary() != (o.Source == voluntary && o.Event == "report") {
			t.Fatalf("%s: voice %s in %s as %s", o.ID, truth.Voice, o.Source, o.Event)
		}
	}
}

func TestExposure(t *testing.T) {
	o := Options{Seed: 1}
	list := o.Exposure()
	if len(list) != 84*len(bases) {
		t.Fatalf("%d rows, want 84 months of %d bases", len(list), len(bases))
	}
	byName := map[string]*base{}
	for _, b := range bases {
		byName[b.name] = b
	}
	for _, e := range list {
		b := byName[e.Strata["place"]]
		if e.Covers != b.source || e.Hours < b.lowHours || e.Hours > b.highHours || e.Departures <= 0 {
			t.Errorf("row %+v does not fit %s", e, b.name)
		}
	}
	part := Options{Seed: 1, From: corpus.Date{Year: 2024, Month: 7, Day: 20}, To: corpus.Date{Year: 2024, Month: 8}}.Exposure()
	if len(part) != 2*len(bases) {
		t.Fatalf("%d rows for two months", len(part))
	}
	whole := slices.IndexFunc(list, func(e corpus.Exposure) bool { return e.Period.String() == "2024-07" })
	if part[0].Hours != list[whole].Hours {
		t.Errorf("hours of July 2024 depend on the stretch: %v and %v", part[0].Hours, list[whole].Hours)
	}
	var b bytes.Buffer
	if err := WriteExposure(&b, part); err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(b.String(), "\n")
	want := fmt.Sprintf("2024-07,%v,%v,tarnwick,Tarnwick", part[0].Hours, part[0].Departures)
	if lines[0] != "period,hours,departures,covers,place" || lines[1] != want {
		t.Errorf("exposure file begins\n%s\n%s\nwant\n%s", lines[0], lines[1], want)
	}
}

func TestCheckRefuses(t *testing.T) {
	for name, o := range map[string]Options{
		"count below 0":    {Count: -1},
		"negative length":  {MeanBytes: -1},
		"doubles over":     {Doubles: 0.6},
		"doubles unknown":  {Doubles: math.NaN()},
		"unknown ids":      {IDs: "roman"},
		"no such day":      {From: corpus.Date{Year: 2021, Month: 2, Day: 30}},
		"end before start": {From: corpus.Date{Year: 2022}, To: corpus.Date{Year: 2021}},
		"unknown event":    {Shifts: []Shift{{Event: "meteor", Times: 2}}},
		"unknown base":     {Shifts: []Shift{{Place: "Nowhere", Times: 2}}},
		"factor below 0":   {Shifts: []Shift{{Times: -2}}},
	} {
		if o.Check() == nil {
			t.Errorf("%s: no error", name)
		}
		occurrence, truth := New(o).Next() // and New makes do with it
		checkTruth(t, occurrence, truth)
	}
	if err := (Options{Count: 5, From: corpus.Date{Year: 2030}, Shifts: DefaultShifts()}).Check(); err != nil {
		t.Errorf("good options: %v", err)
	}
}

func TestNoEventsLeft(t *testing.T) {
	m := New(Options{Seed: 1, Count: 10, Shifts: []Shift{{Times: 0}}})
	for range 10 {
		o, truth := m.Next()
		checkTruth(t, o, truth)
	}
}

func TestGrammarFaults(t *testing.T) {
	for name, text := range map[string]string{
		"no heading":        "i: a clause",
		"no colon":          "== a b\njust words",
		"unknown voice":     "== a b\nx: words",
		"unknown condition": "== a b\ni.moon: words",
		"open choice":       "== a b\ni: [one|two",
		"open span":         "== a b\ni: <one",
		"empty span":        "== a b\ni: <>",
		"unknown slot":      "== a b\ni: {moon}",
		"lone bracket":      "== a b\ni: one] two",
		"heading twice":     "== a b\n== a b",
	} {
		g := &grammar{groups: map[string]*group{}}
		if err := g.add("test", text); err == nil || !strings.HasPrefix(err.Error(), "test:") {
			t.Errorf("%s: error %v, want one with the line", name, err)
		}
	}
}

func TestAbbreviations(t *testing.T) {
	for in, want := range map[string]string{
		"the engine was left running":   "ENG WAS LEFT RUNNING",
		"above the runway, 300 feet":    "ABOVE RWY, 300 FT",
		"the":                           "THE",
		"a café by the approach lights": "A CAFÉ BY APCH LIGHTS",
	} {
		if got := styledOf(in)[abbreviate]; got != want {
			t.Errorf("%q becomes %q, want %q", in, got, want)
		}
	}
}

func BenchmarkNext(b *testing.B) {
	m := New(Options{Seed: 1, MeanBytes: 1685})
	n := 0
	for b.Loop() {
		o, _ := m.Next()
		for _, x := range o.Narratives {
			n += len(x.Text)
		}
	}
	b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "records/s")
	b.ReportMetric(float64(n)/float64(b.N), "bytes/record")
}
