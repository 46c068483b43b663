package fabricate

import (
	"fmt"
	"iter"
	"math/rand/v2"
	"slices"
	"sort"
	"time"

	"catena/ingest/corpus"
)

// Maker makes occurrences, one at a time. It is not safe for use by more than
// one goroutine at once.
type Maker struct {
	options Options
	random  *rand.Rand
	made    int
	months  []month
	shares  []float64 // running sums of the months' weights
	running map[string]int
	told    telling
	pending []retold
}

// month is a month of the corpus and its mix.
type month struct {
	first, last corpus.Date // the days of it that the corpus covers
	weight      float64
	mix         []float64 // running sums over bases and events, base after base; made when needed
}

// retold is a plot to be told again once the maker has come to due.
type retold struct {
	due    int
	plot   *plot
	id     string
	source string

	edited *corpus.Occurrence // what is to be printed again with edits, nil for other words
	truth  Truth
}

// Shares of the voices in percent; the rest are reports in capitals. A
// voluntary report is in first person or capitals, a file entry in the voice of
// an investigator or a remark.
const (
	investigatorShare = 36
	remarkShare       = 19
	firstShare        = 25
)

// New returns a maker. Options that Check would refuse are replaced by their
// defaults.
func New(o Options) *Maker {
	o = o.withDefaults()
	if o.From.Compare(o.To) > 0 {
		o.From, o.To = o.To, o.From
		o.From.Day = 1
	}
	m := &Maker{options: o, random: rand.New(rand.NewPCG(o.Seed, 0x9e3779b97f4a7c15)), running: map[string]int{}}
	m.told.maker = m
	m.told.used = make([]uint64, language.clauses/64+1)
	sum := 0.0
	for first := o.From; first.Compare(o.To) <= 0; {
		_, last := corpus.Date{Year: first.Year, Month: first.Month}.Bounds()
		days := float64(last.Day)
		if last.Compare(o.To) > 0 {
			last = o.To
		}
		mix := m.mixOf(first)
		weight := mix[len(mix)-1] * float64(last.Day-first.Day+1) / days
		m.months = append(m.months, month{first: first, last: last, weight: weight})
		sum += weight
		m.shares = append(m.shares, sum)
		if first.Year == 9999 && first.Month == 12 {
			break
		}
		next := time.Date(first.Year, time.Month(first.Month)+1, 1, 0, 0, 0, 0, time.UTC)
		first = corpus.Date{Year: next.Year(), Month: int(next.Month()), Day: 1}
	}
	return m
}

// mixOf is the running sum of the weights of all bases' events in the month
// that begins on first. A base's share follows its hours flown, so that
// without shifts the rate per hour is level.
func (m *Maker) mixOf(first corpus.Date) []float64 {
	out := make([]float64, 0, len(bases)*len(events))
	sum := 0.0
	for _, b := range bases {
		hours := m.options.hours(b, first.Year, first.Month)
		for i := range events {
			e := &events[i]
			if slices.ContainsFunc(b.jobs, e.fits) {
				sum += hours * e.weight * m.times(e, b, first)
			}
			out = append(out, sum)
		}
	}
	return out
}

// times is the product of the shifts that apply in the month of day.
func (m *Maker) times(e *event, b *base, day corpus.Date) float64 {
	times := 1.0
	for _, s := range m.options.Shifts {
		from, _ := s.From.Bounds()
		_, to := s.To.Bounds()
		if (s.Event == "" || s.Event == e.name) && (s.Place == "" || s.Place == b.name) &&
			from.Compare(day) <= 0 && (to.Year == 0 || day.Compare(to) <= 0) && s.Times >= 0 {
			times *= s.Times
		}
	}
	return times
}

// n draws a whole number in [0, n).
func (m *Maker) n(n int) int { return int(m.random.Uint32N(uint32(n))) }

func (m *Maker) chance(percent int) bool { return m.n(100) < percent }

// All makes the number of occurrences that the options ask for, without end
// where that is 0.
func (m *Maker) All() iter.Seq2[corpus.Occurrence, Truth] {
	return func(yield func(corpus.Occurrence, Truth) bool) {
		for m.options.Count == 0 || m.made < m.options.Count {
			if !yield(m.Next()) {
				return
			}
		}
	}
}

// Next makes an occurrence and its truth. Up to Options.Count the dates run
// from From to To, doubles aside; past it they stay in the last month.
func (m *Maker) Next() (corpus.Occurrence, Truth) {
	m.made++
	if len(m.pending) > 0 && m.pending[0].due <= m.made {
		again := m.pending[0]
		m.pending = m.pending[1:]
		if again.edited != nil {
			return m.reprint(again)
		}
		o, t := m.tell(again.plot, m.otherVoice(again.source))
		t.DoubleOf = again.id
		return o, t
	}
	p := m.draw()
	o, t := m.tell(p, m.drawVoice(p))
	// Each plot told first makes a double with odds d : 1-d, which makes the
	// share of doubles among all d.
	d := m.options.Doubles
	grave := p.harm.fatal() || p.harm.injury == "serious" // nobody reports that in person
	if d > 0 && !grave && m.random.Float64()*(1-d) < d {
		again := retold{due: m.made + 1 + m.n(9), plot: p, id: o.ID, source: o.Source}
		if m.options.Edited > 0 && m.random.Float64() < m.options.Edited {
			again.edited, again.truth = &o, t
		}
		m.pending = append(m.pending, again)
		slices.SortStableFunc(m.pending, func(a, b retold) int { return a.due - b.due })
	}
	return o, t
}

