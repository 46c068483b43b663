package rulebook

import (
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"catena/classify/text"
	"catena/ingest/corpus"
)

// Pattern is a compiled sequence of words to look for within one sentence:
//
//	word        that word, in any spelling that the spelling table knows
//	lose~       any form of it: lose, loses, lost, losing
//	stall:verb  the word where it is a verb (also :noun)
//	{engine}    any phrase of the term
//	(a|b c)     one of these
//	x?          x or nothing (x a word, a term or a group)
//	..  ..5     up to 3 (5) words, none beyond a comma
//	...  ...9   up to 6 (9) words, commas or not
//	#  *        a number; any one word
//	####        a year
//	[ ... ]     what to highlight, if not all of it
//
// A Pattern does not change after it is compiled and may be shared.
type Pattern struct {
	Source   string
	variants [][]elem      // tried in turn; more than one where a group holds gaps
	first    []text.Word   // words that a match can begin with
	starts   []uint64      // the same, a bit each
	anchors  [][]text.Word // by variant: words of which one must stand in the sentence; nil for no such words

	anchorBits [][]uint64 // the same, a bit each
}

// possible tells cheaply whether the pattern can match in a sentence at all.
// Many patterns begin with words that stand everywhere ("it", "not"); what
// must follow them does not.
func (p *Pattern) possible(d *text.Doc, s text.Sentence) bool {
	for i, a := range p.anchors {
		if a == nil || d.Has(s, a, p.anchorBits[i]) {
			return true
		}
	}
	return false
}

// mask is a signature of which some bit must stand in that of a sentence where
// the pattern matches.
func (p *Pattern) mask() text.Signature {
	var m text.Signature
	for _, a := range p.anchors {
		if a == nil {
			for i := range m {
				m[i] = ^uint64(0)
			}
		}
		for _, w := range a {
			m.Add(w)
		}
	}
	return m
}

// anchor picks, of the elements after the first that must stand there, the
// one with the fewest words to begin with.
func anchor(elems []elem) []text.Word {
	var best []text.Word
	first := true
	for _, e := range elems {
		if e.kind != phrases {
			continue
		}
		if first {
			first = false
			continue
		}
		if e.optional || best != nil && len(e.trie.next) >= len(best) {
			continue
		}
		best = make([]text.Word, 0, len(e.trie.next))
		for w := range e.trie.next {
			best = append(best, w)
		}
	}
	return best
}

// canStart tells whether a match can begin with a word.
func (p *Pattern) canStart(w text.Word) bool { return hasBit(p.starts, w) }

type elemKind uint8

const (
	phrases elemKind = iota
	gap
	anyWord
	number
	year
	markStart
	markEnd
)

type elem struct {
	kind     elemKind
	optional bool
	trie     *trie
	max      int  // words of a gap
	cross    bool // a gap that may cross a comma
	verb     bool // the first word must be a verb
	noun     bool // the first word must be a noun
}

// trie holds a set of word sequences. Built by add, it is closed for looking
// words up: most look-ups find nothing, and a bit tells so faster than a map.
type trie struct {
	next map[text.Word]*trie
	end  bool

	has   []uint64    // the words of next, a bit each
	words []text.Word // the words of next in order, when closed
	kids  []*trie     // what follows each
}

// fewWords are faster looked through than looked up.
const fewWords = 6

// close prepares a trie for child.
func (t *trie) close() {
	t.words = slices.Sorted(maps.Keys(t.next))
	if len(t.words) > fewWords {
		t.has = bitsOf(t.words)
	}
	t.kids = make([]*trie, len(t.words))
	for i, w := range t.words {
		t.kids[i] = t.next[w]
		t.kids[i].close()
	}
}

// child is what follows a word, nil for nothing.
func (t *trie) child(w text.Word) *trie {
	if len(t.words) <= fewWords {
		for i, x := range t.words {
			if x == w {
				return t.kids[i]
			}
		}
		return nil
	}
	if !hasBit(t.has, w) {
		return nil
	}
	if i, ok := slices.BinarySearch(t.words, w); ok {
		return t.kids[i]
	}
	return nil
}

// bitsOf sets a bit for each word.
func bitsOf(words []text.Word) []uint64 {
	var bits []uint64
	for _, w := range words {
		for len(bits) <= int(w>>6) {
			bits = append(bits, 0)
		}
		bits[w>>6] |= 1 << (w & 63)
	}
	return bits
}

