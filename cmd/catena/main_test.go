package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

// asProgram makes the test binary run as the program itself.
const asProgram = "CATENA_RUN_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
		return
	}
	testscript.Main(m, map[string]func(){"catena": main})
}

// The scripts double as a tutorial: each shows a command as it is typed.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{Dir: "testdata"})
}

// catena runs the program and returns what it printed to standard output.
func catena(t *testing.T, want int, args ...string) string {
	t.Helper()
	var out, errOut bytes.Buffer
	if got := run(context.Background(), args, strings.NewReader(""), &out, &errOut); got != want {
		t.Fatalf("catena %s: exit %d, want %d\n%s", strings.Join(args, " "), got, want, errOut.String())
	}
	return out.String()
}

// The published rates of on-demand operations under 14 CFR Part 135, 1988 to
// 2007 (National Transportation Safety Board, Table 9; see
// testdata/reference/README.md), from files through the command line: all 20
// printed rates to two decimals, and the exact limits.
func TestPublishedRates(t *testing.T) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "reference", "part135_ondemand_1988_2007.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	rows = rows[1:]
	dir := t.TempDir()
	var records, hours strings.Builder
	hours.WriteString("period,hours,covers\n")
	for _, r := range rows {
		accidents, err := strconv.Atoi(r[1])
		if err != nil {
			t.Fatal(err)
		}
		for n := range accidents {
			fmt.Fprintf(&records, `{"id":"%s-%d","source":"on-demand","date":"%s","event":"accident","narratives":[]}`+"\n", r[0], n, r[0])
		}
		fmt.Fprintf(&hours, "%s,%s,on-demand\n", r[0], r[3])
	}
	write := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	at := "--at=" + filepath.Join(dir, "c")
	catena(t, exitDone, "load", at, write("records.ndjson", records.String()))
	catena(t, exitDone, "exposure", at, write("hours.csv", hours.String()))
	var table struct {
		Columns []struct{ Name string }
		Rows    [][]any
	}
	if err := json.Unmarshal([]byte(catena(t, exitDone, "trend", at, "--by", "year", "--as", "json")), &table); err != nil {
		t.Fatal(err)
	}
	if len(table.Rows) != len(rows) || len(rows) != 20 {
		t.Fatalf("%d rows, want 20", len(table.Rows))
	}
	at2 := map[string]int{}
	for i, c := range table.Columns {
		at2[c.Name] = i
	}
	for i, r := range rows {
		got := table.Rows[i]
		rate, ok := got[at2["rate"]].(float64)
		if !ok || got[at2["period"]] != r[0] || strconv.FormatFloat(rate, 'f', 2, 64) != r[4] {
			t.Errorf("%s: rate %v in row %v, printed %s", r[0], rate, got[0], r[4])
		}
		for name, text := range map[string]string{"rate_low": r[6], "rate_high": r[7]} {
			want, err := strconv.ParseFloat(text, 64)
			if err != nil {
				t.Fatal(err)
			}
			if v, ok := got[at2[name]].(float64); !ok || math.Abs(v-want) > 1e-6 {
				t.Errorf("%s: %s %v, want %v", r[0], name, v, want)
			}
		}
	}
}
