package coupled

import (
	"math"

	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// Reach is what the grid rule needs to know of an orbit and of what is asked.
type Reach struct {
	Hole       hyperboloidal.Kerr
	RMin, RMax float64 // turning points
	Angular    int     // l's carried at this m
}

// Bound returns the rung of spacing close to dx for a bound orbit: the slicing
// is flat 8 kernel widths (at least 5) around the orbit, the layers are 13
// thick, the outer one at least 1.5 r_max (the near field of slow orbits is
// static there), the kernel has 12 moments and 1.8 cells, differences are of
// order 12 and the time step is 1.2 cells. The ramp is slower for fast-spinning
// holes, whose slowly damped modes it must not excite.
func Bound(q Reach, dx float64) Rung {
	const (
		thick, flat  = 13.0, 5.0
		cells, reach = 1.8, 8.0
		courant      = 1.2
		order        = 12
	)
	h := q.Hole
	rp := h.OuterHorizon()
	lo, hi := h.Tortoise(q.RMin-rp), h.Tortoise(q.RMax-rp)
	sigma := cells * dx
	w := math.Max(flat, reach*sigma)
	outer := math.Max(thick, 1.5*q.RMax)
	r := Rung{
		Layers: hyperboloidal.KerrLayers{
			Hole: h, Si: lo - w - thick, Ri: lo - w, Ro: hi + w, So: hi + w + outer, Steepness: 3,
		},
		Kernel: sigma, Moments: 12, Order: order, Angular: q.Angular, Filter: 16,
		Ramp: source.Ramp{Centre: 90, Width: 17},
	}
	if math.Abs(h.Spin()) > 0.95 {
		r.Ramp = source.Ramp{Centre: 300, Width: 60}
	}
	r.Points = max(int(math.Ceil((r.Layers.So-r.Layers.Si)/dx))+1, 2*order+6)
	r.Dt = courant * r.Dx()
	return r
}

// Align shortens the time step so that a whole number of steps makes the period.
func (r Rung) Align(period float64) Rung {
	r.Dt = period / math.Ceil(period/r.Dt)
	return r
}

// CircularState returns the state at t = 0 of the circular equatorial orbit of
// radius r with L > 0 at Boyer–Lindquist azimuth phi, and its angular velocity.
func CircularState(h hyperboloidal.Kerr, r, phi float64) (worldline.KerrState, float64, error) {
	k, om, err := worldline.CircularKerr(h, r)
	if err != nil {
		return worldline.KerrState{}, 0, err
	}
	y := r - h.OuterHorizon()
	return worldline.KerrState{
		Rho: h.Tortoise(y), R: r, Sin: 1, Phi: phi + h.Azimuth(y), E: k.E, L: k.L,
	}, om, nil
}

// BoundTrack samples a bound geodesic at a quarter of the time step dt, from
// before slicing time 0 to past until, as Moving wants it. The orbit must lie in
// the flat part of the slicing.
func BoundTrack(o *worldline.KerrBound, dt, until float64) source.KerrTrack {
	step := dt / 4
	n := int(math.Ceil(until/step)) + source.TrackLead + source.TrackTrail + 8
	t := source.KerrTrack{Start: -source.TrackLead * step, Step: step, States: make([]worldline.KerrState, n)}
	for i := range t.States {
		t.States[i], _ = o.At(t.Start + float64(i)*step)
	}
	return t
}
