package ingest

import (
	"regexp"
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// The fields of an aircraft, in the order of craftCells.
var craftFields = []string{"make", "model", "category", "engines", "engine_type"}

// craftCells are the cells that describe one or several aircraft, as read.
type craftCells [5]cell

// craftField is the index of a field in craftFields, or -1.
func craftField(field string) int {
	for i, f := range craftFields {
		if f == field {
			return i
		}
	}
	return -1
}

// furtherAircraft is the header of a further aircraft's column, as in
// "Aircraft 2 / Make Model Name".
var furtherAircraft = regexp.MustCompile(`^(?:aircraft|acft)([2-9])(.+)$`)

// furtherField is the field of a further aircraft's column, such as
// "aircraft2.make", or "". What is told of the first aircraft is also told of
// the others, in the same words.
func furtherField(squeezed string) string {
	m := furtherAircraft.FindStringSubmatch(squeezed)
	if m == nil {
		return ""
	}
	for _, prefix := range []string{"aircraft1", "aircraft", ""} {
		field := strings.TrimSuffix(headerFields()[prefix+m[2]], "?")
		if craftField(field) >= 0 {
			return "aircraft" + m[1] + "." + field
		}
	}
	return ""
}

// splitFurther cuts "aircraft2.make" into 2 and "make"; 0 for any other field.
func splitFurther(field string) (n int, of string) {
	rest, ok := strings.CutPrefix(field, "aircraft")
	if !ok || len(rest) < 3 || rest[1] != '.' || rest[0] < '2' || rest[0] > '9' {
		return 0, ""
	}
	return int(rest[0] - '0'), rest[2:]
}

// aircraft reads the cells of one or several aircraft. They are several where
// the numbers of engines or the categories are a list in which each part is
// good; a make or model of as many parts is then a list too. Cells that say
// more than the fields hold come back in more; the reason tells of a number
// of engines that is none. With exact, the cells are the record's own keys:
// their texts are taken as they stand.
func (c *craftCells) aircraft(exact bool) (list []corpus.Aircraft, more []cell, reason string) {
	n := max(c.count(3, goodEngines), c.count(2, goodCategory), 1)
	list = make([]corpus.Aircraft, n)
	for i, field := range craftFields {
		text := strings.TrimSpace(c[i].text)
		if exact && n == 1 && field != "engines" {
			setCraft(&list[0], field, c[i].text)
			continue
		}
		if placeholder(text) {
			if field == "engines" && text != "" && strings.Trim(text, "0") == "" {
				more = append(more, c[i])
			}
			continue
		}
		parts := []string{text}
		if n > 1 {
			if several := listed(text); len(several) == n {
				parts = several
			}
		}
		for k, part := range parts {
			part = strings.TrimSpace(part)
			if placeholder(part) {
				continue
			}
			if field != "engines" {
				setCraft(&list[k], field, part)
				continue
			}
			count, whole, bad := parseEngines(part)
			if bad != "" {
				return nil, nil, bad
			}
			list[k].Engines = count
			if !whole || count == 0 {
				more = append(more, c[i])
			}
		}
	}
	for i := range list {
		fillFromName(&list[i])
	}
	return list, more, ""
}

// setCraft puts a text into one of the fields that hold text.
func setCraft(a *corpus.Aircraft, field, text string) {
	switch field {
	case "make":
		a.Make = text
	case "model":
		a.Model = text
	case "category":
		a.Category = category(text)
	case "engine_type":
		a.EngineType = text
	}
}

// count is how many aircraft a cell lists; 0 unless each part is good and at
// least one says something.
func (c *craftCells) count(i int, good func(string) bool) int {
	parts := listed(c[i].text)
	if len(parts) < 2 || len(parts) > 9 {
		return 0
	}
	said := false
	for _, p := range parts {
		if placeholder(p) {
			continue
		}
		if said = true; !good(p) {
			return 0
		}
	}
	if !said {
		return 0
	}
	return len(parts)
}

func goodEngines(text string) bool {
	_, whole, reason := parseEngines(text)
	return whole && reason == ""
}

func goodCategory(text string) bool { return categories[squeeze(text)] != "" }

// category is the record's word for a kind of aircraft, or the text itself.
func category(text string) string {
	if word := categories[squeeze(text)]; word != "" {
		return word
	}
	return text
}

// enginesInName is how some publishers hide a type: "Small Aircraft; Low Wing;
// 1 Eng; Fixed Gear", "Light Transport; Low Wing; 2 Turboprop Eng".
var enginesInName = regexp.MustCompile(`(?i)\b([1-8]) (?:(recip|reciprocating|piston|turbo ?prop|turbo ?jet|turbo ?fan|turbo ?shaft|jet) )?eng(?:ine)?s?\b`)

// fillFromName fills in what is not known from a type that describes itself.
func fillFromName(a *corpus.Aircraft) {
	name := a.Make + "; " + a.Model
	if m := enginesInName.FindStringSubmatch(name); m != nil {
		if a.Engines == 0 {
			a.Engines, _ = strconv.Atoi(m[1]) // one digit
		}
		if a.EngineType == "" {
			a.EngineType = m[2]
		}
	}
	if a.Category == "" && strings.Contains(strings.ToLower(name), "helicopter") {
		a.Category = "helicopter"
	}
}

// injuryCounts are the numbers of people hurt, from the gravest on; -1 where
// not told.
type injuryCounts [3]int

// the fields of columns that count people hurt, gravest first as in severity
var countFields = []string{"injured.fatal", "injured.serious", "injured.minor"}

// add takes a cell of a column that counts; what is no number says nothing.
func (c *injuryCounts) add(field, text string) {
	for i, f := range countFields {
		if n, err := strconv.ParseFloat(strings.TrimSpace(text), 64); f == field && err == nil && n >= 0 {
			c[i] = int(min(n, 1e6))
		}
	}
}

// worst is the gravest injury that the counts tell, and "none" only where all
// of them are told to be zero.
func (c injuryCounts) worst() string {
	told := 0
	for i, n := range c {
		if n > 0 {
			return severity["injury"][i]
		}
		if n == 0 {
			told++
		}
	}
	if told == len(c) {
		return "none"
	}
	return ""
}
