package catalogue

import (
	_ "embed"
	"fmt"
	"slices"
	"strings"
	"sync"

	"github.com/goccy/go-yaml"
)

// Kind is the part that a factor plays in a chain.
type Kind string

// The kinds, in the order in which they usually stand in a chain.
const (
	Trigger   Kind = "trigger"
	Response  Kind = "response"
	Condition Kind = "condition"
	Outcome   Kind = "outcome"
	Recovery  Kind = "recovery"
)

// Factor is one element of the catalogue.
type Factor struct {
	ID       string
	Kind     Kind
	Parent   string   // "" for a factor at the top of the tree
	Meaning  string   // one plain sentence
	Category []string // CICTT occurrence category codes, own or inherited
}

// Tree is the whole catalogue. It does not change after Load.
type Tree struct {
	factors []Factor // in the order of the file: parents before children
	byID    map[string]int
}

//go:embed factors.yaml
var builtin []byte

// Builtin returns the tree that ships with the program.
var Builtin = sync.OnceValue(func() *Tree {
	t, err := Load(builtin)
	if err != nil {
		panic(fmt.Sprintf("the embedded catalogue is broken: %v", err)) // a test loads it
	}
	return t
})

// Load reads a factor tree from YAML: a mapping of kind to a list of factors.
// An unknown kind, a repeated id, or a parent that does not stand above its
// child is an error.
func Load(data []byte) (*Tree, error) {
	var file struct {
		Factors []struct {
			Kind    Kind   `yaml:"kind"`
			ID      string `yaml:"id"`
			Parent  string `yaml:"parent"`
			Meaning string `yaml:"meaning"`
			Codes   string `yaml:"codes"`
		} `yaml:"factors"`
	}
	if err := yaml.UnmarshalWithOptions(data, &file, yaml.Strict()); err != nil {
		return nil, fmt.Errorf("read factor tree: %w", err)
	}
	t := &Tree{byID: map[string]int{}}
	kinds := []Kind{Trigger, Response, Condition, Outcome, Recovery}
	for _, f := range file.Factors {
		parent, hasParent := t.byID[f.Parent]
		_, repeated := t.byID[f.ID]
		switch {
		case f.ID == "" || f.Meaning == "":
			return nil, fmt.Errorf("factor %q: want an id and a meaning", f.ID)
		case repeated:
			return nil, fmt.Errorf("factor %q stands twice", f.ID)
		case !slices.Contains(kinds, f.Kind):
			return nil, fmt.Errorf("factor %q: no such kind %q", f.ID, f.Kind)
		case f.Parent != "" && !hasParent:
			return nil, fmt.Errorf("factor %q: its parent %q does not stand above it", f.ID, f.Parent)
		}
		codes := strings.Fields(f.Codes)
		if len(codes) == 0 && hasParent {
			codes = t.factors[parent].Category
		}
		t.byID[f.ID] = len(t.factors)
		t.factors = append(t.factors, Factor{f.ID, f.Kind, f.Parent, f.Meaning, codes})
	}
	return t, nil
}

// Factors lists the whole tree, parents before children.
func (t *Tree) Factors() []Factor { return slices.Clone(t.factors) }

// IDs lists the ids of the whole tree, parents before children.
func (t *Tree) IDs() []string {
	ids := make([]string, len(t.factors))
	for i, f := range t.factors {
		ids[i] = f.ID
	}
	return ids
}

// Factor looks an id up.
func (t *Tree) Factor(id string) (Factor, bool) {
	i, ok := t.byID[id]
	if !ok {
		return Factor{}, false
	}
	return t.factors[i], true
}

// Lineage is the factor followed by its parent, its parent's parent and so
// on. An unknown id has no lineage.
func (t *Tree) Lineage(id string) []string {
	var line []string
	for f, ok := t.Factor(id); ok; f, ok = t.Factor(f.Parent) {
		line = append(line, f.ID)
	}
	return line
}

// Implies tells whether a tag of child also counts under ancestor.
func (t *Tree) Implies(child, ancestor string) bool {
	for {
		i, ok := t.byID[child]
		switch {
		case !ok:
			return false
		case child == ancestor:
			return true
		}
		if child = t.factors[i].Parent; child == "" {
			return false
		}
	}
}

// Below lists the factor and all factors under it.
func (t *Tree) Below(id string) []string {
	var ids []string
	for _, f := range t.factors {
		if t.Implies(f.ID, id) {
			ids = append(ids, f.ID)
		}
	}
	return ids
}

// Categories lists the CICTT occurrence categories that the factors of an
// occurrence speak for, in order of the alphabet. More than one is usual: an
// engine failure after which control is lost is SCF-PP and LOC-I. By the
// coding rules (CAST/ICAO Common Taxonomy Team, Aviation Occurrence Categories
// 4.7, December 2017, and the rules of 4.1 and 4.2) a loss of power that comes
// from the fuel is FUEL and not SCF-PP, and contact with the runway after
// control was lost in flight is not ARC. What is lost on purpose, and what a
// narrative does not tell, has no category here.
func (t *Tree) Categories(factors []string) []string {
	has := func(id string) bool {
		return slices.ContainsFunc(factors, func(f string) bool { return t.Implies(f, id) })
	}
	var out []string
	for _, id := range factors {
		f, ok := t.Factor(id)
		if !ok {
			continue
		}
		for _, code := range f.Category {
			switch {
			case code == "FUEL" && !has("fuel-problem"),
				code == "SCF-PP" && t.Implies(id, "power-loss") && has("fuel-problem"),
				code == "ARC" && has("control-lost-in-flight"),
				id == "directional-control-lost" && code == "LOC-I" && !has("control-lost-in-flight"),
				id == "directional-control-lost" && code == "LOC-G" && !has("control-lost-on-ground"),
				code == "F-POST" && !has("terrain-impact"), code == "F-NI" && has("terrain-impact"),
				slices.Contains(out, code):
			default:
				out = append(out, code)
			}
		}
	}
	slices.Sort(out)
	return out
}
