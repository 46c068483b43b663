package queries

import (
	"cmp"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"catena/ingest/corpus"
	"catena/queries/filter"
	"catena/queries/stats"
	"catena/queries/table"
)

// TrendOptions say what to count and by what.
type TrendOptions struct {
	Scope
	Factors []string // none: all occurrences are counted
	By      string   // month, quarter, year or a field of the occurrence
	Per     string   // hours or departures
	Scale   float64  // a rate is per so many of these
	Level   float64  // of the intervals, 0.95
}

// undated is the row of occurrences whose date is coarser than the period.
const undated = "undated"

// small is the count under which a figure is called small: the exact 95%
// interval of 4 events reaches from 1.1 to 10.2 (Garwood 1936).
const small = 5

// Trend counts factors by period or field: counts, shares with Wilson
// intervals and, where exposure covers what is counted, rates with exact
// Poisson intervals. A period without occurrences between the first and the
// last has a row of its own. The columns are those of every trend table;
// chart limits, signals and reviews are null as long as nothing fills them.
func Trend(records Records, exposure []corpus.Exposure, o TrendOptions) (*table.Table, error) {
	t := &trend{
		TrendOptions: o, cells: map[string]*cell{}, sources: map[string]map[string]*coverage{},
		usableBySource: map[string]int{}, voluntary: map[string]bool{},
	}
	var err error
	if t.doubles, err = o.Scope.each(records, o.By == "source", t.add); err != nil {
		return nil, err
	}
	keys := t.rows()
	d := t.denominators(exposure)
	out := &table.Table{Title: t.title(), Columns: []table.Column{
		{Name: "period"}, {Name: "factor"}, {Name: "count", Unit: "count"}, {Name: "exposure", Unit: o.Per},
		{Name: "rate", Unit: "rate"}, {Name: "rate_low", Unit: "rate"}, {Name: "rate_high", Unit: "rate"},
		{Name: "share", Unit: "share"}, {Name: "share_low", Unit: "share"}, {Name: "share_high", Unit: "share"},
		{Name: "centre", Unit: "rate"}, {Name: "chart_low", Unit: "rate"}, {Name: "chart_high", Unit: "rate"}, {Name: "signal"},
		{Name: "inferred", Unit: "count"}, {Name: "reviewed", Unit: "count"},
	}}
	if t.grain() == "" {
		out.Columns[0].Name = "period" // the key keeps its name whatever it holds
	}
	factors := o.Factors
	if len(factors) == 0 {
		factors = []string{""}
	}
	for _, f := range factors {
		for _, k := range keys {
			out.Rows = append(out.Rows, t.row(k, f, d))
		}
	}
	out.Notes = t.notes(keys, factors, d)
	return out, nil
}

type trend struct {
	TrendOptions
	cells   map[string]*cell
	total   int
	usable  int                             // with a narrative that is whole
	cutOff  int                             // with one that stops in mid-sentence
	sources map[string]map[string]*coverage // source -> period -> what it delivered

	usableBySource map[string]int
	voluntary      map[string]bool // sources with voluntary reports
	doubles        account
}

// cell is what one row of the table counts.
type cell struct {
	records  int
	usable   int // with a narrative that is whole
	factor   map[string]int
	shared   map[string]int // those of factor that count in a share
	inferred map[string]int
}

// grain is the calendar period of the rows, "" where they are a field's values.
func (t *trend) grain() corpus.Grain {
	switch g := corpus.Grain(t.By); g {
	case corpus.ByMonth, corpus.ByQuarter, corpus.ByYear:
		return g
	}
	return ""
}

func (t *trend) key(o *corpus.Occurrence) string {
	if g := t.grain(); g != "" {
		if p, ok := o.Date.Period(g); ok {
			return p
		}
		return undated
	}
	return filter.Field(o, t.By)
}

func (t *trend) add(r *record) {
	o := &r.Occurrence
	k := t.key(o)
	c := t.cells[k]
	if c == nil {
		c = &cell{factor: map[string]int{}, shared: map[string]int{}, inferred: map[string]int{}}
		t.cells[k] = c
	}
	t.total++
	c.records++
	if r.Usable && r.CutOff {
		t.cutOff++ // what it does not mention is not known, so it bears on no share
	}
	whole := r.Usable && !r.CutOff
	if whole {
		t.usable++
		c.usable++
		t.usableBySource[o.Source]++
	}
	for _, f := range t.Factors {
		if r.has(f) {
			c.factor[f]++
			if whole {
				c.shared[f]++
			}
		}
		if r.inferred[f] {
			c.inferred[f]++
		}
	}
	t.cover(r)
}

// cover keeps account of what each source delivers, year by year.
func (t *trend) cover(r *record) {
	o := &r.Occurrence
	if o.Event == "report" {
		t.voluntary[o.Source] = true
	}
	byPeriod := t.sources[o.Source]
	if byPeriod == nil {
		byPeriod = map[string]*coverage{}
		t.sources[o.Source] = byPeriod
	}
	year, ok := o.Date.Period(corpus.ByYear)
	if !ok {
		return
	}
	c := byPeriod[year]
	if c == nil {
		c = newCoverage(year)
		byPeriod[year] = c
	}
	c.records++
	c.operations[o.Operation]++
	kinds := map[string]bool{}
	for _, n := range o.Narratives {
		kinds[n.Kind] = true
	}
	c.texts[strings.Join(slices.Sorted(maps.Keys(kinds)), " and ")]++
}

