package classify

import (
	"slices"

	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// telling is one narrative's affirmed hits in order of time.
type telling struct {
	kind string
	base int // index of its first tag among all tags
	hits []placed
}

// placed is an affirmed tag of a narrative; byWords where the order rests on
// words such as "due to" and not on the order of telling alone.
type placed struct {
	tag     int // index within the narrative's tags
	factor  string
	byWords bool
}

// inTime puts the affirmed hits of a narrative in order of time: the order of
// telling, except that within a sentence what follows "due to", "after" and
// the like happened before what precedes it.
func (c *Classifier) inTime(d *text.Doc, hits []hit) []placed {
	var out []placed
	for i := 0; i < len(hits); {
		j := i
		for j < len(hits) && hits[j].sentence == hits[i].sentence {
			j++
		}
		out = append(out, c.sentenceInTime(d, hits[i:j], i)...)
		i = j
	}
	return out
}

func (c *Classifier) sentenceInTime(d *text.Doc, hits []hit, base int) []placed {
	var affirmed []int
	for i, h := range hits {
		if h.Assertion == corpus.Affirmed && !c.standsFor(hits, h) {
			affirmed = append(affirmed, i)
		}
	}
	out := make([]placed, 0, len(affirmed))
	if len(affirmed) == 0 {
		return out
	}
	var turns []rulebook.Match
	if len(affirmed) > 1 {
		c.book.FindTurns(d, d.Sentences[hits[0].sentence], func(m rulebook.Match) { turns = append(turns, m) })
	}
	// the same words may show a condition and the outcome that it is: the
	// condition comes first
	for k := 1; k < len(affirmed); k++ {
		for j := k; j > 0; j-- {
			a, b := &hits[affirmed[j-1]], &hits[affirmed[j]]
			if !a.Overlaps(b.Span) || c.rank(a.Factor) <= c.rank(b.Factor) {
				break
			}
			affirmed[j-1], affirmed[j] = affirmed[j], affirmed[j-1]
		}
	}
	// the turning words cut the sentence into parts, told latest first
	part := 0
	var parts [][]placed
	for _, i := range affirmed {
		n := 0
		for _, t := range turns {
			if t.Last <= hits[i].match.First {
				n++
			}
		}
		if n != part || parts == nil {
			parts = append(parts, nil)
			part = n
		}
		last := len(parts) - 1
		parts[last] = append(parts[last], placed{tag: base + i, factor: hits[i].Factor})
	}
	slices.Reverse(parts)
	for _, p := range parts {
		for _, h := range p {
			h.byWords = len(parts) > 1
			out = append(out, h)
		}
	}
	return out
}

// standsFor tells whether the same words show a factor below h's: then that
// one is the link, and stands for both.
func (c *Classifier) standsFor(hits []hit, h hit) bool {
	return slices.ContainsFunc(hits, func(o hit) bool {
		return o.Assertion == corpus.Affirmed && o.Factor != h.Factor && o.Overlaps(h.Span) && c.book.Tree.Implies(o.Factor, h.Factor)
	})
}

// chain merges the tellings: each factor once, at its first place. A cause
// statement sums up, so it is folded in last: what only it tells goes before
// the next factor of its own that the chain already holds.
func (c *Classifier) chain(tags []corpus.Tag, told []telling) corpus.Chain {
	links := []corpus.Link{}
	have := func(factor string) int {
		return slices.IndexFunc(links, func(l corpus.Link) bool { return l.Factor == factor })
	}
	slices.SortStableFunc(told, func(a, b telling) int { return summing(a.kind) - summing(b.kind) })
	for _, t := range told {
		for i, p := range t.hits {
			if have(p.factor) >= 0 {
				continue
			}
			at := len(links)
			for _, later := range t.hits[i+1:] {
				if k := have(later.factor); k >= 0 {
					at = k
					break
				}
			}
			order := "text"
			if p.byWords {
				order = "words"
			}
			links = slices.Insert(links, at, corpus.Link{Factor: p.factor, Tag: t.base + p.tag, Order: order})
		}
	}
	chain := corpus.Chain{Links: links}
	c.ending(&chain)
	return chain
}

// summing ranks the kinds of narrative that tell the event a second time.
func summing(kind string) int {
	switch kind {
	case "synopsis":
		return 1
	case "cause":
		return 2
	}
	return 0
}

// ending sets the outcome (the last one) and what broke the chain: a recovery
// that no condition and no outcome follows.
func (c *Classifier) ending(chain *corpus.Chain) {
	for _, l := range chain.Links {
		f, _ := c.book.Tree.Factor(l.Factor)
		switch f.Kind {
		case catalogue.Outcome:
			chain.Outcome, chain.BrokenBy = l.Factor, ""
		case catalogue.Condition:
			chain.BrokenBy = ""
		case catalogue.Recovery:
			chain.BrokenBy = l.Factor
		}
	}
	if len(chain.Links) < 2 { // nothing was broken
		chain.BrokenBy = ""
	}
}

// rank orders the kinds of factor as they usually follow each other.
func (c *Classifier) rank(factor string) int {
	f, _ := c.book.Tree.Factor(factor)
	return slices.Index([]catalogue.Kind{catalogue.Trigger, catalogue.Response, catalogue.Condition, catalogue.Outcome, catalogue.Recovery}, f.Kind)
}
