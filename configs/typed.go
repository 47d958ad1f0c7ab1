package configs

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"go.yaml.in/yaml/v3"
)

// layer is a source of values; a later one beats an earlier one.
type layer int

const (
	fileLayer layer = iota
	environmentLayer
	setLayer
	layers
)

func (l layer) origin() string {
	return [...]string{OriginFile, OriginEnvironment, OriginSet}[l]
}

// entry is a value as typed: parsed, within its own limits, not yet compared
// with other keys.
type entry struct {
	value any // of the Go type that the Case holds
	shown string
	line  int    // 0 outside the file
	items []item // of a list of modes, in the order of value
	layer layer
}

// item is where one item of a list was typed.
type item struct {
	key  string // such as waves.modes[1]
	line int
}

// sheet collects what was typed, layer by layer, and every fault on the way.
type sheet struct {
	file    string
	values  [layers]map[string]entry
	present map[string]entry // sections that were typed, even empty ones
	bad     map[string]bool  // keys whose typed value was refused
	meant   map[string]bool  // keys that a misspelt one was taken for
	faults  Faults
	resolve func(layer, string) (string, error) // file names to absolute ones
}

func newSheet(file string, resolve func(layer, string) (string, error)) *sheet {
	s := &sheet{file: file, present: map[string]entry{}, bad: map[string]bool{}, meant: map[string]bool{}, resolve: resolve}
	for i := range s.values {
		s.values[i] = map[string]entry{}
	}
	return s
}

// effective returns the value that wins for a key, and whether there is one.
func (s *sheet) effective(path string) (entry, bool) {
	for l := layers - 1; l >= 0; l-- {
		if e, ok := s.values[l][path]; ok {
			return e, true
		}
	}
	return entry{}, false
}

// refuse adds "KEY is VALUE, but must be WANT".
func (s *sheet) refuse(l layer, line int, key, value, want string) {
	s.faults = append(s.faults, Fault{File: s.file, Line: line, Key: key, Value: show(value), Want: want, Origin: l.origin()})
	s.bad[base(key)] = true
}

// say adds a sentence of its own.
func (s *sheet) say(l layer, line int, key, value, sentence string) {
	s.faults = append(s.faults, Fault{File: s.file, Line: line, Key: key, Value: show(value), Says: sentence, Origin: l.origin()})
	s.bad[base(key)] = true
}

// base drops an index from a key path: waves.modes[1] → waves.modes.
func base(key string) string {
	before, _, _ := strings.Cut(key, "[")
	return before
}

// line returns the line of a node where it has a meaning for the reader.
func (l layer) line(n *yaml.Node) int {
	if l == fileLayer {
		return n.Line
	}
	return 0
}

// section reads the mapping n as the section prefix ("" = the whole case).
func (s *sheet) section(n *yaml.Node, prefix string, l layer) {
	if isNull(n) {
		return
	}
	if n.Kind != yaml.MappingNode {
		if prefix == "" {
			s.say(l, l.line(n), "", describe(n), "the file holds "+describe(n)+", but must hold keys and values such as title, hole, waves, orbit")
			return
		}
		s.refuse(l, l.line(n), prefix, describe(n), "a section with keys such as "+strings.Join(firstFew(children(prefix)), ", "))
		return
	}
	seen := map[string]int{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		k, v := n.Content[i], n.Content[i+1]
		if k.Kind != yaml.ScalarNode {
			s.say(l, l.line(k), prefix, describe(k), "a key must be a word, not "+describe(k))
			continue
		}
		path := join(prefix, k.Value)
		if first, twice := seen[k.Value]; twice {
			sentence := show(path) + " is given twice; keep one"
			if l == fileLayer {
				sentence = fmt.Sprintf("%s is given twice, first in line %d; keep one", show(path), first)
			}
			s.say(l, l.line(k), path, describe(v), sentence)
			continue
		}
		seen[k.Value] = k.Line
		s.node(v, k, prefix, k.Value, l)
	}
}

