package text

import (
	"strings"
	"unicode/utf8"

	"catena/ingest/corpus"
)

// Break is the strongest mark between a token and the token before it.
type Break uint8

// The breaks, weakest first. In many voluntary reports a semicolon stands for
// a comma: in a text that has semicolons and no commas.
const (
	NoBreak Break = iota
	Comma         // , : ( ) or a dash, or a semicolon that stands for a comma
	Clause        // a semicolon
	Stop          // the token begins a sentence
)

// Token is one word of the normal form. Several tokens may share a span where
// an abbreviation stands for several words.
type Token struct {
	Start, End int // bytes into the text
	Word       Word
	Break      Break
	Number     bool // digits, with or without decimals
}

// Sentence is a run of tokens.
type Sentence struct {
	First, Last int // tokens First..Last-1
	corpus.Span     // from the first byte of its first token to its end mark
}

// Doc is a text with its tokens and sentences.
type Doc struct {
	Text      string
	Capitals  bool // the text is written in capitals throughout
	Tokens    []Token
	Sentences []Sentence

	words   []uint64 // the words of one sentence, a bit each
	wordsOf int      // the first token of that sentence, plus one

	tags   []Tag  // per token, filled by sentence on demand
	tagged []bool // per sentence
}

// rawKind tells what a run of bytes is made of.
type rawKind uint8

const (
	letters rawKind = iota // letters, or letters and digits
	digits
	hash // the sign # before a number
)

type raw struct {
	start, end int // the word itself
	after      int // end including a possessive 's
	kind       rawKind
}

func isDigit(c byte) bool { return '0' <= c && c <= '9' }
func isUpper(c byte) bool { return 'A' <= c && c <= 'Z' }
func isLower(c byte) bool { return 'a' <= c && c <= 'z' }

// isLetter takes any byte of a character beyond ASCII as a letter unless it
// belongs to punctuation; see letterAt.
func isLetter(c byte) bool { return isUpper(c) || isLower(c) || c == '_' }

// letterAt reports the width in bytes of the letter at i, 0 where there is none.
func letterAt(s string, i int) int {
	if c := s[i]; c < utf8.RuneSelf {
		if isLetter(c) {
			return 1
		}
		return 0
	}
	r, n := utf8.DecodeRuneInString(s[i:])
	switch {
	case r >= 0x2000 && r <= 0x206F, r >= 0x80 && r <= 0xBF, r == 0xD7, r == 0xF7, r == 0xFFFD, r == utf8.RuneError, r == 0x3000, r == 0xFEFF:
		return 0 // general punctuation, signs such as the degree sign, spaces
	}
	return n
}

// apostrophe reports the width of an apostrophe at i, 0 where there is none.
func apostrophe(s string, i int) int {
	if i < len(s) && s[i] == '\'' {
		return 1
	}
	if strings.HasPrefix(s[min(i, len(s)):], "’") {
		return len("’")
	}
	return 0
}

// units that may be written against their number ("71kts").
var units = map[string]bool{
	"kt": true, "kts": true, "knot": true, "knots": true, "kias": true, "ktas": true, "ft": true, "feet": true,
	"lb": true, "lbs": true, "deg": true, "degs": true, "psi": true, "rpm": true, "nm": true, "mph": true,
	"hr": true, "hrs": true, "min": true, "mins": true, "sec": true, "secs": true, "gal": true, "mi": true, "sm": true, "hp": true,
}

// split cuts a text into runs of letters and of digits.
func split(s string) []raw {
	return appendRaw(make([]raw, 0, len(s)/6+4), s)
}

func appendRaw(out []raw, s string) []raw {
	for i := 0; i < len(s); {
		switch n := letterAt(s, i); {
		case isDigit(s[i]):
			end := digitsEnd(s, i)
			w := end
			for w < len(s) {
				n := letterAt(s, w)
				if n == 0 && !isDigit(s[w]) {
					break
				}
				w += max(n, 1)
			}
			switch {
			case w == end:
				out = append(out, raw{i, end, end, digits})
			case units[strings.ToLower(s[end:w])]:
				out = append(out, raw{i, end, end, digits}, raw{end, w, w, letters})
			default:
				out = append(out, raw{i, w, w, letters})
			}
			i = w
		case n > 0:
			start := i
			for i < len(s) {
				if n := letterAt(s, i); n > 0 {
					i += n
				} else if isDigit(s[i]) {
					i++
				} else if a := apostrophe(s, i); a > 0 && i+a < len(s) && letterAt(s, i+a) > 0 {
					i += a // inside a word: didn't, o'clock
				} else {
					break
				}
			}
			if i-start == 1 && slashed(s, start) {
				i = start + 3 // F/O, T/O, C/L
				out = append(out, raw{start, i, i, letters})
				continue
			}
			out = append(out, contraction(s, start, i)...)
		case s[i] == '#' && i+1 < len(s) && isDigit(s[i+1]):
			out = append(out, raw{i, i + 1, i + 1, hash})
			i++
		default:
			i++
		}
	}
	return out
}

