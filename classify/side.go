package classify

import (
	"catena/classify/rulebook"
	"catena/classify/text"
)

// side reads left or right off the words of a match and the few words around
// it, within the clause; "" where neither or both are told. No. 1 is left and
// No. 2 right, which holds for a twin with engines on the wings (common
// practice, no source); package rulebook's rules ask for a side only where an
// engine or the rudder is meant.
func side(lex *text.Lexicon, r *rulebook.Rule, d *text.Doc, s text.Sentence, m rulebook.Match) string {
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
	if found := sideWithin(lex, r, d, m.First, m.Last); found != "" {
		return found
	}
	return sideWithin(lex, r, d, from, to)
}

// inherit gives the side of the engine to the hits around which none is told,
// where the narrative speaks of one engine's side only.
func inherit(lex *text.Lexicon, d *text.Doc, hits []hit) {
	only := ""
	for i := range d.Tokens {
		if !engineWords[lex.Name(d.Tokens[i].Word)] {
			continue
		}
		for k := i; k >= max(0, i-4) && d.Tokens[k].Break != text.Stop; k-- {
			switch here := sideName(lex, d.Tokens[k].Word); {
			case here == "":
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

// sideName reads left or right, for an engine also No. 1 and No. 2.
func sideName(lex *text.Lexicon, w text.Word) string {
	switch lex.Name(w) {
	case "left", "no1":
		return "left"
	case "right", "no2":
		return "right"
	}
	return ""
}

// joined tells whether "and" or "or" stands between left and right, as in
// "the left and right engines".
func joined(lex *text.Lexicon, d *text.Doc, from, to int) bool {
	before, link := "", false
	for i := from; i < to; i++ {
		switch name := lex.Name(d.Tokens[i].Word); name {
		case "left", "right":
			if before != "" && before != name && link {
				return true
			}
			before, link = name, false
		case "and", "or":
			link = true
		}
	}
	return false
}

func sideWithin(lex *text.Lexicon, r *rulebook.Rule, d *text.Doc, from, to int) string {
	found := ""
	for i := from; i < to; i++ {
		here := ""
		switch lex.Name(d.Tokens[i].Word) {
		case "left":
			here = "left"
		case "right":
			here = "right"
		case "no1":
			if r.Side == "engine" {
				here = "left"
			}
		case "no2":
			if r.Side == "engine" {
				here = "right"
			}
		}
		if here == "" {
			continue
		}
		if found != "" && found != here {
			return ""
		}
		found = here
	}
	return found
}
