package filter

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"catena/ingest/corpus"
)

// Vocabulary is what the language may speak of beside the fields.
type Vocabulary struct {
	Factors []string
}

// Error is a filter that cannot be understood. It prints the filter with the
// fault underlined.
type Error struct {
	Filter     string
	Start, End int // bytes
	Text       string
	Try        string // a suggestion, or ""
}

func (e *Error) Error() string {
	s := fmt.Sprintf("%s\n  %s\n  %s%s", e.Text, strings.Map(harmless, e.Filter),
		strings.Repeat(" ", utf8.RuneCountInString(e.Filter[:e.Start])), strings.Repeat("^", max(1, utf8.RuneCountInString(e.Filter[e.Start:e.End]))))
	if e.Try != "" {
		s += "\n  " + e.Try
	}
	return s
}

// harmless puts one letter in the place of every one that could drive a
// terminal or shift the underline.
func harmless(r rune) rune {
	switch {
	case r == '\t':
		return ' '
	case unicode.IsControl(r), unicode.Is(unicode.Bidi_Control, r):
		return utf8.RuneError
	}
	return r
}

// Bounds of the language, so that hostile input stays cheap.
const (
	maxLength = 10_000
	maxDepth  = 100
)

var keywords = []string{"and", "or", "not"}

// Parse reads a filter. An error is of type *Error.
func Parse(text string, v Vocabulary) (Node, error) {
	p := &parser{text: text, vocabulary: v}
	if len(text) > maxLength {
		p.text = strings.ToValidUTF8(text[:40], "")
		return nil, p.fault(0, len(p.text), fmt.Sprintf("longer than %d bytes", maxLength), "")
	}
	if !utf8.ValidString(text) || strings.ContainsAny(text, "\n\r\x00") {
		p.text = strings.ToValidUTF8(strings.NewReplacer("\n", " ", "\r", " ", "\x00", " ").Replace(text), "?")
		return nil, p.fault(0, 0, "want one line of UTF-8 text", "")
	}
	if err := p.next(); err != nil {
		return nil, err
	}
	if p.kind == end {
		return nil, p.fault(0, 0, "nothing to filter by", "for example: source = tarnwick")
	}
	n, err := p.or(0)
	if err != nil {
		return nil, err
	}
	if p.kind != end {
		return nil, p.fault(p.start, p.stop, fmt.Sprintf("%q cannot stand here", p.word), "join conditions with and, or")
	}
	// What is read must be readable once printed, blanks and all.
	if len(n.String()) > maxLength {
		return nil, p.fault(0, len(text), fmt.Sprintf("longer than %d bytes when written out", maxLength), "")
	}
	return n, nil
}

type kind uint8

const (
	end kind = iota
	word
	quoted
	operator
	bracket
)

// parser reads one token ahead.
type parser struct {
	text        string
	vocabulary  Vocabulary
	at          int // where the next token is looked for
	kind        kind
	word        string
	start, stop int // of the token at hand
}

func (p *parser) fault(start, stop int, text, try string) error {
	return &Error{p.text, start, stop, text, try}
}

// wordByte tells whether a byte can stand in a bare word.
func wordByte(c byte) bool {
	return c >= 0x80 || c == '-' || c == '_' || c == '.' || c == ':' || c == '/' || c >= '0' && c <= '9' || c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z'
}

func (p *parser) next() error {
	for p.at < len(p.text) && (p.text[p.at] == ' ' || p.text[p.at] == '\t') {
		p.at++
	}
	p.start = p.at
	if p.at == len(p.text) {
		p.kind, p.word, p.stop = end, "", p.at
		return nil
	}
	c := p.text[p.at]
	switch {
	case c == '(' || c == ')':
		p.kind = bracket
		p.at++
	case strings.IndexByte("=!<>~", c) >= 0:
		p.kind = operator
		p.at++
		if p.at < len(p.text) && p.text[p.at] == '=' && c != '=' && c != '~' {
			p.at++
		}
		if p.text[p.start:p.at] == "!" {
			return p.fault(p.start, p.at, "! alone means nothing", "write != or not")
		}
	case c == '"':
		return p.string()
	case wordByte(c):
		p.kind = word
		for p.at < len(p.text) && wordByte(p.text[p.at]) {
			p.at++
		}
	default:
		_, n := utf8.DecodeRuneInString(p.text[p.at:])
		return p.fault(p.at, p.at+n, "this sign means nothing here", `put values with signs or spaces in quotes: place = "Pell Island"`)
	}
	p.stop = p.at
	p.word = p.text[p.start:p.stop]
	return nil
}

// string reads a quoted value; \" and \\ stand for the sign itself.
func (p *parser) string() error {
	var b strings.Builder
	for i := p.at + 1; i < len(p.text); i++ {
		switch c := p.text[i]; {
		case c == '\\' && i+1 < len(p.text):
			i++
			b.WriteByte(p.text[i])
		case c == '"':
			p.kind, p.word, p.at, p.stop = quoted, b.String(), i+1, i+1
			return nil
		default:
			b.WriteByte(c)
		}
	}
	return p.fault(p.at, len(p.text), "the quotes are not closed", "")
}

func (p *parser) is(k string) bool { return p.kind == word && strings.EqualFold(p.word, k) }

func (p *parser) or(depth int) (Node, error) {
	left, err := p.and(depth)
	for err == nil && p.is("or") {
		if err = p.next(); err != nil {
			break
		}
		var right Node
		if right, err = p.and(depth); err == nil {
			left = &Or{left, right}
		}
	}
	return left, err
}

func (p *parser) and(depth int) (Node, error) {
	left, err := p.unary(depth)
	for err == nil && p.is("and") {
		if err = p.next(); err != nil {
			break
		}
		var right Node
		if right, err = p.unary(depth); err == nil {
			left = &And{left, right}
		}
	}
	return left, err
}

