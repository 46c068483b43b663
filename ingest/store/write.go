package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// Put is one occurrence to write.
type Put struct {
	corpus.Tagged
	Hash [sha256.Size]byte // of the canonical record
	corpus.Source
	Raw []byte
}

// Fate is what became of a Put.
type Fate int

// The fates. Unchanged: this content is there already, as the current one or
// as an earlier revision. Barred: a person removed this reference.
const (
	Stored Fate = iota
	Unchanged
	Revised
	Barred
)

// Batch is a transaction of writes. What it wrote becomes visible with Commit,
// all at once; a batch that is not committed leaves nothing behind.
type Batch struct {
	ctx    context.Context
	tx     *sql.Tx
	change int64
	files  map[string]int64
	stmts  map[string]*sql.Stmt
	barred bool  // some references are removed
	err    error // first error of prepared execs
}

// Begin starts a batch.
func (s *Store) Begin(ctx context.Context) (*Batch, error) {
	tx, err := s.db.BeginTx(ctx, nil)
	if err != nil {
		return nil, fmt.Errorf("begin to write: %w", explain(err))
	}
	// the driver watches over a context that can end with a goroutine for each
	// statement; here the end of ctx rolls the transaction back
	b := &Batch{ctx: context.WithoutCancel(ctx), tx: tx, files: map[string]int64{}, stmts: map[string]*sql.Stmt{}}
	var value string
	if err := tx.QueryRowContext(ctx, "SELECT value FROM state WHERE name = 'change'").Scan(&value); err != nil {
		tx.Rollback()
		return nil, fmt.Errorf("read change number: %w", explain(err))
	}
	if b.change, err = strconv.ParseInt(value, 10, 64); err != nil {
		tx.Rollback()
		return nil, fmt.Errorf("read change number: %w", err)
	}
	if err := tx.QueryRowContext(ctx, "SELECT EXISTS (SELECT 1 FROM removed)").Scan(&b.barred); err != nil {
		tx.Rollback()
		return nil, fmt.Errorf("read removed references: %w", explain(err))
	}
	return b, nil
}

// Change is the change number that the batch has reached.
func (b *Batch) Change() int64 { return b.change }

// Commit makes the batch visible and durable.
func (b *Batch) Commit() error {
	if b.err != nil {
		b.tx.Rollback()
		return b.err
	}
	_, err := b.tx.ExecContext(b.ctx, "UPDATE state SET value = ? WHERE name = 'change'", strconv.FormatInt(b.change, 10))
	if err == nil {
		err = b.tx.Commit()
	}
	if err != nil {
		b.tx.Rollback()
		return fmt.Errorf("write: %w", explain(err))
	}
	return nil
}

// Rollback undoes the batch. After Commit it does nothing.
func (b *Batch) Rollback() { b.tx.Rollback() }

func (b *Batch) stmt(query string) (*sql.Stmt, error) {
	if st, ok := b.stmts[query]; ok {
		return st, nil
	}
	st, err := b.tx.PrepareContext(b.ctx, query)
	if err != nil {
		return nil, fmt.Errorf("prepare: %w", explain(err))
	}
	b.stmts[query] = st
	return st, nil
}

// exec runs a prepared statement and remembers the first error.
func (b *Batch) exec(query string, args ...any) sql.Result {
	if b.err != nil {
		return nil
	}
	st, err := b.stmt(query)
	if err != nil {
		b.err = err
		return nil
	}
	res, err := st.ExecContext(b.ctx, args...)
	if err != nil {
		b.err = fmt.Errorf("write: %w", explain(err))
	}
	return res
}

// file finds or makes the row of a path.
func (b *Batch) file(path, mapName string) int64 {
	if key, ok := b.files[path]; ok {
		return key
	}
	b.exec("INSERT INTO file (path, map) VALUES (?, ?) ON CONFLICT (path) DO UPDATE SET map = excluded.map", path, mapName)
	if b.err != nil {
		return 0
	}
	var key int64
	if err := b.tx.QueryRowContext(b.ctx, "SELECT key FROM file WHERE path = ?", path).Scan(&key); err != nil {
		b.err = fmt.Errorf("find file %s: %w", path, explain(err))
	}
	b.files[path] = key
	return key
}

// Put writes an occurrence with its narratives, raw row, tags and chain.
// Content that is stored already, or was before, changes nothing. mapName is
// the field map that read it. It returns the key of the occurrence.
func (b *Batch) Put(p *Put, mapName string) (key int64, fate Fate, err error) {
	if b.barred {
		switch gone, err := b.isRemoved(p.Occurrence.Source, p.ID); {
		case err != nil:
			return 0, 0, err
		case gone:
			return 0, Barred, nil
		}
	}
	key = b.insert(p, mapName) // most are new: try that first
	if b.err != nil || key != 0 {
		b.parts(key, p)
		return key, Stored, b.err
	}
	find, err := b.stmt("SELECT key, hash FROM occurrence WHERE source = ? AND id = ?")
	if err != nil {
		return 0, 0, err
	}
	var hash []byte
	if err := find.QueryRowContext(b.ctx, p.Occurrence.Source, p.ID).Scan(&key, &hash); err != nil {
		return 0, 0, fmt.Errorf("look up %s %s: %w", p.Occurrence.Source, p.ID, explain(err))
	}
	if bytes.Equal(hash, p.Hash[:]) {
		return key, Unchanged, b.err
	}
	known, err := b.hadContent(key, p.Hash)
	if err != nil || known {
		return key, Unchanged, err
	}
	fate = Revised
	b.revise(key, p, mapName)
	b.parts(key, p)
	return key, fate, b.err
}

