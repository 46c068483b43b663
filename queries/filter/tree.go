package filter

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// Node is a part of a filter: *And, *Or, *Not, *Compare or *Factor. String
// writes it so that Parse reads the same tree.
type Node interface {
	String() string
	eval(o *corpus.Occurrence, has func(string) bool) bool
}

// And holds where both sides hold.
type And struct{ Left, Right Node }

// Or holds where at least one side holds.
type Or struct{ Left, Right Node }

// Not holds where its inside does not.
type Not struct{ Inside Node }

// Factor holds where the factor, or one below it, is affirmed.
type Factor struct{ ID string }

// Compare holds where the field is known and compares as asked.
type Compare struct {
	Field string
	Op    string // = != < <= > >= ~
	Value string
}

// Eval tells whether an occurrence matches. has tells whether a factor, or
// one below it, is affirmed.
func Eval(n Node, o *corpus.Occurrence, has func(id string) bool) bool { return n.eval(o, has) }

func (n *And) eval(o *corpus.Occurrence, has func(string) bool) bool {
	return n.Left.eval(o, has) && n.Right.eval(o, has)
}

func (n *Or) eval(o *corpus.Occurrence, has func(string) bool) bool {
	return n.Left.eval(o, has) || n.Right.eval(o, has)
}

func (n *Not) eval(o *corpus.Occurrence, has func(string) bool) bool { return !n.Inside.eval(o, has) }

func (n *Factor) eval(_ *corpus.Occurrence, has func(string) bool) bool { return has(n.ID) }

func (n *Compare) eval(o *corpus.Occurrence, _ func(string) bool) bool {
	if n.Field == "date" || n.Field == "year" || n.Field == "month" {
		return n.evalDate(o.Date)
	}
	have := Field(o, n.Field)
	if have == "" {
		return false // not known is no match
	}
	switch {
	case n.Op == "~":
		return strings.Contains(strings.ToLower(have), strings.ToLower(n.Value))
	case n.Op == "=" && n.Field != "engines":
		return strings.EqualFold(have, n.Value)
	case n.Op == "!=" && n.Field != "engines":
		return !strings.EqualFold(have, n.Value)
	}
	a, okA := number(have)
	b, okB := number(n.Value)
	return okA && okB && holds(n.Op, a, b)
}

// number reads a number; the words that strconv takes for one too (NaN, Inf)
// are none.
func number(s string) (float64, bool) {
	v, err := strconv.ParseFloat(s, 64)
	return v, err == nil && !math.IsNaN(v) && !math.IsInf(v, 0)
}

// evalDate compares what the date can mean with what the value can mean: =
// holds where every day of the one lies in the other, < where every day lies
// before it, and so on. A year is not known to lie in one of its months: of
// date = 2015-03 and date != 2015-03 neither holds for an occurrence of which
// only 2015 is known.
func (n *Compare) evalDate(d corpus.Date) bool {
	first, last := d.Bounds()
	v, err := corpus.ParseDate(n.Value)
	if first == (corpus.Date{}) || err != nil {
		return false
	}
	from, to := v.Bounds()
	switch n.Op {
	case "=":
		return first.Compare(from) >= 0 && last.Compare(to) <= 0
	case "!=":
		return last.Compare(from) < 0 || first.Compare(to) > 0
	case "<":
		return last.Compare(from) < 0
	case "<=":
		return last.Compare(to) <= 0
	case ">":
		return first.Compare(to) > 0
	case ">=":
		return first.Compare(from) >= 0
	}
	return strings.Contains(d.String(), n.Value)
}

// holds compares two numbers.
func holds(op string, a, b float64) bool {
	switch op {
	case "=":
		return a == b
	case "!=":
		return a != b
	case "<":
		return a < b
	case "<=":
		return a <= b
	case ">":
		return a > b
	case ">=":
		return a >= b
	}
	return false
}

func (n *And) String() string {
	return inBrackets(n.Left, isOr(n.Left)) + " and " + inBrackets(n.Right, isOr(n.Right) || isAnd(n.Right))
}

func (n *Or) String() string {
	return n.Left.String() + " or " + inBrackets(n.Right, isOr(n.Right))
}

func (n *Not) String() string {
	return "not " + inBrackets(n.Inside, isOr(n.Inside) || isAnd(n.Inside))
}

func (n *Factor) String() string { return n.ID }

func (n *Compare) String() string { return fmt.Sprintf("%s %s %s", n.Field, n.Op, quote(n.Value)) }

func inBrackets(n Node, yes bool) string {
	if yes {
		return "(" + n.String() + ")"
	}
	return n.String()
}

func isOr(n Node) bool  { _, ok := n.(*Or); return ok }
func isAnd(n Node) bool { _, ok := n.(*And); return ok }

// quote writes a value bare where that reads back as the same word.
func quote(v string) string {
	bare := v != "" && !slices.Contains(keywords, strings.ToLower(v))
	for i := 0; i < len(v) && bare; i++ {
		bare = wordByte(v[i])
	}
	if bare {
		return v
	}
	return `"` + strings.ReplaceAll(strings.ReplaceAll(v, `\`, `\\`), `"`, `\"`) + `"`
}

// Conjuncts are the parts that must all hold.
func Conjuncts(n Node) []Node {
	if a, ok := n.(*And); ok {
		return append(Conjuncts(a.Left), Conjuncts(a.Right)...)
	}
	return []Node{n}
}

// Fields are the fields that a filter asks about, sorted; factors are not
// fields.
func Fields(n Node) []string {
	var out []string
	walk(n, func(n Node) {
		if c, ok := n.(*Compare); ok && !slices.Contains(out, c.Field) {
			out = append(out, c.Field)
		}
	})
	slices.Sort(out)
	return out
}

// Factors are the factors that a filter asks about, in its order.
func Factors(n Node) []string {
	var out []string
	walk(n, func(n Node) {
		if f, ok := n.(*Factor); ok && !slices.Contains(out, f.ID) {
			out = append(out, f.ID)
		}
	})
	return out
}

func walk(n Node, visit func(Node)) {
	visit(n)
	switch n := n.(type) {
	case *And:
		walk(n.Left, visit)
		walk(n.Right, visit)
	case *Or:
		walk(n.Left, visit)
		walk(n.Right, visit)
	case *Not:
		walk(n.Inside, visit)
	}
}
