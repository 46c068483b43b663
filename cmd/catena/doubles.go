package main

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"os/user"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"catena/ingest/collection"
	"catena/ingest/store"
	"catena/queries"
	"catena/queries/table"
)

type doublesOptions struct {
	most           int
	decided, again bool
}

func newDoublesCommand(g *globalOptions) *cobra.Command {
	o := &doublesOptions{}
	cmd := &cobra.Command{
		Use:   "doubles",
		Short: "Occurrences that may be one event, and decisions on them",
		Long: `Lists pairs of occurrences that may tell one event: reported by two agencies, or
by two people. Both stand side by side, with what speaks for one event and
what against. Loading looks for them; a person decides.

An event that several occurrences tell by such decisions is counted once.
Tables say how many undecided pairs they hold.`,
		Example: `  catena doubles
  catena doubles same T21-014 HT-21-207 --note 'both tell of the tyre'
  catena doubles different T21-014 HT-21-209
  catena doubles --decided`,
		Args: args(cobra.NoArgs),
		RunE: func(cmd *cobra.Command, _ []string) error { return runDoubles(cmd, g, o) },
	}
	f := cmd.Flags()
	g.addAt(f)
	g.addWait(f)
	g.addAs(f, "text", "text, csv, json or md")
	f.IntVar(&o.most, "most", 10, "how many pairs to show")
	f.BoolVar(&o.decided, "decided", false, "show the pairs that are decided")
	f.BoolVar(&o.again, "again", false, "look for doubles anew first")
	for _, d := range []struct{ name, short string }{
		{"same", "Say that two occurrences tell one event"},
		{"different", "Say that two occurrences tell two events"},
		{"undecided", "Take a decision back"},
	} {
		cmd.AddCommand(newDecideCommand(d.name, d.short))
	}
	return cmd
}

// newDecideCommand makes one of the commands that decide on a pair.
func newDecideCommand(name, short string) *cobra.Command {
	g := &globalOptions{}
	who, note := "", ""
	cmd := &cobra.Command{
		Use:   name + " ID OTHER-ID",
		Short: short,
		Long: short + `.

Where several sources use the same reference, write the source before it, as in
tarnwick/T21-014.`,
		Example: "  catena doubles " + name + " T21-014 HT-21-207",
		Args:    args(cobra.ExactArgs(2)),
		RunE: func(cmd *cobra.Command, ids []string) error {
			return runDecide(cmd, g, name, ids, cmp.Or(who, currentUser()), note)
		},
	}
	g.addAt(cmd.Flags())
	g.addWait(cmd.Flags())
	cmd.Flags().StringVar(&who, "by", "", "who decides (default: the user of this computer)")
	cmd.Flags().StringVar(&note, "note", "", "why")
	return cmd
}

func currentUser() string {
	if u, err := user.Current(); err == nil && u.Username != "" {
		return u.Username
	}
	return "unknown"
}

// knownDoubles reads what is known of doubles, for counting.
func knownDoubles(ctx context.Context, c *collection.Collection) (*queries.Doubles, error) {
	pairs, err := c.Store.Pairs(ctx)
	if err != nil {
		return nil, err
	}
	change, err := c.Store.Change(ctx)
	if err != nil {
		return nil, err
	}
	seen, err := c.Store.DoublesSeen(ctx)
	return queries.NewDoubles(pairs, seen != change), err
}

// findDoubles looks for doubles after a load and tells how many wait.
func findDoubles(cmd *cobra.Command, c *collection.Collection) error {
	found, err := c.FindDoubles(cmd.Context(), false)
	if err != nil || found == nil {
		return err
	}
	known, err := knownDoubles(cmd.Context(), c)
	if err != nil {
		return err
	}
	if n := len(known.Undecided()); n > 0 {
		words := fmt.Sprintf("%s pairs of occurrences may each", table.Thousands(int64(n)))
		if n == 1 {
			words = "1 pair of occurrences may"
		}
		noteTo(cmd.ErrOrStderr())(words + " tell one event; catena doubles shows them")
	}
	return nil
}

