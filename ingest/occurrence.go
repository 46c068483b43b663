package ingest

import (
	"crypto/sha256"
	"encoding/hex"
	"maps"
	"slices"
	"strings"

	"catena/ingest/corpus"
)

// builder makes one occurrence from one row's cells.
type builder struct {
	m     *mapper
	order string // of dates
	o     corpus.Occurrence
	next  map[string]int // extra name -> number of its next repetition

	city, state, rules, purpose string

	craft   craftCells
	exact   bool // craft holds the record's own keys
	further map[int]*craftCells
	hurt    injuryCounts
}

// occurrence follows the map. The reason tells why the row is set aside
// instead. A source given overrides those that the rows name.
func (m *mapper) occurrence(cells []cell, source string) (*corpus.Occurrence, string) {
	b := builder{m: m, order: m.DateOrder, hurt: injuryCounts{-1, -1, -1}}
	b.o.Narratives = []corpus.Narrative{}
	for _, c := range cells {
		if reason := b.cell(c); reason != "" {
			return nil, reason
		}
	}
	b.join()
	if reason := b.aircraft(); reason != "" {
		return nil, reason
	}
	if b.o.Injury == "" {
		b.o.Injury = b.hurt.worst()
	}
	if b.o.Event == "" {
		b.o.Event = m.event
	}
	if b.o.ID == "" && b.o.Date == (corpus.Date{}) && len(b.o.Narratives) == 0 {
		return nil, "no id, date or narrative"
	}
	if own := b.o.Source; source != "" {
		if b.o.Source = source; own != "" && own != source {
			b.extra("source", own)
		}
	} else if own == "" {
		b.o.Source = m.Name
	}
	if b.o.ID == "" {
		b.o.ID = rowID(&b.o)
	}
	return &b.o, ""
}

// rowID identifies a row that has no id: "row-" and the first 16 hex digits
// of the SHA-256 of its date and its narratives' kinds and texts, each behind
// a zero byte.
func rowID(o *corpus.Occurrence) string {
	h := sha256.New()
	h.Write([]byte(o.Date.String()))
	for _, n := range o.Narratives {
		h.Write([]byte("\x00" + n.Kind + "\x00" + n.Text))
	}
	return "row-" + hex.EncodeToString(h.Sum(nil)[:8])
}

// cell puts one cell where the map says.
func (b *builder) cell(c cell) (reason string) {
	p := plan{field: toExtra}
	if c.column >= 0 {
		p = b.m.plans[c.column]
	}
	if c.parts != nil {
		b.parts(c.parts)
		return ""
	}
	kind, ok := strings.CutPrefix(p.field, narrativeOf)
	if p.field == toNarratives { // not a list, so not among the parts
		kind, ok = b.m.plain, true
	}
	if ok && !c.nested {
		if !placeholder(c.text) {
			b.o.Narratives = append(b.o.Narratives, corpus.Narrative{Kind: kind, Text: c.text})
		}
		return ""
	}
	target := b.field(p.field)
	n, of := splitFurther(p.field)
	switch {
	case p.field == toDropped:
	case c.nested:
		b.extra(c.name, c.text)
	case p.field == "date":
		return b.date(c)
	case craftField(p.field) >= 0:
		b.craft[craftField(p.field)] = c
		b.exact = b.exact || p.exact
	case n > 0:
		if b.further == nil {
			b.further = map[int]*craftCells{}
		}
		if b.further[n] == nil {
			b.further[n] = &craftCells{}
		}
		b.further[n][craftField(of)] = c
	case strings.HasPrefix(p.field, "injured."):
		b.hurt.add(p.field, c.text)
		b.extra(c.name, strings.TrimSpace(c.text))
	case p.field == "phase":
		b.phase(c, p.exact)
	case words[p.field] != nil:
		b.word(p.field, target, c)
	case target != nil && p.exact:
		*target = c.text
	case target == nil: // also a list of the record that is none here
		b.extra(c.name, strings.TrimSpace(c.text))
	case !placeholder(c.text):
		*target = strings.TrimSpace(c.text)
	}
	return ""
}

