package main

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"catena/classify/catalogue"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/queries"
	"catena/queries/filter"
)

// demoFiles is the invented corpus: a flying school and a small charter
// operator, written by hand (written-*) and made by the fabricate command
// (made), with their hours. The truth beside each file is for the tests.
//
//go:embed demo/made.ndjson demo/written-a.ndjson demo/written-b.ndjson demo/written-c.ndjson demo/exposure.csv
var demoFiles embed.FS

// headline4 are the factors that the demo counts.
var headline4 = []string{"wrong-rudder", "checklist-skipped", "power-rollback", "slow-airspeed"}

func newDemoCommand(g *globalOptions) *cobra.Command {
	dir := ""
	cmd := &cobra.Command{
		Use:   "demo",
		Short: "Build a collection from an invented corpus and show what it tells",
		Long: `Builds a collection from the invented corpus inside the program: a flying
school and a charter operator with two bases, seven years, some of it written
by hand. Prints how often four factors occur, the commonest chains, and what to
type next. People, places, operators and aircraft in it belong to nobody.`,
		Example: "  catena demo --dir /tmp/try-catena",
		Args:    args(cobra.NoArgs),
		RunE:    func(cmd *cobra.Command, _ []string) error { return runDemo(cmd, g, dir) },
	}
	cmd.Flags().StringVar(&dir, "dir", "catena-demo", "folder to build in; it may hold nothing else")
	return cmd
}

func runDemo(cmd *cobra.Command, g *globalOptions, dir string) (err error) {
	if err := freeForDemo(dir); err != nil {
		return err
	}
	g.at = dir
	if err := loadDemo(cmd, g); err != nil {
		return err
	}
	c, err := g.open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	if err := showDemo(cmd, c); err != nil {
		return err
	}
	tellNext(cmd.OutOrStdout(), dir)
	return nil
}

// freeForDemo refuses a folder that holds anything but an earlier demo.
func freeForDemo(dir string) error {
	entries, err := os.ReadDir(dir)
	if errors.Is(err, os.ErrNotExist) || err == nil && len(entries) == 0 {
		return nil
	}
	if err != nil {
		return fmt.Errorf("look into %q: %w", dir, err)
	}
	if !exists(filepath.Join(dir, demoMark)) {
		return hint(fmt.Errorf("%q is not empty and holds no demo", dir), "name another folder: catena demo --dir DIR")
	}
	return nil
}

// demoMark is the file that tells a demo collection from a user's own.
const demoMark = "this-is-a-demo.txt"

func loadDemo(cmd *cobra.Command, g *globalOptions) error {
	if err := os.MkdirAll(g.at, 0o755); err != nil {
		return err
	}
	note := "An invented collection, made by catena demo. It may be deleted.\n"
	if err := os.WriteFile(filepath.Join(g.at, demoMark), []byte(note), 0o644); err != nil {
		return err
	}
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer c.Close()
	names, err := demoNarratives()
	if err != nil {
		return err
	}
	bar := newProgress(cmd.ErrOrStderr())
	defer bar.finish()
	for _, name := range names {
		data, err := demoFiles.ReadFile(name)
		if err != nil {
			return err
		}
		sum, err := c.Load(cmd.Context(), "-", collection.LoadOptions{
			In:   bytes.NewReader(data),
			Name: strings.TrimPrefix(name, "demo/"),
			Progress: func(_ string, rows int, read, _ int64) {
				bar.show("building the demo", read, int64(len(data)))
			},
		})
		if err != nil {
			return fmt.Errorf("%s: %w", name, err)
		}
		if sum.SetAside > 0 {
			return fmt.Errorf("%s: %d rows of the demo corpus were set aside", name, sum.SetAside)
		}
	}
	bar.finish()
	if _, err := c.FindDoubles(cmd.Context(), false); err != nil {
		return err
	}
	return loadDemoExposure(cmd, c)
}

// demoNarratives lists the embedded files of occurrences.
func demoNarratives() ([]string, error) {
	entries, err := demoFiles.ReadDir("demo")
	if err != nil {
		return nil, err
	}
	var names []string
	for _, e := range entries {
		if strings.HasSuffix(e.Name(), ".ndjson") {
			names = append(names, "demo/"+e.Name())
		}
	}
	slices.Sort(names)
	return names, nil
}

func showDemo(cmd *cobra.Command, c *collection.Collection) error {
	ctx, out := cmd.Context(), cmd.OutOrStdout()
	totals, err := c.Store.Totals(ctx)
	if err != nil {
		return err
	}
	fmt.Fprintf(out, "%d invented occurrences of a flying school (tarnwick), a charter operator (sellow) and their\nvoluntary reports (hangar-talk), 2019 to 2025. First the two occurrence files, with rates per flight hour:\n\n", totals.Occurrences)
	exposure, err := c.Store.Exposure(ctx)
	if err != nil {
		return err
	}
	tree := catalogue.Builtin()
	only, err := filter.Parse("source = tarnwick or source = sellow", filter.Vocabulary{Factors: tree.IDs()})
	if err != nil {
		return err
	}
	known, err := knownDoubles(ctx, c)
	if err != nil {
		return err
	}
	for i, f := range headline4 {
		t, err := queries.Trend(c.Store.Count(ctx), exposure, queries.TrendOptions{
			Scope: queries.Scope{Only: only, Tree: tree, Doubles: known}, Factors: []string{f}, By: string(corpus.ByYear), Per: "hours", Scale: 100_000, Level: 0.95,
		})
		if err != nil {
			return err
		}
		t.Title = f
		if i < len(headline4)-1 {
			t.Notes = nil // they are the same under each table; the last one tells them
		}
		if err := writeTable(cmd, t, "text"); err != nil {
			return err
		}
		fmt.Fprintln(out)
	}
	t, err := queries.Chains(c.Store.Count(ctx), queries.ChainOptions{Scope: queries.Scope{Tree: tree, Doubles: known}, Most: 8, Level: 0.95})
	if err != nil {
		return err
	}
	return writeTable(cmd, t, "text")
}

func tellNext(out io.Writer, dir string) {
	at := "--at " + dir
	fmt.Fprintf(out, `
What to type next:
  catena trend wrong-rudder --by place --only 'source = sellow' %[1]s
  catena find 'friction lock' %[1]s
  catena find --only 'slow-airspeed and power-loss' %[1]s
  catena case HT-24-001 %[1]s
  catena doubles %[1]s
  catena load YOUR-FILE.csv                 your own reports, into ./collection

No figure here is a finding of cause. The investigating authority, the aircraft flight manual,
local regulations and licensed instructors come first.
`, at)
}

func loadDemoExposure(cmd *cobra.Command, c *collection.Collection) error {
	data, err := demoFiles.ReadFile("demo/exposure.csv")
	if err != nil {
		return err
	}
	return putExposure(cmd, c, bytes.NewReader(data), "exposure.csv", "")
}
