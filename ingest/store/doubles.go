package store

import (
	"context"
	"database/sql"
	"encoding/json"
	"fmt"
	"iter"
	"strconv"
	"time"

	"catena/ingest/corpus"
)

// Telling is what of an occurrence bears on whether it is another's double.
type Telling struct {
	Key        int64
	Occurrence corpus.Occurrence // with its narratives
	Tags       []corpus.Tag      // told and affirmed: factor and side only
}

// EachTelling streams all occurrences with texts and factors, in the order of
// storing, as one moment shows them; change is the change number of that.
func (s *Store) EachTelling(ctx context.Context, change *int64) iter.Seq2[*Telling, error] {
	return func(yield func(*Telling, error) bool) {
		fail := func(err error) { yield(nil, fmt.Errorf("read occurrences: %w", explain(err))) }
		tx, err := s.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
		if err != nil {
			fail(err)
			return
		}
		defer tx.Rollback()
		var value string
		if err := tx.QueryRowContext(ctx, "SELECT value FROM state WHERE name = 'change'").Scan(&value); err != nil {
			fail(err)
			return
		}
		if *change, err = strconv.ParseInt(value, 10, 64); err != nil {
			fail(err)
			return
		}
		// three streams in the order of keys, read side by side: asking for
		// the parts of each occurrence by itself takes four times as long
		rows, err := tx.QueryContext(ctx, "SELECT o.key, "+fieldColumns+" FROM occurrence o ORDER BY o.key")
		if err != nil {
			fail(err)
			return
		}
		defer rows.Close()
		texts, err := newSide(ctx, tx, "SELECT key / "+strconv.Itoa(maxNarratives)+", kind, text FROM narrative ORDER BY key", 2)
		if err != nil {
			fail(err)
			return
		}
		defer texts.rows.Close()
		tags, err := newSide(ctx, tx, "SELECT occurrence, factor, side FROM tag WHERE assertion = 'affirmed' AND basis = 'told' ORDER BY occurrence, n", 2)
		if err != nil {
			fail(err)
			return
		}
		defer tags.rows.Close()
		for rows.Next() {
			t := &Telling{}
			f := fields{o: &t.Occurrence}
			err := rows.Scan(append([]any{&t.Key}, f.into()...)...)
			if err == nil {
				err = f.done()
			}
			if err == nil {
				err = texts.of(t.Key, func(v []string) {
					t.Occurrence.Narratives = append(t.Occurrence.Narratives, corpus.Narrative{Kind: v[0], Text: v[1]})
				})
			}
			if err == nil {
				err = tags.of(t.Key, func(v []string) {
					t.Tags = append(t.Tags, corpus.Tag{Factor: v[0], Side: v[1]})
				})
			}
			if err != nil {
				fail(err)
				return
			}
			if !yield(t, nil) {
				return
			}
		}
		if err := rows.Err(); err != nil {
			fail(err)
		}
	}
}

// side is a stream of rows that belong to occurrences, in the order of keys.
type side struct {
	rows *sql.Rows
	key  int64 // of the row read last; 0 before the first and behind the last
	into []any
	text []string
}

func newSide(ctx context.Context, tx *sql.Tx, query string, texts int) (*side, error) {
	rows, err := tx.QueryContext(ctx, query)
	if err != nil {
		return nil, err
	}
	s := &side{rows: rows, text: make([]string, texts)}
	s.into = []any{&s.key}
	for i := range s.text {
		s.into = append(s.into, &s.text[i])
	}
	return s, s.next()
}

func (s *side) next() error {
	if !s.rows.Next() {
		s.key = 0
		return s.rows.Err()
	}
	return s.rows.Scan(s.into...)
}

// of hands over the rows of an occurrence.
func (s *side) of(key int64, use func([]string)) error {
	for s.key != 0 && s.key <= key {
		if s.key == key {
			use(s.text)
		}
		if err := s.next(); err != nil {
			return err
		}
	}
	return nil
}

// doublesState names the state that holds the change up to which doubles were
// looked for.
const doublesState = "doubles"

