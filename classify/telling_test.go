package classify

import (
	"fmt"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

func chainOf(t *testing.T, kind, text string) string {
	t.Helper()
	var out []string
	for _, l := range tagged(t, corpus.Narrative{Kind: kind, Text: text}).Chain.Links {
		s := l.Factor
		if l.Order != "text" {
			s += "/" + l.Order
		}
		if l.Seconds > 0 {
			s += fmt.Sprintf("+%v", l.Seconds)
		}
		out = append(out, s)
	}
	return strings.Join(out, " ")
}

func TestTimeOfLinks(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine quit. Four seconds later the aircraft stalled.":                                               "power-loss-total stall+4",
		"The aircraft stalled 4 seconds after the left engine quit.":                                                   "power-loss-total/words stall+4",
		"14:02:20 The aircraft stalled.\n\n14:02:11 The left engine quit.":                                             "power-loss-total/clock stall/clock+9",
		"At 1402:11 the left engine quit. At 1403:01 the aircraft stalled.":                                            "power-loss-total/clock stall/clock+50",
		"The left engine quit at 10:05. The aircraft stalled.":                                                         "power-loss-total stall",
		"At 1030 local the aircraft was substantially damaged when it stalled. The left engine quit. It stalled at 60": "power-loss-total stall",
		"The left engine quit. We landed on runway 10:30 of them say.":                                                 "power-loss-total",
	} {
		if got := chainOf(t, "factual", text); !strings.HasPrefix(got, want) {
			t.Errorf("%q: %s, want %s", text, got, want)
		}
	}
}

// A second telling is merged with the links that it repeats, and does not
// start a second chain.
func TestToldAgain(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine quit and the aircraft stalled. In summary, the airspeed decayed and the aircraft stalled.":            "power-loss-total slow-airspeed stall",
		"The aircraft stalled. CALLBACK CONVERSATION WITH RPTR: the left engine quit before the aircraft stalled.":             "power-loss-total stall",
		"The twin was destroyed when it stalled. The right engine quit at 300 feet. The airspeed decayed. The twin stalled.":   "power-loss-total slow-airspeed stall",
		"The left engine quit. The aircraft stalled. From the first officer: the left engine quit. The aircraft stalled.":      "power-loss-total stall",
		"The student stalled the aircraft. Looking back, the airspeed decayed unnoticed and the aircraft stalled. We learned.": "slow-airspeed stall",
	} {
		if got := chainOf(t, "factual", text); got != want {
			t.Errorf("%q: %s, want %s", text, got, want)
		}
	}
}

func TestActors(t *testing.T) {
	for text, want := range map[string]string{
		"The student did not use the before take-off checklist.":                        "checklist-skipped student",
		"The checklist was not completed by the first officer.":                         "checklist-skipped co-pilot",
		"The student asked the instructor for help. He skipped the checklist.":          "checklist-skipped student",
		"The student told the instructor that he had skipped the checklist.":            "checklist-skipped student",
		"I skipped the downwind checks.":                                                "checklist-skipped pilot",
		"My instructor looked out of the window. I skipped the downwind checks.":        "checklist-skipped student",
		"The maintenance engineer did not use the checklist.":                           "",
		"The captain called the tower and skipped the checklist.":                       "checklist-skipped pilot",
		"The failure of the instructor to use the checklist.":                           "checklist-skipped instructor",
		"The student pilot's failure to maintain airspeed.":                             "slow-airspeed student",
		"The airspeed decayed while the instructor looked out.":                         "slow-airspeed ",
		"The examiner pulled the left throttle to simulate an engine failure at 800 ft": "simulated-failure instructor",
	} {
		got := ""
		for _, tag := range tagged(t, corpus.Narrative{Text: text}).Tags {
			if got == "" || strings.HasPrefix(want, tag.Factor) {
				got = tag.Factor + " " + tag.Actor
			}
		}
		if want == "" && strings.HasPrefix(got, "checklist") || want != "" && got != want && !strings.HasPrefix(got, strings.Fields(want)[0]) {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
		if want != "" && !strings.HasSuffix(got, want[strings.Index(want, " "):]) {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}

func TestQuantities(t *testing.T) {
	for text, want := range map[string]string{
		"The student let the airspeed decay to 71 knots.":                                           "slow-airspeed airspeed 71 kt",
		"The airspeed decayed from 90 knots to 71 knots.":                                           "slow-airspeed airspeed 71 kt",
		"The airspeed decayed to 81 mph.":                                                           "slow-airspeed airspeed 70.39 kt told mph",
		"The stall speed is 60 knots. The airspeed decayed to 58 knots.":                            "slow-airspeed airspeed 58 kt stall 60",
		"The right engine quit. Blue line is 92 knots. The airspeed decayed to 85 knots.":           "slow-airspeed airspeed 85 kt blue-line 92",
		"The right engine quit. Vmc is 74 knots, blue line is 92 knots. Airspeed decayed to 70 kt.": "slow-airspeed airspeed 70 kt vmc 74",
		"It rolled into a steep bank of 70 degrees.":                                                "steep-bank bank 70 deg",
		"The aircraft was overweight by 90 kg.":                                                     "weight-balance weight 198.4 lb told kg",
	} {
		got := ""
		for _, tag := range tagged(t, corpus.Narrative{Text: text}).Tags {
			if q := tag.Quantity; q != nil && strings.HasPrefix(want, tag.Factor) {
				got = fmt.Sprintf("%s %s %.4g %s", tag.Factor, q.Kind, q.Value, q.Unit)
				if q.Told != "" {
					got += " told " + q.Told
				}
				if q.LimitKind != "" {
					got += fmt.Sprintf(" %s %g", q.LimitKind, q.Limit)
				}
			}
		}
		if got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}

// A contradiction is named, not guessed at.
func TestDoubts(t *testing.T) {
	for text, want := range map[string]string{
		"The left engine quit. The right engine failed. It yawed left.":                            "engines on both sides are told to have failed: no side is taken as dead",
		"The left engine quit. Vmc is 84 knots, or Vmc is 88 knots by the newer book.":             "more than one minimum control speed is told (84 kt, 88 kt): no speed is compared with it",
		"The aircraft stalled. A second witness is sure that the aircraft had not stalled.":        "stall is both affirmed and denied",
		"The left engine quit. The right engine ran normally.":                                     "",
		"The left engine quit and was never restarted. Vmc is 84 knots. The Vmc of 84 knots held.": "",
	} {
		if got := strings.Join(tagged(t, corpus.Narrative{Text: text}).Chain.Doubts, "; "); got != want {
			t.Errorf("%q: %q, want %q", text, got, want)
		}
	}
}
