package ingest

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"catena/ingest/corpus"
)

func TestParseDate(t *testing.T) {
	tests := []struct{ text, order, want string }{
		{"2014-12-31", "", "2014-12-31"},
		{"2014-12", "", "2014-12"},
		{"2014", "", "2014"},
		{"201412", "", "2014-12"},
		{"20141231", "", "2014-12-31"},
		{"2014-1-5", "", "2014-01-05"},
		{"2014/12/31", "dmy", "2014-12-31"},
		{"2014.12.31", "", "2014-12-31"},
		{"2014-12-31 18:10:00+00:00", "", "2014-12-31"},
		{"2014-12-31T23:59:59.999-11:00", "", "2014-12-31"},
		{"2014-12-31T18:10Z", "", "2014-12-31"},
		{"2014-12-31T181000Z", "", "2014-12-31"},
		{"2014-12-31, 18:10 UTC", "", "2014-12-31"},
		{"12/31/2014 3:03:48 PM", "mdy", "2014-12-31"},
		{"31/12/2014 9pm", "dmy", "2014-12-31"},
		{"10-JAN-95", "", "1995-01-10"},
		{"10-jan-49", "", "2049-01-10"},
		{"10-JAN-50", "", "1950-01-10"},
		{"10 January 1995", "", "1995-01-10"},
		{"10 Sept. 1995", "", "1995-09-10"},
		{"Jan 10, 1995", "", "1995-01-10"},
		{"January 10 1995 14:30", "", "1995-01-10"},
		{"1995-MAY-10", "", "1995-05-10"},
		{"May 1995", "", "1995-05"},
		{"1995 May", "", "1995-05"},
		{"5/1995", "", "1995-05"},
		{"10/01/1995", "dmy", "1995-01-10"},
		{"10/01/1995", "mdy", "1995-10-01"},
		{"10/01/95", "dmy", "1995-01-10"},
		{"95/01/10", "ymd", "1995-01-10"},
		{"10.1.1995", "dmy", "1995-01-10"},
		{"31/01/1995", "", "1995-01-31"}, // one reading only
		{"05/05/1995", "", "1995-05-05"}, // the same in any order
		{"29/02/2016", "dmy", "2016-02-29"},

		{"31/02/2019", "dmy", "! no such day"},
		{"29/02/2015", "dmy", "! no such day"},
		{"2019-02-31", "", "! no such day"},
		{"2019-13-01", "", "! no such month"},
		{"20191301", "", "! no such month"},
		{"00/01/2019", "dmy", "! no such day"},
		{"2019-00-01", "", "! no such month"},
		{"0000-00-00", "", "! no such year"},
		{"0000", "", "! not a date"},
		{"13/01/2019", "mdy", "! no such month with the month first"},
		{"03/04/2021", "", "! day and month cannot be told apart; use --dates"},
		{"10/01/1995", "ymd", "! not a date with the year first"},
		{"32-JAN-2019", "", "! no such day"},
		{"soon", "", "! not a date"},
		{"2019-03-04-05", "", "! not a date"},
		{"12345", "", "! not a date"},
		{"99999999999999999999", "", "! not a date"},
		{"2019-03-04 in the morning", "", "! not a date"},
		{"--", "", "! not a date"},
		{strings.Repeat("1 ", 40), "", "! not a date"},
	}
	for _, test := range tests {
		d, err := parseDate(test.text, test.order)
		got := d.String()
		if err != nil {
			got = strings.Replace(err.Error(), fmt.Sprintf("date %q: ", brief(test.text)), "! ", 1)
		}
		if got != test.want {
			t.Errorf("%q with order %q: got %q, want %q", test.text, test.order, got, test.want)
		}
	}
}

// Any day written in any usual form, with the order told, is that day.
func TestDateFormsAgree(t *testing.T) {
	layouts := map[string][]string{
		"":    {"2006-01-02", "20060102", "2 January 2006", "02-Jan-2006", "Jan 2, 2006", "2006/1/2", "2006-01-02T15:04:05Z07:00"},
		"dmy": {"02/01/2006", "2.1.2006", "2-1-2006 15:04"},
		"mdy": {"01/02/2006", "1/2/2006 3:04:05 PM"},
	}
	rapid.Check(t, func(t *rapid.T) {
		day := time.Date(rapid.IntRange(1900, 2099).Draw(t, "year"), 1, 1, 13, 14, 15, 0, time.UTC).
			AddDate(0, 0, rapid.IntRange(0, 364).Draw(t, "day"))
		for order, forms := range layouts {
			for _, layout := range forms {
				d, err := parseDate(day.Format(layout), order)
				if want := (corpus.Date{Year: day.Year(), Month: int(day.Month()), Day: day.Day()}); err != nil || d != want {
					t.Fatalf("%q: got %v, %v", day.Format(layout), d, err)
				}
			}
		}
	})
}

func TestDateOrderOfAColumn(t *testing.T) {
	tests := []struct{ name, dates, told, order, want string }{
		{"day first", "03/04/2021 13/04/2021", "", "dmy", "2021-04-03 2021-04-13"},
		{"month first", "03/04/2021 04/13/2021", "", "mdy", "2021-03-04 2021-04-13"},
		{"a day that is none still shows the order", "03/04/2021 31/02/2021", "", "dmy", "2021-04-03 !"},
		{"two digits, year first", "95/03/04 95/03/14", "", "ymd", "1995-03-04 1995-03-14"},
		{"told", "03/04/2021", "mdy", "mdy", "2021-03-04"},
		{"told, and a row against it", "03/04/2021 13/04/2021", "mdy", "mdy", "2021-03-04 !"},
		{"no order needed", "2021-04-03 3-APR-21 2021", "", "", "2021-04-03 2021-04-03 2021"},
		{"the same either way", "04/04/2021", "", "", "2021-04-04"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			text := "id,Date\n"
			for i, d := range strings.Fields(test.dates) {
				text += fmt.Sprintf("%d,%s\n", i, d)
			}
			items, m := readAll(t, text, Options{Dates: test.told})
			var got []string
			for _, it := range items {
				if it.Occurrence == nil {
					got = append(got, "!")
				} else {
					got = append(got, it.Occurrence.Date.String())
				}
			}
			if s := strings.Join(got, " "); s != test.want || m.DateOrder != test.order {
				t.Errorf("got %s with order %q, want %s with %q", s, m.DateOrder, test.want, test.order)
			}
		})
	}
}

// A row behind the sample that contradicts the order is set aside.
func TestDateAgainstTheOrderBehindTheSample(t *testing.T) {
	text := "id,date\n" + strings.Repeat("1,13/04/2021\n", sampleRows+10) + "2,04/13/2021\n"
	items, _ := readAll(t, text, Options{})
	last := items[len(items)-1].SetAside
	if last == nil || last.Reason != `date "04/13/2021": no such month with the day first` || last.Line != sampleRows+12 {
		t.Errorf("got %+v", last)
	}
}