func hasBit(bits []uint64, w text.Word) bool {
	i := int(w >> 6)
	return i < len(bits) && bits[i]&(1<<(w&63)) != 0
}

func (t *trie) add(words []text.Word) {
	for _, w := range words {
		if t.next == nil {
			t.next = map[text.Word]*trie{}
		}
		if t.next[w] == nil {
			t.next[w] = &trie{}
		}
		t = t.next[w]
	}
	t.end = true
}

// maxPhrases bounds what one term or group may stand for, so that a slip in a
// rule file cannot eat the memory.
const maxPhrases = 4000

// FirstWords lists the words that a match can begin with.
func (p *Pattern) FirstWords() []text.Word { return p.first }

// Match is where a pattern was found.
type Match struct {
	First, Last int // tokens First..Last-1
	Shown       corpus.Span
	loose       uint64 // bit i: token First+i was passed over by a gap
}

// Within tells whether the tokens first..last-1 all stand in gaps of the
// match: the pattern asked nothing of them.
func (m Match) Within(first, last int) bool {
	if first < m.First || last > m.Last || last-m.First > 64 {
		return false
	}
	for i := first; i < last; i++ {
		if m.loose&(1<<(i-m.First)) == 0 {
			return false
		}
	}
	return true
}

// MatchAt tells whether the pattern matches at token i of a sentence that
// ends before token last. Gaps are kept as short as possible.
func (p *Pattern) MatchAt(d *text.Doc, i, last int) (Match, bool) {
	for _, elems := range p.variants {
		if m, ok := matchAt(elems, d, i, last); ok {
			return m, true
		}
	}
	return Match{}, false
}

func matchAt(elems []elem, d *text.Doc, i, last int) (Match, bool) {
	m := matcher{d: d, last: last, start: -1, end: -1}
	end, ok := m.run(elems, i, i, true)
	if !ok || end == i {
		return Match{}, false
	}
	from, to := i, end
	if m.start >= 0 {
		from = m.start
	}
	if m.end >= 0 {
		to = m.end
	}
	if to <= from {
		from, to = i, end
	}
	return Match{i, end, corpus.Span{Start: d.Tokens[from].Start, End: d.Tokens[to-1].End}, m.loose}, true
}

type matcher struct {
	d          *text.Doc
	last       int
	start, end int // tokens of the marks, -1 where there are none
	loose      uint64
}

// run matches the elements from token i on; it returns the token after the
// match. begin is where the whole match began. Neighbouring elements do not
// stand on two sides of a comma, unless free: at the beginning, or behind a
// gap that may cross one.
func (m *matcher) run(elems []elem, i, begin int, free bool) (int, bool) {
	if len(elems) == 0 {
		return i, true
	}
	e, rest := &elems[0], elems[1:]
	switch e.kind {
	case markStart, markEnd:
		save := *m
		if e.kind == markStart {
			m.start = i
		} else {
			m.end = i
		}
		end, ok := m.run(rest, i, begin, free)
		if !ok {
			*m = save
		}
		return end, ok
	case gap:
		for n := 0; n <= e.max && i+n <= m.last; n++ {
			if n > 0 && !e.cross && m.d.Tokens[i+n-1].Break != text.NoBreak {
				return 0, false
			}
			save := m.loose
			for k := i; k < i+n && k-begin < 64; k++ {
				m.loose |= 1 << (k - begin)
			}
			if end, ok := m.run(rest, i+n, begin, e.cross); ok {
				return end, true
			}
			m.loose = save
		}
		return 0, false
	case phrases:
		if i < m.last && (free || m.d.Tokens[i].Break == text.NoBreak) && e.fits(m.d, i) {
			if end, ok := m.walk(e.trie, rest, i, i, begin); ok {
				return end, true
			}
		}
	case anyWord, number, year:
		if i < m.last && (free || m.d.Tokens[i].Break == text.NoBreak) && e.takes(m.d, i) {
			if end, ok := m.run(rest, i+1, begin, false); ok {
				return end, true
			}
		}
	}
	if e.optional {
		return m.run(rest, i, begin, free)
	}
	return 0, false
}

