package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
	"iter"
	"os"
	"path/filepath"
	"strconv"
	"time"
)

// Removal is a reference that a person removed, without its content.
type Removal struct {
	Source, ID string
	Who        string
	At         time.Time
	Note       string
}

// isRemoved tells whether a person removed a reference.
func (b *Batch) isRemoved(source, id string) (bool, error) {
	st, err := b.stmt("SELECT EXISTS (SELECT 1 FROM removed WHERE source = ? AND id = ?)")
	if err != nil {
		return false, err
	}
	gone := false
	if err := st.QueryRowContext(b.ctx, source, id).Scan(&gone); err != nil {
		return false, fmt.Errorf("look up removed references: %w", explain(err))
	}
	return gone, nil
}

// Remove takes an occurrence out with everything that belongs to it, its
// history too, and notes that it was removed. No page of the file holds it then.
func (s *Store) Remove(ctx context.Context, key int64, r Removal) error {
	b, err := s.Begin(ctx)
	if err != nil {
		return err
	}
	b.change++
	b.exec(`INSERT INTO removed SELECT source, id, key, ?, ?, ?, ? FROM occurrence WHERE key = ?`, b.change, r.Who, r.At.UTC().Format(time.RFC3339), r.Note, key)
	for _, table := range []string{"double", "double_decision"} {
		b.exec("DELETE FROM "+table+" WHERE a = ?1 OR b = ?1", key)
	}
	b.exec("DELETE FROM narrative WHERE "+narrativesOf, key)
	for _, table := range []string{"tag", "chain", "raw", "revision"} {
		b.exec("DELETE FROM "+table+" WHERE occurrence = ?", key)
	}
	b.exec("DELETE FROM occurrence WHERE key = ?", key)
	// a search for doubles that was in step still is
	b.exec("UPDATE state SET value = ? WHERE name = ? AND value = ?", strconv.FormatInt(b.change, 10), doublesState, strconv.FormatInt(b.change-1, 10))
	if err := b.Commit(); err != nil {
		return err
	}
	// the database is written anew without its free pages, which hold what was
	// deleted, today or before
	if _, err := s.db.ExecContext(ctx, "VACUUM"); err != nil {
		return fmt.Errorf("overwrite what was removed: %w", explain(err))
	}
	return s.flushLog(ctx)
}

// flushLog moves the write-ahead log into the database and empties it, so that
// no page from before is left in it.
func (s *Store) flushLog(ctx context.Context) error {
	var busy, pages, moved int
	if err := s.db.QueryRowContext(ctx, "PRAGMA wal_checkpoint(TRUNCATE)").Scan(&busy, &pages, &moved); err != nil {
		return fmt.Errorf("empty the write-ahead log: %w", explain(err))
	}
	if busy != 0 {
		return ErrLogBusy
	}
	return nil
}

// ErrLogBusy says that others read the database, so that its log could not be
// emptied; nothing is lost by it.
var ErrLogBusy = errors.New("another process is reading the collection; traces may stay in catena.db-wal until it has ended and something is written")

// Readmit lets a removed reference be stored again; it tells whether it was
// removed.
func (s *Store) Readmit(ctx context.Context, source, id string) (bool, error) {
	res, err := s.db.ExecContext(ctx, "DELETE FROM removed WHERE id = ? AND (? = '' OR source = ?)", id, source, source)
	if err != nil {
		return false, fmt.Errorf("readmit %s: %w", id, explain(err))
	}
	n, err := res.RowsAffected()
	return n > 0, err
}

// RemovedKeys are the keys that occurrences had which were removed after a
// change.
func (s *Store) RemovedKeys(ctx context.Context, after int64) ([]int64, error) {
	rows, err := s.db.QueryContext(ctx, "SELECT key FROM removed WHERE change > ? ORDER BY change", after)
	if err != nil {
		return nil, fmt.Errorf("read removed references: %w", explain(err))
	}
	defer rows.Close()
	var keys []int64
	for rows.Next() {
		var k int64
		if err := rows.Scan(&k); err != nil {
			return nil, fmt.Errorf("read removed references: %w", err)
		}
		keys = append(keys, k)
	}
	return keys, rows.Err()
}

// Removals lists what was removed, in that order.
func (s *Store) Removals(ctx context.Context) ([]Removal, error) {
	rows, err := s.db.QueryContext(ctx, "SELECT source, id, who, at, note FROM removed ORDER BY change")
	if err != nil {
		return nil, fmt.Errorf("read removed references: %w", explain(err))
	}
	defer rows.Close()
	var out []Removal
	for rows.Next() {
		var r Removal
		var at string
		err := rows.Scan(&r.Source, &r.ID, &r.Who, &at, &r.Note)
		if err == nil {
			r.At, err = time.Parse(time.RFC3339, at)
		}
		if err != nil {
			return nil, fmt.Errorf("read removed references: %w", err)
		}
		out = append(out, r)
	}
	return out, rows.Err()
}

// maxFaults is how many faults of a kind are told.
const maxFaults = 20

