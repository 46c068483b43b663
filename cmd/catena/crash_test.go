package main

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"
)

// program is a command that runs this test binary as catena, so that it can
// be killed.
func program(args ...string) *exec.Cmd {
	cmd := exec.Command(os.Args[0], args...)
	cmd.Env = append(os.Environ(), asProgram+"=1")
	return cmd
}

// crashInput writes invented reports: enough for a load of about a second.
func crashInput(t *testing.T, rows int) string {
	t.Helper()
	var b strings.Builder
	for n := range rows {
		text := strings.Repeat(fmt.Sprintf("On flight %d the airspeed decayed, the wing stalled and the instructor took over at %d feet. ", n, n%900), 8)
		fmt.Fprintf(&b, `{"id":"K-%d","source":"crash","date":"2023-%02d","narratives":[{"kind":"factual","text":%q}]}`+"\n", n, n%12+1, text)
		if n%500 == 7 {
			fmt.Fprintf(&b, "this line is no record %d\n", n)
		}
	}
	path := filepath.Join(t.TempDir(), "reports.ndjson")
	if err := os.WriteFile(path, []byte(b.String()), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func exported(t *testing.T, dir string) []byte {
	t.Helper()
	var out []byte
	for _, what := range []string{"occurrences", "tags", "chains", "set-aside"} {
		part, err := program("export", "--at", dir, "--what", what).Output()
		if err != nil {
			t.Fatalf("export %s: %v", what, err)
		}
		out = append(out, part...)
	}
	pairs, err := program("doubles", "--at", dir, "--most", "500", "--as", "csv").Output()
	if err != nil {
		t.Fatalf("doubles: %v", err)
	}
	return append(out, pairs...)
}

// found is what the index says; it must hold every occurrence once.
func found(t *testing.T, dir string) string {
	t.Helper()
	out, err := program("find", "--at", dir, "--as", "json", "--most", "1", "stalled").Output()
	if err != nil {
		t.Fatalf("find: %v", err)
	}
	_, total, ok := strings.Cut(strings.TrimSpace(string(out)), `"total":`)
	if !ok {
		t.Fatalf("find printed %q", out)
	}
	return strings.TrimRight(total, "}")
}

// Loads are killed at random instants (kill -9) and run again until one comes
// to its end: the content must be that of an undisturbed run, nothing lost
// and nothing doubled. CATENA_KILLS sets how many runs are killed; see
// DEVELOPERS.md.
func TestKilledLoads(t *testing.T) {
	runs := 4
	if s := os.Getenv("CATENA_KILLS"); s != "" {
		n, err := strconv.Atoi(s)
		if err != nil {
			t.Fatalf("CATENA_KILLS: %v", err)
		}
		runs = n
	}
	input := crashInput(t, 2000)
	quiet := filepath.Join(t.TempDir(), "quiet")
	begun := time.Now()
	if err := program("load", "--at", quiet, input).Run(); err == nil || exitCode(err) != exitSetAside {
		t.Fatalf("undisturbed load: %v", err)
	}
	whole := time.Since(begun)
	want, wantFound := exported(t, quiet), found(t, quiet)
	if !strings.Contains(wantFound, "2000") {
		t.Fatalf("the undisturbed index tells %s, want 2000", wantFound)
	}
	killed := 0
	for run := range runs {
		dir := filepath.Join(t.TempDir(), "killed")
		for try := 0; ; try++ {
			cmd := program("load", "--at", dir, input)
			if err := cmd.Start(); err != nil {
				t.Fatal(err)
			}
			done := make(chan error, 1)
			go func() { done <- cmd.Wait() }()
			instant := time.Duration(rand.Int64N(int64(whole)))
			if try >= 3 {
				instant = time.Minute
			}
			var err error
			select {
			case err = <-done:
			case <-time.After(instant):
				killed++
				cmd.Process.Kill()
				<-done
				continue
			}
			if exitCode(err) != exitSetAside {
				t.Fatalf("run %d: load after a kill: %v", run, err)
			}
			break
		}
		if got := exported(t, dir); !bytes.Equal(got, want) {
			t.Fatalf("run %d: the content differs after a kill (%d bytes, %d undisturbed)", run, len(got), len(want))
		}
		if got := found(t, dir); got != wantFound {
			t.Fatalf("run %d: the index tells %s after a kill, %s undisturbed", run, got, wantFound)
		}
		os.RemoveAll(dir)
	}
	t.Logf("%d runs, %d kills, each came to the same %d bytes", runs, killed, len(want))
}

func exitCode(err error) int {
	if e, ok := err.(*exec.ExitError); ok {
		return e.ExitCode()
	}
	if err != nil {
		return -1
	}
	return 0
}

// Two loads at once: one waits for the other, both are whole.
func TestTwoLoadsAtOnce(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "c")
	a, b := crashInput(t, 600), crashInput(t, 700)
	first, second := program("load", "--at", dir, a), program("load", "--at", dir, b)
	var told bytes.Buffer
	second.Stderr = &told
	if err := first.Start(); err != nil {
		t.Fatal(err)
	}
	if err := second.Start(); err != nil {
		t.Fatal(err)
	}
	for _, cmd := range []*exec.Cmd{first, second} {
		if err := cmd.Wait(); exitCode(err) != exitSetAside {
			t.Errorf("load: %v\n%s", err, told.String())
		}
	}
	if got := found(t, dir); !strings.Contains(got, "700") {
		t.Errorf("after two loads the index tells %s, want 700", got)
	}
}

// A file that is written to while it is read, cut short and then whole again:
// the user is told, and a second load makes good.
func TestFileChangedWhileRead(t *testing.T) {
	input := crashInput(t, 3000)
	whole, err := os.ReadFile(input)
	if err != nil {
		t.Fatal(err)
	}
	dir := filepath.Join(t.TempDir(), "c")
	cmd := program("load", "--at", dir, input)
	var told bytes.Buffer
	cmd.Stderr = &told
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	done := make(chan error, 1)
	go func() { done <- cmd.Wait() }()
	running := true
	for n := 0; running; n++ {
		select {
		case err = <-done:
			running = false
		case <-time.After(3 * time.Millisecond):
			if err := os.WriteFile(input, whole[:len(whole)*(n%7+1)/8], 0o600); err != nil {
				t.Fatal(err)
			}
		}
	}
	if code := exitCode(err); code != exitSetAside && code != exitDone || !strings.Contains(told.String(), "changed while it was read") {
		t.Errorf("load of a changing file: %v\n%s", err, told.String())
	}
	if err := os.WriteFile(input, whole, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := program("load", "--at", dir, input).Run(); exitCode(err) != exitSetAside {
		t.Errorf("load of the file at rest: %v", err)
	}
	if got := found(t, dir); !strings.Contains(got, "3000") {
		t.Errorf("the index tells %s, want 3000", got)
	}
	if out, err := program("check", "--at", dir).CombinedOutput(); err != nil {
		t.Errorf("check: %v\n%s", err, out)
	}
}
