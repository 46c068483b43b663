package classify

import (
	"compress/gzip"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"catena/ingest/corpus"
	"catena/queries/stats"
)

// outside opens a file of the material that stands beside a checkout and does
// not ship with it; the test is skipped where that is absent.
func outside(t *testing.T, name string) io.ReadCloser {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "shared", filepath.FromSlash(name)))
	if errors.Is(err, fs.ErrNotExist) {
		t.Skipf("%s is not here: public narratives are for measuring only and do not ship", name)
	}
	if err != nil {
		t.Fatal(err)
	}
	if !strings.HasSuffix(name, ".gz") {
		return f
	}
	z, err := gzip.NewReader(f)
	if err != nil {
		t.Fatal(err)
	}
	return z
}

// eachRecord decodes newline-delimited JSON.
func eachRecord[T any](t *testing.T, in io.ReadCloser, use func(*T)) {
	t.Helper()
	defer in.Close()
	d := json.NewDecoder(in)
	for {
		var x T
		if err := d.Decode(&x); err == io.EOF {
			return
		} else if err != nil {
			t.Fatal(err)
		}
		use(&x)
	}
}

// Official findings of investigations against the tags of their texts: how
// often a factor is found where the authority coded it. Only records whose
// codes are complete count. A code can rest on more than the text tells, so
// this measures agreement, not error.
func TestOfficialCodes(t *testing.T) {
	c := classifier(t)
	families := []struct{ name, label, factor string }{
		{"Airspeed", " - Airspeed - ", "slow-airspeed"},
		{"Angle of attack", " - Angle of attack - ", "control-lost-in-flight"},
		{"Directional control", " - Directional control - ", "directional-control-lost"},
		{"Checklist", "checklist", "checklist-skipped"},
		{"Fuel", "Fuel", "fuel-problem"},
		{"Power plant", "power plant", "power-loss"},
	}
	coded, found := map[string]int{}, map[string]int{}
	eachRecord(t, outside(t, "corpus/records/investigation.ndjson.gz"), func(o *corpus.Occurrence) {
		if o.Extra["codes_complete"] != "true" || !o.Usable() {
			return
		}
		var tags []corpus.Tag
		for _, f := range families {
			has := false
			for _, code := range o.Codes {
				has = has || strings.Contains(code.Label, f.label)
			}
			if !has {
				continue
			}
			if tags == nil {
				tags = c.Tag(o).Tags
			}
			coded[f.name]++
			for _, tag := range tags {
				if tag.Assertion == corpus.Affirmed && c.book.Tree.Implies(tag.Factor, f.factor) {
					found[f.name]++
					break
				}
			}
		}
	})
	for _, f := range families {
		w := stats.Wilson(found[f.name], coded[f.name], 0.95)
		t.Logf("%-20s %-26s %3d of %3d, %.2f [%.2f, %.2f]", f.name, f.factor, found[f.name], coded[f.name], w.Estimate, w.Low, w.High)
		if coded[f.name] == 0 {
			t.Errorf("no record with a code of %s: has the material changed?", f.name)
		}
	}
}

// The sample of public narratives coded by two readers: F1 over the factors
// that it codes must not fall under what is promised (the same counting as its
// scorer: told and affirmed, per narrative).
func TestCodedSample(t *testing.T) {
	c := classifier(t)
	tree := c.book.Tree
	type code struct {
		ID, Kind string
		Factors  []string
	}
	codes := map[string]*code{}
	all := map[string]bool{}
	eachRecord(t, outside(t, "gold/codes.ndjson"), func(x *code) {
		codes[x.ID] = x
		for _, f := range x.Factors {
			all[f] = true
		}
	})
	type sum struct{ right, found, coded int }
	sums := map[string]*sum{}
	eachRecord(t, outside(t, "gold/narratives.ndjson"), func(o *corpus.Occurrence) {
		x := codes[o.ID]
		coded, found := map[string]bool{}, map[string]bool{}
		for _, f := range x.Factors {
			for _, a := range tree.Lineage(f) {
				coded[a] = true
			}
		}
		for _, tag := range c.Tag(o).Tags {
			if tag.Assertion == corpus.Affirmed && tag.Basis == corpus.Told {
				for _, a := range tree.Lineage(tag.Factor) {
					found[a] = true
				}
			}
		}
		for f := range all {
			for _, group := range []string{"all", x.Kind, f} {
				if sums[group] == nil {
					sums[group] = &sum{}
				}
				s := sums[group]
				if coded[f] {
					s.coded++
				}
				if found[f] {
					s.found++
				}
				if coded[f] && found[f] {
					s.right++
				}
			}
		}
	})
	f1 := func(s *sum) float64 { return 2 * float64(s.right) / float64(s.found+s.coded) }
	head := &sum{}
	for _, f := range []string{"wrong-rudder", "checklist-skipped", "power-rollback", "slow-airspeed"} {
		head.right, head.found, head.coded = head.right+sums[f].right, head.found+sums[f].found, head.coded+sums[f].coded
	}
	sums["headline"] = head
	for group, least := range map[string]float64{"headline": 0.85, "all": 0.88, "report": 0.78} {
		s := sums[group]
		line := fmt.Sprintf("%s: coded %d, found %d, right %d, F1 %.3f", group, s.coded, s.found, s.right, f1(s))
		if t.Log(line); f1(s) < least {
			t.Errorf("%s, want %.2f", line, least)
		}
	}
	for f := range all {
		if s := sums[f]; s.coded >= 10 && f1(s) < 0.75 {
			t.Errorf("%s: F1 %.3f of %d coded, want 0.75", f, f1(s), s.coded)
		}
	}
}
