package ingest

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"os"
	"reflect"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/klauspost/compress/zip"
	"github.com/xuri/excelize/v2"
)

// checkItems holds what is true of every file: each row became exactly one
// thing, rows and lines go up, texts are UTF-8, and the raw rows, in order and
// without overlap, stand in the file, with only what is passed over between.
func checkItems(t *testing.T, text string, items []Item, passedOver string) {
	t.Helper()
	at, line := 0, 0
	for i, it := range items {
		if (it.Occurrence == nil) == (it.SetAside == nil) {
			t.Fatalf("row %d is %v and %v", i+1, it.Occurrence, it.SetAside)
		}
		if it.Source.Row != i+1 || it.Source.Line < line {
			t.Fatalf("row %d stands at %+v behind line %d", i+1, it.Source, line)
		}
		line = it.Source.Line
		raw := it.Raw
		if s := it.SetAside; s != nil {
			if s.Reason == "" {
				t.Fatalf("row %d is set aside without a reason", i+1)
			}
			if s.Spool != "" {
				spooled, err := os.ReadFile(s.Spool)
				if err != nil || len(raw) > 0 {
					t.Fatalf("row %d: spool %v, %d raw bytes", i+1, err, len(raw))
				}
				raw = spooled
			}
		}
		// what is passed over may look like the row: look on the row's line
		from := at
		for from < len(text) && 1+strings.Count(text[:from], "\n") < it.Source.Line {
			from++
		}
		n := strings.Index(text[from:], string(raw))
		if n >= 0 {
			n += from - at
		}
		if n < 0 || strings.Trim(text[at:at+n], passedOver) != "" {
			t.Fatalf("row %d: raw %q does not follow %q", i+1, raw, text[at:])
		}
		if begins := 1 + strings.Count(text[:at+n], "\n"); begins != it.Source.Line {
			t.Fatalf("row %d: line %d, begins on %d", i+1, it.Source.Line, begins)
		}
		at += n + len(raw)
		if it.Occurrence != nil {
			checkText(t, it)
		}
	}
	if strings.Trim(text[at:], passedOver) != "" {
		t.Fatalf("%q is in no row", text[at:])
	}
}

