package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// The README's commands are run as they stand, on an invented file.
func TestReadmeCommands(t *testing.T) {
	readme, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	for name, text := range map[string]string{
		"reports.csv": "Ref,Date,Make,Model,Narrative\n" +
			"R-2024-017,2024-07-03,Larkin,120,\"The left engine quit, the wrong rudder went in and the airspeed decayed.\"\n" +
			"R-2024-018,2024-08-11,Larkin,160,Rotating at Tarnwick the canopy flew open and a bird was struck.\n" +
			"R-2024-031,2024-07-03,Larkin,120,The student was late on the right rudder when the power went.\n",
		"hours.csv": "period,hours,covers\n2024-Q3,410.5,our-base\n",
	} {
		if err := os.WriteFile(name, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	commands := regexp.MustCompile(`(?m)^\./catena ([^#\n]*)`).FindAllStringSubmatch(string(readme), -1)
	if len(commands) < 7 {
		t.Fatalf("only %d commands found in the README", len(commands))
	}
	for _, c := range commands {
		args := words(strings.TrimSpace(c[1]))
		var out, errOut bytes.Buffer
		if code := run(context.Background(), args, strings.NewReader(""), &out, &errOut); code != exitDone {
			t.Errorf("catena %s: exit %d\n%s", strings.Join(args, " "), code, errOut.String())
		}
	}
	checkReadmeRule(t, string(readme))
}

// words splits a command line at spaces, minding single quotes.
func words(line string) []string {
	var out []string
	for _, m := range regexp.MustCompile(`'([^']*)'|(\S+)`).FindAllStringSubmatch(line, -1) {
		out = append(out, m[1]+m[2])
	}
	return out
}

// checkReadmeRule loads the README's rule file and finds its example.
func checkReadmeRule(t *testing.T, readme string) {
	t.Helper()
	m := regexp.MustCompile("(?s)```yaml\n(.*?)```").FindStringSubmatch(readme)
	if m == nil {
		t.Fatal("no rule file in the README")
	}
	if err := os.MkdirAll("our-rules", 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join("our-rules", "own.yaml"), []byte(m[1]), 0o600); err != nil {
		t.Fatal(err)
	}
	if out := catena(t, exitDone, "rules", "check", "--rules", "our-rules"); !strings.Contains(out, "all as they should be") {
		t.Errorf("rules check printed %q", out)
	}
	if out := catena(t, exitDone, "tag", "--rules", "our-rules"); !strings.Contains(out, "tagged 1 of 2") {
		t.Errorf("tag printed %q", out) // the other one is not touched by the new rule
	}
	out := catena(t, exitDone, "rules", "explain", "R-2024-018", "door-open")
	for _, want := range []string{"the [canopy flew open]", "rule door-open/canopy (own.yaml:3", "The canopy came open."} {
		if !strings.Contains(out, want) {
			t.Errorf("explain does not show %q:\n%s", want, out)
		}
	}
}

func TestDemo(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "demo")
	out := catena(t, exitDone, "demo", "--dir", dir)
	for _, want := range append([]string{"commonest chains", "What to type next", "no figure here is a finding"}, headline4...) {
		if !strings.Contains(strings.ToLower(out), strings.ToLower(want)) {
			t.Errorf("the demo does not print %q", want)
		}
	}
	if again := catena(t, exitDone, "demo", "--dir", dir); again != out {
		t.Error("the demo, run again, prints something else")
	}
	// what it says to type works
	for _, m := range regexp.MustCompile(`(?m)^  catena (.* --at .*)$`).FindAllStringSubmatch(out, -1) {
		catena(t, exitDone, words(m[1])...)
	}
	other := t.TempDir()
	if err := os.WriteFile(filepath.Join(other, "mine.txt"), nil, 0o600); err != nil {
		t.Fatal(err)
	}
	catena(t, exitFailed, "demo", "--dir", other)
}
