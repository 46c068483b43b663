package ingest

import (
	"fmt"
	"strings"
	"testing"
	"time"
)

func TestDelimitedRows(t *testing.T) {
	tests := []struct{ name, text, want string }{
		{"a break inside quotes is one row", "id,narrative\nA,\"one\ntwo\"\nB,x\n", "1@2 A\n2@4 B\n"},
		{"doubled quotes", "id,narrative\nA,\"he said \"\"go\"\"\"\nB,x\n", "1@2 A\n2@3 B\n"},
		{"a stray quote is text", "id,narrative\nA,the 6\" pipe\nB,x\n", "1@2 A\n2@3 B\n"},
		{"fewer cells", "id,date,narrative\nA,2019\nB,2019,x\n", "1@2 ! 2 cells where the header has 3\n2@3 B\n"},
		{"more cells", "id,narrative\nA,x,y\nB,x\n", "1@2 ! 3 cells where the header has 2\n2@3 B\n"},
		{"blank cells past the header", "id,narrative\nA,x,, \nB,x\n", "1@2 A\n2@3 B\n"},
		{"blank row of cells", "id,date,narrative\n,,\nB,2019,x\n", "1@2 ! no id, date or narrative\n2@3 B\n"},
		{"not UTF-8", "id,narrative\nA,caf\xe9\nB,né\n", "1@2 ! not UTF-8 at byte 6 of the row\n2@3 B\n"},
		{"no such day", "id,date\nA,31/02/2019\nB,2019-02-28\n", "1@2 ! date \"31/02/2019\": no such day\n2@3 B\n"},
		{"engines", "id,engines\nA,two\nB,2\n", "1@2 ! engines \"two\": not a number\n2@3 B\n"},
		{"unclosed quote at the end", "id,narrative\nA,x\nB,\"open\nC,x\n", "1@2 A\n2@3 ! quote opened on line 3 is never closed\n3@4 C\n"},
		{"unclosed quote in the last row", "id,narrative\nA,x\nB,\"open", "1@2 A\n2@3 ! quote opened on line 3 is never closed\n"},
		{"unclosed quote before a quoted row", "id,narrative\nA,\"open\nB,\"closed\"\nC,x\n",
			"1@2 ! quote opened on line 2 is never closed\n2@3 B\n3@4 C\n"},
		{"unclosed quote before a row that begins with one", "id,narrative\n\"A\",\"open\n\"B\",\"closed\"\n",
			"1@2 ! quote opened on line 2 is never closed\n2@3 B\n"},
		{"unclosed quote behind a closed break", "id,make,narrative\nA,\"x\ny\",\"open\nB,z,closed\n",
			"1@2 ! quote opened on line 3 is never closed\n2@4 B\n"},
		{"header alone", "id,date\n", ""},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			items, _ := readAll(t, test.text, Options{})
			if got := outcomes(items); got != test.want {
				t.Errorf("got\n%swant\n%s", got, test.want)
			}
		})
	}
}

func TestCellsAreKeptByteForByte(t *testing.T) {
	text := "id,narrative\nA,\"  He said \"\"go\"\".\r\n\tThen &quot;left&quot; &amp;amp; R&D &notaname; stood.  \"\n"
	items, _ := readAll(t, text, Options{})
	want := "  He said \"go\".\r\n\tThen \"left\" &amp; R&D &notaname; stood.  "
	if got := items[0].Occurrence.Narratives[0].Text; got != want {
		t.Errorf("got  %q\nwant %q", got, want)
	}
	raw := strings.TrimSuffix(strings.SplitN(text, "\n", 2)[1], "\n")
	if string(items[0].Raw) != raw {
		t.Errorf("raw %q, want %q", items[0].Raw, raw)
	}
}

// A file full of unclosed quotes is read in a time that grows with its size.
func TestManyUnclosedQuotes(t *testing.T) {
	var text strings.Builder
	text.WriteString("id,narrative\n")
	const rows = 20_000
	for i := range rows {
		fmt.Fprintf(&text, "%d,\"open %d and text without an end to it\n", i, i)
	}
	text.WriteString("last,plain\n")
	start := time.Now()
	items, _ := readAll(t, text.String(), Options{})
	if len(items) != rows+1 || items[rows].Occurrence == nil {
		t.Fatalf("%d items", len(items))
	}
	for i, it := range items[:rows] {
		if it.SetAside == nil || it.SetAside.Reason != fmt.Sprintf("quote opened on line %d is never closed", i+2) {
			t.Fatalf("row %d: %+v", i+1, it.SetAside)
		}
	}
	// 20,000 looks at up to 1 MB each would take about ten seconds.
	if took := time.Since(start); took > 3*time.Second {
		t.Errorf("took %v", took)
	}
}

func TestHeadersThatRepeat(t *testing.T) {
	items, m := readAll(t, "id,NULL,NULL,,date,Event Date,NULL\n1,a,b,c,2019,2020,d\n", Options{})
	var names []string
	for _, c := range m.Columns {
		names = append(names, c.Column)
	}
	if got := strings.Join(names, "|"); got != "id|NULL|NULL (2)|column 4|date|Event Date|NULL (3)" {
		t.Errorf("columns %s", got)
	}
	o := items[0].Occurrence
	if o.Date.String() != "2019" || fmt.Sprint(o.Extra) != "map[Event Date:2020 NULL:a NULL (2):b NULL (3):d column 4:c]" {
		t.Errorf("date %s, extra %v", o.Date, o.Extra)
	}
}

func TestTwoHeaderRows(t *testing.T) {
	const text = " ,Time,Place,Place,Aircraft 1,Aircraft 1,Report 1,Report 1,\n" +
		"ACN,Date,Locale Reference,State Reference,Make Model Name,Flight Phase,Narrative,Synopsis,\n" +
		"7,202103,Tarnwick,NL,Marrow Twin,Climb,The left engine quit.,Engine failure.,\n"
	items, m := readAll(t, text, Options{})
	var got []string
	for _, c := range m.Columns {
		got = append(got, c.Column+"="+c.Field)
	}
	want := "ACN=id|Time / Date=date|Place / Locale Reference=place|Place / State Reference=place|Aircraft 1 / Make Model Name=make|" +
		"Aircraft 1 / Flight Phase=phase|Report 1 / Narrative=narrative.reporter|Report 1 / Synopsis=narrative.synopsis|column 9=extra"
	if s := strings.Join(got, "|"); s != want {
		t.Errorf("got  %s\nwant %s", s, want)
	}
	o := items[0].Occurrence
	if len(items) != 1 || o == nil || o.ID != "7" || o.Date.String() != "2021-03" || o.Place != "Tarnwick, NL" || len(o.Narratives) != 2 {
		t.Fatalf("got %s", outcomes(items))
	}
	if items[0].Source.Line != 3 {
		t.Errorf("first row on line %d", items[0].Source.Line)
	}
}

// A header whose own columns repeat is one row: what follows is a row of values.
func TestOneHeaderRowWithRepeats(t *testing.T) {
	items, m := readAll(t, "id,date,narrative,narrative\n1,2021,Date of event,place\n", Options{})
	if len(items) != 1 || len(m.Columns) != 4 || items[0].Occurrence == nil {
		t.Errorf("got %s", outcomes(items))
	}
}
