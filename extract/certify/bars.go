package certify

import (
	"math"
	"math/cmplx"
)

// Budget splits the relative error bar of an amplitude into its parts.
type Budget struct {
	Discretisation float64
	Transient      float64
	RoundOff       float64
	Range          float64 // what an extrapolation beyond the evolved range leaves open
}

// Bar is the sum of the parts.
func (b Budget) Bar() float64 { return b.Discretisation + b.Transient + b.RoundOff + b.Range }

// Largest names the largest part: "discretisation", "transient", "round-off" or
// "part outside the range".
func (b Budget) Largest() string {
	switch {
	case b.Range > b.Discretisation && b.Range > b.Transient && b.Range > b.RoundOff:
		return "part outside the range"
	case b.Discretisation >= b.Transient && b.Discretisation >= b.RoundOff:
		return "discretisation"
	case b.Transient >= b.RoundOff:
		return "transient"
	}
	return "round-off"
}

// Constants of the recipe, from the calibration study (see DEVELOPERS.md).
const (
	// Ratio is the spacing of a rung over that of the next coarser one.
	Ratio = 0.8
	// CoarsestSpacing is that of rung 0, M.
	CoarsestSpacing = 0.64
	// margin times what the leading term of a scheme's error leaves of the
	// difference of the two finest rungs, Ratio^p/(1-Ratio^p), is the bar: 0.1
	// of the difference at order 12, of which 0.03 (where the kernel's order 16
	// rules) to 0.07 are seen.
	margin = 1.25
	// guard replaces a difference that is small by accident (it crosses zero
	// where two terms of the error cancel) by this fraction of the next
	// coarser difference.
	guard = 0.03
	// roundFactor times epsilon N^2 is the round-off of second differences on
	// N points; lowFrequency/Omega takes over for slow modes, in which it adds
	// up for longer.
	roundFactor  = 0.02
	lowFrequency = 0.003
)

const epsilon = 2.220446049250313e-16

// Discretisation bounds the relative error of the amplitude z[0] of the finest
// rung by its complex differences from the coarser rungs z[1], z[2] (each Ratio
// times fewer points), for a scheme of the given order. It wants at least two
// rungs.
func Discretisation(z []complex128, order int) float64 {
	if len(z) < 2 {
		panic("certify: a discretisation bar wants at least two rungs")
	}
	d := cmplx.Abs(z[0] - z[1])
	if len(z) > 2 {
		d = math.Max(d, guard*cmplx.Abs(z[1]-z[2]))
	}
	return leftover(order) * d / cmplx.Abs(z[0])
}

// leftover is the part of a difference of two rungs that bounds what is left.
func leftover(order int) float64 {
	r := math.Pow(Ratio, float64(order))
	return margin * r / (1 - r)
}

// RoundOff is the relative floor of an amplitude of frequency omega on n points.
func RoundOff(n int, omega float64) float64 {
	return math.Max(roundFactor, lowFrequency/omega) * epsilon * float64(n) * float64(n)
}

// Spacing is the grid spacing of rung k >= 0, M.
func Spacing(k int) float64 { return CoarsestSpacing * math.Pow(Ratio, float64(k)) }

// Predict estimates the relative discretisation bar of a flux at one end for a
// circular orbit of radius r0 and a grid spacing dx: a fit to runs with kernels
// of 16 moments, 1.9 cells wide, and differences of order 12. It is only where
// the ladder starts; the bar itself is always measured.
func Predict(end End, l int, r0, dx float64) float64 {
	var e, least float64
	r := math.Log10(r0 / 6)
	if end == Infinity {
		e, least = -11+0.6*float64(l-3)-14*r, -11.5
	} else {
		e, least = -8.6+0.8*float64(l-2)-5*r, -11.5
	}
	return leftover(12) * math.Pow(10, math.Max(e, least)) * math.Pow(dx/0.4096, 13)
}
