package main

import (
	"encoding/json"
	"errors"
	"io"
	"os/exec"
	"strings"
	"testing"
)

// floors is the plan of the house: imports point down only, and packages on
// one floor do not import each other. A package without a floor is a fault.
var floors = map[string]int{
	"cmd/catena": 8, "cmd/fabricate": 8,
	"queries": 5, "ingest/collection": 5,
	"ingest": 4, "ingest/store": 4, "ingest/fabricate": 4, "ingest/doubles": 4, "index": 4, "classify": 4,
	"classify/rulebook": 3, "queries/filter": 3,
	"classify/text": 2, "queries/stats": 2, "queries/table": 2,
	"ingest/corpus": 1, "classify/catalogue": 1,
}

// onlyImporter says which package alone may import a library.
var onlyImporter = map[string]string{
	"github.com/blevesearch/bleve/v2": "index",
	"github.com/jdkato/prose/v2":      "classify/text",
	"modernc.org/sqlite":              "ingest/store",
}

func TestFloors(t *testing.T) {
	out, err := exec.Command("go", "list", "-json=ImportPath,Imports,TestImports", "catena/...").Output()
	if err != nil {
		t.Fatalf("go list: %v", err)
	}
	d := json.NewDecoder(strings.NewReader(string(out)))
	for {
		var p struct {
			ImportPath           string
			Imports, TestImports []string
		}
		if err := d.Decode(&p); errors.Is(err, io.EOF) {
			return
		} else if err != nil {
			t.Fatal(err)
		}
		name := strings.TrimPrefix(p.ImportPath, "catena/")
		floor, ok := floors[name]
		if !ok {
			t.Errorf("%s has no floor: add it to the map in this test and to DEVELOPERS.md", name)
			continue
		}
		for _, i := range p.Imports {
			if below, ours := strings.CutPrefix(i, "catena/"); ours && floors[below] >= floor {
				t.Errorf("%s (floor %d) imports %s (floor %d)", name, floor, below, floors[below])
			}
			for library, owner := range onlyImporter {
				if (i == library || strings.HasPrefix(i, library+"/")) && name != owner {
					t.Errorf("%s imports %s, which only %s may", name, i, owner)
				}
			}
			if name == "ingest/corpus" && strings.Contains(strings.Split(i, "/")[0], ".") {
				t.Errorf("ingest/corpus imports %s: the nouns use the standard library only", i)
			}
		}
	}
}
