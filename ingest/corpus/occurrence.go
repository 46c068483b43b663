package corpus

import (
	"strings"
	"unicode/utf8"
)

// Occurrence is one reported event, with its fields and narratives.
//
// Identity is (Source, ID). The JSON form is the occurrence record, the
// canonical input and output of the program: its keys come in this order and
// a field that is not known is left out.
type Occurrence struct {
	ID     string `json:"id"`     // the source's own reference
	Source string `json:"source"` // who published it; never a file's name
	Date   Date   `json:"date,omitzero"`

	Place   string `json:"place,omitempty"`
	Country string `json:"country,omitempty"`

	Aircraft            // the first aircraft's fields stand beside the others
	Further  []Aircraft `json:"aircraft,omitempty"` // second and later aircraft

	Operation string `json:"operation,omitempty"`
	Phase     string `json:"phase,omitempty"`  // a CICTT phase code where known
	Injury    string `json:"injury,omitempty"` // fatal, serious, minor or none
	Damage    string `json:"damage,omitempty"` // destroyed, substantial, minor or none
	Event     string `json:"event,omitempty"`  // accident, serious-incident, incident or report

	Narratives []Narrative `json:"narratives"`
	Codes      []Code      `json:"codes,omitempty"`

	// Extra holds whatever the file said that has no field of its own.
	Extra map[string]string `json:"extra,omitempty"`
}

// Aircraft describes one aircraft of an occurrence. Engines is 0 where the
// number is unknown; a glider's known zero is not told apart from unknown.
type Aircraft struct {
	Make       string `json:"make,omitempty"`
	Model      string `json:"model,omitempty"`
	Category   string `json:"category,omitempty"`
	Engines    int    `json:"engines,omitempty"`
	EngineType string `json:"engine_type,omitempty"`
}

// Narrative is one free text of an occurrence, exactly as it was decoded from
// its file. Text is valid UTF-8 and never changes.
type Narrative struct {
	Kind string `json:"kind"` // synopsis, factual, analysis, cause, reporter or remarks
	Text string `json:"text"`
}

// CutOff tells whether the text stops in mid-sentence because its publisher
// allows no more characters. What such a text does not mention may have stood
// in the part that is lost. The lengths were met in published data.
func (n *Narrative) CutOff() bool {
	text := strings.TrimRight(n.Text, " \t\r\n")
	if text == "" || strings.ContainsRune(".!?\")", rune(text[len(text)-1])) {
		return false
	}
	switch chars := utf8.RuneCountInString(n.Text); chars {
	case 115, 255, 1000, 2000, 4000, 32767:
		return true
	default:
		return chars == 114 && n.Kind == "remarks" // a space was trimmed
	}
}

// CutOffs lists the narratives that stop in mid-sentence, nil where none does.
func (o *Occurrence) CutOffs() []int {
	var out []int
	for n := range o.Narratives {
		if o.Narratives[n].CutOff() {
			out = append(out, n)
		}
	}
	return out
}

// Code is an official classification that the publisher gave.
type Code struct {
	Scheme string `json:"scheme"`
	Code   string `json:"code"`
	Label  string `json:"label"`
}

// Source says where an occurrence was read from.
type Source struct {
	File string // the path as given, or "-" for standard input
	Row  int    // 1-based number of the record in the file, header not counted
	Line int    // 1-based line on which the record begins
}

// SetAside is a row that could not become an occurrence, kept raw.
type SetAside struct {
	Source
	Reason string
	Raw    []byte // the row exactly as read; empty when Spool is set
	Spool  string // a temporary file that holds a row too large for memory
}

// Usable tells whether the occurrence has a narrative with words in it, so
// that a classifier could have found something there.
func (o *Occurrence) Usable() bool {
	for _, n := range o.Narratives {
		for _, c := range n.Text {
			if c > ' ' {
				return true
			}
		}
	}
	return false
}
