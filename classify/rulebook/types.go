package rulebook

import (
	"slices"
	"strings"
)

// AircraftType is what the table of types knows of an aircraft: the record's
// own number of engines is often wrong in published data.
type AircraftType struct {
	Name    string // as the table writes it
	Engines int    // 0 for a glider
	Place   string // "wings", "centre line" or "other" (pushed by one, pulled by the other, or unlike: no dead side is known)
	Kind    string // "airplane", "rotorcraft" or "glider"
}

// typesYAML is one entry of the section "aircraft types".
type typesYAML struct {
	Types   []located `yaml:"types"`
	Engines int       `yaml:"engines"`
	Place   string    `yaml:"place"`
	Kind    string    `yaml:"kind"`
}

// typeKey is how a type is looked up: letters and digits of the model, of
// which a record's may say more, and the first word of the make, "" for any.
type typeKey struct {
	make, model string
	is          AircraftType
}

// Type finds what is known of an aircraft by its make and model; the entry
// with the longest model wins, of those the later one.
func (b *Book) Type(make, model string) (AircraftType, bool) {
	first, rest, _ := strings.Cut(strings.TrimSpace(make), " ")
	// "Aero Commander" "500", "Cessna 310" "": some write part of the model there
	models := [2]string{model, rest + " " + model}
	first = plainType(first)
	if strings.TrimSpace(models[1]) == "" {
		models[1], first = make, ""
	}
	found, length := AircraftType{}, 0
	for _, k := range b.types {
		if len(k.model) < length || !beginsType(models[0], k.model) && !beginsType(models[1], k.model) || k.make != "" && !sameMake(first, k.make) {
			continue
		}
		found, length = k.is, len(k.model)
	}
	return found, length > 0
}

// beginsType tells whether a model begins with the letters and digits of one
// of the table, and does not go on with another digit of the same number:
// PA-34-200 is a PA-34, and no PA-3.
func beginsType(model, of string) bool {
	n := 0
	for i := range len(model) {
		c := model[i]
		if 'A' <= c && c <= 'Z' {
			c += 'a' - 'A'
		}
		switch {
		case n == len(of):
			return !isDigit(of[n-1]) || !isDigit(c)
		case c == of[n]:
			n++
		case 'a' <= c && c <= 'z' || isDigit(c):
			return false
		}
	}
	return n == len(of)
}

// sameMake takes shortened makes for the same: BEECH and BEECHCRAFT.
func sameMake(a, b string) bool {
	return a == b || min(len(a), len(b)) >= 4 && (strings.HasPrefix(a, b) || strings.HasPrefix(b, a))
}

func isDigit(c byte) bool { return '0' <= c && c <= '9' }

// plainType keeps letters and digits, in lower case.
func plainType(s string) string {
	return strings.Map(func(c rune) rune {
		switch {
		case 'A' <= c && c <= 'Z':
			return c + 'a' - 'A'
		case 'a' <= c && c <= 'z' || '0' <= c && c <= '9':
			return c
		}
		return -1
	}, s)
}

// aircraftTypes adds the types of a file.
func (l *loader) aircraftTypes(file string, entries []typesYAML) {
	for _, y := range entries {
		line := 1
		if len(y.Types) > 0 {
			line = y.Types[0].line
		}
		if y.Kind == "" {
			y.Kind = "airplane"
		}
		if y.Place == "" {
			y.Place = "wings"
		}
		switch {
		case len(y.Types) == 0:
			l.fault(file, line, "aircraft types: an entry without types")
		case !slices.Contains([]string{"airplane", "rotorcraft", "glider"}, y.Kind):
			l.fault(file, line, "aircraft types: no kind is called %q; want airplane, rotorcraft or glider", y.Kind)
		case !slices.Contains([]string{"wings", "centre line", "other"}, y.Place):
			l.fault(file, line, "aircraft types: no place is called %q; want wings, centre line or other", y.Place)
		case y.Engines < 0 || y.Engines > 12 || y.Engines == 0 && y.Kind == "airplane":
			l.fault(file, line, "aircraft types: %d engines", y.Engines)
		}
		for _, t := range y.Types {
			k := typeKey{is: AircraftType{t.text, y.Engines, y.Place, y.Kind}}
			first, rest, _ := strings.Cut(strings.TrimSpace(t.text), " ")
			if strings.ContainsAny(first, "0123456789") || rest == "" {
				k.model = plainType(t.text)
			} else {
				k.make, k.model = plainType(first), plainType(rest)
			}
			if k.model == "" {
				l.fault(file, t.line, "aircraft types: %q names no type", t.text)
				continue
			}
			l.book.types = append(l.book.types, k)
		}
	}
}
