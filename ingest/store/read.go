package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"encoding/json"
	"errors"
	"fmt"
	"iter"
	"strings"

	"catena/ingest/corpus"
)

// Row is a stored occurrence.
type Row struct {
	Key    int64
	Change int64
	corpus.Tagged
	corpus.Source        // where it was read from
	Hash          []byte // of its content, as it was stored
}

// querier is a database or a transaction.
type querier interface {
	QueryContext(ctx context.Context, query string, args ...any) (*sql.Rows, error)
	QueryRowContext(ctx context.Context, query string, args ...any) *sql.Row
}

// fieldColumns are the columns of an occurrence's fields, in the order in
// which fields scans them.
const fieldColumns = `o.source, o.id, o.date, o.place, o.country, o.make, o.model, o.category, o.engines, o.engine_type,
	o.operation, o.phase, o.injury, o.damage, o.event, o.rest`

// fields scans fieldColumns into an occurrence; call done after the scan.
type fields struct {
	o          *corpus.Occurrence
	date, rest string
}

func (f *fields) into() []any {
	o := f.o
	return []any{&o.Source, &o.ID, &f.date, &o.Place, &o.Country, &o.Make, &o.Model, &o.Category, &o.Engines, &o.EngineType,
		&o.Operation, &o.Phase, &o.Injury, &o.Damage, &o.Event, &f.rest}
}

func (f *fields) done() error {
	var err error
	if f.o.Date, err = corpus.ParseDate(f.date); err != nil || f.rest == "{}" {
		return err
	}
	var x rest
	if err := json.Unmarshal([]byte(f.rest), &x); err != nil {
		return err
	}
	f.o.Further, f.o.Codes, f.o.Extra = x.Aircraft, x.Codes, x.Extra
	return nil
}

const rowQuery = `SELECT o.key, o.change, o.rulebook, f.path, o.row, o.line, o.hash, ` + fieldColumns + `
	FROM occurrence o JOIN file f ON f.key = o.file `

func scanRow(rows *sql.Rows) (*Row, error) {
	r := &Row{}
	f := fields{o: &r.Occurrence}
	if err := rows.Scan(append([]any{&r.Key, &r.Change, &r.Rulebook, &r.File, &r.Row, &r.Line, &r.Hash}, f.into()...)...); err != nil {
		return nil, err
	}
	return r, f.done()
}

// Select says which occurrences Each reads. The zero value means all.
type Select struct {
	ByChange bool   // in the order of change, those after After only
	After    int64  // a change number
	Outdated string // only those whose tags another rule book than this made
}

// Each streams occurrences with narratives, tags and chain, in the order in
// which they were stored, or of change. Breaking off the
// loop is allowed.
func (s *Store) Each(ctx context.Context, sel Select) iter.Seq2[*Row, error] {
	return func(yield func(*Row, error) bool) {
		// one transaction, so that a load in another process cannot show
		// half of itself
		tx, err := s.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			yield(nil, fmt.Errorf("read occurrences: %w", explain(err)))
			return
		}
		defer tx.Rollback()
		query, args := rowQuery+"ORDER BY o.key", []any{}
		switch {
		case sel.ByChange:
			query, args = rowQuery+"WHERE o.change > ? ORDER BY o.change", []any{sel.After}
		case sel.Outdated != "":
			query, args = rowQuery+"WHERE o.rulebook <> ? ORDER BY o.key", []any{sel.Outdated}
		}
		rows, err := tx.QueryContext(ctx, query, args...)
		if err != nil {
			yield(nil, fmt.Errorf("read occurrences: %w", explain(err)))
			return
		}
		defer rows.Close()
		p, err := newParts(ctx, tx)
		if err != nil {
			yield(nil, err)
			return
		}
		defer p.close()
		for rows.Next() {
			r, err := scanRow(rows)
			if err == nil {
				err = p.read(ctx, r)
			}
			if err != nil {
				yield(nil, fmt.Errorf("read occurrences: %w", explain(err)))
				return
			}
			if !yield(r, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			yield(nil, fmt.Errorf("read occurrences: %w", explain(err)))
		}
	}
}

// parts reads what belongs to an occurrence beyond its row.
type parts struct {
	narratives, tags, chain *sql.Stmt
}

