package ingest

import (
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"io"
	"runtime"
	"strings"
	"testing"
	"time"
)

// endless is a text followed by one byte repeated n times and an end.
func endless(before string, repeat byte, n int64, after string) io.Reader {
	return io.MultiReader(strings.NewReader(before), io.LimitReader(repeated(repeat), n), strings.NewReader(after))
}

type repeated byte

func (r repeated) Read(p []byte) (int, error) {
	for i := range p {
		p[i] = byte(r)
	}
	return len(p), nil
}

// A row far over the limit passes through a small buffer.
func TestMemoryStaysBounded(t *testing.T) {
	const size = 32 << 20
	for name, in := range map[string]io.Reader{
		"table":  endless("id,narrative\n1,", 'x', size, "\n2,y\n"),
		"quoted": endless("id,narrative\n1,\"", 'x', size, "\"\n2,y\n"),
		"line":   endless(`{"id":"1","narrative":"`, 'x', size, "\"}\n{\"id\":\"2\"}\n"),
		"array":  endless(`[{"id":"1","narrative":"`, 'x', size, `"},{"id":"2"}]`),
	} {
		t.Run(name, func(t *testing.T) {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			f, err := Open(context.Background(), "-", in, Options{MaxRow: 64 << 10, SpoolDir: t.TempDir()})
			if err != nil {
				t.Fatal(err)
			}
			items, err := drain(f)
			runtime.ReadMemStats(&after)
			if err != nil || len(items) != 2 || items[0].SetAside == nil || items[1].Occurrence == nil {
				t.Fatalf("%v, got\n%s", err, outcomes(items))
			}
			if used := after.TotalAlloc - before.TotalAlloc; used > 4<<20 {
				t.Errorf("allocated %d bytes in all", used)
			}
		})
	}
}

// benchRows is how many rows of about 1.7 kB a benchmark reads: the mean of a
// narrative in the larger published collections.
const benchRows = 3000

func benchNarrative(i int) string {
	return strings.Repeat(fmt.Sprintf("On flight %d the left engine of the trainer lost power, and the pilot let the speed decay. ", i), 18)
}

func BenchmarkNDJSON(b *testing.B) {
	var lines strings.Builder
	for i := range benchRows {
		fmt.Fprintf(&lines, `{"id":"B%d","source":"bench","date":"2019-03-02","make":"Zephyrine","engines":2,"narratives":[{"kind":"factual","text":%q}],"extra":{"weather":"fog"}}`+"\n", i, benchNarrative(i))
	}
	yardstick := func(text string) {
		for line := range strings.Lines(text) {
			if !json.Valid([]byte(line)) {
				b.Fatal("not JSON")
			}
		}
	}
	benchmark(b, lines.String(), "json.Valid", yardstick)
}

func BenchmarkCSV(b *testing.B) {
	var table strings.Builder
	w := csv.NewWriter(&table)
	rows := [][]string{{"NtsbNo", "EventDate", "Make", "NumberOfEngines", "City", "State", "Weather", "Narrative"}}
	for i := range benchRows {
		rows = append(rows, []string{fmt.Sprint("B", i), "2019-03-02 10:11:12+00:00", "Zephyrine", "2", "Vell", "Norland", "fog", benchNarrative(i)})
	}
	if err := w.WriteAll(rows); err != nil {
		b.Fatal(err)
	}
	yardstick := func(text string) {
		r := csv.NewReader(strings.NewReader(text))
		for {
			if _, err := r.Read(); err == io.EOF {
				return
			} else if err != nil {
				b.Fatal(err)
			}
		}
	}
	benchmark(b, table.String(), "encoding/csv", yardstick)
}

// benchmark reads the text, and reports rows a second and how many times as
// long as the yardstick it takes.
func benchmark(b *testing.B, text, name string, yardstick func(string)) {
	start := time.Now()
	for range 3 {
		yardstick(text)
	}
	least := time.Since(start) / 3
	b.SetBytes(int64(len(text)))
	for b.Loop() {
		f, err := Open(context.Background(), "-", strings.NewReader(text), Options{})
		if err != nil {
			b.Fatal(err)
		}
		n := 0
		for {
			item, err := f.Next()
			if err == io.EOF {
				break
			}
			if err != nil || item.Occurrence == nil {
				b.Fatal(err, item.SetAside)
			}
			n++
		}
		if n != benchRows {
			b.Fatalf("%d rows", n)
		}
	}
	each := b.Elapsed() / time.Duration(b.N)
	b.ReportMetric(benchRows/each.Seconds(), "rows/s")
	b.ReportMetric(float64(each)/float64(least), "x/"+name)
}
