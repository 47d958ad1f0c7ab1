package worldline

import (
	"fmt"
	"strings"
)

// Impossible says that no orbit of the asked kind has the given parameters.
type Impossible struct {
	Key   string  // the parameter, as case files spell it below "orbit."
	Value float64 // what was given
	Want  string  // what is possible, and which other kind fits
}

func (e *Impossible) Error() string {
	return fmt.Sprintf("orbit.%s = %v is not possible: want %s", e.Key, e.Value, e.Want)
}

// Failure says where solving an orbit broke down.
type Failure struct {
	Step  int     // piece of the dense solution
	Time  float64 // coordinate time
	Place float64 // r_*
	What  string
}

func (e *Failure) Error() string {
	return fmt.Sprintf("the orbit could not be solved beyond t = %g (r_* = %g, piece %d): %s", e.Time, e.Place, e.Step, e.What)
}

// TableFault is one fault of a tabulated trajectory or flux.
type TableFault struct {
	Row    int     // counted from 1, without header lines
	Column string  // name of the column
	Value  float64 // the value found there
	What   string  // what is wrong with it and what to write instead
}

func (f TableFault) Error() string {
	return fmt.Sprintf("row %d, %s = %v: %s", f.Row, f.Column, f.Value, f.What)
}

// TableFaults are all faults found in one table; Error prints one a line.
type TableFaults []TableFault

func (f TableFaults) Error() string {
	lines := make([]string, len(f))
	for i := range f {
		lines[i] = f[i].Error()
	}
	return strings.Join(lines, "\n")
}
