package table

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// gap is the number of blanks between two columns.
const gap = 2

// writeText draws a table for a terminal: no colour, light lines, wrapped to
// the width. Where even wrapped columns do not fit side by side, the table
// goes on below, its first column repeated.
func writeText(w io.Writer, t *Table, o Options) error {
	s := forPeople(t)
	var b strings.Builder
	if t.Title != "" {
		fmt.Fprintf(&b, "%s\n\n", Wrap(Clean(t.Title), o.Width, ""))
	}
	widths := columnWidths(s, o.Width)
	for i, columns := range blocks(widths, o.Width) {
		if i > 0 {
			b.WriteByte('\n')
		}
		writeBlock(&b, s, columns, widths)
	}
	if len(t.Tests)+len(t.Notes) > 0 {
		b.WriteString("\n")
	}
	for _, x := range t.Tests {
		b.WriteString(Wrap(testText(x), o.Width, "  ") + "\n")
	}
	for _, n := range t.Notes {
		b.WriteString("* " + Wrap(Clean(n), o.Width-2, "  ") + "\n")
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// writeBlock draws some columns of a table, each wrapped to its width.
func writeBlock(b *strings.Builder, s shown, columns, widths []int) {
	p := table.NewWriter()
	style := table.StyleDefault
	style.Options = table.OptionsNoBordersAndSeparators
	style.Options.SeparateHeader = true
	style.Format.Header = text.FormatDefault
	style.Box.PaddingLeft, style.Box.PaddingRight = "", strings.Repeat(" ", gap)
	style.Box.MiddleHorizontal = "-"
	p.SetStyle(style)
	var configs []table.ColumnConfig
	for n, i := range columns {
		c := table.ColumnConfig{Number: n + 1, WidthMax: widths[i], WidthMaxEnforcer: text.WrapSoft, Align: text.AlignLeft, AlignHeader: text.AlignLeft}
		if s.right[i] {
			c.Align, c.AlignHeader = text.AlignRight, text.AlignRight
		}
		configs = append(configs, c)
	}
	p.SetColumnConfigs(configs)
	pick := func(cells []string) table.Row {
		var row table.Row
		for _, i := range columns {
			row = append(row, cells[i])
		}
		return row
	}
	p.AppendHeader(pick(s.header))
	for _, r := range s.rows {
		p.AppendRow(pick(r))
	}
	ruled := false
	for _, line := range strings.Split(p.Render(), "\n") {
		if !ruled && line != "" && strings.Trim(line, "-") == "" {
			ruled = true
			line = line[:max(0, len(line)-gap)] // the last column's padding is ruled too
		}
		b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
}

// columnWidths takes the room that is missing from the widest columns, as long
// as no word of theirs must be cut.
func columnWidths(s shown, width int) []int {
	widths, words := make([]int, len(s.header)), make([]int, len(s.header))
	total := -gap
	for i, h := range s.header {
		measure := func(cell string) {
			widths[i] = max(widths[i], text.StringWidth(cell))
			for _, word := range strings.Fields(cell) {
				words[i] = max(words[i], text.StringWidth(word))
			}
		}
		measure(h)
		for _, r := range s.rows {
			measure(r[i])
		}
		total += widths[i] + gap
	}
	for ; total > width; total-- {
		widest := -1
		for i := range widths {
			if widths[i] > words[i] && (widest < 0 || widths[i] > widths[widest]) {
				widest = i
			}
		}
		if widest < 0 {
			break
		}
		widths[widest]--
	}
	if total > width && len(widths) > 0 {
		// The table goes on below: the first column must leave room for any
		// other, and words are cut after all where one alone would not fit.
		widths[0] = min(widths[0], max(8, (width-gap)/2))
		for i := range widths[1:] {
			widths[i+1] = min(widths[i+1], max(8, width-gap-widths[0]))
		}
	}
	return widths
}

// blocks parts the columns into groups that fit side by side; every group
// begins with the first column, which says what a row is about.
func blocks(widths []int, width int) [][]int {
	var groups [][]int
	var group []int
	used := 0
	for i, w := range widths {
		if len(group) > 1 && used+gap+w > width {
			groups = append(groups, group)
			group, used = []int{0}, widths[0]
		}
		group = append(group, i)
		used += w
		if len(group) > 1 {
			used += gap
		}
	}
	return slices.DeleteFunc(append(groups, group), func(g []int) bool { return len(g) == 0 })
}

// Wrap breaks text at spaces; lines after the first begin with indent. A word
// longer than a line is left whole, so that a path can be copied.
func Wrap(s string, width int, indent string) string {
	var b strings.Builder
	col := 0
	for _, word := range strings.Fields(s) {
		n := text.StringWidth(word)
		switch {
		case b.Len() == 0:
		case col+1+n > width:
			b.WriteString("\n" + indent)
			col = len(indent)
		default:
			b.WriteByte(' ')
			col++
		}
		b.WriteString(word)
		col += n
	}
	return b.String()
}
