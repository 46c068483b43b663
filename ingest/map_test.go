package ingest

import (
	"fmt"
	"strings"
	"testing"
)

func TestHeaderWords(t *testing.T) {
	tests := []struct{ headers, field string }{
		{"NtsbNo|acn|ACN|Report No.|report #|NTSB_NO|Id", "id"},
		{"event date|EventDate|local_event_date|Occurrence Date|DATE|ev_date", "date"},
		{"ProbableCause|probable cause|narr_cause|Cause", "narrative.cause"},
		{"Narrative|description", "narrative"},
		{"narrative_synopsis|Synopsis|Summary", "narrative.synopsis"},
		{"FactualNarrative|narr_accf", "narrative.factual"},
		{"AnalysisNarrative|Analysis", "narrative.analysis"},
		{"remarks|Comments", "narrative.remarks"},
		{"AirCraftMake|aircraft_make|acft_make|Make|Aircraft Make 1", "make"},
		{"model|acft_model", "model"},
		{"NumberOfEngines|nbr_of_engines|number of engines|num_eng", "engines"},
		{"engine type|EngineType", "engine_type"},
		{"flight phase|BroadPhaseOfFlight", "phase"},
		{"FAR|far part", "operation.rules"},
		{"PurposeOfFlight|Mission", "operation.purpose"},
		{"HighestInjuryLevel|injury severity", "injury"},
		{"AirCraftDamage|damage", "damage"},
		{"EventType|investigation type", "event"},
		{"Country|ev_country", "country"},
		{"City|event_city", "place.city"},
		{"State|event_state", "place.state"},
		{"Location", "place"},
		{"colour||Engine Make|aircraft_engine_make|Latitude", ""},
	}
	for _, test := range tests {
		for _, h := range strings.Split(test.headers, "|") {
			if got, _ := lookupHeader(h); got != test.field {
				t.Errorf("%q: got %q, want %q", h, got, test.field)
			}
		}
	}
}

// Each line of the table names a field that there is, and no header twice.
func TestHeaderTable(t *testing.T) {
	fields := map[string]bool{toCity: true, toState: true, toRules: true, toPurpose: true, toNarrative: true}
	for _, f := range recordFields {
		fields[f] = true
	}
	for _, kind := range narrativeKinds {
		fields[narrativeOf+kind] = true
	}
	for _, f := range countFields {
		fields[f] = true
	}
	seen := map[string]string{}
	for i, line := range strings.Split(strings.TrimSpace(headersCSV), "\n")[1:] {
		words, field, ok := strings.Cut(strings.TrimSuffix(line, "?"), ",")
		if !ok || !fields[field] {
			t.Errorf("line %d: no such field %q", i+2, field)
		}
		if before := seen[squeeze(words)]; before != "" {
			t.Errorf("line %d: %q stands above as %q", i+2, words, before)
		}
		seen[squeeze(words)] = words
	}
	for key, field := range recordKeys {
		if own, _ := lookupHeader(key); field == key && own != key && key != toNarratives && key != toCodes && key != toAircraft && key != toExtra {
			t.Errorf("the record's key %q is no header of its own field", key)
		}
	}
}

func TestMapOfATable(t *testing.T) {
	text := "City,NtsbNo,State,EventDate,ProbableCause,Narrative,FAR,PurposeOfFlight,ReportNo,Weather,Damage\n" +
		"Ostrava Vale,W1,Norland,2019-03-02,Ice.,Iced up.,091,PERS,77,fog,Subs\n" +
		",W2,Norland,2019-03-02,N/A,,,INST,NULL,,Unknown\n" +
		"Ostrava Vale,W3,,2019-03-02,\"UNDETERMINED.\",,091,UNK,, ,crumpled\n"
	items, m := readAll(t, text, Options{})
	var got strings.Builder
	for _, r := range m.Describe() {
		fmt.Fprintln(&got, strings.Join(r[:], "|"))
	}
	want := `City|place|joined with the state, if any
NtsbNo|id|
State|place|behind the city
EventDate|date|
ProbableCause|narrative.cause|
Narrative|narrative.factual|
FAR|operation|joined with the purpose, if any
PurposeOfFlight|operation|behind the rules of flight
ReportNo|extra|id is read from column "NtsbNo"
Weather|extra|no field is known by this name
Damage|damage|
`
	if got.String() != want {
		t.Errorf("map:\n%swant\n%s", got.String(), want)
	}
	for i, want := range []string{
		"Ostrava Vale, Norland|091 PERS|substantial|[{cause Ice.} {factual Iced up.}]|map[ReportNo:77 Weather:fog]",
		"Norland|INST||[]|map[ReportNo:NULL]",
		"Ostrava Vale|091||[]|map[Damage:crumpled]",
	} {
		o := items[i].Occurrence
		if got := fmt.Sprintf("%s|%s|%s|%v|%v", o.Place, o.Operation, o.Damage, o.Narratives, o.Extra); got != want {
			t.Errorf("row %d:\n got %s\nwant %s", i+1, got, want)
		}
	}
}

