package doubles

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"catena/ingest/corpus"
)

// How often the reports of one event agree, a judgement (common practice, no
// source), kept away from 0 and 1 so that no single field decides.
const (
	sameDay, nextDay, withinDays = 0.92, 0.04, 0.01
	samePlace                    = 0.85
	sameModel, sameMake          = 0.80, 0.15
	sameMark                     = 0.90
	samePhase                    = 0.80
	sameOperation                = 0.85
	sameInjury, sameDamage       = 0.92, 0.85
	sameFigure                   = 0.50 // a clock time, height or the like
	toldAgain                    = 0.50 // of the factors that one report tells
	otherFile                    = 0.95 // of doubles lie in two sources
	// Phase, operation, harm and factors depend on each other (a gear that
	// folds is met in landing, damages and hurts nobody), and the factors of
	// one chain come together: each tells less than it would by itself.
	news = 0.6
	// expected doubles per report: two in a hundred tell an event again.
	expected = 0.02
	// maxBits bounds what one thing can add, since rarity in a small
	// collection is not known well.
	maxBits = 14.0
	// monthBits bounds what a month in common tells: reports come in waves, and
	// who tells no day has often been made hard to find.
	monthBits = 5.0
)

// weights holds, for the values met in a collection, how much it tells that
// two reports share them. Shares are counted with one added, so that a value
// met once is not taken to be rarer than it can be known to be.
type weights struct {
	least float64 // bits from which a pair is a candidate
	rows  []row
	prior float64
	dated int           // records with a day
	days  map[int32]int // how many have each

	months, places, models, makes, marks, figures *values
	fields                                        [4]*values // by fieldNames
	sameFile, otherFile                           float64

	factors               *values
	none                  float64 // what it tells that neither report tells any factor
	factorBoth, factorOne []float64
}

// fieldNames are the circumstances weighed, sameField how often the reports of
// one event agree on each.
var (
	fieldNames = [4]string{"phase", "operation", "injury", "damage"}
	sameField  = [4]float64{samePhase, sameOperation, sameInjury, sameDamage}
)

// values numbers the values of a field and counts the records that have each.
type values struct {
	number map[string]int32
	count  []int
	names  []string
	known  int // records with any

	bits   []float64 // what it tells that two records share a value, see close
	differ float64   // what it tells that they share none
	meet   float64   // the chance that two records share one
}

func newValues() *values { return &values{number: map[string]int32{}} }

// add counts a value that a record has; 0 stands for none.
func (v *values) add(s string) int32 {
	n, ok := v.number[s]
	if !ok {
		n = int32(len(v.count)) + 1
		v.number[s] = n
		v.count = append(v.count, 0)
		v.names = append(v.names, s)
	}
	v.count[n-1]++
	return n
}

// share is the share of records with a known value that have this one.
func (v *values) share(n int32) float64 {
	return min(1, (float64(v.count[n-1])+1)/(float64(v.known)+1))
}

// close finds what it tells that two records share each value, or none, where
// reports of one event share it with the chance m.
func (v *values) close(m float64) {
	meet := 0.0
	for n, c := range v.count {
		p := float64(c) / math.Max(1, float64(v.known))
		meet += p * p
		v.bits = append(v.bits, min(maxBits, max(0, math.Log2(m/v.share(int32(n)+1)))))
	}
	v.differ = math.Log2((1 - m) / (1 - min(0.999, max(meet, 1/(float64(v.known)+1)))))
	v.meet = meet
}

// row is a record by numbers, for fast comparing.
type row struct {
	day, month, monthNumber                       int32 // 0 where not known
	near                                          dateBits
	place, marks, figures, models, makes, factors []int32 // sorted
	fields                                        [4]int32
	file, engines                                 int32
	side                                          byte
}

