package table

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
)

const (
	maxLine    = 1 << 20 // bytes of one line of text
	maxColumns = 4096
)

// textColumn is a column of a text file, all of which is read at once.
type textColumn struct {
	t *Table
	x []float64
}

func (c *textColumn) load(*Table, Column) ([]float64, []complex128, error) {
	return append([]float64(nil), c.x...), nil, nil
}

// readText reads delimited text: columns separated by commas, semicolons, tabs
// or blanks (whichever the first line of numbers shows), lines starting with #
// for comments. Names stand in a line of their own above the numbers or in the
// last comment line that has as many entries as there are columns; units stand
// in brackets behind a name, or in such a comment line of their own. Without
// names the columns are called 0, 1, 2, ….
func (t *Table) readText(r io.Reader) error {
	sc := bufio.NewScanner(r)
	sc.Buffer(make([]byte, 64<<10), maxLine)
	var (
		comments []string
		heading  string
		headline int
		split    func([]byte) [][]byte
		cols     []*textColumn
		names    []string
		units    []string
		line     int
	)
	for sc.Scan() {
		line++
		b := sc.Bytes()
		if line == 1 {
			b = bytes.TrimPrefix(b, []byte("\xef\xbb\xbf"))
		}
		if bytes.IndexByte(b, 0) >= 0 {
			return fault(t.file, "", Format, "write it as npz, npy or csv", "is neither an archive of arrays nor text (line %d holds a zero byte)", line)
		}
		b = bytes.TrimRight(b, " \r")
		trimmed := bytes.TrimSpace(b)
		if len(trimmed) == 0 {
			continue
		}
		if trimmed[0] == '#' {
			if cols == nil {
				comments = append(comments, strings.TrimSpace(strings.TrimLeft(string(trimmed), "#")))
			}
			continue
		}
		if cols == nil {
			if heading == "" && !startsWithNumber(trimmed) {
				heading, headline = string(trimmed), line
				continue
			}
			split = splitter(b)
			n := len(split(b))
			if n > maxColumns {
				return &Fault{File: t.file, Line: line, Row: -1, Kind: Shape, What: fmt.Sprintf("has %d columns, more than %d", n, maxColumns)}
			}
			var err error
			if names, units, err = headings(t.file, heading, headline, comments, n); err != nil {
				return err
			}
			for i := 0; i < n; i++ {
				cols = append(cols, &textColumn{t: t})
			}
		}
		cells := split(b)
		if len(cells) != len(cols) {
			f := &Fault{File: t.file, Line: line, Row: -1, Kind: Cell, What: fmt.Sprintf("has %d cells where the lines above have %d", len(cells), len(cols))}
			if len(cells) < len(cols) {
				f.Array, f.Remedy = names[len(cells)], "this is the first column without a cell"
			}
			return f
		}
		if row := len(cols[0].x); len(t.runs) == 0 || t.line(row) != line {
			t.runs = append(t.runs, run{row, line})
		}
		for i, cell := range cells {
			x, err := number(cell)
			if err != nil {
				return &Fault{File: t.file, Array: names[i], Line: line, Row: len(cols[i].x), Kind: kindOf(err), What: err.Error(), Remedy: "write a number or leave the whole line out"}
			}
			cols[i].x = append(cols[i].x, x)
		}
	}
	if err := sc.Err(); err != nil {
		if errors.Is(err, bufio.ErrTooLong) {
			return &Fault{File: t.file, Line: line + 1, Row: -1, Kind: Format, What: fmt.Sprintf("is longer than %d bytes", maxLine), Remedy: "write one row a line"}
		}
		return fault(t.file, "", Unreadable, "", "cannot be read: %v", err)
	}
	if len(cols) == 0 {
		return fault(t.file, "", Format, "", "holds no line of numbers")
	}
	for i, c := range cols {
		if err := t.add(Column{Name: names[i], Unit: units[i], Len: len(c.x)}, c); err != nil {
			return err
		}
	}
	return nil
}

func startsWithNumber(b []byte) bool {
	cells := splitter(b)(b)
	for _, c := range cells {
		if _, err := number(c); err == nil || errors.Is(err, errNotFinite) {
			return true
		}
	}
	return false
}

// splitter picks the separator from a line of numbers.
func splitter(line []byte) func([]byte) [][]byte {
	for _, sep := range []byte{',', ';', '\t'} {
		if bytes.IndexByte(line, sep) >= 0 {
			s := []byte{sep}
			return func(b []byte) [][]byte { return bytes.Split(b, s) }
		}
	}
	return bytes.Fields
}