// hadContent tells whether an earlier revision had this content, so that a
// file with two versions of one reference changes nothing when read again.
func (b *Batch) hadContent(key int64, hash [sha256.Size]byte) (bool, error) {
	st, err := b.stmt("SELECT count(*) FROM revision WHERE occurrence = ? AND hash = ?")
	if err != nil {
		return false, err
	}
	n := 0
	if err := st.QueryRowContext(b.ctx, key, hash[:]).Scan(&n); err != nil {
		return false, fmt.Errorf("look up revisions: %w", explain(err))
	}
	return n > 0, nil
}

func (b *Batch) columns(p *Put, mapName string) []any {
	rest, err := encodeRest(&p.Occurrence)
	if err != nil {
		b.err = err
		return nil
	}
	b.change++
	o := &p.Occurrence
	return []any{
		o.Date.String(), o.Place, o.Country, o.Make, o.Model, o.Category, o.Engines, o.EngineType, o.Operation,
		o.Phase, o.Injury, o.Damage, o.Event, rest, kinds(o), o.Usable(), o.CutOffs() != nil, p.Hash[:], b.file(p.File, mapName), p.Row, p.Line,
		b.change, p.Rulebook, o.Source, o.ID,
	}
}

const columnNames = `date, place, country, make, model, category, engines, engine_type, operation,
	phase, injury, damage, event, rest, kinds, usable, cut_off, hash, file, row, line, change, rulebook, source, id`

// insertOccurrence stores a reference that is not there yet.
var insertOccurrence = "INSERT INTO occurrence (" + columnNames + ") VALUES (?" + strings.Repeat(", ?", 24) + ") ON CONFLICT (source, id) DO NOTHING"

// insert returns the key of the new occurrence, 0 where the reference is there.
func (b *Batch) insert(p *Put, mapName string) int64 {
	res := b.exec(insertOccurrence, b.columns(p, mapName)...)
	if b.err != nil {
		return 0
	}
	if n, err := res.RowsAffected(); err != nil || n == 0 {
		b.change--
		return 0
	}
	key, err := res.LastInsertId()
	if err != nil {
		b.err = fmt.Errorf("write: %w", err)
	}
	return key
}

// revise moves the present content to the history and puts the new in place.
func (b *Batch) revise(key int64, p *Put, mapName string) {
	old, err := readOne(b.ctx, b.tx, key)
	if err != nil {
		b.err = err
		return
	}
	record, err := encode(&old.Occurrence)
	if err != nil {
		b.err = err
		return
	}
	b.exec(`INSERT INTO revision SELECT o.key, (SELECT count(*) FROM revision WHERE occurrence = o.key), o.hash, ?, r.bytes, o.file, o.row, o.line
		FROM occurrence o JOIN raw r ON r.occurrence = o.key WHERE o.key = ?`, record, key)
	b.exec("DELETE FROM narrative WHERE "+narrativesOf, key)
	for _, table := range []string{"raw", "tag", "chain"} {
		b.exec("DELETE FROM "+table+" WHERE occurrence = ?", key)
	}
	args := append(b.columns(p, mapName), key)
	b.exec("UPDATE occurrence SET ("+columnNames+") = (?"+strings.Repeat(", ?", 24)+") WHERE key = ?", args...)
}

// maxNarratives is what the narrative key leaves room for: the key of an
// occurrence times this, plus the number of the narrative.
const maxNarratives = 256

// narrativesOf finds the narratives of the occurrence whose key is ?1.
const narrativesOf = "key BETWEEN ?1 * 256 AND ?1 * 256 + 255"

func (b *Batch) parts(key int64, p *Put) {
	if len(p.Narratives) > maxNarratives {
		b.err = fmt.Errorf("%s %s: %d narratives, %d are the most", p.Occurrence.Source, p.ID, len(p.Narratives), maxNarratives)
		return
	}
	for n, t := range p.Narratives {
		b.exec("INSERT INTO narrative VALUES (?, ?, ?, ?)", key*maxNarratives+int64(n), key, t.Kind, t.Text)
	}
	raw := p.Raw
	if raw == nil {
		raw = []byte{}
	}
	b.exec("INSERT INTO raw VALUES (?, ?)", key, raw)
	b.tags(key, &p.Tagged)
}

