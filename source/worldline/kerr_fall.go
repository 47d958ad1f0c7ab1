package worldline

import (
	"fmt"
	"math"

	"nullmark/hyperboloidal"
)

// KerrFall is an unbound or plunging equatorial geodesic on a slicing, as a
// solution of
//
//	drho/dlambda = W/r',  dW/dlambda = (1/2) dR/dr,  dphi~/dlambda = a N + L - a E,
//	dtau/dlambda = r^2 tau',  R = P^2 - Delta (r^2 + (L - a E)^2),  W = r^2 dr/d(proper time),
//
// regular at turning points and through the future horizon.
type KerrFall struct {
	layers hyperboloidal.KerrLayers
	e, l   float64
	isco   float64 // its radius when this is the geodesic that leaves it, else 0
}

// NewKerrFall returns the equation of motion of energy e and angular momentum l
// per mass. Constants equal to those of the innermost stable circular orbit to
// rounding mean exactly the geodesic that leaves it, R = (1-E^2) r (r_isco - r)^3:
// near the ISCO the general form would lose nine digits to cancellation.
func NewKerrFall(s hyperboloidal.KerrLayers, e, l float64) *KerrFall {
	f := &KerrFall{layers: s, e: e, l: l}
	r := s.Hole.ISCO()
	k, _, err := CircularKerr(s.Hole, r)
	if err == nil && math.Abs(e-k.E) < 8e-16*k.E && math.Abs(l-k.L) < 8e-16*k.L {
		f.isco = r
	}
	return f
}

// RadialPotential returns R(r) of the equatorial geodesic.
func (f *KerrFall) RadialPotential(r float64) float64 {
	a := f.layers.Hole.Spin()
	if f.isco > 0 {
		d := f.isco - r
		return (1 - f.e) * (1 + f.e) * r * d * d * d
	}
	p := f.e*(r*r+a*a) - a*f.l
	d := f.l - a*f.e
	return p*p - (r*r-2*r+a*a)*(r*r+d*d)
}

// Begin returns the state at radius r and ingoing azimuth phi, moving inwards
// (inward true) or outwards, or an error where the radius is not allowed. A
// potential that is negative by round-off alone counts as a turning point.
func (f *KerrFall) Begin(r, phi float64, inward bool) (KerrState, error) {
	h := f.layers.Hole
	pot := f.RadialPotential(r)
	scale := math.Pow(f.e*(r*r+h.Spin()*h.Spin()), 2)
	if pot < -1e-13*scale {
		return KerrState{}, &KerrOrbitError{Key: "from", Value: r, Limit: math.NaN(),
			Reason: fmt.Sprintf("the geodesic with E = %.9g and L = %.9g does not reach this radius", f.e, f.l)}
	}
	w := math.Sqrt(math.Max(pot, 0))
	if inward {
		w = -w
	}
	return KerrState{
		Rho: f.layers.Rho(r - h.OuterHorizon()), R: r, Sin: 1, Phi: phi, Wr: w, E: f.e, L: f.l,
	}, nil
}

// State returns the full state of (rho, W, phi~).
func (f *KerrFall) State(rho, w, phi float64) KerrState {
	p := f.layers.Along(rho)
	return KerrState{Rho: rho, R: 1 / p.X, Sin: 1, Phi: phi, Wr: w, E: f.e, L: f.l}
}

// rates writes d(rho, W, phi~)/d(tau).
func (f *KerrFall) rates(dst *[3]float64, v *[3]float64) {
	h := f.layers.Hole
	a := h.Spin()
	p := f.layers.Along(v[0])
	r := 1 / p.X
	k := KerrState{R: r, Sin: 1, Wr: v[1], E: f.e, L: f.l}
	tau := k.SigmaTau(a, p.B)
	pp := f.e*(r*r+a*a) - a*f.l
	d := f.l - a*f.e
	delta := r*r - 2*r + a*a
	half := 2*f.e*r*pp - (r-1)*(r*r+d*d) - r*delta
	if f.isco > 0 {
		d := f.isco - r
		half = 0.5 * (1 - f.e) * (1 + f.e) * d * d * (f.isco - 4*r)
	}
	dst[0] = -v[1] * p.X * p.X / p.X1 / tau
	dst[1] = half / tau
	dst[2] = k.SigmaPhi(a) / tau
}

