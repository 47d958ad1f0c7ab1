package worldline

import (
	"math"
)

// Eccentric is a bound geodesic r = p/(1 + e cos chi) between periastron and
// apastron. One half of a radial period is solved in the angle chi, in which
// turning points are regular points and the constants of motion cannot drift;
// the rest is symmetry and exact periodicity, so errors do not grow with time.
//
// Formulas: C. Cutler, D. Kennefick, E. Poisson, PRD 50, 3816 (1994), sec. II.
type Eccentric struct {
	o            orbitShape
	energy       float64
	angular      float64
	period       float64 // radial
	advance      float64 // azimuth per radial period
	offset       float64 // time since periastron at t = 0
	startPhi     float64 // adds to phi counted from the periastron nearest t = 0
	solution     *dense
	seam         float64 // mismatch at apastron, M
	azimuthDrift float64
}

// orbitShape holds p, e and the differences that must not cancel.
type orbitShape struct {
	p, e     float64
	gap      float64 // p-6-2e
	pericoef float64 // sqrt((p-2)^2-4e^2) p^2
	momentum float64 // e/sqrt(p(p-3-e^2))
}

func newShape(p, e float64) orbitShape {
	return orbitShape{
		p: p, e: e, gap: (p - 6) - 2*e,
		pericoef: p * p * math.Sqrt((p-2-2*e)*(p-2+2*e)),
		momentum: e / math.Sqrt(p*(p-3-e*e)),
	}
}

// parts returns D = 1+e cos chi, N = p-2-2e cos chi and G = p-6-2e cos chi as
// sums of positive terms.
func (o *orbitShape) parts(chi float64) (d, n, g float64) {
	s, c := math.Sincos(chi / 2)
	d = (1 - o.e) + 2*o.e*c*c
	w := 4 * o.e * s * s
	return d, o.gap + 4 + w, o.gap + w
}

// rates returns dt/dchi and dphi/dchi.
func (o *orbitShape) rates(chi float64) (dt, dphi float64) {
	d, n, g := o.parts(chi)
	root := math.Sqrt(g)
	return o.pericoef / (n * d * d * root), math.Sqrt(o.p) / root
}

// quadrature returns the radial period and the azimuth per radial period by the
// trapezoidal rule, which converges exponentially on a period (L. N. Trefethen
// & J. A. C. Weideman, SIAM Rev. 56, 385 (2014)).
func (o *orbitShape) quadrature() (period, advance float64) {
	sum := func(n int, shift float64) (a, b float64) {
		var ah, al, bh, bl float64
		for k := range n {
			dt, dphi := o.rates(2 * math.Pi * (float64(k) + shift) / float64(n))
			var e float64
			ah, e = twoSum(ah, dt)
			al += e
			bh, e = twoSum(bh, dphi)
			bl += e
		}
		return (ah + al) / float64(n), (bh + bl) / float64(n)
	}
	n := 64
	a, b := sum(n, 0)
	for n < 1<<22 {
		a2, b2 := sum(n, 0.5)
		n *= 2
		done := math.Abs(a2-a) <= 3e-16*a && math.Abs(b2-b) <= 3e-16*b
		a, b = (a+a2)/2, (b+b2)/2
		if done {
			break
		}
	}
	return turnHi * a, turnHi * b
}

// chiSystem solves dchi/dt and dphi/dt.
type chiSystem struct{ o orbitShape }

func (chiSystem) vars() int { return 2 }

func (s *chiSystem) rates(_ int8, x, d *[maxVars]float64) bool {
	dt, dphi := s.o.rates(x[0])
	d[0] = 1 / dt
	d[1] = dphi / dt
	return true
}

func (chiSystem) scale(int8, *[maxVars]float64, int) float64 { return 1 }

func (chiSystem) rechart(chart int8, _, _ *[maxVars]float64) int8 { return chart }

