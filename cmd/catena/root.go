package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"runtime/debug"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"catena/classify"
	"catena/classify/catalogue"
	"catena/classify/rulebook"
	"catena/index"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries"
	"catena/queries/filter"
	"catena/queries/table"
)

func newRootCommand() *cobra.Command {
	// each command has flags of its own, whose defaults may differ
	g := func() *globalOptions { return &globalOptions{} }
	root := &cobra.Command{
		Use:   "catena",
		Short: "Accident and incident patterns, from reports to tables",
		Long: `catena reads occurrence reports, finds the links of loss-of-control chains in
them, and counts: how often, by what period, how sure. Every figure can be
followed to the sentences behind it.

It makes no finding of cause. The investigating authority, the aircraft flight
manual, local regulations and licensed instructors come first.

Exit status: 0 done, 1 failed, 2 wrong usage, 3 done but some input was set aside.`,
		Example: `  catena demo                                   try it on an invented corpus
  catena load reports.csv                       read your own file
  catena trend slow-airspeed --by year          count`,
		Version:       version(),
		SilenceUsage:  true,
		SilenceErrors: true,
		Args: func(cmd *cobra.Command, given []string) error {
			if len(given) == 0 {
				return nil
			}
			err := usage(cmd, "no command is called %q", given[0])
			if near := cmd.SuggestionsFor(given[0]); len(near) > 0 {
				err = hint(err, "did you mean catena "+strings.Join(near, " or catena ")+"?")
			}
			return err
		},
		RunE: func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	root.SetVersionTemplate("{{.Version}}\n")
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error { return &usageError{err, cmd.CommandPath()} })
	root.SuggestionsMinimumDistance = 2
	root.CompletionOptions.HiddenDefaultCmd = false
	root.AddCommand(
		newDemoCommand(g()), newLoadCommand(g()), newExposureCommand(g()), newTagCommand(g()), newFindCommand(g()), newTrendCommand(g()),
		newChainsCommand(g()), newCaseCommand(g()), newDoublesCommand(g()), newExportCommand(g()), newRulesCommand(g()),
		newCheckCommand(g()), newBackupCommand(g()), newRestoreCommand(g()), newRemoveCommand(g()), newManCommand(),
	)
	return root
}

// version tells what was built, and with which rules.
func version() string {
	book, err := rulebook.Builtin()
	rules := "broken"
	if err == nil {
		rules = classify.New(book).Version()
	}
	v, goVersion, commit := "unreleased", "", ""
	if info, ok := debug.ReadBuildInfo(); ok {
		goVersion = info.GoVersion
		if info.Main.Version != "" && info.Main.Version != "(devel)" {
			v = info.Main.Version
		}
		for _, s := range info.Settings {
			if s.Key == "vcs.revision" {
				commit = ", commit " + s.Value
			}
		}
	}
	return fmt.Sprintf("catena %s (rule book %s, %s%s)", v, rules, goVersion, commit)
}

// globalOptions are the flags that several commands share, with one meaning.
type globalOptions struct {
	at, only, from, to, as string
	wait                   time.Duration
}

func (g *globalOptions) addAt(f *pflag.FlagSet) {
	f.StringVar(&g.at, "at", cmp.Or(os.Getenv("CATENA_AT"), "collection"), "folder of the collection (default: $CATENA_AT, else ./collection)")
	f.Lookup("at").DefValue = ""
}

func (g *globalOptions) addWait(f *pflag.FlagSet) {
	f.DurationVar(&g.wait, "wait", time.Minute, "how long to wait while another process writes to the collection")
}

func (g *globalOptions) addScope(f *pflag.FlagSet) {
	f.StringVar(&g.only, "only", "", "count only what matches, such as 'source = tarnwick and injury = fatal'")
	f.StringVar(&g.from, "from", "", "first date, such as 2019, 2019-06 or 2019-06-30")
	f.StringVar(&g.to, "to", "", "last date, included")
}

func (g *globalOptions) addAs(f *pflag.FlagSet, value, formats string) {
	f.StringVar(&g.as, "as", value, "form of the output: "+formats)
}