func runDoubles(cmd *cobra.Command, g *globalOptions, o *doublesOptions) error {
	if o.most < 1 {
		return usage(cmd, "--most: want a number above 0")
	}
	open := g.open
	if o.again {
		open = func(cmd *cobra.Command) (*collection.Collection, error) { return g.openToWrite(cmd, "") }
	}
	c, err := open(cmd)
	if err != nil {
		return err
	}
	defer c.Close()
	ctx := cmd.Context()
	if o.again {
		found, err := c.FindDoubles(ctx, true)
		if err != nil {
			return err
		}
		noteTo(cmd.ErrOrStderr())(fmt.Sprintf("%s pairs weighed, %s found", table.Thousands(int64(found.Compared)), table.Thousands(int64(len(found.Pairs)))))
		if found.Left > 0 {
			noteTo(cmd.ErrOrStderr())(fmt.Sprintf("on %s crowded days only the nearest were weighed", table.Thousands(int64(found.Left))))
		}
	}
	all, err := c.Store.Pairs(ctx)
	if err != nil {
		return err
	}
	known, err := knownDoubles(ctx, c)
	if err != nil {
		return err
	}
	waiting := map[[2]int64]bool{}
	for _, p := range known.Undecided() {
		waiting[p] = true
	}
	var pairs []store.Pair
	for _, p := range all {
		if o.decided && p.Decision != nil || !o.decided && waiting[[2]int64{p.A, p.B}] {
			pairs = append(pairs, p)
		}
	}
	total := len(pairs)
	what := "pairs that may be one event, undecided"
	switch {
	case o.decided && total == 1:
		what = "pair decided"
	case o.decided:
		what = "pairs decided"
	case total == 1:
		what = "pair that may be one event, undecided"
	}
	pairs = pairs[:min(o.most, total)]
	if g.as != "text" {
		t := queries.PairsTable(what, pairs)
		if n := total - len(pairs); n > 0 {
			t.Notes = append(t.Notes, fmt.Sprintf("%d more not shown (--most)", n))
		}
		return g.write(cmd, t)
	}
	out := cmd.OutOrStdout()
	fmt.Fprintf(out, "%s %s\n", table.Thousands(int64(total)), what)
	for i, p := range pairs {
		if err := printPair(ctx, out, c, i+1, p); err != nil {
			return err
		}
	}
	if n := total - len(pairs); n > 0 {
		fmt.Fprintf(out, "\n%s more: --most %d shows them all\n", table.Thousands(int64(n)), total)
	}
	if total > 0 && !o.decided {
		fmt.Fprintf(out, "\nDecide: catena doubles same ID OTHER-ID, or catena doubles different ID OTHER-ID\n")
	}
	return nil
}

// likelihood puts a probability in words: it rests on judged weights, so that
// no figure of it is worth more.
func likelihood(p float64) string {
	switch {
	case p >= 0.99:
		return "very likely one event"
	case p >= 0.9:
		return "likely one event"
	}
	return "perhaps one event"
}

// printPair prints two occurrences side by side with the evidence.
func printPair(ctx context.Context, out io.Writer, c *collection.Collection, n int, p store.Pair) error {
	a, err := c.Store.One(ctx, p.A)
	if err != nil {
		return err
	}
	b, err := c.Store.One(ctx, p.B)
	if err != nil {
		return err
	}
	head := likelihood(p.Probability)
	if p.Evidence == nil {
		head = "not found by the search"
	}
	if d := p.Decision; d != nil {
		head = fmt.Sprintf("%s, said %s on %s%s; the search: %s", queries.DecisionWord(d.Same), clean(d.Who), d.At.Format("2006-01-02"),
			map[bool]string{true: "", false: " (" + clean(d.Note) + ")"}[d.Note == ""], head)
	}
	fmt.Fprintf(out, "\n%d. %s\n", n, head)
	var pro, con []string
	for _, e := range p.Evidence {
		if e.Bits > 0 {
			pro = append(pro, e.What)
		} else if e.Bits < 0 {
			con = append(con, e.What)
		}
	}
	full := width(out)
	if len(pro) > 0 {
		fmt.Fprintln(out, table.Wrap("for: "+clean(strings.Join(pro, "; ")), full, "   "))
	}
	if len(con) > 0 {
		fmt.Fprintln(out, table.Wrap("against: "+clean(strings.Join(con, "; ")), full, "   "))
	}
	fmt.Fprint(out, sideBySide(telling(a), telling(b), full))
	return nil
}

// telling is an occurrence in a few lines: a first line, its aircraft and
// place, its outcome, and the beginning of its longest narrative.
func telling(r *store.Row) []string {
	join := func(parts ...string) string {
		var out []string
		for _, p := range parts {
			if p != "" {
				out = append(out, clean(p))
			}
		}
		return strings.Join(out, ", ")
	}
	text := ""
	for _, n := range r.Narratives {
		if len(n.Text) > len(text) {
			text = n.Text
		}
	}
	return []string{
		join(r.Occurrence.Source + " " + r.ID), join(r.Date.String(), r.Place), join(strings.TrimSpace(r.Make+" "+r.Model), r.Operation, r.Phase),
		join(r.Event, "injury "+cmp.Or(r.Injury, "not told"), "damage "+cmp.Or(r.Damage, "not told")), clean(shorten(text, 360)),
	}
}

