package text

import "strings"

// reading is one meaning of an ambiguous abbreviation.
type reading struct {
	Means  string   `yaml:"means"`
	Beside []string `yaml:"beside"` // as written, in small letters; none: the meaning where no other fits

	words  []Word
	beside map[string]bool
}

// decide picks the meaning of an ambiguous abbreviation by the words within
// five of it; nil where none fits.
func decide(readings []reading, s string, raws []raw, i int) []Word {
	const reach = 5
	for k := range readings {
		r := &readings[k]
		if len(r.beside) == 0 {
			return r.words
		}
		for n := max(0, i-reach); n <= min(len(raws)-1, i+reach); n++ {
			if n != i && r.beside[strings.ToLower(s[raws[n].start:raws[n].end])] {
				return r.words
			}
		}
	}
	return nil
}

// slips are what a scanner reads wrongly, and what stood there.
var slips = [][2]string{{"0", "o"}, {"1", "l"}, {"1", "i"}, {"5", "s"}, {"8", "b"}, {"rn", "m"}, {"vv", "w"}, {"cl", "d"}, {"li", "h"}, {"ii", "u"}}

// repair reads an unknown word as a known one where a slip of the scanner
// explains the difference: airp1ane, cornpressor. Short words, and numbers
// with a letter, are left alone.
func (l *Lexicon) repair(word string) (Word, bool) {
	letters := 0
	for i := range len(word) {
		if isLower(word[i]) {
			letters++
		}
	}
	if letters < 4 || len(word) > 24 {
		return 0, false
	}
	for _, s := range slips {
		digit := isDigit(s[0][0])
		if !strings.Contains(word, s[0]) || !digit && len(word) < 7 {
			continue // a letter in the place of letters needs a long word
		}
		if w, ok := l.ids[strings.ReplaceAll(word, s[0], s[1])]; ok && !l.opens[w] {
			return w, true
		}
	}
	return 0, false
}

// brokenLine joins a word that a hyphen cut in two at the end of a line, where
// the whole is a known word.
func (l *Lexicon) brokenLine(s string, a, b raw) (Word, bool) {
	gap := s[a.end:b.start]
	if a.kind != letters || b.kind != letters || gap != "-\n" && gap != "-\r\n" {
		return 0, false
	}
	w, ok := l.ids[strings.ToLower(s[a.start:a.end]+s[b.start:b.end])]
	return w, ok && !l.opens[w]
}
