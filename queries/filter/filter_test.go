package filter

import (
	"errors"
	"reflect"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"catena/ingest/corpus"
)

var vocabulary = Vocabulary{Factors: []string{"slow-airspeed", "power-loss", "stall"}}

func TestEval(t *testing.T) {
	o := &corpus.Occurrence{ID: "T1", Source: "tarnwick", Date: corpus.Date{Year: 2015, Month: 3}, Place: "Pell Island",
		Aircraft: corpus.Aircraft{Make: "Larkin", Engines: 2}, Injury: "fatal", Extra: map[string]string{"Light": "dusk"}}
	for text, want := range map[string]bool{
		"source = Tarnwick":                    true,
		"source != tarnwick":                   false,
		"make ~ ark":                           true,
		`place = "pell island"`:                true,
		"slow-airspeed":                        true,
		"factor:stall":                         false,
		"not stall and injury = fatal":         true,
		"stall or slow-airspeed and engines=2": true,
		"(stall or slow-airspeed) and stall":   false,
		"engines >= 2 and engines < 3":         true,
		"date = 2015":                          true,
		"date = 2015-03-01":                    false, // a month is not known to be that day
		"date >= 2015-03":                      true,
		"date > 2015-02-28":                    true,
		"date <= 2015":                         true,
		"date < 2015-03-31":                    false,
		"year = 2015":                          true,
		"extra.Light = dusk":                   true,
		// what is not known does not match, either way
		"damage = minor":      false,
		"damage != minor":     false,
		"not damage = minor":  true,
		"extra.Wind != storm": false,
	} {
		n, err := Parse(text, vocabulary)
		if err != nil {
			t.Errorf("%s: %v", text, err)
			continue
		}
		if got := Eval(n, o, func(id string) bool { return id == "slow-airspeed" }); got != want {
			t.Errorf("%s: %v, want %v", text, got, want)
		}
	}
}

func TestErrorsUnderlineAndSuggest(t *testing.T) {
	for text, want := range map[string]string{
		"slow-airsped":            "no factor is called \"slow-airsped\"\n  slow-airsped\n  ^^^^^^^^^^^^\n  did you mean slow-airspeed?",
		"sorce = x":               "did you mean source?",
		"date = 2015-13":          "is no date",
		"date = 2015-13 and x":    "  date = 2015-13 and x\n         ^^^^^^^",
		"injury > fatal":          "has no order",
		"engines = two":           "is no number",
		"(stall":                  "this bracket is not closed",
		"stall stall":             "cannot stand here",
		`place = "x`:              "the quotes are not closed",
		"place = ":                "wants a value",
		"and":                     "want a field or a factor",
		"place":                   "what of place?",
		"":                        "nothing to filter by",
		"stall $ x":               "this sign means nothing here",
		"a ! b":                   "! alone",
		strings.Repeat("(", 200):  "deeper than 100",
		strings.Repeat("x", 1e5):  "longer than",
		"place = x\nand stall":    "one line",
		"é = 1":                   "no field is called",
		"not not stall and place": "what of place?",
	} {
		_, err := Parse(text, vocabulary)
		var e *Error
		if !errors.As(err, &e) || !strings.Contains(err.Error(), want) {
			t.Errorf("%.30q: %v, want %q", text, err, want)
		}
	}
}

// node draws a tree.
func node(depth int) *rapid.Generator[Node] {
	return rapid.Custom(func(t *rapid.T) Node {
		pick := rapid.IntRange(0, 4).Draw(t, "kind")
		if depth == 0 && pick > 1 {
			pick -= 3
		}
		switch pick {
		case 2:
			return &And{node(depth-1).Draw(t, "left"), node(depth-1).Draw(t, "right")}
		case 3:
			return &Or{node(depth-1).Draw(t, "left"), node(depth-1).Draw(t, "right")}
		case 4:
			return &Not{node(depth-1).Draw(t, "inside")}
		case 1:
			return &Factor{rapid.SampledFrom(vocabulary.Factors).Draw(t, "factor")}
		}
		return &Compare{
			Field: rapid.SampledFrom([]string{"place", "make", "extra.x"}).Draw(t, "field"),
			Op:    rapid.SampledFrom([]string{"=", "!=", "~"}).Draw(t, "op"),
			Value: rapid.StringOfN(rapid.RuneFrom([]rune("ab \"\\-()éor=")), 0, 6, -1).Draw(t, "value"),
		}
	})
}

func TestPrintThenParseIsIdentity(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := node(4).Draw(t, "tree")
		again, err := Parse(n.String(), vocabulary)
		if err != nil {
			t.Fatalf("%s: %v", n, err)
		}
		if !reflect.DeepEqual(n, again) {
			t.Fatalf("%s became %s", n, again)
		}
	})
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"stall and (place = x or not date < 2015)", `a = "`, "((", "!", "\xff", "extra. = 1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		n, err := Parse(s, vocabulary)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || e.Start < 0 || e.End < e.Start || e.End > len(e.Filter) || err.Error() == "" {
				t.Fatalf("%q: %v", s, err)
			}
			return
		}
		again, err := Parse(n.String(), vocabulary)
		if err != nil || again.String() != n.String() {
			t.Fatalf("%q prints as %q, which reads back as %v (%v)", s, n, again, err)
		}
	})
}
