package store

import (
	"context"
	"database/sql"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	_ "modernc.org/sqlite" // the driver "sqlite"
)

//go:embed schema/*.sql
var schema embed.FS

// applicationID marks the file as a collection of this program ("cat" and a
// version byte), so that a foreign database is not written to.
const applicationID = 0x63617401

// Errors that callers branch on.
var (
	ErrNewer   = errors.New("made by a newer version of catena")
	ErrForeign = errors.New("not a collection of catena")
	ErrMissing = errors.New("no collection")
)

// Store is an open database. It may be used by several goroutines, but only
// one Batch may be open at a time.
type Store struct {
	db       *sql.DB
	readOnly bool
}

// Open opens the database file at path, making it where it is missing unless
// readOnly. It refuses a database of a newer version (ErrNewer) or of another
// program (ErrForeign); a missing file that must be read is ErrMissing.
func Open(ctx context.Context, path string, readOnly bool) (*Store, error) {
	if readOnly {
		if _, err := os.Stat(path); errors.Is(err, fs.ErrNotExist) {
			return nil, fmt.Errorf("open %s: %w", path, ErrMissing)
		}
	}
	s, err := connect(ctx, path, readOnly, false)
	if err != nil && readOnly && cannotWrite(err) && logIsEmpty(path) {
		// on a disk that cannot be written to SQLite has no place for what it
		// shares between readers, and needs none, since nobody can write
		s, err = connect(ctx, path, true, true)
	}
	if err != nil {
		return nil, fmt.Errorf("open %s: %w", path, explain(err))
	}
	return s, nil
}

func connect(ctx context.Context, path string, readOnly, immutable bool) (*Store, error) {
	// full synchronisation: an index must never reflect a change that a power
	// cut took back. Commits are of a thousand rows, so it costs little.
	query := url.Values{"_pragma": {
		"busy_timeout(15000)", "page_size(16384)", "foreign_keys(1)", "synchronous(2)", "cache_size(-32000)", "temp_store(2)",
	}}
	switch {
	case immutable:
		query.Set("immutable", "1")
		query.Set("mode", "ro")
	case readOnly:
		query.Add("_pragma", "query_only(1)")
	default:
		query.Set("_txlock", "immediate")
		query.Add("_pragma", "journal_mode(wal)")
	}
	name := (&url.URL{Scheme: "file", Opaque: escapePath(path), RawQuery: query.Encode()}).String()
	db, err := sql.Open("sqlite", name)
	if err != nil {
		return nil, err
	}
	s := &Store{db, readOnly}
	if err := s.migrate(ctx); err != nil {
		db.Close()
		return nil, err
	}
	return s, nil
}

// cannotWrite tells whether an error comes of a disk that cannot be written to.
func cannotWrite(err error) bool {
	text := err.Error()
	return strings.Contains(text, "readonly database") || strings.Contains(text, "unable to open database file")
}

// logIsEmpty tells whether the database file holds all that was written.
func logIsEmpty(path string) bool {
	info, err := os.Stat(path + "-wal")
	return errors.Is(err, fs.ErrNotExist) || err == nil && info.Size() == 0
}

// escapePath writes a path as the opaque part of a file: URI.
func escapePath(path string) string {
	p := filepath.ToSlash(path)
	if filepath.VolumeName(path) != "" {
		p = "/" + p // file:/C:/...
	}
	return (&url.URL{Path: p}).EscapedPath()
}

// Close closes the database.
func (s *Store) Close() error { return s.db.Close() }

// explain adds what to do to the errors of SQLite that users meet.
func explain(err error) error {
	if err == nil {
		return nil
	}
	switch text := err.Error(); {
	case strings.Contains(text, "SQLITE_FULL"), strings.Contains(text, "disk is full"):
		return fmt.Errorf("the disk is full; nothing half-written stays, make room and run the same command again: %w", err)
	case strings.Contains(text, "SQLITE_NOTADB"), strings.Contains(text, "not a database"):
		return fmt.Errorf("%w: %w", ErrForeign, err)
	case strings.Contains(text, "SQLITE_READONLY"):
		return fmt.Errorf("the folder cannot be written to: %w", err)
	case strings.Contains(text, "SQLITE_CORRUPT"):
		return fmt.Errorf("the database is damaged; go back to a backup: %w", err)
	}
	return err
}

// migrate brings the schema up to date, each file in a transaction of its own.
func (s *Store) migrate(ctx context.Context) error {
	var version, app, tables int
	if err := s.db.QueryRowContext(ctx, "PRAGMA user_version").Scan(&version); err != nil {
		return err
	}
	if err := s.db.QueryRowContext(ctx, "PRAGMA application_id").Scan(&app); err != nil {
		return err
	}
	if err := s.db.QueryRowContext(ctx, "SELECT count(*) FROM sqlite_master").Scan(&tables); err != nil {
		return err
	}
	steps, err := fs.Glob(schema, "schema/*.sql")
	if err != nil {
		return err
	}
	slices.Sort(steps)
	switch {
	case app != applicationID && (app != 0 || tables > 0):
		return ErrForeign
	case version > len(steps):
		return fmt.Errorf("%w (its format is %d, this program knows %d); update the program", ErrNewer, version, len(steps))
	case s.readOnly && version < len(steps):
		return fmt.Errorf("its format is %d and must become %d: run any command that writes, such as catena tag", version, len(steps))
	}
	for n := version; n < len(steps); n++ {
		step, err := schema.ReadFile(steps[n])
		if err != nil {
			return err
		}
		tx, err := s.db.BeginTx(ctx, nil)
		if err != nil {
			return err
		}
		script := fmt.Sprintf("%s;\nPRAGMA application_id = %d;\nPRAGMA user_version = %d;", step, applicationID, n+1)
		if _, err := tx.ExecContext(ctx, script); err != nil {
			tx.Rollback()
			return fmt.Errorf("schema step %d: %w", n+1, err)
		}
		if err := tx.Commit(); err != nil {
			return fmt.Errorf("schema step %d: %w", n+1, err)
		}
	}
	return nil
}

// Change is the number of the last change of an occurrence's content; 0 in an
// empty collection.
func (s *Store) Change(ctx context.Context) (int64, error) {
	value, err := s.State(ctx, "change")
	if err != nil {
		return 0, err
	}
	n, err := strconv.ParseInt(value, 10, 64)
	if err != nil {
		return 0, fmt.Errorf("read change number %q: %w", value, err)
	}
	return n, nil
}

// State reads a named value, "" where it was never set.
func (s *Store) State(ctx context.Context, name string) (string, error) {
	var value string
	err := s.db.QueryRowContext(ctx, "SELECT value FROM state WHERE name = ?", name).Scan(&value)
	if err != nil && !errors.Is(err, sql.ErrNoRows) {
		return "", fmt.Errorf("read state %s: %w", name, explain(err))
	}
	return value, nil
}

// SetState sets a named value.
func (s *Store) SetState(ctx context.Context, name, value string) error {
	_, err := s.db.ExecContext(ctx, "INSERT INTO state VALUES (?, ?) ON CONFLICT DO UPDATE SET value = excluded.value", name, value)
	if err != nil {
		return fmt.Errorf("set state %s: %w", name, explain(err))
	}
	return nil
}
