package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"

	"catena/classify"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

func newExplainCommand(g *globalOptions) *cobra.Command {
	source := ""
	cmd := &cobra.Command{
		Use:   "explain ID [FACTOR]",
		Short: "Why an occurrence has its tags, and why a factor is not among them",
		Long: `Prints, for each tag of an occurrence, the sentence with the words that show
the factor, the rule that found them and what it means, and the words that
decided how they are spoken of. With a factor it also prints what rules found
but did not tag, and why.`,
		Example: "  catena rules explain T21-014 slow-airspeed",
		Args:    args(cobra.RangeArgs(1, 2)),
		RunE: func(cmd *cobra.Command, given []string) error {
			if err := factors(cmd, given[1:]); err != nil {
				return err
			}
			return runExplain(cmd, g, source, given)
		},
	}
	g.addAt(cmd.Flags())
	cmd.Flags().StringVar(&source, "source", "", "the source, where several use the same reference")
	return cmd
}

func runExplain(cmd *cobra.Command, g *globalOptions, source string, given []string) error {
	c, err := g.open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	keys, err := c.Store.Keys(cmd.Context(), source, given[0])
	if err != nil {
		return err
	}
	if len(keys) == 0 {
		return hint(fmt.Errorf("no occurrence has the reference %q", given[0]), "catena find WORDS lists occurrences with their references")
	}
	factor := strings.Join(given[1:], "")
	for _, key := range keys {
		r, err := c.Store.One(cmd.Context(), key)
		if err != nil {
			return err
		}
		fmt.Fprintf(cmd.OutOrStdout(), "%s\nrule book %s\n", headline(r), c.Classifier.Version())
		printReasons(cmd, c.Classifier, r, c.Classifier.Explain(&r.Occurrence, factor), factor)
	}
	return nil
}

func printReasons(cmd *cobra.Command, c *classify.Classifier, r *store.Row, reasons []classify.Reason, factor string) {
	out := cmd.OutOrStdout()
	tags := 0
	for _, x := range reasons {
		if x.Refused != "" && factor == "" {
			continue
		}
		text := r.Narratives[x.Narrative].Text
		fmt.Fprintf(out, "\n%s", x.Rule.Factor)
		if x.Refused == "" {
			tags++
			fmt.Fprintf(out, ", %s (%s)", x.Assertion, x.Basis)
			if x.Side != "" {
				fmt.Fprintf(out, ", %s", x.Side)
			}
			if x.Actor != "" {
				fmt.Fprintf(out, ", by the %s", x.Actor)
			}
			if q := x.Quantity; q != nil {
				fmt.Fprintf(out, ", %s %.4g %s", q.Kind, q.Value, q.Unit)
			}
			fmt.Fprintf(out, ", strength %.2f", x.Strength)
		} else {
			fmt.Fprint(out, ", not tagged")
		}
		fmt.Fprintf(out, "\n  %s [%s] %s\n", clean(strings.TrimSpace(text[x.Sentence.Start:x.Start])), clean(x.Of(text)), clean(strings.TrimSpace(text[x.End:x.Sentence.End])))
		at := x.Rule.File
		if x.Rule.Line > 0 {
			at += fmt.Sprintf(":%d", x.Rule.Line)
		}
		fmt.Fprintf(out, "  rule %s (%s): %s\n", x.Rule.ID, at, x.Rule.Says)
		switch {
		case x.Refused != "":
			fmt.Fprintf(out, "  %s\n", x.Refused)
		case x.Cue.Len() > 0:
			fmt.Fprintf(out, "  spoken of so because of %q\n", clean(x.Cue.Of(text)))
		}
	}
	if tags == 0 && factor != "" {
		fmt.Fprintf(out, "\nNo tag of %s: not mentioned in words that a rule knows, which is not a denial.\n", factor)
		if m, ok := c.NearestMiss(&r.Occurrence, factor); ok {
			fmt.Fprintf(out, "Nearest to a match (words for %d of the %d parts of a pattern of %s):\n  %s\n  looked for: %s\n", m.Present, m.All, m.Rule.ID,
				clean(strings.TrimSpace(m.Sentence.Of(r.Narratives[m.Narrative].Text))), m.Pattern.Source)
		}
	}
	if factor == "" && len(r.Chain.Links) > 1 {
		printOrder(out, c.Tag(&r.Occurrence).Chain)
	}
}

// printOrder tells why the links of a chain stand in their order.
func printOrder(out io.Writer, chain corpus.Chain) {
	because := map[string]string{
		"text": "as told", "words": "by words such as due to, after or while", "clock": "by the times that are told",
	}
	fmt.Fprintf(out, "\nOrder of time:\n")
	for i, l := range chain.Links {
		fmt.Fprintf(out, "  %d. %s, %s", i+1, l.Factor, because[l.Order])
		if l.Seconds > 0 {
			fmt.Fprintf(out, ", %.4g s after the link before", l.Seconds)
		}
		fmt.Fprintln(out)
	}
	if chain.BrokenBy != "" {
		fmt.Fprintf(out, "  broken by %s\n", chain.BrokenBy)
	}
}
