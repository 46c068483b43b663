package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"catena/ingest"
	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/queries/table"
)

type loadOptions struct {
	source, dates string
	dryRun        bool
}

func newLoadCommand(g *globalOptions) *cobra.Command {
	o := &loadOptions{}
	cmd := &cobra.Command{
		Use:   "load PATH...",
		Short: "Read files of reports into the collection: store, tag and index them",
		Long: `Reads files (CSV, TSV, JSON, NDJSON, each also gzipped), or standard input for
"-". Columns become fields by the trade's usual header words; what fits no
field is kept as extra. A row that cannot become an occurrence is set aside
with the reason, never dropped. Reading the same file again changes nothing.

The summary counts, per file: rows read, and of these stored, unchanged,
revised (a known reference with new content) and set aside; then the
occurrences with a usable narrative and with a date.`,
		Example: `  catena load reports-2024.csv
  catena load --dry-run reports-2024.csv        see how its columns would be read
  zcat reports.ndjson.gz | catena load --source our-base -`,
		Args: args(cobra.MinimumNArgs(1)),
		RunE: func(cmd *cobra.Command, paths []string) error { return runLoad(cmd, g, o, paths) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addWait(f)
	g.addAs(f, "text", "text or json")
	f.StringVar(&o.source, "source", "", "name the source of these occurrences")
	f.StringVar(&o.dates, "dates", "", "order of dates of three numbers: dmy, mdy or ymd")
	f.BoolVar(&o.dryRun, "dry-run", false, "show how columns would be read and three records; write nothing")
	return cmd
}

func runLoad(cmd *cobra.Command, g *globalOptions, o *loadOptions, paths []string) error {
	if g.as != "text" && g.as != "json" {
		return usage(cmd, "--as: no form is called %q; there are text and json", g.as)
	}
	if o.dates != "" && !slices.Contains([]string{"dmy", "mdy", "ymd"}, o.dates) {
		return usage(cmd, "--dates: %q is none of dmy, mdy and ymd", o.dates)
	}
	if o.dryRun {
		return dryRun(cmd, o, paths)
	}
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer c.Close()
	errOut := cmd.ErrOrStderr()
	bar := newProgress(errOut)
	defer bar.finish()
	var sums []collection.FileSummary
	failed := 0
	for _, path := range paths {
		begun := time.Now()
		shown := 0
		sum, err := c.Load(cmd.Context(), path, collection.LoadOptions{
			Source: o.source, Dates: o.dates, Stdin: cmd.InOrStdin(),
			Progress: func(path string, rows int, read, size int64) {
				bar.show(filepath.Base(path), read, size)
				bar.describe(fmt.Sprintf("%s: %d rows, %.0f a second", filepath.Base(path), rows, float64(rows)/time.Since(begun).Seconds()))
			},
			Aside: func(a *corpus.SetAside) {
				if shown++; shown > maxAsideLines {
					return
				}
				bar.finish()
				fmt.Fprintf(errOut, "set aside: %s:%d: %s\n", clean(a.File), a.Line, clean(a.Reason))
			},
		})
		bar.finish()
		if shown > maxAsideLines {
			fmt.Fprintf(errOut, "set aside: %d more rows of %s (catena export --what set-aside shows all)\n", shown-maxAsideLines, clean(path))
		}
		sums = append(sums, sum)
		switch {
		case err != nil && cmd.Context().Err() != nil:
			printLoad(cmd, g, sums)
			return cmd.Context().Err()
		case err != nil:
			// the other files are read all the same
			fmt.Fprintf(errOut, "error: %v\n", err)
			failed++
		default:
			tellSource(cmd, o, sum)
		}
	}
	if err := printLoad(cmd, g, sums); err != nil {
		return err
	}
	if failed > 0 {
		return hint(fmt.Errorf("%d of %d files could not be read", failed, len(paths)), "the messages above say why; the other files are loaded")
	}
	return asideError(sums)
}

// maxAsideLines is how many set-aside rows of a file are told one by one.
const maxAsideLines = 10

// tellSource says how a file's source was named when the file does not say.
func tellSource(cmd *cobra.Command, o *loadOptions, sum collection.FileSummary) {
	if o.source == "" && slices.Contains(sum.Sources, sum.Map.Name) {
		noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s names no source; its occurrences stand under %q (name them with --source)", clean(sum.Path), sum.Map.Name))
	}
	if sum.Charset != "UTF-8" && sum.Rows > 0 {
		noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s is read as %s", clean(sum.Path), sum.Charset))
	}
	if sum.Rows > 0 && sum.Narratives == 0 {
		noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s has no narrative in any row; its occurrences are counted, but nothing can be found in them", clean(sum.Path)))
	}
}

func asideError(sums []collection.FileSummary) error {
	for _, s := range sums {
		if s.SetAside > 0 {
			return errSetAside
		}
	}
	return nil
}

func printLoad(cmd *cobra.Command, g *globalOptions, sums []collection.FileSummary) error {
	out := cmd.OutOrStdout()
	if g.as == "json" {
		e := json.NewEncoder(out)
		e.SetEscapeHTML(false)
		if sums == nil {
			sums = []collection.FileSummary{}
		}
		return e.Encode(map[string]any{"files": sums})
	}
	t := &table.Table{Title: "loaded", Columns: []table.Column{{Name: "file"}}}
	for _, name := range []string{"rows", "stored", "unchanged", "revised", "set_aside", "narratives", "dated"} {
		t.Columns = append(t.Columns, table.Column{Name: name, Unit: "count"})
	}
	nothing := true
	for _, s := range sums {
		t.Rows = append(t.Rows, []table.Cell{s.Path, s.Rows, s.Stored, s.Unchanged, s.Revised, s.SetAside, s.Narratives, s.Dated})
		nothing = nothing && s.Stored+s.Revised == 0 && s.Rows > 0
	}
	if nothing && len(sums) > 0 {
		t.Notes = append(t.Notes, "nothing has changed: all of this was loaded before")
	}
	return writeTable(cmd, t, "text")
}

// dryRun shows the map of each file and three of its records.
func dryRun(cmd *cobra.Command, o *loadOptions, paths []string) error {
	out := cmd.OutOrStdout()
	for _, path := range paths {
		f, err := ingest.Open(cmd.Context(), path, cmd.InOrStdin(), ingest.Options{Source: o.source, Dates: o.dates, SpoolDir: os.TempDir()})
		if err != nil {
			return err
		}
		err = showMap(cmd, f, path)
		if err == nil {
			fmt.Fprintf(out, "\nThe first records:\n")
			err = showRecords(cmd, f)
		}
		if err = errors.Join(err, f.Close()); err != nil {
			return err
		}
	}
	return nil
}

func showMap(cmd *cobra.Command, f *ingest.File, path string) error {
	m := f.Map()
	t := &table.Table{Title: fmt.Sprintf("%s, read by the map %q", path, m.Name), Columns: []table.Column{{Name: "column"}, {Name: "field"}, {Name: "note"}}}
	for _, c := range m.Columns {
		t.Rows = append(t.Rows, []table.Cell{c.Column, c.Field, c.Note})
	}
	return writeTable(cmd, t, "text")
}

func showRecords(cmd *cobra.Command, f *ingest.File) error {
	out := cmd.OutOrStdout()
	for n := 0; n < 3; {
		item, err := f.Next()
		if err != nil {
			return ignoreEnd(err)
		}
		if a := item.SetAside; a != nil {
			if a.Spool != "" {
				os.Remove(a.Spool)
			}
			fmt.Fprintf(out, "set aside: line %d: %s\n", a.Line, clean(a.Reason))
			continue
		}
		line, err := ingest.AppendRecord(nil, item.Occurrence)
		if err != nil {
			return err
		}
		fmt.Fprintln(out, clean(strings.TrimSpace(string(line))))
		n++
	}
	return nil
}

// exists tells whether a path is there.
func exists(path string) bool {
	_, err := os.Lstat(path)
	return !errors.Is(err, fs.ErrNotExist)
}
