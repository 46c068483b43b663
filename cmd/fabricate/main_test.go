package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"catena/ingest/corpus"
	"catena/ingest/fabricate"
)

// call runs the command and returns its code and what it wrote.
func call(args ...string) (code int, out, errOut string) {
	var o, e bytes.Buffer
	code = run(context.Background(), args, &o, &e)
	return code, o.String(), e.String()
}

func TestWritesThreeFiles(t *testing.T) {
	dir := t.TempDir()
	records, truth, hours := filepath.Join(dir, "r.ndjson"), filepath.Join(dir, "t.ndjson"), filepath.Join(dir, "h.csv")
	flags := []string{"--count", "40", "--seed", "5", "--from", "2020", "--to", "2020-03", "--out", records, "--truth", truth, "--exposure", hours}
	if code, out, errOut := call(flags...); code != exitDone || out != "" || errOut != "" {
		t.Fatalf("code %d, out %q, err %q", code, out, errOut)
	}
	rows, truths := lines(t, records), lines(t, truth)
	if len(rows) != 40 || len(truths) != 40 {
		t.Fatalf("%d records and %d truths, want 40", len(rows), len(truths))
	}
	for i := range rows {
		var o corpus.Occurrence
		var p fabricate.Truth
		if err := errors.Join(json.Unmarshal([]byte(rows[i]), &o), json.Unmarshal([]byte(truths[i]), &p)); err != nil {
			t.Fatal(err)
		}
		if o.ID != p.ID || o.Date.Year != 2020 {
			t.Errorf("line %d: record %s of %s, truth %s", i+1, o.ID, o.Date, p.ID)
		}
		for _, key := range []string{`"tags":[`, `"sequence":[`} {
			if !strings.Contains(truths[i], key) {
				t.Errorf("line %d lacks %s: %s", i+1, key, truths[i])
			}
		}
	}
	if got := lines(t, hours); len(got) != 1+3*3 {
		t.Errorf("exposure has %d lines, want a header and three months of three bases", len(got))
	}
	if left, _ := os.ReadDir(dir); len(left) != 3 {
		t.Errorf("%d files are left, want 3", len(left))
	}

	before := strings.Join(rows, "\n")
	if code, _, errOut := call(flags...); code != exitFailed || !strings.Contains(errOut, "hint: --force") {
		t.Errorf("second run: code %d, err %q", code, errOut)
	}
	if code, _, errOut := call(append(flags, "--force")...); code != exitDone {
		t.Errorf("with --force: code %d, err %q", code, errOut)
	}
	if strings.Join(lines(t, records), "\n") != before {
		t.Error("the same flags made other bytes")
	}
}

func TestStandardOutput(t *testing.T) {
	_, direct, _ := call("--count", "7", "--seed", "9")
	_, dash, _ := call("--count", "7", "--seed", "9", "--out", "-")
	if strings.Count(direct, "\n") != 7 || direct != dash {
		t.Errorf("standard output holds %d lines, want 7 and the same with -", strings.Count(direct, "\n"))
	}
}

func TestRefuses(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "x")
	for name, c := range map[string]struct {
		args []string
		code int
		want string
	}{
		"unknown flag":     {[]string{"--colour"}, exitUsage, "--colour"},
		"argument":         {[]string{"more"}, exitUsage, "more"},
		"no such day":      {[]string{"--from", "2020-02-31"}, exitUsage, "--from: date \"2020-02-31\": no such day"},
		"end before start": {[]string{"--from", "2020", "--to", "2019"}, exitUsage, "comes after"},
		"no count":         {[]string{"--count", "0"}, exitUsage, "want 1 or more"},
		"doubles":          {[]string{"--doubles", "0.9"}, exitUsage, "doubles"},
		"ids":              {[]string{"--ids", "roman"}, exitUsage, "roman"},
		"one place twice":  {[]string{"--out", file, "--truth", dir + "/./x"}, exitUsage, "two outputs"},
		"no such folder":   {[]string{"--out", filepath.Join(dir, "none", "x")}, exitFailed, "none"},
		"a folder":         {[]string{"--out", dir, "--force"}, exitFailed, "exists"},
	} {
		code, out, errOut := call(c.args...)
		if code != c.code || !strings.Contains(errOut, c.want) || out != "" {
			t.Errorf("%s: code %d, out %q, err %q", name, code, out, errOut)
		}
	}
	if left, _ := os.ReadDir(dir); len(left) != 0 {
		t.Errorf("refused runs left %d files", len(left))
	}
}

func TestStoppedRunLeavesNothing(t *testing.T) {
	dir := t.TempDir()
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var out, errOut bytes.Buffer
	code := run(ctx, []string{"--out", filepath.Join(dir, "r.ndjson")}, &out, &errOut)
	left, _ := os.ReadDir(dir)
	if code != exitFailed || len(left) != 0 || !strings.Contains(errOut.String(), "stopped") {
		t.Errorf("code %d, %d files left, err %q", code, len(left), errOut.String())
	}
}

// TestDemoIsUpToDate runs the go:generate line of main.go and compares.
func TestDemoIsUpToDate(t *testing.T) {
	source, err := os.ReadFile("main.go")
	if err != nil {
		t.Fatal(err)
	}
	_, rest, ok := strings.Cut(string(source), "//go:generate go run . ")
	if !ok {
		t.Fatal("main.go has no go:generate line")
	}
	line, _, _ := strings.Cut(rest, "\n")
	dir := t.TempDir()
	var made []string
	flags := strings.Fields(line)
	for i, f := range flags {
		if strings.HasPrefix(f, "../catena/demo/") {
			made = append(made, f)
			flags[i] = filepath.Join(dir, filepath.Base(f))
		}
	}
	if code, _, errOut := call(flags...); code != exitDone || len(made) != 3 {
		t.Fatalf("code %d, %d files, err %q", code, len(made), errOut)
	}
	for _, f := range made {
		want, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		got, err := os.ReadFile(filepath.Join(dir, filepath.Base(f)))
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s is out of date: run go generate ./cmd/fabricate", f)
		}
	}
}

func lines(t *testing.T, path string) []string {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return strings.Split(strings.TrimSuffix(string(b), "\n"), "\n")
}
