package configs

import (
	"os"
	"strings"
	"testing"
)

// TestREADMEHoldsTheReference: the table of keys in README.md is the text of
// Reference, so that it cannot fall behind the schema.
func TestREADMEHoldsTheReference(t *testing.T) {
	text, err := os.ReadFile("../README.md")
	if err != nil {
		t.Fatal(err)
	}
	_, after, begun := strings.Cut(string(text), "<!-- keys: begin;")
	_, after, begun2 := strings.Cut(after, "-->\n")
	table, _, ended := strings.Cut(after, "<!-- keys: end -->")
	if !begun || !begun2 || !ended {
		t.Fatal("README.md has lost the marks around its table of keys")
	}
	want := strings.Split(Reference(), "\n")
	got := strings.Split(table, "\n")
	for i := range max(len(want), len(got)) {
		var w, g string
		if i < len(want) {
			w = want[i]
		}
		if i < len(got) {
			g = got[i]
		}
		if w != g {
			t.Fatalf("README.md, line %d of the table of keys:\n%s\nbut the schema says\n%s\n(put the text of configs.Reference() between the marks)", i+1, g, w)
		}
	}
}
