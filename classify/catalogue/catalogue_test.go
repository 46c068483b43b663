package catalogue

import (
	"slices"
	"strings"
	"testing"
)

func TestBuiltinTree(t *testing.T) {
	tree := Builtin()
	if got := tree.Lineage("spin"); !slices.Equal(got, []string{"spin", "stall", "control-lost-in-flight"}) {
		t.Errorf("lineage of spin = %v", got)
	}
	if !tree.Implies("below-vmc", "slow-airspeed") || tree.Implies("slow-airspeed", "below-vmc") {
		t.Error("below-vmc must count under slow-airspeed, and not the other way round")
	}
	if got := tree.Below("wrong-rudder"); !slices.Equal(got, []string{"wrong-rudder", "rudder-wrong-side", "rudder-overcontrol"}) {
		t.Errorf("below wrong-rudder = %v", got)
	}
	if _, ok := tree.Factor("no-such-factor"); ok || tree.Lineage("no-such-factor") != nil {
		t.Error("an unknown factor must not be found")
	}
}

// The coding rules of the CAST/ICAO Common Taxonomy Team (Aviation Occurrence
// Categories 4.7, December 2017, and the coding rules of 4.1 and 4.2): icing of
// the carburettor is FUEL and not SCF-PP, a stall belongs to LOC-I.
func TestCategoriesFollowTheTaxonomy(t *testing.T) {
	for id, want := range map[string][]string{
		"induction-ice": {"FUEL"}, "stall": {"LOC-I"}, "spin": {"LOC-I"}, "lever-crept": {"SCF-PP"},
		"control-lost-on-ground": {"LOC-G"}, "dynamic-rollover": {"LOC-G"}, "abnormal-runway-contact": {"ARC"},
	} {
		f, ok := Builtin().Factor(id)
		if !ok || !slices.Equal(f.Category, want) {
			t.Errorf("%s: categories %v, want %v", id, f.Category, want)
		}
	}
}

func TestLoadRefuses(t *testing.T) {
	for name, c := range map[string]struct{ yaml, want string }{
		"unknown kind":       {"factors: [{id: a, kind: mood, meaning: x}]", "no such kind"},
		"repeated id":        {"factors: [{id: a, kind: trigger, meaning: x}, {id: a, kind: trigger, meaning: y}]", "stands twice"},
		"parent below child": {"factors: [{id: a, kind: trigger, parent: b, meaning: x}]", "does not stand above"},
		"no meaning":         {"factors: [{id: a, kind: trigger}]", "want an id and a meaning"},
		"unknown key":        {"factors: [{id: a, kind: trigger, meaning: x, colour: red}]", "unknown field"},
	} {
		if _, err := Load([]byte(c.yaml)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q", name, err, c.want)
		}
	}
}
