// Package collection opens a collection (the folder that holds the database
// and what is derived from it) and keeps its parts in step: it loads files,
// tags, and heals the index.
//
// Loading is a chain of stages joined by bounded queues, so that memory does
// not grow with the input and both cores work:
//
//	reader -> classifiers (one per core) -> writer -> index
//
// The writer takes occurrences in the order of the file, whichever
// classifier is done first. It writes a batch as one transaction; the index
// follows from what is committed, and records the last change that it
// reflects. A crash therefore leaves whole batches, and an index that is at
// most behind: the next run reads the file again, finds what is stored
// unchanged, and goes on from there.
//
// One process writes to a collection at a time, by a lock of the operating
// system. Another one waits, and says for whom.
//
// Floor 5 (questions).
package collection
