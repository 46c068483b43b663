package classify

import (
	"slices"
	"strconv"
	"strings"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// The rules behind tags that rest on two numbers.
var (
	belowVmc = &rulebook.Rule{
		ID: "below-vmc/by-numbers", Factor: "below-vmc", Strength: 0.7, File: "quantity.go",
		Says: "A speed flown is told that is at or under the minimum control speed told.",
	}
	belowStall = &rulebook.Rule{
		ID: "slow-airspeed/by-numbers", Factor: "slow-airspeed", Strength: 0.7, File: "quantity.go",
		Says: "A speed flown is told that is under the stall speed told, or, after an engine failure, under the blue line told.",
	}
)

// limit is a speed that the narrative names as a limit.
type limit struct {
	kind  string // vmc, stall or blue-line
	speed text.Measure
}

// quantities gives the hits the numbers that stand with them, and infers what
// two numbers imply.
func (c *Classifier) quantities(d *text.Doc, hits []hit, kind string, twin bool) []hit {
	c.attach(d, hits)
	limits := c.limits(d)
	if len(limits) == 0 {
		return hits
	}
	for i := range hits {
		if q := hits[i].Quantity; q != nil && q.Kind == "airspeed" {
			margin(q, hits[i].told, limits)
		}
	}
	return c.byNumbers(d, hits, limits, kind, twin)
}

// attach gives each hit the measure that belongs to its factor: one of its
// own words, or the nearest in the same clause within a few words.
func (c *Classifier) attach(d *text.Doc, hits []hit) {
	sentence, measures := -1, []text.Measure(nil)
	for i := range hits {
		h := &hits[i]
		kinds := c.kinds(h.Factor)
		if len(kinds) == 0 {
			continue
		}
		if h.sentence != sentence {
			sentence, measures = h.sentence, c.book.Lexicon.Measures(d, d.Sentences[h.sentence])
		}
		if m := nearest(d, h.match, measures, kinds); m != nil {
			h.Quantity, h.told = quantityOf(m), *m
		}
	}
}

// kinds lists the kinds of measure that belong to a factor or to one above it.
func (c *Classifier) kinds(factor string) []string {
	for _, f := range c.book.Tree.Lineage(factor) {
		if kinds := c.book.Measures[f]; kinds != nil {
			return kinds
		}
	}
	return nil
}

// nearest picks the measure that tells most of a match: what the words lead
// "to", then what stands inside them, then the nearest; not where they come
// "from".
func nearest(d *text.Doc, m rulebook.Match, measures []text.Measure, kinds []string) *text.Measure {
	const reach = 8 // words; farther off, a number belongs to something else
	var best *text.Measure
	least := reach + 1
	for i := range measures {
		x := &measures[i]
		if !slices.Contains(kinds, x.Kind) {
			continue
		}
		away := 0
		switch {
		case x.Token < m.First:
			away = m.First - x.Token
		case x.Token >= m.Last:
			away = x.Token - m.Last + 1
		}
		from, to := min(x.Token, m.First), max(x.Token, m.Last-1)
		if slices.ContainsFunc(d.Tokens[from+1:to+1], func(t text.Token) bool { return t.Break >= text.Clause }) {
			continue
		}
		if x.Token > 0 {
			switch lead := d.Tokens[x.Token-1]; d.Text[lead.Start:lead.End] {
			case "from", "FROM":
				away += reach
			case "to", "TO", "through", "THROUGH", "THRU", "thru":
				away--
			}
		}
		if away < least {
			best, least = x, away
		}
	}
	return best
}

func quantityOf(m *text.Measure) *corpus.Quantity {
	q := &corpus.Quantity{Kind: m.Kind, Value: m.Value, Unit: m.Unit}
	if m.Told != m.Unit {
		q.Told = m.Told
	}
	return q
}

// margin gives a speed flown the limit that it stands against: the minimum
// control speed, else the nearest of the others, told in the same unit.
func margin(q *corpus.Quantity, told text.Measure, limits []limit) {
	var best *limit
	for i := range limits {
		l := &limits[i]
		if l.speed.Told != told.Told || l.speed.Start == told.Start {
			continue
		}
		if best == nil || best.kind != "vmc" && (l.kind == "vmc" || l.speed.Value-q.Value < best.speed.Value-q.Value) {
			best = l
		}
	}
	if best != nil {
		q.Limit, q.LimitKind = best.speed.Value, best.kind
	}
}

// limits finds the named speeds of a narrative: one of each kind. A kind told
// with two values is left out, since it is not known which one held.
func (c *Classifier) limits(d *text.Doc) []limit {
	var out []limit
	clash := map[string]bool{}
	for _, s := range d.Sentences {
		var measures []text.Measure
		for _, l := range c.book.Limits {
			rulebook.Each(l.Look, d, s, func(m rulebook.Match) {
				if measures == nil {
					measures = c.book.Lexicon.Measures(d, s)
				}
				x, ok := speedAt(d, measures, m)
				if !ok {
					return
				}
				if i := slices.IndexFunc(out, func(o limit) bool { return o.kind == l.Kind }); i < 0 {
					out = append(out, limit{l.Kind, x})
				} else if out[i].speed.Value != x.Value {
					clash[l.Kind] = true
				}
			})
		}
	}
	return slices.DeleteFunc(out, func(l limit) bool { return clash[l.kind] })
}

// speedAt is the airspeed whose number a match shows. A bare number is taken
// in knots. Speeds that no aircraft with a minimum control speed can have, and
// numbers in another unit, are none.
func speedAt(d *text.Doc, measures []text.Measure, m rulebook.Match) (text.Measure, bool) {
	x := text.Measure{Kind: "airspeed", Unit: "kt", Told: "kt", Span: m.Shown}
	known := false
	for _, o := range measures {
		if o.Start == m.Shown.Start {
			x, known = o, true
		}
	}
	if !known {
		for i := m.First; i < m.Last; i++ {
			if t := d.Tokens[i]; t.Start == m.Shown.Start && t.Number {
				v, ok := bare(m.Shown.Of(d.Text))
				x.Value, x.Token, known = v, i, ok
			}
		}
	}
	return x, known && x.Kind == "airspeed" && x.Value >= 30 && x.Value <= 200
}

func bare(number string) (float64, bool) {
	v, err := strconv.ParseFloat(strings.ReplaceAll(number, ",", ""), 64)
	return v, err == nil
}

// byNumbers infers below-vmc where the narrative tells a speed flown at or
// under the minimum control speed that it also tells: airborne, after an
// engine failed (or was failed on purpose) and thrust was asymmetric, both in
// one unit; and slow-airspeed against the stall speed, or after an engine
// failure against the blue line. Where the factor itself is told, nothing is
// inferred. A published minimum control speed holds for the conditions of its
// certification only (14 CFR 23.149).
func (c *Classifier) byNumbers(d *text.Doc, hits []hit, limits []limit, kind string, twin bool) []hit {
	since, slow := -1, false
	for _, h := range hits {
		switch {
		case h.Assertion != corpus.Affirmed:
		case c.book.Tree.Implies(h.Factor, belowVmc.Factor):
			return hits
		case h.Factor == belowStall.Factor:
			slow = true
		case since < 0 && h.rule.Side == "engine":
			since = h.Start
		}
	}
	var slowest *hit
	for n, s := range d.Sentences {
		if rulebook.Stands(c.book.LandingRoll, d, s) || onTheRoll(c.book.Lexicon, d, s) {
			continue
		}
		var cues []cue
		var measures []text.Measure
		rulebook.Each(c.book.SpeedFlown, d, s, func(m rulebook.Match) {
			if measures == nil {
				measures, cues = c.book.Lexicon.Measures(d, s), c.cues(d, s)
			}
			x, ok := speedAt(d, measures, m)
			if !ok || slowest != nil && slowest.Quantity.Value <= x.Value {
				return
			}
			a, cue := assertion(d, cues, m, kind)
			rule, l := under(x, limits, twin && since >= 0 && m.Shown.Start > since)
			if rule == nil || a != corpus.Affirmed || rule == belowStall && slow {
				return
			}
			q := quantityOf(&x)
			q.Limit, q.LimitKind = l.speed.Value, l.kind
			slowest = &hit{
				Tag: corpus.Tag{
					Factor: rule.Factor, Assertion: a, Basis: corpus.Inferred, Span: m.Shown, Quote: m.Shown.Of(d.Text),
					Rule: rule.ID, Strength: rule.Strength, Quantity: q,
				},
				sentence: n, match: m, rule: rule, cue: cue,
			}
		})
	}
	if slowest == nil {
		return hits
	}
	at := slices.IndexFunc(hits, func(h hit) bool { return h.Start > slowest.Start })
	if at < 0 {
		at = len(hits)
	}
	return slices.Insert(hits, at, *slowest)
}

// under finds the limit that a speed flown breaks, and the rule that says so.
func under(x text.Measure, limits []limit, engineOut bool) (*rulebook.Rule, limit) {
	for _, l := range limits {
		if l.speed.Told != x.Told || l.speed.Start == x.Start {
			continue // not in one unit, or the limit itself
		}
		switch {
		case l.kind == "vmc" && engineOut && x.Value <= l.speed.Value:
			return belowVmc, l
		case l.kind == "stall" && x.Value < l.speed.Value, l.kind == "blue-line" && engineOut && x.Value < l.speed.Value:
			return belowStall, l
		}
	}
	return nil, limit{}
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
