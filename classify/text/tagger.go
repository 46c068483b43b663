package text

import (
	"bytes"
	"encoding/gob"
	"fmt"
	"slices"
	"strings"
	"sync"

	"github.com/jdkato/prose/v2"
)

// Tag is a part of speech of the Penn Treebank set ("VBD", "NN"); "" where
// the token has none.
type Tag string

// Verb tells whether the tag is a verb form.
func (t Tag) Verb() bool { return strings.HasPrefix(string(t), "VB") }

// Noun tells whether the tag is a noun.
func (t Tag) Noun() bool { return strings.HasPrefix(string(t), "NN") }

// tagger decodes the averaged perceptron model that prose publishes. Features
// and context are those that the model was trained with. Classes are in
// alphabetical order and the first of equal scores wins, so that the same
// words always get the same tags.
type tagger struct {
	classes []Tag
	known   map[string]Tag       // words that the model tags without context
	rows    map[string][]float32 // feature -> a weight per class
}

// loadTagger reads the model, once (about a third of a second).
var loadTagger = sync.OnceValue(func() *tagger {
	var classes []string
	var known map[string]string
	var weights map[string]map[string]float64
	for name, into := range map[string]any{"classes": &classes, "tags": &known, "weights": &weights} {
		data, err := prose.Asset("model/AveragedPerceptron/" + name + ".gob")
		if err == nil {
			err = gob.NewDecoder(bytes.NewReader(data)).Decode(into)
		}
		if err != nil {
			panic(fmt.Sprintf("the part-of-speech model inside prose does not load: %v", err)) // a test loads it
		}
	}
	slices.Sort(classes)
	t := &tagger{known: map[string]Tag{}, rows: make(map[string][]float32, len(weights))}
	at := map[string]int{}
	for i, c := range classes {
		at[c] = i
		t.classes = append(t.classes, Tag(c))
	}
	for w, c := range known {
		t.known[w] = Tag(c)
	}
	for feature, byClass := range weights {
		row := make([]float32, len(classes))
		for c, w := range byClass {
			if i, ok := at[c]; ok {
				row[i] = float32(w)
			}
		}
		t.rows[feature] = row
	}
	return t
})

// Tag is the part of speech of token i. The first question about a sentence
// tags the whole sentence.
func (d *Doc) Tag(i int) Tag {
	if d.tags == nil {
		d.tags = make([]Tag, len(d.Tokens))
		d.tagged = make([]bool, len(d.Sentences))
	}
	if s := d.Sentence(i); !d.tagged[s] {
		d.tagged[s] = true
		d.tagSentence(d.Sentences[s])
	}
	return d.tags[i]
}

// tagSentence gives the model the words as written (in small letters where
// the sentence is all capitals, which the model has not met) with the marks
// between them, and hands the tags to the tokens at the same place.
func (d *Doc) tagSentence(s Sentence) {
	caps := d.Capitals || capitals(d.Text[s.Start:s.End])
	var words []string
	var token []int // index of the token, -1 for a mark
	for i := s.First; i < s.Last; i++ {
		t := d.Tokens[i]
		if i > s.First {
			if p := d.Tokens[i-1]; t.Start < p.End {
				continue // shares the span of the token before
			} else if t.Break != NoBreak {
				words, token = append(words, ","), append(token, -1)
			}
		}
		w := d.Text[t.Start:t.End]
		if caps {
			w = strings.ToLower(w)
		}
		words, token = append(words, w), append(token, i)
	}
	if s.End > d.Tokens[s.Last-1].End {
		words, token = append(words, "."), append(token, -1)
	}
	for k, tag := range loadTagger().tag(words) {
		if token[k] >= 0 {
			d.tags[token[k]] = tag
		}
	}
}

func (t *tagger) tag(words []string) []Tag {
	context := make([]string, 0, len(words)+4)
	context = append(context, "-START-", "-START2-")
	for _, w := range words {
		context = append(context, shape(w))
	}
	context = append(context, "-END-", "-END2-")
	tags := make([]Tag, len(words))
	p1, p2 := "-START-", "-START2-"
	scores := make([]float32, len(t.classes))
	var buf []byte
	for i, w := range words {
		tag, ok := t.known[w]
		if !ok {
			clear(scores)
			add := func(parts ...string) {
				buf = buf[:0]
				for k, p := range parts {
					if k > 0 {
						buf = append(buf, ' ')
					}
					buf = append(buf, p...)
				}
				for c, weight := range t.rows[string(buf)] {
					scores[c] += weight
				}
			}
			c := i + 2
			add("bias")
			add("i suffix", tail(w))
			add("i pref1", w[:1])
			add("i-1 tag", p1)
			add("i-2 tag", p2)
			add("i tag+i-2 tag", p1, p2)
			add("i word", context[c])
			add("i-1 tag+i word", p1, context[c])
			add("i-1 word", context[c-1])
			add("i-1 suffix", tail(context[c-1]))
			add("i-2 word", context[c-2])
			add("i+1 word", context[c+1])
			add("i+1 suffix", tail(context[c+1]))
			add("i+2 word", context[c+2])
			best := 0
			for k, score := range scores {
				if score > scores[best] {
					best = k
				}
			}
			tag = t.classes[best]
		}
		tags[i] = tag
		p1, p2 = string(tag), p1
	}
	return tags
}

// tail is the last three bytes, the model's idea of a suffix.
func tail(w string) string { return w[max(0, len(w)-3):] }

// shape is the model's normal form of a word of the context.
func shape(w string) string {
	switch {
	case strings.Contains(w, "-") && w[0] != '-':
		return "!HYPHEN"
	case len(w) == 4 && isDigit(w[0]) && isDigit(w[1]) && isDigit(w[2]) && isDigit(w[3]):
		return "!YEAR"
	case isDigit(w[0]):
		return "!DIGITS"
	}
	return strings.ToLower(w)
}
