package index

import (
	"cmp"
	"context"
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"github.com/blevesearch/bleve/v2"
	"github.com/blevesearch/bleve/v2/mapping"
	"github.com/blevesearch/bleve/v2/search"
	"github.com/blevesearch/bleve/v2/search/query"
	"github.com/blevesearch/bleve/v2/search/searcher"
	api "github.com/blevesearch/bleve_index_api"

	"catena/ingest/corpus"
)

// Query is a question to the index.
type Query struct {
	Text     string               // see parseQuery; empty matches everything
	Fields   map[string]string    // field -> value that it must have
	From, To corpus.Date          // every day that the date can mean lies between, both included
	Keys     func(key int64) bool // nil, or what else must hold of an occurrence
	Sort     string               // "date" (latest first); else by relevance
	Size     int                  // hits at the most
	Offset   int                  // hits to leave out first
}

// Result is what a query found.
type Result struct {
	Total int
	Hits  []Hit
}

// Hit is an occurrence that was found, with the sentences that say most.
type Hit struct {
	Key      int64
	Score    float64
	Snippets []Snippet
}

// Snippet is a window of one narrative. All offsets are bytes into its text.
type Snippet struct {
	Narrative int
	corpus.Span
	Highlights []corpus.Span
}

// Snippet sizes: two sentences tell what a hit is about, and fit a screen.
const (
	maxSnippets    = 2
	maxSnippetSize = 280
)

// Search answers a query. fetch gives the narratives of an occurrence.
func (x *Index) Search(ctx context.Context, q Query, fetch func(key int64) ([]corpus.Narrative, error)) (result *Result, err error) {
	defer recovered(&err)
	built, err := x.build(q)
	if err != nil {
		return nil, err
	}
	req := bleve.NewSearchRequestOptions(built, q.Size, q.Offset, false)
	req.IncludeLocations = true
	req.SortBy([]string{"-_score", "_id"})
	if q.Sort == "date" {
		req.SortBy([]string{"-" + sortField, "_id"})
	}
	found, err := x.bleve.SearchInContext(ctx, req)
	if err != nil {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		return nil, fmt.Errorf("search: %w: %w", ErrDamaged, err)
	}
	result = &Result{Total: int(found.Total)}
	for _, m := range found.Hits {
		h := Hit{Key: keyOf(m.ID), Score: m.Score}
		narratives, err := fetch(h.Key)
		if err != nil {
			return nil, fmt.Errorf("read hit %d: %w", h.Key, err)
		}
		h.Snippets = x.snippets(narratives, m.Locations[textField])
		result.Hits = append(result.Hits, h)
	}
	return result, nil
}

func (x *Index) build(q Query) (query.Query, error) {
	clauses, err := parseQuery(q.Text)
	if err != nil {
		return nil, err
	}
	var must, not []query.Query
	for _, c := range clauses {
		var choices []query.Query
		for _, a := range c.choices {
			if built := x.atom(a); built != nil {
				choices = append(choices, built)
			}
		}
		switch {
		case len(choices) == 0: // function words only
		case c.choices[0].not:
			not = append(not, choices...)
		default:
			must = append(must, either(choices))
		}
	}
	for name, value := range q.Fields {
		t := query.NewTermQuery(strings.ToLower(value))
		t.SetField(name)
		must = append(must, t)
	}
	must = append(must, between(q.From, q.To)...)
	if len(must) == 0 {
		must = append(must, query.NewMatchAllQuery())
	}
	var built query.Query = query.NewBooleanQuery(must, nil, not)
	if q.Keys != nil {
		built = &keyFilter{built, q.Keys}
	}
	return built, nil
}

func either(choices []query.Query) query.Query {
	if len(choices) == 1 {
		return choices[0]
	}
	return query.NewDisjunctionQuery(choices)
}

// atom builds the query of one word or phrase, nil where it has no terms. A
// single word may also stand in make, model or place.
func (x *Index) atom(a atom) query.Query {
	if a.prefix {
		p := query.NewPrefixQuery(strings.ToLower(a.words))
		p.SetField(textField)
		return p
	}
	tokens := x.analyzer.Analyze([]byte(a.words))
	if len(tokens) == 0 {
		return nil
	}
	var choices []query.Query
	for _, field := range []string{textField, aboutField} {
		if len(tokens) == 1 {
			t := query.NewTermQuery(string(tokens[0].Term))
			t.SetField(field)
			choices = append(choices, t)
		} else if field == textField {
			// words left out keep their place, as an empty term
			terms := make([]string, tokens[len(tokens)-1].Position-tokens[0].Position+1)
			for _, t := range tokens {
				terms[t.Position-tokens[0].Position] = string(t.Term)
			}
			choices = append(choices, query.NewPhraseQuery(terms, field))
		}
	}
	return either(choices)
}

