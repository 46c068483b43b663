package classify

import (
	"slices"
	"strings"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// twin tells whether the side logic can hold for an occurrence: it has no dead
// side where the aircraft is known to have one engine or a rotor.
func twin(o *corpus.Occurrence) bool {
	category := strings.ToLower(o.Category)
	return o.Engines != 1 && !strings.HasPrefix(category, "heli") && !strings.HasPrefix(category, "rotor") && !strings.HasPrefix(category, "glid")
}

// onDeadSide keeps the hits of rules that hold only on the side of a dead
// engine where that side is known, was told before, and is theirs; their basis
// is inferred, since no words state the factor.
//
// With one wing engine dead, airborne or on the take-off roll, yaw and roll go
// toward the dead side, and the rudder that is needed is on the live side
// (common practice, no source). Reverse and beta turn the sides around, and a
// landing roll has no dead side: there nothing is inferred. Nor is it where
// the narrative tells the factor itself, or of failures on both sides.
func onDeadSide(book *rulebook.Book, d *text.Doc, hits []hit, twin bool) []hit {
	failed, since := "", 0
	for _, h := range hits {
		if h.rule.Side != "engine" || h.Assertion != corpus.Affirmed || h.Side == "" {
			continue
		}
		if failed == "" {
			failed, since = h.Side, h.Start
		} else if failed != h.Side {
			twin = false // both engines: no dead side
		}
	}
	turnedRound := slices.ContainsFunc(d.Tokens, func(t text.Token) bool {
		switch book.Lexicon.Name(t.Word) {
		case "reverse", "reverser", "beta":
			return true
		}
		return false
	})
	return slices.DeleteFunc(hits, func(h hit) bool {
		if !h.rule.DeadSide {
			return false
		}
		if !twin || turnedRound || failed == "" || h.Side != failed || h.Start < since || rulebook.Stands(book.LandingRoll, d, d.Sentences[h.sentence]) {
			return true
		}
		return slices.ContainsFunc(hits, func(o hit) bool {
			return !o.rule.DeadSide && o.Assertion == corpus.Affirmed && book.Tree.Implies(o.Factor, h.Factor)
		})
	})
}