func newParts(ctx context.Context, tx *sql.Tx) (*parts, error) {
	p := &parts{}
	for _, s := range []struct {
		into  **sql.Stmt
		query string
	}{
		{&p.narratives, "SELECT kind, text FROM narrative WHERE " + narrativesOf + " ORDER BY key"},
		{&p.tags, `SELECT factor, assertion, basis, narrative, start, "end", rule, strength, side, actor, quantity, rule_hash FROM tag WHERE occurrence = ? ORDER BY n`},
		{&p.chain, "SELECT outcome, broken_by, links, doubts FROM chain WHERE occurrence = ?"},
	} {
		st, err := tx.PrepareContext(ctx, s.query)
		if err != nil {
			p.close()
			return nil, fmt.Errorf("read occurrences: %w", explain(err))
		}
		*s.into = st
	}
	return p, nil
}

func (p *parts) close() {
	for _, st := range []*sql.Stmt{p.narratives, p.tags, p.chain} {
		if st != nil {
			st.Close()
		}
	}
}

func (p *parts) read(ctx context.Context, r *Row) error {
	r.Narratives, r.Tags = []corpus.Narrative{}, []corpus.Tag{}
	err := each(ctx, p.narratives, r.Key, func(rows *sql.Rows) error {
		var n corpus.Narrative
		err := rows.Scan(&n.Kind, &n.Text)
		r.Narratives = append(r.Narratives, n)
		return err
	})
	r.CutOff = r.CutOffs()
	if err != nil {
		return err
	}
	err = each(ctx, p.tags, r.Key, func(rows *sql.Rows) error {
		var t corpus.Tag
		var quantity string
		if err := rows.Scan(&t.Factor, &t.Assertion, &t.Basis, &t.Narrative, &t.Start, &t.End, &t.Rule, &t.Strength, &t.Side, &t.Actor, &quantity, &t.RuleHash); err != nil {
			return err
		}
		if t.Narrative < 0 || t.Narrative >= len(r.Narratives) {
			return fmt.Errorf("occurrence %s %s: a tag of narrative %d, which it does not have", r.Occurrence.Source, r.ID, t.Narrative)
		}
		text := r.Narratives[t.Narrative].Text
		if err := t.Check(text); err != nil {
			return fmt.Errorf("occurrence %s %s: tag %s: %w", r.Occurrence.Source, r.ID, t.Factor, err)
		}
		t.Quote = t.Of(text)
		if quantity != "" {
			t.Quantity = &corpus.Quantity{}
			if err := json.Unmarshal([]byte(quantity), t.Quantity); err != nil {
				return err
			}
		}
		r.Tags = append(r.Tags, t)
		return nil
	})
	if err != nil {
		return err
	}
	var links, doubts string
	switch err := p.chain.QueryRowContext(ctx, r.Key).Scan(&r.Chain.Outcome, &r.Chain.BrokenBy, &links, &doubts); {
	case errors.Is(err, sql.ErrNoRows):
		links = "[]"
	case err != nil:
		return err
	}
	if doubts != "" {
		r.Chain.Doubts = strings.Split(doubts, "\n")
	}
	return json.Unmarshal([]byte(links), &r.Chain.Links)
}

func each(ctx context.Context, st *sql.Stmt, key int64, scan func(*sql.Rows) error) error {
	rows, err := st.QueryContext(ctx, key)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() {
		if err := scan(rows); err != nil {
			return err
		}
	}
	return rows.Err()
}

// One reads a stored occurrence by its key; ErrMissing where there is none.
func (s *Store) One(ctx context.Context, key int64) (*Row, error) {
	tx, err := s.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return nil, fmt.Errorf("read occurrence: %w", explain(err))
	}
	defer tx.Rollback()
	return readOne(ctx, tx, key)
}

func readOne(ctx context.Context, tx *sql.Tx, key int64) (*Row, error) {
	rows, err := tx.QueryContext(ctx, rowQuery+"WHERE o.key = ?", key)
	if err != nil {
		return nil, fmt.Errorf("read occurrence: %w", explain(err))
	}
	defer rows.Close()
	if !rows.Next() {
		if err := rows.Err(); err != nil {
			return nil, fmt.Errorf("read occurrence: %w", explain(err))
		}
		return nil, fmt.Errorf("occurrence %d: %w", key, ErrMissing)
	}
	r, err := scanRow(rows)
	if err != nil {
		return nil, fmt.Errorf("read occurrence: %w", err)
	}
	rows.Close()
	p, err := newParts(ctx, tx)
	if err != nil {
		return nil, err
	}
	defer p.close()
	if err := p.read(ctx, r); err != nil {
		return nil, fmt.Errorf("read occurrence: %w", explain(err))
	}
	return r, nil
}

