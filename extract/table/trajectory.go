package table

import (
	"fmt"
	"strings"
)

// TrajectoryNames maps the quantities of a trajectory to columns; an empty
// name means the quantity's own. T, R and Phi must be there, the others are
// read where they are.
type TrajectoryNames struct{ T, R, Phi, Theta, PR, PPhi, E, L string }

// Trajectory is a particle's motion as it stands in a file, G = c = M = 1, per
// unit of its mass: all slices have one entry a time, nil where the file has
// no such column.
type Trajectory struct {
	T, R, Phi                []float64
	Theta, PR, PPhi          []float64
	Energy, AngularMomentum  []float64
	SinglePrecision, Ignored []string // columns of single precision; columns that were not read
}

// ReadTrajectory reads a trajectory: finite numbers, strictly increasing
// times in units of M, columns of equal length. Whether the motion is possible
// is for the caller to judge. Faults are *Fault; an optional quantity whose
// column is named but missing is one too.
func ReadTrajectory(t *Table, names TrajectoryNames) (*Trajectory, error) {
	out := &Trajectory{}
	used := map[string]bool{}
	for _, c := range []struct {
		own, named string
		needed     bool
		dst        *[]float64
	}{
		{"t", names.T, true, &out.T}, {"r", names.R, true, &out.R}, {"phi", names.Phi, true, &out.Phi},
		{"theta", names.Theta, false, &out.Theta}, {"pr", names.PR, false, &out.PR}, {"pphi", names.PPhi, false, &out.PPhi},
		{"E", names.E, false, &out.Energy}, {"L", names.L, false, &out.AngularMomentum},
	} {
		name := c.named
		if name == "" {
			name = c.own
		}
		if !c.needed && c.named == "" && !t.Has(name) {
			continue
		}
		d, err := t.Lookup(name)
		if err != nil {
			if f, ok := err.(*Fault); ok && f.Kind == Missing && c.named == "" {
				f.Remedy = fmt.Sprintf("map it with orbit.columns: {%s: NAME}; %s", c.own, f.Remedy)
			}
			return nil, err
		}
		used[name] = true
		if d.Single {
			out.SinglePrecision = append(out.SinglePrecision, name)
		}
		if c.own == "t" {
			if err := InM(t, name); err != nil {
				return nil, err
			}
			*c.dst, err = t.Increasing(name)
		} else {
			*c.dst, err = t.Real(name)
		}
		if err != nil {
			return nil, err
		}
		if len(*c.dst) != len(out.T) {
			return nil, fault(t.file, name, Shape, "give every quantity one number a time", "has %d rows where the time has %d", len(*c.dst), len(out.T))
		}
	}
	for _, c := range t.columns {
		if !used[c.Name] {
			out.Ignored = append(out.Ignored, c.Name)
		}
	}
	return out, nil
}

// InM refuses a time column whose heading gives a unit other than M.
func InM(t *Table, name string) error {
	c, err := t.Lookup(name)
	if err != nil {
		return err
	}
	switch strings.ToLower(c.Unit) {
	case "s", "sec", "second", "seconds", "ms", "us", "min", "yr", "years":
		return fault(t.file, name, Unit, "write times in units of the hole's mass M (G = c = 1)", "is in the unit %q", c.Unit)
	}
	return nil
}
