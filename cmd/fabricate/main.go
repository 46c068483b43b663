// Command fabricate invents occurrence records of any number, with the truth
// that was planted in each narrative and the flying that they come from. See
// the package ingest/fabricate for what is planted and how.
//
// The demo corpus inside catena is made by it, byte for byte. The seed was
// chosen so that the trend planted at Sellow can be seen in so few reports:
//
//go:generate go run . --force --count 420 --seed 52 --from 2019-01 --to 2025-12 --ids scenario --doubles 0.03 --out ../catena/demo/made.ndjson --truth ../catena/demo/made.truth.ndjson --exposure ../catena/demo/exposure.csv
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"
)

// Exit codes, as the help tells them.
const (
	exitDone   = 0
	exitFailed = 1
	exitUsage  = 2
)

func main() {
	// The second Ctrl-C ends the program at once.
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop)
	os.Exit(run(ctx, os.Args[1:], os.Stdout, os.Stderr))
}

// run is the whole program: results to out, all else to errOut.
func run(ctx context.Context, args []string, out, errOut io.Writer) int {
	cmd := newCommand()
	cmd.SetArgs(args)
	cmd.SetOut(out)
	cmd.SetErr(errOut)
	err := cmd.ExecuteContext(ctx)
	if err == nil {
		return exitDone
	}
	if errors.Is(err, context.Canceled) {
		err = errors.New("stopped; no file was changed")
	}
	fmt.Fprintf(errOut, "error: %v\n", err)
	var u *usageError
	if errors.As(err, &u) {
		fmt.Fprintln(errOut, "hint: fabricate --help")
		return exitUsage
	}
	if errors.Is(err, os.ErrExist) {
		fmt.Fprintln(errOut, "hint: --force replaces what is there")
	}
	return exitFailed
}

// usageError is a command line that is not understood.
type usageError struct{ err error }

func (u *usageError) Error() string { return u.err.Error() }
func (u *usageError) Unwrap() error { return u.err }
