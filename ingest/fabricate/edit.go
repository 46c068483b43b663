package fabricate

import (
	"regexp"
	"slices"
	"strings"
	"time"

	"catena/ingest/corpus"
)

// edits are words that an editor changes without changing what is told; none
// of them stands in words that show a factor's opposite.
var edits = strings.NewReplacer(
	"The aircraft", "The aeroplane", "the aircraft", "the aeroplane", "approximately", "about", "some ", "roughly ", "The weather", "The meteorological conditions",
	" minutes", " min", " hours", " hrs", "morning", "forenoon", "The student", "The trainee", "The trainee", "The student", "had been", "was", "in the last", "during the last",
	"THE AIRCRAFT", "THE AEROPLANE", " MINUTES", " MIN", "MORNING", "FORENOON",
)

// sentence is a sentence with the white space that follows it.
var sentence = regexp.MustCompile(`[^.!?]*[.!?]*\s*`)

// edit makes of an occurrence what another agency printed of it: a sentence in
// six is left out, words are changed, the day or the place may be told
// otherwise. What shows a factor stays, with its place in the new text.
func (m *Maker) edit(o corpus.Occurrence, t Truth) (corpus.Occurrence, Truth) {
	narratives := slices.Clone(o.Narratives)
	tags := slices.Clone(t.Tags)
	for n := range narratives {
		narratives[n].Text = m.editText(narratives[n].Text, n, tags)
	}
	o.Narratives, t.Tags = narratives, tags
	if o.Date.Day > 0 && m.chance(10) {
		next := time.Date(o.Date.Year, time.Month(o.Date.Month), o.Date.Day+1, 0, 0, 0, 0, time.UTC)
		o.Date = corpus.Date{Year: next.Year(), Month: int(next.Month()), Day: next.Day()}
	}
	if m.chance(30) {
		o.Place += " aerodrome"
	}
	return o, t
}

// editText edits one narrative and moves its tags along. Words that show a
// factor are copied as they are; between them, words are changed, and
// sentences that lie wholly between them may be left out.
func (m *Maker) editText(text string, narrative int, tags []PlantedTag) string {
	var shown []corpus.Span
	for _, g := range tags {
		if g.Narrative == narrative {
			shown = append(shown, g.Span)
		}
	}
	slices.SortFunc(shown, func(a, b corpus.Span) int { return a.Start - b.Start })
	type move struct {
		old corpus.Span
		by  int
	}
	var moves []move
	var b strings.Builder
	at := 0
	for i := 0; i <= len(shown); i++ {
		if i == len(shown) {
			b.WriteString(m.editBetween(text[at:], at == 0, true))
			break
		}
		whole := shown[i] // with those that overlap it
		for i+1 < len(shown) && shown[i+1].Start <= whole.End {
			i++
			whole.End = max(whole.End, shown[i].End)
		}
		b.WriteString(m.editBetween(text[at:whole.Start], at == 0, false))
		moves = append(moves, move{whole, b.Len() - whole.Start})
		b.WriteString(whole.Of(text))
		at = whole.End
	}
	if strings.TrimSpace(b.String()) == "" { // a remark of one sentence or two
		return edits.Replace(text)
	}
	for i := range tags {
		g := &tags[i]
		if k := slices.IndexFunc(moves, func(v move) bool { return v.old.Contains(g.Span) }); g.Narrative == narrative && k >= 0 {
			g.Start, g.End = g.Start+moves[k].by, g.End+moves[k].by
		}
	}
	return b.String()
}

// editBetween edits text between the words that show factors; begins and ends
// tell whether its first and last sentence are whole.
func (m *Maker) editBetween(text string, begins, ends bool) string {
	var b strings.Builder
	sentences := sentence.FindAllString(text, -1)
	for i, s := range sentences {
		if (i > 0 || begins) && (i < len(sentences)-1 || ends) && m.chance(17) {
			continue
		}
		b.WriteString(edits.Replace(s))
	}
	return b.String()
}