// Keys finds the occurrences with a reference, of one source or, where source
// is "", of any.
func (s *Store) Keys(ctx context.Context, source, id string) ([]int64, error) {
	rows, err := s.db.QueryContext(ctx, "SELECT key FROM occurrence WHERE id = ? AND (? = '' OR source = ?) ORDER BY source", id, source, source)
	if err != nil {
		return nil, fmt.Errorf("look up %s: %w", id, explain(err))
	}
	defer rows.Close()
	var keys []int64
	for rows.Next() {
		var k int64
		if err := rows.Scan(&k); err != nil {
			return nil, fmt.Errorf("look up %s: %w", id, err)
		}
		keys = append(keys, k)
	}
	return keys, rows.Err()
}

// Raw is the row that an occurrence was read from, byte for byte.
func (s *Store) Raw(ctx context.Context, key int64) ([]byte, error) {
	var raw []byte
	err := s.db.QueryRowContext(ctx, "SELECT bytes FROM raw WHERE occurrence = ?", key).Scan(&raw)
	if errors.Is(err, sql.ErrNoRows) {
		return nil, fmt.Errorf("occurrence %d: %w", key, ErrMissing)
	}
	if err != nil {
		return nil, fmt.Errorf("read raw row: %w", explain(err))
	}
	return raw, nil
}

// Known tells whether this content of (source, id) is stored already. It is
// a hint that spares work: Batch.Put decides.
func (s *Store) Known(ctx context.Context, source, id string, hash [sha256.Size]byte) (bool, error) {
	var stored []byte
	err := s.db.QueryRowContext(ctx, "SELECT hash FROM occurrence WHERE source = ? AND id = ?", source, id).Scan(&stored)
	if errors.Is(err, sql.ErrNoRows) {
		return false, nil
	}
	if err != nil {
		return false, fmt.Errorf("look up %s %s: %w", source, id, explain(err))
	}
	return bytes.Equal(stored, hash[:]), nil
}

// Rulebooks reads what each known version of rule book and engine was made of.
func (s *Store) Rulebooks(ctx context.Context) (map[string]map[string]string, error) {
	out := map[string]map[string]string{}
	rows, err := s.db.QueryContext(ctx, "SELECT version, parts FROM rulebook")
	if err != nil {
		return nil, fmt.Errorf("read rule books: %w", explain(err))
	}
	defer rows.Close()
	for rows.Next() {
		var version, data string
		if err := rows.Scan(&version, &data); err != nil {
			return nil, fmt.Errorf("read rule books: %w", explain(err))
		}
		var parts map[string]string
		if err := json.Unmarshal([]byte(data), &parts); err != nil {
			return nil, fmt.Errorf("read rule book %s: %w", version, err)
		}
		out[version] = parts
	}
	if err := rows.Err(); err != nil {
		return nil, fmt.Errorf("read rule books: %w", explain(err))
	}
	return out, nil
}

// Counted is what a table needs of an occurrence: its fields without the
// texts, and its affirmed factors.
type Counted struct {
	Key        int64
	Occurrence corpus.Occurrence // narratives hold kinds, no text
	Usable     bool
	CutOff     bool     // a narrative stops in mid-sentence
	Told       []string // factors with an affirmed tag whose basis is told
	Inferred   []string // factors whose affirmed tags are inferred
	Path       []string // factors of the chain, in order
	BrokenBy   string
}

