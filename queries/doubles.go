package queries

import (
	"cmp"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries/table"
)

// Doubles is what is known of occurrences that may tell one event, for
// counting each event once.
type Doubles struct {
	event     map[int64]int64 // key -> the smallest key of its event, where others tell it too
	undecided [][2]int64
	stale     bool
}

// NewDoubles takes the pairs found and decided. stale says that occurrences
// have changed since the search.
func NewDoubles(pairs []store.Pair, stale bool) *Doubles {
	d := &Doubles{event: map[int64]int64{}, stale: stale}
	for _, p := range pairs {
		switch {
		case p.Decision == nil:
			d.undecided = append(d.undecided, [2]int64{p.A, p.B})
		case p.Decision.Same:
			a, b := d.Event(p.A), d.Event(p.B)
			root := min(a, b)
			for k, e := range d.event {
				if e == a || e == b {
					d.event[k] = root
				}
			}
			d.event[p.A], d.event[p.B], d.event[a], d.event[b] = root, root, root, root
		}
	}
	// pairs within one event, or across two that are told apart, need no
	// further decision
	d.undecided = slices.DeleteFunc(d.undecided, func(p [2]int64) bool { return d.Event(p[0]) == d.Event(p[1]) })
	return d
}

// Event names the event of an occurrence by the smallest key among those that
// people say tell it.
func (d *Doubles) Event(key int64) int64 {
	if e, ok := d.event[key]; ok {
		return e
	}
	return key
}

// Undecided lists the pairs that wait for a decision, by their keys.
func (d *Doubles) Undecided() [][2]int64 { return d.undecided }

// Contradiction returns a pair that people call two events although other
// decisions make it one; false where there is none.
func Contradiction(pairs []store.Pair) (store.Decision, bool) {
	d := NewDoubles(pairs, false)
	for _, p := range pairs {
		if p.Decision != nil && !p.Decision.Same && d.Event(p.A) == d.Event(p.B) {
			return *p.Decision, true
		}
	}
	return store.Decision{}, false
}

// tellings gathers the occurrences in scope that others tell too.
type tellings struct {
	*Doubles
	apart   bool // a source by itself
	waiting map[eventKey][]*record
	seen    map[int64]bool // keys of undecided pairs that are in scope
	unsure  map[int64]bool
	account account
}

type eventKey struct {
	event  int64
	source string
}

// account is what a count did about doubles.
type account struct {
	events, tellings int // events counted once, and the occurrences that tell them
	undecided        int
	stale, known     bool
}

func newTellings(d *Doubles, apart bool) *tellings {
	t := &tellings{Doubles: d, apart: apart, waiting: map[eventKey][]*record{}, seen: map[int64]bool{}, unsure: map[int64]bool{}}
	if d != nil {
		for _, p := range d.undecided {
			t.unsure[p[0]], t.unsure[p[1]] = true, true
		}
	}
	return t
}

// hold keeps a record back whose event others tell too.
func (t *tellings) hold(r *record) bool {
	if t.Doubles == nil {
		return false
	}
	if t.unsure[r.Key] {
		t.seen[r.Key] = true
	}
	event, ok := t.event[r.Key]
	if !ok {
		return false
	}
	k := eventKey{event: event}
	if t.apart {
		k.source = r.Occurrence.Source
	}
	t.waiting[k] = append(t.waiting[k], r)
	return true
}

// release hands over each event held back, once, and closes the account.
func (t *tellings) release(use func(*record)) account {
	if t.Doubles == nil {
		return t.account
	}
	keys := slices.SortedFunc(maps.Keys(t.waiting), func(a, b eventKey) int {
		return cmp.Or(cmp.Compare(a.event, b.event), strings.Compare(a.source, b.source))
	})
	for _, k := range keys {
		rs := t.waiting[k]
		if len(rs) > 1 {
			t.account.events++
			t.account.tellings += len(rs)
		}
		use(merge(rs))
	}
	for _, p := range t.undecided {
		if t.seen[p[0]] && t.seen[p[1]] {
			t.account.undecided++
		}
	}
	t.account.known, t.account.stale = true, t.stale
	return t.account
}

