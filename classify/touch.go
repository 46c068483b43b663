package classify

import (
	"fmt"
	"strings"

	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

// Parts tells what the version of the classifier is made of: the hash of each
// rule by its id, and under "" the hash of all else (cues, order, engine).
func (c *Classifier) Parts() map[string]string {
	parts := map[string]string{"": fmt.Sprintf("%s.%d", c.book.Common, EngineVersion)}
	for _, r := range c.book.Rules {
		parts[r.ID] = r.Hash
	}
	return parts
}

// Changed lists the factors whose rules differ from those of an earlier
// version, given as its Parts. It reports false where more than rules has
// changed, or the earlier version is not known: then every tag can differ.
func (c *Classifier) Changed(earlier map[string]string) (map[string]bool, bool) {
	now := c.Parts()
	if earlier[""] != now[""] {
		return nil, false
	}
	factors := map[string]bool{}
	differ := func(a, b map[string]string) {
		for id, hash := range a {
			if b[id] != hash {
				factor, _, _ := strings.Cut(id, "/")
				factors[factor] = true
			}
		}
	}
	differ(now, earlier)
	differ(earlier, now)
	return factors, true
}

// Touches tells whether the tags or the chain of an occurrence can differ
// where only the rules of the given factors have changed: one of them tagged
// it before, or a rule of such a factor finds its words in it now. Rules bear
// on those of another factor only through tags that were made, so an
// occurrence that is not touched has the same tags and chain as before.
func (c *Classifier) Touches(t *corpus.Tagged, factors map[string]bool) bool {
	if len(factors) == 0 {
		return false
	}
	for _, tag := range t.Tags {
		factor, _, _ := strings.Cut(tag.Rule, "/")
		if factors[factor] {
			return true
		}
	}
	for _, n := range t.Narratives {
		d := c.book.Lexicon.Analyse(n.Text)
		found := false
		for _, s := range d.Sentences {
			c.book.FindRules(d, s, func(r *rulebook.Rule, _ rulebook.Match) { found = found || factors[r.Factor] })
			if found {
				return true
			}
		}
	}
	return false
}
