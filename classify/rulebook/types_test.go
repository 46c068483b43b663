package rulebook

import (
	"strings"
	"testing"
	"testing/fstest"

	"catena/classify/catalogue"
)

// Spellings as they stand in published data; engines after the descriptions of
// ICAO Doc 8643 (from memory): L2P, L1P, L2T, L4T, H1P.
func TestTypesAsPublished(t *testing.T) {
	book, err := Builtin()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		make, model string
		engines     int
		place, kind string
	}{
		{"PIPER", "PA-34-200T", 2, "wings", "airplane"}, {"Piper", "PA34", 2, "wings", "airplane"}, {"PIPER", "PA 30", 2, "wings", "airplane"},
		{"PIPER AIRCRAFT INC", "PA-28-181", 1, "wings", "airplane"}, {"Cessna", "P337H", 2, "centre line", "airplane"}, {"CESSNA", "337", 2, "centre line", "airplane"},
		{"Cessna 310", "", 2, "wings", "airplane"}, {"BEECHCRAFT", "58P", 2, "wings", "airplane"}, {"BEECH", "1900D", 2, "wings", "airplane"},
		{"LOCKHEED", "C-130H", 4, "wings", "airplane"}, {"ROBINSON HELICOPTER COMPANY", "R22 BETA", 1, "other", "rotorcraft"},
	} {
		got, ok := book.Type(c.make, c.model)
		if !ok || got.Engines != c.engines || got.Place != c.place || got.Kind != c.kind {
			t.Errorf("%s %s: %+v, %v", c.make, c.model, got, ok)
		}
	}
	for _, c := range [][2]string{{"PIPER", "PA-3"}, {"BOEING", "580"}, {"", ""}, {"BEECH", "580"}, {"CESSNA", ""}, {"Marrow", "Twin 44"}} {
		if got, ok := book.Type(c[0], c[1]); ok {
			t.Errorf("%q is taken for %q", c, got.Name)
		}
	}
}

// A user's file adds to the table and overrides it; slips are told by line.
func TestTypesOfTheUser(t *testing.T) {
	folder := fstest.MapFS{"fleet.yaml": {Data: []byte("aircraft types:\n  - types: [Marrow Twin 44]\n    engines: 2\n    place: centre line\n  - types: [PIPER PA-34]\n    engines: 3\n    place: other\n")}}
	book, err := Load(catalogue.Builtin(), folder)
	if err != nil {
		t.Fatal(err)
	}
	if got, ok := book.Type("MARROW", "Twin 44"); !ok || got.Place != "centre line" {
		t.Errorf("%+v, %v", got, ok)
	}
	if got, _ := book.Type("Piper", "PA-34-200"); got.Engines != 3 {
		t.Errorf("%+v: the user's entry does not win", got)
	}
	for text, want := range map[string]string{
		"aircraft types:\n  - types: [A-1]\n    engines: 2\n    place: tail\n":        `fleet.yaml:2: aircraft types: no place is called "tail"`,
		"aircraft types:\n  - types: [A-1]\n    engines: 2\n    kind: balloon\n":      `no kind is called "balloon"`,
		"aircraft types:\n  - types: [A-1]\n":                                         "0 engines",
		"aircraft types:\n  - engines: 2\n":                                           "an entry without types",
		"aircraft types:\n  - types: [\"--\"]\n    engines: 1\n":                      `"--" names no type`,
		"aircraft types:\n  - types: [A-1]\n    engines: 2\n    engine place: tail\n": "unknown field",
	} {
		_, err := Load(catalogue.Builtin(), fstest.MapFS{"fleet.yaml": {Data: []byte(text)}})
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %v, want %q", text, err, want)
		}
	}
}
