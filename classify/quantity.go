package classify

import (
	"strconv"
	"strings"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// byNumbers is the rule behind tags that rest on two numbers.
var byNumbers = &rulebook.Rule{
	ID: "below-vmc/by-numbers", Factor: "below-vmc", Strength: 0.7, File: "quantity.go",
	Says: "A speed flown is told that is under the minimum control speed told.",
}

// belowByNumbers infers below-vmc where the narrative tells a speed flown that
// is at or under the minimum control speed that it also tells: airborne, after
// an engine failed (or was failed on purpose) and thrust was asymmetric, both
// in knots. Where several minimum speeds are told, or the factor itself is,
// nothing is inferred. A published minimum control speed holds for the
// conditions of its certification only (14 CFR 23.149).
func (c *Classifier) belowByNumbers(d *text.Doc, hits []hit, kind string, twin bool) []hit {
	since := -1
	for _, h := range hits {
		switch {
		case h.Assertion != corpus.Affirmed:
		case c.book.Tree.Implies(h.Factor, byNumbers.Factor):
			return hits
		case since < 0 && h.rule.Side == "engine":
			since = h.Start
		}
	}
	limit, ok := c.minimum(d)
	if !twin || since < 0 || !ok {
		return hits
	}
	var slowest *hit
	for n, s := range d.Sentences {
		if s.End <= since || rulebook.Stands(c.book.LandingRoll, d, s) || onTheRoll(c.book.Lexicon, d, s) {
			continue
		}
		cues := c.cues(d, s)
		rulebook.Each(c.book.SpeedFlown, d, s, func(m rulebook.Match) {
			v, ok := knots(c.book.Lexicon, d, m)
			a, cue := assertion(d, cues, m, kind)
			if !ok || a != corpus.Affirmed || v > limit || m.Shown.Start < since || slowest != nil && slowest.Quantity.Value <= v {
				return
			}
			slowest = &hit{
				Tag: corpus.Tag{
					Factor: byNumbers.Factor, Assertion: a, Basis: corpus.Inferred, Span: m.Shown, Quote: m.Shown.Of(d.Text), Rule: byNumbers.ID, Strength: byNumbers.Strength,
					Quantity: &corpus.Quantity{Kind: "airspeed", Value: v, Unit: "kt", Limit: limit, LimitKind: "vmc"},
				},
				sentence: n, match: m, rule: byNumbers, cue: cue,
			}
		})
	}
	if slowest == nil {
		return hits
	}
	at := len(hits)
	for i, h := range hits {
		if h.Start > slowest.Start {
			at = i
			break
		}
	}
	return append(hits[:at:at], append([]hit{*slowest}, hits[at:]...)...)
}

// minimum is the one minimum control speed that the narrative tells, in knots.
func (c *Classifier) minimum(d *text.Doc) (float64, bool) {
	limit, told := 0.0, false
	for _, s := range d.Sentences {
		clash := false
		rulebook.Each(c.book.MinimumIs, d, s, func(m rulebook.Match) {
			v, ok := knots(c.book.Lexicon, d, m)
			if !ok {
				return
			}
			clash = clash || told && v != limit
			limit, told = v, true
		})
		if clash {
			return 0, false
		}
	}
	return limit, told
}

// knots reads the number that a match shows; false where its unit is another,
// or where it can be no speed of an aircraft with a minimum control speed.
func knots(lex *text.Lexicon, d *text.Doc, m rulebook.Match) (float64, bool) {
	for i := m.First; i < m.Last; i++ {
		if d.Tokens[i].Start != m.Shown.Start {
			continue
		}
		if i+1 < len(d.Tokens) {
			switch lex.Name(d.Tokens[i+1].Word) {
			case "mph", "feet", "degrees", "percent", "pounds", "minutes", "seconds":
				return 0, false
			}
		}
		v, err := strconv.ParseFloat(strings.ReplaceAll(m.Shown.Of(d.Text), ",", ""), 64)
		return v, err == nil && v >= 30 && v <= 200
	}
	return 0, false
}

// onTheRoll tells whether a sentence is about the take-off or ground roll.
func onTheRoll(lex *text.Lexicon, d *text.Doc, s text.Sentence) bool {
	for i := s.First + 1; i < s.Last; i++ {
		if name := lex.Name(d.Tokens[i].Word); name == "roll" || name == "run" {
			switch lex.Name(d.Tokens[i-1].Word) {
			case "takeoff", "ground", "landing":
				return true
			}
		}
	}
	return false
}
