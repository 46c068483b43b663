package fabricate

import (
	"math/bits"
	"slices"
	"strings"
	"time"

	"catena/ingest/corpus"
)

// telling puts one plot into words. Narratives are built one after another in
// out, which the maker reuses; spans are offsets into the narrative at hand.
type telling struct {
	maker *Maker
	plot  *plot
	voice Voice
	form  form
	style style
	holds condition // what clauses may ask for

	out       []byte
	sentence  bool // the next letter begins a sentence
	narrative int
	used      []uint64 // clauses told, one bit each
	tags      []PlantedTag
	traps     []string

	// Words that stay the same through the telling.
	actor, instructor, noun styled
	near, cloud             styled
	aircraftWords           []styled
	seniority               int // hours that the teller has more than the one who flies
	weekday, clock          int // Monday is 0; minutes after midnight

	// The clause being written.
	factor     string
	assertion  corpus.Assertion
	inSpan     bool
	spanSide   string
	clauseSide string
	deadTold   bool
}

// begin makes the telling ready for a plot in a voice.
func (t *telling) begin(p *plot, v Voice) {
	m := t.maker
	*t = telling{maker: m, plot: p, voice: v, holds: p.conditions(), out: t.out[:0], used: t.used}
	clear(t.used)
	t.near = p.base.nearby[m.n(len(p.base.nearby))]
	t.cloud = clouds[m.n(len(clouds))]
	t.weekday = m.n(7)
	if d := p.date; d.Day > 0 {
		t.weekday = (int(time.Date(d.Year, time.Month(d.Month), d.Day, 0, 0, 0, 0, time.UTC).Weekday()) + 6) % 7
	}
	t.clock = p.clock
	t.aircraftWords = anAircraft
	if m.chance(40) {
		t.aircraftWords = theAirplane
	}
	switch v {
	case Investigator:
		t.form = formInvestigator
		t.style = pick(m, plain, plain, curly)
	case FirstPerson:
		t.form = formFirst
		t.style = pick(m, plain, plain, plain, curly)
	case Capitals:
		t.form = formCapitals
		t.style = pick(m, capitals, abbreviate, abbreviate, abbreviate)
	case Remark:
		t.form = formRemark
		t.style = pick(m, plain, plain, capitals, abbreviate)
	}
	t.cast(t.form != formFirst && t.form != formCapitals)
}

// cast says who is who: in the third person, or by the one who flew. In a
// first-person report of a lesson the instructor writes and the student flies.
func (t *telling) cast(third bool) {
	m := t.maker
	t.instructor = theyTeach[m.n(len(theyTeach))]
	switch {
	case third && t.plot.job.dual:
		i := m.n(len(theStudent))
		t.actor, t.noun = theStudent[i], studentNoun[i]
	case third:
		i := m.n(len(thePilot))
		t.actor, t.noun = thePilot[i], pilotNoun[i]
	case t.plot.job.dual:
		t.actor, t.noun, t.instructor = myStudent[m.n(len(myStudent))], studentNoun[0], wordI
		t.seniority = 900
	default:
		t.actor, t.noun = wordI, pilotNoun[0]
	}
}

// pick draws one of its arguments.
func pick[T any](m *Maker, from ...T) T { return from[m.n(len(from))] }

// word writes a text in the style of the telling.
func (t *telling) word(s *styled) { t.raw(s[t.style]) }

func (t *telling) oneOf(from []styled) { t.word(&from[t.maker.n(len(from))]) }

// raw writes s, with a capital where a sentence begins. Names need no style
// but capitals.
func (t *telling) raw(s string) {
	if s == "" {
		return
	}
	start := len(t.out)
	t.out = append(t.out, s...)
	if t.sentence {
		t.sentence = false
		if c := s[0]; c >= 'a' && c <= 'z' {
			t.out[start] = c - 'a' + 'A'
		}
	}
	if t.style >= capitals {
		for i := start; i < len(t.out); i++ {
			if c := t.out[i]; c >= 'a' && c <= 'z' {
				t.out[i] = c - 'a' + 'A'
			}
		}
	}
}

// choose draws a clause of the group that the scene allows and that has not
// been told; where all have been told and again is set, one that has. It
// returns nil where the scene allows none.
func (t *telling) choose(key string, f form, again bool) *clause {
	g := language.groups[key]
	if g == nil || len(g[f]) == 0 {
		return nil
	}
	var told *clause
	list := g[f]
	start := t.maker.n(len(list))
	for i := range list {
		c := list[(start+i)%len(list)]
		if c.needs&^t.holds != 0 {
			continue
		}
		if t.used[c.number/64]&(1<<(c.number%64)) == 0 {
			t.used[c.number/64] |= 1 << (c.number % 64)
			return c
		}
		told = c
	}
	if again {
		return told
	}
	return nil
}

// write writes a clause. Any span in it plants factor with assertion.
func (t *telling) write(c *clause, factor string, assertion corpus.Assertion) {
	t.factor, t.assertion, t.clauseSide = factor, assertion, ""
	first := len(t.tags)
	t.nodes(c.body)
	for i := first; i < len(t.tags); i++ {
		switch {
		case factor == "": // a clause that holds others, which have their sides
		case !sided[factor]:
			t.tags[i].Side = ""
		case t.tags[i].Side == "":
			t.tags[i].Side = t.clauseSide
		}
	}
}

