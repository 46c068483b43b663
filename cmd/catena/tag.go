package main

import (
	"bufio"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"runtime"
	"sync"
	"time"

	"github.com/spf13/cobra"

	"catena/classify"
	"catena/ingest"
	"catena/ingest/collection"
	"catena/ingest/corpus"
)

type tagOptions struct {
	again, stream bool
	rules         string
}

func newTagCommand(g *globalOptions) *cobra.Command {
	o := &tagOptions{}
	cmd := &cobra.Command{
		Use:   "tag",
		Short: "Tag what is not yet tagged by this rule book, or all again",
		Long: `Tags the occurrences of the collection whose tags another rule book made, as
far as what has changed in it touches them; the new tags become visible in one
step. With --stream it needs no collection: it
reads occurrence records (NDJSON) on standard input and writes them tagged to
standard output, in order.

A tag names a factor, the words that show it, and how they speak of it:
affirmed, denied, possible, advised, or elsewhere (another flight).`,
		Example: `  catena tag --rules our-rules
  zcat reports.ndjson.gz | catena tag --stream > tagged.ndjson`,
		Args: args(cobra.NoArgs),
		RunE: func(cmd *cobra.Command, _ []string) error {
			if o.stream {
				return runTagStream(cmd, o)
			}
			return runTag(cmd, g, o)
		},
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addWait(f)
	f.BoolVar(&o.again, "again", false, "tag everything again")
	f.BoolVar(&o.stream, "stream", false, "standard input to standard output, without a collection")
	f.StringVar(&o.rules, "rules", "", "folder of your own rules, over the built-in book; remembered (- for none)")
	return cmd
}

func runTag(cmd *cobra.Command, g *globalOptions, o *tagOptions) error {
	if _, err := os.Stat(g.at); err != nil {
		return hint(fmt.Errorf("open collection %q: %w", g.at, err), "load something first: catena load FILE; or name the folder with --at")
	}
	c, err := g.openToWrite(cmd, o.rules)
	if err != nil {
		return err
	}
	defer c.Close()
	totals, err := c.Store.Totals(cmd.Context())
	if err != nil {
		return err
	}
	bar := newProgress(cmd.ErrOrStderr())
	n, err := c.Retag(cmd.Context(), o.again, func(n int) { bar.show("tagging", int64(n), int64(totals.Occurrences)) })
	bar.finish()
	if err != nil {
		return err
	}
	fmt.Fprintf(cmd.OutOrStdout(), "tagged %d of %d occurrences with rule book %s", n, totals.Occurrences, c.Classifier.Version())
	if rest := totals.Occurrences - n; rest > 0 {
		fmt.Fprintf(cmd.OutOrStdout(), "; what has changed does not touch the other %d", rest)
	}
	fmt.Fprintln(cmd.OutOrStdout())
	return nil
}

// streamed is a record on its way through a classifier.
type streamed struct {
	item ingest.Item
	line []byte
	err  error
	done chan struct{}
}

// runTagStream keeps the order of the input: classifiers work side by side,
// the writer takes their results in turn.
func runTagStream(cmd *cobra.Command, o *tagOptions) error {
	book, err := collection.LoadBook(o.rules)
	if err != nil {
		return err
	}
	classifier := classify.New(book)
	in := bufio.NewReaderSize(cmd.InOrStdin(), 1<<20)
	if _, err := in.Peek(1); errors.Is(err, io.EOF) {
		return nil // nothing in, nothing out
	}
	f, err := ingest.Open(cmd.Context(), "-", in, ingest.Options{})
	if err != nil {
		return hint(err, "--stream reads occurrence records, one JSON object a line")
	}
	defer f.Close()
	work, order := make(chan *streamed, 64), make(chan *streamed, 64)
	var broken error
	var wg sync.WaitGroup
	wg.Add(1)
	go func() {
		defer wg.Done()
		defer close(work)
		defer close(order)
		broken = readStream(f, work, order)
	}()
	for range runtime.GOMAXPROCS(0) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for s := range work {
				if s.item.Occurrence != nil {
					s.line, s.err = taggedLine(classifier, s.item.Occurrence)
				}
				close(s.done)
			}
		}()
	}
	err = writeStream(cmd, order)
	wg.Wait()
	return errors.Join(broken, err)
}

func readStream(f *ingest.File, work, order chan<- *streamed) error {
	for {
		item, err := f.Next()
		if err != nil {
			return ignoreEnd(err)
		}
		s := &streamed{item: item, done: make(chan struct{})}
		order <- s
		work <- s
	}
}

func writeStream(cmd *cobra.Command, order <-chan *streamed) error {
	out := bufio.NewWriterSize(cmd.OutOrStdout(), 1<<20)
	bar := newProgress(cmd.ErrOrStderr())
	defer bar.finish()
	begun, n, aside := time.Now(), 0, 0
	var fault error
	for s := range order {
		<-s.done
		if a := s.item.SetAside; a != nil {
			aside++
			if a.Spool != "" {
				os.Remove(a.Spool)
			}
			fmt.Fprintf(cmd.ErrOrStderr(), "set aside: line %d: %s\n", a.Line, clean(a.Reason))
			continue
		}
		if fault == nil {
			fault = s.err
		}
		if fault == nil {
			_, fault = out.Write(s.line)
		}
		if n++; n%500 == 0 {
			bar.show(fmt.Sprintf("tagging, %.0f a second", float64(n)/time.Since(begun).Seconds()), int64(n), 0)
		}
	}
	if fault == nil {
		fault = out.Flush()
	}
	if fault == nil && aside > 0 {
		return errSetAside
	}
	return fault
}

func taggedLine(c *classify.Classifier, o *corpus.Occurrence) ([]byte, error) {
	tagged := c.Tag(o)
	return jsonLine(&tagged)
}

// jsonLine writes a value as one line without HTML escapes.
func jsonLine(v any) ([]byte, error) {
	var buf lineBuffer
	e := json.NewEncoder(&buf)
	e.SetEscapeHTML(false)
	err := e.Encode(v)
	return buf, err
}

type lineBuffer []byte

func (b *lineBuffer) Write(p []byte) (int, error) {
	*b = append(*b, p...)
	return len(p), nil
}

func ignoreEnd(err error) error {
	if errors.Is(err, io.EOF) {
		return nil
	}
	return err
}