// node reads the value v of the key or section called word below prefix; k is
// where the word stands.
func (s *sheet) node(v, k *yaml.Node, prefix, word string, l layer) {
	path := join(prefix, word)
	row := find(path)
	switch {
	case strings.Contains(word, ".") || row == nil && !slices.Contains(sections, path):
		s.unknown(l, l.line(k), path, prefix, word, describe(v))
	case row == nil:
		if _, ok := s.present[path]; !ok || l > fileLayer {
			s.present[path] = entry{line: l.line(k), layer: l}
		}
		s.section(v, path, l)
	default:
		s.leaf(row, v, l)
	}
}

// unknown reports a key that does not exist, with the one that was meant.
func (s *sheet) unknown(l layer, line int, path, prefix, word, value string) {
	if word == "" {
		path += `""`
	}
	sentence := show(path) + " is not a known key"
	if find(path) != nil { // written flat
		s.meant[path] = true
	}
	if len(s.faults) > mostShown { // nobody will read a guess
		s.say(l, line, path, value, sentence)
		return
	}
	if meant := guess(prefix, word); meant != "" {
		sentence += "; did you mean " + meant + "?"
		s.meant[meant] = true
	} else if known := children(prefix); prefix != "" && len(known) > 0 {
		sentence += "; " + prefix + " has " + strings.Join(known, ", ")
	} else {
		sentence += "; the case has " + strings.Join(children(""), ", ")
	}
	s.say(l, line, path, value, sentence)
}

// guess returns the path that was most likely meant by word below prefix: the
// nearest neighbour, else a key or section that stands elsewhere under that
// very name.
func guess(prefix, word string) string {
	if strings.Contains(word, ".") { // written flat: orbit.radius: 10
		if full := join(prefix, word); find(full) != nil {
			return full[:strings.LastIndexByte(full, '.')] + ": {" + name(full) + ": …}"
		}
		return ""
	}
	if near := nearest(word, children(prefix)); near != "" {
		return join(prefix, near)
	}
	for _, p := range everyPath() {
		if strings.EqualFold(name(p), word) {
			return p
		}
	}
	var names []string
	for _, p := range everyPath() {
		names = append(names, name(p))
	}
	if near := nearest(word, names); len(near) > 3 {
		return everyPath()[slices.Index(names, near)]
	}
	return ""
}

// everyPath lists all sections and keys.
func everyPath() []string {
	list := slices.Clone(sections)
	for _, k := range schema {
		list = append(list, k.path)
	}
	return list
}

// children lists the names of what stands directly in a section.
func children(prefix string) []string {
	var list []string
	for _, k := range schema {
		rest, ok := strings.CutPrefix(k.path, prefix+".")
		if prefix == "" {
			rest, ok = k.path, true
		}
		first, _, _ := strings.Cut(rest, ".")
		if ok && !slices.Contains(list, first) {
			list = append(list, first)
		}
	}
	return list
}

func firstFew(list []string) []string { return list[:min(len(list), 4)] }

func join(prefix, word string) string {
	if prefix == "" {
		return word
	}
	return prefix + "." + word
}

