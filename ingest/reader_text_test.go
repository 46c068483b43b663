package ingest

import (
	"strings"
	"testing"
)

func TestOwnReports(t *testing.T) {
	const body = "On the climb the left engine surged: twice.\n\nI lowered the nose."
	for _, c := range []struct{ name, path, text, id, date, place, told string }{
		{"head", "a.txt", "Ref: T-7\nDate of event: 2021-03-04\nPlace: Tarnwick\nWeather: calm\n\n" + body + "\n", "T-7", "2021-03-04", "Tarnwick", body},
		{"fenced head", "a.md", "---\nid: T-8\ndate: 4 March 2021\n---\n\n" + body, "T-8", "2021-03-04", "", body},
		{"no head", "a.md", body + "\n", "", "", "", body},
		{"first line with a colon", "a.txt", "Note: " + body, "", "", "", "Note: " + body},
		{"no blank line", "a.txt", "id: T-9\n" + strings.ReplaceAll(body, ":", ""), "T-9", "", "", strings.ReplaceAll(body, ":", "")},
		{"carriage returns", "a.txt", "id: T-10\r\n\r\nOne.\r\nTwo.\r\n", "T-10", "", "", "One.\r\nTwo."},
		{"a stream", "-", "id: T-11\nplace: Sellow\n\n" + body, "T-11", "", "Sellow", body},
		{"packed name", "a.TXT.gz", "id: T-12\n\nx y", "T-12", "", "", "x y"},
	} {
		f, err := Open(t.Context(), c.path, strings.NewReader(c.text), Options{SpoolDir: t.TempDir()})
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		items, err := drain(f)
		f.Close()
		if err != nil || len(items) != 1 || items[0].Occurrence == nil {
			t.Errorf("%s: %v, %s", c.name, err, outcomes(items))
			continue
		}
		o := items[0].Occurrence
		if c.id != "" && o.ID != c.id || o.Date.String() != c.date || o.Place != c.place || o.Source != "own-reports" {
			t.Errorf("%s: got %+v", c.name, o)
		}
		if len(o.Narratives) != 1 || o.Narratives[0].Text != c.told || o.Narratives[0].Kind != "reporter" {
			t.Errorf("%s: told %q", c.name, o.Narratives)
		}
	}
}

// A table is a table whatever its file is called.
func TestTableInATextFile(t *testing.T) {
	f, err := Open(t.Context(), "export.txt", strings.NewReader("id\tdate\tnarrative\nA\t2021\tx\nB\t2022\ty\n"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if items, err := drain(f); err != nil || len(items) != 2 {
		t.Errorf("%v, %s", err, outcomes(items))
	}
}
