package classify

import (
	"testing"

	"catena/classify/rulebook"
)

func TestExamplesOfTheBook(t *testing.T) {
	book, err := rulebook.Builtin()
	if err != nil {
		t.Fatal(err)
	}
	for _, fault := range CheckExamples(book) {
		t.Error(fault)
	}
}
