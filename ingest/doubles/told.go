package doubles

import (
	"slices"
	"strings"

	"catena/ingest/corpus"
)

// Record is what of an occurrence bears on whether it is another's double.
type Record struct {
	Key                              int64
	Source, ID                       string
	Date                             corpus.Date
	Place                            string
	Aircraft                         []corpus.Aircraft // at least one
	Phase, Operation, Injury, Damage string
	Marks                            []string // registrations told
	Figures                          []string // numbers of three digits and more told: clock times, heights
	Factors                          []string // told and affirmed
	Side                             string   // of the failed engine, "" where not told
	Sketch                           Sketch
	Shingles                         int
}

// Told gathers what bears on doubles from an occurrence with its narratives.
// tags are what they affirm in words, side that of the failed engine.
func Told(key int64, o *corpus.Occurrence, tags []corpus.Tag, side string) Record {
	r := Record{
		Key: key, Source: o.Source, ID: o.ID, Date: o.Date, Place: o.Place,
		Aircraft: append([]corpus.Aircraft{o.Aircraft}, o.Further...),
		Phase:    o.Phase, Operation: o.Operation, Injury: o.Injury, Damage: o.Damage,
		Side: side,
	}
	for _, t := range tags {
		r.Factors = append(r.Factors, t.Factor)
	}
	var s Sketcher
	for _, n := range o.Narratives {
		s.Add(n.Text)
		r.Marks = marks(r.Marks, n.Text)
		r.Figures = figures(r.Figures, n.Text)
	}
	r.Sketch, r.Shingles = s.Sketch(), s.Shingles
	for name, value := range o.Extra {
		if n := strings.ToLower(name); strings.Contains(n, "registration") || strings.Contains(n, "tail number") || strings.HasSuffix(n, "reg") {
			if v := strings.ToUpper(strings.TrimSpace(value)); len(v) >= 3 && len(v) <= 10 && strings.ContainsAny(v, "0123456789-") {
				r.Marks = append(r.Marks, v)
			}
		}
	}
	for _, a := range r.Aircraft { // the type is weighed by itself
		r.Figures = slices.DeleteFunc(r.Figures, func(f string) bool { return strings.Contains(plain(a.Make)+" "+plain(a.Model), f) })
	}
	slices.Sort(r.Figures)
	r.Figures = slices.Compact(r.Figures)
	slices.Sort(r.Marks)
	r.Marks = slices.Compact(r.Marks)
	return r
}

// noMarks are words of capitals-only reports that look like registrations.
var noMarks = []string{"TAIL", "TURN", "RAY", "TYPE", "BAR", "WAY", "SHAPE", "LOOP", "BOX", "CUT", "OFF", "OUT"}

// maxMarks bounds what a list of aircraft in a text can add.
const maxMarks = 8

// marks finds registrations as ICAO Annex 7 builds them: one or two letters of
// nationality, a hyphen and three or four letters; or N and a number of two to
// five digits with up to two letters behind it (14 CFR 47.15). By hand, since a
// regular expression took three quarters of the time of the whole search.
func marks(found []string, text string) []string {
	for i := 0; i < len(text) && len(found) < maxMarks; i++ {
		if !isCapital(text[i]) || i > 0 && isWord(text[i-1]) {
			continue
		}
		if end := markAt(text, i); end > 0 {
			_, suffix, hyphen := strings.Cut(text[i:end], "-")
			if !hyphen || !slices.Contains(noMarks, suffix) {
				found = append(found, text[i:end])
			}
			i = end - 1
		}
	}
	return found
}

// markAt finds the end of a registration that begins at i; 0 where none does.
func markAt(text string, i int) int {
	run := func(at, most int, is func(byte) bool) int {
		n := 0
		for at+n < len(text) && n < most && is(text[at+n]) {
			n++
		}
		return n
	}
	ends := func(at int) bool { return at == len(text) || !isWord(text[at]) }
	if n := run(i, 3, isCapital); n <= 2 && i+n < len(text) && text[i+n] == '-' {
		if k := run(i+n+1, 5, isCapital); (k == 3 || k == 4) && ends(i+n+1+k) {
			return i + n + 1 + k
		}
	}
	if text[i] != 'N' {
		return 0
	}
	digits := run(i+1, 6, isDigit)
	if digits < 2 || digits > 5 || text[i+1] == '0' {
		return 0
	}
	if k := run(i+1+digits, 3, isCapital); k <= 2 && ends(i+1+digits+k) {
		return i + 1 + digits + k
	}
	return 0
}

func isCapital(c byte) bool { return 'A' <= c && c <= 'Z' }

func isWord(c byte) bool {
	return isCapital(c) || isDigit(c) || 'a' <= c && c <= 'z' || c == '_' || c >= 0x80
}

// maxFigures bounds what a table in a text can add.
const maxFigures = 24

// figures finds the numbers of three to six digits in a text, commas left out
// ("2,500 ft" and "2500 FT" tell the same).
func figures(found []string, text string) []string {
	var digits [8]byte
	for i := 0; i < len(text) && len(found) < maxFigures; i++ {
		if !isDigit(text[i]) {
			continue
		}
		n := 0
		for ; i < len(text) && (isDigit(text[i]) || text[i] == ',' && i+1 < len(text) && isDigit(text[i+1])); i++ {
			if text[i] != ',' && n < len(digits) {
				digits[n] = text[i]
				n++
			}
		}
		if n >= 3 && n <= 6 {
			found = append(found, string(digits[:n]))
		}
	}
	return found
}

func isDigit(c byte) bool { return '0' <= c && c <= '9' }