// PutDoubles puts the pairs that a search found in place of those of the
// search before, in one step. change is what the search had before it.
func (s *Store) PutDoubles(ctx context.Context, pairs []corpus.Double, change int64) error {
	b, err := s.Begin(ctx)
	if err != nil {
		return err
	}
	b.exec("DELETE FROM double")
	for _, p := range pairs {
		evidence, err := encode(p.Evidence)
		if err != nil {
			b.Rollback()
			return err
		}
		b.exec("INSERT INTO double VALUES (?, ?, ?, ?)", p.A, p.B, p.Probability, evidence)
	}
	b.exec("INSERT INTO state VALUES (?, ?) ON CONFLICT DO UPDATE SET value = excluded.value", doublesState, strconv.FormatInt(change, 10))
	return b.Commit()
}

// DoublesSeen is the change up to which doubles were looked for, 0 for never.
func (s *Store) DoublesSeen(ctx context.Context) (int64, error) {
	value, err := s.State(ctx, doublesState)
	if err != nil || value == "" {
		return 0, err
	}
	return strconv.ParseInt(value, 10, 64)
}

// Decision is what a person decided about a pair of occurrences.
type Decision struct {
	A, B int64 // A < B
	Same bool  // one event
	Who  string
	At   time.Time
	Note string
}

// Pair is a pair of occurrences with what the search and people say of it.
type Pair struct {
	corpus.Double           // Evidence is nil where the search does not find it
	Decision      *Decision // nil while undecided
	Names         [2]Name   // of A and B
}

// Name is what an occurrence is known by.
type Name struct{ Source, ID string }

// Pairs reads the pairs that the search found or people decided about, the
// likeliest first.
func (s *Store) Pairs(ctx context.Context) ([]Pair, error) {
	rows, err := s.db.QueryContext(ctx, `SELECT p.a, p.b, coalesce(d.probability, 0), coalesce(d.evidence, ''), x.same, x.who, x.at, x.note, m.source, m.id, n.source, n.id
		FROM (SELECT a, b FROM double UNION SELECT a, b FROM double_decision) p
		LEFT JOIN double d ON d.a = p.a AND d.b = p.b LEFT JOIN double_decision x ON x.a = p.a AND x.b = p.b
		JOIN occurrence m ON m.key = p.a JOIN occurrence n ON n.key = p.b
		ORDER BY 3 DESC, 1, 2`)
	if err != nil {
		return nil, fmt.Errorf("read doubles: %w", explain(err))
	}
	defer rows.Close()
	var out []Pair
	for rows.Next() {
		var p Pair
		var evidence string
		var same sql.NullBool
		var who, at, note sql.NullString
		if err := rows.Scan(&p.A, &p.B, &p.Probability, &evidence, &same, &who, &at, &note, &p.Names[0].Source, &p.Names[0].ID, &p.Names[1].Source, &p.Names[1].ID); err != nil {
			return nil, fmt.Errorf("read doubles: %w", err)
		}
		if evidence != "" {
			if err := json.Unmarshal([]byte(evidence), &p.Evidence); err != nil {
				return nil, fmt.Errorf("read doubles: %w", err)
			}
		}
		if same.Valid {
			p.Decision = &Decision{A: p.A, B: p.B, Same: same.Bool, Who: who.String, Note: note.String}
			if p.Decision.At, err = time.Parse(time.RFC3339, at.String); err != nil {
				return nil, fmt.Errorf("read doubles: %w", err)
			}
		}
		out = append(out, p)
	}
	if err := rows.Err(); err != nil {
		return nil, fmt.Errorf("read doubles: %w", explain(err))
	}
	return out, nil
}

// Decide keeps a decision, in place of an earlier one about the same pair.
func (s *Store) Decide(ctx context.Context, d Decision) error {
	_, err := s.db.ExecContext(ctx, "INSERT INTO double_decision VALUES (?, ?, ?, ?, ?, ?) ON CONFLICT DO UPDATE SET same = excluded.same, who = excluded.who, at = excluded.at, note = excluded.note",
		min(d.A, d.B), max(d.A, d.B), d.Same, d.Who, d.At.UTC().Format(time.RFC3339), d.Note)
	if err != nil {
		return fmt.Errorf("write decision: %w", explain(err))
	}
	return nil
}

// Undecide takes a decision back; it tells whether there was one.
func (s *Store) Undecide(ctx context.Context, a, b int64) (bool, error) {
	res, err := s.db.ExecContext(ctx, "DELETE FROM double_decision WHERE a = ? AND b = ?", min(a, b), max(a, b))
	if err != nil {
		return false, fmt.Errorf("write decision: %w", explain(err))
	}
	n, err := res.RowsAffected()
	return n > 0, err
}
