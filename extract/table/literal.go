package table

import (
	"fmt"
	"strconv"
)

// literal parses the small part of Python's literals that an npy header is
// written in: strings, integers, True, False, None, tuples, lists and
// dictionaries with string keys. Values come back as string, int64, bool, nil,
// []any and map[string]any. Nothing is evaluated.
type literal struct {
	s     string
	i     int
	depth int
}

func parseLiteral(s string) (any, error) {
	p := &literal{s: s}
	v, err := p.value()
	if err != nil {
		return nil, err
	}
	p.space()
	if p.i != len(p.s) {
		return nil, fmt.Errorf("something follows the dictionary")
	}
	return v, nil
}

func (p *literal) space() {
	for p.i < len(p.s) && (p.s[p.i] == ' ' || p.s[p.i] == '\n' || p.s[p.i] == '\t' || p.s[p.i] == '\r') {
		p.i++
	}
}

func (p *literal) peek() byte {
	p.space()
	if p.i < len(p.s) {
		return p.s[p.i]
	}
	return 0
}

func (p *literal) value() (any, error) {
	if p.depth++; p.depth > 8 {
		return nil, fmt.Errorf("nested too deeply")
	}
	defer func() { p.depth-- }()
	switch c := p.peek(); {
	case c == '\'' || c == '"':
		return p.str()
	case c == '(':
		return p.list(')')
	case c == '[':
		return p.list(']')
	case c == '{':
		return p.dict()
	case c == '-' || c >= '0' && c <= '9':
		return p.integer()
	case c >= 'A' && c <= 'Z':
		from := p.i
		for p.i < len(p.s) && (p.s[p.i]|0x20) >= 'a' && (p.s[p.i]|0x20) <= 'z' {
			p.i++
		}
		switch w := p.s[from:p.i]; w {
		case "True":
			return true, nil
		case "False":
			return false, nil
		case "None":
			return nil, nil
		default:
			return nil, fmt.Errorf("unknown word %q", w)
		}
	case c == 0:
		return nil, fmt.Errorf("it ends too early")
	default:
		return nil, fmt.Errorf("unexpected character %q", c)
	}
}

func (p *literal) str() (string, error) {
	quote := p.s[p.i]
	p.i++
	from := p.i
	for ; p.i < len(p.s); p.i++ {
		switch p.s[p.i] {
		case '\\':
			return "", fmt.Errorf("escaped characters are not read")
		case quote:
			s := p.s[from:p.i]
			p.i++
			return s, nil
		}
	}
	return "", fmt.Errorf("a string is not closed")
}

func (p *literal) integer() (int64, error) {
	from := p.i
	if p.s[p.i] == '-' {
		p.i++
	}
	for p.i < len(p.s) && p.s[p.i] >= '0' && p.s[p.i] <= '9' {
		p.i++
	}
	n, err := strconv.ParseInt(p.s[from:p.i], 10, 64)
	if err != nil {
		return 0, fmt.Errorf("%q is no size", p.s[from:p.i])
	}
	if p.i < len(p.s) && p.s[p.i] == 'L' { // written by Python 2
		p.i++
	}
	return n, nil
}

func (p *literal) list(end byte) ([]any, error) {
	p.i++
	out := []any{}
	for p.peek() != end {
		v, err := p.value()
		if err != nil {
			return nil, err
		}
		out = append(out, v)
		switch p.peek() {
		case ',':
			p.i++
		case end:
		default:
			return nil, fmt.Errorf("a comma is missing in a list")
		}
	}
	p.i++
	return out, nil
}

func (p *literal) dict() (map[string]any, error) {
	p.i++
	out := map[string]any{}
	for p.peek() != '}' {
		if c := p.peek(); c != '\'' && c != '"' {
			return nil, fmt.Errorf("a key of the dictionary is no string")
		}
		k, err := p.str()
		if err != nil {
			return nil, err
		}
		if p.peek() != ':' {
			return nil, fmt.Errorf("a colon is missing after the key %q", k)
		}
		p.i++
		v, err := p.value()
		if err != nil {
			return nil, err
		}
		if _, ok := out[k]; ok {
			return nil, fmt.Errorf("the key %q stands there twice", k)
		}
		out[k] = v
		switch p.peek() {
		case ',':
			p.i++
		case '}':
		default:
			return nil, fmt.Errorf("a comma is missing in the dictionary")
		}
	}
	p.i++
	return out, nil
}
