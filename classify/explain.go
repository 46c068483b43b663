package classify

import (
	"fmt"

	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

// Reason tells why a tag was made, or why one was not.
type Reason struct {
	Rule        *rulebook.Rule
	Narrative   int
	corpus.Span             // the words that matched
	Sentence    corpus.Span // the sentence that they stand in
	Assertion   corpus.Assertion
	Basis       corpus.Basis
	Side        string
	Actor       string
	Strength    float64          // 0 where no tag was made
	Quantity    *corpus.Quantity // nil where none
	Cue         corpus.Span      // the words that decided the assertion; empty where none did
	Refused     string           // why no tag was made; "" where one was
}

// Explain goes through an occurrence as Tag does and tells, in order of place,
// what each rule found and what it found but did not tag. With a factor it
// tells of that factor and those below it only.
func (c *Classifier) Explain(o *corpus.Occurrence, factor string) []Reason {
	var out []Reason
	strength := map[string]float64{}
	place := func(n int, rule string, s corpus.Span) string {
		return fmt.Sprintf("%d %s %d %d", n, rule, s.Start, s.End)
	}
	for _, t := range c.Tag(o).Tags {
		strength[place(t.Narrative, t.Rule, t.Span)] = t.Strength
	}
	for n, narrative := range o.Narratives {
		d := c.book.Lexicon.Analyse(narrative.Text)
		kept := map[string]bool{}
		key := func(r *rulebook.Rule, s corpus.Span) string { return r.ID + s.Of(d.Text) + string(rune(s.Start)) }
		for _, h := range c.narrative(d, narrative.Kind, c.frame(o, d)) {
			if factor != "" && !c.book.Tree.Implies(h.Factor, factor) {
				continue
			}
			kept[key(h.rule, h.Span)] = true
			r := Reason{Rule: h.rule, Narrative: n, Span: h.Span, Sentence: d.Sentences[h.sentence].Span, Assertion: h.Assertion, Basis: h.Basis, Side: h.Side, Actor: h.Actor, Strength: strength[place(n, h.Rule, h.Span)], Quantity: h.Quantity}
			if h.cue != nil {
				r.Cue = corpus.Span{Start: d.Tokens[h.cue.first].Start, End: d.Tokens[h.cue.last-1].End}
			}
			out = append(out, r)
		}
		for k, s := range d.Sentences {
			c.book.FindRules(d, s, func(r *rulebook.Rule, m rulebook.Match) {
				if factor != "" && !c.book.Tree.Implies(r.Factor, factor) || kept[key(r, m.Shown)] {
					return
				}
				why := c.refused(r, d, k, m)
				switch {
				case why != "":
				case !reads(r, narrative.Kind):
					why = "the rule does not read this kind of narrative (only in)"
				case r.DeadSide || r.LiveSide:
					why = "its side is not known to stand so to an engine that failed before, or the factor is told (on the dead side, on the live side)"
				case len(r.After) > 0:
					why = "nothing that it could come after is affirmed before it (only after), or a stronger tag covers it"
				default:
					why = "a stronger or shorter tag of the factor covers it"
				}
				out = append(out, Reason{Rule: r, Narrative: n, Span: m.Shown, Sentence: s.Span, Refused: why})
			})
		}
	}
	return out
}

// Miss is the sentence that comes nearest to a rule that did not match.
type Miss struct {
	Rule      *rulebook.Rule
	Pattern   *rulebook.Pattern
	Narrative int
	Sentence  corpus.Span
	Present   int // parts of the pattern that the sentence has words for
	All       int
}

// NearestMiss finds, for a factor or those below it, the sentence and pattern
// that come nearest to each other. It reports false where no sentence has
// words for half of any pattern.
func (c *Classifier) NearestMiss(o *corpus.Occurrence, factor string) (Miss, bool) {
	var best Miss
	for n, narrative := range o.Narratives {
		d := c.book.Lexicon.Analyse(narrative.Text)
		for _, s := range d.Sentences {
			for _, r := range c.book.Rules {
				if !c.book.Tree.Implies(r.Factor, factor) || r.Denies {
					continue
				}
				for _, p := range r.Look {
					present, all := p.Parts(d, s)
					if all > 1 && 2*present >= all && (best.Rule == nil || present*best.All > best.Present*all || present*best.All == best.Present*all && present > best.Present) {
						best = Miss{r, p, n, s.Span, present, all}
					}
				}
			}
		}
	}
	return best, best.Rule != nil
}
