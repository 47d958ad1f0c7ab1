package configs

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/go-viper/mapstructure/v2"
	"github.com/spf13/viper"
	"go.yaml.in/yaml/v3"
)

// MaxBytes is the largest case file that is read.
const MaxBytes = 1 << 20

// envPrefix begins the name of every environment variable that is read.
const envPrefix = "NULLMARK_"

// Reader turns case files into resolved cases. The order of precedence is
// defaults < file < Env < Sets. The zero Reader reads files alone.
type Reader struct {
	// Env holds NAME=value pairs, as from os.Environ. Names are NULLMARK_ and
	// the key path in capitals with _ for the dots; other names are ignored,
	// and so are empty values. A NULLMARK_ name that is no key is a fault.
	Env []string
	// Sets holds key.path=value pairs in YAML's notation, or text as it
	// stands for keys that take text. The last one for a key counts.
	Sets []string
	// Checks know the physics. They run once the keys that describe hole,
	// waves, orbit, pulse and span are free of faults, on a Case in which any
	// other faulty key has its default; they must not modify the Case. Their
	// problems are reported beside the rest.
	Checks []func(*Case) []Problem

	features map[string]bool // nil = those of this version
}

// Read reads the case file. Its error is of type Faults and holds everything
// that is wrong. File names in the case become absolute: those in the file are
// taken from the file's directory, others from the working directory.
func (r Reader) Read(path string) (*Case, error) {
	data, err := load(func(p string) (fs.File, error) { return os.Open(p) }, path)
	if err != nil {
		return nil, Faults{{File: path, Origin: OriginFile, Says: err.Error()}}
	}
	return r.Parse(path, data)
}

// Parse is Read for data already in memory; path is its name in faults, and
// its directory is the one that file names start from. data is not kept.
func (r Reader) Parse(path string, data []byte) (*Case, error) {
	root, err := parse(data)
	if err != nil {
		return nil, unparsed(path, err)
	}
	return r.resolve(path, root)
}

// unparsed makes the fault of a file that is no YAML.
func unparsed(path string, err error) Faults {
	var at *syntaxError
	line := 0
	if errors.As(err, &at) {
		line = at.line
	}
	return Faults{{File: path, Line: line, Origin: OriginFile, Says: err.Error()}}
}

// resolve is Parse after the YAML has been read.
func (r Reader) resolve(path string, root *yaml.Node) (*Case, error) {
	s := newSheet(path, func(l layer, file string) (string, error) {
		if l == fileLayer && !filepath.IsAbs(file) {
			file = filepath.Join(filepath.Dir(path), file)
		}
		return filepath.Abs(file)
	})
	s.section(root, "", fileLayer)
	if root.Kind == yaml.MappingNode {
		for _, pair := range r.Env {
			s.variable(pair)
		}
		for _, pair := range r.Sets {
			s.assignment(pair)
		}
		r.rules(s)
		if s.sound() {
			r.physics(s)
		}
	}
	if len(s.faults) > 0 {
		s.faults.sort()
		return nil, s.faults
	}
	return s.decode(), nil
}

// load reads a file of at most MaxBytes of text; its errors are sentences.
func load(open func(string) (fs.File, error), path string) ([]byte, error) {
	f, err := open(path)
	if err != nil {
		return nil, unreadable(err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, unreadable(err)
	}
	if info.IsDir() {
		return nil, errors.New("this is a directory; name a case file in it")
	}
	data, err := io.ReadAll(io.LimitReader(f, MaxBytes+1))
	if err != nil {
		return nil, unreadable(err)
	}
	return data, nil
}

func unreadable(err error) error {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return errors.New("there is no such file")
	case errors.Is(err, fs.ErrPermission):
		return errors.New("no permission to read this file")
	}
	var at *fs.PathError
	if errors.As(err, &at) {
		err = at.Err
	}
	return fmt.Errorf("the file cannot be read: %w", err)
}

// syntaxError is a fault of the YAML text itself.
type syntaxError struct {
	line   int
	reason string
}

func (e *syntaxError) Error() string { return "this is not valid YAML: " + e.reason }

var yamlLine = regexp.MustCompile(`^line (\d+): `)

// parse returns the root node of the one document in data.
func parse(data []byte) (root *yaml.Node, err error) {
	switch {
	case len(data) > MaxBytes:
		return nil, fmt.Errorf("the file is larger than %d KiB, which no case file needs to be", MaxBytes>>10)
	case bytes.IndexByte(data, 0) >= 0 || !utf8.Valid(data):
		return nil, errors.New("this is not a text file in UTF-8; a case file is YAML")
	}
	// The YAML parser reports some malformed input by a panic of its own; on a
	// user's file that is a fault of the file.
	defer func() {
		if p := recover(); p != nil {
			root, err = nil, &syntaxError{reason: fmt.Sprint(p)}
		}
	}()
	decoder := yaml.NewDecoder(bytes.NewReader(data))
	var document yaml.Node
	if err := decoder.Decode(&document); err != nil && !errors.Is(err, io.EOF) {
		return nil, syntax(err, data)
	}
	if document.Kind == 0 || isNull(document.Content[0]) {
		return nil, errors.New("the file is empty; a case needs at least an orbit or a pulse")
	}
	var second yaml.Node
	if err := decoder.Decode(&second); err == nil {
		return nil, &syntaxError{line: second.Line, reason: "a case file holds one document, and here a second one begins"}
	} else if !errors.Is(err, io.EOF) {
		return nil, syntax(err, data)
	}
	return document.Content[0], nil
}

// structural are the errors of the YAML library's parser; their lines count
// from 0 (and 0 itself is left out), where those of its scanner count from 1.
var structural = regexp.MustCompile(`^did not find expected (key|'-' indicator|',' or '[\]}]'|node content|<document start>)$`)

