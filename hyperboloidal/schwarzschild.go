// Package hyperboloidal holds the background: holes with their tortoise
// coordinates, and the hyperboloidal layers that bring null infinity and the
// horizon to the two ends of a finite grid. It knows no stencils and no
// equations. Units G = c = M = 1.
package hyperboloidal

import "math"

// Radii of a Schwarzschild hole of mass 1: horizon, photon orbit, innermost
// stable circular orbit.
const (
	Horizon    = 2.0
	LightRing  = 3.0
	ISCORadius = 6.0
)

// Tortoise returns r_* = r + 2 ln(r/2-1) for the height y = r-2 > 0 above the
// horizon. Taking y instead of r keeps the full relative precision near the
// horizon.
func Tortoise(y float64) float64 { return 2 + y + 2*math.Log(y/2) }

// TortoiseAt returns r_* for an areal radius r > 2.
func TortoiseAt(r float64) float64 { return Tortoise(r - 2) }

// InverseTortoise returns y = r-2 for a tortoise coordinate, to a few units in
// the last place relative to y over the whole line (down to the smallest
// normal number near r_* = -1400).
func InverseTortoise(rstar float64) float64 {
	c, cErr := twoDiff(rstar, 2) // solve y + 2 ln(y/2) = c + cErr
	if c < 2 {
		// w = ln(y/2): 2 w + 2 e^w = c, Newton from w = c/2 or from below.
		w := c / 2
		if w > 0 {
			w = 0
		}
		for i := 0; i < 60; i++ {
			e := math.Exp(w)
			d := (2*w + 2*e - c) / (2 + 2*e)
			w -= d
			if math.Abs(d) <= 1e-16*math.Abs(w)+1e-300 {
				break
			}
		}
		y := 2 * math.Exp(w)
		// One polish with the exponent's rounding carried along, so that a
		// large |r_*| costs no digits: y = 2 exp((c - y)/2).
		for i := 0; i < 2; i++ {
			s, sErr := twoDiff(c, y)
			g := 2 * math.Exp(s/2) * (1 + (sErr+cErr)/2)
			// Fixed point of y = g(y) by one Newton step, g' = -g/2.
			y -= (y - g) / (1 + g/2)
		}
		return y
	}
	y := c
	for i := 0; i < 60; i++ {
		d := (y - c + 2*math.Log(y/2) - cErr) / (1 + 2/y)
		y -= d
		if math.Abs(d) <= 1e-16*y {
			break
		}
	}
	return y
}

// twoDiff returns a-b rounded and the rounding error, exactly.
func twoDiff(a, b float64) (s, err float64) {
	s = a - b
	bb := a - s
	err = (a - (s + bb)) + (bb - b)
	return s, err
}
