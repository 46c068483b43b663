package ingest

import (
	"reflect"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

func TestJSONRows(t *testing.T) {
	deep := strings.Repeat("[", 70) + strings.Repeat("]", 70)
	tests := []struct{ name, text, want string }{
		{"broken line", "{\"id\":\"A\"}\n{\"id\":\"B\"\n{\"id\":\"C\"}\n", "1@1 A\n2@2 ! broken JSON at byte 10 of the row: want a comma or '}'\n3@3 C\n"},
		{"broken first line", "{\"id\":\"A\n{\"id\":\"B\"}\n", "1@1 ! broken JSON at byte 9 of the row: the text is not closed\n2@2 B\n"},
		{"not an object", "{\"id\":\"A\"}\n[1]\n7\n", "1@1 A\n2@2 ! not a JSON object\n3@3 ! not a JSON object\n"},
		{"line cut from an array", "{\"id\":\"A\"},\n{\"id\":\"B\"},\n", "1@1 A\n2@2 B\n"},
		{"text behind the object", "{\"id\":\"A\"} x\n{\"id\":\"B\"}\n", "1@1 ! broken JSON at byte 12 of the row: more text after the end of the value\n2@2 B\n"},
		{"nothing usable", "{\"id\":\"A\"}\n{}\n{\"make\":\"x\"}\n", "1@1 A\n2@2 ! no id, date or narrative\n3@3 ! no id, date or narrative\n"},
		{"not UTF-8", "{\"id\":\"A\"}\n{\"id\":\"\xff\"}\n{\"place\":\"né\"}\n", "1@1 A\n2@2 ! not UTF-8 at byte 8 of the row\n3@3 ! no id, date or narrative\n"},
		{"too deep", "{\"id\":\"A\"}\n{\"id\":\"B\",\"x\":" + deep + "}\n", "1@1 A\n2@2 ! broken JSON at byte 78 of the row: nested deeper than 64\n"},
		{"array over lines", "[\n {\"id\":\"A\"},\n {\"id\":\n \"B\"}\n, {\"id\":\"C\"}]", "1@2 A\n2@3 B\n3@5 C\n"},
		{"broken element", "[{\"id\":\"A\"},\n{\"id\" 1},\n{\"id\":\"C\"}]", "1@1 A\n2@2 ! broken JSON at byte 7 of the row: want a colon after the key\n3@3 C\n"},
		{"element of another kind", "[{\"id\":\"A\"},3,\"x\",null,{\"id\":\"B\"}]",
			"1@1 A\n2@1 ! not a JSON object\n3@1 ! not a JSON object\n4@1 ! not a JSON object\n5@1 B\n"},
		{"rest after a stray mark", "[{\"id\":\"A\"},\n}{\"id\":\"B\"},\n{\"id\":\"C\"}]",
			"1@1 A\n2@2 ! broken JSON: '}' where a value should begin; set aside from here to the end of the file\n"},
		{"element that never ends", "[{\"id\":\"A\"},\n{\"id\":\"B},\n{\"id\":\"C\"}]",
			"1@1 A\n2@2 ! broken JSON: the value that begins here never ends; set aside from here to the end of the file\n"},
		{"text behind the array", "[{\"id\":\"A\"}]\n{\"id\":\"B\"}\n", "1@1 A\n2@2 ! more text after the end of the array; set aside from here to the end of the file\n"},
		{"empty array", "[]", ""},
		{"list in an object", "{\"count\": 2, \"links\": {\"next\": null}, \"results\": [\n{\"id\":\"A\"},\n{\"id\":\"B\"}\n], \"more\": false}\n", "1@2 A\n2@3 B\n"},
		{"list deeper in objects", "{\"data\":{\"items\":[{\"ref\":{\"x\":1},\"id\":\"A\"},{\"id\":\"B\"}]}}", "1@1 A\n2@1 B\n"},
		{"one record with lists", "{\"people\":[{\"id\":1}],\"id\":\"A\"}\n{\"id\":\"B\"}\n", "1@1 A\n2@2 B\n"},
		{"one record over lines", "{\n\"id\":\"A\",\n\"parts\":[{\"id\":\"x\"}]\n}\n", "1@1 A\n"},
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

func TestRestOfAnArrayIsKeptWhole(t *testing.T) {
	rest := "{\"id\":\"B},\n{\"id\":\"C\"}]\n"
	items, _ := readAll(t, "[{\"id\":\"A\"},\n"+rest, Options{})
	if string(items[1].SetAside.Raw) != rest {
		t.Errorf("raw %q, want %q", items[1].SetAside.Raw, rest)
	}
}

func TestArrayCutShortIsAFault(t *testing.T) {
	items, _, err := tryAll(t, "[{\"id\":\"A\"},\n{\"id\":\"B\"}\n", Options{})
	if len(items) != 2 || err == nil || !strings.Contains(err.Error(), "line 3: the array is not closed") {
		t.Errorf("%d items, error %v", len(items), err)
	}
}

func TestWholeRecord(t *testing.T) {
	text := `{"id":7,"source":"hangar","date":"2019-03","place":" Vell ","make":"NULL","engines":"2","injury":"Fatal","damage":"bent",` +
		`"narratives":[{"kind":"cause","text":" a \u00e9\n\ud83d\ude00 "},"plain",{"kind":"summary","text":"s"},{"kind":"odd","text":"","lang":"en"},9],` +
		`"codes":[{"scheme":"s","code":"c","label":"l","why":null},"label only"],` +
		`"aircraft":[{"make":"Borealis","engines":1},{"model":"X","engines":"many"}],` +
		`"extra":{"a":"1","n":{"x": [1, 2]},"t":true},"a":"second","number":1.50e3,"gone":null,"list":[ 1 ],` +
		`"rulebook":"3","tags":[{"factor":"x"}],"chain":{"links":[]},"id":"again"}`
	items, m := readAll(t, text, Options{})
	want := &corpus.Occurrence{
		ID: "7", Source: "hangar", Date: corpus.Date{Year: 2019, Month: 3}, Place: " Vell ",
		Aircraft: corpus.Aircraft{Make: "NULL", Engines: 2}, Injury: "fatal",
		Further: []corpus.Aircraft{{Make: "Borealis", Engines: 1}, {Model: "X"}},
		Narratives: []corpus.Narrative{{Kind: "cause", Text: " a é\n😀 "}, {Kind: "factual", Text: "plain"},
			{Kind: "synopsis", Text: "s"}, {Kind: "remarks", Text: ""}},
		Codes: []corpus.Code{{Scheme: "s", Code: "c", Label: "l"}, {Label: "label only"}},
		Extra: map[string]string{
			"a": "1", "n": `{"x":[1,2]}`, "t": "true", "a (2)": "second", "number": "1.50e3", "list": "[1]", "id (2)": "again",
			"damage": "bent", "narratives[2].kind": "summary", "narratives[3].kind": "odd", "narratives[3].lang": "en",
			"narratives[4]": "9", "aircraft[1].engines": "many",
		},
	}
	if got := items[0].Occurrence; !reflect.DeepEqual(got, want) {
		t.Errorf("got  %+v\nwant %+v", got, want)
	}
	if m.Name != "records" {
		t.Errorf("map %q", m.Name)
	}
}

// Keys that first come behind the sample are mapped like the others.
func TestLateKeys(t *testing.T) {
	text := strings.Repeat(`{"id":"A"}`+"\n", sampleRows+1) + `{"id":"B","Weather":"fog","Probable Cause":"Ice."}` + "\n"
	items, m := readAll(t, text, Options{})
	o := items[len(items)-1].Occurrence
	if o.Extra["Weather"] != "fog" || len(o.Narratives) != 1 || o.Narratives[0] != (corpus.Narrative{Kind: "cause", Text: "Ice."}) {
		t.Errorf("got %+v", o)
	}
	if len(m.Columns) != 3 || m.Columns[2].Field != "narrative.cause" {
		t.Errorf("columns %v", m.Columns)
	}
}
