package store

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"reflect"
	"slices"
	"strings"

	"nullmark/extract/result"
)

// prepare gives a shallow copy of r as it is written: the schema named, no null
// where a list or table belongs, infinities of the case spelt as in YAML. Every
// number is checked to be finite.
func prepare(r *result.Result) (*result.Result, error) {
	out := *r
	if out.Schema == "" {
		out.Schema = result.Schema
	}
	if out.Schema != result.Schema {
		return nil, &Invalid{File: resultFile, Path: "schema", Problem: fmt.Sprintf("is %q, not %q", out.Schema, result.Schema)}
	}
	if out.Conventions == nil {
		out.Conventions = map[string]string{}
	}
	if out.Rungs == nil {
		out.Rungs = []result.Rung{}
	}
	if out.Warnings == nil {
		out.Warnings = []string{}
	}
	out.Case = spellInfinity(out.Case)
	if path, x, ok := notFinite(reflect.ValueOf(out), ""); ok {
		return nil, &Invalid{File: resultFile, Path: path, Problem: fmt.Sprintf("is %v, which JSON does not have", x)}
	}
	return &out, nil
}

// encodeJSON writes v indented, with a newline at the end. Maps come in the
// order of their keys, numbers with the digits that give back the same float64.
func encodeJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}

// spellInfinity copies the maps and lists of a decoded YAML tree with ±infinity
// (an infall from infinity) replaced by its YAML spelling, as JSON has none.
// Other values are returned as they are.
func spellInfinity(v any) any {
	switch v := v.(type) {
	case map[string]any:
		out := make(map[string]any, len(v))
		for k, x := range v {
			out[k] = spellInfinity(x)
		}
		return out
	case []any:
		out := make([]any, len(v))
		for i, x := range v {
			out[i] = spellInfinity(x)
		}
		return out
	case float64:
		if math.IsInf(v, 1) {
			return ".inf"
		}
		if math.IsInf(v, -1) {
			return "-.inf"
		}
	}
	return v
}

// notFinite finds the first NaN or infinity in v and its path in JSON's names.
func notFinite(v reflect.Value, path string) (string, float64, bool) {
	switch v.Kind() {
	case reflect.Float32, reflect.Float64:
		x := v.Float()
		return path, x, math.IsNaN(x) || math.IsInf(x, 0)
	case reflect.Pointer, reflect.Interface:
		if !v.IsNil() {
			return notFinite(v.Elem(), path)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			f := v.Type().Field(i)
			if !f.IsExported() && !f.Anonymous {
				continue
			}
			name, _, _ := strings.Cut(f.Tag.Get("json"), ",")
			if name == "-" {
				continue
			}
			if p, x, bad := notFinite(v.Field(i), join(path, or(name, f.Name))); bad {
				return p, x, true
			}
		}
	case reflect.Slice, reflect.Array:
		for i := range v.Len() {
			if p, x, bad := notFinite(v.Index(i), fmt.Sprintf("%s[%d]", path, i)); bad {
				return p, x, true
			}
		}
	case reflect.Map:
		keys := v.MapKeys()
		slices.SortFunc(keys, func(a, b reflect.Value) int { return strings.Compare(fmt.Sprint(a), fmt.Sprint(b)) })
		for _, k := range keys {
			if p, x, bad := notFinite(v.MapIndex(k), join(path, fmt.Sprint(k))); bad {
				return p, x, true
			}
		}
	}
	return "", 0, false
}

func join(path, name string) string {
	if path == "" {
		return name
	}
	return path + "." + name
}
