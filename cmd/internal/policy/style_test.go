package policy

import (
	"bytes"
	"fmt"
	"go/ast"
	"go/format"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"
)

// root is the module's directory.
func root(t *testing.T) string {
	t.Helper()
	dir, err := filepath.Abs(filepath.Join("..", "..", ".."))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(dir, "go.mod")); err != nil {
		t.Fatalf("no go.mod where the module should be: %v", err)
	}
	return dir
}

// file is one text file of the project, its path relative to the module.
type file struct {
	path string
	text []byte
}

// files reads the project's text files: what git tracks or would track; all
// files below the module where there is no git (an unpacked archive).
func files(t *testing.T) []file {
	t.Helper()
	dir := root(t)
	var paths []string
	cmd := exec.Command("git", "ls-files", "-z", "--cached", "--others", "--exclude-standard")
	cmd.Dir = dir
	if out, err := cmd.Output(); err == nil {
		paths = strings.Split(strings.TrimRight(string(out), "\x00"), "\x00")
	} else if err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		rel, err := filepath.Rel(dir, path)
		paths = append(paths, filepath.ToSlash(rel))
		return err
	}); err != nil {
		t.Fatal(err)
	}
	slices.Sort(paths)
	var all []file
	for _, p := range slices.Compact(paths) {
		full := filepath.Join(dir, filepath.FromSlash(p))
		info, err := os.Lstat(full)
		if err != nil || !info.Mode().IsRegular() {
			continue // deleted but not yet committed, or a link
		}
		text, err := os.ReadFile(full)
		if err != nil {
			t.Fatal(err)
		}
		if utf8.Valid(text) {
			all = append(all, file{p, text})
		}
	}
	if len(all) < 5 {
		t.Fatalf("only %d files found below the module", len(all))
	}
	return all
}

func goFiles(t *testing.T) []file {
	t.Helper()
	return slices.DeleteFunc(files(t), func(f file) bool { return !strings.HasSuffix(f.path, ".go") })
}

func isTest(f file) bool { return strings.HasSuffix(f.path, "_test.go") }

var generated = regexp.MustCompile(`(?m)^// Code generated .* DO NOT EDIT\.$`)

func TestGofmt(t *testing.T) {
	for _, f := range goFiles(t) {
		want, err := format.Source(f.text)
		if err != nil {
			t.Errorf("%s does not parse: %v", f.path, err)
		} else if !bytes.Equal(want, f.text) {
			t.Errorf("gofmt would change %s", f.path)
		}
	}
}

// banned is a pattern that must not stand in the project. The patterns are put
// together from pieces so that this file does not contain what it looks for.
type banned struct {
	where *regexp.Regexp // the paths it applies to
	what  *regexp.Regexp
	why   string
}

func bans() []banned {
	anywhere, code := regexp.MustCompile(``), regexp.MustCompile(`\.(go|s)$`)
	join := func(pieces ...string) *regexp.Regexp { return regexp.MustCompile(strings.Join(pieces, "")) }
	return []banned{
		{anywhere, join(`(?i)\b(seed`, ` document|trans`, `cript|lec`, `ture|ta`, `lk)s?\b`), "names a document that is no part of the project"},
		{anywhere, join(`(^|[^.\w/])/(wo`, `rk|fa`, `rm|ro`, `ot|ho`, `me|Us`, `ers)/`), "names a path of one machine"},
		{anywhere, join(`(?i)\b(proxy\.go`, `lang\.org|sum\.go`, `lang\.org|py`, `pi\.org|deb\.deb`, `ian\.org|registry\.np`, `mjs)`), "names a registry's host"},
		{anywhere, join(`(?i)\biss`, `ue #?\d`), "names a number of the tracker"},
		{code, join(`\b(t|b|f|tb)\.Sk`, `ip(Now|f)?\(`), "skips a test"},
		{code, join(`\b(TO`, `DO|FIX`, `ME|XX`, `X)\b`), "marks unfinished work"},
		{code, join(`(?i)not imple`, `mented`), "is a stub"},
	}
}

