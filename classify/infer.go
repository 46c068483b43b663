package classify

import (
	"slices"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// onDeadSide keeps the hits of rules that hold only on the side of a dead
// engine where that side is known, was told before, and is theirs; their basis
// is inferred, since no words state the factor. It keeps those of rules that
// hold only on the live side where theirs is the other side.
//
// With one wing engine dead, airborne or on the take-off roll, yaw and roll go
// toward the dead side, and the rudder that is needed is on the live side
// (common practice, no source). Reverse and beta turn the sides around, and a
// landing roll has no dead side: there nothing is inferred. Nor is it where
// the narrative tells the factor itself, or of failures on both sides.
func onDeadSide(book *rulebook.Book, d *text.Doc, hits []hit, frame airframe) []hit {
	failed, since, twin := "", 0, frame.dead
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
		if !h.rule.DeadSide && !h.rule.LiveSide {
			return false
		}
		if !twin || turnedRound || failed == "" || h.Side == "" || h.Start < since || rulebook.Stands(book.LandingRoll, d, d.Sentences[h.sentence]) {
			return true
		}
		if dead := h.Side == failed; h.rule.LiveSide || !dead {
			return dead == h.rule.LiveSide
		}
		return slices.ContainsFunc(hits, func(o hit) bool {
			return !o.rule.DeadSide && o.Assertion == corpus.Affirmed && (book.Tree.Implies(o.Factor, h.Factor) || book.Tree.Implies(h.Factor, o.Factor))
		})
	})
}
