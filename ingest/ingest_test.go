package ingest

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/klauspost/compress/gzip"

	"catena/ingest/corpus"
)

// readAll reads a whole text from standard input.
func readAll(t testing.TB, text string, opts Options) ([]Item, *Map) {
	t.Helper()
	items, m, err := tryAll(t, text, opts)
	if err != nil {
		t.Fatal(err)
	}
	return items, m
}

// tryAll is readAll with the first error of Open or Next.
func tryAll(t testing.TB, text string, opts Options) ([]Item, *Map, error) {
	t.Helper()
	if opts.SpoolDir == "" {
		opts.SpoolDir = t.TempDir()
	}
	f, err := Open(context.Background(), "-", strings.NewReader(text), opts)
	if err != nil {
		return nil, nil, err
	}
	defer f.Close()
	items, err := drain(f)
	return items, f.Map(), err
}

// drain reads to the end of f.
func drain(f *File) ([]Item, error) {
	var items []Item
	for {
		item, err := f.Next()
		if err == io.EOF {
			return items, nil
		}
		if err != nil {
			return items, err
		}
		items = append(items, item)
	}
}

// outcomes writes each item on a line: row, line, and id or reason.
func outcomes(items []Item) string {
	var b strings.Builder
	for _, it := range items {
		what := ""
		if it.Occurrence != nil {
			what = it.Occurrence.ID
		}
		if it.SetAside != nil {
			what += "! " + it.SetAside.Reason
		}
		fmt.Fprintf(&b, "%d@%d %s\n", it.Source.Row, it.Source.Line, what)
	}
	return b.String()
}

