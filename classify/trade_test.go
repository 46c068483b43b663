package classify

import (
	"slices"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

// Facts of the trade (common practice, no source), each told in plain words:
// which factors must be found, and which must not.
func TestFactsOfTheTrade(t *testing.T) {
	for _, c := range []struct{ name, text, want, not string }{
		{"a failed left engine yaws and rolls left", "The left engine failed at 300 feet. The aircraft yawed left and rolled left.", "roll-toward-dead-engine", ""},
		{"and not right", "The left engine failed at 300 feet. The aircraft rolled right.", "", "roll-toward-dead-engine"},
		{"rudder on the live side is right", "The left engine failed at 300 feet. The pilot pressed the right pedal.", "correct-rudder", "wrong-rudder"},
		{"rudder on the dead side is wrong", "The left engine failed at 300 feet. The pilot pressed the left pedal.", "wrong-rudder", "correct-rudder"},
		{"the same on the right", "The No. 2 engine failed in the climb. The student pushed the right rudder pedal.", "wrong-rudder", "correct-rudder"},
		{"No. 3 of four is a right one", "The four-engine freighter lost the No. 3 engine in the climb. The aircraft yawed right.", "roll-toward-dead-engine", ""},
		{"No. 2 of four is a left one", "On the four-engine freighter the No. 2 engine failed. The aircraft yawed left.", "roll-toward-dead-engine", ""},
		{"an engine on the centre line has no dead side", "The rear engine failed. The pilot pressed the left pedal. The aircraft yawed left.", "power-loss", "wrong-rudder roll-toward-dead-engine"},
		{"nor before the failure", "The pilot pressed the left pedal. Then the left engine failed.", "power-loss", "wrong-rudder"},
		{"nor with reverse, which turns the sides round", "The left engine failed in reverse. The pilot pressed the left pedal.", "", "wrong-rudder"},
		{"nor on a landing roll", "On the landing roll the left engine failed and the pilot pressed the left pedal.", "", "wrong-rudder"},
		{"bank toward the dead engine is wrong", "The left engine failed and he banked toward the dead engine.", "wrong-bank", ""},
		{"lowering the nose is a recovery", "The airspeed decayed. She lowered the nose and the speed came back.", "nose-lowered", ""},
		{"so is taking power off the live engine", "The left engine failed and the aircraft yawed left. He retarded the right throttle and the yaw stopped.", "power-reduced", ""},
		{"a simulated failure is no loss of power", "The instructor simulated a failure of the left engine.", "simulated-failure", "power-loss"},
		{"a stall horn is no stall", "The stall horn sounded in the flare.", "", "stall"},
		{"weather VMC is no speed", "Day VMC prevailed; we remained below cloud in VMC.", "", "below-vmc"},
		{"electrical power is no engine power", "We lost all electrical power.", "", "power-loss"},
	} {
		have := map[string]bool{}
		for _, tag := range tagged(t, corpus.Narrative{Kind: "factual", Text: c.text}).Tags {
			if tag.Assertion == corpus.Affirmed {
				for _, f := range classifier(t).Book().Tree.Lineage(tag.Factor) {
					have[f] = true
				}
			}
		}
		for _, f := range strings.Fields(c.want) {
			if !have[f] {
				t.Errorf("%s: %q has no %s", c.name, c.text, f)
			}
		}
		for _, f := range strings.Fields(c.not) {
			if have[f] {
				t.Errorf("%s: %q has %s", c.name, c.text, f)
			}
		}
	}
}

// The coding rules of the CAST/ICAO Common Taxonomy Team (Aviation Occurrence
// Categories 4.7, December 2017; rules of 4.1 and 4.2): an engine failure
// followed by a loss of control is both; carburettor ice is FUEL and not
// SCF-PP; a stall belongs to LOC-I; icing with a loss of control is both;
// contact with the runway after control was lost is not ARC.
func TestCategoriesOfAnOccurrence(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine failed and the pilot lost control of the aircraft.":                           "LOC-I SCF-PP",
		"Carburettor ice formed and the engine lost power.":                                            "FUEL",
		"The engine quit from fuel exhaustion and the aircraft stalled.":                               "FUEL LOC-I",
		"The glider stalled in the turn.":                                                              "LOC-I",
		"Ice on the wings brought it to a stall.":                                                      "ICE LOC-I",
		"The student lost directional control on the landing roll and it ground-looped.":               "LOC-G",
		"The aircraft bounced and made a hard landing.":                                                "ARC",
		"The aircraft stalled in the flare and made a hard landing.":                                   "LOC-I",
		"There was no evidence of a loss of engine power, and the aircraft did not stall at any time.": "",
	} {
		var factors []string
		for _, tag := range tagged(t, corpus.Narrative{Kind: "factual", Text: text}).Tags {
			if tag.Assertion == corpus.Affirmed && !slices.Contains(factors, tag.Factor) {
				factors = append(factors, tag.Factor)
			}
		}
		if got := strings.Join(classifier(t).Book().Tree.Categories(factors), " "); got != want {
			t.Errorf("%q: %s, want %s (%v)", text, got, want, factors)
		}
	}
}

// Control speeds as the regulations have them: 14 CFR 23.149 (2003 to 2014)
// gives the minimum control speed as a calibrated airspeed with the critical
// engine suddenly inoperative, and asks for at most 150 pounds of rudder
// force; it is marked by a red radial line, the best rate of climb with one
// engine inoperative by a blue one (14 CFR 23.1545; text from memory, colours
// as in a page of the FAA).
func TestRedAndBlueLines(t *testing.T) {
	for text, want := range map[string]string{
		"The right engine quit. Speed went through the red line.":                              "below-vmc",
		"The right engine quit and we were below blue line.":                                   "slow-airspeed",
		"The right engine quit. The red radial is at 74 knots. The airspeed fell to 70 knots.": "below-vmc",
		"The rpm went through the red line.":                                                   "",
	} {
		got := ""
		for _, tag := range tagged(t, corpus.Narrative{Text: text}).Tags {
			if classifier(t).Book().Tree.Implies(tag.Factor, "slow-airspeed") && got != "below-vmc" {
				got = tag.Factor
			}
		}
		if got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}

// The table of types stands over the record's number of engines, and under the
// narrative's own words.
func TestTypeTableAndSides(t *testing.T) {
	const text = "The left engine failed at 300 feet. The pilot pressed the left pedal."
	for _, c := range []struct {
		make, model string
		engines     int
		text        string
		wrong       bool
	}{
		{"PIPER", "PA-44-180", 1, text, true},                                    // the record is wrong
		{"CESSNA", "337G", 2, text, false},                                       // centre line
		{"Marrow", "Twin 44", 1, text, false},                                    // not in the table
		{"PIPER", "PA-28", 1, "The twin-engine aircraft climbed. " + text, true}, // the words know better
		{"ROBINSON", "R44", 2, text, false},
	} {
		o := corpus.Occurrence{Aircraft: corpus.Aircraft{Make: c.make, Model: c.model, Engines: c.engines}, Narratives: []corpus.Narrative{{Kind: "factual", Text: c.text}}}
		wrong := slices.ContainsFunc(classifier(t).Tag(&o).Tags, func(g corpus.Tag) bool {
			return classifier(t).Book().Tree.Implies(g.Factor, "wrong-rudder") && g.Assertion == corpus.Affirmed
		})
		if wrong != c.wrong {
			t.Errorf("%s %s with %d engines by the record: wrong rudder %v, want %v", c.make, c.model, c.engines, wrong, c.wrong)
		}
	}
}
