package configs

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"reflect"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"
)

// YAML writes the resolved case in the order of the schema, with only the keys
// that belong to it. Reading it again gives an equal Case, and equal Cases
// give equal bytes. The slice is the caller's.
func (c *Case) YAML() ([]byte, error) {
	root := &yaml.Node{Kind: yaml.MappingNode}
	made := map[string]*yaml.Node{"": root}
	set := setting{equation: c.Waves.Equation}
	if c.Orbit != nil {
		set.kind = c.Orbit.Kind
	}
	for i := range schema {
		k := &schema[i]
		value, there := c.at(k.path)
		if !there || !c.carries(k, set) {
			continue
		}
		n := k.node(value)
		if n == nil {
			continue
		}
		in := section(made, parent(k.path))
		in.Content = append(in.Content, textNode(name(k.path)), n)
	}
	var b bytes.Buffer
	e := yaml.NewEncoder(&b)
	e.SetIndent(2)
	if err := e.Encode(root); err != nil {
		return nil, fmt.Errorf("configs: writing the case: %w", err)
	}
	if err := e.Close(); err != nil {
		return nil, fmt.Errorf("configs: writing the case: %w", err)
	}
	return b.Bytes(), nil
}

// Hash returns 16 hexadecimal digits that name the content of the case: the
// start of the SHA-256 of YAML. It panics on a Case that Reader cannot have
// made.
func (c *Case) Hash() string {
	data, err := c.YAML()
	if err != nil {
		panic(err.Error())
	}
	sum := sha256.Sum256(data)
	return hex.EncodeToString(sum[:8])
}

// carries reports whether the key stands in the resolved case.
func (c *Case) carries(k *key, set setting) bool {
	switch k.path {
	case "waves.l_max":
		return len(c.Waves.Modes) == 0
	case "waves.modes":
		return len(c.Waves.Modes) > 0
	case "align":
		return c.Model != nil
	}
	return k.suits(set)
}

// at returns the field at a key path, and false where a section or the value
// is nil.
func (c *Case) at(path string) (reflect.Value, bool) {
	v := reflect.ValueOf(c).Elem()
	for _, part := range strings.Split(path, ".") {
		field := -1
		for i := range v.NumField() {
			if v.Type().Field(i).Tag.Get("mapstructure") == part {
				field = i
			}
		}
		if field < 0 {
			panic("configs: the Case has no field for " + path)
		}
		v = v.Field(field)
		if v.Kind() == reflect.Pointer {
			if v.IsNil() {
				return v, false
			}
			v = v.Elem()
		}
	}
	return v, true
}

// section returns the node of a section, made on first use.
func section(made map[string]*yaml.Node, path string) *yaml.Node {
	if n, ok := made[path]; ok {
		return n
	}
	n := &yaml.Node{Kind: yaml.MappingNode}
	up := section(made, parent(path))
	up.Content = append(up.Content, textNode(name(path)), n)
	made[path] = n
	return n
}

// node writes a value, nil where an empty one means that it was not given.
func (k *key) node(v reflect.Value) *yaml.Node {
	switch k.form {
	case text, pathForm, choice:
		if v.String() == "" {
			return nil
		}
		return textNode(v.String())
	case real:
		return plainNode(number(v.Float()))
	case whole:
		return plainNode(strconv.FormatInt(v.Int(), 10))
	}
	switch x := v.Interface().(type) {
	case []string:
		n := flow(yaml.SequenceNode)
		for _, w := range x {
			n.Content = append(n.Content, textNode(w))
		}
		return n
	case [][2]int:
		n := flow(yaml.SequenceNode)
		for _, lm := range x {
			n.Content = append(n.Content, flow(yaml.SequenceNode, plainNode(strconv.Itoa(lm[0])), plainNode(strconv.Itoa(lm[1]))))
		}
		return n
	case Columns:
		n := flow(yaml.MappingNode)
		for _, q := range quantities {
			if called := *x.at(q); called != "" {
				n.Content = append(n.Content, textNode(q), textNode(called))
			}
		}
		if len(n.Content) == 0 {
			return nil
		}
		return n
	case []ModelMode:
		n := &yaml.Node{Kind: yaml.MappingNode}
		for _, mode := range x {
			value := textNode(mode.Arrays[0])
			if len(mode.Arrays) == 2 {
				value = flow(yaml.SequenceNode, value, textNode(mode.Arrays[1]))
			}
			n.Content = append(n.Content, textNode(fmt.Sprintf("%d,%d", mode.L, mode.M)), value)
		}
		return n
	case Align:
		if !x.Windowed {
			return textNode("none")
		}
		ends := flow(yaml.SequenceNode, plainNode(number(x.From)), plainNode(number(x.To)))
		return flow(yaml.MappingNode, textNode("window"), ends)
	}
	panic("configs: no way to write " + k.path)
}

func textNode(s string) *yaml.Node {
	return &yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: s}
}

func plainNode(s string) *yaml.Node {
	return &yaml.Node{Kind: yaml.ScalarNode, Value: s}
}

func flow(kind yaml.Kind, content ...*yaml.Node) *yaml.Node {
	return &yaml.Node{Kind: kind, Style: yaml.FlowStyle, Content: content}
}

// Tree returns the resolved case as plain maps, lists and scalars, as result.json
// stores it. The tree is the caller's.
func (c *Case) Tree() (map[string]any, error) {
	data, err := c.YAML()
	if err != nil {
		return nil, err
	}
	var tree map[string]any
	if err := yaml.Unmarshal(data, &tree); err != nil {
		return nil, fmt.Errorf("configs: writing the case: %w", err)
	}
	return tree, nil
}
