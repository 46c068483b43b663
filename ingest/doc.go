// Package ingest turns files into occurrences: one reader per format, and a
// field map that says what each column means.
//
// The usual steps:
//
//	f, err := ingest.Open(ctx, "reports.csv", nil, ingest.Options{})
//	defer f.Close()
//	fmt.Println(f.Map().Name) // what the columns were taken for
//	for {
//		item, err := f.Next() // io.EOF after the last row
//		...
//	}
//
// Open peeks at a bounded sample, tells the format by its bytes (never by the
// file's name), finds the fields by the words of the header, and decides the
// order of day and month from the values. It refuses, with a word on what to
// try, a file that is no table of reports: a document, a picture, an archive,
// a table in which no column is known, a column of dates whose order cannot
// be told. It works on a pipe as on a file; nothing seeks.
//
// Next returns each row as an occurrence or as set aside. A row is set aside,
// raw and with the reason, when it is ragged, not UTF-8, larger than the row
// limit, broken JSON, dated on a day that does not exist, or holds no id, no
// date and no narrative. Reading then goes on. Memory stays bounded by the
// row limit whatever the file holds; a larger row goes to a temporary file.
//
// What is kept of a row: known columns go to their fields, every other cell
// that is not blank to Extra under its header. A narrative's text is the
// cell's, byte for byte, after the format's own quoting and, in delimited
// files, one pass of HTML entities. Fields are trimmed, and placeholders such
// as "NULL" or "***" count as unknown. The keys of the occurrence record are
// taken as they stand in JSON.
//
// To add a format, write reader_*.go after its neighbours' shape and add one
// line to the table in format.go.
//
// Floor 4 (engines).
package ingest
