package classify

import (
	"fmt"
	"slices"

	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

// CheckExamples runs every example of a book and returns a fault for each
// that does not come out as its rule file says.
func CheckExamples(book *rulebook.Book) []error {
	c := New(book)
	var faults []error
	for _, r := range book.Rules {
		for _, e := range r.Examples {
			if problem := c.example(r, e); problem != "" {
				faults = append(faults, &rulebook.Fault{File: e.File, Line: e.Line, Text: fmt.Sprintf("rule %s: %s: %q", r.ID, problem, e.Text)})
			}
		}
	}
	return faults
}

// example says what is wrong with an example, "" where nothing is.
func (c *Classifier) example(r *rulebook.Rule, e rulebook.Example) string {
	d := c.book.Lexicon.Analyse(e.Text)
	var hits []hit
	for n, s := range d.Sentences {
		cues := c.cues(d, s)
		c.book.FindRules(d, s, func(found *rulebook.Rule, m rulebook.Match) {
			if found == r && c.holds(r, d, n, m) {
				a, _ := assertion(d, cues, m, "")
				hits = append(hits, denials([]hit{{Tag: corpus.Tag{Span: m.Shown, Assertion: a}, rule: r}})...)
			}
		})
	}
	if r.DeadSide || r.LiveSide {
		all := c.narrative(d, "", c.frame(&corpus.Occurrence{}, d))
		hits = slices.DeleteFunc(hits, func(h hit) bool {
			return !slices.ContainsFunc(all, func(o hit) bool { return o.rule == r && o.Span == h.Span })
		})
	}
	if len(r.After) > 0 {
		others := slices.DeleteFunc(c.narrative(d, "", c.frame(&corpus.Occurrence{}, d)), func(h hit) bool { return h.rule == r })
		hits = slices.DeleteFunc(hits, func(h hit) bool {
			return !slices.ContainsFunc(others, func(o hit) bool {
				f, _ := c.book.Tree.Factor(o.Factor)
				return o.Start < h.Start && o.Assertion == corpus.Affirmed && slices.Contains(r.After, f.Kind)
			})
		})
	}
	switch {
	case e.Want == "" && len(hits) > 0:
		return fmt.Sprintf("must not match, but %q does", hits[0].Of(e.Text))
	case e.Want == "":
		return ""
	case len(hits) == 0:
		return "must match, but nothing does"
	}
	if i := slices.IndexFunc(hits, func(h hit) bool {
		return h.Assertion == e.Want && (e.Shown.Len() == 0 || h.Span == e.Shown)
	}); i >= 0 {
		return ""
	}
	return fmt.Sprintf("want %s at %q, got %s at %q", e.Want, e.Shown.Of(e.Text), hits[0].Assertion, hits[0].Of(e.Text))
}
