package worldline

import (
	"fmt"
	"math"
)

// Inspiral is the quasi-circular inspiral and plunge of a test mass: Hamiltonian
// motion with E = sqrt(p^2 + f(1+L^2/r^2)) and a torque,
//
//	dr_*/dt = p/E,  dphi/dt = f L/(r^2 E),  dp/dt = -(f/2E) d/dr[f(1+L^2/r^2)],
//	dL/dt = -nu Edot(Omega)/Omega,
//
// Edot the flux of circular orbits (at infinity and into the horizon). E follows
// from the momentary velocity, so dE/dt = Omega dL/dt.
type Inspiral struct {
	from     float64
	q        torque
	solution *dense
	tail     tail
	finalL   float64
	finalE   float64
	start    State
	markers  []Marker
	drift    float64
}

// InspiralOrbit says which inspiral is wanted.
type InspiralOrbit struct {
	MassRatio float64 // nu in (0, 0.25]: the rate of the inspiral
	From      float64 // radius at t = 0, outside 6
	Azimuth   float64 // at t = 0, radians
	Drive     Flux    // nil: PostNewtonian
	Continue  Continuation
}

// driven solves (radius, phi, p, L).
type driven struct {
	radialCharts
	q torque
}

func (driven) vars() int { return 4 }

func energyOf(y, r, p, L float64) float64 {
	return math.Sqrt(p*p + y/r*(1+L*L/(r*r)))
}

func (s *driven) rates(chart int8, x, d *[maxVars]float64) bool {
	y, r, ok := radius(chart, x[0])
	if !ok {
		return false
	}
	p, L := x[2], x[3]
	f := y / r
	e := energyOf(y, r, p, L)
	d[0] = p / (e * r)
	if chart == chartY {
		d[0] *= y
	}
	omega := f * L / (r * r * e)
	d[1] = omega
	d[2] = -f / (2 * e) * potentialSlope(y, r, L*L, math.FMA(L, L, -12))
	d[3] = s.q.at(r, omega)
	return !math.IsNaN(d[3])
}

// NewInspiral returns an inspiral that starts at From without eccentricity (on
// the slow manifold: see slow) and runs through the plunge to the horizon.
func NewInspiral(o InspiralOrbit) (*Inspiral, error) {
	switch {
	case !(o.MassRatio > 0 && o.MassRatio <= 0.25):
		return nil, &Impossible{"mass_ratio", o.MassRatio, "a symmetric mass ratio in (0, 0.25]"}
	case !(o.From > 6) || math.IsInf(o.From, 0):
		return nil, &Impossible{"from", o.From, "a start radius outside the innermost stable circular orbit, above 6 (inside it use kind infall)"}
	case o.Continue < FollowFrequency || o.Continue > SwitchOff:
		panic("worldline: NewInspiral: unknown continuation")
	}
	if err := finite("azimuth", o.Azimuth); err != nil {
		return nil, err
	}
	if o.Drive == nil {
		o.Drive = PostNewtonian{}
	}
	if t, ok := o.Drive.(*FluxTable); ok {
		if outer, _ := t.Range(); o.From > outer {
			return nil, &Impossible{"from", o.From, fmt.Sprintf("a start radius covered by the flux table, at most %.6g", outer)}
		}
	}
	q := torque{o.MassRatio, o.Drive, o.Continue}
	p, L, err := slow(&q, o.From)
	if err != nil {
		return nil, err
	}
	c := &Inspiral{from: o.From, q: q}
	y := o.From - 2
	hi := [maxVars]float64{y, o.Azimuth, p, L}
	b := &march{sys: &driven{q: q}, h: -1, hi: hi, dense: new(dense)}
	for b.t > -Before {
		if err := b.step(math.Inf(1)); err != nil {
			return nil, err
		}
	}
	m := &march{sys: &driven{q: q}, h: 1, hi: hi, dense: new(dense)}
	for !(m.chart == chartLog && m.hi[0] <= deepest) {
		if len(m.dense.pieces) == maxPieces {
			return nil, m.failure("the inspiral takes too long: start further in or use a larger mass_ratio")
		}
		if err := m.step(math.Inf(1)); err != nil {
			return nil, err
		}
		if m.chart == chartY && m.hi[0] > 1.5*y+10 {
			return nil, m.failure("the particle moves outwards: the driving flux is not that of an inspiral")
		}
	}
	c.solution = finish(b.dense, m.dense)
	c.tail = tailOf(c.solution)
	c.finalL = m.hi[3]
	c.finalE = math.Abs(m.hi[2])
	c.At(0, &c.start)
	c.markers = c.find()
	c.drift = c.balance()
	return c, nil
}

