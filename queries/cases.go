package queries

import (
	"catena/classify/text"
	"catena/ingest/corpus"
)

// Keys finds the occurrences in scope.
func Keys(records Records, s Scope) (map[int64]bool, error) {
	keys := map[int64]bool{}
	s.Doubles = nil // each occurrence is found by itself
	_, err := s.each(records, false, func(r *record) { keys[r.Key] = true })
	return keys, err
}

// SentenceFinder returns a function that finds, for a span of the text, the
// sentences that hold it.
func SentenceFinder(lexicon *text.Lexicon, s string) func(corpus.Span) corpus.Span {
	d := lexicon.Analyse(s)
	return func(span corpus.Span) corpus.Span {
		out := span
		for _, x := range d.Sentences {
			if x.Overlaps(span) {
				out.Start, out.End = min(out.Start, x.Start), max(out.End, x.End)
			}
		}
		return out
	}
}
