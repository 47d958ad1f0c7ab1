package configs

import (
	"fmt"
	"reflect"
	"strings"
)

// Reference renders the table of all keys as Markdown: path, type with its
// limits, default, where it belongs, meaning. It follows the schema, so that a
// document that holds it cannot fall behind.
func Reference() string {
	var b strings.Builder
	b.WriteString("| key | value | default | belongs to | meaning |\n|---|---|---|---|---|\n")
	for i := range schema {
		k := &schema[i]
		fmt.Fprintf(&b, "| `%s` | %s | %s | %s | %s |\n", k.path, cell(k.brief()), k.defaultWords(), k.place(), cell(k.doc))
	}
	return b.String()
}

// cell keeps a text inside its table cell.
func cell(s string) string { return strings.ReplaceAll(s, "|", `\|`) }

// brief is allowed without the hint, shorter where the reader sees a table.
func (k *key) brief() string {
	switch k.form {
	case text:
		return "text"
	case choice, subset:
		words := "`" + strings.Join(k.choices, "`, `") + "`"
		if k.form == subset {
			return "list of " + words
		}
		return words
	case pathForm:
		if len(k.choices) > 0 {
			return "`" + strings.Join(k.choices, "`, `") + "` or a file"
		}
		return "file"
	}
	plain := *k
	plain.hint = ""
	return plain.allowed()
}

func (k *key) defaultWords() string {
	switch {
	case k.path == "waves.equation":
		return "`master`, with spin `teukolsky`"
	case k.form == subset:
		return "all"
	case len(k.need) > 0 && len(k.need) < len(k.of):
		return "`" + k.node(reflect.ValueOf(k.preset)).Value + "`; required for " + oneOf(k.need)
	case len(k.need) > 0:
		return "required"
	case k.preset != nil:
		return "`" + k.node(reflect.ValueOf(k.preset)).Value + "`"
	case strings.HasPrefix(k.path, "numerics."), strings.HasPrefix(k.path, "span."):
		return "chosen by the tool"
	}
	return ""
}

// place says which orbits and which equation have the key.
func (k *key) place() string {
	s := strings.Join(k.of, ", ")
	if k.equation != "" {
		if s != "" {
			s += "; "
		}
		s += k.equation
	}
	return s
}
