package filter

import (
	"slices"
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// fieldNames are the fields that can be asked for, beside extra.NAME.
var fieldNames = []string{
	"id", "source", "date", "year", "month", "place", "country", "make", "model", "category", "engines", "engine_type",
	"operation", "phase", "injury", "damage", "event",
}

// FieldNames lists the fields of the language, without extra.NAME.
func FieldNames() []string { return slices.Clone(fieldNames) }

// Field is the value of a field of an occurrence as text, "" where it is not
// known. Year and month are those of the date (month as 2019-03).
func Field(o *corpus.Occurrence, name string) string {
	switch name {
	case "id":
		return o.ID
	case "date":
		return o.Date.String()
	case "year":
		s, _ := o.Date.Period(corpus.ByYear)
		return s
	case "month":
		s, _ := o.Date.Period(corpus.ByMonth)
		return s
	case "engines":
		if o.Engines == 0 {
			return ""
		}
		return strconv.Itoa(o.Engines)
	}
	if p := pointer(o, name); p != nil {
		return *p
	}
	if key, ok := strings.CutPrefix(name, "extra."); ok {
		return o.Extra[key]
	}
	return ""
}

// SetField sets a field from text; a field that holds no text (date, engines
// that are no number) stays as it is.
func SetField(o *corpus.Occurrence, name, value string) {
	if p := pointer(o, name); p != nil {
		*p = value
	} else if n, err := strconv.Atoi(value); name == "engines" && err == nil {
		o.Engines = n
	}
}

// pointer finds the fields that are plain text.
func pointer(o *corpus.Occurrence, name string) *string {
	switch name {
	case "source":
		return &o.Source
	case "place":
		return &o.Place
	case "country":
		return &o.Country
	case "make":
		return &o.Make
	case "model":
		return &o.Model
	case "category":
		return &o.Category
	case "engine_type":
		return &o.EngineType
	case "operation":
		return &o.Operation
	case "phase":
		return &o.Phase
	case "injury":
		return &o.Injury
	case "damage":
		return &o.Damage
	case "event":
		return &o.Event
	}
	return nil
}
