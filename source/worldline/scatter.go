package worldline

import (
	"fmt"
	"math"
)

// Scatter is an unbound geodesic (E >= 1) that comes in, turns at a periastron
// and leaves. It is solved from the periastron outwards; the way in is the
// mirror image.
type Scatter struct {
	g        geodesic
	from     float64
	peri     float64
	half     float64 // time from periastron to from
	base     float64 // azimuth of the periastron
	phase    float64 // the same less whole turns
	solution *dense
	sweep    float64 // azimuth from infinity to infinity
	drift    float64
}

// NewScatter returns the unbound orbit of energy E >= 1 and angular momentum L
// that is at radius from, moving inwards, with the given azimuth (radians) at
// t = 0. It is solved at least to t = until and to its return to from.
func NewScatter(energy, angularMomentum, from, azimuth, until float64) (*Scatter, error) {
	if !(energy >= 1) {
		return nil, &Impossible{"energy", energy, "an energy of at least 1 (a bound orbit is kind eccentric, a plunging one kind infall)"}
	}
	for _, k := range []struct {
		key string
		v   float64
	}{{"energy", energy}, {"angular_momentum", angularMomentum}, {"from", from}, {"azimuth", azimuth}, {"until", until}} {
		if err := finite(k.key, k.v); err != nil {
			return nil, err
		}
	}
	g := newGeodesic(energy, angularMomentum)
	u, _ := g.extremes()
	if math.IsNaN(u) || g.radial(u-2, u) >= 0 {
		return nil, &Impossible{"angular_momentum", angularMomentum, fmt.Sprintf("an angular momentum above %.10g for this energy (with less the particle is captured: use kind infall)", capture(energy))}
	}
	x1, x2, x3 := g.roots(1 / u)
	peri := 1 / x2
	if !(from > peri) {
		return nil, &Impossible{"from", from, fmt.Sprintf("a start radius outside the periastron at r = %.10g", peri)}
	}
	c := &Scatter{g: g, from: from, peri: peri}
	c.sweep = sweep(x1, x2, x3)
	m := &march{sys: &turning{g: g}, h: 0.25, chart: chartY, hi: [maxVars]float64{peri - 2, 0, 0}, dense: new(dense)}
	if peri-2 < 0.8 {
		m.chart, m.hi[0] = chartLog, math.Log((peri-2)/2)
	}
	run := func(done func() bool) error {
		for !done() {
			if err := m.step(math.Inf(1)); err != nil {
				return err
			}
		}
		return nil
	}
	outside := func() bool { return m.chart == chartY && m.hi[0] > from-2 }
	if err := run(outside); err != nil {
		return nil, err
	}
	c.solution = finish(nil, m.dense)
	var s State
	zeros := c.solution.cross(0, m.t, func(t float64) float64 {
		var x [maxVars]float64
		chart, _ := c.solution.at(t, &x)
		place(chart, x[0], &s)
		return s.Y - (from - 2)
	})
	if len(zeros) == 0 {
		return nil, m.failure("the start radius is not reached")
	}
	c.half = zeros[len(zeros)-1]
	want := max(c.half+Before, until-c.half, c.half)
	if err := run(func() bool { return m.t > want }); err != nil {
		return nil, err
	}
	c.solution = finish(nil, m.dense)
	c.At(0, &s)
	c.base = azimuth - s.Phi
	_, c.phase = reduce(c.base, 0)
	c.drift = sampledDrift(c, c.half, c.half+c.solution.end(), &g)
	return c, nil
}

// roots returns the zeros x1 <= 0 < x2 < x3 of
// p^2(x) = E^2-1 + 2x - L^2 x^2 + 2 L^2 x^3, x = 1/r, given the place of the
// minimum between x2 and x3.
func (g *geodesic) roots(low float64) (x1, x2, x3 float64) {
	val := func(x float64) float64 { return g.e2m1 + x*(2-g.L2*x*(1-2*x)) }
	// x2 in (0, low): p^2 falls from E^2-1 >= 0 (rising first) to below zero
	top := 1 / (g.L2 * 2) // p^2(top) > 0 and x2 > top
	x2 = bracketed(val, top, low, val(top), val(low))
	// the others from the sums of roots, x1+x2+x3 = 1/2, and products
	sum := 0.5 - x2
	prod := -g.e2m1 / (2 * g.L2 * x2)
	root := math.Sqrt(sum*sum - 4*prod)
	x3 = (sum + root) / 2
	return prod / x3, x2, x3
}

// sweep returns the azimuth from infinity to infinity,
// 2 int_0^x2 dx / sqrt(2 (x-x1)(x2-x)(x3-x)), with x = x2 - (x2-x1) s^2.
func sweep(x1, x2, x3 float64) float64 {
	w := x2 - x1
	smax := math.Asin(math.Sqrt(x2 / w))
	f := func(th float64) float64 {
		s := math.Sin(th)
		return 1 / math.Sqrt(x3-x2+w*s*s)
	}
	last := math.NaN()
	for panels := 1; panels <= 512; panels *= 2 {
		v := 2 * math.Sqrt2 * legendre(f, 0, smax, panels)
		if math.Abs(v-last) < 1e-15*v {
			return v
		}
		last = v
	}
	return last
}

// Kind returns "scatter".
func (c *Scatter) Kind() string { return "scatter" }

// At implements Worldline.
func (c *Scatter) At(t float64, s *State) {
	tau := t - c.half
	side := 1.0
	if tau < 0 {
		tau, side = -tau, -1
	}
	if end := c.solution.end(); tau > end && tau < end*(1+1e-15) {
		tau = end // the rounding of t
	}
	var x [maxVars]float64
	chart, phase := c.solution.at(tau, &x)
	place(chart, x[0], s)
	s.T, s.E, s.L = t, c.g.E, c.g.L
	s.P = side * x[2]
	s.Phi = c.base + side*x[1]
	s.Phase = c.phase + side*phase
}

// Span is as far as the orbit was solved, on both sides of periastron.
func (c *Scatter) Span() (t0, t1 float64) {
	return c.half - c.solution.end(), c.half + c.solution.end()
}

// Markers returns the periastron.
func (c *Scatter) Markers() []Marker { return []Marker{{MarkPeriastron, c.half, c.peri}} }

// Angle returns the scattering angle: the azimuth from infinity to infinity
// less pi.
func (c *Scatter) Angle() float64 { return c.sweep - math.Pi }

// Numbers implements Worldline.
func (c *Scatter) Numbers() []Number {
	n := []Number{
		{"E", c.g.E}, {"L", c.g.L}, {"from", c.from}, {"r_min", c.peri},
		{"scattering_angle", c.Angle()},
	}
	if c.g.E > 1 {
		n = append(n, Number{"speed_at_infinity", math.Sqrt(c.g.e2m1) / c.g.E},
			Number{"impact_parameter", c.g.L / math.Sqrt(c.g.e2m1)})
	}
	return n
}

// Drift implements Worldline.
func (c *Scatter) Drift() float64 { return c.drift }

// Uncertainty implements Worldline.
func (c *Scatter) Uncertainty() (rstar, phi float64) {
	return 2e-15*c.from + 1e2*c.drift, 1e-15 + 1e2*c.drift
}