// reprint makes the double that another source printed with edited wording.
func (m *Maker) reprint(again retold) (corpus.Occurrence, Truth) {
	o, t := m.edit(*again.edited, again.truth)
	o.Event = again.plot.occurrence().Event
	if again.source == voluntary {
		o.Source = again.plot.base.source
	} else {
		o.Source, o.Event = voluntary, "report"
	}
	o.ID = m.nextID(o.Source, again.plot)
	t.ID, t.Source, t.DoubleOf = o.ID, o.Source, again.id
	return o, t
}

// draw draws the date, base, event and all that belongs to them.
func (m *Maker) draw() *plot {
	total := m.shares[len(m.shares)-1]
	at := m.random.Float64()
	if c := m.options.Count; c > 0 {
		at = min((float64(m.made-1)+at)/float64(c), 1)
	}
	at *= total
	i := min(sort.SearchFloat64s(m.shares, at), len(m.months)-1)
	mo := &m.months[i]
	if mo.mix == nil {
		mo.mix = m.mixOf(mo.first)
	}
	date := mo.first
	if mo.weight > 0 {
		part := 1 - (m.shares[i]-at)/mo.weight
		days := mo.last.Day - mo.first.Day + 1
		date.Day += min(max(int(part*float64(days)), 0), days-1)
	}
	sum := mo.mix[len(mo.mix)-1]
	k := min(sort.SearchFloat64s(mo.mix, m.random.Float64()*sum), len(mo.mix)-1)
	b, e := bases[k/len(events)], &events[k%len(events)]
	for !slices.ContainsFunc(b.jobs, e.fits) { // only where all weights are 0
		e = &events[m.n(len(events))]
	}
	p := m.newPlot(e, b, date)
	if m.chance(3) {
		p.date.Day = 0 // known to the month only
	}
	return p
}

// drawVoice draws a voice. Nobody reports a fatal accident in person, and the
// voluntary file takes few accidents.
func (m *Maker) drawVoice(p *plot) Voice {
	r := m.n(100)
	v := Capitals
	switch {
	case r < investigatorShare:
		v = Investigator
	case r < investigatorShare+remarkShare:
		v = Remark
	case r < investigatorShare+remarkShare+firstShare:
		v = FirstPerson
	}
	if v.voluntary() && (p.harm.fatal() || p.harm.injury == "serious") {
		v = Investigator
	}
	return v
}

func (v Voice) voluntary() bool { return v == FirstPerson || v == Capitals }

// otherVoice draws a voice of the other kind of file than source.
func (m *Maker) otherVoice(source string) Voice {
	if source == voluntary {
		return pick(m, Investigator, Investigator, Remark)
	}
	return pick(m, FirstPerson, Capitals)
}

// tell puts a plot into words and gives it an id.
func (m *Maker) tell(p *plot, v Voice) (corpus.Occurrence, Truth) {
	t := &m.told
	t.begin(p, v)
	o := p.occurrence()
	o.Source = p.base.source
	if v.voluntary() {
		o.Source, o.Event = voluntary, "report"
	}
	o.ID = m.nextID(o.Source, p)
	o.Narratives = t.narratives()
	truth := Truth{ID: o.ID, Source: o.Source, Voice: v, Traps: t.traps, Tags: append([]PlantedTag{}, t.tags...)}
	truth.close(p, t.deadTold)
	return o, truth
}

// narratives tells the plot in the voice's kind of narrative, and now and then
// a second one that repeats it.
func (t *telling) narratives() []corpus.Narrative {
	m := t.maker
	switch t.voice {
	case Remark:
		return []corpus.Narrative{t.tellRemark()}
	case Investigator:
		second := t.plot.harm.accident() && t.hasCause() && m.chance(65)
		target := t.target()
		if second {
			return []corpus.Narrative{t.tellReport("factual", target-secondBytes), t.tellCause()}
		}
		return []corpus.Narrative{t.tellReport("factual", target)}
	}
	second := len(t.plot.chain) > 0 && m.chance(22)
	target := t.target()
	if second {
		return []corpus.Narrative{t.tellReport("reporter", target-secondBytes), t.tellSummary()}
	}
	return []corpus.Narrative{t.tellReport("reporter", target)}
}

// nextID gives the next id of the source.
func (m *Maker) nextID(source string, p *plot) string {
	if m.options.IDs == RunningIDs {
		return fmt.Sprintf("F-%06d", m.made)
	}
	initial := p.base.initial
	if source == voluntary {
		initial = "HT-"
	}
	key := fmt.Sprintf("%s%02d", initial, p.date.Year%100)
	if m.running[key] == 0 {
		m.running[key] = 200
	}
	m.running[key]++
	return fmt.Sprintf("%s-%03d", key, m.running[key])
}

// close fills in what follows from the tags: the sequence, the sides and the
// recovery that broke the chain.
func (t *Truth) close(p *plot, deadTold bool) {
	t.Sequence = []string{}
	for _, s := range p.chain {
		told := slices.ContainsFunc(t.Tags, func(g PlantedTag) bool {
			return g.Assertion == corpus.Affirmed && g.Factor == s.factor
		})
		if !told || slices.Contains(t.Sequence, s.factor) {
			continue
		}
		t.Sequence = append(t.Sequence, s.factor)
		if p.event.broken && isRecovery(s.factor) && s.factor != "recovered" {
			t.BrokenBy = s.factor
		}
	}
	if n := len(t.Sequence); p.event.broken && t.BrokenBy == "" && n > 0 && t.Sequence[n-1] == "recovered" {
		t.BrokenBy = "recovered"
	}
	if p.event.fails && p.job.aircraft.engines == 2 && deadTold {
		t.FailedSide = p.dead.String()
	}
	for _, g := range t.Tags {
		if (g.Factor == "rudder-wrong-side" || g.Factor == "correct-rudder") && g.Assertion == corpus.Affirmed && t.RudderSide == "" {
			t.RudderSide = g.Side
		}
	}
}
