package configs

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"
	"unicode"
)

// Problem is one fault found by a check that knows the physics, for example
// {"orbit.radius", 2.5, "a radius above 3 (no timelike circular orbit at or inside the light ring)"}.
// Want follows the words "must be".
type Problem struct {
	Key   string
	Value any
	Want  string
}

// The places that a value can come from.
const (
	OriginFile        = "file"
	OriginEnvironment = "environment"
	OriginSet         = "--set"
)

// Fault is one thing that is wrong with a case.
type Fault struct {
	File   string // the case file as it was named
	Line   int    // in File; 0 where no line applies
	Key    string // key path
	Value  string // as typed, shortened
	Want   string // what is allowed; follows "must be"
	Origin string // OriginFile, OriginEnvironment or OriginSet
	// Says is the sentence itself where "KEY is VALUE, but must be WANT" does
	// not fit: an unknown key, a missing one, a file that cannot be read.
	Says string
}

// Error returns the fault as one sentence that begins with its place.
func (f Fault) Error() string {
	var place string
	switch f.Origin {
	case OriginEnvironment:
		place = "environment " + show(variable(base(f.Key)))
	case OriginSet:
		place = "--set " + show(base(f.Key))
	default:
		place = f.File
		if f.Line > 0 {
			place += ":" + strconv.Itoa(f.Line)
		}
	}
	if f.Says != "" {
		return place + ": " + f.Says
	}
	return fmt.Sprintf("%s: %s is %s, but must be %s", place, f.Key, f.Value, f.Want)
}

// Faults is the error of Reader: everything that is wrong, in the order file
// (by line), environment, --set.
type Faults []Fault

// mostShown caps the lines of Faults.Error.
const mostShown = 100

// Error returns one sentence a line.
func (f Faults) Error() string {
	var b strings.Builder
	for i, fault := range f {
		if i == mostShown {
			fmt.Fprintf(&b, "\nand %d more", len(f)-i)
			break
		}
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(fault.Error())
	}
	return b.String()
}

func (f Faults) sort() {
	rank := map[string]int{OriginFile: 0, OriginEnvironment: 1, OriginSet: 2}
	sort.SliceStable(f, func(i, j int) bool {
		a, b := f[i], f[j]
		if rank[a.Origin] != rank[b.Origin] {
			return rank[a.Origin] < rank[b.Origin]
		}
		if a.Origin != OriginFile || a.Line == b.Line {
			return false
		}
		return b.Line == 0 || a.Line != 0 && a.Line < b.Line
	})
}

// number writes x with the fewest digits that read back as x.
func number(x float64) string {
	switch {
	case math.IsInf(x, 1):
		return ".inf"
	case math.IsInf(x, -1):
		return "-.inf"
	}
	if x == math.Trunc(x) && math.Abs(x) < 1e15 {
		return strconv.FormatFloat(x, 'f', -1, 64)
	}
	s := strconv.FormatFloat(x, 'g', -1, 64)
	return strings.Replace(s, "e-0", "e-", 1) // 1e-8, as people write it
}

// show makes a value fit to stand in a sentence: one line, not too long,
// nothing that moves a terminal's cursor.
func show(s string) string {
	const most = 60
	if r := []rune(s); len(r) > most {
		s = string(r[:most]) + "…"
	}
	for _, r := range s {
		if !unicode.IsPrint(r) {
			return strconv.Quote(s)
		}
	}
	return s
}

// nearest returns the candidate that the word was most likely meant to be, or
// "" when none is close: at most one slip in three letters and fewer slips than
// letters, a swap of neighbours being one. The first of equals wins.
func nearest(word string, candidates []string) string {
	letters := len([]rune(word))
	if letters > 40 {
		return ""
	}
	least, found := (letters+2)/3+1, ""
	for _, c := range candidates {
		d := distance(strings.ToLower(word), strings.ToLower(c))
		if d < least && d < letters && d < len(c) || d == 0 {
			least, found = d, c
		}
	}
	return found
}

// distance counts the insertions, deletions, replacements and swaps of
// neighbours between two words (optimal string alignment).
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	d := make([][]int, len(x)+1)
	for i := range d {
		d[i] = make([]int, len(y)+1)
		d[i][0] = i
	}
	for j := range d[0] {
		d[0][j] = j
	}
	for i := 1; i <= len(x); i++ {
		for j := 1; j <= len(y); j++ {
			differ := 1
			if x[i-1] == y[j-1] {
				differ = 0
			}
			d[i][j] = min(d[i-1][j]+1, d[i][j-1]+1, d[i-1][j-1]+differ)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				d[i][j] = min(d[i][j], d[i-2][j-2]+1)
			}
		}
	}
	return d[len(x)][len(y)]
}