// takes tells whether an element of one word that is not looked up takes a token.
func (e *elem) takes(d *text.Doc, i int) bool {
	t := d.Tokens[i]
	switch e.kind {
	case number:
		return t.Number
	case year:
		w := d.Text[t.Start:t.End]
		return t.Number && len(w) == 4 && (w[:2] == "19" || w[:2] == "20")
	}
	return true
}

// walk tries the phrases of a trie, the longest first. A phrase does not
// cross a comma.
func (m *matcher) walk(t *trie, rest []elem, from, i, begin int) (int, bool) {
	if i < m.last && (i == from || m.d.Tokens[i].Break == text.NoBreak) {
		if w := m.d.Tokens[i].Word; w != 0 {
			if next := t.child(w); next != nil {
				if end, ok := m.walk(next, rest, from, i+1, begin); ok {
					return end, true
				}
			}
		}
	}
	if t.end {
		return m.run(rest, i, begin, false)
	}
	return 0, false
}

// fits checks the part of speech, where one is asked for.
func (e *elem) fits(d *text.Doc, i int) bool {
	if !e.verb && !e.noun {
		return true
	}
	if e.trie.child(d.Tokens[i].Word) == nil {
		return false // spare the tagger
	}
	tag := d.Tag(i)
	return e.verb && tag.Verb() || e.noun && tag.Noun()
}

// compiler turns pattern texts into patterns against one lexicon and the
// terms of one book.
type compiler struct {
	lexicon *text.Lexicon
	terms   map[string]*term
	used    map[string]bool // terms used by the pattern at hand, and below them
	tries   map[string]*compiled
}

// compiled is a word, term or group that was met before: most terms stand in
// many patterns, and a trie does not change.
type compiled struct {
	trie *trie
	used map[string]bool
}

func (c *compiler) pattern(source string) (*Pattern, error) {
	p := &Pattern{Source: source}
	items, err := pieces(source)
	if err != nil {
		return nil, err
	}
	sequences, err := spread(items)
	if err != nil {
		return nil, fmt.Errorf("pattern %q: %w", source, err)
	}
	seen := map[text.Word]bool{}
	for _, items := range sequences {
		if err := c.variant(p, items, seen); err != nil {
			return nil, err
		}
	}
	p.starts = bitsOf(p.first)
	for _, a := range p.anchors {
		p.anchorBits = append(p.anchorBits, bitsOf(a))
	}
	return p, nil
}

// maxVariants bounds what groups with gaps may multiply to.
const maxVariants = 64

// spread makes a sequence of each choice of the groups that hold gaps; the
// other groups stay whole, since a trie finds them faster.
func spread(items []string) ([][]string, error) {
	out := [][]string{nil}
	for _, item := range items {
		choices := [][]string{{item}}
		inner, isGroup := strings.CutPrefix(item, "(")
		body, optional := strings.CutSuffix(inner, "?")
		if isGroup && strings.HasSuffix(body, ")") && strings.Contains(body, "..") {
			choices = nil
			for _, choice := range alternatives(strings.TrimSuffix(body, ")")) {
				parts, err := pieces(choice)
				if err != nil {
					return nil, err
				}
				choices = append(choices, parts)
			}
			if optional {
				choices = append(choices, nil)
			}
		}
		if len(out)*len(choices) > maxVariants {
			return nil, fmt.Errorf("its groups with gaps stand for more than %d sequences", maxVariants)
		}
		var longer [][]string
		for _, a := range out {
			for _, b := range choices {
				longer = append(longer, append(append([]string(nil), a...), b...))
			}
		}
		out = longer
	}
	return out, nil
}

// variant compiles one sequence of a pattern.
func (c *compiler) variant(p *Pattern, items []string, seen map[text.Word]bool) error {
	source := p.Source
	var elems []elem
	for _, item := range items {
		e, err := c.elem(item)
		if err != nil {
			return err
		}
		elems = append(elems, e)
	}
	p.variants = append(p.variants, elems)
	p.anchors = append(p.anchors, anchor(elems))
	open := true
	for _, e := range elems {
		if !open {
			break
		}
		switch e.kind {
		case markStart, markEnd:
			continue
		case gap, anyWord, number, year:
			return fmt.Errorf("pattern %q: begin with a word that must stand there, not with a gap", source)
		}
		for w := range e.trie.next {
			if !seen[w] {
				seen[w] = true
				p.first = append(p.first, w)
			}
		}
		open = e.optional
	}
	if open {
		return fmt.Errorf("pattern %q: nothing in it must stand there", source)
	}
	return nil
}