// Integrity lets SQLite look at every page and every reference between tables.
// It returns what is wrong, in words.
func (s *Store) Integrity(ctx context.Context) ([]string, error) {
	var faults []string
	rows, err := s.db.QueryContext(ctx, fmt.Sprintf("PRAGMA integrity_check(%d)", maxFaults))
	if err != nil {
		return nil, fmt.Errorf("check the database: %w", explain(err))
	}
	for rows.Next() {
		var line string
		if err := rows.Scan(&line); err != nil {
			rows.Close()
			return nil, fmt.Errorf("check the database: %w", err)
		}
		if line != "ok" {
			faults = append(faults, "database: "+line)
		}
	}
	rows.Close()
	if err := rows.Err(); err != nil {
		return nil, fmt.Errorf("check the database: %w", explain(err))
	}
	rows, err = s.db.QueryContext(ctx, "SELECT \"table\", coalesce(rowid, 0), parent FROM pragma_foreign_key_check LIMIT ?", maxFaults)
	if err != nil {
		return nil, fmt.Errorf("check the database: %w", explain(err))
	}
	defer rows.Close()
	for rows.Next() {
		var table, parent string
		var row int64
		if err := rows.Scan(&table, &row, &parent); err != nil {
			return nil, fmt.Errorf("check the database: %w", err)
		}
		faults = append(faults, fmt.Sprintf("database: row %d of %s belongs to no %s", row, table, parent))
	}
	return faults, rows.Err()
}

// EachRevision streams the earlier contents of occurrences with the hashes
// that they were stored under.
func (s *Store) EachRevision(ctx context.Context) iter.Seq2[struct {
	Key    int64
	Record []byte
	Hash   []byte
}, error] {
	type revision = struct {
		Key    int64
		Record []byte
		Hash   []byte
	}
	return func(yield func(revision, error) bool) {
		rows, err := s.db.QueryContext(ctx, "SELECT occurrence, record, hash FROM revision ORDER BY occurrence, n")
		if err != nil {
			yield(revision{}, fmt.Errorf("read revisions: %w", explain(err)))
			return
		}
		defer rows.Close()
		for rows.Next() {
			var r revision
			if err := rows.Scan(&r.Key, &r.Record, &r.Hash); err != nil {
				yield(r, fmt.Errorf("read revisions: %w", err))
				return
			}
			if !yield(r, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			yield(revision{}, fmt.Errorf("read revisions: %w", explain(err)))
		}
	}
}

// CheckSetAside compares each set-aside row with the hash and size that it was
// kept under.
func (s *Store) CheckSetAside(ctx context.Context) (faults []string, err error) {
	rows, err := s.db.QueryContext(ctx, `SELECT a.key, f.path, a.row, a.size, a.hash, p.bytes FROM set_aside a JOIN file f ON f.key = a.file
		LEFT JOIN set_aside_part p ON p.set_aside = a.key ORDER BY a.key, p.n`)
	if err != nil {
		return nil, fmt.Errorf("check set-aside rows: %w", explain(err))
	}
	defer rows.Close()
	sum := sha256.New()
	var at struct {
		key, row, size, got int64
		path                string
		hash                []byte
	}
	done := func() {
		if at.key != 0 && (at.size != at.got || !bytes.Equal(at.hash, sum.Sum(nil))) && len(faults) < maxFaults {
			faults = append(faults, fmt.Sprintf("set aside: row %d of %s is not as it was kept", at.row, at.path))
		}
		sum.Reset()
		at.got = 0
	}
	for rows.Next() {
		var key, row, size int64
		var path string
		var hash []byte
		var part sql.RawBytes
		if err := rows.Scan(&key, &path, &row, &size, &hash, &part); err != nil {
			return nil, fmt.Errorf("check set-aside rows: %w", err)
		}
		if key != at.key {
			done()
			at.key, at.path, at.row, at.size, at.hash = key, path, row, size, bytes.Clone(hash)
		}
		sum.Write(part)
		at.got += int64(len(part))
	}
	done()
	return faults, rows.Err()
}

// Backup writes the database as one moment shows it to a new file, while
// others read and write. The file appears whole or not at all; one that is
// there already is an error unless replace is set.
func (s *Store) Backup(ctx context.Context, path string, replace bool) error {
	if _, err := os.Lstat(path); err == nil && !replace {
		return fmt.Errorf("back up to %s: %w", path, os.ErrExist)
	}
	part := path + ".part"
	if err := os.Remove(part); err != nil && !errors.Is(err, os.ErrNotExist) {
		return fmt.Errorf("back up to %s: %w", path, err)
	}
	err := s.vacuumInto(ctx, part)
	if err == nil {
		err = syncFile(part)
	}
	if err == nil {
		err = os.Rename(part, path)
	}
	if err != nil {
		os.Remove(part)
		return fmt.Errorf("back up to %s: %w", path, err)
	}
	return syncFolder(filepath.Dir(path))
}

// vacuumInto writes a copy. A connection that may only ask may not do that,
// although the copy is another file.
func (s *Store) vacuumInto(ctx context.Context, path string) error {
	conn, err := s.db.Conn(ctx)
	if err != nil {
		return explain(err)
	}
	defer conn.Close()
	if s.readOnly {
		if _, err := conn.ExecContext(ctx, "PRAGMA query_only(0)"); err != nil {
			return explain(err)
		}
		defer conn.ExecContext(context.WithoutCancel(ctx), "PRAGMA query_only(1)")
	}
	_, err = conn.ExecContext(ctx, "VACUUM INTO ?", path)
	return explain(err)
}

// syncFile makes a file's content durable.
func syncFile(path string) error {
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	err = f.Sync()
	return errors.Join(err, f.Close())
}

// syncFolder makes a renaming durable, where the system can.
func syncFolder(dir string) error {
	f, err := os.Open(dir)
	if err != nil {
		return err
	}
	f.Sync() // not everywhere allowed on folders
	return f.Close()
}
