package classify

import (
	"bufio"
	"encoding/json"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"catena/ingest/corpus"
)

var update = flag.Bool("update", false, "write the golden table anew")

// truth is what was meant when an invented narrative was written.
type truth struct {
	ID   string
	Tags []struct {
		Factor    string
		Assertion corpus.Assertion
		Basis     corpus.Basis
	}
}

// goldSets are the invented narratives with coded truth, by who wrote them:
// by hand, and by the fabricate command.
var goldSets = []struct {
	name  string
	files []string
}{
	{"written", []string{"cmd/catena/demo/written-a", "cmd/catena/demo/written-b", "cmd/catena/demo/written-c"}},
	{"made", []string{"cmd/catena/demo/made"}},
}

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
// of the rules shows its effect. The narratives were written by people who
// had not seen the rules.
func TestGoldTable(t *testing.T) {
	c := classifier(t)
	var b strings.Builder
	for _, set := range goldSets {
		scores := map[string]*score{}
		n := 0
		for _, file := range set.files {
			n += scoreFile(t, c, filepath.Join("..", filepath.FromSlash(file)), scores)
		}
		fmt.Fprintf(&b, "== %s: %d narratives\n", set.name, n)
		all := score{}
		for _, f := range c.book.Tree.Factors() {
			if s := scores[f.ID]; s != nil {
				fmt.Fprintf(&b, "%-25s %s\n", f.ID, s)
				all.right, all.extra, all.missed = all.right+s.right, all.extra+s.extra, all.missed+s.missed
			}
		}
		fmt.Fprintf(&b, "%-25s %s\n\n", "all", all)
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

func scoreFile(t *testing.T, c *Classifier, path string, scores map[string]*score) int {
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
		scoreOne(c, &o, truths[n], scores)
		n++
	})
	return n
}

func scoreOne(c *Classifier, o *corpus.Occurrence, x truth, scores map[string]*score) {
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
	for _, tag := range c.Tag(o).Tags {
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
		if scores[f] == nil {
			scores[f] = &score{}
		}
		switch s := scores[f]; {
		case coded[f] && found[f]:
			s.right++
		case found[f]:
			s.extra++
		default:
			s.missed++
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
