package ingest

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"slices"
	"strings"
)

// Map says what each column of a file is taken for.
type Map struct {
	// Name names the source of the occurrences that do not name their own:
	// "records" for the occurrence record, else the format and a hash of the
	// header, such as "csv-1a2b3c", so that a renamed file is no new source.
	Name string

	// Columns stand in the order of the file. A JSON file may bring new ones
	// with any row; they are added as they come.
	Columns []ColumnMap

	// Told says that a person wrote the map.
	Told bool

	// DateOrder is how dates of three numbers are read: dmy, mdy or ymd, and
	// "" where the file needs no order.
	DateOrder string
}

// ColumnMap is one column's place in the occurrence. Columns that share the
// field place or operation are joined; those of one narrative kind stay
// narratives of their own.
type ColumnMap struct {
	Column string // its header; a repeated header is numbered, as in "Place (2)"
	Field  string // a key of the occurrence record, "narrative.cause" and so on, "extra", or "dropped"
	Note   string // what a person should know about it; "" for nothing
}

// Describe returns one row of column, field and note for each column.
func (m *Map) Describe() [][3]string {
	rows := make([][3]string, len(m.Columns))
	for i, c := range m.Columns {
		rows[i] = [3]string{c.Column, c.Field, c.Note}
	}
	return rows
}

// recordFields are the keys of the occurrence record that hold one value.
var recordFields = []string{"id", "source", "date", "place", "country", "make", "model", "category",
	"engines", "engine_type", "operation", "phase", "injury", "damage", "event"}

// Fields of the record that a map can only find under their own names.
const (
	toNarratives = "narratives"
	toCodes      = "codes"
	toAircraft   = "aircraft"
	toDropped    = "dropped"
)

// recordKeys are all the keys of the record: key -> field. Those that are
// recomputed on loading are dropped.
var recordKeys = func() map[string]string {
	keys := map[string]string{
		"narratives": toNarratives, "codes": toCodes, "aircraft": toAircraft, "extra": toExtra, "narrative": toNarrative,
		"tags": toDropped, "chain": toDropped, "rulebook": toDropped,
	}
	for _, f := range recordFields {
		keys[f] = f
	}
	return keys
}()

// mapper holds a map and what is needed to extend and follow it.
type mapper struct {
	Map
	format string
	plans  []plan            // one for each column
	taken  map[string]string // field -> the column that has it, known before it is mapped
	// record tells that the file holds occurrence records, so that tags and
	// the like are the program's own.
	record bool
	place  bool // a column names the whole place
	whole  bool // a column names the whole operation
	plain  string
	event  string // the kind of event where the rows do not say
	shared map[string]string
	told   *MapFile

	unknown map[string]map[string]int // field -> words that are no words of the record -> how often
}

// plan is what to do with a column's cells.
type plan struct {
	field string // with parts told apart, as in headers.csv
	exact bool   // a key of the record in JSON, taken as it stands

	yields bool // leaves the field to any other column that means it
}

// newMapper maps the columns by their headers alone. In JSON the keys of the
// record come before other words for the same field; else the first column
// that means a field has it, before those that yield.
//
// Columns among shared are extra, with the note given there.
func newMapper(format string, names []string, shared map[string]string) *mapper {
	return mapWith(format, names, shared, nil)
}

// mapWith is newMapper with a person's map over it.
func mapWith(format string, names []string, shared map[string]string, told *MapFile) *mapper {
	m := &mapper{format: format, taken: map[string]string{}, plain: plainKind, shared: shared, told: told}
	if format == "text" {
		m.plain, m.event = "reporter", "report"
	}
	for _, name := range names {
		p := m.meaning(name)
		m.place = m.place || p.field == "place"
		m.whole = m.whole || p.field == "operation"
		m.record = m.record || format == "json" && name == "narratives"
		if squeeze(name) == "acn" { // the reports of the voluntary system that has these numbers
			m.plain, m.event = "reporter", "report"
		}
		if p.exact {
			m.taken[p.field] = name
		}
	}
	for _, name := range names {
		if p := m.meaning(name); !p.yields && m.taken[p.field] == "" {
			m.taken[p.field] = name
		}
	}
	m.extend(names)
	m.Name = m.sourceName(names)
	if m.Told = told != nil; m.Told && told.Source != "" {
		m.Name = told.Source
	}
	return m
}

