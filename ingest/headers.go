package ingest

import (
	_ "embed"
	"regexp"
	"strings"
	"sync"
	"unicode"
)

//go:embed headers.csv
var headersCSV string

// The fields that a column can have in headers.csv, beside those of the
// occurrence record: parts that are joined, and a narrative whose kind depends
// on the other columns.
const (
	toCity      = "place.city"
	toState     = "place.state"
	toRules     = "operation.rules"
	toPurpose   = "operation.purpose"
	toNarrative = "narrative"
	toExtra     = "extra"
	narrativeOf = "narrative." // with the kind behind it
)

// headerFields is the table of the trade's usual header words (common
// practice, no source): squeezed words -> field. A question mark behind the
// field marks words that mean it only where no other column does: a report's
// date is the event's only for want of another.
var headerFields = sync.OnceValue(func() map[string]string {
	fields := map[string]string{}
	for _, line := range strings.Split(headersCSV, "\n")[1:] {
		if words, field, ok := strings.Cut(strings.TrimSpace(line), ","); ok {
			fields[squeeze(words)] = field
		}
	}
	return fields
})

// squeeze reduces a header to what its spellings have in common: letters and
// digits in lower case, so that "EventDate", "event_date" and "Event date" are
// one. A number sign counts as "no".
func squeeze(header string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsLetter(r) || unicode.IsDigit(r) {
			return unicode.ToLower(r)
		}
		return -1
	}, strings.ReplaceAll(header, "#", "no"))
}

// repeatNumber is the number of a repeated column.
var repeatNumber = regexp.MustCompile(` \(\d+\)$`)

// lookupHeader is the field of a header, or "", and whether it yields to any
// other column. Where columns are numbered, the first is the one meant.
func lookupHeader(header string) (field string, yields bool) {
	word := squeeze(repeatNumber.ReplaceAllString(header, ""))
	field = headerFields()[word]
	if field == "" {
		field = headerFields()[strings.TrimSuffix(word, "1")]
	}
	if field == "" {
		field = furtherField(word)
	}
	return strings.CutSuffix(field, "?")
}

// plainKind is the kind of a narrative that does not say.
const plainKind = "factual"

// narrativeKinds are the kinds of the occurrence record.
var narrativeKinds = []string{"synopsis", "factual", "analysis", "cause", "reporter", "remarks"}

// narrativeKind is the kind that a record's word means; a word that is not
// known means remarks.
func narrativeKind(word string) string {
	for _, kind := range narrativeKinds {
		if word == kind {
			return kind
		}
	}
	field, _ := lookupHeader(word)
	if kind, ok := strings.CutPrefix(field, narrativeOf); ok {
		return kind
	}
	if word == "" || field == toNarrative {
		return plainKind
	}
	return "remarks"
}
