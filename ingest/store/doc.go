// Package store keeps a collection's occurrences, tags, exposure and set-aside
// rows in one SQLite database. It is the only package that knows the schema.
//
// Rules that hold at every instant, also after a crash:
//
//   - an occurrence is visible with its narratives, its raw row, its tags and
//     its chain, or not at all;
//   - every change of an occurrence's content carries a change number that
//     only grows; what is derived from the database (the index) records the
//     last number that it reflects;
//   - nothing that was read is dropped: a row that could not become an
//     occurrence is kept raw in set_aside, an earlier version in revision.
//
// There is one writer at a time, which is the caller's to see to (package
// collection holds a lock of the operating system); readers, in this process
// or another, see whole transactions only (write-ahead log).
//
// The schema is made by numbered files in schema/. A database of a newer
// version is refused with words.
//
// Floor 4 (engines).
package store
