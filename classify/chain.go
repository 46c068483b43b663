package classify

import (
	"slices"

	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// telling is the affirmed hits of one narrative, or of a part of it that tells
// the event anew, in order of time.
type telling struct {
	again bool // it sums up what another tells, or tells it a second time
	rank  int  // tellings of a higher rank are folded in later
	base  int  // index of the narrative's first tag among all tags
	hits  []placed
}

// tellings splits a narrative's hits into what tells the event, what tells it
// in brief (an opening sentence that says how it ended) and what tells it a
// second time.
func (c *Classifier) tellings(d *text.Doc, kind string, base int, told []placed) []telling {
	rank := summing(kind)
	main, brief, again := telling{rank > 0, rank, base, nil}, telling{true, max(1, rank), base, nil}, telling{true, max(1, rank), base, nil}
	second := len(d.Sentences)
	for n, s := range d.Sentences {
		if n > 0 && rulebook.Stands(c.book.Retelling, d, s) {
			second = n
			break
		}
	}
	const opening = 4 // sentences
	for _, p := range told {
		switch {
		case p.sentence >= second:
			again.hits = append(again.hits, p)
		case rank == 0 && p.sentence < opening && rulebook.Stands(c.book.InBrief, d, d.Sentences[p.sentence]):
			brief.hits = append(brief.hits, p)
		default:
			main.hits = append(main.hits, p)
		}
	}
	if len(main.hits) == 0 { // nothing but a brief telling
		brief.again, brief.rank = main.again, main.rank
	}
	out := []telling{main}
	for _, t := range []telling{brief, again} {
		if len(t.hits) > 0 {
			out = append(out, t)
		}
	}
	return out
}

// placed is an affirmed tag of a narrative; byWords where the order rests on
// words such as "due to" and not on the order of telling alone.
type placed struct {
	tag      int // index within the narrative's tags
	factor   string
	sentence int
	byWords  bool
	explains bool // told in a sentence that says what brought the event about
	earlier  bool // told in the past perfect: it had happened before
	when     when
	since    string // the factor told before it, which when.later counts from
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
		out = append(out, c.sentenceInTime(d, hits[i:j], i, lastFactor(out))...)
		i = j
	}
	byClock(out)
	return out
}

func lastFactor(told []placed) string {
	if len(told) == 0 {
		return ""
	}
	return told[len(told)-1].factor
}

// byClock moves what happened at an earlier time of day ahead of what happened
// later, where both times are told.
func byClock(told []placed) {
	for j := range told {
		if !told[j].when.hasTime {
			continue
		}
		for i := range j {
			if told[i].when.hasTime && told[i].when.clock > told[j].when.clock {
				p := told[j]
				copy(told[i+1:j+1], told[i:j])
				told[i] = p
				break
			}
		}
	}
}

func (c *Classifier) sentenceInTime(d *text.Doc, hits []hit, base int, before string) []placed {
	affirmed := c.affirmed(hits)
	if len(affirmed) == 0 {
		return nil
	}
	n := hits[0].sentence
	explains := rulebook.Stands(c.book.Explains, d, d.Sentences[n])
	out := make([]placed, 0, len(affirmed))
	t := c.turning(d, d.Sentences[n], len(affirmed) > 1)
	var at []when
	if stamps := c.stamps(d, d.Sentences[n]); len(stamps) > 0 {
		starts := make([]int, len(affirmed))
		for k, i := range affirmed {
			starts[k] = hits[i].Start
		}
		at = times(stamps, starts)
	}
	from := 0 // where the present stretch begins in out
	for k, i := range affirmed {
		p := placed{tag: base + i, factor: hits[i].Factor, sentence: n, explains: explains}
		if at != nil {
			p.when = at[k]
		}
		p.earlier = c.pastPerfect(d, d.Sentences[n], hits[i].match)
		switch t.at(hits[i].match.First) {
		case onward:
			from = len(out)
			out = append(out, p)
		case turned:
			p.byWords = len(out) > from
			out = slices.Insert(out, from, p)
			from++ // what is turned keeps its own order
		default:
			out = append(out, p)
		}
	}
	for k := range out {
		if k == 0 {
			out[k].since = before
		} else {
			out[k].since = out[k-1].factor
		}
	}
	return out
}

