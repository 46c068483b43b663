package table

import "testing"

func TestMarkdownSigns(t *testing.T) {
	for in, want := range map[string]string{
		`the pilot's "go-around"`: `the pilot's "go-around"`,
		"a|b":                     `a\|b`,
		"a\\|b":                   `a\\\|b`,
		"`rm`":                    "\\`rm\\`",
		"<script>&amp;":           "&lt;script&gt;&amp;amp;",
		"two\nlines":              "two lines",
		"*bold* _it_ ~~no~~":      `\*bold\* \_it\_ \~\~no\~\~`,
		"![x](y)":                 `!\[x\](y)`,
		"#1":                      `\#1`,
	} {
		if got := markdown(in); got != want {
			t.Errorf("%q = %q, want %q", in, got, want)
		}
	}
}
