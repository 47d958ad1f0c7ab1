package worldline

import "math"

// The innermost stable circular orbit: r = 6, E^2 = 8/9, L^2 = 12.
const (
	iscoE   = 0.9428090415820634
	iscoElo = 9.566246218657682e-18 // sqrt(8/9) - iscoE
	iscoL   = 3.4641016151377544    // nearest to sqrt(12)
)

// geodesic is a pair of constants of motion with the differences that matter
// near the innermost stable circular orbit, where E^2 and the potential cancel.
type geodesic struct {
	E, L    float64
	E2, L2  float64
	e2m1    float64 // E^2-1
	lam     float64 // L^2-12
	eps     float64 // E^2-8/9
	isco    bool    // exactly the geodesic that leaves the innermost stable circular orbit
	similar bool    // close enough to it for the expansion about it
}

// newGeodesic takes E and L; values that are those of the innermost stable
// circular orbit to rounding are taken to mean exactly that.
func newGeodesic(E, L float64) geodesic {
	g := geodesic{E: E, L: L, E2: E * E, L2: L * L, e2m1: (E - 1) * (E + 1)}
	g.lam = math.FMA(L, L, -12)
	g.eps = ((E - iscoE) - iscoElo) * (E + iscoE)
	if math.Abs(E-iscoE) <= 2.3e-16 && math.Abs(math.Abs(L)-iscoL) <= 9e-16 {
		g.isco = true
		g.L2, g.lam = 12, 0
		g.E2, g.eps = 8.0/9, 0
		g.e2m1 = -1.0 / 9
	}
	g.similar = math.Abs(g.eps) < 0.02 && math.Abs(g.lam) < 1
	return g
}

// radial returns (u^r)^2 = E^2 - f(1+L^2/r^2). Near the innermost stable
// circular orbit it is written as
// (E^2-8/9) - (L^2-12) x^2(1-2x) + (6x-1)^3/9, x = 1/r, which does not cancel.
func (g *geodesic) radial(y, r float64) float64 {
	x := 1 / r
	if g.similar && r > 3 && r < 12 {
		c := (4 - y) * x
		return g.eps - g.lam*x*x*(y*x) + c*c*c/9
	}
	if r > 4 {
		return g.e2m1 + 2*x - g.L2*x*x*(y*x)
	}
	return g.E2 - y*x*(1+g.L2*x*x)
}

// potentialSlope returns d/dr[f(1+L^2/r^2)] = (2/r^4)(r^2 - L^2 r + 3 L^2), with
// the square completed where the two circular orbits of this L are close;
// lam = L^2-12.
func potentialSlope(y, r, L2, lam float64) float64 {
	r2 := r * r
	if L2 > 24 {
		return 2 * (r2 - L2*(y-1)) / (r2 * r2)
	}
	d := y + (2 - L2/2)
	return 2 * (d*d - L2*lam/4) / (r2 * r2)
}

// drift returns |p^2 - (E^2 - V)|/E^2 of a state.
func (g *geodesic) drift(s *State) float64 {
	return math.Abs(s.P*s.P-g.radial(s.Y, s.R)) / g.E2
}

// radius returns y and r in a chart.
func radius(chart int8, w float64) (y, r float64, ok bool) {
	if chart == chartY {
		return w, w + 2, w > 0
	}
	y = 2 * math.Exp(w)
	return y, y + 2, true
}

// radialCharts is the part that all systems with a radial first unknown share.
type radialCharts struct{}

func (radialCharts) rechart(chart int8, hi, lo *[maxVars]float64) int8 {
	switch y, _, _ := radius(chart, hi[0]); {
	case chart == chartY && y < 0.8:
		hi[0], lo[0] = math.Log(hi[0]/2), lo[0]/hi[0]
		return chartLog
	case chart == chartLog && y > 1.6:
		hi[0], lo[0] = y, lo[0]*y
		return chartY
	}
	return chart
}

func (radialCharts) scale(chart int8, x *[maxVars]float64, i int) float64 {
	switch {
	case i == 0 && chart == chartY:
		return max(math.Abs(x[0]), 0.1)
	case i == 2:
		return 0.1
	case i == 3:
		return max(math.Abs(x[3]), 1)
	}
	return 1
}

// turning is a geodesic in the unknowns (radius, phi, p): regular where p = 0.
type turning struct {
	radialCharts
	g geodesic
}

func (turning) vars() int { return 3 }

func (s *turning) scale(chart int8, x *[maxVars]float64, i int) float64 {
	if i == 2 {
		return 0.1 * max(1, s.g.E)
	}
	return s.radialCharts.scale(chart, x, i)
}

func (s *turning) rates(chart int8, x, d *[maxVars]float64) bool {
	y, r, ok := radius(chart, x[0])
	if !ok {
		return false
	}
	f := y / r
	d[0] = x[2] / (s.g.E * r)
	if chart == chartY {
		d[0] *= y
	}
	d[1] = f * s.g.L / (r * r * s.g.E)
	d[2] = -f / (2 * s.g.E) * potentialSlope(y, r, s.g.L2, s.g.lam)
	return true
}

// falling is a geodesic in the unknowns (radius, phi) with p = -sqrt(E^2-V):
// its constants of motion cannot drift, and it stays accurate where p is tiny.
type falling struct {
	radialCharts
	g geodesic
}

func (falling) vars() int { return 2 }

func (s *falling) rates(chart int8, x, d *[maxVars]float64) bool {
	y, r, ok := radius(chart, x[0])
	if !ok {
		return false
	}
	p2 := s.g.radial(y, r)
	if !(p2 > 0) {
		return false
	}
	d[0] = -math.Sqrt(p2) / (s.g.E * r)
	if chart == chartY {
		d[0] *= y
	}
	d[1] = y / r * s.g.L / (r * r * s.g.E)
	return true
}

// deepest is ln(y/2) where integration stops and the closed form
// r_* = const - t, p = -E, phi = const takes over: y is then below round-off.
const deepest = -40.0

// extremes returns the radii of the unstable and the stable circular orbit of
// angular momentum L, where the potential has its maximum and minimum
// (NaN when L^2 < 12).
func (g *geodesic) extremes() (unstable, stable float64) {
	if g.lam < 0 {
		return math.NaN(), math.NaN()
	}
	// r^2 - L^2 r + 3 L^2 = 0
	stable = (g.L2 + math.Sqrt(g.L2*g.lam)) / 2
	return 3 * g.L2 / stable, stable
}

// barrier returns E^2 - V at the maximum of the potential: positive when the
// particle passes over it. With L^2 < 12 there is none and it returns +Inf.
func (g *geodesic) barrier() float64 {
	u, _ := g.extremes()
	if math.IsNaN(u) {
		return math.Inf(1)
	}
	return g.radial(u-2, u)
}

// capture returns the angular momentum below which a particle of energy E >= 1
// is captured.
func capture(E float64) float64 {
	lo, hi := math.Sqrt(12.0), 4.0
	for over(E, hi) {
		hi *= 2
	}
	for range 200 {
		mid := lo + (hi-lo)/2
		if mid == lo || mid == hi {
			break
		}
		if over(E, mid) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return hi
}

func over(E, L float64) bool {
	g := newGeodesic(E, L)
	return g.barrier() > 0
}
