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

// joined tells whether "and" or "or" stands between two sides, as in "the
// left and right engines".
func joined(lex *text.Lexicon, d *text.Doc, from, to int) bool {
	side := false
	link := false
	for i := from; i < to; i++ {
		switch lex.Name(d.Tokens[i].Word) {
		case "left", "right":
			if side && link {
				return true
			}
			side, link = true, false
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
