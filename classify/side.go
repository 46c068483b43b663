package classify

import (
	"strings"

	"catena/classify/rulebook"
	"catena/classify/text"
	"catena/ingest/corpus"
)

// airframe is what the side logic knows of an aircraft.
type airframe struct {
	engines int  // 0 where unknown
	dead    bool // an engine that fails has, or may have, a dead side
}

// frame tells how the engines of an aircraft stand. The narrative's own words
// come first, then the table of types, then the record's number of engines,
// which is often wrong in published data. Engines on the centre line, rotors and gliders have no dead
// side.
func (c *Classifier) frame(o *corpus.Occurrence, d *text.Doc) airframe {
	f := airframe{engines: o.Engines}
	known, inTable := c.book.Type(o.Make, o.Model)
	if inTable {
		f.engines = known.Engines
	}
	told := 0 // the smallest number of engines that the words tell
	for _, s := range d.Sentences {
		if rulebook.Stands(c.book.CentreLine, d, s) {
			return f
		}
		for n := 2; n <= 4; n++ {
			if (told == 0 || n < told) && rulebook.Stands(c.book.EngineCount[n], d, s) {
				told = n
			}
		}
	}
	if told > 0 {
		f.engines = told
	}
	if inTable && (known.Place != "wings" || known.Kind != "airplane") {
		return f
	}
	category := strings.ToLower(o.Category)
	f.dead = f.engines != 1 && !strings.HasPrefix(category, "heli") && !strings.HasPrefix(category, "rotor") && !strings.HasPrefix(category, "glid")
	return f
}

// numbered gives the side of a numbered engine: No. 1 left and No. 2 right on
// a twin, 1 and 2 left and 3 and 4 right with four engines, 1 left and 3 right
// with three (common practice, no source).
func (f airframe) numbered(name string) string {
	switch name {
	case "no1":
		return "left"
	case "no2":
		switch f.engines {
		case 3:
			return ""
		case 4:
			return "left"
		}
		return "right"
	case "no3":
		if f.engines != 2 {
			return "right"
		}
	case "no4":
		return "right"
	}
	return ""
}

// side reads left or right off the words of a match and the few words around
// it, within the clause; "" where neither or both are told.
func (f airframe) side(lex *text.Lexicon, r *rulebook.Rule, d *text.Doc, s text.Sentence, m rulebook.Match) string {
	if r.Side == "" {
		return ""
	}
	const around = 4 // words; farther off, a side belongs to something else
	from, to := m.First, m.Last
	for from > s.First && m.First-from < around && d.Tokens[from].Break == text.NoBreak {
		from--
	}
	for to < s.Last && to-m.Last < around && d.Tokens[to].Break == text.NoBreak {
		to++
	}
	if joined(lex, d, max(s.First, m.First-2*around), m.Last) {
		return ""
	}
	if r.Side == "rudder" {
		if found := besideRudder(lex, d, m); found != "" {
			return found
		}
	}
	if found := f.sideWithin(lex, r, d, m.First, m.Last); found != "" {
		return found
	}
	return f.sideWithin(lex, r, d, from, to)
}

// inherit gives the side of the engine to the hits around which none is told,
// where the narrative speaks of one engine's side only.
func (f airframe) inherit(lex *text.Lexicon, d *text.Doc, hits []hit) {
	only := ""
	for i := range d.Tokens {
		if !engineWords[lex.Name(d.Tokens[i].Word)] {
			continue
		}
		for k := i; k >= max(0, i-4); k-- {
			if k < i && d.Tokens[k+1].Break == text.Stop {
				break // the sentence before
			}
			switch here := f.sideName(lex, d.Tokens[k].Word); {
			case here == "" || rejected(lex, d, k) || k < i && rudderWords[lex.Name(d.Tokens[k+1].Word)]:
			case only != "" && only != here:
				return // both sides are spoken of
			default:
				only = here
			}
		}
	}
	for i := range hits {
		if h := &hits[i]; h.Side == "" && h.rule.Side == "engine" && only != "" {
			h.Side = only
		}
	}
}

var engineWords = map[string]bool{"engine": true, "motor": true, "engine's": true, "propeller": true, "throttle": true, "powerplant": true}

// sideName reads left or right, or the side of a numbered engine.
func (f airframe) sideName(lex *text.Lexicon, w text.Word) string {
	switch name := lex.Name(w); name {
	case "left", "port":
		return "left"
	case "right", "starboard":
		return "right"
	default:
		return f.numbered(name)
	}
}

// joined tells whether "and" or "or" joins left and right, as in "the left and
// the right engines"; not where a clause begins between them.
func joined(lex *text.Lexicon, d *text.Doc, from, to int) bool {
	const apart = 4 // words
	before, at, link := "", 0, false
	for i := from; i < to; i++ {
		if i > from && d.Tokens[i].Break != text.NoBreak {
			before, link = "", false
		}
		switch name := lex.Name(d.Tokens[i].Word); name {
		case "left", "right":
			if before != "" && before != name && link && i-at <= apart {
				return true
			}
			before, at, link = name, i, false
		case "and", "or":
			link = true
		}
	}
	return false
}

func (f airframe) sideWithin(lex *text.Lexicon, r *rulebook.Rule, d *text.Doc, from, to int) string {
	found := ""
	for i := from; i < to; i++ {
		here := f.sideName(lex, d.Tokens[i].Word)
		if numbered := strings.HasPrefix(lex.Name(d.Tokens[i].Word), "no"); here == "" || numbered && r.Side != "engine" && r.Side != "lever" {
			continue
		}
		if found != "" && found != here {
			return ""
		}
		found = here
	}
	return found
}

var rudderWords = map[string]bool{"rudder": true, "pedal": true, "foot": true, "boot": true, "leg": true}

// besideRudder reads the side that stands right before a word for the rudder
// within a match: "right rudder instead of left".
func besideRudder(lex *text.Lexicon, d *text.Doc, m rulebook.Match) string {
	for i := m.First + 1; i < m.Last; i++ {
		if !rudderWords[lex.Name(d.Tokens[i].Word)] || rejected(lex, d, i-1) {
			continue
		}
		switch side := lex.Name(d.Tokens[i-1].Word); side {
		case "left", "right":
			return side
		}
	}
	return ""
}

// rejected tells whether the side at token i is named as the one that was not
// taken: "instead of left", "rather than left", "not left".
func rejected(lex *text.Lexicon, d *text.Doc, i int) bool {
	name := func(i int) string {
		if i < 0 {
			return ""
		}
		return lex.Name(d.Tokens[i].Word)
	}
	return name(i-1) == "not" || name(i-1) == "of" && name(i-2) == "instead" || name(i-1) == "than" && name(i-2) == "rather"
}
