package table

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// dash stands for what is not known.
const dash = "–"

// shown is a table as people read it: text only, limits folded in.
type shown struct {
	header []string
	right  []bool // columns of numbers stand at the right
	rows   [][]string
}

// forPeople folds and rounds a table, and leaves out columns in which nothing
// is known.
func forPeople(t *Table) shown {
	var s shown
	index := map[string]int{}
	for i, c := range t.Columns {
		index[c.Name] = i
	}
	s.rows = make([][]string, len(t.Rows))
	for i, c := range t.Columns {
		if isLimit(index, c.Name) || empty(t, i) {
			continue
		}
		low, hasLow := index[c.Name+"_low"]
		high, hasHigh := index[c.Name+"_high"]
		folded := hasLow && hasHigh
		name := Clean(strings.ReplaceAll(c.Name, "_", " "))
		if folded {
			name += " (range)"
		}
		s.header = append(s.header, name)
		s.right = append(s.right, isNumber(t, i))
		for r, row := range t.Rows {
			text := cellText(row[i], c.Unit)
			if folded && !unknown(row[i]) {
				text += limits(row[low], row[high], c.Unit)
			}
			s.rows[r] = append(s.rows[r], text)
		}
	}
	return s
}

// isLimit tells whether a column holds the limits of another.
func isLimit(index map[string]int, name string) bool {
	for _, end := range []string{"_low", "_high"} {
		if of, ok := strings.CutSuffix(name, end); ok {
			_, low := index[of+"_low"]
			_, high := index[of+"_high"]
			_, is := index[of]
			return is && low && high
		}
	}
	return false
}

func empty(t *Table, column int) bool {
	return len(t.Rows) > 0 && !slices.ContainsFunc(t.Rows, func(row []Cell) bool {
		return !unknown(row[column]) && row[column] != Cell("")
	})
}

func isNumber(t *Table, column int) bool {
	for _, row := range t.Rows {
		switch row[column].(type) {
		case int, float64:
			return true
		case string:
			return false
		}
	}
	return false
}

// cellText rounds a value for reading: the unit says how far.
func cellText(c Cell, unit string) string {
	if unknown(c) {
		return dash
	}
	switch v := c.(type) {
	case string:
		return Clean(v)
	case int:
		return Thousands(int64(v))
	case float64:
		switch unit {
		case "share":
			return fixed(100*v, 1) + "%"
		case "hours", "departures", "count":
			return fixed(v, 0)
		}
		return fixed(v, decimals(v))
	}
	return Clean(fmt.Sprint(c))
}

// limits writes the limits of a figure behind it: " (6.6-12.1)". A figure
// whose upper limit has no bound has only a lower one; a figure without limits
// has no brackets.
func limits(low, high Cell, unit string) string {
	if unknown(low) && unknown(high) {
		return ""
	}
	from, to := limit(low, unit), limit(high, unit)
	if h, ok := high.(float64); ok && math.IsInf(h, 1) {
		return fmt.Sprintf(" (%s or more)", from)
	}
	if strings.HasPrefix(from, "-") || strings.HasPrefix(to, "-") {
		return fmt.Sprintf(" (%s to %s)", from, to) // a hyphen would read as a sign
	}
	return fmt.Sprintf(" (%s-%s)", from, to)
}

func limit(c Cell, unit string) string { return strings.TrimSuffix(cellText(c, unit), "%") }

// decimals keeps a number to at least two significant digits, so that a small
// rate never reads as none; beyond six decimals it would only be noise.
func decimals(v float64) int {
	switch v = math.Abs(v); {
	case v >= 100:
		return 0
	case v >= 10 || v == 0:
		return 1
	case v >= 0.1:
		return 2
	}
	return min(6, 1-int(math.Floor(math.Log10(v))))
}

// fixed writes a number with that many decimals, the whole part with commas.
func fixed(v float64, decimals int) string {
	s := strconv.FormatFloat(v, 'f', decimals, 64)
	if strings.Trim(s, "-0.") == "" {
		s = strings.TrimPrefix(s, "-") // rounded to nothing: no sign is left
	}
	whole, rest, _ := strings.Cut(s, ".")
	if rest != "" {
		rest = "." + rest
	}
	return commas(whole) + rest
}

// Thousands writes a whole number with commas.
func Thousands(n int64) string { return commas(strconv.FormatInt(n, 10)) }

// commas parts the digits of a whole number in threes.
func commas(s string) string {
	from := 0
	if strings.HasPrefix(s, "-") {
		from = 1
	}
	for i := len(s) - 3; i > from; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

// Clean makes text from outside safe for a terminal: white space becomes one
// space, control characters and those that turn the direction of writing
// become U+FFFD.
func Clean(s string) string {
	var b strings.Builder
	b.Grow(len(s))
	for _, r := range s {
		switch {
		case unicode.IsSpace(r):
			b.WriteByte(' ')
		case unicode.IsControl(r), r == utf8.RuneError, unicode.Is(unicode.Bidi_Control, r):
			b.WriteRune(utf8.RuneError)
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// testText tells a test in one line.
func testText(t Test) string {
	s := t.Name + ":"
	for _, v := range []struct {
		name  string
		value float64
	}{{"statistic", t.Statistic}, {"p", t.P}, {"estimate", t.Estimate}} {
		if !math.IsNaN(v.value) {
			s += fmt.Sprintf(" %s %.4g", v.name, v.value)
		}
	}
	if !math.IsNaN(t.Low) && !math.IsNaN(t.High) {
		s += fmt.Sprintf(" (%.4g to %.4g)", t.Low, t.High)
	}
	if t.Convention != "" {
		s += "; " + t.Convention
	}
	return Clean(s)
}
