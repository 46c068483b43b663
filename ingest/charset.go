package ingest

import (
	"bufio"
	"bytes"
	"io"
	"unicode/utf8"

	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
	"golang.org/x/text/transform"
)

// Names of the character sets that files are read in.
const (
	charsetUTF8    = "UTF-8"
	charsetUTF16LE = "UTF-16, little endian"
	charsetUTF16BE = "UTF-16, big endian"
	charset1252    = "Windows-1252 (Latin-1)"
)

// charsetReader decodes a stream to UTF-8. UTF-16 is told by its mark or its
// zero bytes. Else nothing needs deciding before the first byte over 127: from
// there it looks ahead, so that a file whose first umlaut stands on its last
// page is read as rightly as any, and a stream as a file is.
type charsetReader struct {
	in      *bufio.Reader
	decoded io.Reader // nil until decided
	name    string
}

// charsetAhead is how many bytes behind the first byte over 127 are judged.
const charsetAhead = 256 << 10

func newCharsetReader(in io.Reader) *charsetReader {
	c := &charsetReader{in: bufio.NewReaderSize(in, charsetAhead), name: charsetUTF8}
	head, _ := c.in.Peek(1024)
	switch endian, name := utf16Of(head); {
	case name != "":
		c.name = name
		c.decoded = transform.NewReader(c.in, unicode.UTF16(endian, unicode.UseBOM).NewDecoder())
	case bytes.HasPrefix(head, byteOrderMark):
		c.decoded = c.in
	}
	return c
}

// utf16Of tells UTF-16 by its byte-order mark or, since ASCII text has a zero
// in every second byte of it, by more zeros than letters there and none in
// the other bytes.
func utf16Of(head []byte) (unicode.Endianness, string) {
	switch {
	case bytes.HasPrefix(head, []byte("\xFF\xFE")):
		return unicode.LittleEndian, charsetUTF16LE
	case bytes.HasPrefix(head, []byte("\xFE\xFF")):
		return unicode.BigEndian, charsetUTF16BE
	}
	var zeros [2]int
	for i, b := range head {
		if b == 0 {
			zeros[i%2]++
		}
	}
	half := len(head) / 4 // half of every second byte
	switch {
	case len(head) < 8:
	case zeros[1] > half && zeros[0] == 0:
		return unicode.LittleEndian, charsetUTF16LE
	case zeros[0] > half && zeros[1] == 0:
		return unicode.BigEndian, charsetUTF16BE
	}
	return unicode.LittleEndian, ""
}

func (c *charsetReader) Read(p []byte) (int, error) {
	if c.decoded != nil {
		return c.decoded.Read(p)
	}
	if _, err := c.in.Peek(1); err != nil {
		return 0, err
	}
	ready, _ := c.in.Peek(c.in.Buffered())
	plain := bytes.IndexFunc(ready, func(r rune) bool { return r >= utf8.RuneSelf })
	if plain < 0 {
		plain = len(ready)
	}
	if plain > 0 {
		return c.in.Read(p[:min(len(p), plain)])
	}
	ahead, _ := c.in.Peek(charsetAhead)
	c.decoded = c.in
	if !likeUTF8(ahead) {
		c.name = charset1252
		c.decoded = transform.NewReader(c.in, charmap.Windows1252.NewDecoder())
	}
	return c.decoded.Read(p)
}

// likeUTF8 tells whether text with bytes over 127 is UTF-8, if need be with
// some damage: in text of another set hardly any of those bytes happen to
// stand as UTF-8 has them.
func likeUTF8(text []byte) bool {
	if utf8.Valid(text) {
		return true
	}
	good, bad := 0, 0
	for len(text) > 0 {
		r, n := utf8.DecodeRune(text)
		switch {
		case r == utf8.RuneError && n == 1:
			if !utf8.FullRune(text) {
				return good >= bad // cut off by the end of what was looked at
			}
			bad++
		case n > 1:
			good++
		}
		text = text[n:]
	}
	return good >= bad
}
