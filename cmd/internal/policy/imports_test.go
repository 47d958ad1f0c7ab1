package policy

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os/exec"
	"slices"
	"strings"
	"testing"
)

const module = "nullmark"

type listed struct {
	ImportPath string
	Imports    []string
	Standard   bool
}

// packages asks the go command for every package of the module.
func packages(t *testing.T) []listed {
	t.Helper()
	cmd := exec.Command("go", "list", "-json=ImportPath,Imports", module+"/...")
	cmd.Dir = root(t)
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("go list: %v\n%s", err, stderr.String())
	}
	var all []listed
	for dec := json.NewDecoder(bytes.NewReader(out)); ; {
		var p listed
		if err := dec.Decode(&p); errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		all = append(all, p)
	}
	return all
}

// below says whether path is prefix or lies below it.
func below(path, prefix string) bool {
	return path == prefix || strings.HasPrefix(path, prefix+"/")
}

// matches says whether the package path is meant by the pattern.
func matches(pattern, path string) bool {
	if stem, all := strings.CutSuffix(pattern, "/..."); all {
		return strings.HasPrefix(path, stem+"/")
	}
	return pattern == path
}

// ruleFor finds the line of a package: its own before a "/..." line, and the
// longest "/..." line among several.
func ruleFor(rules []Rule, path string) (Rule, bool) {
	best, found := Rule{}, false
	for _, r := range rules {
		if r.Package == path {
			return r, true
		}
		if matches(r.Package, path) && len(r.Package) > len(best.Package) {
			best, found = r, true
		}
	}
	return best, found
}

// faults lists what a package imports against the table.
func faults(rules []Rule, p listed) []string {
	path := strings.TrimPrefix(p.ImportPath, module+"/")
	r, ok := ruleFor(rules, path)
	if !ok {
		return []string{path + " has no line in policy.Rules: say what it may import"}
	}
	var out []string
	for _, imp := range p.Imports {
		inside, isInside := strings.CutPrefix(imp, module+"/")
		first, _, _ := strings.Cut(imp, "/")
		switch {
		case isInside:
			if !slices.ContainsFunc(r.Inside, func(pattern string) bool { return matches(pattern, inside) }) {
				out = append(out, fmt.Sprintf("%s may not import %s (the data path runs one way; see policy.Rules)", path, inside))
			}
		case strings.Contains(first, "."):
			if !slices.ContainsFunc(r.Outside, func(prefix string) bool { return below(imp, prefix) }) {
				out = append(out, fmt.Sprintf("%s may not import %s (each outside library has its own place; see policy.Rules)", path, imp))
			}
		case !r.Machine:
			if slices.ContainsFunc(MachinePackages(), func(prefix string) bool { return below(imp, prefix) }) {
				out = append(out, fmt.Sprintf("%s may not import %s (numerics touch no machine)", path, imp))
			}
		}
	}
	return out
}

func TestImportsFollowTheTable(t *testing.T) {
	rules := Rules()
	all := packages(t)
	if len(all) == 0 {
		t.Fatal("go list found no package")
	}
	for _, p := range all {
		for _, f := range faults(rules, p) {
			t.Error(f)
		}
	}
}

// TestTableCatches plants each kind of forbidden edge.
func TestTableCatches(t *testing.T) {
	for _, c := range []struct {
		name, path, imp string
		bad             bool
	}{
		{"against the data path", "hyperboloidal", module + "/equations", true},
		{"numerics read a case", "equations/semi", module + "/configs", true},
		{"extraction knows the evolution", "extract/flux", module + "/equations/evolve", true},
		{"driver knows what is observed", "equations/evolve", module + "/extract", true},
		{"viper outside configs", "extract/store", "github.com/spf13/viper", true},
		{"npyio outside the store", "extract/report", "github.com/sbinet/npyio/npz", true},
		{"numerics open files", "source/worldline", "os", true},
		{"numerics log", "grid/march", "log/slog", true},
		{"a package nobody decided about", "helpers", "math", true},
		{"report reads what it draws", "extract/report", module + "/extract/result", false},
		{"report measures", "extract/report", module + "/extract/demod", true},
		{"store writes files", "extract/store", "os", false},
		{"wire sees both sides", "cmd/internal/wire", module + "/equations/evolve", false},
		{"flux reads the result's types", "extract/flux", module + "/extract/result", false},
	} {
		got := faults(Rules(), listed{ImportPath: module + "/" + c.path, Imports: []string{c.imp}})
		if (len(got) > 0) != c.bad {
			t.Errorf("%s: %s imports %s: faults %q, want a fault: %v", c.name, c.path, c.imp, got, c.bad)
		}
	}
}

func TestRulesNameEachPackageOnce(t *testing.T) {
	seen := map[string]bool{}
	for _, r := range Rules() {
		if seen[r.Package] {
			t.Errorf("%s stands twice in policy.Rules", r.Package)
		}
		seen[r.Package] = true
	}
}
