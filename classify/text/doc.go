// Package text turns a narrative into what rules read: words in a normal
// form, sentences and, on demand, part-of-speech tags, all with byte offsets
// into the narrative exactly as read.
//
// Normal form: lower case; trade abbreviations written out (ACFT, ENG, TKOF);
// one spelling of variants (take off, take-off, takeoff; carburettor,
// carburetor); contractions opened (didn't: did, not); No. 1, #1 and number
// one as one word. The table behind it is spelling.yaml. A word that no rule
// uses has the id 0: nothing is remembered of it but its place.
//
// Sentences are found by a splitter of this package (about fifteen times as
// fast as the library's, and with offsets). Part-of-speech tags come from the
// averaged perceptron model of github.com/jdkato/prose, read by a decoder of
// this package that is deterministic and keeps offsets; this is the only
// package that imports prose. The model is loaded once, when a rule first
// asks for a tag.
//
// It refuses nothing: any string, valid UTF-8 or not, gives a Doc whose spans
// lie inside the text. On valid UTF-8 they stand on rune boundaries.
//
// Floor 2 (tools).
package text
