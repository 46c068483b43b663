package doubles

import (
	"cmp"
	"math"
	"runtime"
	"slices"
	"strings"
	"sync"
	"time"

	"catena/ingest/corpus"
)

// Options say how Find looks.
type Options struct {
	// Least is the probability from which a pair is a candidate; 0 for
	// DefaultLeast.
	Least float64
}

// DefaultLeast is where a list of pairs begins. Of 100,000 invented reports
// with 2% doubles of edited wording it lists 2,614 pairs, 1,744 of them right,
// of 1,893; from 0.5 it would list 3,468 with 1,788.
const DefaultLeast = 0.7

// Found is what Find returns.
type Found struct {
	Pairs    []corpus.Double // the likeliest first
	Compared int             // pairs that were weighed
	Left     int             // pairs of crowded days that were not
}

const (
	// maxDays is how far apart the dates of one event may be told.
	maxDays = 3
	// crowd is how many others with only the aircraft type or only the place
	// in common a report is compared with; those with both are all compared,
	// up to maxCrowd.
	crowd    = 64
	maxCrowd = 4000
	// bands and bandBytes cut a sketch: two narratives of likeness J meet in
	// one of 32 bands with probability 1-(1-J^4)^32, a half at J = 0.38.
	bands, bandBytes = 32, 4
	// leastAlike and leastShingles keep formulas ("for reasons that could not
	// be determined") from bringing strangers together by wording alone.
	leastAlike    = 0.3
	leastShingles = 25
)

// Find lists the pairs of records that probably tell one event. The same
// records give the same pairs in the same order.
func Find(records []Record, o Options) Found {
	if o.Least == 0 {
		o.Least = DefaultLeast
	}
	f := newFinder(records, o)
	f.neighbours()
	f.wording()
	out := Found{Compared: f.compared, Left: f.left}
	for at, bits := range f.found {
		a, b := int(at>>32), int(at&math.MaxUint32)
		if records[a].Key > records[b].Key {
			a, b = b, a
		}
		out.Pairs = append(out.Pairs, corpus.Double{A: records[a].Key, B: records[b].Key, Probability: probability(bits), Evidence: f.evidence(a, b)})
	}
	slices.SortFunc(out.Pairs, func(x, y corpus.Double) int {
		return cmp.Or(cmp.Compare(y.Probability, x.Probability), cmp.Compare(x.A, y.A), cmp.Compare(x.B, y.B))
	})
	return out
}

// probability turns bits of evidence, the prior included, into a probability.
func probability(bits float64) float64 { return 1 / (1 + math.Exp2(-bits)) }

// finder is the state of one Find.
type finder struct {
	*weights
	records  []Record
	found    map[uint64]float64 // index of a << 32 | index of b -> bits
	compared int
	left     int
}

func newFinder(records []Record, o Options) *finder {
	f := &finder{weights: newWeights(records), records: records, found: map[uint64]float64{}}
	f.least = math.Log2(o.Least / (1 - o.Least))
	return f
}

// entry is a record in a block: those of one block stand together, in the
// order of their days.
type entry struct {
	block uint64 // hash of what the records of the block share
	day   int32
	at    int32
}

// dayNumber counts days; a date of the month only takes its first day.
func dayNumber(d corpus.Date) int32 {
	return int32(time.Date(d.Year, time.Month(max(1, d.Month)), max(1, d.Day), 0, 0, 0, 0, time.UTC).Unix() / 86400)
}

func blockOf(parts ...string) uint64 {
	h := uint64(14695981039346656037)
	for _, p := range parts {
		for i := range len(p) {
			h = (h ^ uint64(p[i])) * 1099511628211
		}
		h = (h ^ 0xFF) * 1099511628211
	}
	return h
}

// neighbours weighs the pairs that lie within days of each other and share
// something of aircraft and place.
func (f *finder) neighbours() {
	var whole, part, coarse []entry
	for i := range f.records {
		r := &f.records[i]
		if r.Date.Precision() < corpus.ToMonth {
			continue
		}
		day := dayNumber(r.Date)
		month := int32(r.Date.Year*12 + r.Date.Month)
		add := func(list *[]entry, block uint64) {
			if r.Date.Precision() == corpus.ToDay {
				*list = append(*list, entry{block, day, int32(i)})
			}
		}
		tokens := placeTokens(r.Place)
		for _, a := range r.Aircraft {
			model := blockModel(a)
			if model == "" {
				continue
			}
			add(&part, blockOf("model", model))
			for _, p := range tokens {
				add(&whole, blockOf("both", model, p))
				coarse = append(coarse, entry{blockOf("month", model, p), month, int32(i)})
			}
		}
		for _, p := range tokens {
			add(&part, blockOf("place", p))
		}
		for _, m := range r.Marks {
			add(&whole, blockOf("mark", m))
			coarse = append(coarse, entry{blockOf("month", "mark", m), month, int32(i)})
		}
	}
	f.scan(whole, maxDays, maxCrowd, nil)
	f.scan(part, maxDays, crowd, nil)
	f.scan(coarse, 0, maxCrowd, func(a, b int32) bool {
		return f.records[a].Date.Day == 0 || f.records[b].Date.Day == 0
	})
}

