package main

import (
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"catena/ingest/corpus"
	"catena/queries"
	"catena/queries/filter"
)

type trendOptions struct {
	by, per string
	scale   float64
}

func newTrendCommand(g *globalOptions) *cobra.Command {
	o := &trendOptions{}
	cmd := &cobra.Command{
		Use:   "trend [FACTOR...]",
		Short: "Count factors by month, quarter, year or field: counts, shares, rates",
		Long: `Counts the occurrences whose narratives affirm a factor, or all occurrences
where no factor is named. A share is over the occurrences of the row that have
a usable narrative; a rate is per 100,000 flight hours (--scale, --per) where
exposure is loaded that covers the source counted. Both come with 95%
intervals. Notes under the table say what to know before believing a figure.`,
		Example: `  catena trend slow-airspeed --by year
  catena trend wrong-rudder checklist-skipped --by quarter --only 'source = tarnwick'
  catena trend --by operation --as csv > occurrences.csv`,
		ValidArgsFunction: factorNames,
		RunE:              func(cmd *cobra.Command, ids []string) error { return runTrend(cmd, g, o, ids) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addScope(f)
	g.addAs(f, "text", "text, csv, json or md")
	f.StringVar(&o.by, "by", "year", "month, quarter, year, or a field such as source or place")
	f.StringVar(&o.per, "per", "hours", "rates per hours or departures")
	f.Float64Var(&o.scale, "scale", 100_000, "rates per so many hours or departures")
	return cmd
}

func runTrend(cmd *cobra.Command, g *globalOptions, o *trendOptions, ids []string) error {
	if err := factors(cmd, ids); err != nil {
		return err
	}
	fields := append([]string{string(corpus.ByMonth), string(corpus.ByQuarter), string(corpus.ByYear)}, filter.FieldNames()...)
	switch {
	case !slices.Contains(fields, o.by) && !strings.HasPrefix(o.by, "extra."):
		err := usage(cmd, "--by: no field is called %q", o.by)
		return hint(err, "there are "+strings.Join(fields, ", "))
	case o.per != "hours" && o.per != "departures":
		return usage(cmd, "--per: %q is neither hours nor departures", o.per)
	case !(o.scale > 0):
		return usage(cmd, "--scale: want a number above 0")
	}
	c, scope, err := g.openScoped(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	exposure, err := c.Store.Exposure(cmd.Context())
	if err != nil {
		return err
	}
	t, err := queries.Trend(c.Store.Count(cmd.Context()), exposure, queries.TrendOptions{
		Scope: scope, Factors: ids, By: o.by, Per: o.per, Scale: o.scale, Level: 0.95,
	})
	if err != nil {
		return err
	}
	if err := addVersions(cmd.Context(), c, t); err != nil {
		return err
	}
	return g.write(cmd, t)
}
