package queries

import (
	"iter"

	"catena/classify/catalogue"
	"catena/ingest/corpus"
	"catena/ingest/store"
	"catena/queries/filter"
)

// Records streams what tables count.
type Records = iter.Seq2[*store.Counted, error]

// Scope narrows a question to some occurrences.
type Scope struct {
	Only     filter.Node // nil for all
	From, To corpus.Date // days or coarser, both included; zero for open
	Tree     *catalogue.Tree
	Doubles  *Doubles // nil where none are known: every occurrence counts
}

// record is an occurrence in scope with its factors and their ancestors.
type record struct {
	*store.Counted
	told     map[string]bool // factors told, with all their ancestors
	inferred map[string]bool // factors that only inferred tags support
}

func (r *record) has(factor string) bool { return r.told[factor] || r.inferred[factor] }

// each calls use for every event in scope: an occurrence, or those together
// that people say tell one event. With apart, those of different sources are
// events of their own.
func (s Scope) each(records Records, apart bool, use func(*record)) (account, error) {
	told := newTellings(s.Doubles, apart)
	for c, err := range records {
		if err != nil {
			return account{}, err
		}
		r := &record{Counted: c, told: s.lineage(c.Told), inferred: s.lineage(c.Inferred)}
		for f := range r.told {
			delete(r.inferred, f)
		}
		if s.within(c.Occurrence.Date) && (s.Only == nil || filter.Eval(s.Only, &c.Occurrence, r.has)) && !told.hold(r) {
			use(r)
		}
	}
	return told.release(use), nil
}

func (s Scope) lineage(factors []string) map[string]bool {
	all := map[string]bool{}
	for _, f := range factors {
		for _, a := range s.Tree.Lineage(f) {
			all[a] = true
		}
	}
	return all
}

// within tells whether every day that the date can mean lies in the scope. An
// unknown date lies only in a scope without limits.
func (s Scope) within(d corpus.Date) bool {
	if s.From == (corpus.Date{}) && s.To == (corpus.Date{}) {
		return true
	}
	first, last := d.Bounds()
	if first == (corpus.Date{}) {
		return false
	}
	from, _ := s.From.Bounds()
	_, to := s.To.Bounds()
	return (s.From == corpus.Date{} || first.Compare(from) >= 0) && (s.To == corpus.Date{} || last.Compare(to) <= 0)
}