func newWeights(records []Record) *weights {
	w := &weights{
		days: map[int32]int{}, months: newValues(), places: newValues(), models: newValues(), makes: newValues(), marks: newValues(),
		figures: newValues(), factors: newValues(), rows: make([]row, len(records)),
	}
	for i := range w.fields {
		w.fields[i] = newValues()
	}
	files := newValues()
	usable := 0
	for i := range records {
		r, x := &records[i], &w.rows[i]
		if r.Date.Precision() == corpus.ToDay {
			x.day = dayNumber(r.Date)
			w.days[x.day]++
			w.dated++
		}
		if r.Date.Precision() >= corpus.ToMonth {
			x.month = int32(r.Date.Year*12 + r.Date.Month)
			w.months.known++
			x.monthNumber = w.months.add(r.Date.String()[:7])
		}
		one := func(v *values, s string) int32 {
			if s == "" {
				return 0
			}
			v.known++
			return v.add(s)
		}
		many := func(v *values, all []string) []int32 {
			var out []int32
			for _, s := range all {
				if s != "" {
					out = append(out, v.add(s))
				}
			}
			if out != nil {
				v.known++
			}
			slices.Sort(out)
			return slices.Compact(out)
		}
		x.place = many(w.places, placeTokens(r.Place))
		var models, makes []string
		for _, a := range r.Aircraft {
			first, _, _ := strings.Cut(a.Make, " ")
			models, makes = append(models, plain(a.Model)), append(makes, plain(first))
			x.engines = cmp.Or(x.engines, int32(a.Engines))
		}
		x.models, x.makes = many(w.models, models), many(w.makes, makes)
		x.marks, x.figures = many(w.marks, r.Marks), many(w.figures, r.Figures)
		for k, s := range [4]string{r.Phase, r.Operation, r.Injury, r.Damage} {
			x.fields[k] = one(w.fields[k], s)
		}
		x.file = one(files, r.Source)
		if r.Shingles > 0 {
			usable++
			for _, f := range r.Factors {
				x.factors = append(x.factors, w.factors.add(f))
			}
			slices.Sort(x.factors)
			x.factors = slices.Compact(x.factors)
		}
		if r.Side != "" {
			x.side = r.Side[0]
		}
	}
	w.factors.known = usable
	// who tells no registration could have told any
	w.marks.known, w.figures.known = len(records), len(records)
	for _, v := range []struct {
		*values
		m float64
	}{{w.months, sameDay}, {w.places, samePlace}, {w.models, sameModel}, {w.makes, sameModel}, {w.marks, sameMark}, {w.figures, sameFigure}, {files, 1 - otherFile}} {
		v.close(v.m)
	}
	for i, v := range w.fields {
		v.close(sameField[i])
	}
	w.weighFactors()
	if across := 1 - files.meet; across > 0.001 { // else there is one source only
		w.otherFile, w.sameFile = math.Log2(otherFile/across), math.Log2((1-otherFile)/(1-across))
	}
	for i := range w.rows {
		if x := &w.rows[i]; x.day != 0 {
			x.near = w.dateBits(x.day)
		}
	}
	// among n records, n²/2 pairs hold n × expected doubles
	w.prior = math.Log2(2 * expected / math.Max(2, float64(len(records))))
	return w
}

// weighFactors finds what it tells that both, one or none of two reports tell
// a factor. Reports of one event tell each of its factors with the chance
// toldAgain, given that the other tells it.
func (w *weights) weighFactors() {
	for n := range w.factors.count {
		p := min(0.9, w.factors.share(int32(n)+1))
		again := max(toldAgain, p) // never rarer than by chance
		none := math.Log2((1 - p*(2-again)) / ((1 - p) * (1 - p)))
		w.none += none
		w.factorBoth = append(w.factorBoth, math.Log2(again/p)-none)
		w.factorOne = append(w.factorOne, math.Log2((1-again)/(1-p))-none)
	}
}

// tally sums the evidence of a pair; notes is nil where nobody asks what it is
// made of. Millions of pairs are weighed for each that is listed, so that words
// are made for those alone.
type tally struct {
	bits  float64
	notes *[]corpus.Evidence
}

func (t *tally) add(bits float64) { t.bits += bits }

func (t *tally) note(bits float64, format string, args ...any) {
	*t.notes = append(*t.notes, corpus.Evidence{What: fmt.Sprintf(format, args...), Bits: math.Round(bits*10) / 10})
}