var (
	errEmpty     = errors.New("is empty")
	errNotFinite = errors.New("is not a finite number")
)

func kindOf(err error) Kind {
	if errors.Is(err, errNotFinite) {
		return NotFinite
	}
	return Cell
}

// number reads a decimal number; the exponent letter may be e or, as Fortran
// writes it, d.
func number(cell []byte) (float64, error) {
	cell = bytes.TrimSpace(cell)
	if len(cell) == 0 {
		return 0, errEmpty
	}
	s := string(cell)
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		if errors.Is(err, strconv.ErrRange) {
			return 0, errNotFinite
		}
		if i := strings.IndexAny(s, "dD"); i > 0 {
			x, err = strconv.ParseFloat(s[:i]+"e"+s[i+1:], 64)
		}
		if err != nil {
			if len(s) > 24 {
				s = s[:24] + "…"
			}
			return 0, fmt.Errorf("holds %q, which is no number", s)
		}
	}
	if x-x != 0 {
		return 0, errNotFinite
	}
	return x, nil
}

// headings finds the names and units of n columns.
func headings(file, heading string, line int, comments []string, n int) (names, units []string, err error) {
	names, units = make([]string, n), make([]string, n)
	var unitLine []string
	if heading != "" {
		cells := entries(heading, n)
		if len(cells) != n {
			return nil, nil, &Fault{File: file, Line: line, Row: -1, Kind: Shape,
				What: fmt.Sprintf("names %d columns where the numbers have %d", len(cells), n), Remedy: "write one name a column"}
		}
		for i, c := range cells {
			names[i], units[i] = nameUnit(c)
		}
		for i := len(comments) - 1; i >= 0 && unitLine == nil; i-- {
			unitLine = matching(comments[i], n)
		}
	} else {
		for i := len(comments) - 1; i >= 0; i-- {
			cells := matching(comments[i], n)
			if cells == nil {
				continue
			}
			if unitLine == nil && allUnits(cells) {
				unitLine = cells // the line of names stands above it
				continue
			}
			for j, c := range cells {
				names[j], units[j] = nameUnit(c)
			}
			break
		}
	}
	for i := range names {
		if names[i] == "" {
			names[i] = strconv.Itoa(i)
		}
		if units[i] == "" && unitLine != nil {
			units[i] = strings.Trim(unitLine[i], "[]() ")
		}
	}
	return names, units, nil
}

// matching returns the entries of a comment line if there are n of them.
func matching(s string, n int) []string {
	if i := strings.IndexByte(s, ':'); i >= 0 && strings.EqualFold(strings.TrimSpace(s[:i]), "units") {
		s = strings.TrimSpace(s[i+1:])
	}
	if cells := entries(s, n); len(cells) == n && n > 0 {
		return cells
	}
	return nil
}

// allUnits tells a line of units from a line of names.
func allUnits(cells []string) bool {
	for _, c := range cells {
		switch strings.Trim(c, "[]() ") {
		case "M", "1/M", "M^-1", "1", "-", "", "rad", "rad/M", "s", "ms", "Hz", "km", "deg", "mu", "mu/M", "M^2", "mu^2/M^2":
		default:
			return false
		}
	}
	return true
}

// entries splits a heading into n entries where it can: by the first separator
// it contains, else by blanks; blanks in front of a bracket do not split.
func entries(s string, n int) []string {
	s = strings.ReplaceAll(strings.ReplaceAll(s, " [", "["), " (", "(")
	var cells []string
	switch {
	case strings.Contains(s, ","):
		cells = strings.Split(s, ",")
	case strings.Contains(s, ";"):
		cells = strings.Split(s, ";")
	case strings.Contains(s, "\t"):
		cells = strings.Split(s, "\t")
	default:
		cells = strings.Fields(s)
	}
	for i := range cells {
		cells[i] = strings.Trim(strings.TrimSpace(cells[i]), `"'`)
	}
	if len(cells) == n+1 && cells[n] == "" {
		cells = cells[:n]
	}
	return cells
}

// nameUnit takes "t [M]" or "t(M)" apart.
func nameUnit(s string) (name, unit string) {
	for _, br := range []string{"[]", "()"} {
		if i := strings.IndexByte(s, br[0]); i > 0 && strings.HasSuffix(s, br[1:]) {
			return strings.TrimSpace(s[:i]), strings.TrimSpace(s[i+1 : len(s)-1])
		}
	}
	return strings.TrimSpace(s), ""
}

func short(x float64) string { return strconv.FormatFloat(x, 'g', 8, 64) }
