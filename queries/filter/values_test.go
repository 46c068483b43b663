package filter

import (
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"

	"catena/ingest/corpus"
)

func parse(t *testing.T, text string) Node {
	t.Helper()
	n, err := Parse(text, vocabulary)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return n
}

// An occurrence's date may be known to the year, the month or the day; a
// comparison holds only if it holds for every day that it can mean.
func TestDatesOfReducedPrecision(t *testing.T) {
	dates := []corpus.Date{{}, {Year: 2014}, {Year: 2014, Month: 3}, {Year: 2014, Month: 3, Day: 9}}
	for _, c := range []struct {
		text string
		want string // for an unknown date, 2014, 2014-03, 2014-03-09
	}{
		{"date = 2014", "nyyy"},
		{"date = 2014-03", "nnyy"},
		{"date = 2014-03-09", "nnny"},
		{"date != 2014", "nnnn"},
		{"date != 2013", "nyyy"},
		{"date != 2014-03", "nnnn"},
		{"date != 2014-04", "nnyy"},
		{"date >= 2014", "nyyy"},
		{"date >= 2014-03", "nnyy"},
		{"date >= 2014-03-02", "nnny"},
		{"date < 2014-03", "nnnn"}, // 2014 may be before, it is not known to be
		{"date < 2014-04", "nnyy"},
		{"date < 2015", "nyyy"},
		{"date > 2013", "nyyy"},
		{"date > 2014", "nnnn"},
		{"date <= 2014", "nyyy"},
		{"date <= 2014-03", "nnyy"},
		{"date <= 2014-03-09", "nnny"},
		{"date ~ 2014-03", "nnyy"},
		{"year = 2014", "nyyy"},
		{"year > 2013", "nyyy"},
		{"month = 2014-03", "nnyy"},
		{"not date < 2014-03", "yyyy"},
	} {
		n := parse(t, c.text)
		for i, d := range dates {
			if got := Eval(n, &corpus.Occurrence{Date: d}, nil); got != (c.want[i] == 'y') {
				t.Errorf("%s of %q: %v", c.text, d, got)
			}
		}
	}
}

// = lies within, != lies outside, and nothing is both before and not before.
func TestDateComparisonsExcludeEachOther(t *testing.T) {
	date := rapid.Custom(func(t *rapid.T) corpus.Date {
		d := corpus.Date{Year: rapid.IntRange(2013, 2015).Draw(t, "year")}
		if rapid.Bool().Draw(t, "with month") {
			d.Month = rapid.IntRange(1, 12).Draw(t, "month")
			if rapid.Bool().Draw(t, "with day") {
				d.Day = rapid.IntRange(1, 28).Draw(t, "day")
			}
		}
		return d
	})
	rapid.Check(t, func(t *rapid.T) {
		o, v := &corpus.Occurrence{Date: date.Draw(t, "have")}, date.Draw(t, "value").String()
		holds := func(op string) bool { return Eval(&Compare{"date", op, v}, o, nil) }
		for _, pair := range [][2]string{{"=", "!="}, {"<", ">="}, {">", "<="}, {"<", ">"}, {"<", "="}, {">", "="}} {
			if holds(pair[0]) && holds(pair[1]) {
				t.Fatalf("%s is both %s and %s %s", o.Date, pair[0], pair[1], v)
			}
		}
		if holds("=") && !(holds("<=") && holds(">=")) {
			t.Fatalf("%s lies within %s but is not at most and at least %s", o.Date, v, v)
		}
	})
}

func TestNumbersCompareAsNumbers(t *testing.T) {
	o := &corpus.Occurrence{Aircraft: corpus.Aircraft{Engines: 2}, Extra: map[string]string{"hours": "350.5", "word": "nan", "big": "Inf"}}
	for text, want := range map[string]bool{
		"engines = 2":         true,
		"engines = 02":        true,
		"engines != 02":       false,
		"engines != 3":        true,
		"engines < 10":        true, // not as text
		"engines ~ 2":         true,
		"extra.hours > 99":    true,
		"extra.hours <= 350":  false,
		"extra.word <= 5":     false, // what is no number has no order
		"extra.word >= 5":     false,
		"extra.big > 5":       false,
		"extra.nothing < 5":   false,
		"extra.hours = 350.5": true,
	} {
		if got := Eval(parse(t, text), o, nil); got != want {
			t.Errorf("%s: %v, want %v", text, got, want)
		}
	}
	if Eval(parse(t, "engines != 2"), &corpus.Occurrence{}, nil) {
		t.Error("an unknown number of engines is not known to differ from 2")
	}
}