// score weighs a pair of records in bits, the prior included.
func (w *weights) score(a, b int, records []Record, notes *[]corpus.Evidence) float64 {
	x, y := &w.rows[a], &w.rows[b]
	t := &tally{bits: w.prior, notes: notes}
	w.date(t, x, y)
	w.shared(t, w.places, x.place, y.place, "place")
	if !w.shared(t, w.marks, x.marks, y.marks, "registration") {
		w.aircraft(t, x, y) // which a registration would imply
	}
	w.circumstances(t, x, y)
	if x.engines > 0 && y.engines > 0 && x.engines != y.engines {
		t.add(-3)
		if notes != nil {
			t.note(-3, "%d engines and %d", x.engines, y.engines)
		}
	}
	if x.file != y.file {
		t.add(w.otherFile)
	} else {
		t.add(w.sameFile)
	}
	if p, q := &records[a], &records[b]; p.Shingles > 0 && q.Shingles > 0 {
		w.told(t, x, y)
		w.shared(t, w.figures, x.figures, y.figures, "figure")
		if notes == nil && t.bits+mostWording < w.least {
			return t.bits // no likeness of wording could make it a candidate
		}
		j := alike(&p.Sketch, &q.Sketch)
		bits := wordingBits(j, min(p.Shingles, q.Shingles))
		t.add(bits)
		if notes != nil {
			t.note(bits, "%.0f in 100 runs of words are shared", 100*j)
		}
	}
	return t.bits
}

// dateBits are what dates near a record's own tell.
type dateBits struct{ same, next, within float64 }

func (w *weights) dateBits(day int32) dateBits {
	bits := func(span int32, m float64) float64 {
		n := 1
		for d := -span; d <= span; d++ {
			n += w.days[day+d]
		}
		return min(maxBits, math.Log2(m/min(1, float64(n)/float64(w.dated+1))))
	}
	return dateBits{bits(0, sameDay), bits(1, nextDay), bits(maxDays, withinDays)}
}

func (w *weights) date(t *tally, x, y *row) {
	if x.month == 0 || y.month == 0 {
		return
	}
	bits, words := -8.0, "same day"
	apart := max(x.day-y.day, y.day-x.day)
	switch {
	case x.day == 0 || y.day == 0:
		if bits, words = -6, "another month"; x.month == y.month {
			bits, words = min(monthBits, w.months.bits[x.monthNumber-1]), "same month"
		}
	case apart == 0:
		bits = x.near.same
	case apart == 1:
		bits, words = x.near.next, "a day apart"
	case apart <= maxDays:
		bits, words = x.near.within, fmtDays
	default:
		words = fmtDays
	}
	t.add(bits)
	if t.notes != nil {
		if words == fmtDays {
			t.note(bits, words, apart)
		} else {
			t.note(bits, "%s", words)
		}
	}
}

const fmtDays = "%d days apart"

// shared weighs the rarest value that two lists have in common, or that they
// have none. It tells whether there is one.
func (w *weights) shared(t *tally, v *values, a, b []int32, name string) bool {
	if len(a) == 0 || len(b) == 0 {
		return false
	}
	best := int32(0)
	for i, j := 0, 0; i < len(a) && j < len(b); { // both are sorted
		switch {
		case a[i] < b[j]:
			i++
		case a[i] > b[j]:
			j++
		default:
			if best == 0 || v.count[a[i]-1] < v.count[best-1] {
				best = a[i]
			}
			i, j = i+1, j+1
		}
	}
	if best > 0 {
		t.add(v.bits[best-1])
		if t.notes != nil {
			t.note(v.bits[best-1], "same %s: %s", name, v.names[best-1])
		}
		return true
	}
	t.add(v.differ)
	if t.notes != nil {
		t.note(v.differ, "another %s: %s and %s", name, v.names[a[0]-1], v.names[b[0]-1])
	}
	return false
}

// circumstances weighs phase, operation and harm.
func (w *weights) circumstances(t *tally, x, y *row) {
	for i, v := range w.fields {
		a, b := x.fields[i], y.fields[i]
		switch {
		case a == 0 || b == 0:
		case a == b:
			t.add(news * v.bits[a-1])
			if t.notes != nil {
				t.note(news*v.bits[a-1], "same %s: %s", fieldNames[i], v.names[a-1])
			}
		default:
			t.add(v.differ)
			if t.notes != nil {
				t.note(v.differ, "another %s: %s and %s", fieldNames[i], v.names[a-1], v.names[b-1])
			}
		}
	}
}

