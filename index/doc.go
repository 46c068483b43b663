// Package index is the full-text index of a collection: what find searches.
// It is the only package that imports bleve.
//
// The index is derived from the database and can be thrown away at any time.
// It records the number of the last change that it reflects in the same batch
// as the documents, so that after a crash it is behind at most, never wrong
// about how far it got. A missing, damaged or differently made index gives an
// error that the caller answers by building it anew.
//
// Text is analysed by the words that the rules read too (package
// classify/text): abbreviations written out, one spelling of variants; then
// function words are left out and English stems taken. Every position is a
// byte offset into the narrative exactly as read. Nothing is stored but the
// index itself: texts for snippets come from a function of the caller's.
//
// Floor 4 (engines).
package index