// slashed tells whether two single letters with a stroke between them stand at i.
func slashed(s string, i int) bool {
	letter := func(i int) bool { return i >= 0 && i < len(s) && (isUpper(s[i]) || isLower(s[i])) }
	return letter(i) && i+2 < len(s) && s[i+1] == '/' && letter(i+2) && !letter(i+3) && (i+3 >= len(s) || !isDigit(s[i+3]) && s[i+3] != '/')
}

// digitsEnd finds the end of a number: 71, 1,200, 2.5.
func digitsEnd(s string, i int) int {
	for i < len(s) {
		switch {
		case isDigit(s[i]):
			i++
		case (s[i] == '.' || s[i] == ',') && i+1 < len(s) && isDigit(s[i+1]):
			i++
		default:
			return i
		}
	}
	return i
}

// contraction opens didn't and pilot's. The possessive stays in the span of
// its word ("after"), since quotes read better whole.
func contraction(s string, start, end int) []raw {
	word := s[start:end]
	cut := strings.LastIndexByte(word, '\'')
	width := 1
	if c := strings.LastIndex(word, "’"); c > cut {
		cut, width = c, len("’")
	}
	if cut <= 0 {
		return []raw{{start, end, end, letters}}
	}
	switch tail := strings.ToLower(word[cut+width:]); {
	case tail == "s":
		return []raw{{start, start + cut, end, letters}}
	case tail == "t" && cut > 1 && (word[cut-1] == 'n' || word[cut-1] == 'N'):
		head := raw{start, start + cut - 1, start + cut - 1, letters}
		if strings.EqualFold(word[:cut-1], "ca") {
			head.end, head.after = start+cut, start+cut // can't: can, 't as not
			return []raw{head, {start + cut, end, end, letters}}
		}
		return []raw{head, {start + cut - 1, end, end, letters}}
	case tail == "d" || tail == "ll" || tail == "ve" || tail == "re" || tail == "m":
		return []raw{{start, start + cut, start + cut, letters}, {start + cut, end, end, letters}}
	}
	return []raw{{start, end, end, letters}}
}

// Analyse splits a text into tokens and sentences.
func (l *Lexicon) Analyse(s string) *Doc {
	d := &Doc{Text: s, Capitals: capitals(s)}
	semicolon := Clause
	if !strings.Contains(s, ", ") {
		semicolon = Comma
	}
	raws := split(s)
	d.Tokens = make([]Token, 0, len(raws)+8)
	var lower [64]byte
	lastEnd := 0
	var prev raw
	for i, r := range raws {
		t := Token{Start: r.start, End: r.after, Number: r.kind == digits}
		if i == 0 {
			t.Break = Stop
		} else {
			t.Break = boundary(s, prev, r, lastEnd, d.Capitals, semicolon)
		}
		prev, lastEnd = r, r.after
		if side := l.sideLetter(s, raws, i); side != 0 {
			t.Word = side
			d.push(l, t)
			continue
		}
		if n := r.end - r.start; n <= len(lower) {
			key := lower[:n]
			for j := range key {
				c := s[r.start+j]
				if isUpper(c) {
					c += 'a' - 'A'
				}
				key[j] = c
			}
			w, known := l.ids[string(key)]
			stands := []Word(nil)
			if known && l.opens[w] {
				if stands = l.spelled[string(key)]; stands == nil {
					stands = decide(l.ambiguous[string(key)], s, raws, i)
				}
			} else if !known && r.kind == letters {
				if w, known = l.repair(string(key)); !known && i > 0 && n > 1 {
					p := &d.Tokens[len(d.Tokens)-1]
					if whole, ok := l.brokenLine(s, raws[i-1], r); ok && p.Start == raws[i-1].start {
						p.Word, p.End = whole, r.after
						continue
					}
				}
			}
			if stands != nil {
				for k, w := range stands {
					t.Word = w
					if k > 0 {
						t.Break = NoBreak
					}
					d.push(l, t)
				}
				continue
			}
			t.Word = w
		}
		d.push(l, t)
	}
	d.sentences()
	return d
}

// sideLetter reads a lone capital L or R before a word as left or right
// ("L ENG"), but not after a number ("RWY 25 L").
func (l *Lexicon) sideLetter(s string, raws []raw, i int) Word {
	r := raws[i]
	if r.end-r.start != 1 || s[r.start] != 'L' && s[r.start] != 'R' || i+1 == len(raws) {
		return 0
	}
	next := raws[i+1]
	if next.kind != letters || next.start != r.after+1 || s[r.after] != ' ' || i > 0 && raws[i-1].kind == digits {
		return 0
	}
	if s[r.start] == 'L' {
		return l.ids["left"]
	}
	return l.ids["right"]
}