func (c *compiler) elem(item string) (elem, error) {
	e := elem{}
	switch {
	case item == "[":
		return elem{kind: markStart}, nil
	case item == "]":
		return elem{kind: markEnd}, nil
	case item == "*":
		return elem{kind: anyWord}, nil
	case item == "#":
		return elem{kind: number}, nil
	case item == "####":
		return elem{kind: year}, nil
	case strings.HasPrefix(item, ".."):
		dots := len(item) - len(strings.TrimLeft(item, "."))
		e = elem{kind: gap, max: 3 * (dots - 1), cross: dots == 3}
		if n := item[dots:]; n != "" {
			max, err := strconv.Atoi(n)
			if err != nil || max < 1 || max > 40 {
				return e, fmt.Errorf("gap %q: want .. or ... and a number of words from 1 to 40", item)
			}
			e.max = max
		}
		if dots > 3 {
			return e, fmt.Errorf("gap %q: want two dots or three", item)
		}
		return e, nil
	}
	if rest, ok := strings.CutSuffix(item, "?"); ok {
		item, e.optional = rest, true
	}
	if rest, ok := strings.CutSuffix(item, ":verb"); ok {
		item, e.verb = rest, true
	} else if rest, ok := strings.CutSuffix(item, ":noun"); ok {
		item, e.noun = rest, true
	}
	if known := c.tries[item]; known != nil {
		maps.Copy(c.used, known.used)
		e.trie = known.trie
		return e, nil
	}
	outer := c.used
	c.used = map[string]bool{}
	seqs, err := c.phrases(item)
	used := c.used
	c.used = outer
	maps.Copy(c.used, used)
	if err != nil {
		return e, err
	}
	if len(seqs) == 0 {
		return e, fmt.Errorf("%q holds no word", item)
	}
	e.trie = &trie{}
	for _, s := range seqs {
		e.trie.add(s)
	}
	if c.tries == nil {
		c.tries = map[string]*compiled{}
	}
	e.trie.close()
	c.tries[item] = &compiled{e.trie, used}
	return e, nil
}

// phrases expands a word, term or group to word sequences.
func (c *compiler) phrases(item string) ([][]text.Word, error) {
	switch {
	case strings.HasPrefix(item, "{"):
		name := strings.Trim(item, "{}")
		return c.term(name)
	case strings.HasPrefix(item, "("):
		var out [][]text.Word
		for _, choice := range alternatives(item[1 : len(item)-1]) {
			seqs, err := c.sequence(choice)
			if err != nil {
				return nil, err
			}
			out = append(out, seqs...)
		}
		return out, nil
	case strings.HasSuffix(item, "~"):
		var out [][]text.Word
		for _, form := range Inflect(strings.TrimSuffix(item, "~")) {
			out = append(out, c.lexicon.Words(form))
		}
		return out, nil
	}
	if words := c.lexicon.Words(item); len(words) > 0 {
		return [][]text.Word{words}, nil
	}
	return nil, fmt.Errorf("%q holds no word", item)
}

// sequence expands a phrase (words, terms, groups, no gaps) to all the word
// sequences that it stands for.
func (c *compiler) sequence(phrase string) ([][]text.Word, error) {
	items, err := pieces(phrase)
	if err != nil {
		return nil, err
	}
	out := [][]text.Word{nil}
	for _, item := range items {
		if strings.ContainsAny(item[:1], ".[]*#") || strings.Contains(item, ":") {
			return nil, fmt.Errorf("%q cannot stand inside a term or a group", item)
		}
		item, optional := strings.CutSuffix(item, "?")
		seqs, err := c.phrases(item)
		if err != nil {
			return nil, err
		}
		if optional {
			seqs = append(seqs, nil)
		}
		if len(out)*len(seqs) > maxPhrases {
			return nil, fmt.Errorf("%q stands for more than %d phrases", phrase, maxPhrases)
		}
		var longer [][]text.Word
		for _, a := range out {
			for _, b := range seqs {
				longer = append(longer, append(append([]text.Word(nil), a...), b...))
			}
		}
		out = longer
	}
	return out, nil
}

