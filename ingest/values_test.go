package ingest

import (
	"strings"
	"testing"
)

func TestPlaceholders(t *testing.T) {
	for _, s := range []string{"", " ", "NULL", "null", "N/A", "n/a", "None Submitted", "UNDETERMINED.", "***", "Unknown", "-", "--", "?", ".", strings.Repeat("*", 40)} {
		if !placeholder(s) {
			t.Errorf("%q is not taken for a placeholder", s)
		}
	}
	for _, s := range []string{"0", "Unknown engine", "Null Island", "N", "The cause is undetermined.", "*** see below"} {
		if placeholder(s) {
			t.Errorf("%q is taken for a placeholder", s)
		}
	}
}

func TestWords(t *testing.T) {
	tests := []struct {
		field, cell, want string
		whole             bool
	}{
		{"injury", "Fatal", "fatal", true},
		{"injury", "FATL", "fatal", true},
		{"injury", "Fatal(2)", "fatal", true},
		{"injury", "No injury", "none", true},
		{"injury", "None", "none", true},
		{"injury", "Non-Fatal", "", false},
		{"injury", "Unknown", "", false},
		{"damage", "SUBS", "substantial", true},
		{"damage", "DEST", "destroyed", true},
		{"damage", "Minor,Destroyed", "destroyed", false},
		{"damage", "None,", "none", false},
		{"damage", "Minor,crumpled", "", false},
		{"event", "ACC", "accident", true},
		{"event", "Serious Incident", "serious-incident", true},
		{"event", "serious-incident", "serious-incident", true},
		{"event", "INC", "incident", true},
		{"event", "LOC-I", "", false},
	}
	for _, test := range tests {
		if got, whole := word(test.field, test.cell); got != test.want || whole != test.whole {
			t.Errorf("%s %q: got %q, %v", test.field, test.cell, got, whole)
		}
	}
	for field, order := range severity {
		for _, w := range order {
			if got, whole := word(field, w); got != w || !whole {
				t.Errorf("%s: the record's own word %q is read as %q", field, w, got)
			}
		}
		for cell, w := range words[field] {
			if !strings.Contains(" "+strings.Join(order, " ")+" ", " "+w+" ") || squeeze(cell) != cell {
				t.Errorf("%s: %q for %q is no word of the record, or not squeezed", field, w, cell)
			}
		}
	}
}

func TestParseEngines(t *testing.T) {
	tests := []struct {
		cell   string
		n      int
		whole  bool
		reason string
	}{
		{"2", 2, true, ""},
		{" 2.0 ", 2, true, ""},
		{"", 0, true, ""},
		{"NULL", 0, true, ""},
		{"None", 0, true, ""},
		{"0", 0, true, ""},
		{"2, 2", 2, false, ""},
		{"1,2", 1, false, ""},
		{",", 0, false, ""},
		{",2", 0, false, ""},
		{"two", 0, false, `engines "two": not a number`},
		{"2,two", 0, false, `engines "2,two": not a number`},
		{"2.5", 0, false, `engines "2.5": no such number of engines`},
		{"-1", 0, false, `engines "-1": no such number of engines`},
		{"1e9", 0, false, `engines "1e9": no such number of engines`},
		{"Inf", 0, false, `engines "Inf": no such number of engines`},
		{"0x2", 0, false, `engines "0x2": not a number`},
	}
	for _, test := range tests {
		n, whole, reason := parseEngines(test.cell)
		if n != test.n || reason != test.reason || reason == "" && whole != test.whole {
			t.Errorf("%q: got %d, %v, %q", test.cell, n, whole, reason)
		}
	}
	items, _ := readAll(t, "id,engines\n1,\"2, 2\"\n2,0\n3,2.0\n", Options{})
	if further := items[0].Occurrence.Further; len(further) != 1 || further[0].Engines != 2 {
		t.Errorf("further aircraft %+v", further)
	}
	for i, want := range []string{"", "0", ""} {
		if got := items[i].Occurrence.Extra["engines"]; got != want {
			t.Errorf("row %d keeps %q, want %q", i+1, got, want)
		}
	}
}

