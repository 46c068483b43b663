package text

import (
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// Measure is a number of a text with what it measures.
type Measure struct {
	Kind        string  // airspeed, height, bank ...; see kinds in unitOf and context
	Value       float64 // in Unit
	Unit        string  // the canonical unit of the kind: kt, ft, deg, %, rpm, lb, s ...
	Told        string  // the unit as it was told, in its usual short form: kt, mph, km/h, m ...
	Token       int     // the token of the number
	corpus.Span         // number and unit
}

// unit is a unit of measure as texts write it. Factors are exact by
// definition: the international knot, foot, mile and pound (NIST Special
// Publication 811, appendix B; from memory).
type unit struct {
	short  string  // as Measure.Told has it
	kind   string  // what it measures unless the words around say otherwise
	to     string  // the canonical unit
	factor float64 // canonical units in one
}

var (
	knot       = unit{"kt", "airspeed", "kt", 1}
	mph        = unit{"mph", "airspeed", "kt", 1609.344 / 1852}
	kmh        = unit{"km/h", "airspeed", "kt", 1000.0 / 1852}
	feet       = unit{"ft", "height", "ft", 1}
	meters     = unit{"m", "distance", "ft", 1 / 0.3048}
	degrees    = unit{"deg", "angle", "deg", 1}
	percent    = unit{"%", "percent", "%", 1}
	pounds     = unit{"lb", "weight", "lb", 1}
	kilograms  = unit{"kg", "weight", "lb", 1 / 0.45359237}
	seconds    = unit{"s", "time", "s", 1}
	minutes    = unit{"min", "time", "s", 60}
	hours      = unit{"h", "time", "s", 3600}
	revs       = unit{"rpm", "rpm", "rpm", 1}
	inches     = unit{"inHg", "manifold-pressure", "inHg", 1}
	footPerMin = unit{"ft/min", "vertical-speed", "ft/min", 1}
	torquePSI  = unit{"psi", "pressure", "psi", 1}
)

// unitsTold are the ways to write a unit behind its number, in small letters.
var unitsTold = map[string]unit{
	"kt": knot, "kts": knot, "knot": knot, "knots": knot, "kias": knot, "kcas": knot, "ktas": knot, "knts": knot,
	"mph": mph, "km/h": kmh, "kmh": kmh, "kph": kmh,
	"ft": feet, "feet": feet, "foot": feet, "'": feet, "’": feet, "m": meters, "meters": meters, "metres": meters, "meter": meters, "metre": meters,
	"deg": degrees, "degs": degrees, "degree": degrees, "degrees": degrees, "°": degrees,
	"%": percent, "percent": percent, "pct": percent,
	"lb": pounds, "lbs": pounds, "pound": pounds, "pounds": pounds, "kg": kilograms, "kgs": kilograms, "kilogram": kilograms, "kilograms": kilograms, "kilos": kilograms,
	"s": seconds, "sec": seconds, "secs": seconds, "second": seconds, "seconds": seconds, "min": minutes, "mins": minutes, "minute": minutes, "minutes": minutes,
	"hr": hours, "hrs": hours, "hour": hours, "hours": hours,
	"rpm": revs, "revs": revs, "inches": inches, "in": inches, "\"": inches, "inhg": inches,
	"fpm": footPerMin, "ft/min": footPerMin, "feet/min": footPerMin, "psi": torquePSI,
}

// numberWords are the numbers that texts write as words before a unit.
var numberWords = map[string]float64{
	"one": 1, "two": 2, "three": 3, "four": 4, "five": 5, "six": 6, "seven": 7, "eight": 8, "nine": 9, "ten": 10, "eleven": 11, "twelve": 12,
	"fifteen": 15, "twenty": 20, "thirty": 30, "forty": 40, "fifty": 50, "sixty": 60, "seventy": 70, "eighty": 80, "ninety": 90,
}

// Measures finds the numbers of a sentence with their units, in order of
// place. A number without a unit counts where the words around it say what it
// measures ("heading 240", "a bank of 60").
func (l *Lexicon) Measures(d *Doc, s Sentence) []Measure {
	var out []Measure
	for i := s.First; i < s.Last; i++ {
		t := d.Tokens[i]
		value, ok := number(d.Text[t.Start:t.End], t.Number)
		if !ok {
			continue
		}
		if i > s.First && d.Tokens[i-1].Start == t.Start {
			continue // one of several words of an abbreviation
		}
		m := Measure{Token: i, Span: corpus.Span{Start: t.Start, End: t.End}, Value: value}
		if i > s.First && thousands(d.Text, d.Tokens[i-1], t) {
			head, _ := number(d.Text[d.Tokens[i-1].Start:d.Tokens[i-1].End], true)
			m.Value += 1000 * head
			m.Start = d.Tokens[i-1].Start
		}
		u, width := unitAfter(d.Text, t.End, len(d.Text))
		if width > 0 && m.Start > 0 && u == feet && strings.IndexByte("'\"", d.Text[m.Start-1]) >= 0 {
			continue // '21' in quotes is no height
		}
		if width == 0 && t.Number && i+1 < s.Last && d.Tokens[i+1].Number {
			continue // 14:02, 240/15
		}
		m.End += width
		if l.context(&m, u, width > 0, d, s) {
			out = append(out, m)
		}
	}
	return out
}

// thousands tells whether a and b are one number that a publisher cut in two
// by making every comma a semicolon: 23;500.
func thousands(s string, a, b Token) bool {
	return a.Number && b.Number && b.Start == a.End+1 && s[a.End] == ';' && b.End-b.Start == 3 && a.End-a.Start <= 3
}

func number(word string, digits bool) (float64, bool) {
	if digits {
		v, err := strconv.ParseFloat(strings.ReplaceAll(word, ",", ""), 64)
		return v, err == nil
	}
	if len(word) > len("seventeen") {
		return 0, false
	}
	v, ok := numberWords[strings.ToLower(word)]
	return v, ok
}

// unitAfter reads a unit that begins at i, perhaps behind a space or hyphen;
// width 0 where there is none.
func unitAfter(s string, i, end int) (unit, int) {
	from := i
	if i < end && (s[i] == ' ' || s[i] == '-') {
		i++
	}
	to := i
	for to < end && to-i < 12 && (letterAt(s, to) > 0 && s[to] < 0x80 || s[to] == '/' && to > i) {
		to++
	}
	if to == i { // a sign
		for _, sign := range []string{"°", "%", "’", "'", "\""} {
			if strings.HasPrefix(s[i:end], sign) {
				return unitsTold[sign], i + len(sign) - from
			}
		}
		return unit{}, 0
	}
	if to < end && isDigit(s[to]) {
		return unit{}, 0
	}
	word := strings.ToLower(s[i:to])
	if cent := " cent"; word == "per" && strings.HasPrefix(strings.ToLower(s[to:min(end, to+len(cent))]), cent) {
		return percent, to + len(cent) - from
	}
	if u, ok := unitsTold[word]; ok {
		if word == "feet" || word == "foot" || word == "ft" {
			for _, per := range []string{" per minute", " a minute", " per min"} {
				if strings.HasPrefix(strings.ToLower(s[to:min(end, to+len(per))]), per) {
					return footPerMin, to + len(per) - from
				}
			}
		}
		return u, to - from
	}
	if head, _, ok := strings.Cut(word, "/"); ok { // "knots/airspeed"
		if u, ok := unitsTold[head]; ok && head != "m" && head != "s" {
			return u, i + len(head) - from
		}
	}
	return unit{}, 0
}

// context settles the kind of a measure from its unit and the words around
// it; false where it measures nothing that is known here.
func (l *Lexicon) context(m *Measure, u unit, told bool, d *Doc, s Sentence) bool {
	near := func(back, ahead int, words ...string) bool {
		for i := max(s.First, m.Token-back); i < min(s.Last, m.Token+1+ahead); i++ {
			t := d.Tokens[i]
			word := strings.ToLower(d.Text[t.Start:t.End])
			for _, w := range words {
				if word == w || l.Name(t.Word) == w || strings.HasSuffix(w, "~") && strings.HasPrefix(word, w[:len(w)-1]) {
					return true
				}
			}
		}
		return false
	}
	if u == inches && !near(5, 3, "manifold", "map", "mp", "power") {
		told = false // the word "in"
	}
	if !told {
		switch {
		case near(2, 0, "heading", "hdg"):
			u = unit{"deg", "heading", "deg", 1}
		case near(3, 0, "bank", "banked"):
			u = unit{"deg", "bank", "deg", 1}
		case near(3, 0, "airspeed", "ias") && m.Value >= 30:
			u = knot
		default:
			return false
		}
	}
	m.Kind, m.Unit, m.Told, m.Value = u.kind, u.to, u.short, m.Value*u.factor
	switch m.Kind {
	case "airspeed":
		switch {
		case near(5, 3, "wind", "winds", "gust~", "crosswind~", "tailwind~", "headwind~", "component"):
			m.Kind = "wind"
		case near(3, 3, "groundspeed", "ground speed"):
			m.Kind = "groundspeed"
		}
	case "height", "distance":
		switch {
		case near(4, 4, "runway", "long", "wide", "length", "distance", "visibility", "rvr", "remaining", "threshold", "past", "strip", "away", "apart", "width", "skid~", "beyond"):
			m.Kind = "distance"
		case near(3, 3, "cloud", "clouds", "ceiling", "broken", "overcast", "scattered", "clg", "bkn", "ovc"):
			m.Kind = "cloud"
		case m.Told == "m" && near(3, 3, "height", "altitude", "high", "above", "agl", "up"):
			m.Kind = "height"
		case m.Told == "ft" && near(0, 3, "msl", "elevation"), near(2, 0, "elevation"):
			m.Kind = "altitude"
		}
	case "angle":
		switch {
		case near(4, 3, "bank~", "roll~", "aileron"):
			m.Kind = "bank"
		case near(4, 3, "pitch~", "nose"):
			m.Kind = "pitch"
		case near(3, 3, "flap~"):
			m.Kind = "flap"
		case near(4, 3, "heading~", "hdg", "track", "yaw~", "off", "swung"):
			m.Kind = "heading"
		case near(3, 1, "wind", "winds"):
			m.Kind = "wind-direction"
		case near(0, 1, "c", "f", "celsius", "fahrenheit") || near(3, 1, "temperature"):
			m.Kind = "temperature"
		case near(3, 3, "rudder"):
			m.Kind = "rudder"
		}
	case "percent":
		if near(5, 3, "torque", "power", "n1", "n2", "thrust", "tq") {
			m.Kind = "power"
		}
	case "pressure":
		if near(5, 3, "torque") {
			m.Kind = "power"
		}
	case "weight":
		if near(2, 4, "fuel") {
			m.Kind = "fuel"
		}
	}
	return true
}