// "Not known is not a match" for every field and every comparison; denying
// the comparison takes the unknown in.
func TestWhatIsNotKnownDoesNotMatch(t *testing.T) {
	for _, field := range append(FieldNames(), "extra.x") {
		for _, op := range []string{"=", "!=", "~", "<", "<=", ">", ">="} {
			c := &Compare{field, op, "2014"}
			if Eval(c, &corpus.Occurrence{}, nil) {
				t.Errorf("%s holds of nothing", c)
			}
			if !Eval(&Not{c}, &corpus.Occurrence{}, nil) {
				t.Errorf("not %s does not hold of nothing", c)
			}
		}
	}
}

func TestBindingOfNotAndOr(t *testing.T) {
	for text, want := range map[string]string{
		"stall OR power-loss AND id=1":         "stall or power-loss and id = 1",
		"(stall or power-loss) and id=1":       "(stall or power-loss) and id = 1",
		"not stall and power-loss":             "not stall and power-loss",
		"not (stall and power-loss)":           "not (stall and power-loss)",
		"((stall))":                            "stall",
		"stall and (power-loss and id = 1)":    "stall and (power-loss and id = 1)",
		"factor:stall":                         "stall",
		`place="and"`:                          `place = "and"`,
		`place="Pell" or place = "Upper Pell"`: `place = Pell or place = "Upper Pell"`,
	} {
		if got := parse(t, text).String(); got != want {
			t.Errorf("%s prints as %s, want %s", text, got, want)
		}
	}
}

func TestValuesThatCouldNeverCompare(t *testing.T) {
	for text, want := range map[string]string{
		"extra.x < abc":      "is no number",
		"extra.x < nan":      "is no number",
		"year = 2015-03":     "finer than a year",
		"year >= 2015-03-01": "write date >= 2015-03-01",
		"month = 2015-03-01": "finer than a month",
		"date = 2015-02-30":  "is no date",
		`date = ""`:          "is no date",
	} {
		if _, err := Parse(text, vocabulary); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, want %q", text, err, want)
		}
	}
}

// An error repeats the filter, which may come from a link: it must neither
// drive the terminal nor lose its place under the fault.
func TestErrorsAreHarmlessAndInPlace(t *testing.T) {
	for text, want := range map[string]string{
		"\x1b[31m":             "\n  \uFFFD[31m\n  ^\n",
		"\tstall and\tplcae=1": "\n   stall and plcae=1\n             ^^^^^\n",
		`place = "` + "\u202e": "\n  place = \"\uFFFD\n          ^^",
	} {
		_, err := Parse(text, vocabulary)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %q, want %q", text, err, want)
		}
	}
	_, err := Parse(strings.Repeat("a", 39)+strings.Repeat("é", maxLength), vocabulary)
	if err == nil || !utf8.ValidString(err.Error()) {
		t.Errorf("a cut letter reaches the message: %q", err)
	}
}

// Printing adds blanks; what is read must be readable once printed.
func TestWhatIsReadCanBePrintedAndRead(t *testing.T) {
	conditions := func(n int) string { return strings.TrimSuffix(strings.Repeat("id=1 or ", n), " or ") }
	n := parse(t, conditions(900))
	if again := parse(t, n.String()); again.String() != n.String() {
		t.Error("a long filter does not print as itself")
	}
	text := conditions(1200)
	if len(text) > maxLength {
		t.Fatalf("%d bytes: want fewer than the bound", len(text))
	}
	if _, err := Parse(text, vocabulary); err == nil || !strings.Contains(err.Error(), "when written out") {
		t.Errorf("%.60v", err)
	}
}
