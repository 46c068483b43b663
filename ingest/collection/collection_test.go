package collection

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/iotest"

	"catena/index"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

// reports makes invented records, one a line.
func reports(n int) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, `{"id":"C-%d","source":"s","date":"2022-0%d","narratives":[{"kind":"factual","text":"On flight %d the glider stalled in the turn."}]}`+"\n", i, i%9+1, i)
	}
	return b.String()
}

func openTo(t *testing.T, dir string, write bool) *Collection {
	t.Helper()
	c, err := Open(context.Background(), dir, Options{Write: write, Command: "test", Note: func(s string) { t.Log(s) }})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { c.Close() })
	return c
}

func load(t *testing.T, c *Collection, text string) FileSummary {
	t.Helper()
	sum, err := c.Load(context.Background(), "-", LoadOptions{In: strings.NewReader(text)})
	if err != nil {
		t.Fatal(err)
	}
	return sum
}

func hits(t *testing.T, c *Collection, words string) int {
	t.Helper()
	x, err := c.Index(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	r, err := x.Search(context.Background(), index.Query{Text: words, Size: 1}, c.Narratives(context.Background()))
	if err != nil {
		t.Fatal(err)
	}
	return r.Total
}

func TestLoadAccountsForEveryRow(t *testing.T) {
	c := openTo(t, t.TempDir(), true)
	text := reports(30) + "no record\n" + reports(3) + `{"id":"C-1","source":"s","narratives":[{"kind":"factual","text":"The glider stalled twice."}]}` + "\n"
	sum := load(t, c, text)
	if sum.Rows != 35 || sum.Stored != 30 || sum.SetAside != 1 || sum.Unchanged != 3 || sum.Revised != 1 {
		t.Errorf("first: %+v", sum)
	}
	if sum := load(t, c, text); sum.Stored+sum.Revised != 0 || sum.Unchanged != 34 || sum.SetAside != 1 {
		t.Errorf("again: %+v", sum)
	}
	if n := hits(t, c, "glider"); n != 30 {
		t.Errorf("%d found, want 30", n)
	}
	if n := hits(t, c, "twice"); n != 1 {
		t.Errorf("the revision is found %d times, want once", n)
	}
	totals, err := c.Store.Totals(context.Background())
	if err != nil || totals.SetAside != 1 || totals.Revisions != 1 || totals.Tags != 30 {
		t.Errorf("totals %+v, %v", totals, err)
	}
}

// The index is mended whatever happens to its files.
func TestIndexHeals(t *testing.T) {
	for name, spoil := range map[string]func(dir string) error{
		"gone":        func(dir string) error { return os.RemoveAll(dir) },
		"meta cut":    func(dir string) error { return os.Truncate(filepath.Join(dir, "index_meta.json"), 3) },
		"store cut":   func(dir string) error { return os.Truncate(filepath.Join(dir, "store", "root.bolt"), 2000) },
		"another one": func(dir string) error { return rewrite(dir) },
		"behind":      func(dir string) error { return behind(dir) },
	} {
		t.Run(name, func(t *testing.T) {
			dir := t.TempDir()
			c := openTo(t, dir, true)
			load(t, c, reports(40))
			if err := c.Close(); err != nil {
				t.Fatal(err)
			}
			if err := spoil(filepath.Join(dir, indexName)); err != nil {
				t.Fatal(err)
			}
			// a reader mends it too
			if n := hits(t, openTo(t, dir, false), "glider"); n != 40 {
				t.Errorf("%d found, want 40", n)
			}
		})
	}
}

// rewrite makes an index that claims changes which the database never had.
func rewrite(dir string) error {
	if err := os.RemoveAll(dir); err != nil {
		return err
	}
	x, err := index.Open(dir, index.Options{})
	if err != nil {
		return err
	}
	return errors.Join(x.Put(context.Background(), nil, 999), x.Close())
}

// behind makes an index that lacks the last changes.
func behind(dir string) error {
	if err := os.RemoveAll(dir); err != nil {
		return err
	}
	x, err := index.Open(dir, index.Options{})
	if err != nil {
		return err
	}
	doc := index.Doc{Key: 1, Occurrence: &corpus.Occurrence{Narratives: []corpus.Narrative{{Text: "On flight 0 the glider stalled in the turn."}}}}
	return errors.Join(x.Put(context.Background(), []index.Doc{doc}, 1), x.Close())
}

// A file that breaks off leaves what was read before the break.
func TestBrokenInputKeepsWhatWasRead(t *testing.T) {
	c := openTo(t, t.TempDir(), true)
	text := strings.Repeat(" ", 5<<20) // beyond the sample that Open reads
	broken := errors.New("the stick was pulled")
	sum, err := c.Load(context.Background(), "-", LoadOptions{In: io.MultiReader(strings.NewReader(reports(20)+text+"\n"), iotest.ErrReader(broken))})
	if !errors.Is(err, broken) {
		t.Errorf("error %v, want %v", err, broken)
	}
	totals, terr := c.Store.Totals(context.Background())
	if terr != nil || totals.Occurrences != 20 || sum.Stored != 20 {
		t.Errorf("%d stored (summary %+v), want 20", totals.Occurrences, sum)
	}
}

func TestInterruptedLoadGoesOn(t *testing.T) {
	dir := t.TempDir()
	c := openTo(t, dir, true)
	ctx, cancel := context.WithCancel(context.Background())
	_, err := c.Load(ctx, "-", LoadOptions{In: strings.NewReader(reports(3500)), Progress: func(_ string, rows int, _, _ int64) {
		if rows >= 1000 {
			cancel()
		}
	}})
	if !errors.Is(err, context.Canceled) {
		t.Fatalf("error %v, want a cancelled context", err)
	}
	if n := hits(t, c, "nothing"); n != 0 {
		t.Fatal("nothing is in no report")
	}
	sum := load(t, c, reports(3500))
	if sum.Rows != 3500 || sum.Unchanged < 1000 || sum.Stored == 0 {
		t.Errorf("the second load: %+v", sum)
	}
	if n := hits(t, c, "glider"); n != 3500 {
		t.Errorf("%d found, want 3500", n)
	}
}

func TestSecondWriterIsToldWhoHoldsIt(t *testing.T) {
	dir := t.TempDir()
	openTo(t, dir, true)
	_, err := Open(context.Background(), dir, Options{Write: true, Command: "load"})
	if !errors.Is(err, ErrHeld) || !strings.Contains(err.Error(), fmt.Sprintf("catena test (process %d", os.Getpid())) {
		t.Errorf("error %v", err)
	}
}

func TestRetagFollowsTheUsersRules(t *testing.T) {
	dir, rules := t.TempDir(), t.TempDir()
	c := openTo(t, dir, true)
	load(t, c, reports(12))
	if n, err := c.Retag(context.Background(), false, nil); n != 0 || err != nil {
		t.Errorf("tagged %d (%v), want none: the book is the same", n, err)
	}
	before := c.Classifier.Version()
	c.Close()
	rule := "factor: door-open\nrules:\n  - rule: probe\n    look for: [\"in the turn\"]\n    match: [\"in the turn\"]\n"
	if err := os.WriteFile(filepath.Join(rules, "own.yaml"), []byte(rule), 0o600); err != nil {
		t.Fatal(err)
	}
	c, err := Open(context.Background(), dir, Options{Write: true, Rules: rules})
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	if n, err := c.Retag(context.Background(), false, nil); n != 12 || err != nil || c.Classifier.Version() == before {
		t.Errorf("tagged %d (%v), want 12", n, err)
	}
	for r, err := range c.Store.Each(context.Background(), store.Select{}) {
		if err != nil {
			t.Fatal(err)
		}
		if len(r.Tags) != 2 || r.Rulebook != c.Classifier.Version() {
			t.Fatalf("%+v", r.Tagged)
		}
	}
	c.Close()
	// the folder is remembered
	again := openTo(t, dir, false)
	if again.Classifier.Version() == before {
		t.Error("the user's rules are forgotten")
	}
}

// Tagging again touches only what a change of rules touches, and gives the
// same tags and chains as tagging everything anew.
func TestRetagTouchesOnlyWhatChanged(t *testing.T) {
	text := ""
	for _, name := range []string{"written-a", "written-b", "made"} {
		data, err := os.ReadFile(filepath.Join("..", "..", "cmd", "catena", "demo", name+".ndjson"))
		if err != nil {
			t.Fatal(err)
		}
		text += string(data)
	}
	dir, rules := t.TempDir(), t.TempDir()
	c := openTo(t, dir, true)
	load(t, c, text)
	c.Close()
	write := func(name, rule string) {
		if err := os.WriteFile(filepath.Join(rules, name), []byte(rule), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	content := func(c *Collection) string {
		var b strings.Builder
		for r, err := range c.Store.Each(context.Background(), store.Select{}) {
			if err != nil {
				t.Fatal(err)
			}
			line, err := json.Marshal(r.Tagged)
			if err != nil {
				t.Fatal(err)
			}
			b.Write(line)
			b.WriteByte('\n')
		}
		return b.String()
	}
	steps := []struct{ name, rule string }{
		{"a.yaml", "# a remark only\n"},
		{"b.yaml", "factor: turn-back\nrules:\n  - rule: probe\n    look for: [\"turn~ (left|right)\"]\n    match: [\"It turned left.\"]\n"},
		{"c.yaml", "factor: recovered\nrules:\n  - rule: landed-safely\n    off: true\n  - rule: flight-went-on\n    off: true\n"},
		{"d.yaml", "factor: power-loss\nrules:\n  - rule: probe\n    side: engine\n    look for: [\"{engine} ..3 (idle|idling)\"]\n    match: [\"The engine was at idle.\"]\n"},
	}
	for i, step := range steps {
		write(step.name, step.rule)
		c, err := Open(context.Background(), dir, Options{Write: true, Rules: rules})
		if err != nil {
			t.Fatal(err)
		}
		n, err := c.Retag(context.Background(), false, nil)
		if err != nil {
			t.Fatal(err)
		}
		some := content(c)
		all, err := c.Retag(context.Background(), true, nil)
		if err != nil {
			t.Fatal(err)
		}
		if got := content(c); got != some {
			t.Errorf("%s: tagging everything again gives other tags than tagging the %d that the change touches", step.name, n)
		}
		if i == 0 && n != 0 || n >= all {
			t.Errorf("%s: tagged %d of %d", step.name, n, all)
		}
		t.Logf("%s: %d of %d tagged again", step.name, n, all)
		c.Close()
	}
}