func (b *Batch) tags(key int64, t *corpus.Tagged) {
	for n, g := range t.Tags {
		quantity := ""
		if g.Quantity != nil {
			data, err := json.Marshal(g.Quantity)
			if err != nil {
				b.err = fmt.Errorf("write quantity: %w", err)
				return
			}
			quantity = string(data)
		}
		b.exec("INSERT INTO tag VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)", key, n, g.Factor, string(g.Assertion), string(g.Basis),
			g.Narrative, g.Start, g.End, g.Rule, g.Strength, g.Side, g.Actor, quantity, g.RuleHash)
	}
	links, err := json.Marshal(t.Chain.Links)
	if err != nil {
		b.err = fmt.Errorf("write chain: %w", err)
		return
	}
	b.exec("INSERT INTO chain VALUES (?, ?, ?, ?, ?)", key, t.Chain.Outcome, t.Chain.BrokenBy, string(links), strings.Join(t.Chain.Doubts, "\n"))
}

// Retag replaces the tags and the chain of an occurrence; its content and
// change number stay.
func (b *Batch) Retag(key int64, t *corpus.Tagged) error {
	b.exec("DELETE FROM tag WHERE occurrence = ?", key)
	b.exec("DELETE FROM chain WHERE occurrence = ?", key)
	b.tags(key, t)
	b.exec("UPDATE occurrence SET rulebook = ? WHERE key = ?", t.Rulebook, key)
	return b.err
}

// Untouched marks the tags of an occurrence as those that the rule book of a
// version makes, without making them anew.
func (b *Batch) Untouched(key int64, rulebook string) error {
	b.exec("UPDATE occurrence SET rulebook = ? WHERE key = ?", rulebook, key)
	return b.err
}

// Rulebook keeps what a version of rule book and engine is made of (see
// classify.Classifier.Parts), in the transaction of the tags that it makes.
func (b *Batch) Rulebook(version string, parts map[string]string) error {
	data, err := json.Marshal(parts)
	if err != nil {
		return fmt.Errorf("write rule book: %w", err)
	}
	b.exec("INSERT INTO rulebook VALUES (?, ?) ON CONFLICT DO NOTHING", version, string(data))
	return b.err
}

// partSize is how much of a set-aside row is written at a time.
const partSize = 1 << 20

// SetAside keeps a row that could not become an occurrence. The same row of
// the same file, read again, is kept once; isNew tells whether it was.
func (b *Batch) SetAside(a *corpus.SetAside, mapName string) (isNew bool, err error) {
	open := func() (io.ReadCloser, error) {
		if a.Spool != "" {
			return os.Open(a.Spool)
		}
		return io.NopCloser(bytes.NewReader(a.Raw)), nil
	}
	in, err := open()
	if err != nil {
		return false, fmt.Errorf("read set-aside row: %w", err)
	}
	sum := sha256.New()
	size, err := io.Copy(sum, in)
	in.Close()
	if err != nil {
		return false, fmt.Errorf("read set-aside row: %w", err)
	}
	res := b.exec("INSERT INTO set_aside (file, row, line, reason, size, hash) VALUES (?, ?, ?, ?, ?, ?) ON CONFLICT DO NOTHING",
		b.file(a.File, mapName), a.Row, a.Line, a.Reason, size, sum.Sum(nil))
	if b.err != nil {
		return false, b.err
	}
	if n, err := res.RowsAffected(); err != nil || n == 0 {
		return false, err
	}
	key, err := res.LastInsertId()
	if err != nil {
		return false, fmt.Errorf("write: %w", err)
	}
	if in, err = open(); err != nil {
		return false, fmt.Errorf("read set-aside row: %w", err)
	}
	defer in.Close()
	part := make([]byte, min(partSize, size))
	for n := 0; size > 0; n++ {
		got, err := io.ReadFull(in, part)
		if got > 0 {
			b.exec("INSERT INTO set_aside_part VALUES (?, ?, ?)", key, n, part[:got])
		}
		if err == io.EOF || err == io.ErrUnexpectedEOF {
			break
		}
		if err != nil {
			return false, fmt.Errorf("read set-aside row: %w", err)
		}
	}
	return true, b.err
}

// kinds lists the kinds of an occurrence's narratives, for tables that tell
// one mix of texts from another.
func kinds(o *corpus.Occurrence) string {
	var out []string
	for _, n := range o.Narratives {
		out = append(out, n.Kind)
	}
	return strings.Join(out, ",")
}

// rest is what has no column of its own.
type rest struct {
	Aircraft []corpus.Aircraft `json:"aircraft,omitempty"`
	Codes    []corpus.Code     `json:"codes,omitempty"`
	Extra    map[string]string `json:"extra,omitempty"`
}

func encodeRest(o *corpus.Occurrence) (string, error) {
	return encode(rest{o.Further, o.Codes, o.Extra})
}

func encode(v any) (string, error) {
	var buf bytes.Buffer
	e := json.NewEncoder(&buf)
	e.SetEscapeHTML(false)
	if err := e.Encode(v); err != nil {
		return "", fmt.Errorf("encode record: %w", err)
	}
	return strings.TrimSuffix(buf.String(), "\n"), nil
}
