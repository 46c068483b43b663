package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
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
	source, dates     string
	delimiter         string
	mapPath, writeMap string
	dryRun, retry     bool

	file *ingest.MapFile // read from mapPath
}

func newLoadCommand(g *globalOptions) *cobra.Command {
	o := &loadOptions{}
	cmd := &cobra.Command{
		Use:   "load PATH...",
		Short: "Read files of reports into the collection: store, tag and index them",
		Long: `Reads files (CSV, TSV, JSON, NDJSON, XML, XLSX, each also gzipped), ZIP archives
and folders of them, or standard input for "-". Columns become
fields by the trade's usual header words; what fits no field is kept as extra. A row that cannot become an occurrence is set aside
with the reason, never dropped. Reading the same file again changes nothing.

Where columns are taken for the wrong fields, write the map (--write-map),
correct it, and load with --map; it is remembered for files of the same
columns.

The summary counts, per file: rows read, and of these stored, unchanged,
revised (a known reference with new content) and set aside; then the
occurrences with a usable narrative and with a date.`,
		Example: `  catena load reports-2024.csv
  catena load --dry-run reports-2024.csv        see how its columns would be read
  catena load --dry-run --write-map our.toml reports-2024.csv
  catena load --map our.toml reports-2024.csv
  zcat reports.ndjson.gz | catena load --source our-base -`,
		Args: args(func(cmd *cobra.Command, paths []string) error {
			if o.retry {
				return cobra.NoArgs(cmd, paths)
			}
			return cobra.MinimumNArgs(1)(cmd, paths)
		}),
		RunE: func(cmd *cobra.Command, paths []string) error { return runLoad(cmd, g, o, paths) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addWait(f)
	g.addAs(f, "text", "text or json")
	f.StringVar(&o.source, "source", "", "name the source of these occurrences")
	f.StringVar(&o.dates, "dates", "", "order of dates of three numbers: dmy, mdy or ymd")
	f.StringVar(&o.delimiter, "delimiter", "", "what stands between the cells of a table: comma, tab, semicolon or pipe (default: seen from the header)")
	f.StringVar(&o.mapPath, "map", "", "file that says which field each column is; \"-\" forgets the remembered one")
	f.StringVar(&o.writeMap, "write-map", "", "write how the columns are read to a file, to correct and use with --map")
	f.BoolVar(&o.retry, "retry", false, "read the rows that were set aside again, with what --map, --dates or --source say now")
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
	if o.delimiter != "" && !slices.Contains(ingest.Delimiters, o.delimiter) {
		return usage(cmd, "--delimiter: %q is none of %s", o.delimiter, strings.Join(ingest.Delimiters, ", "))
	}
	if err := o.readMap(); err != nil {
		return err
	}
	if o.dryRun || o.writeMap != "" {
		if err := dryRun(cmd, g, o, paths); err != nil || o.dryRun {
			return err
		}
	}
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer c.Close()
	if o.retry {
		return retryAside(cmd, g, o, c)
	}
	l := &loader{cmd: cmd, o: o, c: c, bar: newProgress(cmd.ErrOrStderr())}
	defer l.bar.finish()
	for _, path := range paths {
		if err := l.path(path); err != nil {
			printLoad(cmd, g, l.sums)
			return err
		}
	}
	if err := printLoad(cmd, g, l.sums); err != nil {
		return err
	}
	if err := findDoubles(cmd, c); err != nil {
		return err
	}
	if o.source == "" {
		tellSources(cmd, l.sums)
	}
	if l.failed > 0 {
		return hint(fmt.Errorf("%d of %d files could not be read", l.failed, len(l.sums)), "the messages above say why; the other files are loaded")
	}
	return asideError(l.sums)
}

// retryAside reads the set-aside rows again.
func retryAside(cmd *cobra.Command, g *globalOptions, o *loadOptions, c *collection.Collection) error {
	shown := 0
	sums, err := c.Retry(cmd.Context(), collection.LoadOptions{
		Source: o.source, Dates: o.dates, Map: o.file,
		Aside: func(a *corpus.SetAside) {
			if shown++; shown <= maxAsideLines {
				fmt.Fprintf(cmd.ErrOrStderr(), "still set aside: %s:%d: %s\n", clean(a.File), a.Line, clean(a.Reason))
			}
		},
	})
	if err != nil {
		return err
	}
	if shown > maxAsideLines {
		fmt.Fprintf(cmd.ErrOrStderr(), "still set aside: %d more rows (catena export --what set-aside shows all)\n", shown-maxAsideLines)
	}
	if len(sums) == 0 {
		noteTo(cmd.ErrOrStderr())("no row is set aside")
	}
	for _, s := range sums {
		if s.Charset != "UTF-8" {
			noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s: some rows are read as %s", clean(s.Path), s.Charset))
		}
	}
	if err := printLoad(cmd, g, sums); err != nil {
		return err
	}
	if err := findDoubles(cmd, c); err != nil {
		return err
	}
	return asideError(sums)
}

// readMap reads the file of --map.
func (o *loadOptions) readMap() error {
	if o.mapPath == "" || o.mapPath == "-" {
		return nil
	}
	info, err := os.Stat(o.mapPath)
	if err != nil {
		return fmt.Errorf("read the map: %w", err)
	}
	if info.Size() > maxMapBytes {
		return fmt.Errorf("read the map: %s has %d bytes, more than the limit of %d", o.mapPath, info.Size(), maxMapBytes)
	}
	text, err := os.ReadFile(o.mapPath)
	if err != nil {
		return fmt.Errorf("read the map: %w", err)
	}
	o.file, err = ingest.ParseMap(o.mapPath, text)
	return err
}

// maxMapBytes is more than any map of ten thousand columns has.
const maxMapBytes = 4 << 20

// loader loads paths one after another. A file that cannot be read does not
// keep the others from being loaded.
type loader struct {
	cmd    *cobra.Command
	o      *loadOptions
	c      *collection.Collection
	bar    *progress
	sums   []collection.FileSummary
	failed int
}

// path loads what a path stands for. An error ends the command.
func (l *loader) path(path string) error {
	inputs, err := ingest.FindInputs(l.cmd.Context(), path, l.cmd.InOrStdin(), os.TempDir())
	if err != nil {
		return l.fail(collection.FileSummary{Path: path}, err)
	}
	defer inputs.Close()
	passed := 0
	for _, in := range inputs.List {
		sum, err := l.input(in)
		switch {
		case l.cmd.Context().Err() != nil:
			l.sums = append(l.sums, sum)
			return l.cmd.Context().Err()
		case in.Found && errors.Is(err, ingest.ErrNoReports):
			passed++
			noteTo(l.cmd.ErrOrStderr())(fmt.Sprintf("passed over: %s", clean(strings.TrimPrefix(err.Error(), "open "))))
		case err != nil:
			if err := l.fail(sum, err); err != nil {
				return err
			}
		default:
			l.sums = append(l.sums, sum)
			tellFile(l.cmd, sum)
			if sum.Map.Told && l.o.file == nil {
				noteTo(l.cmd.ErrOrStderr())(fmt.Sprintf("%s is read by the map that was given for files of these columns before (--map - forgets it)", clean(sum.Path)))
			}
		}
	}
	if passed == len(inputs.List) {
		return l.fail(collection.FileSummary{Path: path}, fmt.Errorf("open %q: no file of reports in it", path))
	}
	return nil
}

// fail tells an error and counts the file.
func (l *loader) fail(sum collection.FileSummary, err error) error {
	if ctx := l.cmd.Context().Err(); ctx != nil {
		return ctx
	}
	fmt.Fprintf(l.cmd.ErrOrStderr(), "error: %s\n", clean(err.Error()))
	l.sums = append(l.sums, sum)
	l.failed++
	return nil
}

func (l *loader) input(in ingest.Input) (collection.FileSummary, error) {
	errOut := l.cmd.ErrOrStderr()
	begun := time.Now()
	shown := 0
	stream, err := in.Reader()
	if err != nil {
		return collection.FileSummary{Path: in.Path}, fmt.Errorf("open %q: %w", in.Path, err)
	}
	opts := collection.LoadOptions{
		Delimiter: l.o.delimiter,
		Source:    l.o.source, Dates: l.o.dates, Size: in.Size, Map: l.o.file, Forget: l.o.mapPath == "-",
		Progress: func(path string, rows int, read, size int64) {
			l.bar.show(filepath.Base(path), read, size)
			l.bar.describe(fmt.Sprintf("%s: %d rows, %.0f a second", filepath.Base(path), rows, float64(rows)/time.Since(begun).Seconds()))
		},
		Aside: func(a *corpus.SetAside) {
			if shown++; shown > maxAsideLines {
				return
			}
			l.bar.finish()
			fmt.Fprintf(errOut, "set aside: %s:%d: %s\n", clean(a.File), a.Line, clean(a.Reason))
		},
	}
	if stream != nil {
		defer stream.Close()
		opts.In = stream
	}
	sum, err := l.c.Load(l.cmd.Context(), in.Path, opts)
	l.bar.finish()
	if shown > maxAsideLines {
		fmt.Fprintf(errOut, "set aside: %d more rows of %s (catena export --what set-aside shows all)\n", shown-maxAsideLines, clean(in.Path))
	}
	return sum, err
}

// maxAsideLines is how many set-aside rows of a file are told one by one.
const maxAsideLines = 10

// tellFile says what a person should know of how a file was read.
func tellFile(cmd *cobra.Command, sum collection.FileSummary) {
	note := func(format string, args ...any) {
		noteTo(cmd.ErrOrStderr())(clean(sum.Path) + " " + fmt.Sprintf(format, args...))
	}
	if sum.Changed {
		note("changed while it was read: load it once more when nothing writes to it")
	}
	if sum.Charset != "UTF-8" && sum.Rows > 0 {
		note("is read as %s", sum.Charset)
	}
	if len(sum.Unread) > 0 {
		note("has other sheets that are not read: %s", clean(strings.Join(sum.Unread, ", ")))
	}
	if n := len(sum.Unknown); n > 0 {
		var words []string
		for _, w := range sum.Unknown[:min(n, 4)] {
			words = append(words, fmt.Sprintf("%q (%d)", clean(w.Word), w.Count))
		}
		if n > 4 {
			words = append(words, fmt.Sprintf("%d more", n-4))
		}
		note("has phases of flight without a standard code, kept as they are: %s", strings.Join(words, ", "))
	}
	if sum.Rows > 0 && sum.Narratives == 0 {
		note("has no narrative in any row; its occurrences are counted, but nothing can be found in them")
	}
}

// tellSources says, once for each, how sources were named that the files do
// not name.
func tellSources(cmd *cobra.Command, sums []collection.FileSummary) {
	var names []string
	files := map[string][]string{}
	for _, sum := range sums {
		if sum.Map == nil || sum.Map.Told || !slices.Contains(sum.Sources, sum.Map.Name) {
			continue
		}
		if name := sum.Map.Name; files[name] == nil {
			names = append(names, name)
		}
		files[sum.Map.Name] = append(files[sum.Map.Name], clean(filepath.Base(sum.Path)))
	}
	for _, name := range names {
		many, verb, their := files[name], "names", "its"
		if len(many) > 1 {
			verb, their = "name", "their"
		}
		shown := strings.Join(many[:min(3, len(many))], ", ")
		if len(many) > 3 {
			shown += fmt.Sprintf(" and %d more", len(many)-3)
		}
		noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s %s no source; %s occurrences stand under %q (name them with --source)", shown, verb, their, name))
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
	folder := sharedFolder(sums)
	title := "loaded"
	if folder != "" {
		title = "loaded from " + folder
	}
	t := &table.Table{Title: title, Columns: []table.Column{{Name: "file"}}}
	for _, name := range []string{"rows", "stored", "unchanged", "revised", "set_aside", "narratives", "dated"} {
		t.Columns = append(t.Columns, table.Column{Name: name, Unit: "count"})
	}
	nothing := true
	for _, s := range sums {
		t.Rows = append(t.Rows, []table.Cell{strings.TrimPrefix(s.Path, folder), s.Rows, s.Stored, s.Unchanged, s.Revised, s.SetAside, s.Narratives, s.Dated})
		nothing = nothing && s.Stored+s.Revised == 0 && s.Rows > 0
	}
	barred := 0
	for _, s := range sums {
		barred += s.Barred
	}
	if barred > 0 {
		t.Notes = append(t.Notes, fmt.Sprintf("%d of the unchanged rows hold references that were removed here, and stay out (catena remove --list)", barred))
	}
	if nothing && len(sums) > 0 {
		t.Notes = append(t.Notes, "nothing has changed: all of this was loaded before")
	}
	return writeTable(cmd, t, "text")
}

// sharedFolder is the folder, with its slash, that all files stand in, or "".
func sharedFolder(sums []collection.FileSummary) string {
	if len(sums) == 0 {
		return ""
	}
	folder := sums[0].Path
	for _, s := range sums {
		for !strings.HasPrefix(s.Path, folder) {
			folder = folder[:len(folder)-1]
		}
	}
	return folder[:strings.LastIndexAny(folder, `/\`)+1]
}

// dryRun shows the map of each file and three of its records, or only writes
// the map.
func dryRun(cmd *cobra.Command, g *globalOptions, o *loadOptions, paths []string) error {
	opts := ingest.Options{Source: o.source, Dates: o.dates, Delimiter: o.delimiter, SpoolDir: os.TempDir(), Map: o.file}
	if exists(g.at) && o.mapPath == "" {
		c, err := g.open(cmd)
		if err != nil {
			return err
		}
		defer c.Close()
		opts.Recall = c.Recall(cmd.Context())
	}
	maps := 0
	for _, path := range paths {
		inputs, err := ingest.FindInputs(cmd.Context(), path, cmd.InOrStdin(), os.TempDir())
		if err != nil {
			return err
		}
		if o.writeMap != "" && !o.dryRun && path == "-" {
			return hint(fmt.Errorf("--write-map: standard input cannot be read twice"), "add --dry-run, then load with --map")
		}
		for _, in := range inputs.List {
			if err = dryRunInput(cmd, o, in, opts, &maps); in.Found && errors.Is(err, ingest.ErrNoReports) {
				noteTo(cmd.ErrOrStderr())(fmt.Sprintf("passed over: %s", clean(strings.TrimPrefix(err.Error(), "open "))))
				err = nil
			}
			if err != nil {
				break
			}
		}
		if err = errors.Join(err, inputs.Close()); err != nil {
			return err
		}
	}
	return nil
}

func dryRunInput(cmd *cobra.Command, o *loadOptions, in ingest.Input, opts ingest.Options, maps *int) error {
	opts.Size = in.Size
	stream, err := in.Reader()
	if err != nil {
		return err
	}
	var from io.Reader
	if stream != nil {
		defer stream.Close()
		from = stream
	}
	f, err := ingest.Open(cmd.Context(), in.Path, from, opts)
	if err != nil {
		return err
	}
	defer f.Close()
	if o.writeMap != "" {
		if *maps++; *maps > 1 {
			return hint(fmt.Errorf("--write-map: one map for one kind of file, and there are several files"), "name one of them")
		}
		if err := writeMap(cmd, f, o.writeMap); err != nil {
			return err
		}
	}
	if !o.dryRun {
		return nil
	}
	if err := showMap(cmd, f, in.Path); err != nil {
		return err
	}
	fmt.Fprintf(cmd.OutOrStdout(), "\nThe first records:\n")
	return showRecords(cmd, f)
}

// writeMap writes the map whole or not at all, and never over another file.
func writeMap(cmd *cobra.Command, f *ingest.File, path string) error {
	out, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if errors.Is(err, fs.ErrExist) {
		return hint(fmt.Errorf("--write-map: %s is there already", path), "name another file, or remove it")
	}
	if err != nil {
		return fmt.Errorf("--write-map: %w", err)
	}
	_, err = out.Write(f.TOML())
	if err = errors.Join(err, out.Close()); err != nil {
		os.Remove(path)
		return fmt.Errorf("--write-map: %w", err)
	}
	noteTo(cmd.ErrOrStderr())(fmt.Sprintf("the map is in %s: correct it and load with --map %[1]s", clean(path)))
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
