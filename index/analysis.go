package index

import (
	"strings"
	"sync"
	"sync/atomic"

	"github.com/blevesearch/bleve/v2/analysis"
	"github.com/blevesearch/snowballstem"
	"github.com/blevesearch/snowballstem/english"

	"catena/classify/text"
)

// stopWords carry no meaning by themselves. They keep their place, so that a
// phrase with one in it is still found. "no" and "not" are searched for.
var stopWords = func() map[string]bool {
	set := map[string]bool{}
	for _, w := range strings.Fields(`a an the and or of to in on at by for from with as is are was were be been being it its this that these those
		he she they them his her their i we my our you your had has have which who then than there`) {
		set[w] = true
	}
	return set
}()

// analyzer turns text into terms. It may be used by many goroutines.
type analyzer struct {
	lexicon *text.Lexicon
	stems   sync.Map // word -> stem
	held    atomic.Int64
}

// maxStems bounds the memory of stems; English reports hold some tens of
// thousands of words, and the rest are names and slips.
const maxStems = 200_000

func newAnalyzer() *analyzer { return &analyzer{lexicon: text.NewLexicon()} }

// Analyze implements analysis.Analyzer.
func (a *analyzer) Analyze(input []byte) analysis.TokenStream {
	s := string(input)
	d := a.lexicon.Analyse(s)
	out := make(analysis.TokenStream, 0, len(d.Tokens))
	tokens := make([]analysis.Token, len(d.Tokens)) // one allocation for all
	for i, t := range d.Tokens {
		word := a.word(s, t)
		if stopWords[word] {
			continue
		}
		tokens[i] = analysis.Token{Term: []byte(a.stem(word)), Start: t.Start, End: t.End, Position: i + 1, Type: analysis.AlphaNumeric}
		out = append(out, &tokens[i])
	}
	return out
}

// word is a token's normal form, or its own letters where the lexicon does
// not know it.
func (a *analyzer) word(s string, t text.Token) string {
	if name := a.lexicon.Name(t.Word); name != "" {
		return name
	}
	w := strings.ToLower(s[t.Start:t.End])
	for _, own := range []string{"'s", "’s"} {
		if cut, ok := strings.CutSuffix(w, own); ok && cut != "" {
			return cut
		}
	}
	return w
}

func (a *analyzer) stem(word string) string {
	if v, ok := a.stems.Load(word); ok {
		return v.(string)
	}
	env := snowballstem.NewEnv(word)
	english.Stem(env)
	stem := env.Current()
	if a.held.Add(1) <= maxStems {
		a.stems.Store(strings.Clone(word), stem)
	}
	return stem
}

// whole keeps a field's value as one term, in small letters.
type whole struct{}

func (whole) Analyze(input []byte) analysis.TokenStream {
	return analysis.TokenStream{{Term: []byte(strings.ToLower(string(input))), Start: 0, End: len(input), Position: 1, Type: analysis.AlphaNumeric}}
}