// rows lists the keys of the table in order: all periods from the first to
// the last, or the field's values; undated and unknown come last.
func (t *trend) rows() []string {
	var keys []string
	for k := range t.cells {
		if k != undated && k != "" {
			keys = append(keys, k)
		}
	}
	slices.Sort(keys)
	if t.grain() != "" && len(keys) > 0 {
		keys = between(keys[0], keys[len(keys)-1])
	}
	for _, last := range []string{"", undated} {
		if t.cells[last] != nil {
			keys = append(keys, last)
		}
	}
	return keys
}

// maxPeriods bounds a table against a date that a slip put far away.
const maxPeriods = 2400 // two hundred years of months

// between lists the periods from first to last.
func between(first, last string) []string {
	p, err := corpus.ParsePeriod(first)
	if err != nil {
		return []string{first, last}
	}
	keys := []string{first}
	for k := first; k != last && len(keys) < maxPeriods; keys = append(keys, k) {
		p = p.Next()
		k = p.String()
	}
	return keys
}

func (t *trend) row(key, factor string, d *denominators) []table.Cell {
	c := cmp.Or(t.cells[key], &cell{})
	count, inferred := c.records, 0
	share := stats.Interval{Estimate: math.NaN(), Low: math.NaN(), High: math.NaN()}
	if factor != "" {
		count, inferred = c.factor[factor], c.inferred[factor]
		share = stats.Wilson(c.shared[factor], c.usable, t.Level)
	}
	exposure := d.of(key)
	rate := stats.Garwood(count, exposure/t.Scale, t.Level)
	name := key
	if key == "" {
		name = "unknown"
	}
	return []table.Cell{
		name, factor, count, exposure, rate.Estimate, rate.Low, rate.High, share.Estimate, share.Low, share.High,
		nil, nil, nil, nil, inferred, 0,
	}
}

func (t *trend) title() string {
	what := "all occurrences"
	if len(t.Factors) > 0 {
		what = strings.Join(t.Factors, ", ")
	}
	s := fmt.Sprintf("%s by %s", what, t.By)
	if t.Only != nil {
		s += ", only " + t.Only.String()
	}
	if t.From != (corpus.Date{}) {
		s += ", from " + t.From.String()
	}
	if t.To != (corpus.Date{}) {
		s += ", to " + t.To.String()
	}
	return s
}

func (t *trend) notes(keys, factors []string, d *denominators) []string {
	var notes []string
	if t.total == 0 {
		return []string{"no occurrence matches"}
	}
	if len(t.Factors) > 0 {
		notes = append(notes, fmt.Sprintf("share: occurrences whose narratives affirm the factor, of the %d of %d with a usable narrative; what is not mentioned is not said not to have happened",
			t.usable, t.total))
		if t.cutOff > 0 {
			notes = append(notes, fmt.Sprintf("%s in mid-sentence: counted where the factor is told, but left out of shares, since what was cut off is not known",
				plural(t.cutOff, "narrative")+map[bool]string{true: " stops", false: " stop"}[t.cutOff == 1]))
		}
	}
	if t.Only != nil {
		notes = append(notes, "only those where "+filter.Explain(t.Only))
	}
	notes = append(notes, fmt.Sprintf("ranges are %g%% intervals: Wilson for shares, exact Poisson (Garwood) for rates", t.Level*100))
	notes = append(notes, d.notes...)
	notes = append(notes, t.doubles.notes()...)
	smalls := 0
	for _, f := range factors {
		for _, k := range keys {
			if c := t.cells[k]; f != "" && (c == nil || c.factor[f] < small) || f == "" && (c == nil || c.records < small) {
				smalls++
			}
		}
	}
	if smalls > 0 {
		notes = append(notes, fmt.Sprintf("small numbers: %d of %d rows count fewer than %d; look at their ranges, not at their ups and downs", smalls, len(keys)*len(factors), small))
	}
	if c := t.cells[undated]; c != nil {
		notes = append(notes, fmt.Sprintf("%s with a date too coarse for a %s stand in the row %q and are not spread", plural(c.records, "occurrence"), t.By, undated))
	}
	if len(t.sources) > 1 && t.By != "source" {
		var names []string
		for _, s := range slices.Sorted(maps.Keys(t.sources)) {
			names = append(names, fmt.Sprintf("%s (%d)", s, t.usableBySource[s]))
		}
		notes = append(notes, fmt.Sprintf("%d sources are counted together: %s with usable narratives; they are selected differently, so look at each by itself (--only 'source = ...' or --by source)",
			len(names), strings.Join(names, ", ")))
	}
	if t.grain() != "" {
		for _, s := range slices.Sorted(maps.Keys(t.sources)) {
			notes = append(notes, breaks(s, spread(t.sources[s]))...)
		}
	}
	return notes
}

// spread puts a source's periods in order, with the empty ones between.
func spread(byPeriod map[string]*coverage) []*coverage {
	if len(byPeriod) == 0 {
		return nil
	}
	keys := slices.Sorted(maps.Keys(byPeriod))
	var out []*coverage
	for _, k := range between(keys[0], keys[len(keys)-1]) {
		out = append(out, cmp.Or(byPeriod[k], newCoverage(k)))
	}
	return out
}
