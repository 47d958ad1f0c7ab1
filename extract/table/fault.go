package table

import (
	"fmt"
	"strings"
)

// Kind sorts the faults a file can have.
type Kind string

// The kinds of Fault.
const (
	Unreadable Kind = "unreadable" // the file system would not give it
	Format     Kind = "format"     // not what its name or its first bytes say
	Truncated  Kind = "truncated"  // fewer bytes than it promises
	Refused    Kind = "refused"    // safe to write, unsafe or senseless to read: pickled objects, zip bombs, text arrays
	Missing    Kind = "missing"    // a name that is not there
	Shape      Kind = "shape"      // not a column of numbers
	Cell       Kind = "cell"       // a csv cell that is empty or no number
	NotFinite  Kind = "not finite" // NaN or infinity
	Order      Kind = "order"      // a time or abscissa that does not increase
	Unit       Kind = "unit"       // a unit that cannot be the one wanted
)

// Fault is what is wrong with a file, and where. Error makes one sentence of it.
type Fault struct {
	File   string
	Array  string // array or column, "" where the whole file is meant
	Line   int    // line of a text file, from 1; 0 where it does not apply
	Row    int    // row of an array, from 0; -1 where it does not apply
	Kind   Kind
	What   string // what is wrong
	Remedy string // what to write instead, may be empty
}

// Error returns "file: line 7: column "re22": what; remedy".
func (f *Fault) Error() string {
	var b strings.Builder
	b.WriteString(f.File)
	if f.Line > 0 {
		fmt.Fprintf(&b, ": line %d", f.Line)
	}
	if f.Array != "" {
		fmt.Fprintf(&b, ": column %q", f.Array)
	}
	if f.Row >= 0 && f.Line == 0 {
		fmt.Fprintf(&b, ": row %d", f.Row)
	}
	b.WriteString(": ")
	b.WriteString(f.What)
	if f.Remedy != "" {
		b.WriteString("; ")
		b.WriteString(f.Remedy)
	}
	return b.String()
}

// fault makes a Fault that concerns no particular row.
func fault(file, array string, kind Kind, remedy, format string, args ...any) *Fault {
	return &Fault{File: file, Array: array, Row: -1, Kind: kind, What: fmt.Sprintf(format, args...), Remedy: remedy}
}
