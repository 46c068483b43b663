package index

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// clause is one requirement of a query: at least one of its choices.
type clause struct {
	choices []atom
}

// atom is a word, a beginning of a word, or a phrase.
type atom struct {
	words  string
	prefix bool
	not    bool
	at     int // byte offset in the query
}

// QueryError is a query that cannot be understood.
type QueryError struct {
	Query string
	At    int // byte offset of the fault
	Text  string
}

func (e *QueryError) Error() string {
	return fmt.Sprintf("query, character %d: %s", utf8.RuneCountInString(e.Query[:e.At])+1, e.Text)
}

// maxQuery bounds a query in bytes and in atoms.
const (
	maxQuery = 2000
	maxAtoms = 64
)

// parseQuery reads the query language: words, "phrases", -exclusions, word*
// and OR between choices.
func parseQuery(q string) ([]clause, error) {
	if len(q) > maxQuery {
		return nil, &QueryError{q, 0, fmt.Sprintf("longer than %d bytes", maxQuery)}
	}
	if !utf8.ValidString(q) {
		return nil, &QueryError{q, 0, "not UTF-8"}
	}
	var clauses []clause
	or := -1 // offset of an OR that waits for its right side
	atoms := 0
	for i := 0; i < len(q); {
		r, n := utf8.DecodeRuneInString(q[i:])
		if unicode.IsSpace(r) {
			i += n
			continue
		}
		if q[i:] == "OR" || strings.HasPrefix(q[i:], "OR ") {
			if len(clauses) == 0 || or >= 0 {
				return nil, &QueryError{q, i, "OR stands between two choices"}
			}
			or = i
			i += 2
			continue
		}
		a, next, err := parseAtom(q, i)
		if err != nil {
			return nil, err
		}
		if atoms++; atoms > maxAtoms {
			return nil, &QueryError{q, i, fmt.Sprintf("more than %d words", maxAtoms)}
		}
		i = next
		switch {
		case a.words == "":
			// nothing but signs: nothing to look for
		case or >= 0:
			if a.not {
				return nil, &QueryError{q, a.at, "what is excluded cannot be a choice of OR"}
			}
			last := &clauses[len(clauses)-1]
			if last.choices[0].not {
				return nil, &QueryError{q, or, "what is excluded cannot be a choice of OR"}
			}
			last.choices = append(last.choices, a)
			or = -1
		default:
			clauses = append(clauses, clause{[]atom{a}})
		}
	}
	if or >= 0 {
		return nil, &QueryError{q, or, "OR wants a word behind it"}
	}
	return clauses, nil
}

func parseAtom(q string, i int) (atom, int, error) {
	a := atom{at: i}
	if q[i] == '-' {
		a.not = true
		i++
		if i == len(q) || q[i] == ' ' {
			return a, i, nil // a lone dash
		}
	}
	if q[i] == '"' {
		end := strings.IndexByte(q[i+1:], '"')
		if end < 0 {
			return a, 0, &QueryError{q, i, `the phrase is not closed: put " behind it`}
		}
		a.words = strings.TrimSpace(q[i+1 : i+1+end])
		return a, i + end + 2, nil
	}
	end := strings.IndexFunc(q[i:], func(r rune) bool { return unicode.IsSpace(r) || r == '"' })
	if end < 0 {
		end = len(q) - i
	}
	word := q[i : i+end]
	if stem, ok := strings.CutSuffix(word, "*"); ok {
		word, a.prefix = stem, true
	}
	if k := strings.IndexByte(word, '*'); k >= 0 {
		return a, 0, &QueryError{q, i + k, "* stands at the end of a word only"}
	}
	if a.prefix && utf8.RuneCountInString(word) < 2 {
		return a, 0, &QueryError{q, i, "want at least two letters before *"}
	}
	a.words = word
	return a, i + end, nil
}
