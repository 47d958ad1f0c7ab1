// Package junk tells from which time on a run is free of its start-up: two runs
// that differ only in when the source was switched on differ by nothing else.
package junk

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/signal"
)

// Ramps says how the two runs were switched on, so that their difference can be
// turned into what is left of the start-up in the first. The zero value takes
// the difference itself.
type Ramps struct {
	// Centre is the time of the first run's ramp, Other that of the second, in
	// the series' own time.
	Centre, Other float64
	// Power is the n of the remainder's fall (t - ramp)^-n: l+2 for the field at
	// null infinity, l+3 for its time derivative; 2l+3 and 2l+4 at the horizon.
	Power float64
}

// amplify is remainder of the first run / difference of the two for a power law:
// 1/|1 - ((t-Centre)/(t-Other))^n|, no less than 1.
func (r Ramps) amplify(t float64) float64 {
	a, b := t-r.Centre, t-r.Other
	if r.Power <= 0 || a <= 0 || b <= 0 || r.Centre == r.Other {
		return 1
	}
	return math.Max(1, 1/math.Abs(1-math.Pow(a/b, r.Power)))
}

// Residue is what the start-up leaves.
type Residue struct {
	// Until is the time from which what is left stays at or below the bar.
	Until float64
	// First is the index of that sample in Left.
	First int
	// Left bounds what is left in each sample of the first run: it never rises.
	// Samples outside the second run take the bound of the nearest inside.
	Left []float64
}

// Lasting says that the start-up never falls below the bar.
type Lasting struct{ Bar, Left, U float64 }

func (e *Lasting) Error() string {
	return fmt.Sprintf("junk: the start-up still leaves %.3g at the end of the run (u = %.6g), above the bar %.3g; the run must start earlier or be longer", e.Left, e.U, e.Bar)
}

// Find compares two runs of the same mode (b is resampled at a's times where
// they differ). The difference times the ramps' factor, and from each time on
// the largest to come, is the residue; the part of the difference that the
// samples' own bars explain is not taken off. On a *Lasting error the residue
// is returned as well.
func Find(a, b signal.Series, bar float64, r Ramps) (*Residue, error) {
	if err := a.Check(); err != nil {
		return nil, fmt.Errorf("junk: the first run: %w", err)
	}
	if err := b.Check(); err != nil {
		return nil, fmt.Errorf("junk: the second run: %w", err)
	}
	on, other, err := signal.Onto(a, b)
	if err != nil {
		return nil, err
	}
	offset := int(math.Round((on.Start - a.Start) / a.Dt))
	out := &Residue{Left: make([]float64, len(a.Values))}
	var envelope float64
	for k := len(on.Values) - 1; k >= 0; k-- {
		d := cmplx.Abs(on.Values[k]-other.Values[k]) * r.amplify(on.Time(k))
		envelope = math.Max(envelope, d)
		out.Left[offset+k] = envelope
	}
	for k := range offset {
		out.Left[k] = envelope
	}
	for k := offset + len(on.Values); k < len(out.Left); k++ {
		out.Left[k] = out.Left[k-1]
	}
	last := len(out.Left) - 1
	if out.Left[last] > bar {
		out.Until, out.First = a.End(), last
		return out, &Lasting{bar, out.Left[last], a.End()}
	}
	for out.First < last && out.Left[out.First] > bar {
		out.First++
	}
	out.Until = a.Time(out.First)
	return out, nil
}
