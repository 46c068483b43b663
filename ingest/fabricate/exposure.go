package fabricate

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"strconv"

	"catena/ingest/corpus"
)

// hours are the flight hours of a base in a month: a yearly swing between the
// base's low and high, with the school's and the company's slow growth and a
// month's luck, never outside low and high. It depends on the seed and the
// month only, so any stretch of dates has the same hours.
func (o Options) hours(b *base, year, month int) float64 {
	luck := rand.New(rand.NewPCG(o.Seed^uint64(year*12+month), uint64(b.initial[0])<<8|uint64(b.name[0]))).NormFloat64()
	season := (1 - math.Cos(2*math.Pi*float64(month-1)/12)) / 2 // 0 in January, 1 in July
	growth := 0.012 * float64(min(max(year-2019, 0), 12))
	share := 0.08 + 0.74*season + growth + 0.05*luck
	h := b.lowHours + (b.highHours-b.lowHours)*min(max(share, 0), 1)
	return math.Round(h*10) / 10
}

// Exposure is the flying that the occurrences of the options come from: hours
// and departures of each base in each month that the dates touch.
func (o Options) Exposure() []corpus.Exposure {
	o = o.withDefaults()
	var out []corpus.Exposure
	period, err := corpus.ParsePeriod(corpus.Date{Year: o.From.Year, Month: o.From.Month}.String())
	for err == nil && period.First.Compare(o.To) <= 0 {
		for _, b := range bases {
			h := o.hours(b, period.First.Year, period.First.Month)
			out = append(out, corpus.Exposure{
				Period: period, Covers: b.source, Hours: h,
				Departures: math.Round(h / b.hoursPerDeparture),
				Strata:     map[string]string{"place": b.name},
			})
		}
		next := period.Next()
		if next == period {
			break
		}
		period = next
	}
	return out
}

// WriteExposure writes an exposure file: CSV with the columns period, hours,
// departures, covers and place.
func WriteExposure(w io.Writer, list []corpus.Exposure) error {
	c := csv.NewWriter(w)
	c.Write([]string{"period", "hours", "departures", "covers", "place"}) // errors stay in c until Flush
	for _, e := range list {
		c.Write([]string{
			e.Period.String(), strconv.FormatFloat(e.Hours, 'f', -1, 64),
			strconv.FormatFloat(e.Departures, 'f', -1, 64), e.Covers, e.Strata["place"],
		})
	}
	c.Flush()
	if err := c.Error(); err != nil {
		return fmt.Errorf("write exposure: %w", err)
	}
	return nil
}
