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
)

// CheckExposure refuses amounts of flying whose periods overlap within a
// source and stratum, since these would be counted twice.
func CheckExposure(rows []corpus.Exposure) error {
	groups := map[string][]corpus.Exposure{}
	for _, e := range rows {
		k := e.Covers + "\x00" + strataKey(e.Strata)
		groups[k] = append(groups[k], e)
	}
	for _, k := range slices.Sorted(maps.Keys(groups)) {
		g := groups[k]
		slices.SortFunc(g, func(a, b corpus.Exposure) int {
			return cmp.Or(a.Period.First.Compare(b.Period.First), b.Period.Last.Compare(a.Period.Last))
		})
		for i := 1; i < len(g); i++ {
			if g[i].Period.First.Compare(g[i-1].Period.Last) <= 0 {
				return fmt.Errorf("exposure of %q%s: %s overlaps %s; give one grain per source and stratum", g[i].Covers, strataWords(g[i].Strata), g[i].Period, g[i-1].Period)
			}
		}
	}
	return nil
}

func strataKey(strata map[string]string) string {
	var b strings.Builder
	for _, k := range slices.Sorted(maps.Keys(strata)) {
		fmt.Fprintf(&b, "%s=%s\x00", k, strata[k])
	}
	return b.String()
}

func strataWords(strata map[string]string) string {
	var out []string
	for _, k := range slices.Sorted(maps.Keys(strata)) {
		out = append(out, k+" "+strata[k])
	}
	if len(out) == 0 {
		return ""
	}
	return " (" + strings.Join(out, ", ") + ")"
}

// denominators are the amounts of flying for the rows of a trend.
type denominators struct {
	amount map[string]float64 // by row key; missing where no rate may be given
	notes  []string
}

func (d *denominators) of(key string) float64 {
	if x, ok := d.amount[key]; ok {
		return x
	}
	return math.NaN()
}

// aircraftFields are fields by which flying itself can be divided. A filter
// on one of them narrows the flights, and needs exposure of that stratum; a
// filter on any other (injury, a factor) narrows the occurrences only.
var aircraftFields = []string{"place", "country", "make", "model", "category", "engines", "engine_type", "operation"}

// denominators finds the amount of flying that stands behind each row, and
// says why where it finds none.
func (t *trend) denominators(exposure []corpus.Exposure) *denominators {
	d := &denominators{amount: map[string]float64{}}
	if len(exposure) == 0 {
		return d
	}
	rows, reason := t.covering(exposure)
	if reason != "" {
		d.notes = append(d.notes, "no rate: "+reason)
		return d
	}
	missing := 0
	for key := range t.cells {
		if amount, ok := t.amount(rows, key); ok {
			d.amount[key] = amount
		} else if key != undated {
			missing++
		}
	}
	if missing > 0 {
		d.notes = append(d.notes, fmt.Sprintf("no rate in %s: the %s loaded do not cover the whole of it", plural(missing, "row"), t.Per))
	}
	// empty periods between the first and the last have exposure too
	for _, key := range t.rows() {
		if _, ok := t.cells[key]; !ok {
			if amount, ok := t.amount(rows, key); ok {
				d.amount[key] = amount
			}
		}
	}
	if len(d.amount) > 0 && len(t.voluntary) > 0 {
		d.notes = append(d.notes, "these are voluntary reports: a rate that rises can mean better reporting")
	}
	if len(d.amount) > 0 {
		d.notes = append(d.notes, fmt.Sprintf("rates are per %s %s", thousands(t.Scale), t.Per))
	}
	return d
}

