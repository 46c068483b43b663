package main

import (
	"errors"
	"fmt"
	"io"
	"maps"
	"os"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"catena/ingest"
	"catena/ingest/collection"
	"catena/queries"
	"catena/queries/filter"
)

func newExposureCommand(g *globalOptions) *cobra.Command {
	covers := ""
	cmd := &cobra.Command{
		Use:   "exposure PATH",
		Short: "Read flight hours or departures, the denominators of rates",
		Long: `Reads a CSV file with the columns period (2019, 2019-Q3 or 2019-07), hours
and/or departures, covers (the source of occurrences that these amounts stand
for), and any field of the occurrence as a stratum, such as place. The same
period and stratum, read again, is replaced. Periods of different length that
overlap within a stratum are an error.

A rate is given only for occurrences of the source that the exposure covers.`,
		Example: `  catena exposure hours.csv
  catena exposure --covers tarnwick hours.csv`,
		Args: args(cobra.ExactArgs(1)),
		RunE: func(cmd *cobra.Command, paths []string) error { return runExposure(cmd, g, paths[0], covers) },
	}
	g.addAt(cmd.Flags())
	g.addWait(cmd.Flags())
	cmd.Flags().StringVar(&covers, "covers", "", "the source that these amounts stand for, where the file does not say")
	return cmd
}

func runExposure(cmd *cobra.Command, g *globalOptions, path, covers string) (err error) {
	in := cmd.InOrStdin()
	if path != "-" {
		f, err := os.Open(path)
		if err != nil {
			return fmt.Errorf("open exposure: %w", err)
		}
		defer f.Close()
		in = f
	}
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, c.Close()) }()
	return putExposure(cmd, c, in, path, covers)
}

// putExposure reads a file of exposure into the collection and says what it was.
func putExposure(cmd *cobra.Command, c *collection.Collection, in io.Reader, name, covers string) error {
	rows, err := ingest.ReadExposure(in, name, covers, filter.FieldNames())
	if err != nil {
		return hint(err, "catena exposure --help shows what the file must hold")
	}
	if err := c.Store.PutExposure(cmd.Context(), rows, queries.CheckExposure); err != nil {
		return err
	}
	sources := map[string]bool{}
	for _, e := range rows {
		sources[e.Covers] = true
	}
	fmt.Fprintf(cmd.ErrOrStderr(), "%s: %d amounts of flying read, for %s\n", clean(name), len(rows), clean(strings.Join(slices.Sorted(maps.Keys(sources)), ", ")))
	return nil
}
