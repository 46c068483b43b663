package corpus

// Assertion is how a narrative speaks of a factor.
type Assertion string

// The assertions. Only an affirmed tag says that the factor happened on the
// flight that the narrative reports. A factor without a tag was not
// mentioned, which is not a denial.
const (
	Affirmed  Assertion = "affirmed"
	Denied    Assertion = "denied"
	Possible  Assertion = "possible"
	Advised   Assertion = "advised"
	Elsewhere Assertion = "elsewhere"
)

// Basis is what a tag rests on.
type Basis string

// Told: words state the factor. Inferred: no words state it, but sides or
// quantities imply it.
const (
	Told     Basis = "told"
	Inferred Basis = "inferred"
)

// Tag is a factor found at a span of a narrative by a rule.
//
// Invariants: Span lies in the narrative's text on rune boundaries, and Quote
// is the text of that span.
type Tag struct {
	Factor    string    `json:"factor"`
	Assertion Assertion `json:"assertion"`
	Basis     Basis     `json:"basis"`
	Narrative int       `json:"narrative"` // index into the occurrence's narratives
	Span
	Quote    string    `json:"quote"`
	Rule     string    `json:"rule"`
	RuleHash string    `json:"rule_hash,omitempty"` // of the rule with all terms that it uses
	Strength float64   `json:"strength"`            // in [0, 1]
	Side     string    `json:"side,omitempty"`
	Actor    string    `json:"actor,omitempty"`
	Quantity *Quantity `json:"quantity,omitempty"`
}

// Quantity is a measured value told with a factor, and the limit that it is
// compared with, where one is told. Value and Limit are in Unit; Told is the
// unit of the text where it is another ("mph").
type Quantity struct {
	Kind      string  `json:"kind"`
	Value     float64 `json:"value"`
	Unit      string  `json:"unit"`
	Told      string  `json:"told,omitempty"`
	Limit     float64 `json:"limit,omitempty"`
	LimitKind string  `json:"limit_kind,omitempty"`
}

// Link is a tag in its place in time.
type Link struct {
	Factor  string  `json:"factor"`
	Tag     int     `json:"tag"`               // index into the tags
	Order   string  `json:"order"`             // what the place rests on: text, words or clock
	Seconds float64 `json:"seconds,omitempty"` // since the link before, where told
}

// Chain is the ordered links of one occurrence: affirmed tags only, each
// factor once, the earliest first.
type Chain struct {
	Links    []Link   `json:"links"`
	Outcome  string   `json:"outcome,omitempty"`
	BrokenBy string   `json:"broken_by,omitempty"`
	Doubts   []string `json:"doubts,omitempty"` // what the narratives contradict themselves in
}

// Tagged is an occurrence with what the rule book found in it. Tags and
// Chain.Links are never null in JSON.
type Tagged struct {
	Occurrence
	CutOff   []int  `json:"cut_off,omitempty"` // narratives that stop in mid-sentence
	Rulebook string `json:"rulebook"`
	Tags     []Tag  `json:"tags"`
	Chain    Chain  `json:"chain"`
}
