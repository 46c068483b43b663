package ingest

import (
	"bytes"
	"fmt"
)

// format is one kind of file that can be read.
type format struct {
	name string // begins the name of sources that do not name themselves
	// looks tells whether a file of this name that begins with these bytes,
	// white space and byte-order mark cut off, is of the format.
	looks func(path string, head []byte) bool
	open  func(w *window, lim limits) (rowReader, error)
}

// formats are tried in this order; any text at all may be a table.
var formats = []format{
	{"json", func(_ string, head []byte) bool { return looksJSON(head) }, newJSONReader},
	{"xml", func(_ string, head []byte) bool { return looksXML(head) }, newXMLReader},
	{"text", looksReport, newTextReader},
	{"csv", func(string, []byte) bool { return true }, newDelimitedReader},
}

// formatOf picks the format of the file at path that begins with head.
func formatOf(path string, head []byte) format {
	for _, f := range formats {
		if f.looks(path, head) {
			return f
		}
	}
	panic("unreachable: the last format takes any text")
}

// byteOrderMark begins UTF-8 text as some programs write it.
var byteOrderMark = []byte("\xEF\xBB\xBF")

// asTable is what to try with a file that some program can open.
const asTable = "save it as CSV or JSON"

// signature is what a file of some other kind begins with.
type signature struct {
	at    int
	bytes string
	what  string
	try   string
}

// signatures are first bytes that tell a file which holds no text to read
// (the formats' own specifications), the more telling before the less.
var signatures = []signature{
	{0, "%PDF-", "a PDF document", "export the reports as CSV or JSON from where they were published"},
	{0, "{\\rtf", "an RTF document", asTable},
	{0, zipMagic, "an archive inside an archive, or a document that is one", "unpack it, or " + asTable},
	{0, "PK\x05\x06", "an empty ZIP archive", "check that it was downloaded whole"},
	{0, "\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1", "an old Office document", asTable},
	{0, "\x89PNG", "a PNG picture", "load the reports themselves"},
	{0, "\xFF\xD8\xFF", "a JPEG picture", "load the reports themselves"},
	{0, "GIF8", "a GIF picture", "load the reports themselves"},
	{0, "\x7FELF", "a program", "load the reports themselves"},
	{0, "SQLite format 3\x00", "an SQLite database", "export its table as CSV or JSON"},
	{0, "\x00\x01\x00\x00Standard ", "an Access database", "export its table as CSV"},
	{0, "PAR1", "a Parquet file", asTable},
	{0, "\x1F\x8B", "gzip inside gzip", "unpack it once"},
	{0, "BZh", "a bzip2 archive", "unpack it first; gzip is read as it is"},
	{0, "\xFD7zXZ\x00", "an xz archive", "unpack it first; gzip is read as it is"},
	{0, "\x28\xB5\x2F\xFD", "a zstd archive", "unpack it first; gzip is read as it is"},
	{0, "7z\xBC\xAF\x27\x1C", "a 7z archive", "unpack it and load what is inside"},
	{0, "Rar!", "a RAR archive", "unpack it and load what is inside"},
	{257, "ustar", "a tar archive", "unpack it and load what is inside"},
}

// pages are first characters of text that is no table of reports.
var pages = []signature{
	{0, "<!DOCTYPE html", "a web page", "download the table itself"},
	{0, "<!DOCTYPE HTML", "a web page", "download the table itself"},
	{0, "<!doctype html", "a web page", "download the table itself"},
	{0, "<html", "a web page", "download the table itself"},
	{0, "<HTML", "a web page", "download the table itself"},
}

// refuse returns an error that says what a file is that cannot hold a table
// of reports, judged by its first bytes before they are decoded.
func refuse(head []byte) error { return refuseAny(signatures, head) }

// refuseText is refuse for the first characters, decoded.
func refuseText(head []byte) error {
	if err := refuseAny(pages, head); err != nil {
		return err
	}
	return refuseBinary(head)
}

func refuseAny(known []signature, head []byte) error {
	text := bytes.TrimLeft(head, jsonSpace)
	for _, s := range known {
		if len(head) < s.at {
			continue
		}
		if !bytes.HasPrefix(head[s.at:], []byte(s.bytes)) && (s.at > 0 || !bytes.HasPrefix(text, []byte(s.bytes))) {
			continue
		}
		return fmt.Errorf("%s, not a table of reports: %s", s.what, s.try)
	}
	return nil
}

// refuseBinary refuses bytes that no text holds: a NUL, or more than one
// control character in a hundred (a stray one is a slip; a binary file has
// about ten). DEL does not count: JSON may hold it as it is.
func refuseBinary(head []byte) error {
	controls := 0
	for _, c := range head {
		switch {
		case c == 0:
			return fmt.Errorf("binary data (a NUL byte at byte %d), not a table of reports: %s in UTF-8", bytes.IndexByte(head, 0)+1, asTable)
		case c < ' ' && c != '\t' && c != '\n' && c != '\r' && c != '\f':
			controls++
		}
	}
	if controls*100 > len(head) {
		return fmt.Errorf("binary data (%d control characters in %d bytes), not a table of reports: %s", controls, len(head), asTable)
	}
	return nil
}
