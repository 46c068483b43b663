package classify

import (
	"fmt"
	"slices"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// Census counts what each rule of a book does on a body of occurrences, so
// that a book can be told of rules that do nothing.
type Census struct {
	c     *Classifier
	rules map[string]*tally
}

// tally is what one rule did: the matches whose conditions held, those that
// became a tag, and the rules whose tags of the same factor stood in place of
// the others.
type tally struct {
	found, kept int
	instead     map[string]int
}

// NewCensus begins a count with no occurrence.
func NewCensus(c *Classifier) *Census {
	x := &Census{c, map[string]*tally{}}
	for _, r := range c.book.Rules {
		x.rules[r.ID] = &tally{instead: map[string]int{}}
	}
	return x
}

// Add counts an occurrence.
func (x *Census) Add(o *corpus.Occurrence) {
	for _, n := range o.Narratives {
		d := x.c.book.Lexicon.Analyse(n.Text)
		kept := x.c.narrative(d, n.Kind, x.c.frame(o, d))
		for k, s := range d.Sentences {
			x.sentence(d, s, k, n.Kind, kept)
		}
	}
}

func (x *Census) sentence(d *text.Doc, s text.Sentence, k int, kind string, kept []hit) {
	x.c.book.FindRules(d, s, func(r *rulebook.Rule, m rulebook.Match) {
		if !reads(r, kind) || !x.c.holds(r, d, k, m) {
			return
		}
		t := x.rules[r.ID]
		t.found++
		for _, h := range kept {
			switch {
			case h.rule == r && h.Span == m.Shown:
				t.kept++
				return
			case h.rule != r && h.Factor == r.Factor && h.Overlaps(m.Shown):
				t.instead[h.Rule]++
			}
		}
	})
}

// Warnings names the rules that found nothing, and those that others always
// stood in front of.
func (x *Census) Warnings() []string {
	var out []string
	for _, r := range x.c.book.Rules {
		t := x.rules[r.ID]
		switch {
		case t.found == 0:
			out = append(out, fmt.Sprintf("%s:%d: rule %s finds nothing in the demo corpus", r.File, r.Line, r.ID))
		case t.kept == 0 && len(t.instead) > 0:
			var by []string
			for id := range t.instead {
				by = append(by, id)
			}
			slices.Sort(by)
			out = append(out, fmt.Sprintf("%s:%d: rule %s never shows in the demo corpus: of %d matches none is left beside %v, which is stronger or shorter there", r.File, r.Line, r.ID, t.found, by))
		}
	}
	return out
}