// NewEccentric returns the bound orbit of semi-latus rectum p and eccentricity
// e, with the radial phase Omega_r (t - t_periastron) and the azimuth it has at
// t = 0 (both in radians; radial phase 0 is periastron, pi is apastron).
func NewEccentric(p, e, radialPhase, azimuth float64) (*Eccentric, error) {
	switch {
	case !(e >= 0):
		return nil, &Impossible{"e", e, "an eccentricity in [0, 1)"}
	case e >= 1:
		return nil, &Impossible{"e", e, "an eccentricity in [0, 1); for an unbound orbit use kind scatter with energy and angular_momentum"}
	case !(p > 6+2*e) || math.IsInf(p, 0):
		return nil, &Impossible{"p", p, "a semi-latus rectum above 6 + 2e (there the orbit plunges: use kind infall for that, scatter for an unbound one)"}
	}
	for _, k := range []struct {
		key string
		v   float64
	}{{"radial_phase", radialPhase}, {"azimuth", azimuth}} {
		if err := finite(k.key, k.v); err != nil {
			return nil, err
		}
	}
	o := newShape(p, e)
	c := &Eccentric{o: o}
	c.energy = math.Sqrt((p - 2 - 2*e) * (p - 2 + 2*e) / (p * (p - 3 - e*e)))
	c.angular = p / math.Sqrt(p-3-e*e)
	c.period, c.advance = o.quadrature()
	_, rest := reduce(radialPhase, 0)
	c.offset = rest / turnHi * c.period

	m := &march{sys: &chiSystem{o}, h: c.period / 64, chart: chartAngle, dense: new(dense)}
	half := c.period / 2
	for m.t < half {
		if err := m.step(math.Inf(1)); err != nil {
			return nil, err
		}
	}
	c.solution = finish(nil, m.dense)
	var x [maxVars]float64
	c.solution.at(half, &x)
	dt, _ := o.rates(math.Pi)
	c.seam = math.Abs(x[0]-math.Pi) * dt
	c.azimuthDrift = math.Abs(x[1] - c.advance/2)
	var s State
	c.At(0, &s)
	c.startPhi = azimuth - s.Phi
	return c, nil
}

// Kind returns "eccentric".
func (c *Eccentric) Kind() string { return "eccentric" }

// At implements Worldline.
func (c *Eccentric) At(t float64, s *State) {
	n := math.RoundToEven((t + c.offset) / c.period)
	tau := math.FMA(-n, c.period, t) + c.offset
	side := 1.0
	if tau < 0 {
		tau, side = -tau, -1
	}
	var x [maxVars]float64
	_, phase := c.solution.at(min(tau, c.solution.end()), &x)
	sin, cos := math.Sincos(x[0] / 2)
	d := (1 - c.o.e) + 2*c.o.e*cos*cos
	w := 4 * c.o.e * sin * sin
	s.T = t
	s.Y = (c.o.gap + 4 + w) / d
	s.R = c.o.p / d
	s.Rstar = s.R + 2*math.Log(s.Y/2)
	s.P = side * c.o.momentum * 2 * sin * cos * math.Sqrt(c.o.gap+w)
	s.E, s.L = c.energy, c.angular
	whole := n * c.advance
	part := math.FMA(n, c.advance, -whole)
	_, rest := reduce(whole, part)
	s.Phase = rest + side*phase + c.startPhi
	s.Phi = whole + (part + side*x[1] + c.startPhi)
}

// Span is all times.
func (c *Eccentric) Span() (t0, t1 float64) { return math.Inf(-1), math.Inf(1) }

// Markers returns the first periastron and the first apastron at t >= 0.
func (c *Eccentric) Markers() []Marker {
	first := func(name string, t, r float64) Marker {
		if t < 0 {
			t += c.period
		}
		return Marker{name, t, r}
	}
	a := first(MarkPeriastron, -c.offset, c.o.p/(1+c.o.e))
	b := first(MarkApastron, -c.offset+c.period/2, c.o.p/(1-c.o.e))
	if b.T >= c.period {
		b.T -= c.period
	}
	if b.T < a.T {
		a, b = b, a
	}
	return []Marker{a, b}
}

// Numbers implements Worldline.
func (c *Eccentric) Numbers() []Number {
	return []Number{
		{"p", c.o.p}, {"e", c.o.e}, {"E", c.energy}, {"L", c.angular},
		{"omega_r", turnHi / c.period}, {"omega_phi", c.advance / c.period},
		{"period_r", c.period}, {"period_phi", turnHi / (c.advance / c.period)},
		{"r_min", c.o.p / (1 + c.o.e)}, {"r_max", c.o.p / (1 - c.o.e)},
		{"periastron_advance", c.advance - turnHi},
	}
}

// Drift returns the mismatch of the solution with the quadratures after half a
// radial period: E and L cannot drift here, time and azimuth can.
func (c *Eccentric) Drift() float64 {
	return max(c.seam/c.period, c.azimuthDrift/c.advance)
}

// Uncertainty implements Worldline.
func (c *Eccentric) Uncertainty() (rstar, phi float64) {
	// dr_*/dt stays below 1
	return c.seam + 2e-15*c.o.p/(1-c.o.e), c.azimuthDrift + 1e-15
}
