package app

import (
	"fmt"
	"os"
	"strings"
	"testing"

	"github.com/spf13/pflag"

	"nullmark/configs"
)

// TestREADMENamesEverything: each command, flag and exit code, and each kind of
// orbit that runs, stands in README.md; the two commands that a reader tries
// first stand in its first twelve lines.
func TestREADMENamesEverything(t *testing.T) {
	data, err := os.ReadFile("../../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	text := string(data)
	want := func(what, needle string) {
		t.Helper()
		if !strings.Contains(text, needle) {
			t.Errorf("README.md does not have %s (%s)", what, needle)
		}
	}
	root := (&command{}).root()
	for _, sub := range root.Commands() {
		if sub.Name() == "help" || sub.Name() == "completion" {
			continue
		}
		want("the command", "| `"+sub.CommandPath())
		sub.Flags().VisitAll(func(f *pflag.Flag) { want("a flag of "+sub.Name(), "`--"+f.Name) })
	}
	root.PersistentFlags().VisitAll(func(f *pflag.Flag) { want("a flag", "`--"+f.Name) })
	for _, code := range []int{ExitDone, ExitNotMet, ExitUsage, ExitNumerical, ExitFiles, ExitInterrupted} {
		want("an exit code", fmt.Sprintf("\n| %d | ", code))
	}
	for _, name := range configs.Shipped() {
		file, err := configs.ShippedFile(name)
		if err != nil {
			t.Fatal(err)
		}
		if _, kind, ok := strings.Cut(string(file), "kind: "); ok {
			kind, _, _ = strings.Cut(kind, "\n")
			want("an orbit that "+name+" shows", "| `"+strings.Trim(strings.TrimSpace(kind), "}")+"` | ")
		}
	}
	lines := strings.SplitN(text, "\n", 13)
	top := strings.Join(lines[:len(lines)-1], "\n")
	for _, c := range []string{"\ngo run ./cmd/nullmark run configs/circular.yaml\n", "\ngo test ./...\n"} {
		if !strings.Contains(top, c) {
			t.Errorf("the first lines of README.md do not have %q", c)
		}
	}
}