// Sample integrates from the state begin at sample 0 in n-1 steps of length step
// in slicing time, with the eleven-stage scheme of order 8 of G. J. Cooper and
// J. H. Verner, SIAM J. Numer. Anal. 9, 389 (1972). It stops early, with fewer
// samples, when the particle passes rho = stop on its way in.
func (f *KerrFall) Sample(begin KerrState, step float64, n int, stop float64) []KerrState {
	out := make([]KerrState, 0, n)
	v := [3]float64{begin.Rho, begin.Wr, begin.Phi}
	tab := cooperVerner()
	for i := range n {
		out = append(out, f.State(v[0], v[1], v[2]))
		if v[0] < stop || i == n-1 {
			break
		}
		tab.step(f, &v, step)
	}
	return out
}

type eighthOrder struct {
	a [11][10]float64
	b [11]float64
}

func cooperVerner() *eighthOrder {
	s := math.Sqrt(21)
	t := &eighthOrder{b: [11]float64{1. / 20, 0, 0, 0, 0, 0, 0, 49. / 180, 16. / 45, 49. / 180, 1. / 20}}
	for i, row := range [][]float64{
		{},
		{.5},
		{.25, .25},
		{1. / 7, (-7 - 3*s) / 98, (21 + 5*s) / 49},
		{(11 + s) / 84, 0, (18 + 4*s) / 63, (21 - s) / 252},
		{(5 + s) / 48, 0, (9 + s) / 36, (-231 + 14*s) / 360, (63 - 7*s) / 80},
		{(10 - s) / 42, 0, (-432 + 92*s) / 315, (633 - 145*s) / 90, (-504 + 115*s) / 70, (63 - 13*s) / 35},
		{1. / 14, 0, 0, 0, (14 - 3*s) / 126, (13 - 3*s) / 63, 1. / 9},
		{1. / 32, 0, 0, 0, (91 - 21*s) / 576, 11. / 72, (-385 - 75*s) / 1152, (63 + 13*s) / 128},
		{1. / 14, 0, 0, 0, 1. / 9, (-733 - 147*s) / 2205, (515 + 111*s) / 504, (-51 - 11*s) / 56, (132 + 28*s) / 245},
		{0, 0, 0, 0, (-42 + 7*s) / 18, (-18 + 28*s) / 45, (-273 - 53*s) / 72, (301 + 53*s) / 72, (28 - 28*s) / 45, (49 - 7*s) / 18},
	} {
		copy(t.a[i][:], row)
	}
	return t
}

func (t *eighthOrder) step(f *KerrFall, v *[3]float64, h float64) {
	var k [11][3]float64
	for i := range k {
		y := *v
		for j := range i {
			if c := t.a[i][j]; c != 0 {
				for q := range y {
					y[q] += h * c * k[j][q]
				}
			}
		}
		f.rates(&k[i], &y)
	}
	for i, b := range t.b {
		for q := range v {
			v[q] += h * b * k[i][q]
		}
	}
}

// KerrFromVelocity returns the state of a particle at Boyer–Lindquist radius r
// and azimuth phi in the equatorial plane with the coordinate velocities
// rdot = dr/dt and phidot = dphi/dt: E and L are those of the instantaneous
// four-velocity (u^t from its norm). It returns an error where the velocity is
// not timelike. Rho is left at the tortoise coordinate (flat part).
func KerrFromVelocity(h hyperboloidal.Kerr, r, phi, rdot, phidot float64) (KerrState, error) {
	a := h.Spin()
	y := r - h.OuterHorizon()
	if !(y > 0) {
		return KerrState{}, fmt.Errorf("worldline: radius %g is not outside the horizon at %g", r, h.OuterHorizon())
	}
	delta := y * (y + 2*h.Eccentre())
	gtt, gtp := -(1 - 2/r), -2*a/r
	gpp := r*r + a*a + 2*a*a/r
	n := -(gtt + 2*gtp*phidot + gpp*phidot*phidot + r*r/delta*rdot*rdot)
	if !(n > 0) {
		return KerrState{}, fmt.Errorf("worldline: at r = %g the velocity dr/dt = %g, dphi/dt = %g is not below that of light", r, rdot, phidot)
	}
	ut := 1 / math.Sqrt(n)
	return KerrState{
		Rho: h.Tortoise(y), R: r, Sin: 1, Phi: phi + h.Azimuth(y), Wr: r * r * ut * rdot,
		E: -ut * (gtt + gtp*phidot), L: ut * (gtp + gpp*phidot),
	}, nil
}
