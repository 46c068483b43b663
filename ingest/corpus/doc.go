// Package corpus holds the nouns that every other package speaks in: spans,
// dates, sources, occurrences, narratives, tags, chains and exposure.
//
// It knows no file, no database and no clock, and imports only the standard
// library. A narrative's text is fixed once its reader has decoded it; from
// then on it never changes, and every Span is a pair of byte offsets into
// exactly that text.
//
// Floor 1 (nouns).
package corpus