// shorten cuts a text behind a word.
func shorten(s string, most int) string {
	if len(s) <= most {
		return s
	}
	cut := strings.LastIndexByte(s[:most], ' ')
	if cut < most/2 {
		cut = most
		for cut > 0 && s[cut]&0xC0 == 0x80 {
			cut--
		}
	}
	return s[:cut] + " ..."
}

// sideBySide sets two lists of paragraphs in two columns.
func sideBySide(a, b []string, full int) string {
	const gap = " | "
	column := max(20, (full-3-len(gap))/2)
	var out strings.Builder
	for i := range a {
		left, right := strings.Split(table.Wrap(a[i], column, ""), "\n"), strings.Split(table.Wrap(b[i], column, ""), "\n")
		for n := range max(len(left), len(right)) {
			l, r := "", ""
			if n < len(left) {
				l = left[n]
			}
			if n < len(right) {
				r = right[n]
			}
			fmt.Fprintf(&out, "   %s\n", strings.TrimRight(fmt.Sprintf("%-*s%s%s", column, l, gap, r), " "))
		}
	}
	return out.String()
}

func runDecide(cmd *cobra.Command, g *globalOptions, what string, ids []string, who, note string) error {
	c, err := g.openToWrite(cmd, "")
	if err != nil {
		return err
	}
	defer c.Close()
	ctx := cmd.Context()
	a, err := oneKey(cmd, c, ids[0])
	if err != nil {
		return err
	}
	b, err := oneKey(cmd, c, ids[1])
	if err != nil {
		return err
	}
	if a == b {
		return usage(cmd, "%q and %q are one occurrence", ids[0], ids[1])
	}
	a, b = min(a, b), max(a, b)
	if what == "undecided" {
		was, err := c.Store.Undecide(ctx, a, b)
		if err == nil && !was {
			err = fmt.Errorf("nothing was decided about %s and %s", ids[0], ids[1])
		}
		return err
	}
	d := store.Decision{A: a, B: b, Same: what == "same", Who: who, At: time.Now(), Note: note}
	pairs, err := c.Store.Pairs(ctx)
	if err != nil {
		return err
	}
	others := []store.Pair{{Decision: &d}}
	others[0].A, others[0].B = a, b
	for _, p := range pairs {
		if p.A != a || p.B != b {
			others = append(others, p)
		}
	}
	if x, contradicts := queries.Contradiction(others); contradicts {
		xa, err := c.Store.One(ctx, x.A)
		if err != nil {
			return err
		}
		xb, err := c.Store.One(ctx, x.B)
		if err != nil {
			return err
		}
		return hint(fmt.Errorf("this contradicts other decisions: %s %s and %s %s would be one event by some and two by another",
			xa.Occurrence.Source, xa.ID, xb.Occurrence.Source, xb.ID), "catena doubles --decided shows them; catena doubles undecided ID OTHER-ID takes one back")
	}
	if err := c.Store.Decide(ctx, d); err != nil {
		return err
	}
	fmt.Fprintf(cmd.ErrOrStderr(), "%s and %s: %s event%s, by %s\n", ids[0], ids[1], map[bool]string{true: "one", false: "two"}[d.Same], map[bool]string{true: "", false: "s"}[d.Same], clean(who))
	return nil
}

// oneKey finds the occurrence that a reference means: ID, or SOURCE/ID where
// several sources use it.
func oneKey(cmd *cobra.Command, c *collection.Collection, ref string) (int64, error) {
	keys, err := c.Store.Keys(cmd.Context(), "", ref)
	if err != nil {
		return 0, err
	}
	if source, id, ok := strings.Cut(ref, "/"); len(keys) == 0 && ok {
		if keys, err = c.Store.Keys(cmd.Context(), source, id); err != nil {
			return 0, err
		}
	}
	switch len(keys) {
	case 0:
		return 0, hint(fmt.Errorf("no occurrence has the reference %q", ref), "catena find WORDS lists occurrences with their references")
	case 1:
		return keys[0], nil
	}
	var names []string
	for _, k := range keys {
		r, err := c.Store.One(cmd.Context(), k)
		if err != nil {
			return 0, err
		}
		names = append(names, r.Occurrence.Source+"/"+r.ID)
	}
	return 0, hint(fmt.Errorf("%d sources use the reference %q", len(keys), ref), "write one of "+strings.Join(names, ", "))
}