// Kind returns "inspiral".
func (c *Inspiral) Kind() string { return "inspiral" }

// At implements Worldline.
func (c *Inspiral) At(t float64, s *State) {
	s.T = t
	if t > c.tail.t0 {
		c.tail.at(t, s)
		s.P, s.E, s.L = -c.finalE, c.finalE, c.finalL
		return
	}
	var x [maxVars]float64
	chart, phase := c.solution.at(t, &x)
	place(chart, x[0], s)
	s.Phi, s.Phase, s.P, s.L = x[1], phase, x[2], x[3]
	s.E = energyOf(s.Y, s.R, s.P, s.L)
}

// Torque returns dL/dt of the particle in a state of this orbit.
func (c *Inspiral) Torque(s *State) float64 { return c.q.at(s.R, s.Omega()) }

// omegaSlope returns dOmega/dt over Omega, with Omega = f L/(r^2 E).
func (c *Inspiral) omegaSlope(s *State) float64 {
	q := c.Torque(s)
	return -2*(s.Y-1)/(s.R*s.R)*s.P/s.E + q/s.L - s.Omega()*q/s.E
}

func (c *Inspiral) find() []Marker {
	var s State
	var list []Marker
	add := func(name string, v func(*State) float64) {
		g := func(t float64) float64 {
			c.At(t, &s)
			return v(&s)
		}
		zeros := c.solution.cross(0, c.solution.end(), g)
		if len(zeros) > 0 {
			t := zeros[len(zeros)-1]
			c.At(t, &s)
			list = append(list, Marker{name, t, s.R})
		}
	}
	add(MarkISCO, func(s *State) float64 { return s.Y - 4 })
	add(MarkPeakOmega, func(s *State) float64 {
		if s.R > 4.5 {
			return 1
		}
		return c.omegaSlope(s)
	})
	add(MarkLightRing, func(s *State) float64 { return s.Y - 1 })
	add(MarkHorizon, func(s *State) float64 { return s.Rstar - HorizonApproach })
	for i := 1; i < len(list); i++ {
		for k := i; k > 0 && list[k].T < list[k-1].T; k-- {
			list[k], list[k-1] = list[k-1], list[k]
		}
	}
	return list
}

// balance compares the loss of E with the integral of Omega dL/dt over the
// whole orbit (Clenshaw–Curtis on the pieces), relative to E.
func (c *Inspiral) balance() float64 {
	tb := tables()
	var s State
	var e0, hi, lo, worst float64
	for i := range c.solution.pieces {
		p := &c.solution.pieces[i]
		a, b := c.solution.edges[i], c.solution.edges[i+1]
		if a < 0 {
			continue
		}
		if e0 == 0 {
			c.At(a, &s)
			e0 = s.E
		}
		sum := 0.0
		for j := range nodes {
			c.At(a+(b-a)*(tb.points[j]+1)/2, &s)
			sum += tb.integral[degree][j] * s.Omega() * c.Torque(&s)
		}
		var e float64
		hi, e = twoSum(hi, sum*math.Abs(p.h)/2)
		lo += e
		c.At(b, &s)
		worst = max(worst, math.Abs(s.E-e0-(hi+lo))/e0)
	}
	return worst
}

// Span starts a little before t = 0, on the inspiral continued backwards, and
// has no end.
func (c *Inspiral) Span() (t0, t1 float64) { return c.solution.start(), math.Inf(1) }

