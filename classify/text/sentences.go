package text

import "strings"

// Abbreviations after which a full stop does not end a sentence.
var neverEnds = wordSet(`approx capt dr mr mrs ms messrs prof fo f/o freq fig figs no nos nr st mt ft. vs cf viz eg ie
	gen col maj lt sgt sr jr dept est max min. alt. hdg. temp vol sec. para ref rev ser tel incl excl reg cpt cap jan feb mar apr jun jul aug
	sept oct nov dec mon tue tues wed thu thurs fri sat`)

// Abbreviations after which it may: only where a capital letter follows.
var mayEnd = wordSet(`ft in gal gals lb lbs hr hrs min mins sec secs kt kts apt etc inc co ltd corp dist deg degs mi nm rpm msl agl
	am pm us usa uk hp psi sq cu ave blvd rd hwy rwy twr apch eng acft alt hdg spd vis tfc`)

func wordSet(list string) map[string]bool {
	set := map[string]bool{}
	for _, w := range strings.Fields(list) {
		set[w] = true
	}
	return set
}

// boundary classifies the gap between two raw words: gap begins at from.
func boundary(s string, prev, next raw, from int, caps bool, semicolon Break) Break {
	gap := s[from:next.start]
	if len(gap) <= 1 && (gap == "" || gap == " ") { // by far the commonest
		return NoBreak
	}
	stop := false
	mark := NoBreak
	breaks := 0
	for i := 0; i < len(gap); i++ {
		switch gap[i] {
		case '.', '!', '?':
			stop = true
		case ';':
			mark = max(mark, semicolon)
		case ',', ':', '(', ')', '[', ']', '"':
			mark = max(mark, Comma)
		case '-':
			if i > 0 && i+1 < len(gap) {
				mark = max(mark, Comma) // a dash between spaces; a hyphen stands alone
			}
		case 0xE2: // en and em dashes
			if strings.HasPrefix(gap[i:], "–") || strings.HasPrefix(gap[i:], "—") {
				mark = max(mark, Comma)
			}
		case '\n':
			breaks++
		case '*', '|':
			if strings.IndexByte(gap, '\n') >= 0 {
				breaks = 2 // an item of a list
			}
		}
	}
	if breaks >= 2 {
		return Stop
	}
	if breaks == 1 && next.kind == digits && strings.HasPrefix(s[next.end:], ". ") || breaks == 1 && strings.ContainsAny(gap, "-–") {
		return Stop // "2. ..." or "- ..." at the start of a line
	}
	if stop && ends(s, prev, next, gap, caps) {
		return Stop
	}
	return mark
}

// ends decides whether the full stop in gap ends a sentence.
func ends(s string, prev, next raw, gap string, caps bool) bool {
	word := s[prev.start:prev.end]
	capital := isUpper(s[next.start]) || next.kind != letters || s[next.start] >= 0x80
	if strings.ContainsAny(gap, "!?") {
		return capital || len(gap) > 1
	}
	lower := strings.ToLower(word)
	if prev.kind == digits && len(word) <= 2 && (prev.start == 0 || s[prev.start-1] == '\n') {
		return false // the number of an item of a list
	}
	spaced := strings.ContainsAny(gap, " \n\t\r\u00a0")
	quoted := strings.ContainsAny(gap, "\")”")
	switch {
	case neverEnds[lower] && strings.HasPrefix(gap, "."):
		return false
	case mayEnd[lower] && strings.HasPrefix(gap, "."):
		// in capitals one abbreviation may follow another: "HDG. ALT. SPD."
		return spaced && isUpper(s[next.start]) && (!caps || !mayEnd[strings.ToLower(s[next.start:next.end])] || !strings.HasPrefix(s[next.end:], "."))
	case len(word) == 1 && prev.kind == letters:
		// an initial, U.S., a.m.; in capitals "TURNED L. THEN" ends
		return spaced && capital && (caps || strings.EqualFold(word, "i") || quoted)
	case !spaced && !quoted:
		// a full stop glued to the next word: SETTLED.STUDENT, busy.We
		if len(word) < 2 || next.end-next.start < 2 || prev.kind != letters || next.kind != letters {
			return false
		}
		if caps {
			return gap == "."
		}
		return isLower(word[len(word)-1]) && isUpper(s[next.start])
	case capital:
		return true
	}
	// a small letter after a full stop: a slip of the typist's, unless the
	// word before looks like an abbreviation
	return gap == ". " && len(word) >= 4
}
