package classify

import (
	"cmp"
	"fmt"
	"slices"

	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// Classifier runs one rule book.
type Classifier struct {
	book *rulebook.Book
}

// New returns a classifier for a book.
func New(book *rulebook.Book) *Classifier { return &Classifier{book} }

// Version names the book together with the engine that runs it.
func (c *Classifier) Version() string {
	return fmt.Sprintf("%s.%d", c.book.Version, EngineVersion)
}

// Book is the rule book behind the classifier.
func (c *Classifier) Book() *rulebook.Book { return c.book }

// hit is a tag with what ordering needs to know of its place.
type hit struct {
	corpus.Tag
	sentence int
	match    rulebook.Match
	rule     *rulebook.Rule
	cue      *cue         // what decided the assertion, nil where nothing did
	told     text.Measure // behind Quantity
}

// Tag finds the factors of an occurrence and its chain. Tags are in order of
// narrative and place; Tags and Chain.Links are never nil.
func (c *Classifier) Tag(o *corpus.Occurrence) corpus.Tagged {
	out := corpus.Tagged{Occurrence: *o, CutOff: o.CutOffs(), Rulebook: c.Version(), Tags: []corpus.Tag{}}
	var told []telling
	var doubts []string
	for n, narrative := range o.Narratives {
		d := c.book.Lexicon.Analyse(narrative.Text)
		hits := c.narrative(d, narrative.Kind, c.frame(o, d))
		for i := range hits {
			hits[i].Narrative = n
		}
		for _, doubt := range c.doubts(d, hits) {
			if !slices.Contains(doubts, doubt) {
				doubts = append(doubts, doubt)
			}
		}
		told = append(told, c.tellings(d, narrative.Kind, len(out.Tags), c.inTime(d, hits))...)
		for _, h := range hits {
			out.Tags = append(out.Tags, h.Tag)
		}
	}
	out.Chain = c.chain(out.Tags, told)
	out.Chain.Doubts = doubts
	c.strengths(out.Tags, o.Narratives)
	return out
}

// narrative finds the tags of one text, in order of place.
func (c *Classifier) narrative(d *text.Doc, kind string, frame airframe) []hit {
	var hits []hit
	for n, s := range d.Sentences {
		from := len(hits)
		c.book.FindRules(d, s, func(r *rulebook.Rule, m rulebook.Match) {
			if reads(r, kind) && c.holds(r, d, n, m) {
				hits = append(hits, hit{
					Tag: corpus.Tag{
						Factor: r.Factor, Basis: basis(r), Span: m.Shown, Quote: m.Shown.Of(d.Text),
						Rule: r.ID, RuleHash: r.Hash, Strength: r.Strength, Side: frame.side(c.book.Lexicon, r, d, s, m),
					},
					sentence: n, match: m, rule: r,
				})
			}
		})
		if len(hits) == from {
			continue
		}
		cues := c.cues(d, s)
		for i := from; i < len(hits); i++ {
			hits[i].Assertion, hits[i].cue = assertion(d, cues, hits[i].match, kind)
		}
		hits = append(hits[:from], denials(hits[from:])...)
		hits = append(hits[:from], distinct(hits[from:])...)
		for i := from; i < len(hits); i++ {
			hits[i].Actor = c.doer(d, n, &hits[i])
		}
	}
	// what does not hold goes first, so that it cannot bear on anything else:
	// see Touches
	hits = c.inPlace(hits)
	frame.inherit(c.book.Lexicon, d, hits)
	return c.quantities(d, onDeadSide(c.book, d, hits, frame), kind, frame.dead)
}

// denials gives the hits of rules whose words deny their factor that
// assertion. Where a cue bears on such words ("was not running normally") they
// say nothing.
func denials(hits []hit) []hit {
	kept := slices.DeleteFunc(hits, func(h hit) bool { return h.rule.Denies && h.Assertion != corpus.Affirmed })
	for i := range kept {
		if kept[i].rule.Denies {
			kept[i].Assertion = corpus.Denied
		}
	}
	return kept
}

// reads tells whether a rule reads narratives of a kind.
func reads(r *rulebook.Rule, kind string) bool {
	return len(r.Kinds) == 0 || slices.Contains(r.Kinds, kind)
}

// basis is what a rule's tags rest on.
func basis(r *rulebook.Rule) corpus.Basis {
	if r.DeadSide {
		return corpus.Inferred
	}
	return corpus.Told
}

// inPlace drops the hits of rules whose place among the others does not suit
// them: those that hold only after something else where nothing of that kind
// is affirmed before (a safe landing is a recovery only where there was
// something to recover from), those that do not hold after it, and those on
// words that tell something else.
func (c *Classifier) inPlace(hits []hit) []hit {
	before := map[catalogue.Kind]bool{}
	var said []string // factors affirmed so far
	hits = slices.DeleteFunc(hits, func(h hit) bool {
		if len(h.rule.After) > 0 && !slices.ContainsFunc(h.rule.After, func(k catalogue.Kind) bool { return before[k] }) ||
			slices.ContainsFunc(said, func(f string) bool { return c.oneOf(f, h.rule.NotAfter) }) {
			return true
		}
		if f, ok := c.book.Tree.Factor(h.Factor); ok && h.Assertion == corpus.Affirmed {
			before[f.Kind] = true
			said = append(said, h.Factor)
		}
		return false
	})
	return slices.DeleteFunc(slices.Clone(hits), func(h hit) bool {
		return len(h.rule.NotOver) > 0 && slices.ContainsFunc(hits, func(o hit) bool {
			return o.Assertion == corpus.Affirmed && o.Overlaps(h.Span) && c.oneOf(o.Factor, h.rule.NotOver)
		})
	})
}

// oneOf tells whether a factor counts under one of others.
func (c *Classifier) oneOf(factor string, others []string) bool {
	return slices.ContainsFunc(others, func(f string) bool { return c.book.Tree.Implies(factor, f) })
}

// holds checks the conditions of a rule around a match in sentence n.
func (c *Classifier) holds(r *rulebook.Rule, d *text.Doc, n int, m rulebook.Match) bool {
	return c.refused(r, d, n, m) == ""
}

// refused says why the conditions of a rule do not hold, "" where they do.
func (c *Classifier) refused(r *rulebook.Rule, d *text.Doc, n int, m rulebook.Match) string {
	s := d.Sentences[n]
	switch {
	case len(r.PartOf) > 0 && rulebook.Overlaps(r.PartOf, d, s, m.First, m.Last):
		return "the words are part of something that the rule excludes (not part of)"
	case len(r.Unless) > 0 && rulebook.Stands(r.Unless, d, s):
		return "words that the rule excludes stand in the same sentence (unless)"
	case len(r.With) > 0 && !rulebook.Stands(r.With, d, s):
		return "words that the rule wants in the same sentence are missing (with)"
	case len(r.NotNear) > 0 && near(r.NotNear, d, n):
		return "words that the rule excludes stand in this or a neighbouring sentence (not near)"
	case len(r.Near) > 0 && !near(r.Near, d, n):
		return "words that the rule wants in this or a neighbouring sentence are missing (near)"
	case len(r.NotBy) > 0 && slices.Contains(r.NotBy, c.actor(d, n, m)):
		return "it is the deed of somebody whom the rule leaves out (not by)"
	case len(r.Nowhere) > 0 && slices.ContainsFunc(d.Sentences, func(s text.Sentence) bool { return rulebook.Stands(r.Nowhere, d, s) }):
		return "words that the rule excludes stand in the narrative (nowhere)"
	}
	return ""
}

// near tells whether one of the patterns stands in sentence n or beside it.
func near(patterns []*rulebook.Pattern, d *text.Doc, n int) bool {
	for k := max(0, n-1); k <= min(n+1, len(d.Sentences)-1); k++ {
		if rulebook.Stands(patterns, d, d.Sentences[k]) {
			return true
		}
	}
	return false
}

// distinct keeps, of overlapping hits of one factor, the strongest and of
// equally strong ones the shortest, and puts what is left in order of place.
func distinct(hits []hit) []hit {
	slices.SortStableFunc(hits, func(a, b hit) int {
		return cmp.Or(
			cmp.Compare(b.Strength, a.Strength), cmp.Compare(a.Len(), b.Len()),
			cmp.Compare(a.Start, b.Start), cmp.Compare(a.Rule, b.Rule))
	})
	var kept []hit
	for _, h := range hits {
		if !slices.ContainsFunc(kept, func(k hit) bool { return k.Factor == h.Factor && k.Overlaps(h.Span) }) {
			kept = append(kept, h)
		}
	}
	slices.SortStableFunc(kept, func(a, b hit) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.End, b.End), cmp.Compare(a.Factor, b.Factor))
	})
	return kept
}