// checkText holds that everything of an occurrence is UTF-8 and written again.
func checkText(t *testing.T, it Item) {
	t.Helper()
	line, err := AppendRecord(nil, it.Occurrence)
	if err != nil || !json.Valid(line) {
		t.Fatalf("written as %q, %v", line, err)
	}
	if !utf8.Valid(line) || bytes.Contains(line, []byte(`\ufffd`)) && !bytes.Contains(it.Raw, []byte("\uFFFD")) &&
		!bytes.ContainsAny(it.Raw, `&\`) {
		t.Fatalf("not UTF-8: %q", line)
	}
	if it.Occurrence.ID == "" || it.Occurrence.Source == "" {
		t.Fatalf("no identity: %s", line)
	}
}

func FuzzDelimited(f *testing.F) {
	for _, seed := range []string{
		"id,date,narrative\nA,2019-01-02,\"one\r\ntwo \"\"x\"\"\"\nB,,\"open\nC,\"x\",y\n",
		"id;narrative\r\n1;a \"b\" c\r\n\r\n;\r\n\"x\"y;z\r\n",
		"id\tengines\n1\t2, 2\n\x00\t\xff\n",
		"sep=|\nid|event\n1|ACC\n", "id,date\n1,31/02/2019\n2,\"1/13/2019\"", "narrative\n&amp;&#0;\n\"\n\"\"\n", "id,id,\n1,2,\"3\"\r",
		"id,a\n1,\"" + strings.Repeat("long ", 60) + "\n2,b\n",
	} {
		f.Add(seed, 100)
	}
	f.Fuzz(func(t *testing.T, text string, maxRow int) {
		maxRow = 16 + (maxRow%5000+5000)%5000
		file, err := Open(context.Background(), "-", strings.NewReader(text), Options{MaxRow: maxRow, SpoolDir: t.TempDir()})
		if err != nil {
			return
		}
		defer file.Close()
		if file.Header() == nil {
			t.Skip("JSON")
		}
		items, err := drain(file)
		if err != nil {
			t.Fatal(err)
		}
		top := strings.Index(text, string(file.Header()))
		if file.Charset() != charsetUTF8 || top < 0 { // decoded, or two header rows
			return
		}
		body := text[top+len(file.Header()):]
		for i := range items { // lines are counted from the top of the file
			items[i].Source.Line -= strings.Count(text[:len(text)-len(body)], "\n")
		}
		checkItems(t, body, items, " \t\r\n\v\f\u0085\u00a0\u1680\u2000\u2001\u2002\u2003\u2004\u2005\u2006\u2007\u2008\u2009\u200a\u2028\u2029\u202f\u205f\u3000")
		compareWithCSV(t, file, items)
	})
}

// compareWithCSV holds that a record has the cells that encoding/csv finds,
// which drops the carriage return of a line break inside quotes.
func compareWithCSV(t *testing.T, file *File, items []Item) {
	delimiter := file.reader.(*delimitedReader).split.delimiter
	for _, it := range items {
		s := splitter{delimiter: delimiter}
		if it.SetAside != nil && (it.SetAside.Spool != "" || strings.HasPrefix(it.SetAside.Reason, "quote opened")) {
			continue
		}
		found := s.scan(it.Raw, true)
		if found.outcome != complete || found.end != len(it.Raw) {
			t.Fatalf("%q: found %+v", it.Raw, found)
		}
		r := csv.NewReader(bytes.NewReader(it.Raw))
		r.Comma, r.LazyQuotes = rune(delimiter), true
		want, err := r.Read()
		if errors.Is(err, io.EOF) {
			continue
		}
		var got []string
		for _, c := range s.cells(string(it.Raw)) {
			got = append(got, strings.ReplaceAll(c, "\r\n", "\n"))
		}
		if err != nil || !slices.Equal(got, want) {
			t.Fatalf("%q: cells %q, encoding/csv has %q, %v", it.Raw, got, want, err)
		}
	}
}

func FuzzJSON(f *testing.F) {
	for _, seed := range []string{
		`{"id":"A","date":"2019-01","narrative":"x \u00e9\ud83d\ude00\ud83d \n"}` + "\n{}\n{\"id\":1e5}\n",
		`[{"id":"A","narratives":[{"kind":"cause","text":"t"},"x",1]}, {"id" 1}, 7, "s", null]`,
		`[{"id":"A"}} , {"id":"B"`, "{\n\"id\": \"A\"\n}\n{ \"id\":\"B\", \"extra\":{\"a\":[1, 2]},\"extra\":1}",
		`{"id":"A","codes":[{"scheme":"s"}],"aircraft":[{"engines":2.0}],"engines":"3","id":"B"}`, "[\n]x", `{"id":"A"},`, "[1,,2]",
		`[{"id":"` + strings.Repeat("long ", 60) + `"},{"id":"B"}]`,
	} {
		f.Add(seed, 100)
	}
	f.Fuzz(func(t *testing.T, text string, maxRow int) {
		maxRow = 16 + (maxRow%5000+5000)%5000
		file, err := Open(context.Background(), "-", strings.NewReader(text), Options{MaxRow: maxRow, SpoolDir: t.TempDir()})
		if err != nil {
			return
		}
		defer file.Close()
		j, ok := file.reader.(*jsonReader)
		if !ok {
			t.Skip("a table")
		}
		items, err := drain(file)
		if err != nil && !strings.HasSuffix(err.Error(), "the file may be cut short") {
			t.Fatal(err)
		}
		if file.Charset() != charsetUTF8 || j.wrapped {
			return
		}
		between := jsonSpace + "\uFEFF"
		if j.shape != perLine {
			between += ",[]"
		}
		checkItems(t, text, items, between)
		for _, it := range items {
			compareWithJSON(t, it)
		}
	})
}

// compareWithJSON holds that a row is taken if and only if encoding/json
// takes it for an object, but for trailing commas, and that its plain values
// are the same.
func compareWithJSON(t *testing.T, it Item) {
	if it.SetAside != nil {
		if strings.HasPrefix(it.SetAside.Reason, "broken JSON at") && !strings.Contains(it.SetAside.Reason, "nested deeper") && json.Valid(it.Raw) {
			t.Fatalf("%q: %s, yet valid", it.Raw, it.SetAside.Reason)
		}
		return
	}
	var want map[string]any
	if err := json.Unmarshal(it.Raw, &want); err != nil {
		if !trailingComma(it.Raw) {
			t.Fatalf("%q: taken, yet %v", it.Raw, err)
		}
		return
	}
	var got map[string]any
	p := jsonText{s: string(it.Raw)}
	got = map[string]any{}
	err := p.object(func(key string) error {
		start := p.at
		text, _, _, err := p.any()
		var v any
		if c := strings.TrimLeft(p.s[start:p.at], jsonSpace+":"); strings.HasPrefix(c, `"`) {
			v = text
		} else if err := json.Unmarshal([]byte(c), &v); err != nil {
			return fmt.Errorf("%q: %w", c, err)
		}
		got[key] = v
		return err
	})
	if err != nil || !reflect.DeepEqual(got, want) {
		t.Fatalf("%q: got %v, %v, want %v", it.Raw, got, err, want)
	}
}

