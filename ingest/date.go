package ingest

import (
	"fmt"
	"regexp"
	"strings"

	"catena/ingest/corpus"
)

// The orders of day, month and year in a date of three numbers.
const (
	dayFirst   = "dmy"
	monthFirst = "mdy"
	yearFirst  = "ymd"
)

// dateOrders are all the orders, each with the places of year, month and day.
var dateOrders = []struct {
	name             string
	words            string
	year, month, day int
}{
	{dayFirst, "the day first", 2, 1, 0},
	{monthFirst, "the month first", 2, 0, 1},
	{yearFirst, "the year first", 0, 1, 2},
}

// orderWords says in words which part of a date comes first.
func orderWords(order string) string {
	for _, o := range dateOrders {
		if o.name == order {
			return o.words
		}
	}
	return ""
}

// Two-digit years from 50 to 99 are of the twentieth century and the others
// of the twenty-first, about as in POSIX strptime (which turns at 69); 50
// because safety databases reach back to the sixties.
const centuryTurn = 50

// timeOfDay is what may follow a date: a time with a colon, with "am" or "pm",
// or behind a "T", and its zone. Four bare digits are not taken for a time:
// they are the year in "10 January 1995".
var timeOfDay = regexp.MustCompile(`^(?:[Tt]\d{2}(?::?\d{2}){0,2}|(?:\s*,)?\s*\d{1,2}(?::\d{2}){1,2}|(?:\s*,)?\s*\d{1,2}(?:\s*[AaPp]\.?[Mm]\.?))(?:[.,]\d+)?` +
	`\s*(?:[AaPp]\.?[Mm]\.?)?\s*(?:[Zz]|[A-Za-z]{3,4}|(?:UTC|GMT)?[+-]\d{2}:?(?:\d{2})?)?$`)

// splitTime cuts a time of day off a date, if one follows.
func splitTime(s string) string {
	for i, c := range []byte(s) {
		if (c == ' ' || c == 'T' || c == 't' || c == ',') && i >= 4 && timeOfDay.MatchString(s[i:]) {
			return s[:i]
		}
	}
	return s
}

// dateParts is a date as its parts are written.
type dateParts struct {
	part   [3]string // up to three groups of digits, or a month's name
	n      int
	month  int  // number of the month where it is named, else 0
	atName int  // which part is the name
	slash  bool // three groups of digits of which the last may be the year
}

// parseDate reads a cell. Order matters only for three numbers of which the
// first is no four-digit year; with order "" such a date is an error unless
// only one reading is a date. The calendar date is taken as it is written, no
// zone shifts it.
//
// Forms: 2014, 2014-12, 2014-12-31, 201412, 20141231, 12/2014, 31/12/2014,
// 31.12.14, 10-JAN-95, 10 January 1995, Jan 10, 1995, January 1995; each may
// be followed by a time.
func parseDate(s, order string) (corpus.Date, error) {
	if d, err := corpus.ParseDate(s); err == nil && d.Year > 0 {
		return d, nil
	}
	p, ok := partsOf(s)
	if !ok {
		return corpus.Date{}, fmt.Errorf("date %q: not a date", brief(s))
	}
	d, err := p.date(order)
	if err == nil {
		err = d.Check()
	}
	if err == nil && d.Year == 0 {
		err = fmt.Errorf("no such year")
	}
	if err != nil {
		return corpus.Date{}, fmt.Errorf("date %q: %w", brief(s), err)
	}
	return d, nil
}

// monthNames are the English months; three letters are enough.
var monthNames = []string{"january", "february", "march", "april", "may", "june", "july",
	"august", "september", "october", "november", "december"}

// maxDate is longer than any date with its time; it keeps a narrative in a
// column of dates from being tried at every blank.
const maxDate = 64