// affirmed lists the hits that become links, in order of place. The same
// words may show a condition and the outcome that it is: the condition comes
// first.
func (c *Classifier) affirmed(hits []hit) []int {
	var out []int
	for i, h := range hits {
		if h.Assertion != corpus.Affirmed || c.standsFor(hits, h) {
			continue
		}
		out = append(out, i)
		for j := len(out) - 1; j > 0; j-- {
			a, b := &hits[out[j-1]], &hits[out[j]]
			if !a.Overlaps(b.Span) || c.rank(a.Factor) <= c.rank(b.Factor) {
				break
			}
			out[j-1], out[j] = out[j], out[j-1]
		}
	}
	return out
}

// direction is how a stretch of a sentence stands in time to what was told
// before it.
type direction uint8

const (
	along  direction = iota // as told
	turned                  // earlier: behind "due to", "after" ...
	onward                  // later: behind "which resulted in" ...
)

// turns are the words of a sentence that turn the order round, or back.
type turns []turn

type turn struct {
	first int // the first token that it governs
	end   int // the token before which its reach ends
	dir   direction
}

// turning finds the turning words of a sentence. What "due to" brings in
// reaches to the next comma, or to words that lead onward.
func (c *Classifier) turning(d *text.Doc, s text.Sentence, wanted bool) turns {
	if !wanted {
		return nil
	}
	var out turns
	after := map[int]bool{} // tokens where words such as "after that" begin
	c.book.FindOnward(d, s, func(m rulebook.Match) { after[m.First] = true })
	c.book.FindTurns(d, s, func(m rulebook.Match) {
		if after[m.First] {
			return
		}
		end := m.Last
		for end < s.Last && (end == m.Last || d.Tokens[end].Break == text.NoBreak) {
			end++
		}
		if m.First > s.First { // "After the stall, ..." is told in order
			out = append(out, turn{m.Last, end, turned})
		}
	})
	c.book.FindOnward(d, s, func(m rulebook.Match) {
		for i := range out {
			if out[i].dir == turned && out[i].first <= m.First {
				out[i].end = min(out[i].end, m.First)
			}
		}
		out = append(out, turn{m.Last, s.Last, onward})
	})
	return out
}

// at tells the direction of what begins at token i: that of the nearest turn
// ahead of it that reaches it.
func (ts turns) at(i int) direction {
	dir, nearest := along, -1
	for _, t := range ts {
		if t.first <= i && i < t.end && t.first > nearest {
			dir, nearest = t.dir, t.first
		}
	}
	return dir
}

// standsFor tells whether the same words show a factor below h's: then that
// one is the link, and stands for both.
func (c *Classifier) standsFor(hits []hit, h hit) bool {
	return slices.ContainsFunc(hits, func(o hit) bool {
		return o.Assertion == corpus.Affirmed && o.Factor != h.Factor && o.Overlaps(h.Span) && c.book.Tree.Implies(o.Factor, h.Factor)
	})
}

// chain merges the tellings: each factor once, at its first place. A cause
// statement sums up, so it is folded in last. What a sentence (or a summary)
// adds to a chain goes before the next of its own factors that the chain
// already holds; a trigger that is told as an explanation goes before what it
// explains.
func (c *Classifier) chain(tags []corpus.Tag, told []telling) corpus.Chain {
	links := []corpus.Link{}
	slices.SortStableFunc(told, func(a, b telling) int { return a.rank - b.rank })
	summary := !slices.ContainsFunc(told, func(t telling) bool { return t.rank == 0 }) // nothing but summaries
	at := map[string]placed{}
	for _, t := range told {
		for i, p := range t.hits {
			if at := linked(links, p.factor); at >= 0 {
				if p.factor == ended && !t.again {
					l := links[at] // the last place is where it ended
					l.Tag = t.base + p.tag
					links = append(slices.Delete(links, at, at+1), l)
				}
				continue
			}
			order := "text"
			switch {
			case p.when.hasTime && timed(told) > 1:
				order = "clock"
			case p.byWords:
				order = "words"
			}
			at[p.factor] = p
			links = slices.Insert(links, c.place(links, t, i), corpus.Link{Factor: p.factor, Tag: t.base + p.tag, Order: order})
		}
	}
	c.hadHappened(links, at)
	c.triggerFirst(links, at)
	order := c.book.Always
	if summary {
		order = slices.Concat(c.book.Usually, order)
	}
	c.settle(links, order)
	for i := range links[min(1, len(links)):] {
		elapsed(&links[i+1], at[links[i].Factor], at[links[i+1].Factor])
	}
	chain := corpus.Chain{Links: links}
	c.ending(&chain)
	return chain
}