func TestWholePlaceAndOperationOverParts(t *testing.T) {
	items, _ := readAll(t, "id,City,Location,FAR,Operation\n1,Vell,Vell field,091,survey\n", Options{})
	o := items[0].Occurrence
	if o.Place != "Vell field" || o.Operation != "survey" || fmt.Sprint(o.Extra) != "map[City:Vell FAR:091]" {
		t.Errorf("got %+v", o)
	}
}

func TestWordsThatYield(t *testing.T) {
	items, _ := readAll(t, "Report No,Report Date,Event Date,Accident Number,Aircraft,Make\n7,2020,2019,A1,Zephyrine 2,Zephyrine\n", Options{})
	o := items[0].Occurrence
	if o.ID != "A1" || o.Date.String() != "2019" || o.Make != "Zephyrine" || fmt.Sprint(o.Extra) != "map[Aircraft:Zephyrine 2 Report Date:2020 Report No:7]" {
		t.Errorf("got %+v", o)
	}
	items, _ = readAll(t, "Report No,Report Date,Aircraft\n7,2020,Zephyrine 2\n", Options{})
	if o := items[0].Occurrence; o.ID != "7" || o.Date.String() != "2020" || o.Make != "Zephyrine 2" {
		t.Errorf("for want of others: %+v", o)
	}
}

func TestSourceNames(t *testing.T) {
	name := func(text string) string {
		items, _ := readAll(t, text, Options{})
		return items[0].Occurrence.Source
	}
	table := name("EventDate,NtsbNo\n2019,1\n")
	if !strings.HasPrefix(table, "csv-") || len(table) != len("csv-123456") {
		t.Errorf("table: %q", table)
	}
	if other := name("ntsb no;event_date\n1;2019\n"); other != table {
		t.Errorf("the same columns in another order are %q, not %q", other, table)
	}
	if other := name("EventDate,NtsbNo,Make\n2019,1,x\n"); other == table {
		t.Errorf("other columns are %q too", other)
	}
	if got := name(`{"EventDate":"2019","NtsbNo":"1"}`); got != "json"+table[3:] {
		t.Errorf("the same keys in JSON are %q, want json%s", got, table[3:])
	}
	if got := name(`{"id":"1","narrative":"x","weather":"fog"}`); got != "records" {
		t.Errorf("records: %q", got)
	}
	if got := name(`{"id":"1","source":"hangar"}`); got != "hangar" {
		t.Errorf("own source: %q", got)
	}
	items, _ := readAll(t, `{"id":"1","source":"hangar"}`, Options{Source: "told"})
	if o := items[0].Occurrence; o.Source != "told" || o.Extra["source"] != "hangar" {
		t.Errorf("told source: %+v", o)
	}
}

func TestRowWithoutID(t *testing.T) {
	id := func(row string) string {
		items, _ := readAll(t, "date,narrative,make\n"+row+"\n", Options{})
		return items[0].Occurrence.ID
	}
	a := id("2019,Bounced.,x")
	// printf '2019\0factual\0Bounced.' | sha256sum
	if want := "row-d08847ab27944b2f"; a != want {
		t.Errorf("got %s, want %s", a, want)
	}
	if id("2019,Bounced.,y") != a {
		t.Error("another make makes another id")
	}
	if id("2020,Bounced.,x") == a || id("2019,Bounced,x") == a {
		t.Error("another date or narrative makes no other id")
	}
}

func TestVoluntaryReportsAreTheReporters(t *testing.T) {
	items, _ := readAll(t, "ACN,Date,Narrative,Synopsis\n99,201903,I stalled.,A stall.\n", Options{})
	if got := fmt.Sprint(items[0].Occurrence.Narratives, items[0].Occurrence.Date); got != "[{reporter I stalled.} {synopsis A stall.}] 2019-03" {
		t.Errorf("got %s", got)
	}
}