// notes say how often an event may have been counted twice.
func (a account) notes() []string {
	if !a.known {
		return nil
	}
	var out []string
	if a.events > 0 {
		out = append(out, fmt.Sprintf("%s told by %d occurrences, by people's decisions, and counted once each",
			plural(a.events, "event")+map[bool]string{true: " is", false: " are"}[a.events == 1], a.tellings))
	}
	switch {
	case a.stale:
		out = append(out, "occurrences have changed since doubles were looked for; catena doubles --again looks once more")
	case a.undecided > 0:
		out = append(out, fmt.Sprintf("%s of occurrences here may each tell one event and %s counted twice if so: decide with catena doubles",
			plural(a.undecided, "undecided pair"), map[bool]string{true: "is", false: "are"}[a.undecided == 1]))
	default:
		out = append(out, "0 undecided pairs of possible doubles")
	}
	return out
}

// eventRank orders the tellings of an event: the file that must be complete
// speaks before the one that is voluntary.
var eventRank = map[string]int{"accident": 0, "serious-incident": 1, "incident": 2, "": 3, "report": 4}

// merge makes one record of the tellings of an event: the fields of the one
// from the fullest file, its date as fine as any tells it, the factors of all,
// and the longest chain.
func merge(rs []*record) *record {
	slices.SortStableFunc(rs, func(a, b *record) int {
		return cmp.Or(cmp.Compare(eventRank[a.Occurrence.Event], eventRank[b.Occurrence.Event]), cmp.Compare(a.Key, b.Key))
	})
	first := *rs[0].Counted
	out := &record{Counted: &first, told: map[string]bool{}, inferred: map[string]bool{}}
	whole := false
	for _, r := range rs {
		maps.Copy(out.told, r.told)
		maps.Copy(out.inferred, r.inferred)
		if r.Occurrence.Date.Precision() > first.Occurrence.Date.Precision() {
			first.Occurrence.Date = r.Occurrence.Date
		}
		if len(r.Path) > len(first.Path) {
			first.Path, first.BrokenBy = r.Path, r.BrokenBy
		}
		first.Usable = first.Usable || r.Usable
		whole = whole || r.Usable && !r.CutOff
	}
	first.CutOff = first.CutOff && !whole
	for f := range out.told {
		delete(out.inferred, f)
	}
	return out
}

// PairsTable lists pairs of possible doubles.
func PairsTable(title string, pairs []store.Pair) *table.Table {
	t := &table.Table{Title: title, Columns: []table.Column{
		{Name: "source"}, {Name: "id"}, {Name: "other_source"}, {Name: "other_id"}, {Name: "probability"}, {Name: "evidence"},
		{Name: "decision"}, {Name: "who"}, {Name: "when"}, {Name: "why"},
	}}
	for _, p := range pairs {
		row := []table.Cell{p.Names[0].Source, p.Names[0].ID, p.Names[1].Source, p.Names[1].ID, math.Round(p.Probability*1e4) / 1e4, evidenceWords(p.Evidence), "", "", "", ""}
		if p.Evidence == nil {
			row[4] = nil
		}
		if d := p.Decision; d != nil {
			row[6], row[7], row[8], row[9] = DecisionWord(d.Same), d.Who, d.At.Format("2006-01-02"), d.Note
		}
		t.Rows = append(t.Rows, row)
	}
	t.Notes = []string{"probability: that the two tell one event, by the evidence weighed (Fellegi and Sunter 1969); a person decides"}
	return t
}

// DecisionWord is how a decision is written.
func DecisionWord(same bool) string {
	if same {
		return "same"
	}
	return "different"
}

func evidenceWords(evidence []corpus.Evidence) string {
	var out []string
	for _, e := range evidence {
		out = append(out, fmt.Sprintf("%s (%+.1f)", e.What, e.Bits))
	}
	return strings.Join(out, "; ")
}
