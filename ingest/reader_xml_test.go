package ingest

import (
	"strings"
	"testing"
)

func TestXMLRows(t *testing.T) {
	tests := []struct{ name, text, want string }{
		{"attributes", `<d xmlns="urn:x"><rows><r id="A" date="2021"/>` + "\n" + `<r id="B" date="2022"/></rows></d>`, "1@1 A\n2@2 B\n"},
		{"children", "<?xml version=\"1.0\" encoding=\"windows-1252\"?>\n<d>\n<r><id>A</id><date>2021</date></r>\n<r><id>B</id><date>2022</date></r>\n</d>", "1@3 A\n2@4 B\n"},
		{"one record", "<report><id>A</id><narrative>x</narrative></report>", "1@1 A\n"},
		{"records in a comment", `<d><!-- <r id="X"/> --><r id="A"/><r id="B"/></d>`, "1@1 A\n2@1 B\n"},
		{"a bracket in a value", `<d><r id="A>"/><r id="B"/></d>`, "1@1 A>\n2@1 B\n"},
		{"a record inside a record", `<d><r id="A" date="2021"><r id="X"/></r><r id="B"/></d>`, "1@1 A\n2@1 B\n"},
		{"broken record", "<d><r id=\"A\"><narrative>x</narrative></r>\n<r id=\"B\"><narrative>x</r>\n<r id=\"C\"/></d>",
			"1@1 A\n2@2 ! broken XML: line 1: element <narrative> closed by </r>\n3@3 C\n"},
		{"record never closed", "<d><r id=\"A\"/>\n<r id=\"B\"><x>\n<r id=\"C\"></r></d>", "1@1 A\n2@2 ! XML cut short: what begins here never ends\n"},
		{"value without quotes", "<d><r id=\"A\"/>\n<r id=B></r>\n<r id=\"C\"/></d>",
			"1@1 A\n2@2 ! broken XML: line 1: unquoted or missing attribute value in element\n3@3 C\n"},
		{"nothing usable", `<d><r id="A" x=""/><r x="1"/></d>`, "1@1 A\n2@1 ! no id, date or narrative\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			items, _, err := tryAll(t, test.text, Options{})
			if got := outcomes(items); got != test.want {
				t.Errorf("got\n%swant\n%s (%v)", got, test.want, err)
			}
		})
	}
}

func TestXMLNarrative(t *testing.T) {
	items, _ := readAll(t, `<d><r><id>A</id><narrative kind="cause">The &quot;left&quot; <b>engine</b> quit &amp;amp; stopped.</narrative>`+
		`<narrative><![CDATA[ 1 < 2 ]]></narrative><aircraft><make>Marrow</make></aircraft></r><r><id>B</id></r></d>`, Options{})
	o := items[0].Occurrence
	if o == nil || len(o.Narratives) != 2 {
		t.Fatalf("got %s", outcomes(items))
	}
	for i, want := range []struct{ kind, text string }{{"cause", `The "left" engine quit & stopped.`}, {"factual", " 1 < 2 "}} {
		if n := o.Narratives[i]; n.Kind != want.kind || n.Text != want.text {
			t.Errorf("narrative %d: got %q, want %q", i, n, want)
		}
	}
	if o.Make != "Marrow" {
		t.Errorf("make %q", o.Make)
	}
}

// A document's own entities are not expanded: the classic bomb of ten in ten
// in ten costs its row and nothing else.
func TestXMLEntitiesAreNotExpanded(t *testing.T) {
	var b strings.Builder
	b.WriteString("<!DOCTYPE d [<!ENTITY a \"ha\">")
	for c := 'b'; c < 'k'; c++ {
		b.WriteString("<!ENTITY " + string(c) + " \"" + strings.Repeat("&"+string(c-1)+";", 10) + "\">")
	}
	b.WriteString(`]><d><r id="A"><narrative>&j;</narrative></r><r id="B"/></d>`)
	items, _ := readAll(t, b.String(), Options{})
	if len(items) != 2 || items[0].SetAside == nil || !strings.Contains(items[0].SetAside.Reason, "entity") || items[1].Occurrence == nil {
		t.Errorf("got %s", outcomes(items))
	}
}

func TestLargeXMLElementIsSpooled(t *testing.T) {
	long := `<r id="A"><narrative>` + strings.Repeat("<i>word</i> ", 40_000) + `</narrative></r>`
	items, _ := readAll(t, "<d><r id=\"0\"/>"+long+"<r id=\"B\"/></d>", Options{MaxRow: 100_000})
	if len(items) != 3 || items[1].SetAside == nil || items[1].SetAside.Spool == "" || items[2].Occurrence == nil {
		t.Fatalf("got %s", outcomes(items))
	}
}

func TestDeepXMLIsSetAside(t *testing.T) {
	deep := strings.Repeat("<x>", 200) + strings.Repeat("</x>", 200)
	items, _ := readAll(t, `<d><r id="A">`+deep+`</r><r id="B"/></d>`, Options{})
	if len(items) != 2 || items[0].SetAside == nil || items[1].Occurrence == nil {
		t.Errorf("got %s", outcomes(items))
	}
}
