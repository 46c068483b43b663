package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"catena/ingest/corpus"
	"catena/ingest/fabricate"
)

// options are the command line.
type options struct {
	count    int
	seed     uint64
	bytes    int
	from, to string
	doubles  float64
	edited   float64
	ids      string
	level    bool
	out      string
	truth    string
	exposure string
	force    bool
}

func newCommand() *cobra.Command {
	o := &options{}
	cmd := &cobra.Command{
		Use:   "fabricate",
		Short: "Invent occurrence records, with the truth that was planted in them",
		Long: `Invents occurrence records (NDJSON): a flying school and a charter operator with
three bases, their two occurrence files and a file of voluntary reports. People,
places, operators and aircraft in them belong to nobody.

--truth writes, record by record in the same order, what was planted: factor,
assertion, bytes, side, and the order in time. --exposure writes the hours and
departures of each base and month that the occurrences come from.

The same flags make the same bytes. From 2023 on, omitted checks grow more
frequent at Sellow, so that there is a trend to be found; --level plants none.
Files appear whole or not at all.

Exit codes: 0 done, 1 failed, 2 wrong usage.`,
		Example: `  # a corpus for trying things out, its truth, and its hours
  fabricate --count 500 --out reports.ndjson --truth truth.ndjson --exposure hours.csv

  # 50,000 narratives of the length that measurements use
  fabricate --count 50000 --bytes 1685 --seed 7 --out big.ndjson

  # straight into catena
  fabricate --count 1000 --from 2021 --to 2023-06 | catena tag --stream`,
		SilenceUsage:  true,
		SilenceErrors: true,
		Args: func(cmd *cobra.Command, args []string) error {
			if err := cobra.NoArgs(cmd, args); err != nil {
				return &usageError{err}
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, _ []string) error {
			return runFabricate(cmd.Context(), o, cmd.OutOrStdout(), cmd.ErrOrStderr())
		},
	}
	cmd.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return &usageError{err} })
	o.addFlags(cmd)
	return cmd
}

func (o *options) addFlags(cmd *cobra.Command) {
	f := cmd.Flags()
	f.SortFlags = false
	f.IntVar(&o.count, "count", 1000, "occurrences to make")
	f.Uint64Var(&o.seed, "seed", 1, "where the dice begin")
	f.IntVar(&o.bytes, "bytes", 0, "mean bytes of narrative of an occurrence; 0 leaves each kind of report its natural length")
	f.StringVar(&o.from, "from", "2019-01", "first date: 2019, 2019-01 or 2019-01-31")
	f.StringVar(&o.to, "to", "2025-12", "last date, the same forms")
	f.Float64Var(&o.doubles, "doubles", 0, "share of occurrences that tell an earlier one again, 0 to 0.5")
	f.Float64Var(&o.edited, "edited", 0, "share of these that copy its text with edited wording, 0 to 1; the others use their own words")
	f.StringVar(&o.ids, "ids", string(fabricate.RunningIDs), "ids: running (F-000001) or scenario (T20-201)")
	f.BoolVar(&o.level, "level", false, "plant no trend")
	f.StringVar(&o.out, "out", "-", "file for the records, - for standard output")
	f.StringVar(&o.truth, "truth", "", "file for what was planted, - for standard output")
	f.StringVar(&o.exposure, "exposure", "", "file for hours and departures (CSV), - for standard output")
	f.BoolVar(&o.force, "force", false, "replace files that exist")
}

// read turns the flags into options of the package.
func (o *options) read() (fabricate.Options, error) {
	made := fabricate.Options{Seed: o.seed, Count: o.count, MeanBytes: o.bytes, Doubles: o.doubles, Edited: o.edited, IDs: fabricate.IDs(o.ids)}
	var err error
	if made.From, err = corpus.ParseDate(o.from); err != nil {
		return made, &usageError{fmt.Errorf("--from: %w", err)}
	}
	if made.To, err = corpus.ParseDate(o.to); err != nil {
		return made, &usageError{fmt.Errorf("--to: %w", err)}
	}
	if o.level {
		made.Shifts = []fabricate.Shift{}
	}
	if o.count < 1 {
		return made, &usageError{fmt.Errorf("--count %d: want 1 or more", o.count)}
	}
	if err := made.Check(); err != nil {
		return made, &usageError{err}
	}
	return made, nil
}

func runFabricate(ctx context.Context, o *options, out, errOut io.Writer) (err error) {
	made, err := o.read()
	if err != nil {
		return err
	}
	files, err := openOutputs(out, o.force, o.out, o.truth, o.exposure)
	if err != nil {
		return err
	}
	defer files.discard()
	if err := writeAll(ctx, made, files, newProgress(errOut, o.count)); err != nil {
		return err
	}
	return files.keep()
}

// writeAll makes the corpus into the outputs: records, truth, exposure.
func writeAll(ctx context.Context, made fabricate.Options, files outputs, p *progress) error {
	defer p.finish()
	records, truths := encoder(files[0]), encoder(files[1])
	n := 0
	for occurrence, truth := range fabricate.New(made).All() {
		if n%256 == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		if err := errors.Join(records.Encode(occurrence), truths.Encode(truth)); err != nil {
			return fmt.Errorf("write occurrence %s: %w", occurrence.ID, err)
		}
		n++
		p.show(n)
	}
	if files[2] == nil {
		return nil
	}
	return fabricate.WriteExposure(files[2], made.Exposure())
}

func encoder(o *output) *json.Encoder {
	var w io.Writer = io.Discard
	if o != nil {
		w = o
	}
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	return e
}

// progress counts on a terminal; elsewhere it is silent.
type progress struct {
	w     io.Writer
	total int
	last  time.Time
	shown bool
}

func newProgress(w io.Writer, total int) *progress {
	f, ok := w.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		w = nil
	}
	return &progress{w: w, total: total, last: time.Now()}
}

func (p *progress) show(n int) {
	if p.w == nil || n%1000 != 0 || time.Since(p.last) < 200*time.Millisecond {
		return
	}
	p.last, p.shown = time.Now(), true
	fmt.Fprintf(p.w, "\rmade %d of %d", n, p.total)
}

func (p *progress) finish() {
	if p.shown {
		fmt.Fprint(p.w, "\r\x1b[K")
	}
}