// trailingComma tells whether a comma stands before a closing bracket or at
// the end, outside texts.
func trailingComma(raw []byte) bool {
	inText, escaped, comma := false, false, false
	for _, c := range raw {
		switch {
		case inText:
			inText = escaped || c != '"'
			escaped = !escaped && c == '\\'
		case c == '"':
			inText, comma = true, false
		case c == ',':
			comma = true
		case strings.IndexByte(jsonSpace, c) >= 0:
		default:
			if comma && (c == ']' || c == '}') {
				return true
			}
			comma = false
		}
	}
	return comma
}

func FuzzXML(f *testing.F) {
	for _, seed := range []string{
		`<?xml version="1.0"?><a xmlns="u"><ROW id="1" Narrative="x &lt;br/&gt; y"/><ROW id="2"><date>2019</date></ROW></a>`,
		"<data><!-- <row> -->\n<row><id>1</id><narrative kind=\"cause\">a <b>b</b> c</narrative></row>\n<row><id>2</id><![CDATA[ <row> ]]></row></data>",
		`<!DOCTYPE a [<!ENTITY x "y">]><a><r><id>&x;</id></r><r><id>2</id></r></a>`, `<a><r id="1"><r id="2"/></r><r id='>'/>`, `<r id="1"/>`,
		"<a><r id=\"1\">" + strings.Repeat("long ", 60) + "</r><r id=\"2\"/></a>", "<a><r id=1/><r id='2'></a>", "<a><r id=\"1\"",
	} {
		f.Add(seed, 100)
	}
	f.Fuzz(func(t *testing.T, text string, maxRow int) {
		maxRow = 16 + (maxRow%5000+5000)%5000
		file, err := Open(context.Background(), "-", strings.NewReader(text), Options{MaxRow: maxRow, SpoolDir: t.TempDir()})
		if err != nil {
			return
		}
		defer file.Close()
		x, ok := file.reader.(*xmlReader)
		if !ok || file.Charset() != charsetUTF8 {
			t.Skip("no XML")
		}
		items, err := drain(file)
		if err != nil && !strings.HasSuffix(err.Error(), "the file may be cut short") {
			t.Fatal(err)
		}
		at := 0
		for i, it := range items {
			if (it.Occurrence == nil) == (it.SetAside == nil) || it.Source.Row != i+1 {
				t.Fatalf("row %d is %+v", i+1, it)
			}
			raw := it.Raw
			if it.SetAside != nil && it.SetAside.Spool != "" {
				if raw, err = os.ReadFile(it.SetAside.Spool); err != nil {
					t.Fatal(err)
				}
			}
			n := strings.Index(text[at:], string(raw))
			if n < 0 {
				t.Fatalf("row %d: raw %q is not in %q", i+1, raw, text[at:])
			}
			at += n + len(raw)
			if it.Occurrence != nil {
				checkText(t, it)
			}
		}
		if want, ok := elementsOf(text, x.record, x.level); ok && want != len(items) {
			t.Fatalf("%d rows, encoding/xml has %d elements %q", len(items), want, x.record)
		}
	})
}