// partsOf cuts a date, without its time, at blanks, slashes, points, hyphens and commas.
func partsOf(s string) (dateParts, bool) {
	p := dateParts{}
	if len(s) > maxDate {
		return p, false
	}
	s = splitTime(s)
	for _, word := range strings.FieldsFunc(s, func(r rune) bool { return strings.ContainsRune(" /.-,\t", r) }) {
		if p.n == 3 {
			return p, false
		}
		if month := monthNamed(word); month > 0 && p.month == 0 {
			p.month, p.atName = month, p.n
		} else if digits(word) == 0 || len(word) > 4 && len(s) != len(word) {
			return p, false
		}
		p.part[p.n] = word
		p.n++
	}
	p.slash = p.n == 3 && p.month == 0 && len(p.part[0]) < 3
	return p, p.n > 0
}

// monthNamed is the number of the month that a word names, or 0.
func monthNamed(word string) int {
	if len(word) < 3 {
		return 0
	}
	word = strings.ToLower(word)
	for i, name := range monthNames {
		if strings.HasPrefix(name, word) || word == "sept" && name == "september" {
			return i + 1
		}
	}
	return 0
}

// digits is the number of digits of a word of digits only, else 0.
func digits(s string) int {
	for _, c := range []byte(s) {
		if c < '0' || c > '9' {
			return 0
		}
	}
	return len(s)
}

// number is the value of a word of at most eight digits.
func number(s string) int {
	n := 0
	for _, c := range []byte(s) {
		n = n*10 + int(c-'0')
	}
	return n
}

// yearOf widens two digits to a year.
func yearOf(s string) int {
	y := number(s)
	switch {
	case len(s) != 2:
		return y
	case y < centuryTurn:
		return 2000 + y
	}
	return 1900 + y
}

// date puts the parts together.
func (p dateParts) date(order string) (corpus.Date, error) {
	a, b, c := p.part[0], p.part[1], p.part[2]
	switch {
	case p.slash:
		return p.ordered(order)
	case p.month > 0:
		return p.named()
	case p.n == 3 && len(a) == 4 && len(b) <= 2 && len(c) <= 2: // 2014-12-31
		return checked(number(a), number(b), number(c))
	case p.n == 2 && len(a) == 4 && len(b) <= 2: // 2014-1
		return checked(number(a), number(b), -1)
	case p.n == 2 && len(a) <= 2 && len(b) == 4: // 12/2014
		return checked(number(b), number(a), -1)
	case p.n == 1 && len(a) == 8: // 20141231
		return checked(number(a[:4]), number(a[4:6]), number(a[6:]))
	case p.n == 1 && len(a) == 6: // 201412
		return checked(number(a[:4]), number(a[4:]), -1)
	}
	return corpus.Date{}, fmt.Errorf("not a date")
}

// checked makes a date of a month and day that are given, so that 0 is
// neither; day -1 stands for no day given.
func checked(year, month, day int) (corpus.Date, error) {
	switch {
	case year == 0:
		return corpus.Date{}, fmt.Errorf("no such year")
	case month == 0:
		return corpus.Date{}, fmt.Errorf("no such month")
	case day == 0:
		return corpus.Date{}, fmt.Errorf("no such day")
	}
	return corpus.Date{Year: year, Month: month, Day: max(day, 0)}, nil
}

// named reads a date with the month's name: the name first or second of
// three, or before or behind the year.
func (p dateParts) named() (corpus.Date, error) {
	a, b, c := p.part[0], p.part[1], p.part[2]
	isYear := func(s string) bool { return len(s) == 4 || len(s) == 2 }
	switch {
	case p.n == 2 && p.atName == 0 && len(b) == 4:
		return checked(number(b), p.month, -1)
	case p.n == 2 && p.atName == 1 && len(a) == 4:
		return checked(number(a), p.month, -1)
	case p.n == 3 && p.atName == 0 && len(b) <= 2 && isYear(c): // Jan 10, 1995
		return checked(yearOf(c), p.month, number(b))
	case p.n == 3 && p.atName == 1 && len(a) == 4 && len(c) <= 2: // 1995-JAN-10
		return checked(number(a), p.month, number(c))
	case p.n == 3 && p.atName == 1 && len(a) <= 2 && isYear(c): // 10-JAN-95
		return checked(yearOf(c), p.month, number(a))
	}
	return corpus.Date{}, fmt.Errorf("not a date")
}