func (p *parser) unary(depth int) (Node, error) {
	if depth > maxDepth {
		return nil, p.fault(p.start, p.stop, fmt.Sprintf("brackets and nots deeper than %d", maxDepth), "")
	}
	switch {
	case p.is("not"):
		if err := p.next(); err != nil {
			return nil, err
		}
		inside, err := p.unary(depth + 1)
		if err != nil {
			return nil, err
		}
		return &Not{inside}, nil
	case p.kind == bracket && p.word == "(":
		open := p.start
		if err := p.next(); err != nil {
			return nil, err
		}
		n, err := p.or(depth + 1)
		if err != nil {
			return nil, err
		}
		if p.kind != bracket || p.word != ")" {
			return nil, p.fault(open, open+1, "this bracket is not closed", "")
		}
		return n, p.next()
	}
	return p.condition()
}

func (p *parser) condition() (Node, error) {
	if p.kind != word || slices.Contains(keywords, strings.ToLower(p.word)) {
		return nil, p.fault(p.start, p.stop, "want a field or a factor here", "for example: injury = fatal, or slow-airspeed")
	}
	name, start, stop := p.word, p.start, p.stop
	if err := p.next(); err != nil {
		return nil, err
	}
	if p.kind != operator {
		return p.factor(name, start, stop)
	}
	if !slices.Contains(fieldNames, name) && !(strings.HasPrefix(name, "extra.") && len(name) > len("extra.")) {
		return nil, p.fault(start, stop, fmt.Sprintf("no field is called %q", name), didYouMean(name, fieldNames, "there are "+strings.Join(fieldNames, ", ")+" and extra.NAME"))
	}
	c := &Compare{Field: name, Op: p.word}
	if err := p.next(); err != nil {
		return nil, err
	}
	if p.kind != word && p.kind != quoted {
		return nil, p.fault(p.start, p.stop, fmt.Sprintf("%s %s wants a value", c.Field, c.Op), "")
	}
	c.Value = p.word
	if err := p.checkValue(c); err != nil {
		return nil, err
	}
	return c, p.next()
}

func (p *parser) factor(name string, start, stop int) (Node, error) {
	id := strings.TrimPrefix(name, "factor:")
	if slices.Contains(p.vocabulary.Factors, id) {
		return &Factor{id}, nil
	}
	if slices.Contains(fieldNames, name) {
		return nil, p.fault(start, stop, fmt.Sprintf("what of %s?", name), fmt.Sprintf("for example: %s = VALUE", name))
	}
	return nil, p.fault(start, stop, fmt.Sprintf("no factor is called %q", id), didYouMean(id, p.vocabulary.Factors, "fields want a comparison, such as place = Tarnwick"))
}

// checkValue refuses values that could never compare, and those that would
// compare as something else than the field's name says.
func (p *parser) checkValue(c *Compare) error {
	order := strings.ContainsAny(c.Op, "<>")
	switch {
	case c.Field == "date" || c.Field == "year" || c.Field == "month":
		return p.checkDate(c)
	case c.Field == "engines":
		if _, err := strconv.Atoi(c.Value); err != nil {
			return p.fault(p.start, p.stop, fmt.Sprintf("%q is no number", c.Value), "")
		}
	case strings.HasPrefix(c.Field, "extra."):
		if _, ok := number(c.Value); order && !ok {
			return p.fault(p.start, p.stop, fmt.Sprintf("%q is no number", c.Value), "other values of "+c.Field+" have no order: = != and ~ can compare them")
		}
	case order:
		return p.fault(p.start, p.stop, fmt.Sprintf("%s has no order, so %s cannot compare it", c.Field, c.Op), "= != and ~ can")
	}
	return nil
}

func (p *parser) checkDate(c *Compare) error {
	if c.Op == "~" {
		return nil
	}
	d, err := corpus.ParseDate(c.Value)
	switch {
	case err != nil || c.Value == "":
		return p.fault(p.start, p.stop, fmt.Sprintf("%q is no date", c.Value), "write 2019, 2019-03 or 2019-03-31")
	case c.Field == "year" && d.Precision() > corpus.ToYear:
		return p.fault(p.start, p.stop, fmt.Sprintf("%q is finer than a year", c.Value), fmt.Sprintf("write date %s %s", c.Op, c.Value))
	case c.Field == "month" && d.Precision() > corpus.ToMonth:
		return p.fault(p.start, p.stop, fmt.Sprintf("%q is finer than a month", c.Value), fmt.Sprintf("write date %s %s", c.Op, c.Value))
	}
	return nil
}

func didYouMean(name string, names []string, otherwise string) string {
	if near := Nearest(name, names); near != "" {
		return fmt.Sprintf("did you mean %s?", near)
	}
	return otherwise
}

// Nearest finds the name that takes the fewest single-letter edits
// (Levenshtein 1966) to reach, "" where all are farther than a third of the word.
func Nearest(name string, names []string) string {
	best, fewest := "", max(1, len(name)/3)+1
	for _, n := range names {
		if d := edits(strings.ToLower(name), n); d < fewest {
			best, fewest = n, d
		}
	}
	return best
}

func edits(a, b string) int {
	if len(a) > 100 || len(b) > 100 {
		return 100
	}
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := 1; i <= len(a); i++ {
		corner := row[0]
		row[0] = i
		for j := 1; j <= len(b); j++ {
			above := row[j]
			cost := 1
			if a[i-1] == b[j-1] {
				cost = 0
			}
			row[j] = min(above+1, row[j-1]+1, corner+cost)
			corner = above
		}
	}
	return row[len(b)]
}
