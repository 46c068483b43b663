package classify

import (
	"fmt"
	"slices"
	"strings"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// doubts names what a narrative contradicts itself in. Where it does, nothing
// is guessed: no side is taken as dead, no speed is compared.
func (c *Classifier) doubts(d *text.Doc, hits []hit) []string {
	var out []string
	sides := map[string]bool{}
	for _, h := range hits {
		if h.Assertion == corpus.Affirmed && h.Side != "" && (c.book.Tree.Implies(h.Factor, "power-loss") || h.Factor == "simulated-failure") {
			sides[h.Side] = true
		}
	}
	if len(sides) > 1 {
		out = append(out, "engines on both sides are told to have failed: no side is taken as dead")
	}
	for _, l := range c.book.Limits {
		if values := c.told(d, l); len(values) > 1 {
			out = append(out, fmt.Sprintf("more than one %s is told (%s): no speed is compared with it", limitNames[l.Kind], strings.Join(values, ", ")))
		}
	}
	for i, h := range hits {
		if h.Assertion != corpus.Affirmed || h.rule.Denies || slices.ContainsFunc(hits[:i], func(o hit) bool { return o.Factor == h.Factor && o.Assertion == corpus.Affirmed }) {
			continue
		}
		if slices.ContainsFunc(hits, func(o hit) bool {
			return o.Factor == h.Factor && o.Assertion == corpus.Denied && o.Rule == h.Rule && (o.Side == h.Side || o.Side == "" || h.Side == "")
		}) {
			out = append(out, h.Factor+" is both affirmed and denied")
		}
	}
	return out
}

var limitNames = map[string]string{"vmc": "minimum control speed", "stall": "stall speed", "blue-line": "blue line"}

// told lists the values that a narrative gives of a limit, with their units,
// each once, in order of place.
func (c *Classifier) told(d *text.Doc, l rulebook.Limit) []string {
	var out []string
	for _, s := range d.Sentences {
		rulebook.Each(l.Look, d, s, func(m rulebook.Match) {
			x, ok := speedAt(d, c.book.Lexicon.Measures(d, s), m)
			if v := fmt.Sprintf("%.4g %s", x.Value, x.Unit); ok && !slices.Contains(out, v) {
				out = append(out, v)
			}
		})
	}
	return out
}