// covering picks the exposure that stands for what is counted, or says why
// there is none.
func (t *trend) covering(exposure []corpus.Exposure) (rows []corpus.Exposure, reason string) {
	covered := map[string]bool{}
	for _, e := range exposure {
		covered[e.Covers] = true
	}
	var conjuncts []filter.Node
	if t.Only != nil {
		conjuncts = filter.Conjuncts(t.Only)
	}
	for _, s := range slices.Sorted(maps.Keys(t.sources)) {
		if !covered[s] && t.By != "source" {
			return nil, fmt.Sprintf("the exposure covers %s, and the count holds %q too; narrow it with --only 'source = ...'", quoted(covered), s)
		}
		if t.voluntary[s] && t.By != "source" {
			if len(t.sources) > 1 || !names(conjuncts, s) {
				return nil, fmt.Sprintf("%q holds voluntary reports, which grow with the will to report; ask for it alone, --only 'source = %s', to see a rate all the same", s, s)
			}
		}
	}
	strata := map[string]bool{}
	for _, e := range exposure {
		if t.sources[e.Covers] != nil {
			rows = append(rows, e)
			for k := range e.Strata {
				strata[k] = true
			}
		}
	}
	if t.grain() == "" && t.By != "source" && !strata[t.By] {
		return nil, fmt.Sprintf("the exposure is not divided by %s", t.By)
	}
	for _, c := range conjuncts {
		fields := filter.Fields(c)
		narrows := slices.ContainsFunc(fields, func(f string) bool { return slices.Contains(aircraftFields, f) || f == "source" })
		if !narrows {
			continue
		}
		for _, f := range fields {
			if f != "source" && !strata[f] {
				return nil, fmt.Sprintf("the exposure is not divided by %s, which %s asks for", f, c)
			}
		}
		rows = slices.DeleteFunc(rows, func(e corpus.Exposure) bool {
			o := corpus.Occurrence{Source: e.Covers}
			for k, v := range e.Strata {
				filter.SetField(&o, k, v)
			}
			return !filter.Eval(c, &o, func(string) bool { return false })
		})
	}
	return rows, ""
}

// names tells whether a filter's top level asks for a source by name.
func names(conjuncts []filter.Node, source string) bool {
	for _, c := range conjuncts {
		if fields := filter.Fields(c); len(fields) == 1 && fields[0] == "source" && filter.Eval(c, &corpus.Occurrence{Source: source}, func(string) bool { return false }) {
			return true
		}
	}
	return false
}

// amount sums the exposure of a row; false where it does not cover the row
// whole.
func (t *trend) amount(rows []corpus.Exposure, key string) (float64, bool) {
	sum, days := 0.0, map[string]bool{}
	if t.By == "source" && t.voluntary[key] {
		return 0, false
	}
	var period corpus.Period
	if t.grain() != "" {
		var err error
		if period, err = corpus.ParsePeriod(key); err != nil {
			return 0, false
		}
	}
	from, _ := t.From.Bounds()
	_, to := t.To.Bounds()
	any := false
	for _, e := range rows {
		x := e.Hours
		if t.Per == "departures" {
			x = e.Departures
		}
		switch {
		case t.From != (corpus.Date{}) && e.Period.First.Compare(from) < 0, t.To != (corpus.Date{}) && e.Period.Last.Compare(to) > 0:
			continue
		case t.grain() != "":
			if e.Period.First.Compare(period.First) < 0 || e.Period.Last.Compare(period.Last) > 0 {
				continue
			}
			for m := e.Period.First; m.Compare(e.Period.Last) <= 0; m = nextMonth(m) {
				days[fmt.Sprintf("%04d-%02d", m.Year, m.Month)] = true
			}
		case t.By == "source" && e.Covers != key, t.By != "source" && !strings.EqualFold(e.Strata[t.By], key):
			continue
		}
		if math.IsNaN(x) {
			return 0, false
		}
		sum += x
		any = true
	}
	if !any || sum <= 0 {
		return 0, false
	}
	if t.grain() != "" {
		for m := period.First; m.Compare(period.Last) <= 0; m = nextMonth(m) {
			if !days[fmt.Sprintf("%04d-%02d", m.Year, m.Month)] {
				return 0, false
			}
		}
	}
	return sum, true
}

func nextMonth(d corpus.Date) corpus.Date {
	if d.Month == 12 {
		return corpus.Date{Year: d.Year + 1, Month: 1, Day: 1}
	}
	return corpus.Date{Year: d.Year, Month: d.Month + 1, Day: 1}
}

func quoted(set map[string]bool) string {
	var out []string
	for _, s := range slices.Sorted(maps.Keys(set)) {
		out = append(out, fmt.Sprintf("%q", s))
	}
	return strings.Join(out, ", ")
}

func thousands(x float64) string {
	s := fmt.Sprintf("%.0f", x)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}
