package ingest

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strings"
	"unicode/utf16"
	"unicode/utf8"
)

// jsonText walks over one JSON value (RFC 8259) and hands its parts to the
// caller as they come, so that a record is decoded once and straight into its
// fields. Strings without escapes are substrings of the text. The text must
// be valid UTF-8.
//
// encoding/json keeps neither the order of the keys nor a repeated one, or, a
// token at a time, takes several times as long.
type jsonText struct {
	s     string
	at    int
	depth int
}

// maxDepth is how deep values may nest: the occurrence record needs three.
const maxDepth = 64

// fail tells what is wrong at the present byte, counted from 1.
func (p *jsonText) fail(what string) error {
	return fmt.Errorf("broken JSON at byte %d of the row: %s", p.at+1, what)
}

// peek skips white space and returns the byte that begins the next token, or
// 0 at the end.
func (p *jsonText) peek() byte {
	for p.at < len(p.s) {
		switch c := p.s[p.at]; c {
		case ' ', '\t', '\n', '\r':
			p.at++
		default:
			return c
		}
	}
	return 0
}

// end returns an error when anything but white space follows.
func (p *jsonText) end() error {
	if p.peek() != 0 || p.at < len(p.s) {
		return p.fail("more text after the end of the value")
	}
	return nil
}

// object reads an object; member must read the value of the key that it gets.
func (p *jsonText) object(member func(key string) error) error {
	return p.list('{', '}', func() error {
		if p.peek() != '"' {
			return p.fail("want a key in quotes")
		}
		key, err := p.text()
		if err != nil {
			return err
		}
		if p.peek() != ':' {
			return p.fail("want a colon after the key")
		}
		p.at++
		return member(key)
	})
}

// array reads an array; element must read one value.
func (p *jsonText) array(element func() error) error { return p.list('[', ']', element) }

// list reads items between brackets, with commas between them. One comma
// behind the last item is let pass.
func (p *jsonText) list(opening, closing byte, item func() error) error {
	if p.peek() != opening {
		return p.fail(fmt.Sprintf("want %q", opening))
	}
	if p.depth++; p.depth > maxDepth {
		return p.fail(fmt.Sprintf("nested deeper than %d", maxDepth))
	}
	p.at++
	for p.peek() != closing {
		if err := item(); err != nil {
			return err
		}
		switch p.peek() {
		case ',':
			p.at++
		case closing:
		default:
			return p.fail(fmt.Sprintf("want a comma or %q", closing))
		}
	}
	p.at++
	p.depth--
	return nil
}

// text reads a string.
func (p *jsonText) text() (string, error) {
	if p.peek() != '"' {
		return "", p.fail("want a text in quotes")
	}
	p.at++
	start := p.at
	var decoded []byte // what stands before start, once there was an escape
	for p.at < len(p.s) {
		switch c := p.s[p.at]; {
		case c == '"':
			part := p.s[start:p.at]
			p.at++
			if decoded == nil {
				return part, nil
			}
			return string(append(decoded, part...)), nil
		case c < ' ':
			return "", p.fail("a control character inside a text")
		case c == '\\':
			decoded = append(decoded, p.s[start:p.at]...)
			var err error
			if decoded, err = p.escape(decoded); err != nil {
				return "", err
			}
			start = p.at
		default:
			p.at++
		}
	}
	return "", p.fail("the text is not closed")
}

// escape decodes the escape sequence at the present byte. Half a surrogate
// pair becomes U+FFFD, as encoding/json has it.
func (p *jsonText) escape(b []byte) ([]byte, error) {
	if p.at+1 >= len(p.s) {
		return nil, p.fail("the text is not closed")
	}
	c := p.s[p.at+1]
	if i := strings.IndexByte(`"\/bfnrt`, c); i >= 0 {
		p.at += 2
		return append(b, "\"\\/\b\f\n\r\t"[i]), nil
	}
	r, ok := p.codeUnit()
	if !ok {
		return nil, p.fail("no such escape")
	}
	p.at += 6
	if utf16.IsSurrogate(r) {
		low, ok := p.codeUnit()
		if r = utf16.DecodeRune(r, low); ok && r != utf8.RuneError {
			p.at += 6
		} else {
			r = utf8.RuneError
		}
	}
	return utf8.AppendRune(b, r), nil
}

// codeUnit reads "\uXXXX" at the present byte without passing it.
func (p *jsonText) codeUnit() (rune, bool) {
	rest := p.s[p.at:]
	if len(rest) < 6 || rest[0] != '\\' || rest[1] != 'u' {
		return 0, false
	}
	var r rune
	for _, c := range []byte(rest[2:6]) {
		switch {
		case c >= '0' && c <= '9':
			r = r<<4 | rune(c-'0')
		case c|0x20 >= 'a' && c|0x20 <= 'f':
			r = r<<4 | rune(c|0x20-'a'+10)
		default:
			return 0, false
		}
	}
	return r, true
}

// scalar reads a string, number, true, false or null. A number is returned as
// it is written, and null as "" and false.
func (p *jsonText) scalar() (text string, ok bool, err error) {
	switch c := p.peek(); {
	case c == '"':
		text, err = p.text()
		return text, true, err
	case c == '-' || c >= '0' && c <= '9':
		text, err = p.number()
		return text, true, err
	}
	for _, word := range []string{"null", "true", "false"} {
		if strings.HasPrefix(p.s[p.at:], word) {
			p.at += len(word)
			if word == "null" {
				return "", false, nil
			}
			return word, true, nil
		}
	}
	return "", false, p.fail("want a value")
}

// number reads a number and returns it as it is written.
func (p *jsonText) number() (string, error) {
	start := p.at
	digits := func() bool {
		from := p.at
		for p.at < len(p.s) && p.s[p.at] >= '0' && p.s[p.at] <= '9' {
			p.at++
		}
		return p.at > from
	}
	is := func(set string) bool {
		if p.at < len(p.s) && strings.IndexByte(set, p.s[p.at]) >= 0 {
			p.at++
			return true
		}
		return false
	}
	is("-")
	ok := is("0") || digits()
	if ok && is(".") {
		ok = digits()
	}
	if ok && is("eE") {
		is("+-")
		ok = digits()
	}
	if !ok {
		return "", p.fail("not a number")
	}
	return p.s[start:p.at], nil
}

// skip passes over one value of any kind.
func (p *jsonText) skip() error {
	switch p.peek() {
	case '{':
		return p.object(func(string) error { return p.skip() })
	case '[':
		return p.array(p.skip)
	}
	_, _, err := p.scalar()
	return err
}

// any reads a value of any kind as text: a nested one as compact JSON. It
// returns false for null.
func (p *jsonText) any() (text string, nested, ok bool, err error) {
	if c := p.peek(); c != '{' && c != '[' {
		text, ok, err = p.scalar()
		return text, false, ok, err
	}
	start := p.at
	if err := p.skip(); err != nil {
		return "", false, false, err
	}
	var b bytes.Buffer
	if json.Compact(&b, []byte(p.s[start:p.at])) != nil {
		return p.s[start:p.at], true, true, nil // a trailing comma, which Compact refuses
	}
	return b.String(), true, true, nil
}
