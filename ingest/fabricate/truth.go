package fabricate

import "catena/ingest/corpus"

// Voice is the manner in which a narrative is told.
type Voice string

// The voices of the trade.
const (
	Investigator Voice = "investigator" // third person, whole sentences
	FirstPerson  Voice = "first-person" // a voluntary report
	Capitals     Voice = "capitals"     // a voluntary report in capitals and abbreviations
	Remark       Voice = "remark"       // one to three short phrases
)

// Truth is what was planted in one occurrence.
type Truth struct {
	ID     string       `json:"id"`
	Source string       `json:"source"`
	Voice  Voice        `json:"voice"`
	Tags   []PlantedTag `json:"tags"` // in order of the text; a factor told twice has two

	// Sequence holds the affirmed factors in order of time, each once. The
	// text may tell them in another order.
	Sequence []string `json:"sequence"`

	FailedSide string `json:"failed_side"` // of the engine that failed or was failed, where a sentence says so
	RudderSide string `json:"rudder_side"` // of the rudder that was used, where a sentence says so
	BrokenBy   string `json:"broken_by"`   // the recovery that ended the chain without accident

	// Traps names words in the text that look like a factor and are none:
	// vmc-weather, control-word or engine-stall.
	Traps []string `json:"traps,omitempty"`

	// DoubleOf is the id of the occurrence that this one tells again.
	DoubleOf string `json:"double_of,omitempty"`
}

// PlantedTag is a factor at the bytes that show it.
//
// Invariants: Start and End are a corpus.Span of the narrative's text, and
// Quote is the text of that span.
type PlantedTag struct {
	Factor    string           `json:"factor"`
	Assertion corpus.Assertion `json:"assertion"`
	Basis     corpus.Basis     `json:"basis"` // always told
	Narrative int              `json:"narrative"`
	corpus.Span
	Quote string `json:"quote"`
	Side  string `json:"side,omitempty"` // left or right, where the clause says so
}
