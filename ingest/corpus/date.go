package corpus

import (
	"fmt"
	"strconv"
	"time"
)

// Precision is how much of a date is known.
type Precision int

// The precisions of a Date, from nothing known to the day known.
const (
	Unknown Precision = iota
	ToYear
	ToMonth
	ToDay
)

// Date is a calendar date of reduced precision (ISO 8601: "2019", "2019-01"
// or "2019-01-31"). The zero Date is an unknown date.
//
// Invariants: Year is 1..9999 when anything is known; Month is 0 (unknown) or
// 1..12; Day is 0 (unknown) or a day that the month has; a day is known only
// with its month.
type Date struct {
	Year, Month, Day int
}

// ParseDate reads "2019", "2019-01" or "2019-01-31". The empty string is the
// unknown date. Any other form, and a day that does not exist, is an error.
func ParseDate(s string) (Date, error) {
	if s == "" {
		return Date{}, nil
	}
	part := func(from, to int) (int, bool) {
		n := 0
		for _, c := range []byte(s[from:to]) {
			if c < '0' || c > '9' {
				return 0, false
			}
			n = n*10 + int(c-'0')
		}
		return n, true
	}
	var d Date
	ok := len(s) == 4 || len(s) == 7 && s[4] == '-' || len(s) == 10 && s[4] == '-' && s[7] == '-'
	if ok {
		d.Year, ok = part(0, 4)
	}
	if ok && len(s) >= 7 {
		d.Month, ok = part(5, 7)
		ok = ok && d.Month != 0
	}
	if ok && len(s) == 10 {
		d.Day, ok = part(8, 10)
		ok = ok && d.Day != 0
	}
	if !ok {
		return Date{}, fmt.Errorf("date %q: want the form 2019, 2019-01 or 2019-01-31", s)
	}
	if err := d.Check(); err != nil {
		return Date{}, fmt.Errorf("date %q: %w", s, err)
	}
	return d, nil
}

// Check returns an error when the date breaks an invariant.
func (d Date) Check() error {
	switch {
	case d == Date{}:
		return nil
	case d.Year < 1 || d.Year > 9999:
		return fmt.Errorf("no such year")
	case d.Month < 0 || d.Month > 12:
		return fmt.Errorf("no such month")
	case d.Day < 0 || d.Day > 0 && d.Month == 0:
		return fmt.Errorf("no such day")
	case d.Day > 0 && d.Day > daysIn(d.Year, d.Month):
		return fmt.Errorf("no such day")
	}
	return nil
}

// daysIn is the number of days of a month in the Gregorian calendar.
func daysIn(year, month int) int {
	return time.Date(year, time.Month(month)+1, 0, 0, 0, 0, 0, time.UTC).Day()
}

// Precision tells how much of the date is known.
func (d Date) Precision() Precision {
	switch {
	case d.Year == 0:
		return Unknown
	case d.Month == 0:
		return ToYear
	case d.Day == 0:
		return ToMonth
	}
	return ToDay
}

// String writes the date in ISO 8601, no finer than it is known.
func (d Date) String() string {
	switch d.Precision() {
	case Unknown:
		return ""
	case ToYear:
		return fmt.Sprintf("%04d", d.Year)
	case ToMonth:
		return fmt.Sprintf("%04d-%02d", d.Year, d.Month)
	}
	return fmt.Sprintf("%04d-%02d-%02d", d.Year, d.Month, d.Day)
}

// Bounds are the first and last day that the date can mean; both are the zero
// Date when nothing is known.
func (d Date) Bounds() (first, last Date) {
	first, last = d, d
	switch d.Precision() {
	case Unknown:
		return Date{}, Date{}
	case ToYear:
		first.Month, last.Month = 1, 12
		first.Day, last.Day = 1, 31
	case ToMonth:
		first.Day, last.Day = 1, daysIn(d.Year, d.Month)
	}
	return first, last
}

// Compare orders dates by their text form; an unknown date comes first and a
// coarse date before the finer dates that it contains.
func (d Date) Compare(o Date) int {
	for _, p := range [3][2]int{{d.Year, o.Year}, {d.Month, o.Month}, {d.Day, o.Day}} {
		if p[0] != p[1] {
			if p[0] < p[1] {
				return -1
			}
			return 1
		}
	}
	return 0
}

// Grain is the length of a calendar period.
type Grain string

// The grains that a table can count by.
const (
	ByMonth   Grain = "month"
	ByQuarter Grain = "quarter"
	ByYear    Grain = "year"
)

// Period names the period of the given grain that the date falls in, such as
// "2019", "2019-Q1" or "2019-01". It reports false where the date is too
// coarse to tell.
func (d Date) Period(g Grain) (string, bool) {
	switch {
	case d.Year == 0 || g != ByYear && d.Month == 0:
		return "", false
	case g == ByYear:
		return fmt.Sprintf("%04d", d.Year), true
	case g == ByQuarter:
		return fmt.Sprintf("%04d-Q%d", d.Year, (d.Month+2)/3), true
	}
	return fmt.Sprintf("%04d-%02d", d.Year, d.Month), true
}

// Period is a calendar year, quarter or month.
type Period struct {
	Grain Grain
	First Date // its first day
	Last  Date // its last day
}

// ParsePeriod reads "2019", "2019-Q3" or "2019-07".
func ParsePeriod(s string) (Period, error) {
	if len(s) == 7 && s[4] == '-' && (s[5] == 'Q' || s[5] == 'q') {
		year, err := strconv.Atoi(s[:4])
		q := int(s[6] - '0')
		if err == nil && year > 0 && q >= 1 && q <= 4 {
			last := q * 3
			return Period{ByQuarter, Date{year, last - 2, 1}, Date{year, last, daysIn(year, last)}}, nil
		}
	} else if d, err := ParseDate(s); err == nil {
		first, last := d.Bounds()
		switch d.Precision() {
		case ToYear:
			return Period{ByYear, first, last}, nil
		case ToMonth:
			return Period{ByMonth, first, last}, nil
		}
	}
	return Period{}, fmt.Errorf("period %q: want a year, quarter or month such as 2019, 2019-Q3 or 2019-07", s)
}

// String writes the period as ParsePeriod reads it.
func (p Period) String() string {
	s, _ := p.First.Period(p.Grain)
	return s
}

// Next is the period of the same grain that follows.
func (p Period) Next() Period {
	months := map[Grain]int{ByMonth: 1, ByQuarter: 3, ByYear: 12}[p.Grain]
	t := time.Date(p.First.Year, time.Month(p.First.Month+months), 1, 0, 0, 0, 0, time.UTC)
	first := Date{t.Year(), int(t.Month()), 1}
	s, _ := first.Period(p.Grain)
	next, err := ParsePeriod(s)
	if err != nil { // past the year 9999
		return p
	}
	return next
}

// MarshalText writes the ISO 8601 form.
func (d Date) MarshalText() ([]byte, error) { return []byte(d.String()), nil }

// UnmarshalText reads what ParseDate reads.
func (d *Date) UnmarshalText(b []byte) error {
	v, err := ParseDate(string(b))
	if err == nil {
		*d = v
	}
	return err
}
