package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
)

// Reading is how a file was read last.
type Reading struct {
	Header []byte // its header row or rows, nil for formats without
	Fields string // its field map as a map file, "" where the headers alone decided
	Dates  string // the order of dates
	Source string // the source that was told for all of it, "" for none
}

// Reading returns how the file of a path was read last.
func (s *Store) Reading(ctx context.Context, path string) (Reading, error) {
	var r Reading
	err := s.db.QueryRowContext(ctx, "SELECT header, fields, dates, source FROM file WHERE path = ?", path).Scan(&r.Header, &r.Fields, &r.Dates, &r.Source)
	if err != nil && !errors.Is(err, sql.ErrNoRows) {
		return r, fmt.Errorf("look up file %s: %w", path, explain(err))
	}
	return r, nil
}

// Reading notes how a file is read.
func (b *Batch) Reading(path, mapName string, r Reading) error {
	if r.Header == nil {
		r.Header = []byte{}
	}
	b.exec("UPDATE file SET header = ?, fields = ?, dates = ?, source = ? WHERE key = ?", r.Header, r.Fields, r.Dates, r.Source, b.file(path, mapName))
	return b.err
}

// DropAside removes a set-aside row that has become an occurrence in the same
// batch.
func (b *Batch) DropAside(key int64) error {
	b.exec("DELETE FROM set_aside_part WHERE set_aside = ?", key)
	b.exec("DELETE FROM set_aside WHERE key = ?", key)
	return b.err
}

// AsideReason puts the reason of the latest try to read a set-aside row.
func (b *Batch) AsideReason(key int64, reason string) error {
	b.exec("UPDATE set_aside SET reason = ? WHERE key = ?", reason, key)
	return b.err
}