// scan weighs each record of a block with those that follow within days, at
// most limit of them.
func (f *finder) scan(entries []entry, days int32, limit int, want func(a, b int32) bool) {
	slices.SortFunc(entries, func(x, y entry) int {
		return cmp.Or(cmp.Compare(x.block, y.block), cmp.Compare(x.day, y.day), cmp.Compare(x.at, y.at))
	})
	f.parallel(len(entries), func(w *weigher, i int) {
		x := entries[i]
		n := 0
		for _, y := range entries[i+1:] {
			if y.block != x.block || y.day-x.day > days {
				break
			}
			if y.at == x.at || want != nil && !want(x.at, y.at) {
				continue
			}
			if n++; n > limit {
				w.left++
				break
			}
			w.weigh(x.at, y.at)
		}
	})
}

// wording weighs the pairs whose sketches meet in a band.
func (f *finder) wording() {
	type cell struct {
		band uint32
		at   int32
	}
	cells := make([]cell, 0, len(f.records))
	for band := range bands {
		cells = cells[:0]
		for i := range f.records {
			r := &f.records[i]
			if r.Shingles < leastShingles {
				continue
			}
			s := r.Sketch[band*bandBytes:]
			cells = append(cells, cell{uint32(s[0]) | uint32(s[1])<<8 | uint32(s[2])<<16 | uint32(s[3])<<24, int32(i)})
		}
		slices.SortFunc(cells, func(x, y cell) int { return cmp.Or(cmp.Compare(x.band, y.band), cmp.Compare(x.at, y.at)) })
		f.parallel(len(cells), func(w *weigher, i int) {
			for n, y := range cells[i+1:] {
				if y.band != cells[i].band {
					break
				}
				if n == crowd {
					w.left++
					break
				}
				if alike(&f.records[cells[i].at].Sketch, &f.records[y.at].Sketch) >= leastAlike {
					w.weigh(cells[i].at, y.at)
				}
			}
		})
	}
}

// weigher is what one goroutine finds.
type weigher struct {
	f              *finder
	found          map[uint64]float64
	compared, left int
}

func (w *weigher) weigh(a, b int32) {
	if a > b {
		a, b = b, a
	}
	w.compared++
	if bits := w.f.bits(int(a), int(b)); bits >= w.f.least {
		w.found[uint64(a)<<32|uint64(b)] = bits
	}
}

// parallel calls use for 0 to n-1 on all cores and gathers what is found.
func (f *finder) parallel(n int, use func(w *weigher, i int)) {
	workers := max(1, runtime.GOMAXPROCS(0))
	all := make([]*weigher, workers)
	var wg sync.WaitGroup
	for k := range workers {
		w := &weigher{f: f, found: map[uint64]float64{}}
		all[k] = w
		wg.Go(func() {
			for i := k; i < n; i += workers {
				use(w, i)
			}
		})
	}
	wg.Wait()
	for _, w := range all {
		f.compared += w.compared
		f.left += w.left
		for k, bits := range w.found {
			f.found[k] = bits
		}
	}
}

// blockModel is what two spellings of one aircraft type have in common: the
// first three letters and digits of the model.
func blockModel(a corpus.Aircraft) string {
	m := plain(a.Model)
	if m == "" {
		m = plain(a.Make)
	}
	return m[:min(3, len(m))]
}

// plain keeps the letters and digits of a word, in lower case.
func plain(s string) string {
	return strings.Map(func(c rune) rune {
		switch {
		case 'A' <= c && c <= 'Z':
			return c + 'a' - 'A'
		case 'a' <= c && c <= 'z' || '0' <= c && c <= '9' || c >= 0x80:
			return c
		}
		return -1
	}, s)
}

// noPlaces are words of places that tell none: kinds of place, and the letters
// by which publishers hide one.
var noPlaces = []string{"airport", "aerodrome", "airfield", "airpark", "heliport", "tower", "tracon", "artcc", "center", "centre", "county", "municipal", "regional",
	"international", "intl", "near", "zzz", "zzzz", "unknown", "usa"}

// placeTokens are the words of a place by which it is known elsewhere: those
// of three letters and more, at most three of them.
func placeTokens(place string) []string {
	var out []string
	for _, w := range strings.FieldsFunc(place, func(c rune) bool { return c == ' ' || c == ',' || c == '/' || c == '(' || c == ')' || c == '.' }) {
		if w = plain(w); len(w) >= 3 && len(out) < 3 && !slices.Contains(out, w) && !slices.Contains(noPlaces, w) {
			out = append(out, w)
		}
	}
	return out
}