// Count streams what tables count, in the order of storing.
func (s *Store) Count(ctx context.Context) iter.Seq2[*Counted, error] {
	return func(yield func(*Counted, error) bool) {
		rows, err := s.db.QueryContext(ctx, `SELECT o.key, o.kinds, o.usable, o.cut_off, coalesce((SELECT group_concat(DISTINCT basis || ' ' || factor) FROM tag WHERE occurrence = o.key AND assertion = 'affirmed'), ''),
			coalesce(c.links, '[]'), coalesce(c.broken_by, ''), `+fieldColumns+`
			FROM occurrence o LEFT JOIN chain c ON c.occurrence = o.key ORDER BY o.key`)
		if err != nil {
			yield(nil, fmt.Errorf("count occurrences: %w", explain(err)))
			return
		}
		defer rows.Close()
		for rows.Next() {
			c, err := scanCounted(rows)
			if err != nil {
				yield(nil, fmt.Errorf("count occurrences: %w", err))
				return
			}
			if !yield(c, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			yield(nil, fmt.Errorf("count occurrences: %w", explain(err)))
		}
	}
}

func scanCounted(rows *sql.Rows) (*Counted, error) {
	c := &Counted{}
	o := &c.Occurrence
	f := fields{o: o}
	var kinds, factors, links string
	if err := rows.Scan(append([]any{&c.Key, &kinds, &c.Usable, &c.CutOff, &factors, &links, &c.BrokenBy}, f.into()...)...); err != nil {
		return nil, err
	}
	if err := f.done(); err != nil {
		return nil, err
	}
	if kinds != "" {
		for _, k := range strings.Split(kinds, ",") {
			o.Narratives = append(o.Narratives, corpus.Narrative{Kind: k})
		}
	}
	if factors != "" {
		for _, f := range strings.Split(factors, ",") {
			basis, factor, _ := strings.Cut(f, " ")
			if basis == string(corpus.Told) {
				c.Told = append(c.Told, factor)
			} else {
				c.Inferred = append(c.Inferred, factor)
			}
		}
	}
	if links != "[]" {
		var path []corpus.Link
		if err := json.Unmarshal([]byte(links), &path); err != nil {
			return nil, err
		}
		for _, l := range path {
			c.Path = append(c.Path, l.Factor)
		}
	}
	return c, nil
}

// KeptAside is a row of set_aside as it is read back.
type KeptAside struct {
	Key             int64 // rises with each row kept
	corpus.SetAside       // Raw is filled up to the limit that was asked for
	Size            int64
}

// EachSetAside streams the set-aside rows behind the key after in the order of
// keeping, each with at most limit bytes of its raw content.
func (s *Store) EachSetAside(ctx context.Context, after, limit int64) iter.Seq2[*KeptAside, error] {
	return func(yield func(*KeptAside, error) bool) {
		fail := func(err error) { yield(nil, fmt.Errorf("read set-aside rows: %w", explain(err))) }
		tx, err := s.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			fail(err)
			return
		}
		defer tx.Rollback()
		rows, err := tx.QueryContext(ctx, "SELECT a.key, f.path, a.row, a.line, a.reason, a.size FROM set_aside a JOIN file f ON f.key = a.file WHERE a.key > ? ORDER BY a.key", after)
		if err != nil {
			fail(err)
			return
		}
		defer rows.Close()
		parts, err := tx.PrepareContext(ctx, "SELECT bytes FROM set_aside_part WHERE set_aside = ? ORDER BY n")
		if err != nil {
			fail(err)
			return
		}
		defer parts.Close()
		for rows.Next() {
			a := &KeptAside{}
			if err := rows.Scan(&a.Key, &a.File, &a.Row, &a.Line, &a.Reason, &a.Size); err != nil {
				fail(err)
				return
			}
			if err := readParts(ctx, parts, a.Key, limit, &a.Raw); err != nil {
				fail(err)
				return
			}
			if !yield(a, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			fail(err)
		}
	}
}

func readParts(ctx context.Context, st *sql.Stmt, key, limit int64, into *[]byte) error {
	rows, err := st.QueryContext(ctx, key)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() && int64(len(*into)) < limit {
		var part []byte
		if err := rows.Scan(&part); err != nil {
			return err
		}
		*into = append(*into, part[:min(int64(len(part)), limit-int64(len(*into)))]...)
	}
	return rows.Err()
}

// Totals are the sizes of a collection.
type Totals struct {
	Occurrences, Narratives, Tags, SetAside, Revisions, Exposures int
	Bytes                                                         int64 // of narrative text
}

// Totals counts what the collection holds.
func (s *Store) Totals(ctx context.Context) (Totals, error) {
	var t Totals
	err := s.db.QueryRowContext(ctx, `SELECT (SELECT count(*) FROM occurrence), (SELECT count(*) FROM narrative), (SELECT count(*) FROM tag),
		(SELECT count(*) FROM set_aside), (SELECT count(*) FROM revision), (SELECT count(*) FROM exposure), (SELECT coalesce(sum(octet_length(text)), 0) FROM narrative)`).
		Scan(&t.Occurrences, &t.Narratives, &t.Tags, &t.SetAside, &t.Revisions, &t.Exposures, &t.Bytes)
	if err != nil {
		return t, fmt.Errorf("count the collection: %w", explain(err))
	}
	return t, nil
}
