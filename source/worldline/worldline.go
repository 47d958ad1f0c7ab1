// Package worldline holds the orbits of a small body around a Schwarzschild
// hole, as smooth functions of coordinate time.
//
// Every orbit is described in variables that are regular at turning points
// and all the way down to the horizon: the tortoise coordinate r_*, the radial
// component p = u^r of the four-velocity and the azimuth phi,
//
//	dr_*/dt = p/E,   dphi/dt = f L/(r^2 E),   dp/dt = -(f/2E) d/dr[f(1+L^2/r^2)],
//
// with f = 1-2/r. Orbits that need integrating are solved once, by spectral
// collocation on pieces whose interpolation error is at round-off, so that high
// differences of closely spaced samples see no joints. After construction a
// worldline is immutable and safe for concurrent use.
//
// Units are G = c = M = 1 and the particle's mass is 1. The motion is in the
// equatorial plane.
package worldline

import "math"

// State is where the particle is at one coordinate time.
type State struct {
	T     float64 // coordinate time
	Rstar float64 // r + 2 ln(r/2-1)
	R     float64 // areal radius
	Y     float64 // r-2, to full relative precision down to the horizon
	P     float64 // u^r
	Phi   float64 // azimuth, counted through all turns (rounded at its own size)
	Phase float64 // Phi less whole turns, a few radians at most, absolute error near 1e-15: use it in e^{-i m phi}
	E, L  float64 // energy and angular momentum per mass of the instantaneous velocity
}

// F returns f = 1-2/r to full relative precision.
func (s *State) F() float64 { return s.Y / s.R }

// Omega returns dphi/dt = f L/(r^2 E).
func (s *State) Omega() float64 { return s.Y / s.R * s.L / (s.R * s.R * s.E) }

// Rates returns dr/dt = f p/E, dphi/dt = f L/(r^2 E) and the geodesic
// dp/dt = -(f/2E) d/dr[f(1+L^2/r^2)]. For Hamiltonian motion with a torque the
// three are exact as well; for a table dp/dt is that of the geodesic which
// touches the path there.
func (s *State) Rates() (rdot, phidot, pdot float64) {
	f := s.Y / s.R
	return f * s.P / s.E, f * s.L / (s.R * s.R * s.E), -f / (2 * s.E) * potentialSlope(s.Y, s.R, s.L*s.L, math.FMA(s.L, s.L, -12))
}

// Marker is an event on a worldline.
type Marker struct {
	Name string  // one of the names below
	T    float64 // its coordinate time
	R    float64 // the radius there
}

// Names of markers.
const (
	MarkISCO        = "isco"                   // r = 6
	MarkLightRing   = "light_ring"             // r = 3
	MarkPeakOmega   = "peak_orbital_frequency" // maximum of dphi/dt
	MarkHorizon     = "horizon"                // r_* = HorizonApproach
	MarkPeriastron  = "periastron"
	MarkApastron    = "apastron"
	HorizonApproach = -30.0
)

// Number is a named constant of an orbit.
type Number struct {
	Name  string
	Value float64
}

// Worldline is an orbit as a function of coordinate time.
type Worldline interface {
	// Kind is the name of the kind of orbit, as case files spell it.
	Kind() string
	// At fills s with the state at time t. It does not allocate, gives the
	// same bits for the same t and may be called concurrently. A t outside
	// Span is a programmer's error and panics.
	At(t float64, s *State)
	// Span is the range of times that At accepts; an end may be infinite.
	// The orbit proper starts at t = 0, with the azimuth that was asked for.
	Span() (t0, t1 float64)
	// Markers are the events of the orbit in order of time (for periodic
	// orbits the first of each kind at t >= 0).
	Markers() []Marker
	// Numbers are what follows from the orbit: E, L, frequencies, periods, …
	Numbers() []Number
	// Drift is the largest relative departure of the constants of motion (for
	// driven and tabulated motion: of the balance that replaces them) over
	// the solved part of the orbit.
	Drift() float64
	// Uncertainty is an estimate of the largest error of r_* (M) and of phi
	// (radians) that stems from solving or interpolating the orbit.
	Uncertainty() (rstar, phi float64)
}

// place fills the radial coordinates from one of the two charts.
func place(chart int8, w float64, s *State) {
	if chart == chartY {
		s.Y = w
		s.R = w + 2
		s.Rstar = s.R + 2*math.Log(w/2)
		return
	}
	s.Y = 2 * math.Exp(w)
	s.R = 2 + s.Y
	s.Rstar = s.R + 2*w
}