// ordered reads three numbers in an order.
func (p dateParts) ordered(order string) (corpus.Date, error) {
	if order == "" {
		readings := p.orders()
		if len(readings) == 0 {
			return corpus.Date{}, fmt.Errorf("no such day")
		}
		first, err := p.ordered(readings[0])
		for _, o := range readings[1:] {
			if d, _ := p.ordered(o); d != first {
				return corpus.Date{}, fmt.Errorf("day and month cannot be told apart; use --dates")
			}
		}
		return first, err
	}
	for _, o := range dateOrders {
		if o.name != order {
			continue
		}
		year, month, day := p.part[o.year], p.part[o.month], p.part[o.day]
		switch {
		case len(year) != 4 && len(year) != 2, len(month) > 2, len(day) > 2:
			return corpus.Date{}, fmt.Errorf("not a date with %s", o.words)
		case number(month) > 12:
			return corpus.Date{}, fmt.Errorf("no such month with %s", o.words)
		}
		return checked(yearOf(year), number(month), number(day))
	}
	return corpus.Date{}, fmt.Errorf("no such order of dates %q", order)
}

// orders are the orders in which the parts can be a date at all: whether the
// month has that day is not asked, so that 31/02/2019 still shows that the
// day comes first.
func (p dateParts) orders() []string {
	var fit []string
	for _, o := range dateOrders {
		if d, err := p.ordered(o.name); err == nil && d.Day <= 31 {
			fit = append(fit, o.name)
		}
	}
	return fit
}

// dateEvidence gathers what the values of one column say about its order.
type dateEvidence struct {
	seen      [3]dateSighting // by index into dateOrders: a value that fits this order and not all others seen
	left      []string        // the orders that fit all the values
	first     dateSighting    // the first value that says something
	undecided dateSighting    // the first value that has several readings
}

// dateSighting is a value and the line that it stands on.
type dateSighting struct {
	text string
	line int
}

// add takes one value into account. It returns an error when no order fits
// all the values so far.
func (e *dateEvidence) add(text string, line int) error {
	p, ok := partsOf(text)
	if !ok || !p.slash {
		return nil
	}
	fit := p.orders()
	if len(fit) == 0 {
		return nil // no date in any order; its row is set aside
	}
	now := dateSighting{text, line}
	if e.left == nil {
		e.left, e.first = fit, now
	} else if left := intersect(e.left, fit); len(left) == 0 {
		before := e.first
		for i, o := range dateOrders {
			if o.name == e.left[0] && e.seen[i].text != "" {
				before = e.seen[i]
			}
		}
		return fmt.Errorf("line %d has %q, with %s, and line %d has %q, with %s: use --dates dmy|mdy|ymd to say which holds",
			before.line, before.text, orderWords(e.left[0]), line, text, orderWords(fit[0]))
	} else {
		e.left = left
	}
	if len(fit) == 1 {
		for i, o := range dateOrders {
			if o.name == fit[0] && e.seen[i].text == "" {
				e.seen[i] = now
			}
		}
	}
	if _, err := p.ordered(""); err != nil && len(fit) > 1 && e.undecided.text == "" {
		e.undecided = now
	}
	return nil
}

// intersect keeps the members of a that are in b.
func intersect(a, b []string) []string {
	var both []string
	for _, x := range a {
		for _, y := range b {
			if x == y {
				both = append(both, x)
			}
		}
	}
	return both
}

// order is the order that all values agree on; "" when none is needed. It is
// an error when the values leave a choice that matters.
func (e *dateEvidence) order() (string, error) {
	switch {
	case len(e.left) == 1:
		return e.left[0], nil
	case e.undecided.text != "":
		return "", fmt.Errorf("day and month cannot be told apart, as in %q on line %d: use --dates dmy|mdy|ymd",
			e.undecided.text, e.undecided.line)
	}
	return "", nil
}