// push adds a token, joining it with the one before where the two are one
// word (take off) or a numbered thing (No. 1).
func (d *Doc) push(l *Lexicon, t Token) {
	if n := len(d.Tokens); n > 0 && t.Break == NoBreak {
		p := &d.Tokens[n-1]
		switch {
		case p.Word == 0:
		case l.pairs[p.Word]:
			if w, ok := l.joined[[2]Word{p.Word, t.Word}]; ok {
				p.Word, p.End = w, t.End
				return
			}
		case p.Word == l.no || p.Word == l.number || p.Word == l.hash:
			if w := l.numbered(d.Text, *p, t); w != 0 {
				p.Word, p.End, p.Number = w, t.End, false
				return
			}
		}
	}
	d.Tokens = append(d.Tokens, t)
}

// numbered tells whether p and t together are "No. 1" or the like.
func (l *Lexicon) numbered(s string, p, t Token) Word {
	n := 0
	switch w := s[t.Start:t.End]; {
	case len(w) == 1 && w[0] >= '1' && w[0] <= '4':
		n = int(w[0] - '0')
	case strings.EqualFold(w, "one"):
		n = 1
	case strings.EqualFold(w, "two"):
		n = 2
	default:
		return 0
	}
	// "no one noticed" is not a number: a word needs the full stop
	if p.Word != l.no || t.Number || strings.Contains(s[p.End:t.Start], ".") {
		return l.numbers[n]
	}
	return 0
}

// maxSentence bounds a sentence, so that a text without full stops cannot
// make rules slow: 300 words are more than any sentence met in the corpora.
const maxSentence = 300

func (d *Doc) sentences() {
	for i := range d.Tokens {
		if i == 0 || d.Tokens[i].Break == Stop || i-d.Sentences[len(d.Sentences)-1].First >= maxSentence {
			d.Tokens[i].Break = Stop
			d.Sentences = append(d.Sentences, Sentence{First: i})
		}
		s := &d.Sentences[len(d.Sentences)-1]
		s.Last = i + 1
	}
	for i := range d.Sentences {
		s := &d.Sentences[i]
		s.Start, s.End = d.Tokens[s.First].Start, d.Tokens[s.Last-1].End
		limit := len(d.Text)
		if i+1 < len(d.Sentences) {
			limit = d.Tokens[d.Sentences[i+1].First].Start
		}
		// its end mark, and signs written against the last word: 10°, 20%
		for s.End < limit && strings.IndexByte(" \t\r\n([{", d.Text[s.End]) < 0 {
			s.End++
		}
	}
}

// Has tells whether one of the words stands in the sentence; bits holds a bit
// for each of them. The answer for a sentence is prepared once; a Doc is for one
// goroutine at a time.
func (d *Doc) Has(s Sentence, words []Word, bits []uint64) bool {
	if d.wordsOf != s.First+1 {
		clear(d.words)
		d.wordsOf = s.First + 1
		for _, t := range d.Tokens[s.First:s.Last] {
			for int(t.Word>>6) >= len(d.words) {
				d.words = append(d.words, 0)
			}
			d.words[t.Word>>6] |= 1 << (t.Word & 63)
		}
	}
	if len(words) > s.Last-s.First { // the sentence is the shorter list
		for _, t := range d.Tokens[s.First:s.Last] {
			if i := int(t.Word >> 6); t.Word != 0 && i < len(bits) && bits[i]&(1<<(t.Word&63)) != 0 {
				return true
			}
		}
		return false
	}
	for _, w := range words {
		if i := int(w >> 6); i < len(d.words) && d.words[i]&(1<<(w&63)) != 0 {
			return true
		}
	}
	return false
}

// Signature is a set of words that may say yes where it should say no: a bit
// each of 256.
type Signature [4]uint64

// Add puts a word in.
func (g *Signature) Add(w Word) { g[w>>6&3] |= 1 << (w & 63) }

// Meets tells whether the two may have a word in common.
func (g *Signature) Meets(h *Signature) bool {
	return g[0]&h[0]|g[1]&h[1]|g[2]&h[2]|g[3]&h[3] != 0
}

// Signature is that of the words of a sentence.
func (d *Doc) Signature(s Sentence) Signature {
	var g Signature
	for _, t := range d.Tokens[s.First:s.Last] {
		g.Add(t.Word)
	}
	return g
}

// Sentence finds the sentence that holds token i.
func (d *Doc) Sentence(i int) int {
	lo, hi := 0, len(d.Sentences)
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; d.Sentences[mid].First <= i {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

// capitals tells whether a text is written in capitals: fewer than one letter
// in twelve is small. Texts of fewer than ten letters do not count as such.
func capitals(s string) bool {
	upper, lower := 0, 0
	for i := 0; i < len(s) && i < 2000; i++ {
		if isUpper(s[i]) {
			upper++
		} else if isLower(s[i]) {
			lower++
		}
	}
	return upper >= 10 && lower*12 < upper
}