func zipped(t testing.TB, text string) string {
	t.Helper()
	var b bytes.Buffer
	w := gzip.NewWriter(&b)
	if _, err := w.Write([]byte(text)); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// Every format, plain and packed, under every ending of lines, reads as the
// same occurrences.
func TestFormatsReadAlike(t *testing.T) {
	texts := map[string]string{
		"commas":     "id,date,make,narrative\nA1,2019-03-02,Zephyrine,\"Stalled, then spun.\"\nA2,2020,,Bounced.\n",
		"tabs":       "id\tdate\tmake\tnarrative\nA1\t2019-03-02\tZephyrine\tStalled, then spun.\nA2\t2020\t\tBounced.\n",
		"semicolons": "id;date;make;narrative\nA1;2019-03-02;Zephyrine;Stalled, then spun.\nA2;2020;;Bounced.\n",
		"bars":       "id|date|make|narrative\nA1|2019-03-02|Zephyrine|Stalled, then spun.\nA2|2020||Bounced.\n",
		"sep line":   "sep=;\nid;date;make;narrative\nA1;2019-03-02;Zephyrine;Stalled, then spun.\nA2;2020;;Bounced.\n",
		"lines": `{"id":"A1","date":"2019-03-02","make":"Zephyrine","narrative":"Stalled, then spun."}` + "\n" +
			`{"id":"A2","date":"2020","narrative":"Bounced."}` + "\n",
		"array": `[{"id":"A1","date":"2019-03-02","make":"Zephyrine","narrative":"Stalled, then spun."},` + "\n" +
			`{"id":"A2","date":2020,"make":null,"narrative":"Bounced."},` + "\n]\n",
		"flow": "{\n \"id\": \"A1\",\n \"date\": \"2019-03-02\",\n \"make\": \"Zephyrine\",\n \"narrative\": \"Stalled, then spun.\"\n}\n" +
			"{\n \"id\": \"A2\",\n \"date\": \"2020\",\n \"narrative\": \"Bounced.\"\n}\n",
	}
	for name, text := range texts {
		for how, change := range map[string]func(string) string{
			"plain":      func(s string) string { return s },
			"crlf":       func(s string) string { return strings.ReplaceAll(s, "\n", "\r\n") },
			"marked":     func(s string) string { return "\uFEFF" + s },
			"no ending":  func(s string) string { return strings.TrimRight(s, "\n") },
			"blank rows": func(s string) string { return "\n\n" + strings.ReplaceAll(s, "\n", "\n\n") },
			"packed":     func(s string) string { return zipped(t, s) },
		} {
			if how == "blank rows" && name == "sep line" {
				continue
			}
			t.Run(name+" "+how, func(t *testing.T) {
				items, m := readAll(t, change(text), Options{})
				if len(items) != 2 || items[0].Occurrence == nil || items[1].Occurrence == nil {
					t.Fatalf("got\n%s", outcomes(items))
				}
				a, b := items[0].Occurrence, items[1].Occurrence
				if a.ID != "A1" || a.Date.String() != "2019-03-02" || a.Make != "Zephyrine" || a.Source != "records" ||
					len(a.Narratives) != 1 || a.Narratives[0] != (corpus.Narrative{Kind: "factual", Text: "Stalled, then spun."}) {
					t.Errorf("first: %+v", a)
				}
				if b.ID != "A2" || b.Date.String() != "2020" || b.Make != "" || b.Narratives[0].Text != "Bounced." {
					t.Errorf("second: %+v", b)
				}
				if m.Name != "records" {
					t.Errorf("map %q, want records", m.Name)
				}
			})
		}
	}
}

// One byte at a time, as from a slow pipe, makes no difference.
func TestSlowPipe(t *testing.T) {
	for _, text := range []string{
		"id,narrative\r\n1,\"one \"\"quoted\"\"\r\nbreak\"\r\n2,two\r\n",
		`[{"id":"1","narrative":"a \"b\" ] }"}, {"id":"2","narrative":"two"} ]`,
		"{\"id\":\"1\",\"narrative\":\"one\"}\n{\"id\":\"2\",\"narrative\":\"two\"}",
	} {
		whole, _ := readAll(t, text, Options{})
		f, err := Open(context.Background(), "-", iotest.OneByteReader(strings.NewReader(text)), Options{})
		if err != nil {
			t.Fatal(err)
		}
		slow, err := drain(f)
		if err != nil {
			t.Fatal(err)
		}
		if a, b := outcomes(whole), outcomes(slow); a != b || len(whole) != 2 {
			t.Errorf("whole:\n%s\nslow:\n%s", a, b)
		}
	}
}

func TestOpenRefuses(t *testing.T) {
	tests := []struct {
		name, text string
		want       []string
	}{
		{"empty", "", []string{"an empty file"}},
		{"mark only", "\uFEFF", []string{"an empty file"}},
		{"white space", " \n\n\t\r\n", []string{"white space only"}},
		{"long white space", strings.Repeat(" \n", windowSize), []string{"white space only"}},
		{"packed nothing", zipped(t, ""), []string{"an empty file"}},
		{"pdf", "%PDF-1.7\n1 0 obj", []string{"a PDF document", "CSV or JSON"}},
		{"zip", "PK\x03\x04\x14\x00rest", []string{"an archive", "unpack"}},
		{"xlsx", "PK\x03\x04\x14\x00[Content_Types].xml", []string{"broken workbook", "as CSV"}},
		{"png", "\x89PNG\r\n\x1a\n", []string{"a PNG picture"}},
		{"rtf", `{\rtf1 text}`, []string{"an RTF document"}},
		{"gzip twice", zipped(t, zipped(t, "id,date\n1,2019\n")), []string{"gzip inside gzip"}},
		{"web page", "\n<!DOCTYPE html><html>", []string{"a web page"}},
		{"nul", "id,date\n1,20\x0019\n", []string{"binary data", "NUL byte at byte 13"}},
		{"controls", "id,\x01\x02\x03\x04\x05date", []string{"binary data", "control characters"}},
		{"no known column", "colour,taste\nred,sweet\n", []string{"no column is known", `"colour", "taste"`, "id, date, narrative"}},
		{"header quote", "id,\"date\n1,2019\n", []string{"header: quote opened on line 1 is never closed"}},
		{"date order open", "id,Date\n1,03/04/2021\n", []string{`column "Date": day and month cannot be told apart`, `"03/04/2021" on line 2`, "--dates dmy|mdy|ymd"}},
		{"date order both", "id,Date\n1,13/04/2021\n2,04/13/2021\n",
			[]string{`column "Date": line 2 has "13/04/2021", with the day first, and line 3 has "04/13/2021", with the month first`, "--dates"}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			_, err := Open(context.Background(), "-", strings.NewReader(test.text), Options{})
			if err == nil {
				t.Fatal("no error")
			}
			for _, want := range append(test.want, "open standard input: ") {
				if !strings.Contains(err.Error(), want) {
					t.Errorf("error %q lacks %q", err, want)
				}
			}
		})
	}
}