func (t *telling) nodes(list []node) {
	for i := range list {
		n := &list[i]
		switch n.kind {
		case literalNode:
			t.word(&n.literal)
		case slotNode:
			t.fill(n.slot)
		case choiceNode:
			t.nodes(n.choices[t.maker.n(len(n.choices))])
		case spanNode:
			tag := PlantedTag{Factor: t.factor, Assertion: t.assertion, Basis: corpus.Told, Narrative: t.narrative}
			tag.Start = len(t.out)
			t.inSpan, t.spanSide = true, ""
			t.nodes(n.choices[0])
			t.inSpan = false
			tag.End, tag.Side = len(t.out), t.spanSide
			t.tags = append(t.tags, tag)
		}
	}
}

// full begins a sentence with a capital, after a space where text precedes.
func (t *telling) full() {
	if n := len(t.out); n > 0 && t.out[n-1] != '\n' {
		t.out = append(t.out, ' ')
	}
	t.sentence = true
}

// stop ends a sentence.
func (t *telling) stop() { t.out = append(t.out, '.') }

// say writes one clause of a topic as a sentence; false where none is left.
func (t *telling) say(key string) bool {
	c := t.choose(key, t.form, false)
	if c == nil {
		return false
	}
	t.full()
	t.write(c, "", "")
	t.stop()
	return true
}

// seal turns what is written into the text of a narrative, quotes its tags
// and starts the next.
func (t *telling) seal(kind string) corpus.Narrative {
	text := string(t.out)
	for i := range t.tags {
		if tag := &t.tags[i]; tag.Narrative == t.narrative {
			tag.Quote = tag.Of(text)
		}
	}
	t.out = t.out[:0]
	t.narrative++
	return corpus.Narrative{Kind: kind, Text: text}
}

// Natural lengths of the voices, in bytes, and that of the short second
// narratives and the remarks, as measured; common practice, no source.
var naturalBytes = map[Voice]int{Investigator: 1150, FirstPerson: 950, Capitals: 850}

const remarkBytes, secondBytes = 66, 160

// target draws the length to aim for: the mean, give or take half, with one
// long report in twenty.
func (t *telling) target() int {
	m := t.maker
	mean := naturalBytes[t.voice]
	if given := m.options.MeanBytes; given > 0 {
		// Remarks stay short, so the others are longer by as much.
		mean = max((given*100-remarkShare*remarkBytes)/(100-remarkShare), 1)
	}
	n := mean * (50 + (m.n(101)+m.n(101))/2) / 100
	if m.n(20) == 0 {
		return n * 2
	}
	return n * 20 / 21
}

// trap is what is mentioned without being affirmed, chosen before the telling.
type trap struct {
	key       string
	factor    string
	assertion corpus.Assertion
}

// trapKeys are the headings of the grammar that plant no affirmed factor.
var trapKeys = func() []trap {
	var out []trap
	for _, key := range language.keys {
		factor, assertion, _ := strings.Cut(key, " ")
		switch a := corpus.Assertion(assertion); a {
		case corpus.Denied, corpus.Possible, corpus.Advised, corpus.Elsewhere:
			out = append(out, trap{key, factor, a})
		}
	}
	return out
}()

// lexicalTraps are the topics whose words only look like factors.
var lexicalTraps = []trap{{key: "vmcweather", factor: "vmc-weather"},
	{key: "controlword", factor: "control-word"}, {key: "enginestall", factor: "engine-stall"}}

// drawTraps draws the traps of a telling: in about a third of them at least
// one.
func (t *telling) drawTraps() (factors []trap, words []trap) {
	m := t.maker
	wanted := 0
	if m.chance(23) {
		wanted = 1
		if m.chance(25) {
			wanted = 2
		}
	}
	for tries := 0; len(factors) < wanted && tries < 30; tries++ {
		c := trapKeys[m.n(len(trapKeys))]
		if t.allows(c) && !slices.ContainsFunc(factors, func(o trap) bool { return o.factor == c.factor }) {
			factors = append(factors, c)
		}
	}
	if m.chance(15) {
		words = append(words, lexicalTraps[bits.Len(uint(m.n(8)))%3]) // 5/8, 1/8, 2/8
	}
	return factors, words
}

// allows tells whether a trap can be set without contradicting the plot.
func (t *telling) allows(c trap) bool {
	chain := t.plot.chain
	has := func(is func(string) bool) bool {
		return slices.ContainsFunc(chain, func(s planted) bool { return is(s.factor) })
	}
	related := has(func(f string) bool { return family[f]&family[c.factor] != 0 })
	told := c.assertion == corpus.Advised || c.assertion == corpus.Elsewhere
	switch {
	case told:
	case t.plot.event.mild && c.assertion == corpus.Possible, t.plot.event.story != "", related:
		return false
	case !t.plot.event.invites(c.factor), c.factor == "recovered" && !has(isLoss):
		return false
	}
	return t.allowed(c.key, t.form)
}

// allowed tells whether the scene allows a clause of the group in a form.
func (t *telling) allowed(key string, f form) bool {
	g := language.groups[key]
	return g != nil && slices.ContainsFunc(g[f], func(c *clause) bool { return c.needs&^t.holds == 0 })
}

// setTraps tells the traps of the given assertions.
func (t *telling) setTraps(traps []trap, assertions ...corpus.Assertion) {
	for _, c := range traps {
		if !slices.Contains(assertions, c.assertion) {
			continue
		}
		if l := t.choose(c.key, t.form, false); l != nil {
			t.full()
			t.write(l, c.factor, c.assertion)
			t.stop()
		}
	}
}
