package ingest

import (
	"bytes"
	"io"
	"strings"
	"testing"
	"time"

	"github.com/xuri/excelize/v2"
)

func workbook(t *testing.T, fill func(*excelize.File)) io.Reader {
	t.Helper()
	book := excelize.NewFile()
	fill(book)
	var b bytes.Buffer
	if err := book.Write(&b); err != nil {
		t.Fatal(err)
	}
	return &b
}

func setRow(t *testing.T, book *excelize.File, sheet, at string, cells ...any) {
	t.Helper()
	if err := book.SetSheetRow(sheet, at, &cells); err != nil {
		t.Fatal(err)
	}
}

// A register as people keep it: a title above the header, a sheet of notes
// before it, real dates and numbers, blank rows and cells left out.
func TestWorkbookAsPeopleKeepIt(t *testing.T) {
	day := time.Date(2021, 3, 4, 0, 0, 0, 0, time.UTC)
	in := workbook(t, func(b *excelize.File) {
		setRow(t, b, "Sheet1", "A1", "How to fill this in")
		b.NewSheet("Register")
		setRow(t, b, "Register", "A1", "Occurrence register 2021")
		setRow(t, b, "Register", "A3", "Case no", "Date of event", "Engines", "Description", "Hours", "")
		for i, format := range []string{"", "yyyy-mm-dd", "dd/mm/yyyy", "d mmm yyyy"} {
			at := "A" + string(rune('4'+i))
			setRow(t, b, "Register", at, "C-"+string(rune('1'+i)), day, 2, "The door came open.", 12.5)
			if format == "" {
				continue
			}
			style, err := b.NewStyle(&excelize.Style{CustomNumFmt: &format})
			if err != nil {
				t.Fatal(err)
			}
			b.SetCellStyle("Register", strings.Replace(at, "A", "B", 1), strings.Replace(at, "A", "B", 1), style)
		}
		setRow(t, b, "Register", "A10", "C-5", 2021, nil, "The engine quit.")
		setRow(t, b, "Register", "A11", "C-6", "2021-03", "many", "Broken.")
	})
	f, err := Open(t.Context(), "register.xlsx", in, Options{SpoolDir: t.TempDir(), Dates: "dmy"})
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	items, err := drain(f)
	if err != nil {
		t.Fatal(err)
	}
	if len(items) != 6 || len(f.Unread()) != 1 || f.Unread()[0] != "Sheet1" {
		t.Fatalf("unread %v, %s", f.Unread(), outcomes(items))
	}
	for _, it := range items[:4] {
		o := it.Occurrence
		if o == nil || o.Date.String() != "2021-03-04" || o.Engines != 2 || o.Extra["Hours"] != "12.5" {
			t.Errorf("got %+v", it)
		}
	}
	if o := items[4].Occurrence; o == nil || o.Date.String() != "2021" || items[4].Source.Line != 10 {
		t.Errorf("got %+v", items[4])
	}
	if a := items[5].SetAside; a == nil || a.Line != 11 || !strings.Contains(a.Reason, "engines") {
		t.Errorf("got %+v", items[5])
	}
	// with its header above, the row that was set aside is a file again
	again := string(f.Header()) + "\n" + strings.Replace(string(items[5].Raw), "many", "2", 1) + "\n"
	if items, _ := readAll(t, again, Options{}); items[0].Occurrence == nil || items[0].Occurrence.ID != "C-6" {
		t.Errorf("read again: %s", outcomes(items))
	}
}

func TestBrokenWorkbooks(t *testing.T) {
	whole, err := io.ReadAll(workbook(t, func(b *excelize.File) { setRow(t, b, "Sheet1", "A1", "id", "date") }))
	if err != nil {
		t.Fatal(err)
	}
	for n := 100; n < len(whole); n += 97 { // cut short, and with a byte changed
		changed := bytes.Clone(whole)
		changed[n] ^= 0xFF
		for _, b := range [][]byte{whole[:n], changed} {
			f, err := Open(t.Context(), "x.xlsx", bytes.NewReader(b), Options{SpoolDir: t.TempDir()})
			if err == nil {
				drain(f) // any outcome but a crash
				f.Close()
			}
		}
	}
}