func syntax(err error, data []byte) error {
	e := &syntaxError{reason: strings.TrimPrefix(err.Error(), "yaml: ")}
	if at := yamlLine.FindStringSubmatch(e.reason); at != nil {
		e.line, _ = strconv.Atoi(at[1])
		e.reason = strings.TrimPrefix(e.reason, at[0])
	}
	if structural.MatchString(e.reason) {
		last := bytes.Count(bytes.TrimSuffix(data, []byte("\n")), []byte("\n")) + 1
		e.line = min(e.line+1, last)
	}
	return e
}

// variable returns the environment variable of a key path.
func variable(path string) string {
	return envPrefix + strings.ToUpper(strings.ReplaceAll(path, ".", "_"))
}

// variable reads one NAME=value pair of the environment.
func (s *sheet) variable(pair string) {
	called, value, _ := strings.Cut(pair, "=")
	if !strings.HasPrefix(called, envPrefix) || value == "" {
		return
	}
	var names []string
	for _, p := range everyPath() {
		if called == variable(p) {
			s.assign(p, value, environmentLayer)
			return
		}
		names = append(names, variable(p))
	}
	sentence := show(called) + " does not stand for a key"
	// Only the part behind the prefix counts as misspelt.
	for i := range names {
		names[i] = strings.TrimPrefix(names[i], envPrefix)
	}
	if near := nearest(strings.TrimPrefix(called, envPrefix), names); near != "" {
		sentence += "; did you mean " + envPrefix + near + "?"
	} else {
		sentence += "; names are " + envPrefix + " and a key path, such as " + variable("orbit.radius")
	}
	s.say(environmentLayer, 0, strings.ToLower(strings.TrimPrefix(called, envPrefix)), value, sentence)
}

// assignment reads one key.path=value pair.
func (s *sheet) assignment(pair string) {
	path, value, ok := strings.Cut(pair, "=")
	path = strings.TrimSpace(path)
	if !ok || path == "" {
		s.say(setLayer, 0, path, "", "\""+show(pair)+"\" is not a setting; write key.path=value, such as orbit.radius=6")
		return
	}
	s.assign(path, value, setLayer)
}

// assign reads a value that was given as text outside the file.
func (s *sheet) assign(path, value string, l layer) {
	row := find(path)
	literal := row != nil && (row.form == text || row.form == choice || row.form == pathForm)
	n := &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: value}
	if !literal || value == "" {
		var err error
		if n, err = parse([]byte(value)); err != nil {
			n = &yaml.Node{} // nothing
			if strings.TrimSpace(value) != "" {
				n = &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: value, Style: yaml.DoubleQuotedStyle}
			}
		}
	}
	s.node(n, &yaml.Node{}, parent(path), name(path), l)
}

// physical reports whether the physics checks look at a key path.
func physical(path string) bool {
	first, _, _ := strings.Cut(base(path), ".")
	switch first {
	case "hole", "waves", "orbit", "pulse", "span":
		return true
	}
	return false
}

// sound reports whether the keys that the physics needs are there and free of
// faults, under their own names or under misspelt ones.
func (s *sheet) sound() bool {
	for _, f := range s.faults {
		if physical(f.Key) {
			return false
		}
	}
	for path := range s.meant {
		if physical(path) {
			return false
		}
	}
	return true
}

// physics runs the checks that were supplied and places their problems.
func (r Reader) physics(s *sheet) {
	for _, check := range r.Checks {
		for _, p := range check(s.decode()) {
			value := fmt.Sprint(p.Value)
			if x, ok := p.Value.(float64); ok {
				value = number(x)
			}
			e, typed := s.effective(base(p.Key))
			if !typed {
				value += " (the default)"
				for up := parent(p.Key); up != "" && e.line == 0; up = parent(up) {
					e.line = s.present[up].line
				}
			}
			s.refuse(e.layer, e.line, p.Key, value, p.Want)
		}
	}
}

// decode merges defaults < file < environment < --set and fills a new Case.
// The values are of the Case's own types already (leaf), so that viper has
// nothing to convert, and maps never reach it, whose keys it would fold to
// lower case.
func (s *sheet) decode() *Case {
	v := viper.NewWithOptions(viper.KeyDelimiter("."))
	for _, k := range schema {
		if preset := s.preset(&k); preset != nil {
			v.SetDefault(k.path, preset)
		}
	}
	for l := range layers {
		for _, k := range schema {
			e, ok := s.values[l][k.path]
			if !ok {
				continue
			}
			if l > fileLayer {
				v.Set(k.path, e.value)
			} else if err := v.MergeConfigMap(nest(k.path, e.value)); err != nil {
				panic("configs: merging " + k.path + ": " + err.Error())
			}
		}
	}
	c := new(Case)
	if err := v.UnmarshalExact(c, func(d *mapstructure.DecoderConfig) {
		d.WeaklyTypedInput = false
		d.DecodeHook = nil
	}); err != nil {
		panic("configs: the schema and the Case disagree: " + err.Error())
	}
	c.Waves.Modes = append([][2]int(nil), c.Waves.Modes...)
	if n := len(c.Waves.Modes); n > 0 {
		sortModes(c.Waves.Modes)
		c.Waves.LMax = c.Waves.Modes[n-1][0]
	}
	return c
}

// nest returns {a: {b: value}} for the path a.b.
func nest(path string, value any) map[string]any {
	first, rest, deeper := strings.Cut(path, ".")
	if !deeper {
		return map[string]any{first: value}
	}
	return map[string]any{first: nest(rest, value)}
}
