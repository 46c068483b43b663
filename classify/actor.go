package classify

import (
	"slices"
	"strings"

	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/classify/text"
)

// part is an actor of the book at its place in the text.
type part struct {
	name        string
	first, last int // tokens
}

// reporter names the one who tells the story ("I"): the other of a pair where
// the text speaks of my instructor or my student, else the pilot.
func (c *Classifier) reporter(d *text.Doc) string {
	for i := range d.Tokens[1:] {
		if c.word(d, i) == "my" {
			switch c.word(d, i+1) {
			case "instructor", "examiner":
				return "student"
			case "student", "trainee":
				return "instructor"
			}
		}
	}
	return "pilot"
}

// objects are words after which somebody is named who does not act.
var objects = map[string]bool{
	"to": true, "from": true, "with": true, "told": true, "called": true, "answering": true, "asked": true, "advised": true, "contacted": true,
	"informed": true, "at": true, "past": true, "for": true, "talking": true, "watching": true, "of": true,
}

// acts tells whether the one named at token i can be the one who acts.
func (c *Classifier) acts(d *text.Doc, s text.Sentence, i int) bool {
	for i--; i >= s.First; i-- {
		switch w := c.word(d, i); w {
		case "the", "a", "an", "his", "her", "my", "our", "their":
		case "of": // "the failure of the instructor"
			before := c.word(d, i-1)
			return i > s.First && (before == "failure" || before == "inability" || before == "part" || before == "decision")
		default:
			return !objects[w]
		}
	}
	return true
}

// actor names who did, or left undone, what a match shows: the one named in
// its words, or "by" whom it was done right behind them, or the nearest one
// named ahead of it in the sentence. A pronoun stands for the first who acts in
// the sentence before, or in the one before that. "" where none is named.
func (c *Classifier) actor(d *text.Doc, n int, m rulebook.Match) string {
	s := d.Sentences[n]
	parts := c.parts(d, s)
	for _, p := range parts {
		if p.first >= m.First && p.last <= m.Last && c.acts(d, s, p.first) {
			return p.name
		}
	}
	parts = slices.DeleteFunc(parts, func(p part) bool { return p.last <= m.First && !c.acts(d, s, p.first) })
	const behind = 4 // words
	for _, p := range parts {
		if p.first > m.Last && p.first-m.Last < behind && c.word(d, m.Last) == "by" {
			return p.name
		}
	}
	name, at := "", -1
	for _, p := range parts {
		if p.last <= m.First && p.last > at {
			name, at = p.name, p.last
		}
	}
	switch pronoun, i := c.pronoun(d, s, m); {
	case i < at || pronoun == "":
		return name
	case pronoun == "i", pronoun == "we":
		return c.reporter(d)
	}
	if name != "" {
		return name
	}
	for k := n - 1; k >= max(0, n-2); k-- {
		for _, p := range c.parts(d, d.Sentences[k]) {
			if c.acts(d, d.Sentences[k], p.first) {
				return p.name // the subject stands first
			}
		}
	}
	return ""
}

// pronoun finds the last pronoun ahead of the end of a match's first word, and
// its token.
func (c *Classifier) pronoun(d *text.Doc, s text.Sentence, m rulebook.Match) (string, int) {
	for i := m.First; i >= s.First; i-- {
		switch w := c.word(d, i); w {
		case "he", "she", "they", "his", "her", "their":
			return "he", i
		case "i", "my", "me":
			return "i", i
		case "we", "our":
			return "we", i
		}
		if i < m.First && d.Tokens[i+1].Break >= text.Clause {
			break
		}
	}
	return "", -1
}

// word is the normal form of a token, or the word as it stands where the rule
// book does not know it.
func (c *Classifier) word(d *text.Doc, i int) string {
	if i < 0 || i >= len(d.Tokens) {
		return ""
	}
	t := d.Tokens[i]
	if t.Word != 0 {
		return c.book.Lexicon.Name(t.Word)
	}
	return strings.ToLower(d.Text[t.Start:t.End])
}

// parts finds the actors named in a sentence, in order of place; of two at one
// place the longer.
func (c *Classifier) parts(d *text.Doc, s text.Sentence) []part {
	var out []part
	for _, a := range c.book.Actors {
		rulebook.Each(a.Look, d, s, func(m rulebook.Match) {
			p := part{a.Name, m.First, m.Last}
			at := len(out)
			for i, o := range out {
				if p.first < o.last && o.first < p.last {
					if p.last-p.first > o.last-o.first {
						out[i] = p
					}
					return
				}
				if o.first > p.first && at == len(out) {
					at = i
				}
			}
			out = append(out[:at:at], append([]part{p}, out[at:]...)...)
		})
	}
	return out
}

// doer names who did what a hit shows. Of a condition or an outcome it is told
// only where the words of the match name one ("the student's failure to
// maintain airspeed").
func (c *Classifier) doer(d *text.Doc, n int, h *hit) string {
	f, _ := c.book.Tree.Factor(h.Factor)
	deed := f.Kind == catalogue.Response || f.Kind == catalogue.Recovery && h.Factor != "recovered" || h.Factor == "simulated-failure"
	if deed {
		return c.actor(d, n, h.match)
	}
	if f.Kind == catalogue.Condition || f.Kind == catalogue.Outcome {
		const ahead = 4 // words: "the student pilot's abrupt ..."
		s := d.Sentences[n]
		for _, p := range c.parts(d, s) {
			if p.last <= h.match.Last && p.first >= h.match.First-ahead && c.acts(d, s, p.first) && d.Tokens[min(p.last, len(d.Tokens)-1)].Break < text.Clause {
				return p.name
			}
		}
	}
	return ""
}
