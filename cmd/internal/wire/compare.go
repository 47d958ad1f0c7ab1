package wire

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strconv"

	"nullmark/configs"
	"nullmark/extract/compare"
	"nullmark/extract/result"
	"nullmark/extract/table"
	"nullmark/hyperboloidal"
)

// Comparison says what a result is held against: a modeller's files, or
// another result.
type Comparison struct {
	Model   *configs.Model // nil: With is compared
	With    *result.Bundle
	Name    string // of With
	Align   configs.Align
	Context []compare.Expansion // published fluxes to draw beside a flux curve
}

// Compare opens the files that the model names, reads them as it says and sets
// them against the result of case c. Errors are *table.Fault and *compare.InputError.
func Compare(ref *result.Bundle, c *configs.Case, w Comparison) (*result.Comparison, *result.Curves, error) {
	in := compare.Input{Title: ref.Result.Title, Reference: ref, Tortoise: tortoise(c.Hole.Spin), MasterHorizon: c.Waves.Equation == configs.Master}
	if w.Align.Windowed {
		in.Align = &[2]float64{w.Align.From, w.Align.To}
	}
	if w.Model == nil {
		other, err := compare.FromResult(w.With)
		if err != nil {
			return nil, nil, err
		}
		in.Name, in.Model, in.Numbers = w.Name, other, w.With.Result
		return compare.Compare(in)
	}
	m := w.Model
	in.Name = m.Name
	in.Convention = compare.Convention{Quantity: m.Quantity, Phase: m.Phase, PhaseOf: m.PhaseOf, TimeIs: m.TimeIs, Per: m.Per, MassRatio: m.MassRatio}
	var open []*table.Table
	defer func() {
		for _, t := range open {
			t.Close()
		}
	}()
	get := func(path string) (*table.Table, error) {
		t, err := table.Open(path)
		if err == nil {
			open = append(open, t)
		}
		return t, err
	}
	if f := m.Waveform; f != nil {
		t, err := get(f.File)
		if err != nil {
			return nil, nil, err
		}
		var modes []compare.ModeColumns
		for _, c := range f.Modes {
			modes = append(modes, compare.ModeColumns{L: c.L, M: c.M, Arrays: c.Arrays})
		}
		if in.Model, err = compare.NewFileWaveform(t, f.Time, modes); err != nil {
			return nil, nil, err
		}
	}
	if f := m.Flux; f != nil {
		t, err := get(f.File)
		if err != nil {
			return nil, nil, err
		}
		if in.Flux, err = fluxInput(t, f); err != nil {
			return nil, nil, err
		}
		in.Flux.Context = w.Context
		if f.Against != "" {
			against, err := get(f.Against)
			if err != nil {
				return nil, nil, err
			}
			if in.Flux.Rows, err = sweepRows(against); err != nil {
				return nil, nil, err
			}
		}
	}
	if f := m.Force; f != nil {
		t, err := get(f.File)
		if err != nil {
			return nil, nil, err
		}
		if in.Force, err = force(t, f); err != nil {
			return nil, nil, err
		}
		if in.Force.MassRatio = m.MassRatio; in.Force.MassRatio == 0 && ref.Result.Orbit != nil {
			in.Force.MassRatio = ref.Result.Orbit.Numbers["mass_ratio"]
		}
	}
	if f := m.Noise; f != nil {
		t, err := get(f.File)
		if err != nil {
			return nil, nil, err
		}
		if in.Noise, err = compare.ReadNoise(t, f.Frequency, f.Density, f.TotalMass); err != nil {
			return nil, nil, err
		}
	}
	return compare.Compare(in)
}

// tortoise returns r_*(r) of the hole, with the constant of the slicing.
func tortoise(spin float64) func(float64) float64 {
	if spin != 0 {
		return nil
	}
	return func(r float64) float64 {
		if r <= hyperboloidal.Horizon {
			return math.Inf(-1)
		}
		return hyperboloidal.TortoiseAt(r)
	}
}

// byMode is the name of a column of one mode: l2m2_ and the quantity.
var byMode = regexp.MustCompile(`^l([0-9]+)m(-?[0-9]+)_(.+)$`)

