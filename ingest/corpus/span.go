package corpus

import "fmt"

// Span is a half-open range [Start, End) of bytes in one narrative's text.
//
// Invariants: 0 <= Start <= End <= len(text), and both ends stand on rune
// boundaries. Check tells whether they hold for a given text.
type Span struct {
	Start int `json:"start"`
	End   int `json:"end"`
}

// Len is the number of bytes that the span covers.
func (s Span) Len() int { return s.End - s.Start }

// Overlaps tells whether the two spans share at least one byte.
func (s Span) Overlaps(o Span) bool { return s.Start < o.End && o.Start < s.End }

// Contains tells whether o lies wholly inside s.
func (s Span) Contains(o Span) bool { return s.Start <= o.Start && o.End <= s.End }

// Check returns an error that says which invariant the span breaks in text.
func (s Span) Check(text string) error {
	switch {
	case s.Start < 0 || s.End < s.Start || s.End > len(text):
		return fmt.Errorf("span %d-%d does not lie in a text of %d bytes", s.Start, s.End, len(text))
	case !runeBoundary(text, s.Start) || !runeBoundary(text, s.End):
		return fmt.Errorf("span %d-%d cuts a character in two", s.Start, s.End)
	}
	return nil
}

// Of returns the words that the span covers. The span must lie in text.
func (s Span) Of(text string) string { return text[s.Start:s.End] }

// runeBoundary tells whether offset i begins a rune (or ends the text).
// A UTF-8 continuation byte has the form 10xxxxxx (RFC 3629, section 3).
func runeBoundary(text string, i int) bool {
	return i == len(text) || text[i]&0xC0 != 0x80
}