// open opens the collection for reading.
func (g *globalOptions) open(cmd *cobra.Command) (*collection.Collection, error) {
	c, err := collection.Open(cmd.Context(), g.at, collection.Options{Note: noteTo(cmd.ErrOrStderr())})
	return c, explainOpen(err)
}

// openToWrite opens the collection for writing, making it where it is missing.
func (g *globalOptions) openToWrite(cmd *cobra.Command, rules string) (*collection.Collection, error) {
	c, err := collection.Open(cmd.Context(), g.at, collection.Options{
		Write: true, Command: cmd.Name(), Patience: g.wait, Rules: rules, Note: noteTo(cmd.ErrOrStderr()),
	})
	return c, explainOpen(err)
}

func explainOpen(err error) error {
	switch {
	case errors.Is(err, store.ErrMissing):
		return hint(err, "load something first: catena load FILE; or name the folder with --at")
	case errors.Is(err, index.ErrBusy):
		return hint(err, "a load is running; tables and cases can be read meanwhile, searching when it is done")
	case errors.Is(err, collection.ErrHeld):
		return hint(err, "try again when it is done, or wait longer with --wait")
	}
	return err
}

// scope compiles --only, --from and --to.
func (g *globalOptions) scope(cmd *cobra.Command) (queries.Scope, error) {
	s := queries.Scope{Tree: catalogue.Builtin()}
	var err error
	for _, d := range []struct {
		flag, text string
		into       *corpus.Date
	}{{"--from", g.from, &s.From}, {"--to", g.to, &s.To}} {
		if *d.into, err = corpus.ParseDate(d.text); err != nil {
			return s, usage(cmd, "%s: %w", d.flag, err)
		}
	}
	if g.only != "" {
		if s.Only, err = filter.Parse(g.only, filter.Vocabulary{Factors: catalogue.Builtin().IDs()}); err != nil {
			return s, usage(cmd, "--only: %w", err)
		}
	}
	return s, nil
}

// openScoped opens the collection for a question within --only, --from and --to.
func (g *globalOptions) openScoped(cmd *cobra.Command) (*collection.Collection, queries.Scope, error) {
	scope, err := g.scope(cmd)
	if err != nil {
		return nil, scope, err
	}
	c, err := g.open(cmd)
	if err != nil {
		return nil, scope, err
	}
	if scope.Doubles, err = knownDoubles(cmd.Context(), c); err != nil {
		c.Close()
		return nil, scope, err
	}
	return c, scope, nil
}

// factors checks that the arguments are factors of the catalogue.
func factors(cmd *cobra.Command, ids []string) error {
	tree := catalogue.Builtin()
	for _, id := range ids {
		if _, ok := tree.Factor(id); ok {
			continue
		}
		err := usage(cmd, "the catalogue has no factor %q", id)
		if near := filter.Nearest(id, tree.IDs()); near != "" {
			return hint(err, fmt.Sprintf("did you mean %s? catena rules list shows all", near))
		}
		return hint(err, "catena rules list shows all factors")
	}
	return nil
}

// write prints a table in the form that --as asks for.
func (g *globalOptions) write(cmd *cobra.Command, t *table.Table) error {
	return writeTable(cmd, t, g.as)
}

func writeTable(cmd *cobra.Command, t *table.Table, as string) error {
	err := table.Write(cmd.OutOrStdout(), t, as, table.Options{Width: width(cmd.OutOrStdout()), Notes: cmd.ErrOrStderr()})
	if err != nil && errors.Is(err, table.ErrFormat) {
		return usage(cmd, "--as: %w", err)
	}
	return err
}

func noteTo(w io.Writer) func(string) {
	return func(s string) { fmt.Fprintf(w, "note: %s\n", s) }
}

// factorNames completes factor ids in the shell.
func factorNames(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	var out []string
	for _, f := range catalogue.Builtin().Factors() {
		out = append(out, f.ID+"\t"+f.Meaning)
	}
	return out, cobra.ShellCompDirectiveNoFileComp
}

// addVersions notes what a table rests on.
func addVersions(ctx context.Context, c *collection.Collection, t *table.Table) error {
	change, err := c.Store.Change(ctx)
	if err != nil {
		return err
	}
	t.Notes = append(t.Notes, fmt.Sprintf("rule book %s, collection at change %d; no finding of cause", c.Classifier.Version(), change))
	return nil
}
