package ingest

import (
	"strings"
	"testing"

	"github.com/BurntSushi/toml"
)

const oddTable = "Vorgang,Wann,Flugzeug,Was geschah\n7,03/04/2021,Marrow Twin,The left engine quit.\n8,25/04/2021,Quill,A gull was hit.\n"

func TestMapFile(t *testing.T) {
	m, err := ParseMap("our.toml", []byte("source = 'hangar'\n[columns]\n\"Vorgang\" = \"id\"\nWann = 'date'\nFlugzeug = \"model\"\n\"Was geschah\" = \"narrative.reporter\"\n"))
	if err != nil {
		t.Fatal(err)
	}
	items, got := readAll(t, oddTable, Options{Map: m})
	o := items[0].Occurrence
	if o == nil || o.ID != "7" || o.Source != "hangar" || o.Date.String() != "2021-04-03" || o.Model != "Marrow Twin" || o.Narratives[0].Kind != "reporter" || !got.Told {
		t.Errorf("got %+v, %s", o, outcomes(items))
	}
}

func TestMapFileFaults(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"[columns]\n\"Vorgang\" = \"narative.cause\"\n", `m.toml:2: no field is called "narative.cause": did you mean "narrative.cause"?`},
		{"[columns]\nVorgang = \"id\"\n\nWann = \"id\"\n", `m.toml:4: "Wann" is id already on line 2 ("Vorgang")`},
		{"[columns]\nVorgang = id\n", "m.toml:2: "},
		{"sauce = 'x'\n[columns]\nVorgang = 'id'\n", `m.toml:1: no setting is called "sauce"`},
		{"dates = 'dym'\n[columns]\nVorgang = 'id'\n", `m.toml:1: dates = "dym": want dmy, mdy or ymd`},
		{"source = 'x'\n", "m.toml: a map needs a table [columns]"},
		{"[columns]\nVorgangg = 'id'\n", `m.toml:2: the file has no column "Vorgangg": did you mean "Vorgang"?`},
	} {
		m, err := ParseMap("m.toml", []byte(c.text))
		if err == nil {
			_, _, err = tryAll(t, oddTable, Options{Map: m})
		}
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: got %v, want %s", c.text, err, c.want)
		}
	}
}

// What --write-map writes is read back as the same map, and TOML 1.0 to its
// reference parser whatever stands in a header.
func TestWrittenMapIsTheSameMap(t *testing.T) {
	text := "id,date of event,\"odd \"\"quoted\"\" \\ = # name\",Aircraft 2 / Make,city,narrative\n1,31/12/2020,\"x\ny\",Quill,Sellow,The engine quit.\n"
	f, err := Open(t.Context(), "-", strings.NewReader(text), Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	written := f.TOML()
	var any map[string]any
	if err := toml.Unmarshal(written, &any); err != nil {
		t.Fatalf("%v in\n%s", err, written)
	}
	m, err := ParseMap("w.toml", written)
	if err != nil {
		t.Fatal(err)
	}
	first, _ := readAll(t, text, Options{})
	second, _ := readAll(t, text, Options{Map: m})
	if a, b := ContentHash(first[0].Occurrence), ContentHash(second[0].Occurrence); a != b {
		t.Errorf("%+v\n%+v", first[0].Occurrence, second[0].Occurrence)
	}
}

// Without a header that says so, long texts are the narrative and dates the date.
func TestMapByValues(t *testing.T) {
	var b strings.Builder
	b.WriteString("Nr,Tag,Bemerkung,Was geschah\n")
	for range 10 {
		b.WriteString("7,2021-03-04,short," + strings.Repeat("The left engine lost power. ", 10) + "\n")
	}
	_, m := readAll(t, b.String(), Options{})
	if c := m.Columns; c[1].Field != "date" || c[3].Field != "narrative.factual" || c[3].Note != "by its long texts" || c[2].Field != "extra" {
		t.Errorf("%+v", c)
	}
}
