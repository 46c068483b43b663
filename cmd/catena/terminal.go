package main

import (
	"fmt"
	"io"
	"os"
	"strconv"
	"time"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"

	"catena/queries/table"
)

// isTerminal tells whether a person reads what is written to w.
func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// colour tells whether to highlight with terminal codes (see no-color.org).
func colour(w io.Writer) bool {
	return isTerminal(w) && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
}

// width is how many columns a table may take: the terminal's, $COLUMNS, or 100.
func width(w io.Writer) int {
	if f, ok := w.(*os.File); ok {
		if n, _, err := term.GetSize(int(f.Fd())); err == nil && n >= 40 {
			return n
		}
	}
	if n, err := strconv.Atoi(os.Getenv("COLUMNS")); err == nil && n >= 40 {
		return n
	}
	return 100
}

// clean makes text from outside safe for a terminal.
func clean(s string) string { return table.Clean(s) }

// progress shows on a terminal how far long work is; elsewhere it is silent.
type progress struct {
	w     io.Writer
	bar   *progressbar.ProgressBar
	label string
}

func newProgress(w io.Writer) *progress {
	if !isTerminal(w) {
		w = nil
	}
	return &progress{w: w}
}

// show draws done of total units; total 0 means unknown.
func (p *progress) show(label string, done, total int64) {
	if p.w == nil {
		return
	}
	if p.bar == nil || p.label != label {
		p.finish()
		p.label = label
		if total <= 0 {
			total = -1
		}
		p.bar = progressbar.NewOptions64(total,
			progressbar.OptionSetWriter(p.w), progressbar.OptionSetDescription(label), progressbar.OptionSetWidth(24),
			progressbar.OptionThrottle(100*time.Millisecond), progressbar.OptionClearOnFinish(), progressbar.OptionSetPredictTime(true),
			progressbar.OptionSetElapsedTime(true),
			progressbar.OptionFullWidth(), progressbar.OptionUseANSICodes(true))
	}
	p.bar.Set64(done)
}

// describe changes the words before the bar.
func (p *progress) describe(s string) {
	if p.bar != nil {
		p.bar.Describe(s)
	}
}

// finish clears the bar.
func (p *progress) finish() {
	if p.bar != nil {
		p.bar.Finish()
		fmt.Fprint(p.w, "\r\x1b[K")
		p.bar = nil
	}
}
