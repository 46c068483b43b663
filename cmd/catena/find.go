package main

import (
	"encoding/json"
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"

	"catena/index"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries"
	"catena/queries/filter"
)

type findOptions struct {
	sort         string
	most, offset int
}

func newFindCommand(g *globalOptions) *cobra.Command {
	o := &findOptions{}
	cmd := &cobra.Command{
		Use:   "find [QUERY]",
		Short: "Search the narratives",
		Long: `Finds occurrences whose narratives hold all the words, in any of their forms
and abbreviations (ACFT finds aircraft). "quoted words" must follow each other,
-word excludes, OR stands between choices, word* finds beginnings. Without a
query it lists what --only, --from and --to let through.`,
		Example: `  catena find 'rudder "left engine"'
  catena find stall --only 'operation = training' --from 2023
  catena find --only 'wrong-rudder'             the occurrences behind a count`,
		Args: args(cobra.ArbitraryArgs),
		RunE: func(cmd *cobra.Command, words []string) error {
			return runFind(cmd, g, o, strings.Join(words, " "))
		},
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addScope(f)
	g.addAs(f, "text", "text or json")
	f.StringVar(&o.sort, "sort", "relevance", "relevance or date")
	f.IntVar(&o.most, "most", 10, "how many to show")
	f.IntVar(&o.offset, "skip", 0, "how many to leave out first")
	return cmd
}

func runFind(cmd *cobra.Command, g *globalOptions, o *findOptions, query string) error {
	switch {
	case g.as != "text" && g.as != "json":
		return usage(cmd, "--as: no form is called %q; there are text and json", g.as)
	case o.sort != "relevance" && o.sort != "date":
		return usage(cmd, "--sort: %q is neither relevance nor date", o.sort)
	case o.most < 1 || o.offset < 0:
		return usage(cmd, "--most wants a number above 0, --skip one that is not below")
	}
	c, scope, err := g.openScoped(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	q := index.Query{Text: query, Sort: o.sort, Size: o.most, Offset: o.offset}
	if scope.Only != nil || scope.From != (corpus.Date{}) || scope.To != (corpus.Date{}) {
		keys, err := queries.Keys(c.Store.Count(cmd.Context()), scope)
		if err != nil {
			return err
		}
		q.Keys = func(key int64) bool { return keys[key] }
	}
	x, err := c.Index(cmd.Context())
	if err != nil {
		return explainOpen(err)
	}
	result, err := x.Search(cmd.Context(), q, c.Narratives(cmd.Context()))
	if err != nil {
		return err
	}
	show := hitPrinter{cmd: cmd, c: c, o: o, json: g.as == "json"}
	if strings.TrimSpace(query) == "" && scope.Only != nil {
		show.factors = filter.Factors(scope.Only)
	}
	return show.print(result)
}

// hitJSON is one hit as --as json prints it.
type hitJSON struct {
	ID       string        `json:"id"`
	Source   string        `json:"source"`
	Date     corpus.Date   `json:"date,omitzero"`
	Score    float64       `json:"score"`
	Snippets []snippetJSON `json:"snippets"`
}

type snippetJSON struct {
	Narrative int `json:"narrative"`
	corpus.Span
	Text       string        `json:"text"`
	Highlights []corpus.Span `json:"highlights"`
}

// hitPrinter prints what was found. factors are those of a filter without
// words: their sentences stand in the place of snippets.
type hitPrinter struct {
	cmd     *cobra.Command
	c       *collection.Collection
	o       *findOptions
	json    bool
	factors []string
}

func (p hitPrinter) print(result *index.Result) error {
	out := p.cmd.OutOrStdout()
	hits := []hitJSON{}
	for i, h := range result.Hits {
		r, err := p.c.Store.One(p.cmd.Context(), h.Key)
		if err != nil {
			return err
		}
		if evidence := p.evidence(r); len(evidence) > 0 {
			h.Snippets = evidence
		}
		if p.json {
			hits = append(hits, jsonHit(r, h))
			continue
		}
		if i > 0 {
			fmt.Fprintln(out)
		}
		fmt.Fprintf(out, "%d. %s\n", p.o.offset+i+1, headline(r))
		for _, s := range h.Snippets {
			fmt.Fprintf(out, "   %s\n", highlight(r.Narratives[s.Narrative].Text, s, colour(out)))
		}
	}
	if p.json {
		e := json.NewEncoder(out)
		e.SetEscapeHTML(false)
		return e.Encode(map[string]any{"total": result.Total, "hits": hits})
	}
	return printTotal(p.cmd.ErrOrStderr(), result, p.o)
}

// evidence finds the sentence behind each factor that the filter asks for.
func (p hitPrinter) evidence(r *store.Row) []index.Snippet {
	var out []index.Snippet
	book := p.c.Classifier.Book()
	for _, f := range p.factors {
		for _, t := range r.Tags {
			if t.Assertion == corpus.Affirmed && book.Tree.Implies(t.Factor, f) {
				text := r.Narratives[t.Narrative].Text
				out = append(out, index.Snippet{Narrative: t.Narrative, Span: queries.SentenceFinder(book.Lexicon, text)(t.Span), Highlights: []corpus.Span{t.Span}})
				break
			}
		}
	}
	return out
}

func printTotal(w io.Writer, result *index.Result, o *findOptions) error {
	var err error
	switch shown := o.offset + len(result.Hits); {
	case result.Total == 0:
		_, err = fmt.Fprintln(w, "nothing found; try fewer words, or a beginning with *, such as rudd*")
	case shown < result.Total:
		_, err = fmt.Fprintf(w, "\n%d to %d of %d; --skip %d shows the next\n", o.offset+1, shown, result.Total, shown)
	default:
		_, err = fmt.Fprintf(w, "\n%d found\n", result.Total)
	}
	return err
}

func jsonHit(r *store.Row, h index.Hit) hitJSON {
	j := hitJSON{ID: r.ID, Source: r.Occurrence.Source, Date: r.Date, Score: h.Score, Snippets: []snippetJSON{}}
	for _, s := range h.Snippets {
		j.Snippets = append(j.Snippets, snippetJSON{s.Narrative, s.Span, s.Span.Of(r.Narratives[s.Narrative].Text), s.Highlights})
	}
	return j
}

// headline tells an occurrence in a line: reference, date, aircraft, place.
func headline(r *store.Row) string {
	parts := []string{r.ID, r.Occurrence.Source}
	for _, s := range []string{r.Date.String(), strings.TrimSpace(r.Make + " " + r.Model), r.Operation, r.Place} {
		if s != "" {
			parts = append(parts, s)
		}
	}
	return clean(strings.Join(parts, "  "))
}

// highlight prints a snippet with its hits in bold on a terminal, between
// square brackets elsewhere.
func highlight(text string, s index.Snippet, bold bool) string {
	on, off := "[", "]"
	if bold {
		on, off = "\x1b[1;4m", "\x1b[0m"
	}
	var b strings.Builder
	if s.Start > 0 {
		b.WriteString("... ")
	}
	at := s.Start
	for _, h := range s.Highlights {
		if h.Start < at || h.End > s.End {
			continue
		}
		b.WriteString(clean(text[at:h.Start]) + on + clean(h.Of(text)) + off)
		at = h.End
	}
	b.WriteString(clean(text[at:s.End]))
	if s.End < len(text) {
		b.WriteString(" ...")
	}
	return b.String()
}
