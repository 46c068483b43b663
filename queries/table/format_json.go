package table

import (
	"encoding/json"
	"io"
	"math"
)

// number is null where it is not known.
type number float64

// MarshalJSON implements json.Marshaler.
func (n number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(n)) || math.IsInf(float64(n), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

type testJSON struct {
	Name       string `json:"name"`
	Statistic  number `json:"statistic"`
	P          number `json:"p"`
	Estimate   number `json:"estimate"`
	Low        number `json:"low"`
	High       number `json:"high"`
	Convention string `json:"convention"`
}

// writeJSON writes the whole table with full precision; lists are never null.
func writeJSON(w io.Writer, t *Table, _ Options) error {
	out := struct {
		Title   string     `json:"title"`
		Columns []Column   `json:"columns"`
		Rows    [][]any    `json:"rows"`
		Tests   []testJSON `json:"tests"`
		Notes   []string   `json:"notes"`
	}{t.Title, append([]Column{}, t.Columns...), [][]any{}, []testJSON{}, append([]string{}, t.Notes...)}
	for _, r := range t.Rows {
		row := []any{}
		for _, c := range r {
			if unknown(c) {
				c = nil
			}
			row = append(row, c)
		}
		out.Rows = append(out.Rows, row)
	}
	for _, x := range t.Tests {
		out.Tests = append(out.Tests, testJSON{x.Name, number(x.Statistic), number(x.P), number(x.Estimate), number(x.Low), number(x.High), x.Convention})
	}
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	return e.Encode(out)
}