// leaf parses the value of one key and keeps it, or reports it.
func (s *sheet) leaf(k *key, n *yaml.Node, l layer) {
	for p := parent(k.path); p != ""; p = parent(p) {
		if _, ok := s.present[p]; !ok {
			s.present[p] = entry{line: l.line(n), layer: l}
		}
	}
	line := l.line(n)
	if isNull(n) {
		s.say(l, line, k.path, "", k.path+" has no value; it must be "+k.allowed())
		return
	}
	e := entry{shown: describe(n), line: line, layer: l}
	var ok bool
	switch k.form {
	case text:
		e.value, ok = word(n)
	case pathForm:
		var typed string
		if typed, ok = word(n); ok {
			e.value = typed
			if !slices.Contains(k.choices, typed) {
				absolute, err := s.resolve(l, typed)
				e.value, ok = absolute, err == nil
			}
		}
	case choice:
		typed, isWord := word(n)
		e.value, ok = typed, isWord && slices.Contains(k.choices, typed)
		if !ok {
			want := k.allowed()
			if near := nearest(typed, k.choices); near != "" {
				want += " (did you mean " + near + "?)"
			}
			s.refuse(l, line, k.path, e.shown, want)
			return
		}
	case subset:
		e.value, ok = someOf(n, k.choices)
	case real:
		var x float64
		x, ok = decimal(n)
		ok = ok && (k.bounds.hold(x) && !math.IsInf(x, 0) || math.IsInf(x, 1) && len(k.infinite) > 0)
		e.value = x
	case whole:
		var x float64
		x, ok = decimal(n)
		ok = ok && x == math.Trunc(x) && k.bounds.hold(x) && !(k.even && math.Mod(x, 2) != 0)
		if ok {
			e.value = int(x)
		}
	case pairs:
		s.pairs(k, n, l, e)
		return
	case columns:
		e.value, ok = columnNames(n)
	case arrays:
		e.value, ok = modelModes(n)
	case shift:
		e.value, ok = alignment(n)
	}
	if !ok {
		s.refuse(l, line, k.path, e.shown, k.allowed())
		return
	}
	s.values[l][k.path] = e
}

// pairs parses a list of modes; each faulty item is reported on its own.
func (s *sheet) pairs(k *key, n *yaml.Node, l layer, e entry) {
	if n.Kind != yaml.SequenceNode || len(n.Content) == 0 {
		s.refuse(l, e.line, k.path, e.shown, k.allowed())
		return
	}
	var list [][2]int
	seen := map[[2]int]bool{}
	for i, node := range n.Content {
		at := fmt.Sprintf("%s[%d]", k.path, i)
		lm, ok := pair(node)
		switch {
		case !ok || lm[0] < 0 || lm[0] > maxL:
			s.refuse(l, l.line(node), at, describe(node), fmt.Sprintf("a pair [l, m] of whole numbers with |m| <= l <= %d", maxL))
		case max(lm[1], -lm[1]) > lm[0]:
			s.refuse(l, l.line(node), at, describe(node), "a pair [l, m] with |m| <= l")
		case seen[lm]:
			s.refuse(l, l.line(node), at, describe(node), "a mode that is not in the list already")
		default:
			seen[lm] = true
			list = append(list, lm)
			e.items = append(e.items, item{at, l.line(node)})
		}
	}
	// Kept even when some items are faulty: the others have rules to meet, too.
	e.value = list
	s.values[l][k.path] = e
}

func pair(n *yaml.Node) (lm [2]int, ok bool) {
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		return lm, false
	}
	for i := range lm {
		x, ok := decimal(n.Content[i])
		if !ok || x != math.Trunc(x) || math.Abs(x) > 1e6 {
			return lm, false
		}
		lm[i] = int(x)
	}
	return lm, true
}

// plainNumber is a decimal number as people write it. YAML would also take
// 010 for eight, 1_0 for ten and 0x10 for sixteen; a case file does not.
var plainNumber = regexp.MustCompile(`^[-+]?((0|[1-9][0-9]*)(\.[0-9]*)?|\.[0-9]+)([eE][-+]?[0-9]+)?$`)

// decimal reads an unquoted number, or .inf. Negative zero becomes zero.
func decimal(n *yaml.Node) (float64, bool) {
	if n.Kind != yaml.ScalarNode || n.Style != 0 {
		return 0, false
	}
	switch n.Value {
	case ".inf", ".Inf", ".INF", "+.inf", "+.Inf", "+.INF":
		return math.Inf(1), true
	}
	if !plainNumber.MatchString(n.Value) {
		return 0, false
	}
	x, err := strconv.ParseFloat(n.Value, 64)
	if x == 0 {
		x = 0 // drops the sign
	}
	return x, err == nil
}

// word reads a short line of text.
func word(n *yaml.Node) (string, bool) {
	if n.Kind != yaml.ScalarNode || n.ShortTag() != "!!str" || n.Value == "" || utf8.RuneCountInString(n.Value) > maxText {
		return "", false
	}
	for _, r := range n.Value {
		if !unicode.IsPrint(r) {
			return "", false
		}
	}
	return n.Value, true
}