// meaning is what a header says by itself.
func (m *mapper) meaning(name string) plan {
	if m.told != nil {
		if field := m.told.fields[name]; field == toNarrative {
			return plan{field: narrativeOf + m.plain}
		} else if field != "" {
			return plan{field: field}
		}
		return plan{field: toExtra}
	}
	if m.shared[name] != "" {
		return plan{field: toExtra}
	}
	if field := recordKeys[name]; field != "" && m.format == "json" {
		return plan{field: field, exact: true}
	}
	if field, yields := lookupHeader(name); field != "" {
		return plan{field: field, yields: yields}
	}
	return plan{field: toExtra}
}

// extend maps the columns that are not mapped yet.
func (m *mapper) extend(names []string) {
	for _, name := range names[len(m.plans):] {
		p := m.meaning(name)
		note := m.shared[name]
		switch owner := m.taken[p.field]; {
		case p.field == toDropped && !m.record:
			p = plan{field: toExtra}
		case p.field == toDropped:
			note = "computed anew on loading"
		case p.field == toExtra && (note != "" || m.told != nil):
		case p.field == toExtra && !p.exact:
			note = "no field is known by this name"
		case p.field == toNarrative:
			p.field = narrativeOf + m.plain
		case strings.HasPrefix(p.field, narrativeOf) || p.field == toExtra:
		case owner != "" && owner != name:
			note = fmt.Sprintf("%s is read from column %q", shown(p.field), owner)
			p = plan{field: toExtra}
		case (p.field == toCity || p.field == toState) && m.place,
			(p.field == toRules || p.field == toPurpose) && m.whole:
			note = fmt.Sprintf("%s is read from another column", shown(p.field))
			p = plan{field: toExtra}
		default:
			m.taken[p.field] = name
			note = joinedNotes[p.field]
		}
		m.plans = append(m.plans, p)
		m.Columns = append(m.Columns, ColumnMap{name, shown(p.field), note})
	}
}

// assign gives a column that is extra a field.
func (m *mapper) assign(column int, field, note string) {
	m.plans[column] = plan{field: field}
	m.taken[field] = m.Columns[column].Column
	m.Columns[column].Field, m.Columns[column].Note = shown(field), note
}

// joinedNotes tell of the fields that several columns make together.
var joinedNotes = map[string]string{
	toCity:    "joined with the state, if any",
	toState:   "behind the city",
	toRules:   "joined with the purpose, if any",
	toPurpose: "behind the rules of flight",
}

// shown is the field as the record has it.
func shown(field string) string {
	switch field {
	case toCity, toState:
		return "place"
	case toRules, toPurpose:
		return "operation"
	}
	return field
}

// strange counts a word that is kept as it is.
func (m *mapper) strange(field, word string) {
	if m.unknown == nil {
		m.unknown = map[string]map[string]int{}
	}
	if m.unknown[field] == nil {
		m.unknown[field] = map[string]int{}
	}
	if n, seen := m.unknown[field][word]; seen || len(m.unknown[field]) < maxStrange {
		m.unknown[field][word] = n + 1
	}
}

// maxStrange bounds the words that are remembered.
const maxStrange = 1000

// known tells whether any column can make a row usable.
func (m *mapper) known() bool {
	for _, p := range m.plans {
		if p.field == "id" || p.field == "date" || p.field == toNarratives || strings.HasPrefix(p.field, narrativeOf) {
			return true
		}
	}
	return false
}

// dateColumn is the index of the column that holds the date, or -1.
func (m *mapper) dateColumn() int {
	return slices.IndexFunc(m.plans, func(p plan) bool { return p.field == "date" })
}

// sourceName names the source after the header. Records whose fields all go
// by the record's own keys are "records", with whatever extra keys.
func (m *mapper) sourceName(names []string) string {
	if m.format == "text" { // whatever each of them has in its head
		return "own-reports"
	}
	narrated, foreign := false, false
	words := make([]string, len(names))
	for i, name := range names {
		words[i] = squeeze(name)
		if _, own := recordKeys[name]; !own {
			foreign = foreign || m.plans[i].field != toExtra
		} else if name == "narrative" || name == "narratives" {
			narrated = true
		}
	}
	if narrated && !foreign {
		return "records"
	}
	slices.Sort(words)
	sum := sha256.Sum256([]byte(strings.Join(words, "\n")))
	return m.format + "-" + hex.EncodeToString(sum[:3])
}
