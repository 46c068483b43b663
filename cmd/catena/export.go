package main

import (
	"bufio"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"catena/ingest/collection"
	"catena/ingest/corpus"
	"catena/ingest/store"
)

type exportOptions struct {
	what, out string
	force     bool
}

func newExportCommand(g *globalOptions) *cobra.Command {
	o := &exportOptions{}
	cmd := &cobra.Command{
		Use:   "export",
		Short: "Write occurrences, tags, chains or set-aside rows for other tools",
		Long: `Writes NDJSON, one object a line: occurrences are whole tagged records, which
catena load reads back; tags and chains are one line each with the reference
of their occurrence; set-aside rows come raw with the reason. The same input
and version give the same bytes.`,
		Example: `  catena export --what occurrences --out -
  catena export --what tags --out research-set`,
		Args: args(cobra.NoArgs),
		RunE: func(cmd *cobra.Command, _ []string) error { return runExport(cmd, g, o) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addAs(f, "ndjson", "ndjson")
	f.StringVar(&o.what, "what", "occurrences", "occurrences, tags, chains or set-aside")
	f.StringVar(&o.out, "out", "-", "folder to write to, or - for standard output")
	f.BoolVar(&o.force, "force", false, "overwrite a file that is there")
	return cmd
}

// exporters write one kind each, a line at a time.
var exporters = map[string]func(*cobra.Command, *collection.Collection, io.Writer) error{
	"occurrences": exportOccurrences, "tags": exportTags, "chains": exportChains, "set-aside": exportSetAside,
}

func runExport(cmd *cobra.Command, g *globalOptions, o *exportOptions) error {
	export, ok := exporters[o.what]
	switch {
	case !ok:
		return usage(cmd, "--what: %q is none of occurrences, tags, chains and set-aside", o.what)
	case g.as != "ndjson":
		return usage(cmd, "--as: no form is called %q; there is ndjson", g.as)
	}
	c, err := g.open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	if o.out == "-" {
		w := bufio.NewWriterSize(cmd.OutOrStdout(), 1<<20)
		if err := export(cmd, c, w); err != nil {
			return err
		}
		return w.Flush()
	}
	path := filepath.Join(o.out, o.what+".ndjson")
	if err := writeWhole(path, o.force, func(w io.Writer) error { return export(cmd, c, w) }); err != nil {
		return err
	}
	fmt.Fprintf(cmd.ErrOrStderr(), "wrote %s\n", clean(path))
	return nil
}

// writeWhole writes a file whole or not at all, and overwrites one only with
// force.
func writeWhole(path string, force bool, write func(io.Writer) error) (err error) {
	if exists(path) && !force {
		return hint(fmt.Errorf("%s is there already", path), "--force overwrites it")
	}
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(path), ".catena-*")
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
		}
	}()
	w := bufio.NewWriterSize(f, 1<<20)
	if err = write(w); err != nil {
		return err
	}
	if err = w.Flush(); err != nil {
		return err
	}
	if err = f.Chmod(0o644); err != nil {
		return err
	}
	if err = f.Close(); err != nil {
		return err
	}
	return os.Rename(f.Name(), path)
}

func exportRows(cmd *cobra.Command, c *collection.Collection, w io.Writer, lines func(*store.Row) []any) error {
	bar := newProgress(cmd.ErrOrStderr())
	defer bar.finish()
	n := 0
	for r, err := range c.Store.Each(cmd.Context(), store.Select{}) {
		if err != nil {
			return err
		}
		for _, v := range lines(r) {
			line, err := jsonLine(v)
			if err != nil {
				return err
			}
			if _, err := w.Write(line); err != nil {
				return err
			}
		}
		if n++; n%1000 == 0 {
			bar.show("writing", int64(n), 0)
		}
	}
	return nil
}

func exportOccurrences(cmd *cobra.Command, c *collection.Collection, w io.Writer) error {
	return exportRows(cmd, c, w, func(r *store.Row) []any { return []any{&r.Tagged} })
}

// tagLine is a tag with the reference of its occurrence and of the row that
// it was read from.
type tagLine struct {
	ID     string `json:"id"`
	Source string `json:"source"`
	corpus.Tag
	Rulebook string `json:"rulebook"`
	File     string `json:"file"`
	Row      int    `json:"row"`
	Line     int    `json:"line"`
}

func exportTags(cmd *cobra.Command, c *collection.Collection, w io.Writer) error {
	return exportRows(cmd, c, w, func(r *store.Row) []any {
		var out []any
		for _, t := range r.Tags {
			out = append(out, tagLine{r.ID, r.Occurrence.Source, t, r.Rulebook, r.File, r.Row, r.Line})
		}
		return out
	})
}

type chainLine struct {
	ID     string `json:"id"`
	Source string `json:"source"`
	Path   string `json:"path"`
	corpus.Chain
	Rulebook string `json:"rulebook"`
}

func exportChains(cmd *cobra.Command, c *collection.Collection, w io.Writer) error {
	return exportRows(cmd, c, w, func(r *store.Row) []any {
		if len(r.Chain.Links) == 0 {
			return nil
		}
		factors := []string{}
		for _, l := range r.Chain.Links {
			factors = append(factors, l.Factor)
		}
		return []any{chainLine{r.ID, r.Occurrence.Source, strings.Join(factors, " > "), r.Chain, r.Rulebook}}
	})
}

// asideLine is a set-aside row. Raw is text where it is valid UTF-8, and
// base64 otherwise, so that nothing is lost.
type asideLine struct {
	File   string `json:"file"`
	Row    int    `json:"row"`
	Line   int    `json:"line"`
	Reason string `json:"reason"`
	Bytes  int64  `json:"bytes"`
	Raw    string `json:"raw,omitempty"`
	Base64 []byte `json:"raw_base64,omitempty"`
	Cut    bool   `json:"cut,omitempty"`
}

// maxAsideRaw bounds what of one row is exported; the collection holds it all.
const maxAsideRaw = 16 << 20

func exportSetAside(cmd *cobra.Command, c *collection.Collection, w io.Writer) error {
	for a, err := range c.Store.EachSetAside(cmd.Context(), 0, maxAsideRaw) {
		if err != nil {
			return err
		}
		l := asideLine{File: a.File, Row: a.Row, Line: a.Line, Reason: a.Reason, Bytes: a.Size, Cut: a.Size > int64(len(a.Raw))}
		if text := string(a.Raw); strings.ToValidUTF8(text, "") == text {
			l.Raw = text
		} else {
			l.Base64 = slices.Clone(a.Raw)
		}
		line, err := jsonLine(l)
		if err != nil {
			return err
		}
		if _, err := w.Write(line); err != nil {
			return err
		}
	}
	return nil
}