// elementsOf counts the elements of a name at a level with encoding/xml; ok
// is false where that does not take the text.
func elementsOf(text, name string, level int) (n int, ok bool) {
	d := xml.NewDecoder(strings.NewReader(text))
	d.CharsetReader = decodedAlready
	for depth := 0; ; {
		token, err := d.Token()
		if err != nil {
			return n, err == io.EOF
		}
		switch t := token.(type) {
		case xml.StartElement:
			if depth == level && t.Name.Local == name {
				n++
			}
			depth++
		case xml.EndElement:
			depth--
		}
	}
}

func FuzzReport(f *testing.F) {
	for _, seed := range []string{"id: A\ndate: 2019\n\nThe engine quit.\n", "---\nid: A\n---\nx", "id:\n", "---\n", "a: b\n\n", "id: 1\nid: 2\r\n\r\n\xff"} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		file, err := Open(context.Background(), "x.txt", strings.NewReader(text), Options{MaxRow: 2000, SpoolDir: t.TempDir()})
		if err != nil {
			return
		}
		defer file.Close()
		if _, ok := file.reader.(*textReader); !ok {
			t.Skip("no report")
		}
		items, err := drain(file)
		if err != nil || len(items) != 1 {
			t.Fatalf("%d rows, %v", len(items), err)
		}
		if it := items[0]; it.Occurrence != nil {
			checkText(t, it)
			for _, n := range it.Occurrence.Narratives {
				if !strings.Contains(string(it.Raw), n.Text) && !strings.Contains(n.Text, "&") && !strings.Contains(string(it.Raw), "&") {
					t.Fatalf("%q is not in %q", n.Text, it.Raw)
				}
			}
		}
	})
}

func FuzzDate(f *testing.F) {
	for _, seed := range []string{"2014-12-31", "10-JAN-95", "Jan 10, 1995", "3/4/2021 10:11 PM", "201412", "2014-12-31T18:10:00Z", "0000-00-00", "1//2"} {
		f.Add(seed, "dmy")
	}
	f.Fuzz(func(t *testing.T, text, order string) {
		d, err := parseDate(text, order)
		if err == nil && text != "" && (d.Year == 0 || d.Check() != nil) {
			t.Fatalf("%q: date %+v", text, d)
		}
		if err != nil && d.Year != 0 {
			t.Fatalf("%q: date %+v and error %v", text, d, err)
		}
		if err == nil {
			if again, err := parseDate(d.String(), order); err != nil || again != d {
				t.Fatalf("%q: %v read again as %v, %v", text, d, again, err)
			}
		}
		if order == "" && err == nil { // a date that needs no order is the same under any that reads it
			for _, o := range dateOrders {
				if other, err := parseDate(text, o.name); err == nil && other != d {
					t.Fatalf("%q: %v, but %v with %s", text, d, other, o.words)
				}
			}
		}
		var e dateEvidence
		if e.add(text, 1) != nil {
			t.Fatalf("%q alone contradicts itself", text)
		}
	})
}

