package classify

import (
	"strings"

	"catena/classify/text"
)

// when is what a text tells of the time of a hit.
type when struct {
	clock   float64 // seconds of the day, as a clock or a recorder tells them
	hasTime bool
	later   float64 // seconds after the link told just before it
	hasGap  bool
}

// stamp is a time told in a sentence: a time of day, or so many seconds later.
type stamp struct {
	at      int // byte where it begins
	seconds float64
	gap     bool // "four seconds later": since what was told before
	after   bool // "four seconds after": since what is told behind it
}

// stamps finds the times told in a sentence, in order of place.
func (c *Classifier) stamps(d *text.Doc, s text.Sentence) []stamp {
	var out []stamp
	from, to := s.Start, s.End
	for i := from; i < to; {
		seconds, width := clockAt(d.Text[:to], i)
		if width == 0 {
			i++
			continue
		}
		out = append(out, stamp{at: i, seconds: seconds})
		i += width
	}
	if len(out) == 0 && !strings.Contains(strings.ToLower(s.Of(d.Text)), "later") && !strings.Contains(strings.ToLower(s.Of(d.Text)), "after") {
		return nil
	}
	for _, m := range c.book.Lexicon.Measures(d, s) {
		if m.Kind != "time" {
			continue
		}
		next := m.Token + 1
		for next < s.Last && d.Tokens[next].Start < m.End { // the unit
			next++
		}
		switch c.word(d, next) {
		case "later", "afterward", "afterwards", "thereafter":
			out = append(out, stamp{at: m.Start, seconds: m.Value, gap: true})
		case "after":
			out = append(out, stamp{at: m.Start, seconds: m.Value, after: true})
		default:
			if m.Token > s.First && c.word(d, m.Token-1) == "after" || m.Token > s.First+1 && c.word(d, m.Token-2) == "after" {
				out = append(out, stamp{at: m.Start, seconds: m.Value, gap: true})
			}
		}
	}
	return out
}

// clockAt reads a time of day at i: 14:02:11, 14:02, 1402:11, or 1402 before
// "local", "UTC", "hours" or "Z". Width 0 where there is none. A time with a
// comma or point behind it (14:02:11.5) keeps its whole seconds.
func clockAt(s string, i int) (seconds float64, width int) {
	if !digit(s, i) || i > 0 && (digit(s, i-1) || strings.IndexByte(".,:/-", s[i-1]) >= 0) {
		return 0, 0
	}
	n := 0
	for digit(s, i+n) {
		n++
	}
	hour, minute, second, end := -1, -1, 0, i+n
	two := func(at int) int { return int(s[at]-'0')*10 + int(s[at+1]-'0') }
	pair := func(at int) bool {
		return at < len(s) && s[at] == ':' && digit(s, at+1) && digit(s, at+2) && !digit(s, at+3)
	}
	switch {
	case n == 4 && pair(end):
		hour, minute, second, end = two(i), two(i+2), two(end+1), end+3
	case (n == 1 || n == 2) && pair(end):
		hour, minute = int(s[i]-'0'), two(end+1)
		if n == 2 {
			hour = two(i)
		}
		if end += 3; pair(end) {
			second, end = two(end+1), end+3
		}
	case n == 4 && dayWord(s[end:]):
		hour, minute = two(i), two(i+2)
	default:
		return 0, 0
	}
	if hour > 23 || minute > 59 || second > 59 {
		return 0, 0
	}
	return float64(hour*3600 + minute*60 + second), end - i
}

func digit(s string, i int) bool { return i >= 0 && i < len(s) && s[i] >= '0' && s[i] <= '9' }

// dayWord tells whether what follows makes four digits a time of day.
func dayWord(s string) bool {
	s = strings.TrimPrefix(s, " ")
	for _, w := range []string{"local", "LOCAL", "UTC", "hours", "HRS", "hrs", "Z", "LCL", "central", "eastern", "pacific", "mountain"} {
		if rest, ok := strings.CutPrefix(s, w); ok && (rest == "" || rest[0] < 'A' || rest[0] > 'z') {
			return true
		}
	}
	return false
}

// times tells the time of each of the affirmed hits of a sentence: a stamp
// holds for what follows it, and one at the end for what stands ahead of it
// ("the propeller stopped at 14:02:11").
func times(stamps []stamp, starts []int) []when {
	out := make([]when, len(starts))
	for k, start := range starts {
		last, next := -1, -1
		for i, st := range stamps {
			switch {
			case st.at < start:
				last = i
			case next < 0:
				next = i
			}
		}
		w := &out[k]
		switch {
		case last >= 0 && !stamps[last].after:
			st := stamps[last]
			if st.gap {
				// only the first behind it is so much later
				if k == 0 || starts[k-1] < st.at {
					w.later, w.hasGap = st.seconds, true
				}
			} else {
				w.clock, w.hasTime = st.seconds, true
			}
		case last < 0 && next >= 0 && !stamps[next].gap:
			st := stamps[next]
			if st.after {
				if k+1 < len(starts) && starts[k+1] > st.at {
					w.later, w.hasGap = st.seconds, true // the earlier one is told behind it
				}
			} else {
				w.clock, w.hasTime = st.seconds, true
			}
		}
	}
	return out
}
