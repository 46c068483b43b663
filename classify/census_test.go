package classify

import (
	"strings"
	"testing"
	"testing/fstest"

	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

func TestCensusNamesIdleAndShadowedRules(t *testing.T) {
	own := fstest.MapFS{"own.yaml": {Data: []byte(`factor: door-open
rules:
  - rule: idle
    look for: ["hangar door ..2 fell"]
    match: ["The hangar door fell."]
  - rule: shadowed
    strength: 0.3
    look for: ["the cabin door came open"]
    match: ["[The cabin door came open]."]
  - rule: strong
    strength: 0.99
    look for: ["cabin door came"]
    match: ["The [cabin door came] open."]
`)}}
	book, err := rulebook.Load(catalogue.Builtin(), own)
	if err != nil {
		t.Fatal(err)
	}
	x := NewCensus(New(book))
	for range 3 {
		x.Add(&corpus.Occurrence{Narratives: []corpus.Narrative{{Text: "At 200 feet the cabin door came open."}}})
	}
	all := strings.Join(x.Warnings(), "\n")
	for _, want := range []string{
		"own.yaml:3: rule door-open/idle finds nothing",
		"own.yaml:6: rule door-open/shadowed never shows in the demo corpus: of 3 matches none is left beside [door-open/strong]",
	} {
		if !strings.Contains(all, want) {
			t.Errorf("no warning %q in:\n%s", want, all)
		}
	}
	if strings.Contains(all, "door-open/strong finds") {
		t.Error("a rule that shows is warned of")
	}
}
