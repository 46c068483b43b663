package ingest

import (
	"bytes"
	"crypto/sha256"
	"encoding/json"
	"fmt"

	"catena/ingest/corpus"
)

// AppendRecord appends the occurrence record as one line of NDJSON: keys in
// the record's order, extra keys sorted, no HTML escaping, so that equal
// occurrences make equal bytes. What Open then reads is the same occurrence,
// save that an empty list and none are one.
func AppendRecord(dst []byte, o *corpus.Occurrence) ([]byte, error) {
	record := *o
	if record.Narratives == nil {
		record.Narratives = []corpus.Narrative{} // never null
	}
	out := bytes.NewBuffer(dst)
	enc := json.NewEncoder(out)
	enc.SetEscapeHTML(false)
	if err := enc.Encode(&record); err != nil {
		return dst, fmt.Errorf("write occurrence %q: %w", o.ID, err)
	}
	return out.Bytes(), nil
}

// ContentHash is the SHA-256 of the occurrence record as AppendRecord writes
// it: it changes with any field or narrative, and not with the file or the
// row that the occurrence was read from.
func ContentHash(o *corpus.Occurrence) [32]byte {
	line, err := AppendRecord(nil, o)
	if err != nil {
		// Strings, integers and dates always encode.
		panic(err)
	}
	return sha256.Sum256(line)
}
