package ingest

import (
	"archive/zip"
	"bytes"
	"compress/gzip"
	"encoding/csv"
	"encoding/json"
	"encoding/xml"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
)

// The same records in every format give the same occurrences but for their
// source. The writers are the standard library's and excelize, none of ours.
func TestFormatsAgree(t *testing.T) {
	const records = 1000
	names, rows := flatRecords(records)
	want := ""
	for _, file := range writtenFiles(t, names, rows) {
		got := readRecords(t, file.path)
		if n := strings.Count(got, "\n"); n != records {
			t.Fatalf("%s: %d records", file.name, n)
		}
		if want == "" {
			want = got
		}
		if got != want {
			a, b := firstDifference(got, want)
			t.Errorf("%s differs from the first format:\n%s\n%s", file.name, a, b)
		}
	}
}

// flatRecords are invented records that every format can hold: no nested
// value, no cell of over 32,767 characters, no letter that Latin-1 lacks.
func flatRecords(n int) (names []string, rows [][]string) {
	names = []string{"id", "date", "place", "country", "make", "model", "category", "engines", "operation", "injury", "damage", "event", "narrative", "remarks", "flown hours"}
	hard := []string{"a, b; c | d\tend", "says \"left\"", "two\nlines", "ümlaut Ø £5", "R&D <b>x</b> & y", " led by blanks ", "'=1+1", "0012", "1e5", "true", "C:\\x\\n", "#5", "-"}
	for i := range n {
		date := fmt.Sprintf("20%02d-%02d-%02d", 19+i%5, 1+i%12, 1+i%28)
		if i%7 == 0 {
			date = date[:7]
		}
		text := fmt.Sprintf("On the climb through %d ft the left engine lost power. %s\n\nThe speed fell to %d kt.", 200+i, hard[i*5%len(hard)], 60+i%40)
		rows = append(rows, []string{fmt.Sprintf("A-%04d", i), date, "Tarnwick", "Norland", "Marrow", "Twin 44", "airplane", fmt.Sprint(1 + i%2),
			"training", []string{"fatal", "none", ""}[i%3], "substantial", "accident", text, hard[i%len(hard)], fmt.Sprint(i)})
	}
	return names, rows
}

type writtenFile struct{ name, path string }

func writtenFiles(t *testing.T, names []string, rows [][]string) []writtenFile {
	dir := t.TempDir()
	var files []writtenFile
	add := func(name string, content []byte) {
		path := filepath.Join(dir, strings.NewReplacer(" ", "-", "/", "-").Replace(name))
		if err := os.WriteFile(path, content, 0o600); err != nil {
			t.Fatal(err)
		}
		files = append(files, writtenFile{name, path})
	}
	var plain []byte
	for _, mark := range []rune{',', '\t', ';', '|'} {
		var b bytes.Buffer
		w := csv.NewWriter(&b)
		w.Comma = mark
		w.Write(names)
		w.WriteAll(rows)
		add(fmt.Sprintf("table %d.csv", mark), b.Bytes())
		if plain == nil {
			plain = b.Bytes()
		}
	}
	for name, set := range map[string]interface {
		Bytes([]byte) ([]byte, error)
	}{
		"windows-1252.csv": charmap.Windows1252.NewEncoder(),
		"latin-1.csv":      charmap.ISO8859_1.NewEncoder(),
		"utf-16.csv":       unicode.UTF16(unicode.LittleEndian, unicode.UseBOM).NewEncoder(),
		"utf-8-mark.csv":   unicode.UTF8BOM.NewEncoder(),
	} {
		b, err := set.Bytes(plain)
		if err != nil {
			t.Fatal(err)
		}
		add(name, b)
	}
	objects := make([]map[string]string, len(rows))
	var lines, marked, attributes bytes.Buffer
	marked.WriteString(xml.Header + "<export><reports>\n")
	attributes.WriteString("<export>")
	for i, r := range rows {
		objects[i] = map[string]string{}
		marked.WriteString("<report>")
		attributes.WriteString("<report")
		for k, name := range names {
			objects[i][name] = r[k]
			element := strings.ReplaceAll(name, " ", "_")
			fmt.Fprintf(&marked, "\n  <%s>%s</%[1]s>", element, escaped(t, r[k]))
			fmt.Fprintf(&attributes, " %s=\"%s\"", element, escaped(t, r[k]))
		}
		marked.WriteString("\n</report>\n")
		attributes.WriteString("/>\n")
		line, err := json.Marshal(objects[i])
		if err != nil {
			t.Fatal(err)
		}
		lines.Write(append(line, '\n'))
	}
	marked.WriteString("</reports></export>")
	attributes.WriteString("</export>")
	array, err := json.MarshalIndent(objects, "", " ")
	if err != nil {
		t.Fatal(err)
	}
	add("array.json", array)
	add("wrapped.json", []byte(`{"total": 1000, "results": `+string(array)+`, "next": null}`))
	add("lines.ndjson", lines.Bytes())
	add("elements.xml", marked.Bytes())
	add("attributes.xml", attributes.Bytes())

	book := excelize.NewFile()
	for i, r := range append([][]string{names}, rows...) {
		if err := book.SetSheetRow("Sheet1", fmt.Sprintf("A%d", i+1), &r); err != nil {
			t.Fatal(err)
		}
	}
	var b bytes.Buffer
	if err := book.Write(&b); err != nil {
		t.Fatal(err)
	}
	add("book.xlsx", b.Bytes())

	var packed bytes.Buffer
	g := gzip.NewWriter(&packed)
	g.Write(lines.Bytes())
	g.Close()
	add("lines.ndjson.gz", packed.Bytes())
	var archive bytes.Buffer
	z := zip.NewWriter(&archive)
	m, err := z.Create("in/book.xlsx")
	if err != nil {
		t.Fatal(err)
	}
	m.Write(b.Bytes())
	z.Close()
	add("book in archive.zip", archive.Bytes())
	return files
}

func escaped(t *testing.T, text string) string {
	var b bytes.Buffer
	if err := xml.EscapeText(&b, []byte(text)); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// readRecords reads what a path stands for into occurrence records without
// their source, a line each.
func readRecords(t *testing.T, path string) string {
	t.Helper()
	inputs, err := FindInputs(t.Context(), path, nil, t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	defer inputs.Close()
	var out []byte
	for _, in := range inputs.List {
		stream, err := in.Reader()
		if err != nil {
			t.Fatal(err)
		}
		var from io.Reader
		if stream != nil {
			from = stream
		}
		f, err := Open(t.Context(), in.Path, from, Options{Source: "x", SpoolDir: t.TempDir()})
		if err != nil {
			t.Fatal(err)
		}
		items, err := drain(f)
		if err != nil {
			t.Fatal(err)
		}
		for _, it := range items {
			if it.SetAside != nil {
				t.Fatalf("%s: line %d: %s", in.Path, it.Source.Line, it.SetAside.Reason)
			}
			// XML has no blanks in names
			if hours, ok := it.Occurrence.Extra["flown_hours"]; ok {
				delete(it.Occurrence.Extra, "flown_hours")
				it.Occurrence.Extra["flown hours"] = hours
			}
			if out, err = AppendRecord(out, it.Occurrence); err != nil {
				t.Fatal(err)
			}
		}
		f.Close()
	}
	return string(out)
}

func firstDifference(a, b string) (string, string) {
	as, bs := strings.Split(a, "\n"), strings.Split(b, "\n")
	for i := range min(len(as), len(bs)) {
		if as[i] != bs[i] {
			return as[i], bs[i]
		}
	}
	return "", ""
}