func TestDecodeEntities(t *testing.T) {
	tests := []struct{ in, want string }{
		{"a &amp; b", "a & b"},
		{"&amp;lt;", "&lt;"}, // once only
		{"&lt;br&gt;&#233;&#xE9;&nbsp;", "<br>éé\u00a0"},
		{"R&D; P&L, AT&T", "R&D; P&L, AT&T"},
		{"&ampere; &copyleft;", "&ampere; &copyleft;"},
		{"&semi;", ";"},
		{"&#0;&#xD800;", "\uFFFD\uFFFD"},
		{"100% & more", "100% & more"},
	}
	for _, test := range tests {
		if got := decodeEntities(test.in); got != test.want {
			t.Errorf("%q: got %q, want %q", test.in, got, test.want)
		}
	}
	items, _ := readAll(t, `{"id":"1","narrative":"a &amp; b"}`, Options{})
	if got := items[0].Occurrence.Narratives[0].Text; got != "a &amp; b" {
		t.Errorf("JSON text is changed to %q", got)
	}
}

func TestPhases(t *testing.T) {
	for _, c := range []struct {
		cell, code   string
		whole, known bool
	}{
		{"Climb", "ENR", false, true},
		{"ICL", "ICL", true, true},
		{"TAKEOFF GROUND ROLL", "TOF", false, true},
		{"Aproximação final", "APR", false, true},
		{"Descent; Landing", "ENR", false, true},
		{"Towards the moon", "Towards the moon", true, false},
		{"", "", true, true},
	} {
		code, whole, known := phase(c.cell)
		if code != c.code || whole != c.whole || known != c.known {
			t.Errorf("%q: got %q, %v, %v", c.cell, code, whole, known)
		}
	}
}

// The codes are those of the CICTT phase-of-flight taxonomy (CAST/ICAO Common
// Taxonomy Team, Phase of Flight: Definitions and Usage Notes).
func TestPhaseCodesAreCICTT(t *testing.T) {
	want := map[string]bool{"STD": true, "PBT": true, "TXI": true, "TOF": true, "ICL": true, "ENR": true, "MNV": true,
		"APR": true, "LDG": true, "EMG": true, "UND": true, "PIM": true, "UNK": true}
	for words, code := range phaseCodes() {
		if !want[code] {
			t.Errorf("%q has the code %q", words, code)
		}
	}
}

func TestSeveralAircraft(t *testing.T) {
	items, _ := readAll(t, "id,make,model,category,engines,engine type\n"+
		"1,\"Marrow, Quill\",\"Twin 44, Q1\",\"AIR, GLI\",\"2, 0\",\"REC, \"\n"+ // two, all listed
		"2,\"Marrow, Sons & Co\",Twin 44,AIR,2,\"TJ, REC, REC, TJ\"\n"+ // one with a comma in its make
		"3,Marrow,Twin 44,HELI,1,\n", Options{})
	o := items[0].Occurrence
	if o.Make != "Marrow" || o.Model != "Twin 44" || o.Category != "airplane" || o.Engines != 2 || len(o.Further) != 1 {
		t.Fatalf("got %+v", o)
	}
	if a := o.Further[0]; a.Make != "Quill" || a.Model != "Q1" || a.Category != "glider" || a.Engines != 0 {
		t.Errorf("second aircraft %+v", a)
	}
	if o := items[1].Occurrence; o.Make != "Marrow, Sons & Co" || len(o.Further) != 0 || o.EngineType != "TJ, REC, REC, TJ" {
		t.Errorf("got %+v", o)
	}
	if o := items[2].Occurrence; o.Category != "helicopter" {
		t.Errorf("got %+v", o)
	}
	items, _ = readAll(t, "id,Aircraft 1 / Make Model Name,Aircraft 2 / Make Model Name,Aircraft 2 / Mission\n"+
		"1,Small Aircraft; Low Wing; 1 Eng; Fixed Gear,Light Transport; 2 Turboprop Eng,Training\n", Options{})
	o = items[0].Occurrence
	if o.Engines != 1 || len(o.Further) != 1 || o.Further[0].Engines != 2 || o.Further[0].EngineType != "Turboprop" || o.Operation != "" {
		t.Errorf("got %+v", o)
	}
}

func TestInjuryFromCounts(t *testing.T) {
	items, _ := readAll(t, "id,injury severity,fatal injuries,serious injuries,minor injuries\n1,Non-Fatal,0,1,\n2,,0,0,0\n3,,,,\n4,Fatal,0,0,0\n5,,2,0,x\n", Options{})
	for i, want := range []string{"serious", "none", "", "fatal", "fatal"} {
		if got := items[i].Occurrence.Injury; got != want {
			t.Errorf("row %d: %q, want %q", i+1, got, want)
		}
	}
	if items[0].Occurrence.Extra["serious injuries"] != "1" {
		t.Error("the counts are lost")
	}
}
