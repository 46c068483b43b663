package collection

import (
	"bytes"
	"context"
	"database/sql"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"catena/ingest/store"
)

// What was removed is in no file of the collection, not even in a free page or
// an index segment.
func TestRemoveLeavesNoTrace(t *testing.T) {
	dir := t.TempDir()
	c := openTo(t, dir, true)
	secret := "marmalade lighthouse"
	row := `{"id":"X-1","source":"s","place":"Secretfield","narratives":[{"kind":"factual","text":"` + strings.Repeat("The "+secret+" stalled. ", 3000) + `"}]}` + "\n"
	load(t, c, reports(200)+row)
	load(t, c, strings.Replace(row, "factual", "cause", 1)) // with a history
	keys, err := c.Store.Keys(context.Background(), "s", "X-1")
	if err != nil || len(keys) != 1 {
		t.Fatal(keys, err)
	}
	if err := c.Remove(context.Background(), keys[0], store.Removal{Who: "me", At: time.Now()}); err != nil {
		t.Fatal(err)
	}
	if n := hits(t, c, "marmalade"); n != 0 {
		t.Errorf("found %d times", n)
	}
	c.Close()
	filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		data, err := os.ReadFile(path)
		if err != nil {
			t.Error(err)
		}
		for _, s := range []string{"marmalade", "Secretfield", "secretfield"} {
			if bytes.Contains(data, []byte(s)) {
				t.Errorf("%s holds %q still", path, s)
			}
		}
		return nil
	})
	c = openTo(t, dir, true)
	if sum := load(t, c, row); sum.Barred != 1 || sum.Unchanged != 1 || sum.Stored != 0 {
		t.Errorf("loaded again: %+v", sum)
	}
	if k, err := c.Check(context.Background(), nil); err != nil || len(k.Faults) > 0 || k.Occurrences != 200 {
		t.Errorf("check: %+v, %v", k, err)
	}
}

// An index that lags behind a removal learns of it.
func TestIndexLearnsOfRemovals(t *testing.T) {
	dir := t.TempDir()
	c := openTo(t, dir, true)
	load(t, c, reports(20))
	if err := c.Store.Remove(context.Background(), 7, store.Removal{Who: "me", At: time.Now()}); err != nil {
		t.Fatal(err)
	}
	c.Close() // as after a crash between database and index
	c = openTo(t, dir, false)
	if n := hits(t, c, "glider"); n != 19 {
		t.Errorf("%d found, want 19", n)
	}
	if k, err := c.Check(context.Background(), nil); err != nil || len(k.Faults) > 0 {
		t.Errorf("check: %+v, %v", k, err)
	}
}

// Each damage is told.
func TestCheckFindsDamage(t *testing.T) {
	for name, c := range map[string]struct{ spoil, want string }{
		"field":      {"UPDATE occurrence SET place = 'elsewhere' WHERE key = 3", "s C-2: the content is not as it was stored"},
		"text":       {"UPDATE narrative SET text = replace(text, 'glider', 'GLIDER') WHERE occurrence = 5", "s C-4: the content is not as it was stored"},
		"tag":        {`UPDATE tag SET "end" = 4000 WHERE occurrence = 6`, "tag stall"},
		"chain":      {`UPDATE chain SET links = '[{"factor":"spin","tag":0,"order":"text"}]' WHERE occurrence = 6`, "a link spin without its tag"},
		"orphan":     {"PRAGMA foreign_keys(0); DELETE FROM occurrence WHERE key = 4", "belongs to no occurrence"},
		"set aside":  {"UPDATE set_aside_part SET bytes = x'00'", "is not as it was kept"},
		"change":     {"UPDATE occurrence SET change = 900 WHERE key = 2", "change 900 of"},
		"lost index": {"INSERT INTO state VALUES ('x', 'y'); UPDATE state SET value = '99' WHERE name = 'change'", "the next search or load brings it up to date"},
	} {
		t.Run(name, func(t *testing.T) {
			dir := t.TempDir()
			x := openTo(t, dir, true)
			load(t, x, reports(10)+"no record\n")
			if k, err := x.Check(context.Background(), nil); err != nil || len(k.Faults) > 0 {
				t.Fatalf("before: %+v, %v", k, err)
			}
			x.Close()
			db, err := sql.Open("sqlite", filepath.Join(dir, databaseName))
			if err != nil {
				t.Fatal(err)
			}
			if _, err := db.Exec(c.spoil); err != nil {
				t.Fatal(err)
			}
			db.Close()
			k, err := openTo(t, dir, false).Check(context.Background(), nil)
			if err != nil {
				t.Fatal(err)
			}
			if !strings.Contains(strings.Join(k.Faults, "\n"), c.want) {
				t.Errorf("faults %q, want one with %q", k.Faults, c.want)
			}
		})
	}
}

// A backup taken while a load runs is one whole moment of it.
func TestBackupWhileLoading(t *testing.T) {
	dir := t.TempDir()
	c := openTo(t, dir, true)
	backup := filepath.Join(t.TempDir(), "b.catena")
	taken := false
	_, err := c.Load(context.Background(), "-", LoadOptions{In: strings.NewReader(reports(6000)), Progress: func(_ string, rows int, _, _ int64) {
		if rows >= 2000 && !taken {
			taken = true
			r := openTo(t, dir, false)
			if err := r.Store.Backup(context.Background(), backup, false); err != nil {
				t.Error(err)
			}
		}
	}})
	if err != nil || !taken {
		t.Fatal(err, taken)
	}
	other := filepath.Join(t.TempDir(), "restored")
	opts := Options{Now: time.Now, Note: func(s string) { t.Log(s) }}
	if err := Restore(context.Background(), other, backup, false, opts); err != nil {
		t.Fatal(err)
	}
	r := openTo(t, other, false)
	totals, err := r.Store.Totals(context.Background())
	if err != nil || totals.Occurrences < 2000 || totals.Occurrences > 6000 || totals.Occurrences%1000 != 0 {
		t.Errorf("restored %+v, %v: want whole batches", totals, err)
	}
	if n := hits(t, r, "glider"); n != totals.Occurrences {
		t.Errorf("%d found of %d", n, totals.Occurrences)
	}
	if k, err := r.Check(context.Background(), nil); err != nil || len(k.Faults) > 0 {
		t.Errorf("check: %+v, %v", k, err)
	}
}

// A restore over a damaged database keeps what there was.
func TestRestoreOverDamage(t *testing.T) {
	dir := t.TempDir()
	c := openTo(t, dir, true)
	load(t, c, reports(50))
	backup := filepath.Join(t.TempDir(), "b.catena")
	if err := c.Store.Backup(context.Background(), backup, false); err != nil {
		t.Fatal(err)
	}
	c.Close()
	if err := os.WriteFile(filepath.Join(dir, databaseName), []byte("rubbish"), 0o600); err != nil {
		t.Fatal(err)
	}
	opts := Options{Now: time.Now, Note: func(string) {}}
	if err := Restore(context.Background(), dir, backup, true, opts); err != nil {
		t.Fatal(err)
	}
	if n := hits(t, openTo(t, dir, false), "glider"); n != 50 {
		t.Errorf("%d found, want 50", n)
	}
	if kept, err := os.ReadFile(filepath.Join(dir, databaseName+".before-restore")); err != nil || string(kept) != "rubbish" {
		t.Errorf("kept %q, %v", kept, err)
	}
}