// field is where a field's text goes, or nil.
func (b *builder) field(name string) *string {
	switch name {
	case "id":
		return &b.o.ID
	case "source":
		return &b.o.Source
	case "place":
		return &b.o.Place
	case toCity:
		return &b.city
	case toState:
		return &b.state
	case "country":
		return &b.o.Country
	case "operation":
		return &b.o.Operation
	case toRules:
		return &b.rules
	case toPurpose:
		return &b.purpose
	case "injury":
		return &b.o.Injury
	case "damage":
		return &b.o.Damage
	case "event":
		return &b.o.Event
	}
	return nil
}

// date reads the date; a day that does not exist sets the row aside.
func (b *builder) date(c cell) (reason string) {
	text := strings.TrimSpace(c.text)
	if placeholder(text) {
		return ""
	}
	d, err := parseDate(text, b.order)
	if err != nil {
		return err.Error()
	}
	b.o.Date = d
	return ""
}

// phase puts the code of the phase; a cell that says more is kept beside it.
// The record's own key is taken as it stands where no code is known for it.
func (b *builder) phase(c cell, exact bool) {
	code, whole, known := phase(c.text)
	switch {
	case exact && (!known || code == strings.TrimSpace(c.text) || placeholder(c.text)):
		b.o.Phase = c.text
		return
	case placeholder(c.text):
		return
	}
	if b.o.Phase = code; !whole {
		b.extra(c.name, strings.TrimSpace(c.text))
	}
	if !known {
		b.m.strange("phase", code)
	}
}

// aircraft puts the aircraft, the first beside the other fields.
func (b *builder) aircraft() (reason string) {
	list, more, reason := b.craft.aircraft(b.exact)
	if reason != "" {
		return reason
	}
	numbers := slices.Sorted(maps.Keys(b.further))
	for _, n := range numbers {
		others, others2, reason := b.further[n].aircraft(false)
		if reason != "" {
			return reason
		}
		for _, a := range others {
			if a != (corpus.Aircraft{}) {
				list = append(list, a)
			}
		}
		more = append(more, others2...)
	}
	b.o.Aircraft = list[0]
	if len(list) > 1 {
		b.o.Further = append(list[1:], b.o.Further...)
	}
	for _, c := range more {
		b.extra(c.name, strings.TrimSpace(c.text))
	}
	return ""
}

// word puts the record's word for the cell; a cell that says more or other
// than the word is kept beside it.
func (b *builder) word(field string, target *string, c cell) {
	w, whole := word(field, c.text)
	if *target = w; !whole && !placeholder(c.text) {
		b.extra(c.name, strings.TrimSpace(c.text))
	}
}

// parts adds the nested values of an occurrence record.
func (b *builder) parts(p *parts) {
	b.o.Narratives = append(b.o.Narratives, p.narratives...)
	b.o.Codes = append(b.o.Codes, p.codes...)
	b.o.Further = append(b.o.Further, p.aircraft...)
	for _, c := range p.extra {
		b.keep(c.name, c.text)
	}
}

// extra keeps a cell that is not blank.
func (b *builder) extra(name, text string) {
	if text != "" {
		b.keep(name, text)
	}
}

// keep adds to Extra, under a numbered name where the name is taken.
func (b *builder) keep(name, text string) {
	if b.o.Extra == nil {
		b.o.Extra = map[string]string{}
	}
	if _, taken := b.o.Extra[name]; taken {
		if b.next == nil {
			b.next = map[string]int{}
		}
		name = unusedName(name, b.o.Extra, b.next)
	}
	b.o.Extra[name] = text
}

// join puts the fields together that several columns make.
func (b *builder) join() {
	b.o.Place = joined(b.o.Place, ", ", b.city, b.state)
	b.o.Operation = joined(b.o.Operation, " ", b.rules, b.purpose)
}

// joined is the whole, or, where none is given, the parts that are.
func joined(whole, separator string, first, second string) string {
	switch {
	case whole != "":
		return whole
	case first == "":
		return second
	case second == "":
		return first
	}
	return first + separator + second
}
