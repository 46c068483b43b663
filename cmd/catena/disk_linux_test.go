package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// A disk that is full: said in words, the collection stays whole, and the same
// command goes on once there is room. It needs the right to mount a small disk
// in memory, and is skipped elsewhere.
func TestFullDisk(t *testing.T) {
	disk := t.TempDir()
	if err := syscall.Mount("tmpfs", disk, "tmpfs", 0, "size=3m"); err != nil {
		t.Skipf("no small disk to fill here: %v", err)
	}
	defer syscall.Unmount(disk, syscall.MNT_DETACH)
	input := crashInput(t, 1500)
	dir := filepath.Join(disk, "c")
	out, err := program("load", "--at", dir, input).CombinedOutput()
	if exitCode(err) != exitFailed || !strings.Contains(string(out), "disk is full") && !strings.Contains(string(out), "no space left") {
		t.Fatalf("load onto a full disk: %v\n%s", err, out)
	}
	if err := syscall.Mount("tmpfs", disk, "tmpfs", syscall.MS_REMOUNT, "size=200m"); err != nil {
		t.Skipf("no more room to be had: %v", err)
	}
	out, err = program("check", "--at", dir).CombinedOutput()
	if !strings.Contains(string(out), "occurrences") || bytes.Contains(out, []byte("database:")) || bytes.Contains(out, []byte("not as it was stored")) {
		t.Errorf("check after the disk was full: %v\n%s", err, out)
	}
	if out, err := program("load", "--at", dir, input).CombinedOutput(); exitCode(err) != exitSetAside {
		t.Fatalf("load with room again: %v\n%s", err, out)
	}
	quiet := filepath.Join(t.TempDir(), "quiet")
	if err := program("load", "--at", quiet, input).Run(); exitCode(err) != exitSetAside {
		t.Fatal(err)
	}
	if !bytes.Equal(exported(t, dir), exported(t, quiet)) || found(t, dir) != found(t, quiet) {
		t.Error("the content differs from that of an undisturbed load")
	}
}

// A folder that may not be written to is said so; one that may be read can
// still be asked.
func TestReadOnlyFolder(t *testing.T) {
	// what is run as nobody must stand where nobody may go
	home, err := os.MkdirTemp("/tmp", "catena-test-*")
	if err != nil {
		t.Fatal(err)
	}
	defer os.RemoveAll(home)
	self, err := os.ReadFile(os.Args[0])
	if err != nil {
		t.Fatal(err)
	}
	binary := filepath.Join(home, "catena")
	if err := os.WriteFile(binary, self, 0o755); err != nil {
		t.Fatal(err)
	}
	input, err := os.ReadFile(crashInput(t, 50))
	if err != nil {
		t.Fatal(err)
	}
	file, dir := filepath.Join(home, "reports.ndjson"), filepath.Join(home, "c")
	if err := os.WriteFile(file, input, 0o644); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(home, 0o755); err != nil {
		t.Fatal(err)
	}
	if err := program("load", "--at", dir, file).Run(); exitCode(err) != exitSetAside {
		t.Fatal(err)
	}
	err = filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err == nil && d.IsDir() {
			return os.Chmod(path, 0o555)
		} else if err == nil {
			return os.Chmod(path, 0o444)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	defer filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error { return os.Chmod(path, 0o755) })
	as := func(args ...string) (string, error) {
		cmd := exec.Command(binary, args...)
		cmd.Env = append(os.Environ(), asProgram+"=1", "HOME="+home)
		cmd.Dir = home
		if os.Getuid() == 0 {
			cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}}
		}
		out, err := cmd.CombinedOutput()
		return string(out), err
	}
	out, err := as("load", "--at", dir, file)
	if exitCode(err) != exitFailed || !strings.Contains(out, "permission denied") && !strings.Contains(out, "cannot be written") {
		t.Errorf("load into a folder that may only be read: %v\n%s", err, out)
	}
	for _, args := range [][]string{{"trend", "stall", "--at", dir}, {"case", "K-3", "--at", dir}, {"find", "stalled", "--at", dir}, {"export", "--at", dir}, {"check", "--at", dir}, {"doubles", "--at", dir}} {
		if out, err := as(args...); err != nil {
			t.Errorf("catena %s in a folder that may only be read: %v\n%s", args[0], err, out)
		}
	}
	if out, err := as("load", "--at", filepath.Join(home, "new"), file); exitCode(err) != exitFailed || !strings.Contains(out, "permission denied") {
		t.Errorf("a new collection where none may be made: %v\n%s", err, out)
	}
}
