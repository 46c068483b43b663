package rulebook

import (
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"catena/classify/catalogue"
)

func TestInflect(t *testing.T) {
	for base, want := range map[string]string{
		"fail": "fail fails failed failing", "lose": "lose loses lost losing", "veer": "veer veers veered veering",
		"stall": "stall stalls stalled stalling", "apply": "apply applies applied applying", "skip": "skip skips skipped skipping",
		"use": "use uses used using", "miss": "miss misses missed missing", "control": "control controls controlled controlling",
		"simulat": "simulate simulates simulated simulating simulation", "inadvertent": "inadvertent inadvertents inadvertented inadvertenting inadvertently", "carry": "carry carries carried carrying", "reduce": "reduce reduces reduced reducing",
	} {
		if got := strings.Join(Inflect(base), " "); !strings.HasPrefix(got+" ", want+" ") {
			t.Errorf("%s: %s, want %s", base, got, want)
		}
	}
}

// book compiles one rule that looks for a pattern.
func book(t *testing.T, pattern, more string) *Book {
	t.Helper()
	b, err := probe(pattern, more)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func probe(pattern, more string) (*Book, error) {
	file := "terms:\n  machine: [glider, \"tug plane\"]\n" + more + "factor: stall\nrules:\n  - rule: probe\n    look for: [" +
		pattern + "]\n    match: [x]\n"
	return Load(catalogue.Builtin(), fstest.MapFS{"probe.yaml": {Data: []byte(file)}})
}

func TestPatterns(t *testing.T) {
	for _, c := range []struct{ name, pattern, text, want string }{
		{"words in a row", `"nose dropped"`, "The nose dropped at once.", "nose dropped"},
		{"forms of a verb", `"drop~"`, "It drops, then dropped.", "drops; dropped"},
		{"a term", `"{machine} dropped"`, "The tug plane dropped.", "tug plane dropped"},
		{"one of several", `"(left|right) wing"`, "The right wing, the left wing.", "right wing; left wing"},
		{"something or nothing", `"left? wing dropped"`, "A left wing dropped; a wing dropped.", "left wing dropped; wing dropped; wing dropped"},
		{"a gap", `"nose ..2 dropped"`, "The nose very suddenly dropped.", "nose very suddenly dropped"},
		{"a gap in a choice", `"(nose ..2 dropped|rose)"`, "It rose, then the nose suddenly dropped.", "rose; nose suddenly dropped"},
		{"a gap too wide", `"nose ..2 dropped"`, "The nose all at once dropped.", ""},
		{"a gap stops at a comma", `"nose ..3 dropped"`, "The nose, it dropped.", ""},
		{"a wide gap does not", `"nose ...3 dropped"`, "The nose, it dropped.", "nose, it dropped"},
		{"not beyond the sentence", `"nose ...5 dropped"`, "He held the nose. It dropped.", ""},
		{"a number", `"at # knots"`, "It flew at 71 kt and at speed.", "at 71 kt"},
		{"what to show", `"the [ nose dropped ]"`, "Then the nose dropped.", "nose dropped"},
		{"a part of speech", `"stall:verb"`, "Gliders stall. The stall was gentle.", "stall"},
		{"any spelling", `"takeoff"`, "Take-off, TKOF and take off.", "Take-off; TKOF; take off"},
	} {
		b := book(t, c.pattern, "")
		d := b.Lexicon.Analyse(c.text)
		var got []string
		for _, s := range d.Sentences {
			b.FindRules(d, s, func(r *Rule, m Match) {
				if r.ID == "stall/probe" {
					got = append(got, m.Shown.Of(c.text))
				}
			})
		}
		if g := strings.Join(got, "; "); g != c.want {
			t.Errorf("%s: %s in %q: got %q, want %q", c.name, c.pattern, c.text, g, c.want)
		}
	}
}

func TestFaultsNameFileAndLine(t *testing.T) {
	for name, c := range map[string]struct{ pattern, more, want string }{
		"unknown term":        {`"{machin} dropped"`, "", `probe.yaml:6: no term is called "machin"; did you mean "machine"?`},
		"open bracket":        {`"(a|b dropped"`, "", "probe.yaml:6: pattern"},
		"begins with a gap":   {`"..3 dropped"`, "", "begin with a word"},
		"nothing must stand":  {`"dropped?"`, "", "nothing in it must stand there"},
		"gap inside a term":   {`"{gappy}"`, "  gappy: [\"a ..2 b\"]\n", "cannot stand inside"},
		"term in a circle":    {`"dropped"`, "  round: [\"{about}\"]\n  about: [\"{round}\"]\n", "is explained by itself"},
		"unknown key":         {`"dropped"`, "colour: red\n", "colour"},
		"empty pattern":       {`""`, "", "empty pattern"},
		"gap of no size":      {`"nose ..x dropped"`, "", "want .. or ..."},
		"text where a number": {`[1]`, "", "probe.yaml"},
	} {
		_, err := probe(c.pattern, c.more)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}

func TestUserFolderOverridesAndVersionChanges(t *testing.T) {
	plain, err := Load(catalogue.Builtin())
	if err != nil {
		t.Fatal(err)
	}
	again, err := Load(catalogue.Builtin())
	if err != nil || again.Version != plain.Version {
		t.Errorf("the same book has versions %s and %s (%v)", plain.Version, again.Version, err)
	}
	own := book(t, `"nose dropped"`, "")
	if own.Version == plain.Version {
		t.Error("a user's rule must change the version of the book")
	}
	if len(own.Rules) != len(plain.Rules)+1 {
		t.Errorf("%d rules with one of the user's, %d without", len(own.Rules), len(plain.Rules))
	}
	off, err := Load(catalogue.Builtin(), fstest.MapFS{"off.yaml": {Data: []byte("factor: spin\nrules:\n  - rule: " + firstRule(plain, "spin") + "\n    off: true\n")}})
	if err != nil || len(off.Rules) != len(plain.Rules)-1 {
		t.Errorf("a rule switched off: %d rules, %v", len(off.Rules), err)
	}
}

func firstRule(b *Book, factor string) string {
	for _, r := range b.Rules {
		if r.Factor == factor {
			return strings.TrimPrefix(r.ID, factor+"/")
		}
	}
	return ""
}

func TestRuleHashFollowsTerms(t *testing.T) {
	hash := func(b *Book) string {
		i := slices.IndexFunc(b.Rules, func(r *Rule) bool { return r.ID == "stall/probe" })
		return b.Rules[i].Hash
	}
	base := hash(book(t, `"{machine} dropped"`, ""))
	if hash(book(t, `"{machine} dropped"`, "  other: [word]\n")) != base {
		t.Error("a term that the rule does not use changed its hash")
	}
	if hash(book(t, `"{machine} fell"`, "")) == base {
		t.Error("another pattern must change the hash")
	}
}

func TestEveryTermIsUsed(t *testing.T) {
	b, err := Builtin()
	if err != nil {
		t.Fatal(err)
	}
	if unused := b.UnusedTerms(); len(unused) > 0 {
		t.Errorf("terms that no rule uses: %v", unused)
	}
}

func FuzzLoad(f *testing.F) {
	f.Add("factor: stall\nrules:\n  - rule: a\n    look for: [\"{x} (a|b) ..3 [ c~ ]\"]\n    match: [\"a c\"]\nterms:\n  x: [y, \"z (p|q)?\"]\n")
	f.Add("cues:\n  - sense: denied\n    look for: [\"no\"]\norder: [\"due to\"]\n")
	f.Fuzz(func(t *testing.T, s string) {
		b, err := load(catalogue.Builtin(), fstest.MapFS{"f.yaml": {Data: []byte(s)}})
		if err != nil {
			return
		}
		const text = "The left engine lost power and it stalled; a c was seen 5 times."
		d := b.Lexicon.Analyse(text)
		for _, s := range d.Sentences {
			b.FindRules(d, s, func(_ *Rule, m Match) {
				if err := m.Shown.Check(text); err != nil {
					t.Error(err)
				}
			})
		}
	})
}
