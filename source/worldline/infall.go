package worldline

import (
	"fmt"
	"math"
)

// FarStart is the radius at which an infall from infinity starts.
const FarStart = 400.0

// Before is how far before t = 0 a worldline that is not periodic is defined.
const Before = 50.0

// Infall is a geodesic that reaches the horizon: radial or with angular
// momentum, from rest or with a given energy, or from the innermost stable
// circular orbit.
type Infall struct {
	g       geodesic
	from    float64
	mono    bool // unknowns (radius, phi) for t >= 0; else (radius, phi, p)
	past    *dense
	ahead   *dense
	tail    tail
	markers []Marker
	drift   float64
}

// tail is the last stretch to the horizon, where y is below round-off.
type tail struct {
	t0, w, phi, phase float64
}

func (a *tail) at(t float64, s *State) {
	place(chartLog, a.w-(t-a.t0)/2, s)
	s.Rstar = 2 + 2*a.w - (t - a.t0)
	s.Phi, s.Phase = a.phi, a.phase
}

// tailOf closes a march that has reached deepest.
func tailOf(d *dense) tail {
	var x [maxVars]float64
	_, phase := d.at(d.end(), &x)
	return tail{d.end(), x[0], x[1], phase}
}

// AtRest asks NewInfall for the energy of a particle without radial velocity.
func AtRest() float64 { return math.NaN() }

// NewInfall returns the geodesic that starts at radius from at t = 0, moves
// inwards and reaches the horizon, with the given energy and angular momentum
// per mass and the azimuth (radians) at t = 0. With energy NaN (AtRest) it
// starts without radial velocity. from = +Inf stands for FarStart, with the
// velocity of a particle of that energy (at least 1) coming from infinity.
// E and L equal to sqrt(8/9) and sqrt(12) to rounding mean exactly the geodesic
// that leaves the innermost stable circular orbit.
func NewInfall(from, energy, angularMomentum, azimuth float64) (*Infall, error) {
	if math.IsInf(from, 1) {
		if math.IsNaN(energy) {
			energy = 1
		}
		if energy < 1 {
			return nil, &Impossible{"energy", energy, "an energy of at least 1 for a fall from infinity (a bound particle starts at a finite from)"}
		}
		from = FarStart
	}
	if !(from > 2) {
		return nil, &Impossible{"from", from, "a start radius outside the horizon, above 2"}
	}
	for _, k := range []struct {
		key string
		v   float64
	}{{"angular_momentum", angularMomentum}, {"azimuth", azimuth}} {
		if err := finite(k.key, k.v); err != nil {
			return nil, err
		}
	}
	rest := math.IsNaN(energy)
	y, L2 := from-2, angularMomentum*angularMomentum
	vstart := y / from * (1 + L2/(from*from))
	if rest {
		energy = math.Sqrt(vstart)
	}
	if !(energy > 0) || math.IsInf(energy, 0) {
		return nil, &Impossible{"energy", energy, "a positive energy per mass"}
	}
	g := newGeodesic(energy, angularMomentum)
	p2 := g.radial(y, from)
	if !rest && math.Abs(p2) < 4e-16*vstart && !g.similar {
		rest = true
	}
	slope := potentialSlope(y, from, g.L2, g.lam)
	switch u, st := g.extremes(); {
	case rest && slope == 0:
		return nil, &Impossible{"energy", energy, "an energy different from that of the circular orbit at from (use kind circular to stay there)"}
	case rest && slope < 0:
		return nil, &Impossible{"from", from, fmt.Sprintf("a start radius outside %.6g, where a particle with this angular momentum falls inwards (from rest here it moves out: use kind eccentric or scatter)", st)}
	case !rest && !(p2 > 0):
		return nil, &Impossible{"energy", energy, fmt.Sprintf("an energy above %.16g, the potential at from with this angular momentum (or leave energy out to start at rest)", math.Sqrt(vstart))}
	case !math.IsNaN(u) && u < from && g.radial(u-2, u) <= 0 && !g.isco:
		other := "eccentric"
		if energy >= 1 {
			other = "scatter"
		}
		return nil, &Impossible{"angular_momentum", angularMomentum, fmt.Sprintf("an angular momentum that lets the particle pass the potential barrier at r = %.6g (with this one it turns: use kind %s)", u, other)}
	case g.isco && from >= 6:
		return nil, &Impossible{"from", from, "a start radius inside 6 for the plunge that leaves the innermost stable circular orbit"}
	}
	c := &Infall{g: g, from: from}
	pstart := 0.0
	if !rest {
		pstart = -math.Sqrt(p2)
		// the time since the turning point, if there were one just outside
		since := 2 * math.Abs(pstart) / math.Abs(y/from/(2*energy)*slope)
		c.mono = since > 5
	}
	start := [maxVars]float64{y, azimuth, pstart}
	chart := chartY
	if y < 0.8 {
		chart, start[0] = chartLog, math.Log(y/2)
	}
	var sys system = &turning{g: g}
	if c.mono {
		sys = &falling{g: g}
	}
	m := &march{sys: sys, h: 0.25, chart: chart, hi: start, dense: new(dense)}
	for !(m.chart == chartLog && m.hi[0] <= deepest) {
		if err := m.step(math.Inf(1)); err != nil {
			return nil, err
		}
		if m.hi[0] > from {
			return nil, m.failure("the particle moved away from the hole")
		}
	}
	c.ahead = finish(nil, m.dense)
	c.tail = tailOf(c.ahead)
	b := &march{sys: &turning{g: g}, h: -0.25, chart: chart, hi: start, dense: new(dense)}
	for b.t > -Before {
		if err := b.step(math.Inf(1)); err != nil {
			return nil, err
		}
		if b.chart == chartLog && b.hi[0] <= deepest {
			break
		}
	}
	c.past = finish(b.dense, new(dense))
	c.drift = sampledDrift(c, c.past.start(), c.ahead.end(), &g)
	c.markers = c.find()
	return c, nil
}

