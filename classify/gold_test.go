package classify

import (
	"bufio"
	"cmp"
	"encoding/json"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

var update = flag.Bool("update", false, "write the golden table anew")

// truth is what was meant when an invented narrative was written. Sequence is
// the affirmed factors in order of time.
type truth struct {
	ID       string
	Tags     []corpus.Tag
	Sequence []string
}

// goldSets are the invented narratives with coded truth, by who wrote them:
// by hand, and by the fabricate command.
var goldSets = []struct {
	name  string
	files []string
}{
	{"written", []string{"cmd/catena/demo/written-a", "cmd/catena/demo/written-b", "cmd/catena/demo/written-c"}},
	{"made", []string{"cmd/catena/demo/made"}},
	{"traps", []string{"testdata/gold/traps"}},
	{"words", []string{"testdata/gold/words"}},
	{"assertion", []string{"testdata/gold/assertion"}},
	{"sides", []string{"testdata/gold/sides"}},
	{"twins", []string{"testdata/gold/twins"}},
}

// sheet is what is counted over a set of narratives.
type sheet struct {
	factors map[string]*score
	spoken  map[[2]corpus.Assertion]int // coded and found assertion of words that both show; "" where nothing is found
	sides   [2]int                      // right, all where both tell a side
	order   [2]int                      // pairs of links in the right order, all whose factors were both found
	sure    map[string][2]int           // by strength: right, all of the affirmed tags
}

// bands of strength, from below.
var bands = []struct {
	name string
	from float64
}{{"under 0.80", 0}, {"0.80 to 0.89", 0.8}, {"0.90 and more", 0.9}}

var assertions = []corpus.Assertion{corpus.Affirmed, corpus.Denied, corpus.Possible, corpus.Advised, corpus.Elsewhere}

// score counts one factor over a set: told and affirmed, or below it.
type score struct{ right, extra, missed int }

func (s score) String() string {
	ratio := func(a, b int) string {
		if b == 0 {
			return "   –"
		}
		return fmt.Sprintf("%.2f", float64(a)/float64(b))
	}
	return fmt.Sprintf("coded %3d  found %3d  right %3d  precision %s  recall %s", s.right+s.missed, s.right+s.extra, s.right, ratio(s.right, s.right+s.extra), ratio(s.right, s.right+s.missed))
}

// The table of precision and recall on invented narratives, so that a change
// of the rules shows its effect: by factor over what is told and affirmed, by
// assertion over all that was coded, then strength, sides and order. Who had not
// seen the rules wrote the narratives, but for those of sides.
func TestGoldTable(t *testing.T) {
	c := classifier(t)
	var b strings.Builder
	var sure [2]int // right, all of the affirmed tags in the highest band of strength
	for _, set := range goldSets {
		s := sheet{factors: map[string]*score{}, spoken: map[[2]corpus.Assertion]int{}, sure: map[string][2]int{}}
		n := 0
		for _, file := range set.files {
			n += s.read(t, c, filepath.Join("..", filepath.FromSlash(file)))
		}
		fmt.Fprintf(&b, "== %s: %d narratives\n", set.name, n)
		s.print(&b, c)
		top := s.sure[bands[len(bands)-1].name]
		sure[0], sure[1] = sure[0]+top[0], sure[1]+top[1]
	}
	if right, all := sure[0], sure[1]; 10*right < 9*all || all < 100 {
		t.Errorf("of %d affirmed tags at a strength of 0.9 or more %d are right: want nine in ten", all, right)
	}
	golden := filepath.Join("testdata", "gold.txt")
	if *update {
		if err := os.WriteFile(golden, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if b.String() != string(want) {
		t.Errorf("the table has changed; look at the difference, and run with -update if it is for the better:\n%s", b.String())
	}
}

func (s *sheet) print(b *strings.Builder, c *Classifier) {
	all := score{}
	for _, f := range c.book.Tree.Factors() {
		if x := s.factors[f.ID]; x != nil {
			fmt.Fprintf(b, "%-25s %s\n", f.ID, x)
			all.right, all.extra, all.missed = all.right+x.right, all.extra+x.extra, all.missed+x.missed
		}
	}
	fmt.Fprintf(b, "%-25s %s\n", "all", all)
	fmt.Fprintf(b, "%-10s", "coded as")
	found := append(slices.Clone(assertions), "")
	for _, a := range found {
		fmt.Fprintf(b, " %10s", cmp.Or(string(a), "not found"))
	}
	for _, coded := range assertions {
		fmt.Fprintf(b, "\n%-10s", coded)
		for _, a := range found {
			fmt.Fprintf(b, " %10d", s.spoken[[2]corpus.Assertion{coded, a}])
		}
	}
	for _, band := range bands {
		fmt.Fprintf(b, "\nstrength %-13s %3d of %3d affirmed tags right", band.name, s.sure[band.name][0], s.sure[band.name][1])
	}
	fmt.Fprintf(b, "\nsides right %d of %d, pairs in order %d of %d\n\n", s.sides[0], s.sides[1], s.order[0], s.order[1])
}

func (s *sheet) read(t *testing.T, c *Classifier, path string) int {
	t.Helper()
	var truths []truth
	lines(t, path+".truth.ndjson", func(line []byte) {
		var x truth
		if err := json.Unmarshal(line, &x); err != nil {
			t.Fatal(err)
		}
		truths = append(truths, x)
	})
	n := 0
	lines(t, path+".ndjson", func(line []byte) {
		var o corpus.Occurrence
		if err := json.Unmarshal(line, &o); err != nil {
			t.Fatal(err)
		}
		if o.ID != truths[n].ID {
			t.Fatalf("%s: record %d is %s, its truth is of %s", path, n+1, o.ID, truths[n].ID)
		}
		s.add(c, &o, truths[n])
		n++
	})
	return n
}

// add scores one occurrence.
func (s *sheet) add(c *Classifier, o *corpus.Occurrence, x truth) {
	coded, implied, found := map[string]bool{}, map[string]bool{}, map[string]bool{}
	for _, g := range x.Tags {
		if g.Assertion != corpus.Affirmed {
			continue
		}
		for _, f := range c.book.Tree.Lineage(g.Factor) {
			if g.Basis == corpus.Inferred {
				implied[f] = true // neither right nor wrong among what is told
			} else {
				coded[f] = true
			}
		}
	}
	tagged := c.Tag(o)
	for _, tag := range tagged.Tags {
		if tag.Assertion == corpus.Affirmed {
			s.rate(tag, coded[tag.Factor] || implied[tag.Factor])
		}
		if tag.Assertion == corpus.Affirmed && tag.Basis == corpus.Told {
			for _, f := range c.book.Tree.Lineage(tag.Factor) {
				found[f] = true
			}
		}
	}
	for _, f := range c.book.Tree.IDs() {
		if !coded[f] && !found[f] || implied[f] && !coded[f] {
			continue
		}
		if s.factors[f] == nil {
			s.factors[f] = &score{}
		}
		switch x := s.factors[f]; {
		case coded[f] && found[f]:
			x.right++
		case found[f]:
			x.extra++
		default:
			x.missed++
		}
	}
	for _, g := range x.Tags {
		s.compare(c, g, tagged.Tags)
	}
	s.pairs(c, x.Sequence, tagged.Chain)
}

// rate counts a tag in its band of strength.
func (s *sheet) rate(tag corpus.Tag, right bool) {
	name := ""
	for _, band := range bands {
		if tag.Strength >= band.from {
			name = band.name
		}
	}
	x := s.sure[name]
	x[1]++
	if right {
		x[0]++
	}
	s.sure[name] = x
}

// compare looks for tags on the coded words, of the coded factor or one of
// its line, and counts how they are spoken of and on which side.
func (s *sheet) compare(c *Classifier, g corpus.Tag, tags []corpus.Tag) {
	var spoken corpus.Assertion
	side := ""
	for _, tag := range tags {
		if tag.Narrative != g.Narrative || !tag.Overlaps(g.Span) || !c.book.Tree.Implies(tag.Factor, g.Factor) && !c.book.Tree.Implies(g.Factor, tag.Factor) {
			continue
		}
		if spoken == "" || tag.Assertion == g.Assertion {
			spoken = tag.Assertion
		}
		if side == "" || tag.Side == g.Side {
			side = tag.Side
		}
	}
	s.spoken[[2]corpus.Assertion{g.Assertion, spoken}]++
	if g.Side != "" && side != "" {
		s.sides[1]++
		if side == g.Side {
			s.sides[0]++
		}
	}
}

// pairs counts the pairs of coded links that stand in the chain in the coded
// order.
func (s *sheet) pairs(c *Classifier, sequence []string, chain corpus.Chain) {
	place := func(f string) int {
		return slices.IndexFunc(chain.Links, func(l corpus.Link) bool { return c.book.Tree.Implies(l.Factor, f) })
	}
	for i, a := range sequence {
		for _, b := range sequence[i+1:] {
			x, y := place(a), place(b)
			if x < 0 || y < 0 || c.book.Tree.Implies(a, b) || c.book.Tree.Implies(b, a) {
				continue // not found, or one link may stand for both
			}
			s.order[1]++
			if x < y {
				s.order[0]++
			}
		}
	}
}

func lines(t *testing.T, path string, use func([]byte)) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	s := bufio.NewScanner(f)
	s.Buffer(nil, 1<<20)
	for s.Scan() {
		use(s.Bytes())
	}
	if err := s.Err(); err != nil {
		t.Fatal(err)
	}
}