func breaches(f file) []string {
	var out []string
	for _, b := range bans() {
		if !b.where.MatchString(f.path) {
			continue
		}
		for i, line := range strings.Split(string(f.text), "\n") {
			if hit := b.what.FindString(line); hit != "" {
				out = append(out, fmt.Sprintf("%s:%d: %q %s", f.path, i+1, strings.TrimSpace(hit), b.why))
			}
		}
	}
	return out
}

func TestNothingBannedStandsInTheProject(t *testing.T) {
	for _, f := range files(t) {
		if f.path == "go.sum" {
			continue // hashes
		}
		for _, b := range breaches(f) {
			t.Error(b)
		}
	}
}

// TestBansCatch plants one line for each ban, and lines that resemble them.
func TestBansCatch(t *testing.T) {
	for _, c := range []struct {
		path, line string
		bad        bool
	}{
		{"README.md", "as the lec" + "ture says", true},
		{"README.md", "see the trans" + "cript", true},
		{"a.go", `open("/ro` + `ot/x")`, true},
		{"a.go", "cd /wo" + "rk/main", true},
		{"a.go", "// see iss" + "ue 12", true},
		{"a.go", "GOPROXY=https://proxy.go" + "lang.org", true},
		{"a_test.go", "\tt.Sk" + `ip("later")`, true},
		{"a.go", "// TO" + "DO: more", true},
		{"a.go", `panic("not imple` + `mented")`, true},
		{"a.go", `import "nullmark/extract/result"`, false},
		{"a.go", "the frame/work/energy relation", false},
		{"a.go", "two lec" + "tures", true},
		{"a.go", "architecture", false},
		{"a.go", "./work/x and results/root/y", false},
	} {
		if got := breaches(file{c.path, []byte(c.line)}); (len(got) > 0) != c.bad {
			t.Errorf("%s with %q: %q, want a breach: %v", c.path, c.line, got, c.bad)
		}
	}
}

func TestFilesStayShort(t *testing.T) {
	allowed := map[string]string{}
	for _, l := range LongFiles() {
		if l.Reason == "" {
			t.Errorf("%s may be long without a reason", l.Path)
		}
		allowed[l.Path] = l.Reason
	}
	for _, f := range goFiles(t) {
		lines := bytes.Count(f.text, []byte("\n"))
		_, long := allowed[f.path]
		delete(allowed, f.path)
		switch {
		case generated.Match(f.text):
		case lines > MaxLines && !long:
			t.Errorf("%s has %d lines, above the cap of %d: split it by subject, or give the reason in policy.LongFiles", f.path, lines, MaxLines)
		case lines <= MaxLines && long:
			t.Errorf("%s is back below the cap: take it out of policy.LongFiles", f.path)
		}
	}
	for path := range allowed {
		t.Errorf("policy.LongFiles names %s, which does not exist", path)
	}
}

// undocumented lists the package clauses, top-level exported names and
// exported methods of exported types that have no comment. A group of
// constants or variables may share the comment above it; methods whose meaning
// an interface of the language's library fixes need none.
func undocumented(path string, text []byte) ([]string, *ast.File, error) {
	fset := token.NewFileSet()
	parsed, err := parser.ParseFile(fset, path, text, parser.ParseComments)
	if err != nil {
		return nil, nil, err
	}
	var out []string
	miss := func(n ast.Node, name string) {
		out = append(out, fmt.Sprintf("%s:%d: %s has no doc comment", path, fset.Position(n.Pos()).Line, name))
	}
	for _, d := range parsed.Decls {
		switch d := d.(type) {
		case *ast.FuncDecl:
			fixed := d.Recv != nil && slices.Contains([]string{"Error", "String", "Unwrap"}, d.Name.Name)
			if d.Name.IsExported() && exportedReceiver(d) && d.Doc.Text() == "" && !fixed {
				miss(d, d.Name.Name)
			}
		case *ast.GenDecl:
			for _, s := range d.Specs {
				switch s := s.(type) {
				case *ast.TypeSpec:
					if s.Name.IsExported() && d.Doc.Text() == "" && s.Doc.Text() == "" {
						miss(s, s.Name.Name)
					}
				case *ast.ValueSpec:
					for _, n := range s.Names {
						if n.IsExported() && d.Doc.Text() == "" && s.Doc.Text() == "" && s.Comment.Text() == "" {
							miss(n, n.Name)
						}
					}
				}
			}
		}
	}
	return out, parsed, nil
}

