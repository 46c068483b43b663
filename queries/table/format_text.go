package table

import (
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// writeText draws a table for a terminal: no colour, light lines, wrapped to
// the width.
func writeText(w io.Writer, t *Table, o Options) error {
	s := forPeople(t)
	p := table.NewWriter()
	style := table.StyleDefault
	style.Options = table.OptionsNoBordersAndSeparators
	style.Options.SeparateHeader = true
	style.Format.Header = text.FormatDefault
	style.Box.PaddingLeft, style.Box.PaddingRight = "", "  "
	style.Box.MiddleHorizontal = "-"
	p.SetStyle(style)
	header := table.Row{}
	var configs []table.ColumnConfig
	widths := columnWidths(s, o.Width)
	for i, h := range s.header {
		header = append(header, h)
		c := table.ColumnConfig{Number: i + 1, WidthMax: widths[i], WidthMaxEnforcer: text.WrapSoft, Align: text.AlignLeft, AlignHeader: text.AlignLeft}
		if s.right[i] {
			c.Align, c.AlignHeader = text.AlignRight, text.AlignRight
		}
		configs = append(configs, c)
	}
	p.AppendHeader(header)
	p.SetColumnConfigs(configs)
	for _, r := range s.rows {
		row := table.Row{}
		for _, c := range r {
			row = append(row, c)
		}
		p.AppendRow(row)
	}
	var b strings.Builder
	if t.Title != "" {
		fmt.Fprintf(&b, "%s\n\n", Wrap(Clean(t.Title), o.Width, ""))
	}
	for _, line := range strings.Split(p.Render(), "\n") {
		b.WriteString(strings.TrimRight(line, " ") + "\n")
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

// columnWidths takes the room that is missing from the widest columns.
func columnWidths(s shown, width int) []int {
	widths := make([]int, len(s.header))
	total := 0
	for i, h := range s.header {
		widths[i] = utf8.RuneCountInString(h)
		for _, r := range s.rows {
			widths[i] = max(widths[i], utf8.RuneCountInString(r[i]))
		}
		total += widths[i] + 2
	}
	for total > width {
		widest := 0
		for i := range widths {
			if widths[i] > widths[widest] {
				widest = i
			}
		}
		if widths[widest] <= 8 {
			break
		}
		widths[widest]--
		total--
	}
	return widths
}

// Wrap breaks text at spaces; lines after the first begin with indent.
func Wrap(s string, width int, indent string) string {
	var b strings.Builder
	col := 0
	for _, word := range strings.Fields(s) {
		n := utf8.RuneCountInString(word)
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