// Any bytes at all, as a file of any name: the sniffer, the charset and the
// unpacking end in rows, in rows set aside, or in words.
func FuzzOpen(f *testing.F) {
	for _, seed := range []string{
		"id;date\n1;2019\n", "\xFF\xFEi\x00d\x00\n\x001\x00\n\x00", "\xFE\xFF\x00i\x00d", "id,narrative\n1,caf\xe9\n", "\x1f\x8b\x08\x00", "\xEF\xBB\xBF[{\"id\":1}]",
		"PK\x03\x04[Content_Types].xml", "sep=\t\nid\tnarrative\n1\tx\n", "<a><b id='1'/></a>", "%PDF-1.4", "id: 1\n\ntext", "{\"results\":{\"rows\":[{\"id\":\"1\"}]}}",
	} {
		f.Add([]byte(seed), "a.txt")
		f.Add([]byte(seed), "a.csv")
	}
	f.Fuzz(func(t *testing.T, data []byte, name string) {
		file, err := Open(context.Background(), name, bytes.NewReader(data), Options{MaxRow: 2000, SpoolDir: t.TempDir()})
		if err != nil {
			if err.Error() == "" {
				t.Fatal("an error without words")
			}
			return
		}
		defer file.Close()
		items, _ := drain(file) // a broken stream may end in an error
		for i, it := range items {
			if (it.Occurrence == nil) == (it.SetAside == nil) || it.Source.Row != i+1 {
				t.Fatalf("row %d: %+v", i+1, it)
			}
			if it.Occurrence != nil {
				checkText(t, it)
			}
		}
	})
}

// The sheet of a workbook may hold anything.
func FuzzWorkbook(f *testing.F) {
	book := excelize.NewFile()
	row := []any{"id", "date", "narrative"}
	if err := book.SetSheetRow("Sheet1", "A1", &row); err != nil {
		f.Fatal(err)
	}
	var template bytes.Buffer
	if err := book.Write(&template); err != nil {
		f.Fatal(err)
	}
	for _, rows := range []string{
		`<row r="1"><c r="A1" t="inlineStr"><is><t>id</t></is></c><c r="B1" t="str"><v>date</v></c></row><row r="2"><c r="A2"><v>1</v></c><c r="B2" s="1"><v>43831.5</v></c></row>`,
		`<row r="1048577"><c r="XFE1"><v>1</v></c></row>`, `<row><c t="s"><v>99</v></c></row>`, `<row r="-1"><c r="A0"/></row>`, `<row r="3"><c r="B3" t="e"><v>#N/A</v></c>`,
	} {
		f.Add(rows)
	}
	f.Fuzz(func(t *testing.T, rows string) {
		sheet := `<?xml version="1.0" encoding="UTF-8"?><worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>` + rows + `</sheetData></worksheet>`
		file, err := Open(context.Background(), "a.xlsx", bytes.NewReader(withSheet(t, template.Bytes(), sheet)), Options{MaxRow: 2000, SpoolDir: t.TempDir()})
		if err != nil {
			return
		}
		defer file.Close()
		items, _ := drain(file)
		for _, it := range items {
			if it.Occurrence != nil {
				checkText(t, it)
			}
		}
	})
}

// withSheet puts another text in place of a workbook's first sheet.
func withSheet(t *testing.T, book []byte, sheet string) []byte {
	t.Helper()
	in, err := zip.NewReader(bytes.NewReader(book), int64(len(book)))
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	out := zip.NewWriter(&b)
	for _, m := range in.File {
		if m.Name != "xl/worksheets/sheet1.xml" {
			if err := out.Copy(m); err != nil {
				t.Fatal(err)
			}
			continue
		}
		w, err := out.Create(m.Name)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.WriteString(w, sheet); err != nil {
			t.Fatal(err)
		}
	}
	if err := out.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// A map that is accepted names only fields that there are.
func FuzzMap(f *testing.F) {
	for _, seed := range []string{"[columns]\n\"Case\" = \"id\"\n", "source = \"x\"\ndates = \"dmy\"\n", "[columns]\nA = \"narrative:cause\"\n", "x", "[columns]\nA = [1]\n", "[[columns]]\n"} {
		f.Add([]byte(seed))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		m, err := ParseMap("map.toml", data)
		if err == nil && m == nil || err != nil && !strings.Contains(err.Error(), "map.toml") {
			t.Fatalf("%v, %v", m, err)
		}
	})
}
