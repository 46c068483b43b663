package store

import (
	"context"
	"database/sql"
	"encoding/json"
	"fmt"
	"math"

	"catena/ingest/corpus"
)

// PutExposure writes amounts of flying in one transaction, replacing the same
// period and stratum. Where periods of different grain then overlap within a
// stratum, nothing is written and check's error comes back: check is given
// everything as it would stand.
func (s *Store) PutExposure(ctx context.Context, rows []corpus.Exposure, check func([]corpus.Exposure) error) error {
	tx, err := s.db.BeginTx(ctx, nil)
	if err != nil {
		return fmt.Errorf("write exposure: %w", explain(err))
	}
	defer tx.Rollback()
	for _, e := range rows {
		strata, err := encodeStrata(e.Strata)
		if err != nil {
			return err
		}
		_, err = tx.ExecContext(ctx, "INSERT INTO exposure VALUES (?, ?, ?, ?, ?) ON CONFLICT DO UPDATE SET hours = excluded.hours, departures = excluded.departures",
			e.Covers, e.Period.String(), strata, nullable(e.Hours), nullable(e.Departures))
		if err != nil {
			return fmt.Errorf("write exposure: %w", explain(err))
		}
	}
	all, err := readExposure(ctx, tx)
	if err != nil {
		return err
	}
	if err := check(all); err != nil {
		return err
	}
	if err := tx.Commit(); err != nil {
		return fmt.Errorf("write exposure: %w", explain(err))
	}
	return nil
}

// Exposure reads all amounts of flying, sorted by source, period and stratum.
func (s *Store) Exposure(ctx context.Context) ([]corpus.Exposure, error) {
	return readExposure(ctx, s.db)
}

func readExposure(ctx context.Context, q querier) ([]corpus.Exposure, error) {
	rows, err := q.QueryContext(ctx, "SELECT covers, period, strata, hours, departures FROM exposure ORDER BY covers, period, strata")
	if err != nil {
		return nil, fmt.Errorf("read exposure: %w", explain(err))
	}
	defer rows.Close()
	var out []corpus.Exposure
	for rows.Next() {
		var e corpus.Exposure
		var period, strata string
		var hours, departures sql.NullFloat64
		if err := rows.Scan(&e.Covers, &period, &strata, &hours, &departures); err != nil {
			return nil, fmt.Errorf("read exposure: %w", err)
		}
		if e.Period, err = corpus.ParsePeriod(period); err != nil {
			return nil, fmt.Errorf("read exposure: %w", err)
		}
		if err := json.Unmarshal([]byte(strata), &e.Strata); err != nil {
			return nil, fmt.Errorf("read exposure: %w", err)
		}
		e.Hours, e.Departures = known(hours), known(departures)
		out = append(out, e)
	}
	return out, rows.Err()
}

// encodeStrata is canonical: encoding/json sorts the keys.
func encodeStrata(strata map[string]string) (string, error) {
	if strata == nil {
		strata = map[string]string{}
	}
	return encode(strata)
}

func nullable(x float64) sql.NullFloat64 { return sql.NullFloat64{Float64: x, Valid: !math.IsNaN(x)} }

func known(x sql.NullFloat64) float64 {
	if !x.Valid {
		return math.NaN()
	}
	return x.Float64
}