// term expands a named term, once.
func (c *compiler) term(name string) ([][]text.Word, error) {
	t := c.terms[name]
	if t == nil {
		return nil, fmt.Errorf("no term is called %q%s", name, c.nearest(name))
	}
	c.used[name] = true
	switch t.state {
	case expanding:
		return nil, fmt.Errorf("term %q is explained by itself", name)
	case expanded:
		for u := range t.uses {
			c.used[u] = true
		}
		return t.phrases, nil
	}
	t.state = expanding
	outer := c.used
	c.used = map[string]bool{}
	for _, phrase := range t.source {
		seqs, err := c.sequence(phrase.text)
		if err != nil {
			return nil, &Fault{t.file, phrase.line, fmt.Sprintf("term %q: %v", name, err)}
		}
		t.phrases = append(t.phrases, seqs...)
	}
	t.state, t.uses = expanded, c.used
	c.used = outer
	for u := range t.uses {
		c.used[u] = true
	}
	return t.phrases, nil
}

// nearest suggests a term whose name begins alike.
func (c *compiler) nearest(name string) string {
	best, most := "", 2
	for t := range c.terms {
		n := 0
		for n < len(t) && n < len(name) && t[n] == name[n] {
			n++
		}
		if n > most || n == most && best != "" && t < best {
			best, most = t, n
		}
	}
	if best == "" {
		return ""
	}
	return fmt.Sprintf("; did you mean %q?", best)
}

// pieces cuts a pattern at spaces that stand outside brackets; [ and ] are
// pieces of their own. Neighbouring plain words stay apart here.
func pieces(source string) ([]string, error) {
	var out []string
	depth, start := 0, -1
	flush := func(i int) {
		if start >= 0 {
			out = append(out, source[start:i])
			start = -1
		}
	}
	for i := 0; i < len(source); i++ {
		switch ch := source[i]; {
		case ch == '(' || ch == '{':
			if start < 0 {
				start = i
			}
			depth++
		case ch == ')' || ch == '}':
			if depth--; depth < 0 {
				return nil, fmt.Errorf("pattern %q: %q closes nothing", source, string(ch))
			}
		case depth > 0:
		case ch == ' ' || ch == '\t':
			flush(i)
		case ch == '[' || ch == ']':
			flush(i)
			out = append(out, string(ch))
		case start < 0:
			start = i
		}
	}
	if depth != 0 {
		return nil, fmt.Errorf("pattern %q: a bracket is not closed", source)
	}
	flush(len(source))
	if len(out) == 0 {
		return nil, fmt.Errorf("an empty pattern")
	}
	return join(out), nil
}

// join brings neighbouring words together that the spelling table may write
// as one: the lexicon decides, so plain neighbours are simply one piece.
func join(items []string) []string {
	plain := func(s string) bool { return !strings.ContainsAny(s, "{}()~?:.[]*#") }
	var out []string
	for i, s := range items {
		if i > 0 && plain(s) && plain(items[i-1]) {
			out[len(out)-1] += " " + s
			continue
		}
		out = append(out, s)
	}
	return out
}

// alternatives cuts the inside of a group at the bars of its own level.
func alternatives(s string) []string {
	var out []string
	depth, start := 0, 0
	for i := 0; i < len(s); i++ {
		switch s[i] {
		case '(', '{':
			depth++
		case ')', '}':
			depth--
		case '|':
			if depth == 0 {
				out = append(out, s[start:i])
				start = i + 1
			}
		}
	}
	return append(out, s[start:])
}

// Parts counts the parts of the pattern that ask for words, and those of them
// for which a word to begin with stands in the sentence: how near the sentence
// comes to a match. Of several sequences that a pattern stands for, the
// nearest counts.
func (p *Pattern) Parts(d *text.Doc, s text.Sentence) (present, all int) {
	for _, elems := range p.variants {
		n, want := 0, 0
		for _, e := range elems {
			if e.kind != phrases || e.optional {
				continue
			}
			want++
			if d.Has(s, e.trie.words, bitsOf(e.trie.words)) {
				n++
			}
		}
		if all == 0 || n*all > present*want {
			present, all = n, want
		}
	}
	return present, all
}
