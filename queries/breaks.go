package queries

import (
	"cmp"
	"fmt"
	"slices"

	"catena/queries/stats"
)

// coverage is what a source delivered in one period: how many records, and
// of which kinds.
type coverage struct {
	period     string
	records    int
	operations map[string]int
	texts      map[string]int // by the kinds of narrative that a record has
}

func newCoverage(period string) *coverage {
	return &coverage{period: period, operations: map[string]int{}, texts: map[string]int{}}
}

// When neighbouring periods differ too much for one to be compared with the
// other. The figures are chosen on public data, where a change of what is
// published moves records by a factor of ten and a good year by a tenth:
// a tripling that chance makes less than once in a thousand; another mix
// where four records in ten would have to change their kind, among at least
// twenty in each period.
const (
	jumpFactor = 3.0
	jumpP      = 0.001
	mixShift   = 0.4
	mixRecords = 20
)

// breaks names the places where the coverage of a source changes so that no
// trend can be read across them. Periods come in order, those without records
// between the first and the last included.
func breaks(source string, periods []*coverage) []string {
	var notes []string
	for i := 1; i < len(periods); i++ {
		a, b := periods[i-1], periods[i]
		if jumps(a.records, b.records) {
			notes = append(notes, fmt.Sprintf("coverage of %q breaks between %s (%s) and %s (%s): do not read a trend across it",
				source, a.period, plural(a.records, "record"), b.period, plural(b.records, "record")))
		}
		for _, mix := range []struct {
			name string
			a, b map[string]int
		}{{"operation", a.operations, b.operations}, {"kind of text", a.texts, b.texts}} {
			if kind, ok := shifted(mix.a, mix.b); ok {
				notes = append(notes, fmt.Sprintf("%q has another mix of %s in %s than in %s (%s: %d of %d, then %d of %d): do not read a trend across it",
					source, mix.name, b.period, a.period, orUnknown(kind), mix.a[kind], a.records, mix.b[kind], b.records))
			}
		}
	}
	return notes
}

func jumps(a, b int) bool {
	low, high := float64(min(a, b)), float64(max(a, b))
	if high < jumpFactor*low || high == 0 {
		return false
	}
	_, p := stats.RateRatio(a, 1, b, 1, 0.95)
	return p < jumpP
}

// shifted tells whether the two mixes differ by more than mixShift in total
// variation (half the sum of the differences of shares), and which kind
// changed most.
func shifted(a, b map[string]int) (kind string, ok bool) {
	na, nb := total(a), total(b)
	if na < mixRecords || nb < mixRecords {
		return "", false
	}
	kinds := map[string]bool{}
	for k := range a {
		kinds[k] = true
	}
	for k := range b {
		kinds[k] = true
	}
	names := make([]string, 0, len(kinds))
	for k := range kinds {
		names = append(names, k)
	}
	slices.Sort(names)
	sum, most := 0.0, -1.0
	for _, k := range names {
		d := float64(a[k])/float64(na) - float64(b[k])/float64(nb)
		d = max(d, -d)
		sum += d
		if d > most {
			kind, most = k, d
		}
	}
	return kind, sum/2 > mixShift
}

func total(m map[string]int) int {
	n := 0
	for _, c := range m {
		n += c
	}
	return n
}

func plural(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

func orUnknown(s string) string { return cmp.Or(s, "not told") }