// Markers implements Worldline.
func (c *Inspiral) Markers() []Marker { return append([]Marker(nil), c.markers...) }

// Numbers returns the values at t = 0 and those left at the horizon.
func (c *Inspiral) Numbers() []Number {
	return []Number{
		{"mass_ratio", c.q.nu}, {"from", c.from},
		{"E", c.start.E}, {"L", c.start.L}, {"omega_phi", c.start.Omega()},
		{"E_final", c.finalE}, {"L_final", c.finalL},
	}
}

// Drift returns the largest relative departure of E from its start value plus
// the integral of Omega dL/dt.
func (c *Inspiral) Drift() float64 { return c.drift }

// Uncertainty implements Worldline. It does not contain the error of the flux
// that drives the motion.
func (c *Inspiral) Uncertainty() (rstar, phi float64) {
	return 2e-15*c.from + 1e2*c.drift, 1e-15 + 1e2*c.drift
}

// slow returns p and L of the motion without eccentricity at radius r0: the slow
// manifold p(r), L(r) on which dL/dr dr/dt is the torque and dp/dr dr/dt the
// radial force,
//
//	p = E torque/(f dL/dr),   L^2 (r-3) = r^2 + r^4 p dp/dr,
//
// found by iterating from the circular orbits, on Chebyshev points around r0.
// Each pass gains a factor of the adiabaticity squared; the iteration stops
// where it no longer improves.
func slow(q *torque, r0 float64) (p, L float64, err error) {
	tb := tables()
	width := 0.08 * r0
	width = min(width, 0.7*(r0-6))
	var rs, ps, ls [nodes]float64
	for j := range nodes {
		r := r0 + width*tb.points[j]
		rs[j] = r
		ls[j] = r / math.Sqrt(r-3)
	}
	derive := func(v *[nodes]float64) (d [nodes]float64) {
		var c [nodes + 2]float64
		for k := range nodes {
			for j := range nodes {
				c[k] += tb.toSeries[k][j] * v[j]
			}
		}
		var b [nodes + 2]float64
		for k := degree - 1; k >= 0; k-- {
			b[k] = b[k+2] + 2*float64(k+1)*c[k+1]
		}
		b[0] /= 2
		for j := range nodes {
			// T_k at the points, by recurrence
			x := tb.points[j]
			t0, t1 := 1.0, x
			sum := b[0]
			for k := 1; k < degree; k++ {
				sum += b[k] * t1
				t0, t1 = t1, 2*x*t1-t0
			}
			d[j] = sum / width
		}
		return d
	}
	const mid = degree / 2
	last := math.Inf(1)
	for range 12 {
		dl := derive(&ls)
		var np, nl [nodes]float64
		for j, r := range rs {
			e := energyOf(r-2, r, ps[j], ls[j])
			f := (r - 2) / r
			omega := f * ls[j] / (r * r * e)
			np[j] = e * q.at(r, omega) / (f * dl[j])
		}
		dp := derive(&np)
		for j, r := range rs {
			l2 := (r*r + r*r*r*r*np[j]*dp[j]) / (r - 3)
			if !(l2 > 0) {
				return 0, 0, tooFast(q, r0)
			}
			nl[j] = math.Sqrt(l2)
		}
		change := max(math.Abs(np[mid]-ps[mid])/math.Abs(np[mid]), math.Abs(nl[mid]-ls[mid])/nl[mid])
		if math.IsNaN(change) {
			return 0, 0, tooFast(q, r0)
		}
		if change >= last {
			break
		}
		ps, ls, last = np, nl, change
	}
	if last > 0.1 {
		return 0, 0, tooFast(q, r0)
	}
	return ps[mid], ls[mid], nil
}

func tooFast(q *torque, r0 float64) error {
	return &Impossible{"from", r0, fmt.Sprintf("a start radius further out, where the inspiral with mass_ratio %g is still slow against the orbit", q.nu)}
}
