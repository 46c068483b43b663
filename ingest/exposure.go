package ingest

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"catena/ingest/corpus"
)

// maxExposureRows bounds an exposure file: a century of months for eighty
// strata.
const maxExposureRows = 100_000

// ReadExposure reads amounts of flying from CSV with a header: period, hours
// and/or departures, covers, and any field of the occurrence as a stratum.
// covers names the source for files without that column; name is the file's,
// for errors. The first bad line is an error, since half a denominator is worse
// than none. A period given twice for one source and stratum is an error that
// names both lines; so are periods that overlap, which check finds.
func ReadExposure(in io.Reader, name, covers string, fields []string) ([]corpus.Exposure, error) {
	r := csv.NewReader(skipMark(in))
	r.TrimLeadingSpace = true
	r.FieldsPerRecord = -1
	header, err := r.Read()
	if errors.Is(err, io.EOF) {
		return nil, fmt.Errorf("%s: the file is empty; want a header such as period,hours,covers", name)
	}
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	columns, err := exposureColumns(header, covers, fields)
	if err != nil {
		return nil, fmt.Errorf("%s:1: %w", name, err)
	}
	var out []corpus.Exposure
	lines := map[string]int{}
	for {
		cells, err := r.Read()
		if errors.Is(err, io.EOF) {
			if len(out) == 0 {
				return nil, fmt.Errorf("%s: a header and no rows", name)
			}
			return out, nil
		}
		if err != nil {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		line, _ := r.FieldPos(0)
		if len(cells) == 1 && strings.TrimSpace(cells[0]) == "" {
			continue
		}
		if len(cells) != len(header) {
			return nil, fmt.Errorf("%s:%d: %d cells, the header has %d", name, line, len(cells), len(header))
		}
		e, err := exposureRow(columns, cells, covers)
		if err != nil {
			return nil, fmt.Errorf("%s:%d: %w", name, line, err)
		}
		key := fmt.Sprint(e.Covers, e.Period, e.Strata)
		if first, ok := lines[key]; ok {
			return nil, fmt.Errorf("%s:%d: the same period and stratum as line %d", name, line, first)
		}
		lines[key] = line
		if out = append(out, e); len(out) > maxExposureRows {
			return nil, fmt.Errorf("%s:%d: more than %d rows", name, line, maxExposureRows)
		}
	}
}

// skipMark drops a byte-order mark.
func skipMark(in io.Reader) io.Reader {
	head := make([]byte, 3)
	n, _ := io.ReadFull(in, head)
	if string(head[:n]) == "\ufeff" {
		return in
	}
	return io.MultiReader(strings.NewReader(string(head[:n])), in)
}

func exposureColumns(header []string, covers string, fields []string) ([]string, error) {
	var columns []string
	for _, h := range header {
		c := strings.ToLower(strings.TrimSpace(h))
		if !slices.Contains([]string{"period", "hours", "departures", "covers"}, c) && !slices.Contains(fields, c) {
			return nil, fmt.Errorf("column %q: want period, hours, departures, covers, or a field of the occurrence such as place", h)
		}
		if slices.Contains(columns, c) {
			return nil, fmt.Errorf("column %q stands twice", h)
		}
		columns = append(columns, c)
	}
	switch {
	case !slices.Contains(columns, "period"):
		return nil, fmt.Errorf("no column period")
	case !slices.Contains(columns, "hours") && !slices.Contains(columns, "departures"):
		return nil, fmt.Errorf("no column hours or departures")
	case covers == "" && !slices.Contains(columns, "covers"):
		return nil, fmt.Errorf("no column covers: which source of occurrences do these amounts stand for? Name it with --covers")
	}
	return columns, nil
}

func exposureRow(columns, cells []string, covers string) (corpus.Exposure, error) {
	e := corpus.Exposure{Covers: covers, Hours: math.NaN(), Departures: math.NaN(), Strata: map[string]string{}}
	for i, c := range columns {
		cell := strings.TrimSpace(cells[i])
		var err error
		switch c {
		case "period":
			e.Period, err = corpus.ParsePeriod(cell)
		case "hours":
			e.Hours, err = amount(cell)
		case "departures":
			e.Departures, err = amount(cell)
		case "covers":
			if cell != "" {
				e.Covers = cell
			}
		default:
			if cell != "" {
				e.Strata[c] = cell
			}
		}
		if err != nil {
			return e, fmt.Errorf("%s: %w", c, err)
		}
	}
	switch {
	case e.Covers == "":
		return e, fmt.Errorf("covers: which source of occurrences is this for?")
	case math.IsNaN(e.Hours) && math.IsNaN(e.Departures):
		return e, fmt.Errorf("neither hours nor departures")
	}
	return e, nil
}

// amount reads a number of hours or departures; an empty cell is not known.
func amount(cell string) (float64, error) {
	if cell == "" {
		return math.NaN(), nil
	}
	x, err := strconv.ParseFloat(strings.ReplaceAll(cell, ",", ""), 64)
	if err != nil || math.IsInf(x, 0) || math.IsNaN(x) || x < 0 {
		return 0, fmt.Errorf("%q is no amount", cell)
	}
	return x, nil
}