// fluxInput reads a flux curve: the named columns are the totals, columns
// named l2m2_ and the same name are those of single modes.
func fluxInput(t *table.Table, f *configs.ModelFlux) (*compare.FluxInput, error) {
	in := &compare.FluxInput{File: t.File()}
	var err error
	if in.X, err = t.Increasing(f.X); err != nil {
		return nil, err
	}
	if f.Energy == "" && f.AngularMomentum == "" {
		return nil, &compare.InputError{What: "model.flux names no column of a flux", Remedy: "write energy: or angular_momentum: with the column's name"}
	}
	column := func(name string) ([]float64, error) {
		if name == "" {
			return nil, nil
		}
		y, err := t.Real(name)
		if err == nil && len(y) != len(in.X) {
			err = &table.Fault{File: t.File(), Array: name, Row: -1, Kind: table.Shape, What: fmt.Sprintf("has %d rows where the column %q has %d", len(y), f.X, len(in.X))}
		}
		return y, err
	}
	total := compare.FluxColumn{}
	if total.Energy, err = column(f.Energy); err != nil {
		return nil, err
	}
	if total.AngMom, err = column(f.AngularMomentum); err != nil {
		return nil, err
	}
	in.Columns = []compare.FluxColumn{total}
	seen := map[[2]int]bool{}
	for _, c := range t.Columns() {
		at := byMode.FindStringSubmatch(c.Name)
		if at == nil || at[3] != f.Energy && at[3] != f.AngularMomentum {
			continue
		}
		l, errL := strconv.Atoi(at[1])
		m, errM := strconv.Atoi(at[2])
		if errors.Join(errL, errM) != nil || seen[[2]int{l, m}] {
			continue
		}
		seen[[2]int{l, m}] = true
		mode := compare.FluxColumn{L: l, M: m}
		prefix := fmt.Sprintf("l%dm%d_", l, m)
		if f.Energy != "" && t.Has(prefix+f.Energy) {
			if mode.Energy, err = column(prefix + f.Energy); err != nil {
				return nil, err
			}
		}
		if f.AngularMomentum != "" && t.Has(prefix+f.AngularMomentum) {
			if mode.AngMom, err = column(prefix + f.AngularMomentum); err != nil {
				return nil, err
			}
		}
		in.Columns = append(in.Columns, mode)
	}
	return in, nil
}

// sweepRows reads the table of a sweep over circular equatorial orbits: the
// columns orbit.radius, hole.spin (0 where it is missing) and the fluxes at
// infinity with their bars, of the sum and of single modes.
func sweepRows(t *table.Table) ([]compare.FluxRow, error) {
	radius, err := t.Real("orbit.radius")
	if err != nil {
		return nil, err
	}
	spin := make([]float64, len(radius))
	if t.Has("hole.spin") {
		if spin, err = t.Real("hole.spin"); err != nil {
			return nil, err
		}
	}
	quantity := func(name string) ([]result.Q, error) {
		v, err := t.Real(name)
		if err != nil {
			return nil, err
		}
		e, err := t.Real(name + "_error")
		if err != nil {
			return nil, err
		}
		if len(v) != len(radius) || len(e) != len(radius) {
			return nil, &table.Fault{File: t.File(), Array: name, Row: -1, Kind: table.Shape, What: "has another length than orbit.radius"}
		}
		q := make([]result.Q, len(v))
		for i := range v {
			q[i] = result.Q{Value: v[i], Error: e[i]}
		}
		return q, nil
	}
	const energy, angular = "energy_infinity", "angular_momentum_infinity"
	var rows []compare.FluxRow
	add := func(prefix string, l, m int) error {
		e, err := quantity(prefix + energy)
		if err != nil {
			return err
		}
		var a []result.Q
		if t.Has(prefix + angular) {
			if a, err = quantity(prefix + angular); err != nil {
				return err
			}
		}
		for i, r := range radius {
			if !(r > 0) || i >= len(spin) {
				return &table.Fault{File: t.File(), Array: "orbit.radius", Row: i, Kind: table.Cell, What: "is no radius above zero"}
			}
			row := compare.FluxRow{X: math.Pow(math.Abs(math.Pow(r, 1.5)+spin[i]), -2./3), Energy: e[i], L: l, M: m}
			if a != nil {
				row.AngMom = &a[i]
			}
			rows = append(rows, row)
		}
		return nil
	}
	if err := add("", 0, 0); err != nil {
		return nil, err
	}
	for _, c := range t.Columns() {
		at := byMode.FindStringSubmatch(c.Name)
		if at == nil || at[3] != energy {
			continue
		}
		l, errL := strconv.Atoi(at[1])
		m, errM := strconv.Atoi(at[2])
		if errors.Join(errL, errM) != nil {
			continue
		}
		if err := add(fmt.Sprintf("l%dm%d_", l, m), l, m); err != nil {
			return nil, err
		}
	}
	return rows, nil
}

// force reads what a model's dynamics lose.
func force(t *table.Table, f *configs.ModelForce) (*compare.Force, error) {
	out := &compare.Force{File: t.File()}
	var err error
	if out.T, err = t.Increasing(f.T); err != nil {
		return nil, err
	}
	for _, c := range []struct {
		name string
		dst  *[]float64
	}{{f.EnergyRate, &out.EnergyRate}, {f.AngularMomentumRate, &out.AngMomRate}, {f.Energy, &out.Energy}, {f.AngularMomentum, &out.AngMom}} {
		if c.name == "" {
			continue
		}
		if *c.dst, err = t.Real(c.name); err != nil {
			return nil, err
		}
		if len(*c.dst) != len(out.T) {
			return nil, &table.Fault{File: t.File(), Array: c.name, Row: -1, Kind: table.Shape, What: fmt.Sprintf("has %d rows where the column %q has %d", len(*c.dst), f.T, len(out.T))}
		}
	}
	return out, nil
}
