package filter

import (
	"fmt"
	"strings"
)

// Explain tells a filter in plain words: "source is tarnwick, and stall is
// affirmed". A part that joins others differently from its surroundings stands
// in brackets, so that the words can be read in one way only.
func Explain(n Node) string {
	switch n := n.(type) {
	case *And:
		return explainPart(n.Left, isOr(n.Left)) + ", and " + explainPart(n.Right, isOr(n.Right))
	case *Or:
		return explainPart(n.Left, isAnd(n.Left)) + ", or " + explainPart(n.Right, isAnd(n.Right))
	case *Not:
		return explainNot(n.Inside)
	case *Factor:
		return n.ID + " is affirmed"
	case *Compare:
		return explainCompare(n)
	}
	return ""
}

func explainPart(n Node, brackets bool) string {
	if brackets {
		return "(" + Explain(n) + ")"
	}
	return Explain(n)
}

// explainNot says what a denial takes in: also what is not known.
func explainNot(n Node) string {
	switch n := n.(type) {
	case *Factor:
		return n.ID + " is not affirmed"
	case *Compare:
		return "it is not known that " + explainCompare(n)
	}
	return "it is not so that (" + Explain(n) + ")"
}

// explainCompare words a comparison. Of the unequal one it says that the field
// must be known, for there a reader would not expect it.
func explainCompare(c *Compare) string {
	name := strings.ReplaceAll(c.Field, "_", " ")
	if extra, ok := strings.CutPrefix(c.Field, "extra."); ok {
		name = fmt.Sprintf("the file's own field %q", extra)
	}
	words := relations
	if c.Field == "date" || c.Field == "year" || c.Field == "month" {
		words = dateRelations
	}
	return fmt.Sprintf("%s %s %s", name, words[c.Op], quote(c.Value))
}

var relations = map[string]string{
	"=": "is", "!=": "is known and is not", "~": "contains",
	"<": "is less than", "<=": "is at most", ">": "is more than", ">=": "is at least",
}

var dateRelations = map[string]string{
	"=": "lies within", "!=": "is known and lies outside", "~": "is written with",
	"<": "lies before", "<=": "is not later than", ">": "lies after", ">=": "is not earlier than",
}
