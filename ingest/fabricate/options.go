package fabricate

import (
	"errors"
	"fmt"
	"strings"

	"catena/ingest/corpus"
)

// Options say what to make. The zero value makes an endless corpus of the
// whole invented scenario, January 2019 to December 2025.
type Options struct {
	Seed  uint64
	Count int // occurrences to make; 0 is endless, with dates in no order

	// From and To bound the dates; both may be coarse. The zero Dates are
	// January 2019 and December 2025.
	From, To corpus.Date

	// MeanBytes is the mean length of an occurrence's narratives together, in
	// bytes; 0 leaves each voice its natural length. Below some 400 and above
	// some 3,500 the store of sentences does not allow it.
	MeanBytes int

	// Doubles is the share, in [0, 0.5], of occurrences that tell an earlier
	// one again, from another source and in other words.
	Doubles float64

	// Edited is the share, in [0, 1], of the doubles that copy the earlier text
	// with edited wording instead.
	Edited float64

	// Shifts change the mix of events over time, so that there is a trend to
	// be found. Nil means DefaultShifts; an empty list means none.
	Shifts []Shift

	// IDs is the kind of id to give; the zero value is RunningIDs.
	IDs IDs
}

// IDs is a kind of occurrence id.
type IDs string

// RunningIDs count over the whole corpus, as in F-000001. ScenarioIDs are
// those of the invented files, as in T20-201: they count per source and year,
// from 201 on, so that they leave room for occurrences written by hand.
const (
	RunningIDs  IDs = "running"
	ScenarioIDs IDs = "scenario"
)

// Shift multiplies the weight of an event in a part of the scenario.
type Shift struct {
	Event    string // an event's name, see Events; empty for all
	Place    string // a base's name; empty for all
	From, To corpus.Date
	Times    float64 // 0 removes the event, 2 doubles it
}

// DefaultShifts plant two trends: from 2023 on, events that begin with an
// omitted check grow more frequent at Sellow, a little more each year; and at
// Tarnwick simulated failures that went wrong grow rarer from 2022 on.
func DefaultShifts() []Shift {
	var out []Shift
	for i, times := range []float64{3.5, 5, 6.5} {
		year := corpus.Date{Year: 2023 + i}
		for _, name := range []string{"gear-not-lowered", "gear-caught-late", "tank-not-changed", "tank-run-dry", "rollback-rejected", "rollback-held"} {
			out = append(out, Shift{Event: name, Place: "Sellow", From: year, To: year, Times: times})
		}
	}
	for _, name := range []string{"simulated-lost", "simulated-recovered"} {
		out = append(out, Shift{Event: name, Place: "Tarnwick", From: corpus.Date{Year: 2022}, To: corpus.Date{Year: 9999}, Times: 0.6})
	}
	return out
}

// Events are the names of the events that a Shift can name, in order of the
// mix.
func Events() []string {
	out := make([]string, len(events))
	for i := range events {
		out[i] = events[i].name
	}
	return out
}

// Check returns an error that says what New could not use as it stands.
func (o Options) Check() error {
	var faults []error
	fault := func(format string, args ...any) { faults = append(faults, fmt.Errorf(format, args...)) }
	if o.Count < 0 {
		fault("count %d: want 0 (endless) or more", o.Count)
	}
	if o.MeanBytes < 0 {
		fault("mean length %d: want 0 (natural) or more bytes", o.MeanBytes)
	}
	if !(o.Doubles >= 0 && o.Doubles <= 0.5) {
		fault("share of doubles %v: want 0 to 0.5", o.Doubles)
	}
	if !(o.Edited >= 0 && o.Edited <= 1) {
		fault("share of edited doubles %v: want 0 to 1", o.Edited)
	}
	if o.IDs != "" && o.IDs != RunningIDs && o.IDs != ScenarioIDs {
		fault("ids %q: want %s or %s", o.IDs, RunningIDs, ScenarioIDs)
	}
	if err := errors.Join(o.From.Check(), o.To.Check()); err != nil {
		fault("dates: %w", err)
	} else if d := o.withDefaults(); d.From.Compare(d.To) > 0 {
		fault("dates: %s comes after %s", d.From, d.To)
	}
	for _, s := range o.Shifts {
		if err := s.check(); err != nil {
			fault("shift: %w", err)
		}
	}
	return errors.Join(faults...)
}

func (s Shift) check() error {
	known := s.Event == ""
	for i := range events {
		known = known || events[i].name == s.Event
	}
	if !known {
		return fmt.Errorf("no event %q; there are %s", s.Event, strings.Join(Events(), ", "))
	}
	known = s.Place == ""
	for _, b := range bases {
		known = known || b.name == s.Place
	}
	if !known {
		return fmt.Errorf("no base %q", s.Place)
	}
	if !(s.Times >= 0 && s.Times <= 1000) {
		return fmt.Errorf("factor %v: want 0 to 1000", s.Times)
	}
	return errors.Join(s.From.Check(), s.To.Check())
}

// withDefaults fills in what is not given and replaces what cannot be used.
// From and To become first and last days.
func (o Options) withDefaults() Options {
	if o.From.Check() != nil || o.From.Year == 0 {
		o.From = corpus.Date{Year: 2019}
	}
	if o.To.Check() != nil || o.To.Year == 0 {
		o.To = corpus.Date{Year: max(2025, o.From.Year)}
	}
	o.From, _ = o.From.Bounds()
	_, o.To = o.To.Bounds()
	o.Count = max(o.Count, 0)
	o.MeanBytes = max(o.MeanBytes, 0)
	if !(o.Doubles >= 0) {
		o.Doubles = 0
	}
	o.Doubles = min(o.Doubles, 0.5)
	if !(o.Edited >= 0) {
		o.Edited = 0
	}
	if o.Shifts == nil {
		o.Shifts = DefaultShifts()
	}
	if o.IDs != ScenarioIDs {
		o.IDs = RunningIDs
	}
	return o
}
