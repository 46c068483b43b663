package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"

	"catena/classify/catalogue"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries"
	"catena/queries/table"
)

func newCaseCommand(g *globalOptions) *cobra.Command {
	source := ""
	cmd := &cobra.Command{
		Use:   "case ID",
		Short: "One occurrence as a chain, with the sentence and rule behind each link",
		Long: `Prints one occurrence: its fields, its chain in the order of time, the words
behind each link, what else its narratives say of factors (denied, possible,
advised, elsewhere), and the row of the file that it was read from.`,
		Example: `  catena case T21-014
  catena case --source sellow S22-007`,
		Args: args(cobra.ExactArgs(1)),
		RunE: func(cmd *cobra.Command, ids []string) error { return runCase(cmd, g, source, ids[0]) },
	}
	g.addAt(cmd.Flags())
	cmd.Flags().StringVar(&source, "source", "", "the source, where several use the same reference")
	return cmd
}

func runCase(cmd *cobra.Command, g *globalOptions, source, id string) error {
	c, err := g.open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	keys, err := c.Store.Keys(cmd.Context(), source, id)
	if err != nil {
		return err
	}
	if len(keys) == 0 {
		return hint(fmt.Errorf("no occurrence has the reference %q", id), "catena find WORDS lists occurrences with their references")
	}
	for i, key := range keys {
		r, err := c.Store.One(cmd.Context(), key)
		if err != nil {
			return err
		}
		if i > 0 {
			fmt.Fprintln(cmd.OutOrStdout())
		}
		printCase(cmd, c, r)
	}
	return nil
}

func printCase(cmd *cobra.Command, c *collection.Collection, r *store.Row) {
	out := cmd.OutOrStdout()
	sentences := map[int]func(corpus.Span) corpus.Span{}
	sentence := func(t corpus.Tag) string {
		if sentences[t.Narrative] == nil {
			sentences[t.Narrative] = queries.SentenceFinder(c.Classifier.Book().Lexicon, r.Narratives[t.Narrative].Text)
		}
		text := r.Narratives[t.Narrative].Text
		s := sentences[t.Narrative](t.Span)
		return clean(strings.TrimSpace(text[s.Start:t.Start])) + " [" + clean(t.Quote) + "] " + clean(strings.TrimSpace(text[t.End:s.End]))
	}
	fmt.Fprintf(out, "%s\n", headline(r))
	for _, f := range []struct{ name, value string }{
		{"event", r.Event}, {"phase", r.Phase}, {"injury", r.Injury}, {"damage", r.Damage},
	} {
		if f.value != "" {
			fmt.Fprintf(out, "  %s: %s\n", f.name, clean(f.value))
		}
	}
	if known, ok := c.Classifier.Book().Type(r.Make, r.Model); ok && r.Engines > 0 && known.Engines != r.Engines {
		fmt.Fprintf(out, "  engines: %d by the table of types (%s), %d by the record; the table is followed\n", known.Engines, known.Name, r.Engines)
	}
	fmt.Fprintf(out, "  read from %s, row %d, line %d; rule book %s\n", clean(r.File), r.Row, r.Line, r.Rulebook)
	fmt.Fprintf(out, "\nChain, in the order of time:\n")
	if len(r.Chain.Links) == 0 {
		fmt.Fprintln(out, "  no factor of the catalogue is affirmed")
	}
	for i, l := range r.Chain.Links {
		t := r.Tags[l.Tag]
		fmt.Fprintf(out, "  %d. %s%s\n     %s\n     (%s, rule %s, strength %.2f)\n", i+1, l.Factor, linkWords(l, t), strings.TrimSpace(sentence(t)), kindOf(l.Factor), t.Rule, t.Strength)
	}
	printCategories(out, r)
	printBalance(out, r)
	if r.Chain.BrokenBy != "" {
		fmt.Fprintf(out, "  broken by: %s\n", r.Chain.BrokenBy)
	}
	for _, doubt := range r.Chain.Doubts {
		fmt.Fprintf(out, "  doubt: %s\n", clean(doubt))
	}
	others := 0
	for _, t := range r.Tags {
		if t.Assertion == corpus.Affirmed {
			continue
		}
		if others++; others == 1 {
			fmt.Fprintf(out, "\nAlso spoken of, and not counted:\n")
		}
		fmt.Fprintf(out, "  %s, %s\n     %s\n", t.Factor, t.Assertion, strings.TrimSpace(sentence(t)))
	}
	for n, t := range r.Narratives {
		if t.CutOff() {
			t.Text += " [...]"
			fmt.Fprintf(out, "\nThe next text stops in mid-sentence: what it does not mention is not known.")
		}
		fmt.Fprintf(out, "\nNarrative %d (%s):\n%s\n", n+1, clean(t.Kind), table.Wrap(clean(t.Text), width(out), ""))
	}
	fmt.Fprintf(out, "\nThis is what the report tells, not a finding of cause. The investigating authority,\nthe aircraft flight manual, local regulations and licensed instructors come first.\n")
}

// printCategories names the occurrence categories that the chain speaks for.
func printCategories(out io.Writer, r *store.Row) {
	var factors []string
	for _, l := range r.Chain.Links {
		factors = append(factors, l.Factor)
	}
	if codes := catalogue.Builtin().Categories(factors); len(codes) > 0 {
		fmt.Fprintf(out, "  occurrence categories that these speak for (CICTT): %s\n", strings.Join(codes, ", "))
	}
}

// printBalance tells, where a speed flown under the minimum control speed is
// told, how much of the needed yawing moment full rudder could still give, and
// what raised the actual minimum control speed in this case.
func printBalance(out io.Writer, r *store.Row) {
	for _, t := range r.Tags {
		ratio, ok := queries.Balance(t.Quantity)
		if !ok {
			continue
		}
		q := t.Quantity
		fmt.Fprintf(out, "  %.0f %s flown against a minimum control speed of %.0f: balance ratio %.2f, the share of the yawing moment that\n"+
			"  full rudder could still give. A published speed holds for the conditions of its certification only.\n", q.Value, q.Unit, q.Limit, ratio)
		if raised := queries.RaisesVmc(r.Tags); len(raised) > 0 {
			fmt.Fprintf(out, "  told here, and raising the actual speed: %s\n", strings.Join(raised, ", "))
		}
		return
	}
}

// linkWords says what a link tells beyond its factor: side, actor, number,
// time since the link before.
func linkWords(l corpus.Link, t corpus.Tag) string {
	var words []string
	if t.Side != "" {
		words = append(words, t.Side)
	}
	if t.Actor != "" {
		words = append(words, "by the "+t.Actor)
	}
	if q := t.Quantity; q != nil {
		s := fmt.Sprintf("%s %.4g %s", q.Kind, q.Value, q.Unit)
		if q.Told != "" {
			s += ", told in " + q.Told
		}
		if q.LimitKind != "" {
			s += fmt.Sprintf(", %s %.4g: margin %+.4g", strings.ReplaceAll(q.LimitKind, "-", " "), q.Limit, q.Value-q.Limit)
		}
		words = append(words, s)
	}
	if t.Basis == corpus.Inferred {
		words = append(words, "inferred")
	}
	if l.Seconds > 0 {
		words = append(words, fmt.Sprintf("%.4g s after the link before", l.Seconds))
	}
	if len(words) == 0 {
		return ""
	}
	return " (" + clean(strings.Join(words, "; ")) + ")"
}

func kindOf(factor string) catalogue.Kind {
	f, _ := catalogue.Builtin().Factor(factor)
	return f.Kind
}
