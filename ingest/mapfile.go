package ingest

import (
	"cmp"
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/BurntSushi/toml"

	"catena/queries/filter"
)

// MapFile is a map that a person has written or corrected: which field each
// column is, how dates are ordered, how the source is called. Columns that it
// does not name are extra.
type MapFile struct {
	Path   string // for messages
	Text   string // as read
	Source string
	Dates  string
	fields map[string]string // header -> field
	lines  map[string]int    // header -> line
}

// mapFields are the fields that a column can be given, in the order in which
// they are explained.
var mapFields = func() []string {
	fields := append(slices.Clone(recordFields), toNarrative)
	for _, kind := range narrativeKinds {
		fields = append(fields, narrativeOf+kind)
	}
	fields = append(fields, toCity, toState, toRules, toPurpose)
	fields = append(fields, countFields...)
	for _, f := range craftFields {
		fields = append(fields, "aircraft2."+f)
	}
	return append(fields, toExtra)
}()

// ParseMap reads a map file (TOML 1.0). Errors name the file and the line.
func ParseMap(path string, text []byte) (*MapFile, error) {
	var file struct {
		Source  string            `toml:"source"`
		Dates   string            `toml:"dates"`
		Columns map[string]string `toml:"columns"`
	}
	meta, err := toml.Decode(string(text), &file)
	if err != nil {
		var at toml.ParseError
		if errors.As(err, &at) {
			return nil, fmt.Errorf("%s:%d: %s", path, at.Position.Line, at.Message)
		}
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	m := &MapFile{Path: path, Text: string(text), Source: file.Source, Dates: file.Dates, fields: file.Columns, lines: map[string]int{}}
	for n, line := range strings.Split(m.Text, "\n") {
		key, _, ok := strings.Cut(strings.TrimSpace(line), "=")
		if key = strings.TrimSpace(key); ok && key != "" && key[0] != '#' {
			if plain, err := strconv.Unquote(key); err == nil {
				key = plain
			}
			m.lines[strings.Trim(key, "'")] = n + 1
		}
	}
	for _, key := range meta.Undecoded() {
		name := key.String()
		return nil, fmt.Errorf("%s:%d: no setting is called %q: there are source, dates and [columns]", path, m.lines[name], name)
	}
	if m.Dates != "" && orderWords(m.Dates) == "" {
		return nil, fmt.Errorf("%s:%d: dates = %q: want dmy, mdy or ymd", path, m.lines["dates"], m.Dates)
	}
	if len(m.fields) == 0 {
		return nil, fmt.Errorf("%s: a map needs a table [columns] with lines such as \"Event date\" = \"date\"", path)
	}
	return m, m.check()
}

// check holds that each field is one, and that no two columns have a field
// that holds one value.
func (m *MapFile) check() error {
	owner := map[string]string{}
	for _, header := range m.headers() {
		field := m.fields[header]
		if !slices.Contains(mapFields, field) && !furtherOf(field) {
			err := fmt.Sprintf("%s:%d: no field is called %q", m.Path, m.lines[header], field)
			if near := filter.Nearest(field, mapFields); near != "" {
				return fmt.Errorf("%s: did you mean %q?", err, near)
			}
			return fmt.Errorf("%s: there are %s", err, strings.Join(mapFields, ", "))
		}
		if field == toExtra || strings.HasPrefix(field, narrativeOf) {
			continue
		}
		if other, taken := owner[field]; taken {
			return fmt.Errorf("%s:%d: %q is %s already on line %d (%q)", m.Path, m.lines[header], header, field, m.lines[other], other)
		}
		owner[field] = header
	}
	return nil
}

// furtherOf tells whether a field is of a third or later aircraft.
func furtherOf(field string) bool {
	n, of := splitFurther(field)
	return n > 0 && craftField(of) >= 0
}

// headers are the columns in the order of their lines.
func (m *MapFile) headers() []string {
	headers := make([]string, 0, len(m.fields))
	for h := range m.fields {
		headers = append(headers, h)
	}
	slices.SortFunc(headers, func(a, b string) int {
		return cmp.Or(cmp.Compare(m.lines[a], m.lines[b]), strings.Compare(a, b))
	})
	return headers
}

// covers holds that the file has each column that the map names.
func (m *MapFile) covers(names []string) error {
	for _, header := range m.headers() {
		if slices.Contains(names, header) {
			continue
		}
		err := fmt.Sprintf("%s:%d: the file has no column %q", m.Path, m.lines[header], header)
		lower := make([]string, len(names))
		for i, name := range names {
			lower[i] = strings.ToLower(name)
		}
		if i := slices.Index(lower, filter.Nearest(header, lower)); i >= 0 {
			return fmt.Errorf("%s: did you mean %q?", err, names[i])
		}
		return fmt.Errorf("%s: its columns are %s", err, listNames(names))
	}
	return nil
}

// TOML writes the map as a file to correct and to give to --map. Each column
// has an example of its values beside it.
func (f *File) TOML() []byte {
	var b strings.Builder
	b.WriteString("# Which field of the occurrence each column is. Correct it, then load with --map and this file.\n" +
		"# Columns that are \"extra\" are kept with the occurrence under their own names.\n# Fields: ")
	line := 10
	for i, field := range mapFields {
		if i > 0 {
			b.WriteString(", ")
		}
		if line += len(field) + 2; line > 110 {
			b.WriteString("\n#   ")
			line = len(field) + 4
		}
		b.WriteString(field)
	}
	fmt.Fprintf(&b, "\n\n# The name of the source, for occurrences that do not name their own.\nsource = %s\n", tomlText(f.mapper.Name))
	if f.mapper.DateOrder != "" {
		fmt.Fprintf(&b, "\n# The order of day, month and year where dates are three numbers: dmy, mdy or ymd.\ndates = %s\n", tomlText(f.mapper.DateOrder))
	}
	b.WriteString("\n[columns]\n")
	width := 0
	for _, c := range f.mapper.Columns {
		width = max(width, min(60, len(tomlText(c.Column))))
	}
	for i, c := range f.mapper.Columns {
		field := f.mapper.plans[i].field
		fmt.Fprintf(&b, "%-*s = %-22s # %s", width, tomlText(c.Column), tomlText(field), f.example(i))
		if c.Note != "" && field != toExtra {
			fmt.Fprintf(&b, "; %s", tomlComment(c.Note))
		}
		b.WriteByte('\n')
	}
	return []byte(b.String())
}

// example is a value of a column as a comment.
func (f *File) example(column int) string {
	for _, r := range f.sample {
		for _, c := range r.cells {
			if c.column == column && !placeholder(c.text) {
				return "for example " + tomlComment(brief(strings.TrimSpace(c.text)))
			}
		}
	}
	return "blank in the first rows"
}

// tomlText writes a basic string of TOML 1.0.
func tomlText(text string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range text {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r < ' ' || r == 0x7F:
			fmt.Fprintf(&b, `\u%04X`, r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// tomlComment keeps a text on one line.
func tomlComment(text string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7F {
			return ' '
		}
		return r
	}, text)
}
