package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"strings"

	"github.com/spf13/cobra"

	"catena/classify"
	"catena/classify/rulebook"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/queries/table"
)

func newRulesCommand(g *globalOptions) *cobra.Command {
	folder := ""
	cmd := &cobra.Command{
		Use:   "rules",
		Short: "The rule book: list, show, check and explain it",
		Args:  args(cobra.NoArgs),
		RunE:  func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	cmd.PersistentFlags().StringVar(&folder, "rules", "", "folder of your own rules, over the built-in book")
	list := &cobra.Command{
		Use: "list", Short: "All factors of the catalogue, and how many rules find each",
		Example: "  catena rules list",
		Args:    args(cobra.NoArgs),
		RunE:    func(cmd *cobra.Command, _ []string) error { return listRules(cmd, g, folder) },
	}
	g.addAs(list.Flags(), "text", "text, csv, json or md")
	show := &cobra.Command{
		Use: "show FACTOR", Short: "What a factor means and what its rules look for",
		Example: "  catena rules show wrong-rudder",
		Args:    args(cobra.ExactArgs(1)), ValidArgsFunction: factorNames,
		RunE: func(cmd *cobra.Command, ids []string) error { return showRules(cmd, folder, ids[0]) },
	}
	check := &cobra.Command{
		Use: "check", Short: "Compile the rule book and run its examples",
		Long: `Compiles the rule book, runs every example, and reports faults with file, line
and the words at fault. Notes name terms that nothing uses, rules that find
nothing in the invented corpus of the demo, and rules that others always stand
in front of.`,
		Example: "  catena rules check --rules our-rules",
		Args:    args(cobra.NoArgs),
		RunE:    func(cmd *cobra.Command, _ []string) error { return checkRules(cmd, folder) },
	}
	cmd.AddCommand(list, show, check, newExplainCommand(&globalOptions{}))
	return cmd
}

func listRules(cmd *cobra.Command, g *globalOptions, folder string) error {
	book, err := collection.LoadBook(folder)
	if err != nil {
		return err
	}
	rules := map[string]int{}
	for _, r := range book.Rules {
		rules[r.Factor]++
	}
	t := &table.Table{Title: "factors, rule book " + classify.New(book).Version(), Columns: []table.Column{
		{Name: "factor"}, {Name: "kind"}, {Name: "under"}, {Name: "rules", Unit: "count"}, {Name: "meaning"},
	}}
	for _, f := range book.Tree.Factors() {
		t.Rows = append(t.Rows, []table.Cell{f.ID, string(f.Kind), f.Parent, rules[f.ID], f.Meaning})
	}
	t.Notes = []string{"a factor without rules is found only through the factors under it, or not yet"}
	return writeTable(cmd, t, g.as)
}

func showRules(cmd *cobra.Command, folder, id string) error {
	if err := factors(cmd, []string{id}); err != nil {
		return err
	}
	book, err := collection.LoadBook(folder)
	if err != nil {
		return err
	}
	out := cmd.OutOrStdout()
	f, _ := book.Tree.Factor(id)
	fmt.Fprintf(out, "%s (%s): %s\n", f.ID, f.Kind, f.Meaning)
	if f.Parent != "" {
		fmt.Fprintf(out, "counts under: %s\n", strings.Join(book.Tree.Lineage(id)[1:], ", "))
	}
	if len(f.Category) > 0 {
		fmt.Fprintf(out, "occurrence categories (CICTT): %s\n", strings.Join(f.Category, ", "))
	}
	for _, r := range book.Rules {
		if r.Factor != id {
			continue
		}
		fmt.Fprintf(out, "\n%s  (%s:%d, strength %.2f)\n  %s\n", r.ID, r.File, r.Line, r.Strength, r.Says)
		for _, part := range []struct {
			name     string
			patterns []*rulebook.Pattern
		}{{"looks for", r.Look}, {"with, in the sentence", r.With}, {"near, in a sentence beside it", r.Near}, {"unless, in the sentence", r.Unless}, {"unless, in a sentence beside it", r.NotNear}, {"unless, anywhere", r.Nowhere}} {
			for i, p := range part.patterns {
				if i == 0 {
					fmt.Fprintf(out, "  %s:\n", part.name)
				}
				fmt.Fprintf(out, "    %s\n", p.Source)
			}
		}
		for _, e := range r.Examples {
			want := string(e.Want)
			if want == "" {
				want = "no match"
			}
			fmt.Fprintf(out, "  %s: %s\n", want, e.Text)
		}
	}
	return nil
}

func checkRules(cmd *cobra.Command, folder string) error {
	book, err := collection.LoadBook(folder)
	if err != nil {
		return err
	}
	for _, name := range book.UnusedTerms() {
		fmt.Fprintf(cmd.ErrOrStderr(), "note: no rule uses the term %q\n", name)
	}
	census, err := demoCensus(classify.New(book))
	if err != nil {
		return err
	}
	for _, w := range census.Warnings() {
		fmt.Fprintf(cmd.ErrOrStderr(), "note: %s\n", clean(w))
	}
	examples := 0
	for _, r := range book.Rules {
		examples += len(r.Examples)
	}
	if faults := classify.CheckExamples(book); len(faults) > 0 {
		return hint(errors.Join(faults...), fmt.Sprintf("%d of %d examples do not come out as their rule file says", len(faults), examples))
	}
	fmt.Fprintf(cmd.OutOrStdout(), "rule book %s: %d rules, %d cues, %d examples, all as they should be\n", classify.New(book).Version(), len(book.Rules), len(book.Cues), examples)
	return nil
}

// demoCensus counts what the rules do on the invented corpus of the demo.
func demoCensus(c *classify.Classifier) (*classify.Census, error) {
	census := classify.NewCensus(c)
	names, err := demoNarratives()
	if err != nil {
		return nil, err
	}
	for _, name := range names {
		data, err := demoFiles.ReadFile(name)
		if err != nil {
			return nil, err
		}
		for line := range bytes.Lines(data) {
			var o corpus.Occurrence
			if err := json.Unmarshal(line, &o); err != nil {
				return nil, fmt.Errorf("read %s: %w", name, err)
			}
			census.Add(&o)
		}
	}
	return census, nil
}
