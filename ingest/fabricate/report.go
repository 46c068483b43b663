package fabricate

import (
	"slices"
	"unicode/utf8"

	"catena/ingest/corpus"
)

// affirmedKey is the heading of a factor's affirmed clauses.
var affirmedKey, lateKey = func() (affirmed, late map[string]string) {
	affirmed, late = map[string]string{}, map[string]string{}
	for i := range events {
		for _, s := range events[i].steps {
			for _, f := range s.pick {
				affirmed[f] = f + " affirmed"
				if key := f + " late"; language.groups[key] != nil {
					late[f] = key
				}
			}
		}
	}
	return affirmed, late
}()

// tellReport tells the plot at length: opening, circumstances, what happened,
// what came after.
func (t *telling) tellReport(kind string, target int) corpus.Narrative {
	factors, words := t.drawTraps()
	chain, late := t.holdBack()
	t.say("opening")
	t.circumstances(words, target-80*(len(t.plot.chain)+len(factors))-len(t.out))
	t.setTraps(factors, corpus.Elsewhere)
	if t.plot.event.story != "" {
		t.say(t.plot.event.story)
	} else {
		t.tellChain(chain)
	}
	if t.voice == Investigator && t.maker.chance(35) {
		t.out = append(t.out, "\n\n"...)
	}
	t.tellLate(late)
	t.setTraps(factors, corpus.Denied, corpus.Possible)
	t.aftermath(target, func() { t.setTraps(factors, corpus.Advised) })
	return t.seal(kind)
}

// holdBack parts the chain into what is told in its place and what comes to
// light at the end.
func (t *telling) holdBack() (chain, late []planted) {
	for _, s := range t.plot.chain {
		if lateKey[s.factor] != "" && len(t.plot.chain) > 1 && t.maker.chance(40) {
			late = append(late, s)
		} else {
			chain = append(chain, s)
		}
	}
	return chain, late
}

// Topics in the order of telling, before and after the event. The weight is
// how many sentences a topic yields in a long report.
type topic struct {
	key    string
	weight int
}

var (
	beforeTopics = []topic{{"crew", 3}, {"aircraft", 2}, {"weather", 3}, {"field", 2}, {"taxi", 2}, {"atc", 2}, {"enroute", 2}}
	groundTopics = []topic{{"crew", 3}, {"aircraft", 3}, {"weather", 3}, {"field", 3}}
	rollTopics   = []topic{{"crew", 3}, {"aircraft", 2}, {"weather", 3}, {"field", 2}, {"taxi", 2}, {"atc", 2}}
	afterTopics  = []topic{{"aftermath", 3}, {"exam", 4}, {"reflect", 3}, {"admin", 1}}
)

// fillerBytes is the mean length of a filler sentence of each form, as
// measured over the grammar.
var fillerBytes = [forms]int{formInvestigator: 80, formFirst: 60, formCapitals: 54}

// circumstances tells fillers that take up a part of the bytes left: less where
// an accident gives much to tell afterwards.
func (t *telling) circumstances(words []trap, bytes int) {
	topics := beforeTopics
	switch t.plot.event.where {
	case onGround:
		topics = groundTopics
	case onRoll, inClimb:
		topics = rollTopics
	}
	part := 65
	if t.plot.harm.accident() {
		part = 50
	}
	size := fillerBytes[t.form]
	counts := t.shareOut(topics, (bytes*part/100+size/2)/size)
	at := t.maker.n(len(topics))
	for i, c := range topics {
		for range counts[i] {
			t.say(c.key)
		}
		if i == at {
			t.sayTraps(words)
		}
	}
}

func (t *telling) sayTraps(words []trap) {
	for _, w := range words {
		if t.say(w.key) {
			t.traps = append(t.traps, w.factor)
		}
	}
}

// shareOut deals n sentences to the topics, by weight.
func (t *telling) shareOut(topics []topic, n int) (counts [8]int) {
	total := 0
	for _, c := range topics {
		total += c.weight
	}
	for range n {
		r := t.maker.n(total)
		at := slices.IndexFunc(topics, func(c topic) bool { r -= c.weight; return r < 0 })
		for range topics { // on to a topic that still has sentences
			if counts[at] < t.stock(topics[at].key) {
				counts[at]++
				break
			}
			at = (at + 1) % len(topics)
		}
	}
	return counts
}

// stock is how many sentences a topic has for the form of this telling, those
// that the scene does not allow included.
func (t *telling) stock(key string) int {
	if key == "aftermath" {
		key = t.afterKey(key)
	}
	return len(language.groups[key][t.form])
}

// aftermath tells fillers until the target is as near as it gets; advice, if
// any, stands before the closing words.
func (t *telling) aftermath(target int, advise func()) {
	size := fillerBytes[t.form]
	counts := t.shareOut(afterTopics, max(target-len(t.out), 0)/size+3)
	for i, c := range afterTopics {
		if i == len(afterTopics)-1 {
			advise()
		}
		for range counts[i] {
			if target-len(t.out) < size/2 {
				break
			}
			if !t.say(t.afterKey(c.key)) && c.key == "exam" {
				t.say(c.key)
			}
		}
	}
}

// afterKey is the heading of an after topic that suits the outcome. Nobody
// examines a wreck that there is none of.
func (t *telling) afterKey(key string) string {
	accident := t.plot.harm.accident()
	switch {
	case key == "aftermath" && accident:
		return "aftermath acc"
	case key == "aftermath", key == "exam" && !accident && t.maker.chance(75):
		return "aftermath ok"
	}
	return key
}

