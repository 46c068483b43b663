package filter

import "testing"

func TestExplain(t *testing.T) {
	for text, want := range map[string]string{
		"stall":                                 "stall is affirmed",
		"not stall":                             "stall is not affirmed",
		"injury = fatal":                        "injury is fatal",
		"injury != fatal":                       "injury is known and is not fatal",
		"not injury = fatal":                    "it is not known that injury is fatal",
		"engines >= 2":                          "engines is at least 2",
		"engine_type ~ turbo":                   "engine type contains turbo",
		`place = "Pell Island"`:                 `place is "Pell Island"`,
		"extra.Light = dusk":                    `the file's own field "Light" is dusk`,
		"date = 2014":                           "date lies within 2014",
		"date >= 2014-03":                       "date is not earlier than 2014-03",
		"stall and source = x":                  "stall is affirmed, and source is x",
		"stall or source = x and damage=none":   "stall is affirmed, or (source is x, and damage is none)",
		"(stall or source = x) and damage=none": "(stall is affirmed, or source is x), and damage is none",
		"not (stall or power-loss)":             "it is not so that (stall is affirmed, or power-loss is affirmed)",
	} {
		n, err := Parse(text, vocabulary)
		if err != nil {
			t.Errorf("%s: %v", text, err)
			continue
		}
		if got := Explain(n); got != want {
			t.Errorf("%s: %q, want %q", text, got, want)
		}
	}
}
