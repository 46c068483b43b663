package queries

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"catena/queries/stats"
	"catena/queries/table"
)

// ChainOptions say which chains to count.
type ChainOptions struct {
	Scope
	Most  int     // rows at the most
	Level float64 // of the intervals, 0.95
}

// Chains counts the ordered chains of at least two links, the commonest first,
// and says how often each was broken by a recovery.
func Chains(records Records, o ChainOptions) (*table.Table, error) {
	type group struct {
		path          string
		count, broken int
	}
	groups := map[string]*group{}
	chained, usable, single := 0, 0, 0
	doubles, err := o.Scope.each(records, false, func(r *record) {
		if r.Usable {
			usable++
		}
		if len(r.Path) < 2 {
			single += len(r.Path)
			return
		}
		chained++
		path := strings.Join(r.Path, " > ")
		g := groups[path]
		if g == nil {
			g = &group{path: path}
			groups[path] = g
		}
		g.count++
		if r.BrokenBy != "" {
			g.broken++
		}
	})
	if err != nil {
		return nil, err
	}
	all := make([]*group, 0, len(groups))
	for _, g := range groups {
		all = append(all, g)
	}
	slices.SortFunc(all, func(a, b *group) int {
		return cmp.Or(cmp.Compare(b.count, a.count), cmp.Compare(a.path, b.path))
	})
	t := &table.Table{Title: "commonest chains", Columns: []table.Column{
		{Name: "chain"}, {Name: "count", Unit: "count"}, {Name: "share", Unit: "share"}, {Name: "share_low", Unit: "share"}, {Name: "share_high", Unit: "share"},
		{Name: "broken", Unit: "count"},
	}}
	for _, g := range all[:min(o.Most, len(all))] {
		s := stats.Wilson(g.count, chained, o.Level)
		t.Rows = append(t.Rows, []table.Cell{g.path, g.count, s.Estimate, s.Low, s.High, g.broken})
	}
	t.Notes = append(t.Notes,
		fmt.Sprintf("share: of the %s with two links or more, among %d with a usable narrative; %d more have a single link", plural(chained, "chain"), usable, single),
		"broken: a recovery follows the last condition, and no outcome comes after it",
		"links are in the order of time as far as the words tell it; a chain is what was told, not a finding of cause")
	t.Notes = append(t.Notes, doubles.notes()...)
	if n := len(all) - len(t.Rows); n > 0 {
		t.Notes = append(t.Notes, fmt.Sprintf("%s more not shown", plural(n, "chain")))
	}
	return t, nil
}
