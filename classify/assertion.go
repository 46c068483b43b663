package classify

import (
	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// cue is a cue of the book at its place in a sentence.
type cue struct {
	*rulebook.Cue
	first, last int // tokens
}

// cues finds the cues of a sentence, less those that stand inside words which
// only look like a cue ("not only").
func (c *Classifier) cues(d *text.Doc, s text.Sentence) []cue {
	var all []cue
	c.book.FindCues(d, s, func(q *rulebook.Cue, m rulebook.Match) {
		all = append(all, cue{q, m.First, m.Last})
	})
	kept := all[:0:0]
	for _, q := range all {
		hidden := false
		for _, o := range all {
			if o.Sense == rulebook.Nothing && q.Sense != rulebook.Nothing && q.first >= o.first && q.last <= o.last {
				hidden = true
			}
		}
		if !hidden && q.Sense != rulebook.Nothing {
			kept = append(kept, q)
		}
	}
	return kept
}

// assertion decides how the words of a match are spoken of.
//
// The method is that of NegEx (Chapman et al. 2001) and ConText (Harkema et
// al. 2009): cues work forward or backward over a limited number of words,
// until words that end their reach, and some words only look like cues. The
// cues themselves are the rule book's, written for this trade. A cue inside
// the match has no effect where the pattern asked for its words ("failed to
// maintain"); in a gap of the pattern it has ("the engine may have failed").
//
// Where several cues reach, another flight outweighs advice, advice outweighs
// a denial, and a denial outweighs a possibility. In a cause statement what
// is offered as possible is the stated cause, and counts as affirmed, unless
// the cue holds there too ("the captain's assumption that ..."). The second result is the cue that decided, nil where none did.
func assertion(d *text.Doc, cues []cue, m rulebook.Match, kind string) (corpus.Assertion, *cue) {
	found, by := corpus.Affirmed, (*cue)(nil)
	for i, q := range cues {
		a := corpus.Assertion(q.Sense)
		// of equal cues the longest is told as the reason
		more := weight[a] > weight[found] || by != nil && a == found && q.last-q.first > by.last-by.first
		if q.Sense != rulebook.End && more && reaches(d, cues, q, m) {
			found, by = a, &cues[i]
		}
	}
	if found == corpus.Possible && kind == "cause" && !by.InCauses {
		return corpus.Affirmed, nil
	}
	return found, by
}

var weight = map[corpus.Assertion]int{
	corpus.Affirmed: 0, corpus.Possible: 1, corpus.Denied: 2, corpus.Advised: 3, corpus.Elsewhere: 4,
}

func reaches(d *text.Doc, cues []cue, q cue, m rulebook.Match) bool {
	if q.first >= m.First && q.last <= m.Last {
		return q.Reach != rulebook.Backward && m.Within(q.first, q.last)
	}
	var from, to int // the words between the cue and the match
	switch {
	case q.Reach == rulebook.Whole:
		return true
	case q.Reach == rulebook.Forward && q.first < m.First:
		from, to = q.last, m.First
	case q.Reach == rulebook.Backward && q.last > m.Last:
		from, to = m.Last, q.first
	default:
		return false
	}
	if to-from > q.Words {
		return false
	}
	for i := from; i <= to && i < len(d.Tokens); i++ {
		// a semicolon ends every reach, a comma that of some
		if b := d.Tokens[i].Break; b >= text.Clause || q.Clause && b != text.NoBreak {
			return false
		}
	}
	for _, e := range cues {
		if e.Sense == rulebook.End && e.first >= from && e.first < to {
			return false
		}
	}
	return true
}