// tellChain tells the links in order of time, one or two to a sentence.
func (t *telling) tellChain(chain []planted) {
	m, placed, open := t.maker, false, 0
	for i, s := range chain {
		c := t.choose(affirmedKey[s.factor], t.form, true)
		if c == nil {
			continue
		}
		switch {
		case open == 1 && m.chance(45):
			t.raw(pick(m, ", and ", ", and ", "; ", ", then ", " and "))
			open = 2
		default:
			if open > 0 {
				t.stop()
			}
			t.full()
			open = 1
			if !placed && !s.early {
				placed = true
				t.lead(placeTopics[t.plot.event.where])
			} else if i > 0 && m.chance(60) {
				t.lead("connectnext")
			}
		}
		t.write(c, s.factor, corpus.Affirmed)
		if s.early {
			t.stop()
			open = 0
		}
	}
	if open > 0 {
		t.stop()
	}
}

// lead writes words that place the clause after them in time.
func (t *telling) lead(key string) {
	if c := t.choose(key, t.form, true); c != nil {
		t.write(c, "", "")
		t.out = append(t.out, ' ')
	}
}

// tellLate tells what came to light afterwards.
func (t *telling) tellLate(late []planted) {
	for _, s := range late {
		if c := t.choose(lateKey[s.factor], t.form, true); c != nil {
			t.full()
			t.write(c, s.factor, corpus.Affirmed)
			t.stop()
		}
	}
}

// tellCause tells a cause statement as a narrative of its own.
func (t *telling) tellCause() corpus.Narrative {
	t.say("cause")
	return t.seal("cause")
}

// hasCause tells whether at least two links can stand in a cause statement.
func (t *telling) hasCause() bool { return len(t.named()) >= 2 }

// named are the links that the grammar can name by a noun phrase.
func (t *telling) named() []planted {
	var out []planted
	for _, s := range t.plot.chain {
		if !isRecovery(s.factor) && t.allowed(affirmedKey[s.factor], formNoun) {
			out = append(out, s)
		}
	}
	return out
}

// tellCauses writes up to three links as noun phrases, in order of time.
func (t *telling) tellCauses() {
	list := t.named()
	for len(list) > 3 {
		i := t.maker.n(len(list))
		list = slices.Delete(list, i, i+1)
	}
	for i, s := range list {
		switch {
		case i == 0:
		case i == len(list)-1:
			t.raw(pick(t.maker, " and ", ", followed by ", ", which led to ", " and then "))
		default:
			t.raw(", ")
		}
		if c := t.choose(affirmedKey[s.factor], formNoun, true); c != nil {
			t.write(c, s.factor, corpus.Affirmed)
		}
	}
}

// tellSummary tells the chain once more, in the third person, as the office
// that received a voluntary report would.
func (t *telling) tellSummary() corpus.Narrative {
	t.form, t.style = formInvestigator, plain
	t.cast(true)
	t.say("synopsis")
	return t.seal("synopsis")
}

// tellSynopsis writes up to three links as clauses.
func (t *telling) tellSynopsis() {
	list := slices.Clone(t.plot.chain)
	list = slices.DeleteFunc(list, func(s planted) bool { return !t.allowed(affirmedKey[s.factor], formInvestigator) })
	for len(list) > 3 {
		i := 1 + t.maker.n(len(list)-1)
		list = slices.Delete(list, i, i+1)
	}
	for i, s := range list {
		if i > 0 {
			t.raw(pick(t.maker, " and ", ", and ", ", then "))
		}
		if c := t.choose(affirmedKey[s.factor], formInvestigator, true); c != nil {
			t.write(c, s.factor, corpus.Affirmed)
		}
	}
}

// cutAt is where the cut-off remarks stop, in characters, in the middle of a
// sentence or not.
const cutAt = 115

// tellRemark tells at most three links in a line or two.
func (t *telling) tellRemark() corpus.Narrative {
	m := t.maker
	factors, words := t.drawTraps()
	if m.chance(60) {
		t.say("opening")
	}
	if t.plot.event.story != "" {
		t.say(t.plot.event.story)
	}
	list := slices.Clone(t.plot.chain)
	list = slices.DeleteFunc(list, func(s planted) bool { return !t.allowed(affirmedKey[s.factor], formRemark) })
	for len(list) > 3 {
		i := m.n(len(list) - 1) // the last stays
		list = slices.Delete(list, i, i+1)
	}
	for _, s := range list {
		t.full()
		t.write(t.choose(affirmedKey[s.factor], formRemark, true), s.factor, corpus.Affirmed)
		t.stop()
	}
	t.setTraps(factors, corpus.Denied, corpus.Possible, corpus.Advised, corpus.Elsewhere)
	t.sayTraps(words)
	if len(t.out) > cutAt && m.chance(40) {
		t.cut(cutAt)
	}
	return t.seal("remarks")
}

// cut ends the narrative after n characters and forgets the tags and traps
// that do not lie wholly before.
func (t *telling) cut(n int) {
	end := 0
	for range n {
		if end == len(t.out) {
			return
		}
		_, size := utf8.DecodeRune(t.out[end:])
		end += size
	}
	t.out = t.out[:end]
	t.tags = slices.DeleteFunc(t.tags, func(g PlantedTag) bool { return g.End > end })
	t.traps = nil // they come last, so what is left of them is not sure
}