func between(from, to corpus.Date) []query.Query {
	var out []query.Query
	yes := true
	if first, _ := from.Bounds(); first != (corpus.Date{}) {
		n := dayNumber(first)
		r := query.NewNumericRangeInclusiveQuery(&n, nil, &yes, nil)
		r.SetField(firstField)
		out = append(out, r)
	}
	if _, last := to.Bounds(); last != (corpus.Date{}) {
		n := dayNumber(last)
		r := query.NewNumericRangeInclusiveQuery(nil, &n, nil, &yes)
		r.SetField(lastField)
		out = append(out, r)
	}
	return out
}

// keyFilter lets through the documents whose key the caller accepts.
type keyFilter struct {
	query.Query
	accept func(key int64) bool
}

// Searcher implements query.Query.
func (f *keyFilter) Searcher(ctx context.Context, r api.IndexReader, m mapping.IndexMapping, o search.SearcherOptions) (search.Searcher, error) {
	inner, err := f.Query.Searcher(ctx, r, m, o)
	if err != nil {
		return nil, err
	}
	return searcher.NewFilteringSearcher(ctx, inner, func(_ *search.SearchContext, d *search.DocumentMatch) bool {
		id, err := r.ExternalID(d.IndexInternalID)
		return err == nil && f.accept(keyOf(id))
	}), nil
}

// place is one highlighted term.
type place struct {
	corpus.Span
	term string
}

// snippets picks the sentences that hold the most different terms.
func (x *Index) snippets(narratives []corpus.Narrative, found search.TermLocationMap) []Snippet {
	places := map[int][]place{}
	for term, locations := range found {
		for _, l := range locations {
			n := 0
			if len(l.ArrayPositions) > 0 {
				n = int(l.ArrayPositions[0])
			}
			s := corpus.Span{Start: int(l.Start), End: int(l.End)}
			if n < len(narratives) && s.Check(narratives[n].Text) == nil {
				places[n] = append(places[n], place{s, term})
			}
		}
	}
	type candidate struct {
		Snippet
		terms int
	}
	var all []candidate
	for n, narrative := range narratives {
		if len(places[n]) == 0 {
			continue
		}
		ps := places[n]
		slices.SortFunc(ps, func(a, b place) int { return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.End, b.End)) })
		for _, s := range x.analyzer.lexicon.Analyse(narrative.Text).Sentences {
			c := candidate{Snippet: Snippet{Narrative: n, Span: s.Span}}
			terms := map[string]bool{}
			for _, p := range ps {
				if s.Contains(p.Span) && (len(c.Highlights) == 0 || c.Highlights[len(c.Highlights)-1].End <= p.Start) {
					c.Highlights = append(c.Highlights, p.Span)
					terms[p.term] = true
				}
			}
			if c.terms = len(terms); c.terms > 0 {
				c.Snippet = trim(narrative.Text, c.Snippet)
				all = append(all, c)
			}
		}
	}
	slices.SortStableFunc(all, func(a, b candidate) int { return cmp.Compare(b.terms, a.terms) })
	all = all[:min(len(all), maxSnippets)]
	slices.SortStableFunc(all, func(a, b candidate) int {
		return cmp.Or(cmp.Compare(a.Narrative, b.Narrative), cmp.Compare(a.Start, b.Start))
	})
	out := []Snippet{}
	for _, c := range all {
		out = append(out, c.Snippet)
	}
	if len(out) == 0 {
		out = append(out, x.beginning(narratives)...)
	}
	return out
}

// beginning shows the first sentence where nothing is to be highlighted.
func (x *Index) beginning(narratives []corpus.Narrative) []Snippet {
	for n, t := range narratives {
		if s := x.analyzer.lexicon.Analyse(t.Text).Sentences; len(s) > 0 {
			return []Snippet{trim(t.Text, Snippet{Narrative: n, Span: s[0].Span, Highlights: []corpus.Span{}})}
		}
	}
	return nil
}

// trim cuts a long sentence to a window around its first highlight, at spaces.
func trim(s string, w Snippet) Snippet {
	if w.Len() <= maxSnippetSize {
		return w
	}
	start := w.Start
	if len(w.Highlights) > 0 {
		start = max(w.Start, w.Highlights[0].Start-maxSnippetSize/3)
	}
	if start > w.Start {
		if k := strings.IndexByte(s[start:w.End], ' '); k >= 0 && (len(w.Highlights) == 0 || start+k+1 <= w.Highlights[0].Start) {
			start += k + 1
		}
	}
	end := min(w.End, start+maxSnippetSize)
	if len(w.Highlights) > 0 {
		end = min(w.End, max(end, w.Highlights[0].End))
	}
	if end < w.End {
		if k := strings.LastIndexByte(s[start:end], ' '); k > 0 && (len(w.Highlights) == 0 || start+k >= w.Highlights[0].End) {
			end = start + k
		}
	}
	for start > w.Start && !utf8.RuneStart(s[start]) {
		start--
	}
	for end < w.End && !utf8.RuneStart(s[end]) {
		end++
	}
	w.Span = corpus.Span{Start: start, End: end}
	w.Highlights = slices.DeleteFunc(slices.Clone(w.Highlights), func(h corpus.Span) bool { return !w.Contains(h) })
	return w
}