// timed counts the factors of which a time of day is told: one alone orders
// nothing.
func timed(told []telling) int {
	var factors []string
	for _, t := range told {
		for _, p := range t.hits {
			if p.when.hasTime && !slices.Contains(factors, p.factor) {
				factors = append(factors, p.factor)
			}
		}
	}
	return len(factors)
}

// elapsed sets the seconds from one link to the next, where they are told.
func elapsed(l *corpus.Link, before, p placed) {
	switch {
	case before.when.hasTime && p.when.hasTime && p.when.clock >= before.when.clock:
		l.Seconds = p.when.clock - before.when.clock
	case p.when.hasGap && p.since == before.factor:
		l.Seconds = p.when.later
	}
}

// ended is the factor of which the last place counts, not the first: a flight
// is recovered when it is over.
const ended = "recovered"

func linked(links []corpus.Link, factor string) int {
	return slices.IndexFunc(links, func(l corpus.Link) bool { return l.Factor == factor })
}

// place finds where in the chain hit i of a telling belongs.
func (c *Classifier) place(links []corpus.Link, t telling, i int) int {
	p := t.hits[i]
	at := len(links)
	for _, later := range t.hits[i+1:] {
		if k := linked(links, later.factor); k >= 0 && (t.again || later.sentence == p.sentence) {
			at = k
			break
		}
	}
	if p.explains && c.rank(p.factor) == 0 {
		if k := slices.IndexFunc(links, func(l corpus.Link) bool { return c.rank(l.Factor) > 0 }); k >= 0 {
			at = min(at, k)
		}
	}
	return at
}

// pastPerfect tells whether the words of a match, or the two before them in
// their clause, say that something had happened.
func (c *Classifier) pastPerfect(d *text.Doc, s text.Sentence, m rulebook.Match) bool {
	for i := max(s.First, m.First-2); i < m.Last; i++ {
		if c.word(d, i) == "had" && (i >= m.First || d.Tokens[i+1].Break == text.NoBreak) {
			return true
		}
	}
	return false
}

// hadHappened moves a trigger or response that is told in the past perfect
// ahead of what is told before it and usually comes later: "The aircraft
// stalled. The checklist had not been used."
func (c *Classifier) hadHappened(links []corpus.Link, at map[string]placed) {
	for j := range links {
		rank := c.rank(links[j].Factor)
		if p := at[links[j].Factor]; !p.earlier || rank > 1 || links[j].Order != "text" {
			continue
		}
		for i := range j {
			if p := at[links[i].Factor]; c.rank(links[i].Factor) > rank && !p.earlier && p.sentence < at[links[j].Factor].sentence {
				l := links[j]
				l.Order = "words"
				copy(links[i+1:j+1], links[i:j])
				links[i] = l
				break
			}
		}
	}
}

// triggerFirst moves a trigger that is told only after what it brought about
// ("we found later that ...") ahead of the first condition or outcome, where no
// other trigger stands there, and neither words nor a clock say otherwise.
func (c *Classifier) triggerFirst(links []corpus.Link, at map[string]placed) {
	first := slices.IndexFunc(links, func(l corpus.Link) bool { r := c.rank(l.Factor); return r == 0 || r == 2 || r == 3 })
	if first < 0 || c.rank(links[first].Factor) == 0 {
		return
	}
	for j := first + 1; j < len(links); j++ {
		if c.rank(links[j].Factor) == 0 && links[j].Order == "text" && at[links[j].Factor].sentence != at[links[first].Factor].sentence {
			l := links[j]
			copy(links[first+1:j+1], links[first:j])
			links[first] = l
			return
		}
	}
}

// settle moves links forward until no pair stands against the order given, or
// until it is clear that the order contradicts itself.
func (c *Classifier) settle(links []corpus.Link, order []rulebook.Before) {
	against := func(earlier, later string) bool {
		return slices.ContainsFunc(order, func(b rulebook.Before) bool {
			return c.book.Tree.Implies(later, b.First) && c.book.Tree.Implies(earlier, b.Then)
		})
	}
	for range links {
		moved := false
		for j := range links {
			for i := range j {
				if against(links[i].Factor, links[j].Factor) {
					l := links[j]
					copy(links[i+1:j+1], links[i:j])
					links[i] = l
					moved = true
					break
				}
			}
		}
		if !moved {
			return
		}
	}
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
