package coupled

import (
	"math"

	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// Domain is the grid rule: one slicing for all rungs of an orbit, so that their
// amplitudes compare without a shift in time.
type Domain struct {
	Layers hyperboloidal.KerrLayers
	Ramp   source.Ramp
}

// Defaults of the scheme, from scans against the frequency-domain solver.
const (
	defaultCells   = 2.0 // kernel width in cells
	defaultMoments = 16
	defaultOrder   = 12
	defaultTaylor  = 8
	defaultCourant = 1.2
	defaultFilter  = 16
	steepness      = 2.0
	innerThickness = 20.0
	outerThickness = 25.0
	innermost      = 4.0 // the inner layer begins at or below this r*
	flatRoom       = 5.0
	plungeSlope    = 0.05
	flatWidths     = 8.0 // of the kernel
)

// Bound places the slicing around a bound orbit between rmin and rmax for
// spacings up to widest: flat over 8 kernel widths (at least 5) on both sides,
// an inner layer 20 thick that begins at r* = 4 or below (further out dr/drho at
// the horizon would be large and the end stiff), an outer one 25 thick, at least
// 1.5 rmax (the near field of a slow orbit is static out to there). The ramp is
// slower for fast-spinning holes, whose slowly damped modes it must not excite.
func Bound(h hyperboloidal.Kerr, rmin, rmax, widest float64) Domain {
	rp := h.OuterHorizon()
	lo, hi := h.Tortoise(rmin-rp), h.Tortoise(rmax-rp)
	w := math.Max(flatRoom, flatWidths*defaultCells*widest)
	ri := math.Min(lo-w, innermost)
	d := Domain{
		Layers: hyperboloidal.KerrLayers{
			Hole: h, Si: ri - innerThickness, Ri: ri,
			Ro: hi + w, So: hi + w + math.Max(outerThickness, 1.5*rmax), Steepness: steepness,
		},
		Ramp: source.Ramp{Centre: 90, Width: 17},
	}
	if math.Abs(h.Spin()) > 0.95 {
		d.Ramp = source.Ramp{Centre: 300, Width: 60}
	}
	return d
}

// Rung returns the rung of a spacing close to dx (never above it) with the
// given count of l's: kernel 2 cells of 16 moments, differences of order 12,
// Taylor-8 with steps of 1.2 cells, a filter of order 16.
func (d Domain) Rung(dx float64, angular int) Rung {
	r := Rung{
		Layers: d.Layers, Moments: defaultMoments, Order: defaultOrder, Taylor: defaultTaylor,
		Angular: angular, Filter: defaultFilter, Ramp: d.Ramp,
	}
	r.Points = max(int(math.Ceil((d.Layers.So-d.Layers.Si)/dx))+1, 2*defaultOrder+6)
	r.Kernel = defaultCells * r.Dx()
	r.Dt = defaultCourant * r.Dx()
	return r
}

// On is the time at which the source has come to full strength.
func (d Domain) On() float64 { return d.Ramp.Centre + 2*d.Ramp.Width }

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

// Fall is the slicing for an equatorial orbit that starts at radius from (its
// largest radius, for scattering) and either turns or plunges through the
// horizon: flat from r* = -3 to beyond the start, so that no layer lies above
// the orbit before it nears the horizon.
func Fall(h hyperboloidal.Kerr, from, widest float64) Domain {
	const inner, thick = -3.0, 20.0
	w := math.Max(flatRoom, flatWidths*defaultCells*widest)
	hi := h.Tortoise(from - h.OuterHorizon())
	d := Domain{
		Layers: hyperboloidal.KerrLayers{
			Hole: h, Si: inner - thick, Ri: inner, Ro: hi + w, So: hi + w + outerThickness, Steepness: 3,
		},
		Ramp: source.Ramp{Centre: 90, Width: 17},
	}
	d.Layers.Slope = hyperboloidal.KerrPlungeSlope(h, d.Layers.Si, plungeSlope)
	return d
}

// Absorbing is the domain for the same orbit with s = +2, run for what the
// horizon absorbs: a shallower inner layer (13 thick from r* = 3), because that
// field grows from round-off at a deep inner end, and a thin outer one, because
// nothing is read there.
func (d Domain) Absorbing() Domain {
	const ri, inner, outer = 3.0, 13.0, 15.0
	d.Layers.Ri = math.Min(ri, d.Layers.Ro)
	d.Layers.Si = d.Layers.Ri - inner
	d.Layers.So = d.Layers.Ro + outer
	d.Layers.Steepness = steepness
	if d.Layers.Slope > 0 {
		d.Layers.Slope = hyperboloidal.KerrPlungeSlope(d.Layers.Hole, d.Layers.Si, plungeSlope)
	}
	return d
}

// Plunge is Rung for a worldline through the horizon: the filter is of order 12.
func (d Domain) Plunge(dx float64, angular int) Rung {
	r := d.Rung(dx, angular)
	r.Filter = 12
	return r
}

// FallTrack samples an equatorial geodesic of energy e and angular momentum l
// that is at radius from and Boyer–Lindquist azimuth phi at slicing time 0, moving
// inwards or outwards, at a quarter of the rung's time step up to time until. It
// ends early when the particle's kernel has left the grid through the horizon.
func FallTrack(r Rung, e, l, from, phi float64, inward bool, until float64) (source.KerrTrack, error) {
	h := r.Layers.Hole
	f := worldline.NewKerrFall(r.Layers, e, l)
	begin, err := f.Begin(from, phi+h.Azimuth(from-h.OuterHorizon()), inward)
	if err != nil {
		return source.KerrTrack{}, err
	}
	step := r.Dt / 4
	n := int(math.Ceil(until/step)) + 2*source.TrackTrail + 8
	stop := r.Layers.Si - source.TeukolskyReach*r.Kernel - 1
	after := f.Sample(begin, step, n, stop)
	before := f.Sample(begin, -step, source.TrackLead+1, math.Inf(-1))
	t := source.KerrTrack{Start: -source.TrackLead * step, Step: step}
	for i := source.TrackLead; i >= 1; i-- {
		t.States = append(t.States, before[i])
	}
	t.States = append(t.States, after...)
	return t, nil
}

// Angular returns how many l's to carry on the finest rung at azimuthal number
// m so that those up to lmax come out to the asked relative accuracy at
// frequencies up to omega: one beyond lmax without spin (a coarser rung carries
// one less), and up to some ten more where a omega is of order 1. It is where the
// ladder starts; what the coupling leaves is in the measured bars.
func Angular(spin, omega float64, m, lmax int, asked float64) int {
	n := max(lmax-max(2, m, -m)+1, 1) + 1
	aw := math.Abs(spin * omega)
	if spin == 0 {
		return n
	}
	digits := -math.Log10(asked)
	return n + 1 + int(math.Ceil(0.6*digits*math.Min(1, aw)))
}
