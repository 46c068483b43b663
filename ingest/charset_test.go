package ingest

import (
	"strings"
	"testing"

	"golang.org/x/text/encoding"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
)

// The encoders are those of golang.org/x/text, which follow the WHATWG
// Encoding Standard; only what Windows-1252 can hold is written in it.
func TestCharsets(t *testing.T) {
	const text = "id,narrative\nA,“Ruder” gegen die Böe – 5 € Schaden\nB,plain\n"
	for _, c := range []struct {
		name string
		set  encoding.Encoding
	}{
		{charsetUTF8, encoding.Nop},
		{charsetUTF8, unicode.UTF8BOM},
		{charset1252, charmap.Windows1252},
		{charsetUTF16LE, unicode.UTF16(unicode.LittleEndian, unicode.IgnoreBOM)},
		{charsetUTF16LE, unicode.UTF16(unicode.LittleEndian, unicode.UseBOM)},
		{charsetUTF16BE, unicode.UTF16(unicode.BigEndian, unicode.IgnoreBOM)},
		{charsetUTF16BE, unicode.UTF16(unicode.BigEndian, unicode.UseBOM)},
	} {
		encoded, err := c.set.NewEncoder().String(text)
		if err != nil {
			t.Fatal(err)
		}
		// the first byte over 127 may stand far behind what Open looks at
		for _, lead := range []int{0, 3 * charsetAhead} {
			if lead > 0 && strings.HasPrefix(c.name, "UTF-16") {
				continue
			}
			input := encoded
			if lead > 0 {
				filler := "X," + strings.Repeat("calm ", 100) + "\n"
				input = strings.Replace(encoded, "A,", strings.Repeat(filler, lead/len(filler))+"A,", 1)
			}
			items, name := readCharset(t, input)
			n := len(items) - 2
			if name != c.name {
				t.Errorf("%s behind %d bytes: read as %s", c.name, lead, name)
			}
			if o := items[n].Occurrence; o == nil || o.ID != "A" || o.Narratives[0].Text != "“Ruder” gegen die Böe – 5 € Schaden" {
				t.Errorf("%s behind %d bytes: got %+v", c.name, lead, items[n])
			}
		}
	}
}

func readCharset(t *testing.T, text string) ([]Item, string) {
	t.Helper()
	f, err := Open(t.Context(), "-", strings.NewReader(text), Options{SpoolDir: t.TempDir()})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	items, err := drain(f)
	if err != nil {
		t.Fatal(err)
	}
	return items, f.Charset()
}

func TestDamagedUTF8StaysUTF8(t *testing.T) {
	items, name := readCharset(t, "id,narrative\nA,Böe\nB,B\xf6e\nC,Bö\n")
	if name != charsetUTF8 || items[1].SetAside == nil || items[0].Occurrence == nil || items[2].Occurrence == nil {
		t.Errorf("%s: %s", name, outcomes(items))
	}
}
