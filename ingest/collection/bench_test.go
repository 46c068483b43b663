package collection

import (
	"context"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"testing"

	"catena/ingest"
	"catena/ingest/corpus"
	"catena/ingest/fabricate"
	"catena/ingest/store"
)

// benchRows is how many invented occurrences of 1.7 kB the benchmarks read.
const benchRows = 20_000

// benchCSV writes invented occurrences as a table, one narrative each.
func benchCSV(b *testing.B) string {
	b.Helper()
	path := filepath.Join(b.TempDir(), "bench.csv")
	f, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	w := csv.NewWriter(f)
	w.Write([]string{"source", "id", "date", "place", "country", "make", "model", "category", "engines", "engine_type", "operation", "phase", "injury", "damage", "event", "narrative"})
	for o := range fabricate.New(fabricate.Options{Seed: 3, Count: benchRows, MeanBytes: 1685}).All() {
		text := ""
		for _, n := range o.Narratives {
			text += n.Text
		}
		w.Write([]string{o.Source, o.ID, o.Date.String(), o.Place, o.Country, o.Make, o.Model, o.Category, strconv.Itoa(o.Engines), o.EngineType, o.Operation, o.Phase, o.Injury, o.Damage, o.Event, text})
	}
	w.Flush()
	if err := errors.Join(w.Error(), f.Close()); err != nil {
		b.Fatal(err)
	}
	return path
}

// Reading, normalising and storing a table, beside what the sqlite3 shell takes
// to import the same table with the same unique key; and the whole load with
// tags and index.
func BenchmarkStore(b *testing.B) {
	path := benchCSV(b)
	b.Run("read and store", func(b *testing.B) {
		for b.Loop() {
			if err := storeOnly(path, filepath.Join(b.TempDir(), "catena.db")); err != nil {
				b.Fatal(err)
			}
		}
		b.ReportMetric(benchRows*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
	})
	b.Run("yardstick, sqlite3 .import", func(b *testing.B) {
		shell, err := exec.LookPath("sqlite3")
		if err != nil {
			b.Skip("no sqlite3 shell here")
		}
		for b.Loop() {
			db := filepath.Join(b.TempDir(), "t.db")
			out, err := exec.Command(shell, db, "PRAGMA journal_mode=wal", "CREATE TABLE t (source, id, date, place, country, make, model, category, engines, engine_type, operation, phase, injury, damage, event, narrative, UNIQUE (source, id))",
				".import --csv --skip 1 "+strconv.Quote(path)+" t", "SELECT count(*) FROM t").CombinedOutput()
			if err != nil || !containsNumber(out, benchRows) {
				b.Fatalf("sqlite3: %v\n%s", err, out)
			}
		}
		b.ReportMetric(benchRows*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
	})
	b.Run("whole load", func(b *testing.B) {
		for b.Loop() {
			c, err := Open(context.Background(), b.TempDir(), Options{Write: true})
			if err != nil {
				b.Fatal(err)
			}
			sum, err := c.Load(context.Background(), path, LoadOptions{})
			if err = errors.Join(err, c.Close()); err != nil || sum.Stored != benchRows {
				b.Fatal(sum, err)
			}
		}
		b.ReportMetric(benchRows*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
	})
}

func containsNumber(out []byte, n int) bool {
	var mode string
	var got int
	fmt.Sscan(string(out), &mode, &got)
	return got == n
}

// storeOnly is a load without tags and index: one goroutine reads and
// normalises, another writes.
func storeOnly(path, db string) error {
	ctx := context.Background()
	s, err := store.Open(ctx, db, false)
	if err != nil {
		return err
	}
	defer s.Close()
	f, err := ingest.Open(ctx, path, nil, ingest.Options{})
	if err != nil {
		return err
	}
	defer f.Close()
	puts := make(chan *store.Put, queued)
	fault := make(chan error, 1)
	go func() {
		defer close(puts)
		for {
			item, err := f.Next()
			if err != nil {
				if !errors.Is(err, io.EOF) {
					fault <- err
				}
				return
			}
			if item.Occurrence == nil {
				fault <- errors.New(item.SetAside.Reason)
				return
			}
			puts <- &store.Put{Tagged: corpus.Tagged{Occurrence: *item.Occurrence}, Hash: ingest.ContentHash(item.Occurrence), Source: item.Source, Raw: item.Raw}
		}
	}()
	for more := true; more; {
		b, err := s.Begin(ctx)
		if err != nil {
			return err
		}
		for n := 0; more && n < batchRows; n++ {
			p, ok := <-puts
			if more = ok; !ok {
				break
			}
			if _, _, err := b.Put(p, "bench"); err != nil {
				b.Rollback()
				return err
			}
		}
		if err := b.Commit(); err != nil {
			return err
		}
	}
	select {
	case err := <-fault:
		return err
	default:
		return nil
	}
}