func TestOpenNamesThePath(t *testing.T) {
	dir := t.TempDir()
	_, err := Open(context.Background(), dir, nil, Options{})
	if want := fmt.Sprintf("open %q: a folder, not a file", dir); err == nil || err.Error() != want {
		t.Errorf("folder: got %v, want %s", err, want)
	}
	missing := filepath.Join(dir, "none.csv")
	_, err = Open(context.Background(), missing, nil, Options{})
	if want := fmt.Sprintf("open %q: no such file or directory", missing); !errors.Is(err, os.ErrNotExist) || err.Error() != want {
		t.Errorf("missing: got %v, want %s", err, want)
	}
	if _, err := Open(context.Background(), "-", strings.NewReader("id\n1"), Options{Dates: "myd"}); err == nil {
		t.Error("an order of dates that is none passes")
	}
}

func TestProgressCountsBytesOnDisk(t *testing.T) {
	path := filepath.Join(t.TempDir(), "renamed.txt")
	packed := zipped(t, "id,narrative\n"+strings.Repeat("7,Nosed over on rollout.\n", 5000))
	if err := os.WriteFile(path, []byte(packed), 0o600); err != nil {
		t.Fatal(err)
	}
	f, err := Open(context.Background(), path, nil, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	items, err := drain(f)
	if err != nil || len(items) != 5000 {
		t.Fatalf("%d items, %v", len(items), err)
	}
	if n := int64(len(packed)); f.Size() != n || f.BytesRead() != n {
		t.Errorf("size %d, read %d, want both %d", f.Size(), f.BytesRead(), n)
	}
	if last := items[4999].Source; last != (corpus.Source{File: path, Row: 5000, Line: 5001}) {
		t.Errorf("last row stands at %+v", last)
	}
}

// A stream that breaks off is a fault with its line, after all whole rows.
func TestBrokenStream(t *testing.T) {
	var long strings.Builder
	long.WriteString("id,narrative\n")
	for i := range 5000 {
		fmt.Fprintf(&long, "%d,Landed gear up %x.\n", i, i*i*7919)
	}
	packed := zipped(t, long.String())
	f, err := Open(context.Background(), "-", strings.NewReader(packed[:len(packed)/2]), Options{})
	if err != nil {
		t.Fatal(err)
	}
	items, err := drain(f)
	if !errors.Is(err, io.ErrUnexpectedEOF) {
		t.Fatalf("error %v, want unexpected EOF", err)
	}
	want := fmt.Sprintf("read standard input: line %d: unexpected EOF", len(items)+2)
	if len(items) < 100 || err.Error() != want {
		t.Errorf("%d items, error %q, want %q", len(items), err, want)
	}
	if _, again := f.Next(); again == nil || again == io.EOF {
		t.Errorf("after a fault Next returns %v", again)
	}
}

func TestCancelledContextEndsReading(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	f, err := Open(ctx, "-", strings.NewReader("id\n1\n2\n"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	cancel()
	if _, err := f.Next(); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
}

// A row over the limit goes to a file in any format, and the next row is read.
func TestLargeRowIsSpooled(t *testing.T) {
	big := strings.Repeat("x", 5000)
	tests := []struct{ name, text, spooled string }{
		{"plain cell", "id,narrative\n1,small\n2," + big + "\n3,small\n", "2," + big},
		{"quoted cell", "id,narrative\n1,small\n2,\"" + big + "\"\n3,small\n", "2,\"" + big + "\""},
		{"after a quoted break", "id,narrative,make\n1,small,\n2,\"a\nb\"," + big + "\n3,small,\n", "2,\"a\nb\"," + big},
		{"json line", `{"id":"1"}` + "\n" + `{"id":"2","narrative":"` + big + `"}` + "\n" + `{"id":"3"}`, `{"id":"2","narrative":"` + big + `"}`},
		{"array element", `[{"id":"1"},{"id":"2","narrative":"` + big + `"},{"id":"3"}]`, `{"id":"2","narrative":"` + big + `"}`},
	}
	for _, test := range tests {
		for _, limit := range []int{1000, 4900, len(test.spooled) - 1} {
			t.Run(fmt.Sprint(test.name, " ", limit), func(t *testing.T) {
				items, _ := readAll(t, test.text, Options{MaxRow: limit})
				if len(items) != 3 || items[0].Occurrence == nil || items[2].Occurrence == nil || items[2].Occurrence.ID != "3" {
					t.Fatalf("got\n%s", outcomes(items))
				}
				aside := items[1].SetAside
				want := fmt.Sprintf("a row of %d bytes, more than the limit of %d", len(test.spooled), limit)
				if aside == nil || aside.Reason != want || len(aside.Raw) > 0 {
					t.Fatalf("set aside: %+v, want reason %q", aside, want)
				}
				if got, err := os.ReadFile(aside.Spool); err != nil || string(got) != test.spooled {
					t.Errorf("spool holds %d bytes (%v), want the row's %d", len(got), err, len(test.spooled))
				}
			})
		}
		t.Run(test.name+" at the limit", func(t *testing.T) {
			items, _ := readAll(t, test.text, Options{MaxRow: len(test.spooled)})
			if len(items) != 3 || items[1].SetAside != nil {
				t.Errorf("got\n%s", outcomes(items))
			}
		})
	}
}

func TestCloseRemovesSpooledRowsNotReturned(t *testing.T) {
	dir := t.TempDir()
	f, err := Open(context.Background(), "-", strings.NewReader("id,narrative\n1,"+strings.Repeat("x", 900)+"\n"), Options{MaxRow: 100, SpoolDir: dir})
	if err != nil {
		t.Fatal(err)
	}
	if left, _ := os.ReadDir(dir); len(left) != 1 {
		t.Fatalf("%d spooled rows before Close, want 1", len(left))
	}
	f.Close()
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("%d spooled rows after Close", len(left))
	}
}

// Rows that share a value of the id column and tell something else are no
// revisions of one another: each stands under an id of its own.
func TestSharedIDIsNoID(t *testing.T) {
	var b strings.Builder
	b.WriteString("case no,narrative\n")
	for i := range 40 {
		fmt.Fprintf(&b, "C-%d,Advice number %d.\n", i/4, i)
	}
	items, m := readAll(t, b.String(), Options{})
	ids := map[string]bool{}
	for _, it := range items {
		ids[it.Occurrence.ID] = true
	}
	if len(ids) != 40 || m.Columns[0].Field != "extra" || !strings.Contains(m.Columns[0].Note, "30 of 40 rows") {
		t.Errorf("%d ids, column %+v", len(ids), m.Columns[0])
	}
	if got := items[5].Occurrence.Extra["case no"]; got != "C-1" {
		t.Errorf("extra %q", got)
	}
	// two rows of one id are a row and its correction
	_, m = readAll(t, "case no,narrative\nC-1,a\nC-1,b\nC-2,c\n", Options{})
	if m.Columns[0].Field != "id" {
		t.Errorf("column %+v", m.Columns[0])
	}
}
