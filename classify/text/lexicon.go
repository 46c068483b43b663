package text

import (
	_ "embed"
	"fmt"
	"strings"

	"github.com/goccy/go-yaml"
)

// Word is the id of a word in its normal form. 0 stands for every word that
// the lexicon does not know.
type Word uint32

// Lexicon knows the words that rules use and how they may be spelled. Fill it
// (Words, Add) before the first Analyse; after that it must not change, and
// may be shared between goroutines.
type Lexicon struct {
	ids       map[string]Word
	names     []string             // id -> word
	spelled   map[string][]Word    // surface form -> words of the normal form
	ambiguous map[string][]reading // surface form -> what it may stand for
	joined    map[[2]Word]Word     // two words that are written as one
	numbers   [5]Word              // no1 .. no4, at their index
	opens     []bool               // by id: a surface form in spelled
	pairs     []bool               // by id: the first word of a pair in joined

	no, number, hash Word
}

//go:embed spelling.yaml
var spelling []byte

// Spelling is the embedded spelling table, for the version of what is built on it.
func Spelling() []byte { return spelling }

// NewLexicon returns a lexicon that holds the spelling table and no words
// of rules yet.
func NewLexicon() *Lexicon {
	l := &Lexicon{
		ids: map[string]Word{}, names: []string{""},
		spelled: map[string][]Word{}, ambiguous: map[string][]reading{}, joined: map[[2]Word]Word{}, opens: []bool{false}, pairs: []bool{false},
	}
	var table struct {
		Joined    []string             `yaml:"joined"`
		Variants  map[string]string    `yaml:"variants"`
		Short     map[string]string    `yaml:"short"`
		Ambiguous map[string][]reading `yaml:"ambiguous"`
	}
	if err := yaml.UnmarshalWithOptions(spelling, &table, yaml.Strict()); err != nil {
		panic(fmt.Sprintf("the embedded spelling table is broken: %v", err)) // a test loads it
	}
	for n := 1; n < len(l.numbers); n++ {
		l.numbers[n] = l.intern(fmt.Sprintf("no%d", n))
	}
	for _, w := range []string{"not", "left", "right"} {
		l.intern(w)
	}
	l.no, l.number, l.hash = l.intern("no"), l.intern("number"), l.intern("#")
	for _, pair := range table.Joined {
		a, b, _ := strings.Cut(pair, " ")
		l.joined[[2]Word{l.intern(a), l.intern(b)}] = l.intern(a + b)
		l.pairs[l.intern(a)] = true
	}
	for _, m := range []map[string]string{table.Variants, table.Short} {
		for from, to := range m {
			var words []Word
			for _, w := range strings.Fields(to) {
				words = append(words, l.intern(w))
			}
			l.spelled[from] = words
			l.opens[l.intern(from)] = true
		}
	}
	for from, readings := range table.Ambiguous {
		for i := range readings {
			r := &readings[i]
			for _, w := range strings.Fields(r.Means) {
				r.words = append(r.words, l.intern(w))
			}
			r.beside = map[string]bool{}
			for _, w := range r.Beside {
				r.beside[w] = true
			}
		}
		l.ambiguous[from] = readings
		l.opens[l.intern(from)] = true
	}
	return l
}

func (l *Lexicon) intern(word string) Word {
	id, ok := l.ids[word]
	if !ok {
		id = Word(len(l.names))
		l.ids[word] = id
		l.names = append(l.names, word)
		l.opens, l.pairs = append(l.opens, false), append(l.pairs, false)
	}
	return id
}

// Words gives the normal form of a phrase of a rule, adding words that the
// lexicon does not hold yet.
func (l *Lexicon) Words(phrase string) []Word {
	for _, raw := range split(phrase) {
		if surface := strings.ToLower(phrase[raw.start:raw.end]); raw.kind == letters && l.spelled[surface] == nil {
			l.intern(surface)
		}
	}
	var words []Word
	for _, t := range l.Analyse(phrase).Tokens {
		words = append(words, t.Word)
	}
	return words
}

// Name is the word behind an id, "" for 0.
func (l *Lexicon) Name(w Word) string { return l.names[w] }

// Size is one more than the largest id.
func (l *Lexicon) Size() int { return len(l.names) }
