package table

import (
	"fmt"
	"io"
	"strings"
)

// writeMarkdown writes a table as the pipe tables of GitHub Flavored Markdown
// (a published specification), for people who paste it elsewhere.
func writeMarkdown(w io.Writer, t *Table, _ Options) error {
	s := forPeople(t)
	var b strings.Builder
	if t.Title != "" {
		fmt.Fprintf(&b, "**%s**\n\n", markdown(t.Title))
	}
	line := func(cells []string) {
		b.WriteByte('|')
		for _, c := range cells {
			fmt.Fprintf(&b, " %s |", markdown(c))
		}
		b.WriteByte('\n')
	}
	line(s.header)
	b.WriteByte('|')
	for _, right := range s.right {
		if right {
			b.WriteString(" ---: |")
		} else {
			b.WriteString(" --- |")
		}
	}
	b.WriteByte('\n')
	for _, r := range s.rows {
		line(r)
	}
	if len(t.Tests)+len(t.Notes) > 0 {
		b.WriteByte('\n')
	}
	for _, x := range t.Tests {
		fmt.Fprintf(&b, "- %s\n", markdown(testText(x)))
	}
	for _, n := range t.Notes {
		fmt.Fprintf(&b, "- %s\n", markdown(n))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// markdownSigns includes the three signs of HTML; html.EscapeString would also
// write quotes as &#39;, whose # this table would then escape.
var markdownSigns = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;",
	`\`, `\\`, "|", `\|`, "`", "\\`", "*", `\*`, "_", `\_`, "~", `\~`, "[", `\[`, "]", `\]`, "#", `\#`)

// markdown takes away the power of signs, and of HTML.
func markdown(s string) string { return markdownSigns.Replace(Clean(s)) }