// sampledDrift returns the largest relative departure from E^2 = V + p^2.
func sampledDrift(w Worldline, t0, t1 float64, g *geodesic) float64 {
	const n = 4000
	worst := 0.0
	var s State
	for i := range n + 1 {
		t := t0 + (t1-t0)*float64(i)/n
		w.At(min(max(t, t0), t1), &s)
		worst = max(worst, g.drift(&s))
	}
	return worst
}

// find locates the events for t >= 0.
func (c *Infall) find() []Marker {
	var s State
	at := func(v func(*State) float64) func(float64) float64 {
		return func(t float64) float64 {
			c.At(t, &s)
			return v(&s)
		}
	}
	var list []Marker
	add := func(name string, g func(float64) float64) {
		for _, t := range c.ahead.cross(0, c.ahead.end(), g) {
			c.At(t, &s)
			list = append(list, Marker{name, t, s.R})
		}
	}
	if c.from > 6 {
		add(MarkISCO, at(func(s *State) float64 { return s.Y - 4 }))
	}
	if c.from > 3 {
		add(MarkLightRing, at(func(s *State) float64 { return s.Y - 1 }))
		if c.g.L != 0 {
			// Omega = f L/(r^2 E) peaks where f/r^2 does
			add(MarkPeakOmega, at(func(s *State) float64 { return s.Y - 1 }))
		}
	}
	add(MarkHorizon, at(func(s *State) float64 { return s.Rstar - HorizonApproach }))
	return list
}

// Kind returns "infall".
func (c *Infall) Kind() string { return "infall" }

// At implements Worldline.
func (c *Infall) At(t float64, s *State) {
	s.T, s.E, s.L = t, c.g.E, c.g.L
	if t > c.tail.t0 {
		c.tail.at(t, s)
		s.P = -c.g.E
		return
	}
	var x [maxVars]float64
	if t < 0 {
		var chart int8
		chart, s.Phase = c.past.at(t, &x)
		place(chart, x[0], s)
		s.Phi, s.P = x[1], x[2]
		return
	}
	chart, phase := c.ahead.at(t, &x)
	place(chart, x[0], s)
	s.Phi, s.Phase, s.P = x[1], phase, x[2]
	if c.mono {
		s.P = -math.Sqrt(max(0, c.g.radial(s.Y, s.R)))
	}
}

// Span starts a little before t = 0, on the geodesic continued backwards, and
// has no end: the particle approaches the horizon for ever.
func (c *Infall) Span() (t0, t1 float64) { return c.past.start(), math.Inf(1) }

// Markers implements Worldline.
func (c *Infall) Markers() []Marker { return append([]Marker(nil), c.markers...) }

// Numbers implements Worldline.
func (c *Infall) Numbers() []Number {
	return []Number{{"from", c.from}, {"E", c.g.E}, {"L", c.g.L}}
}

// Drift implements Worldline.
func (c *Infall) Drift() float64 { return c.drift }

// Uncertainty implements Worldline.
func (c *Infall) Uncertainty() (rstar, phi float64) {
	return 2e-15*c.from + 1e2*c.drift, 1e-15 + 1e2*c.drift
}
