package classify

import (
	"math"

	"catena/classify/rulebook"
	"catena/ingest/corpus"
)

// strengths replaces the strength that a rule's author wrote, which decides
// between overlapping tags, by how sure a tag is: the share of such tags that
// readers agree with. It is fitted to affirmed tags; those spoken of in other
// ways borrow it.
func (c *Classifier) strengths(tags []corpus.Tag, narratives []corpus.Narrative) {
	affirmed := map[string]int{}
	for _, t := range tags {
		if t.Assertion == corpus.Affirmed {
			affirmed[t.Factor]++
		}
	}
	for i := range tags {
		t := &tags[i]
		t.Strength = certainty(&c.book.Calibration, t, narratives[t.Narrative].Kind, affirmed[t.Factor] > 1)
	}
}

// certainty is a probability, rounded to hundredths.
func certainty(k *rulebook.Calibration, t *corpus.Tag, kind string, repeated bool) float64 {
	written := min(0.97, max(0.03, t.Strength))
	z := k.Base + k.Written*(logit(written)-logit(0.9)) + k.Rules[t.Rule]
	switch kind {
	case "cause":
		z += k.Cause
	case "remarks":
		z += k.Remarks
	}
	if repeated && t.Assertion == corpus.Affirmed {
		z += k.Repeated
	}
	p := 1 / (1 + math.Exp(-z))
	return math.Round(100*min(k.Most, max(k.Least, p))) / 100
}

func logit(p float64) float64 { return math.Log(p / (1 - p)) }