func exportedReceiver(d *ast.FuncDecl) bool {
	if d.Recv == nil || len(d.Recv.List) == 0 {
		return true
	}
	typ := d.Recv.List[0].Type
	for {
		switch x := typ.(type) {
		case *ast.StarExpr:
			typ = x.X
		case *ast.IndexExpr:
			typ = x.X
		case *ast.Ident:
			return x.IsExported()
		default:
			return true
		}
	}
}

func TestExportedNamesAreDocumented(t *testing.T) {
	packageDoc := map[string]bool{}
	for _, f := range goFiles(t) {
		if isTest(f) {
			continue
		}
		missing, parsed, err := undocumented(f.path, f.text)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, m := range missing {
			t.Error(m)
		}
		dir := filepath.ToSlash(filepath.Dir(f.path))
		packageDoc[dir] = packageDoc[dir] || parsed.Doc.Text() != ""
	}
	for dir, ok := range packageDoc {
		if !ok {
			t.Errorf("package %s has no comment above its package clause", dir)
		}
	}
}

func TestUndocumentedNamesAreFound(t *testing.T) {
	const src = `package p

type A struct{}

func (A) M() {}

func (A) Error() string { return "" }

// D has a comment.
func D() {}

func E() {}

type hidden struct{}

func (hidden) Exported() {}

const C = 1

// Group has one comment.
const (
	G = 1
	H = 2
)
`
	got, _, err := undocumented("p.go", []byte(src))
	if err != nil {
		t.Fatal(err)
	}
	want := []string{"p.go:3: A", "p.go:5: M", "p.go:12: E", "p.go:18: C"}
	for i := range want {
		want[i] += " has no doc comment"
	}
	if !slices.Equal(got, want) {
		t.Errorf("found %q, want %q", got, want)
	}
}

// TestNoExportedMutableTables: an exported slice, map or pointer variable can
// be changed by anybody; tables are functions or constants.
func TestNoExportedMutableTables(t *testing.T) {
	for _, f := range goFiles(t) {
		if isTest(f) {
			continue
		}
		fset := token.NewFileSet()
		parsed, err := parser.ParseFile(fset, f.path, f.text, 0)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, d := range parsed.Decls {
			g, ok := d.(*ast.GenDecl)
			if !ok || g.Tok != token.VAR {
				continue
			}
			for _, s := range g.Specs {
				v := s.(*ast.ValueSpec)
				for i, n := range v.Names {
					if n.IsExported() && mutable(v, i) {
						t.Errorf("%s:%d: exported variable %s can be changed by anybody: make it a function", f.path, fset.Position(n.Pos()).Line, n.Name)
					}
				}
			}
		}
	}
}

// mutable says whether the i-th variable of a declaration is something else
// than an error made by errors.New or fmt.Errorf.
func mutable(v *ast.ValueSpec, i int) bool {
	if i >= len(v.Values) {
		return true
	}
	call, ok := v.Values[i].(*ast.CallExpr)
	if !ok {
		return true
	}
	sel, ok := call.Fun.(*ast.SelectorExpr)
	if !ok {
		return true
	}
	pkg, ok := sel.X.(*ast.Ident)
	return !ok || !(pkg.Name == "errors" && sel.Sel.Name == "New" || pkg.Name == "fmt" && sel.Sel.Name == "Errorf")
}

// TestNoPackageForEverything: a package says what it is about.
func TestNoPackageForEverything(t *testing.T) {
	vague := []string{"util", "utils", "common", "helpers", "misc", "shared"}
	for _, f := range goFiles(t) {
		if name := filepath.Base(filepath.Dir(f.path)); slices.Contains(vague, name) {
			t.Errorf("%s: a package named %q says nothing about what it holds", f.path, name)
		}
	}
}
