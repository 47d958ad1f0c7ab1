package source

import (
	"fmt"
	"math"
)

// Direction says where a pulse goes at first.
type Direction int

// An outgoing pulse starts with d_t psi = -d psi/dr_*, an ingoing one with
// d_t psi = +d psi/dr_*, a static one with d_t psi = 0 (half of it goes either
// way).
const (
	Outgoing Direction = iota
	Ingoing
	Static
)

func (d Direction) String() string {
	switch d {
	case Outgoing:
		return "out"
	case Ingoing:
		return "in"
	}
	return "static"
}

// Pulse is initial data of unit height on the slice t = 0 where slices are those
// of the static observers' time and rho = r_*: the flat part of the grid. It
// must lie there with its whole Reach.
//
// The Gaussian is psi = exp(-z^2/2), z = (r_*-Centre)/Width. The compact pulse
// has the same curvature at its top and is exactly zero, with all derivatives,
// from 4 Width on: psi = exp(8 (1 - 1/(1-(z/4)^2))).
type Pulse struct {
	Centre, Width float64 // in r_*, M
	Moving        Direction
	Compact       bool
}

// compactness k and the half width of the compact pulse in units of Width,
// sqrt(2k): near its top exp(k(1-1/(1-s^2))) = 1 - k s^2 + ...
const (
	compactness = 8.0
	compactHalf = 4.0
)

// gaussHalf is where a Gaussian counts as zero: 4e-18 of its top there.
const gaussHalf = 9.0

// Reach is the distance from the centre from which on the pulse counts as zero.
func (p Pulse) Reach() float64 {
	if p.Compact {
		return compactHalf * p.Width
	}
	return gaussHalf * p.Width
}

// At returns psi and d psi/dt at r_*.
func (p Pulse) At(rstar float64) (psi, pi float64) {
	z := (rstar - p.Centre) / p.Width
	var slope float64
	if p.Compact {
		s := z / compactHalf
		if q := 1 - s*s; q > 0 {
			psi = math.Exp(compactness * (1 - 1/q))
			if psi > 0 {
				slope = -psi * compactness * 2 * s / (q * q) / (compactHalf * p.Width)
			}
		}
	} else if math.Abs(z) < gaussHalf {
		psi = math.Exp(-z * z / 2)
		slope = -psi * z / p.Width
	}
	switch p.Moving {
	case Outgoing:
		return psi, -slope
	case Ingoing:
		return psi, slope
	}
	return psi, 0
}

// Fill writes the pulse into one lane of a state [psi block][pi block] with
// lanes numbers a point; rho are the grid's coordinates. Other lanes are left
// alone. It panics when the lengths do not match.
func (p Pulse) Fill(state, rho []float64, lanes, lane int) {
	half := len(rho) * lanes
	if len(state) != 2*half || lane < 0 || lane >= lanes {
		panic(fmt.Sprintf("source: a state of %d numbers for %d points of %d lanes", len(state), len(rho), lanes))
	}
	for i, x := range rho {
		state[i*lanes+lane], state[half+i*lanes+lane] = p.At(x)
	}
}

// Outside says that a pulse does not fit where it must lie.
type Outside struct {
	Centre, Reach float64
	From, To      float64 // r_*, of the flat part
}

func (e *Outside) Error() string {
	return fmt.Sprintf("the pulse at r_* = %g reaches %.3g M to either side, beyond the flat part of the grid from %.6g to %.6g; move it inside, or make it narrower", e.Centre, e.Reach, e.From, e.To)
}

// Unresolved says that a grid is too coarse for a pulse.
type Unresolved struct{ Width, Dx float64 }

func (e *Unresolved) Error() string {
	return fmt.Sprintf("a pulse of width %g M is not resolved by a grid spacing of %.3g M; it needs a spacing of at most %.3g M", e.Width, e.Dx, e.Width/cellsPerWidth)
}

// cellsPerWidth is how many cells a width must span: the spectrum of a Gaussian
// has then fallen to exp(-pi^2 cells^2/2) = 5e-20 at the grid's shortest wave.
const cellsPerWidth = 3.0

// CoarsestSpacing is the largest grid spacing on which the pulse is resolved.
func (p Pulse) CoarsestSpacing() float64 { return p.Width / cellsPerWidth }

// Check returns an *Outside or *Unresolved when the pulse does not lie between
// the places from and to in r_* (the flat part of a grid), or is not resolved by
// the spacing dx.
func (p Pulse) Check(from, to, dx float64) error {
	if r := p.Reach(); p.Centre-r < from || p.Centre+r > to {
		return &Outside{p.Centre, r, from, to}
	}
	if dx > p.CoarsestSpacing() {
		return &Unresolved{p.Width, dx}
	}
	return nil
}