// aircraft weighs type and make, which are not two things: a type has one make.
func (w *weights) aircraft(t *tally, x, y *row) {
	if len(x.models) > 0 && len(y.models) > 0 {
		if common(x.models, y.models) > 0 {
			w.shared(t, w.models, x.models, y.models, "type")
			return
		}
		// "PA-28" and "PA-28-181": half of what the longer one would tell
		for _, n := range x.models {
			for _, m := range y.models {
				p, q := w.models.names[n-1], w.models.names[m-1]
				if min(len(p), len(q)) < 2 || !strings.HasPrefix(p, q) && !strings.HasPrefix(q, p) {
					continue
				}
				if len(q) > len(p) {
					n = m
				}
				t.add(w.models.bits[n-1] / 2)
				if t.notes != nil {
					t.note(w.models.bits[n-1]/2, "like types: %s and %s", p, q)
				}
				return
			}
		}
	}
	if n := common(x.makes, y.makes); n > 0 {
		bits := w.makes.bits[n-1]
		if len(x.models) > 0 && len(y.models) > 0 { // told, and not the same
			bits += math.Log2(sameMake / sameModel)
		}
		t.add(bits)
		if t.notes != nil {
			t.note(bits, "same make: %s", w.makes.names[n-1])
		}
		return
	}
	if len(x.models) > 0 && len(y.models) > 0 || len(x.makes) > 0 && len(y.makes) > 0 {
		t.add(w.models.differ)
		if t.notes != nil {
			t.note(w.models.differ, "another type")
		}
	}
}

// common is the first number that two sorted lists share, 0 for none.
func common(a, b []int32) int32 {
	for _, n := range a {
		if slices.Contains(b, n) {
			return n
		}
	}
	return 0
}

// told weighs the factors that the two narratives tell, and the failed side.
func (w *weights) told(t *tally, x, y *row) {
	sum := w.none
	var both, one []string
	add := func(list *[]string, n int32, bits float64) {
		sum += bits
		if t.notes != nil {
			*list = append(*list, w.factors.names[n-1])
		}
	}
	i, j := 0, 0
	for i < len(x.factors) || j < len(y.factors) {
		switch {
		case j == len(y.factors) || i < len(x.factors) && x.factors[i] < y.factors[j]:
			add(&one, x.factors[i], w.factorOne[x.factors[i]-1])
			i++
		case i == len(x.factors) || y.factors[j] < x.factors[i]:
			add(&one, y.factors[j], w.factorOne[y.factors[j]-1])
			j++
		default:
			add(&both, x.factors[i], w.factorBoth[x.factors[i]-1])
			i, j = i+1, j+1
		}
	}
	bits := min(maxBits, news*sum)
	t.add(bits)
	if t.notes != nil {
		var words []string
		if len(both) > 0 {
			words = append(words, "both tell "+strings.Join(both, ", "))
		}
		if len(one) > 0 {
			words = append(words, "only one tells "+strings.Join(one, ", "))
		}
		if words == nil {
			words = append(words, "neither tells a factor")
		}
		t.note(bits, "%s", strings.Join(words, "; "))
	}
	if x.side == 0 || y.side == 0 {
		return
	}
	side, words := 0.9, "the same side failed"
	if x.side != y.side {
		side, words = -3, "another side failed"
	}
	t.add(side)
	if t.notes != nil {
		t.note(side, "%s", words)
	}
}

// mostWording is what the same wording tells, the sum of the steps below.
const mostWording = 20

// wordingBits is what a likeness of wording tells. Reports of one trade share
// hardly a run of three words in twenty; a retelling may share no more, so
// that none tells little. Short texts tell less: they are made of formulas.
func wordingBits(j float64, shingles int) float64 {
	bits := -0.3
	for _, s := range []struct{ from, to, bits float64 }{{0.05, 0.15, 4}, {0.15, 0.3, 5}, {0.3, 0.5, 6}, {0.5, 0.9, 5}} {
		bits += s.bits * min(1, max(0, (j-s.from)/(s.to-s.from)))
	}
	return min(bits, float64(shingles)/5)
}

// bits weighs a pair of records.
func (f *finder) bits(a, b int) float64 { return f.score(a, b, f.records, nil) }

// evidence tells what the weight of a pair is made of, the weightiest first.
func (f *finder) evidence(a, b int) []corpus.Evidence {
	var out []corpus.Evidence
	f.score(a, b, f.records, &out)
	slices.SortStableFunc(out, func(x, y corpus.Evidence) int { return cmp.Compare(math.Abs(y.Bits), math.Abs(x.Bits)) })
	return out
}
