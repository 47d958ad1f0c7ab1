// Package demod turns the sampled field at one end of the grid into complex
// amplitudes: smooth windows over whole periods. Every time step is used, so
// that grid noise is not aliased into the band.
package demod

import (
	"fmt"
	"math"
	"math/cmplx"
)

// Window is sin^{2 Power}(pi (t-Start)/Length) on [Start, Start+Length]. Over
// Length = n periods of a tone its spectrum vanishes at every multiple of
// 1/Length from Power+1 on: with n > Power a constant (or slowly decaying)
// remainder is removed from the tone.
type Window struct {
	Start, Length float64
	Power         int
}

// Weight returns the window at t.
func (w Window) Weight(t float64) float64 {
	x := (t - w.Start) / w.Length
	if x <= 0 || x >= 1 {
		return 0
	}
	s := math.Sin(math.Pi * x)
	s *= s
	return pow(s, w.Power)
}

func pow(s float64, n int) float64 {
	p := 1.0
	for ; n > 0; n-- {
		p *= s
	}
	return p
}

// Series is a uniformly sampled complex field: sample k at Start + k Dt.
type Series struct {
	Start, Dt float64
	Values    []complex128
}

// End is the time of the last sample.
func (s Series) End() float64 { return s.Start + float64(len(s.Values)-1)*s.Dt }

// ErrShort is returned when a window does not lie inside the series.
type ErrShort struct{ From, To, HaveFrom, HaveTo float64 }

func (e *ErrShort) Error() string {
	return fmt.Sprintf("demod: the window [%g, %g] is not inside the samples [%g, %g]", e.From, e.To, e.HaveFrom, e.HaveTo)
}

// Amplitude returns Z = sum w e^{i omega t} field / sum w: for a field
// Z e^{-i omega t} it is exact to round-off, and the trapezoidal sum of the
// smooth window leaves nothing else.
func Amplitude(s Series, w Window, omega float64) (complex128, error) {
	const slack = 1e-9
	if w.Start < s.Start-slack || w.Start+w.Length > s.End()+slack*math.Abs(s.End())+slack {
		return 0, &ErrShort{w.Start, w.Start + w.Length, s.Start, s.End()}
	}
	k0 := int(math.Ceil((w.Start - s.Start) / s.Dt))
	k1 := int(math.Floor((w.Start + w.Length - s.Start) / s.Dt))
	k0 = max(k0, 0)
	k1 = min(k1, len(s.Values)-1)
	if k1-k0 < 16 {
		return 0, fmt.Errorf("demod: only %d samples in the window", k1-k0+1)
	}
	var z complex128
	var sum float64
	for k := k0; k <= k1; k++ {
		t := s.Start + float64(k)*s.Dt
		g := w.Weight(t)
		if g == 0 {
			continue
		}
		z += complex(g, 0) * s.Values[k] * cmplx.Exp(complex(0, omega*t))
		sum += g
	}
	return z / complex(sum, 0), nil
}
