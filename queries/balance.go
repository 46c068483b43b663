package queries

import (
	"strings"

	"catena/ingest/corpus"
)

// Balance is the balance ratio of a speed flown and a minimum control speed:
// the share of the needed yawing moment that full rudder could still give,
// which is the square of their ratio, since the force of a rudder goes with
// the square of the speed (common practice, no source). It reports false where
// the two are not told, and at or above 1, where the ratio says nothing: a
// published minimum control speed holds for the conditions of its
// certification only.
func Balance(q *corpus.Quantity) (float64, bool) {
	if q == nil || q.Kind != "airspeed" || q.LimitKind != "vmc" || q.Limit <= 0 || q.Value <= 0 || q.Value >= q.Limit {
		return 0, false
	}
	ratio := q.Value / q.Limit
	return ratio * ratio, true
}

// RaisesVmc lists what tags tell of a flight that raises the actual minimum
// control speed above the published one: bank toward the dead engine or wings
// held level, a propeller that windmills, a centre of gravity far aft
// (FAA-H-8083-3C, chapter 13; the effect of a windmilling propeller and of an
// aft centre of gravity from memory).
func RaisesVmc(tags []corpus.Tag) []string {
	var out []string
	told := map[string]bool{}
	add := func(s string) {
		if !told[s] {
			told[s] = true
			out = append(out, s)
		}
	}
	for _, t := range tags {
		if t.Assertion != corpus.Affirmed {
			continue
		}
		quote := strings.ToLower(t.Quote)
		switch t.Factor {
		case "wrong-bank":
			if strings.Contains(quote, "level") {
				add("wings held level")
			} else {
				add("bank toward the dead engine")
			}
		case "not-secured":
			if !strings.Contains(quote, "gear") && !strings.Contains(quote, "flap") {
				add("propeller not feathered")
			}
		case "weight-balance":
			if strings.Contains(quote, "aft") || strings.Contains(quote, "rear") {
				add("centre of gravity aft")
			}
		}
	}
	return out
}