// someOf reads a list of distinct choices; the result is in their order.
func someOf(n *yaml.Node, choices []string) ([]string, bool) {
	if n.Kind != yaml.SequenceNode {
		return nil, false
	}
	typed := map[string]bool{}
	for _, item := range n.Content {
		w, ok := word(item)
		if !ok || typed[w] || !slices.Contains(choices, w) {
			return nil, false
		}
		typed[w] = true
	}
	list := []string{}
	for _, c := range choices {
		if typed[c] {
			list = append(list, c)
		}
	}
	return list, true
}

func columnNames(n *yaml.Node) (c Columns, ok bool) {
	if n.Kind != yaml.MappingNode {
		return c, false
	}
	for i := 0; i+1 < len(n.Content); i += 2 {
		quantity := n.Content[i].Value
		called, ok := word(n.Content[i+1])
		if !ok || !slices.Contains(quantities, quantity) || *c.at(quantity) != "" {
			return c, false
		}
		*c.at(quantity) = called
	}
	return c, true
}

var modeName = regexp.MustCompile(`^([0-9]{1,3}),\s?(-?[0-9]{1,3})$`)

func modelModes(n *yaml.Node) (list []ModelMode, ok bool) {
	if n.Kind != yaml.MappingNode || len(n.Content) == 0 {
		return nil, false
	}
	seen := map[[2]int]ModelMode{}
	var order [][2]int
	for i := 0; i+1 < len(n.Content); i += 2 {
		parts := modeName.FindStringSubmatch(n.Content[i].Value)
		if parts == nil {
			return nil, false
		}
		l, _ := strconv.Atoi(parts[1])
		m, _ := strconv.Atoi(parts[2])
		if _, twice := seen[[2]int{l, m}]; twice || l > maxL || max(m, -m) > l {
			return nil, false
		}
		items := []*yaml.Node{n.Content[i+1]}
		if items[0].Kind == yaml.SequenceNode {
			if items = items[0].Content; len(items) != 2 {
				return nil, false
			}
		}
		mode := ModelMode{L: l, M: m}
		for _, item := range items {
			called, ok := word(item)
			if !ok {
				return nil, false
			}
			mode.Arrays = append(mode.Arrays, called)
		}
		seen[[2]int{l, m}] = mode
		order = append(order, [2]int{l, m})
	}
	sortModes(order)
	for _, lm := range order {
		list = append(list, seen[lm])
	}
	return list, true
}

func alignment(n *yaml.Node) (a Align, ok bool) {
	if w, isWord := word(n); isWord {
		return a, w == "none"
	}
	if n.Kind != yaml.MappingNode || len(n.Content) != 2 || n.Content[0].Value != "window" {
		return a, false
	}
	ends := n.Content[1]
	if ends.Kind != yaml.SequenceNode || len(ends.Content) != 2 {
		return a, false
	}
	from, ok1 := decimal(ends.Content[0])
	to, ok2 := decimal(ends.Content[1])
	return Align{Windowed: true, From: from, To: to}, ok1 && ok2 && from < to && !math.IsInf(to, 0)
}

func isNull(n *yaml.Node) bool {
	return n.Kind == 0 || n.Kind == yaml.ScalarNode && n.ShortTag() == "!!null"
}

// describe writes a value as it was typed, or says what it is.
func describe(n *yaml.Node) string {
	switch n.Kind {
	case yaml.ScalarNode:
		if n.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle|yaml.LiteralStyle|yaml.FoldedStyle) != 0 {
			return strconv.Quote(n.Value)
		}
		if isNull(n) {
			return "nothing"
		}
		return n.Value
	case yaml.MappingNode:
		return "a mapping"
	case yaml.AliasNode:
		return "an alias"
	case yaml.SequenceNode:
		const most = 6
		var items []string
		for i, item := range n.Content {
			if item.Kind != yaml.ScalarNode || i == most {
				return "a list"
			}
			items = append(items, describe(item))
		}
		return "[" + strings.Join(items, ", ") + "]"
	}
	return "nothing"
}
