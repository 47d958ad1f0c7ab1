package hyperboloidal

import (
	"fmt"
	"math"
)

// Profile is the smooth transition of a layer: Omega(x) falls from 1 at x = 0
// to 0 at x = 1. At returns Omega and its first two derivatives in x. Its
// smoothness at x = 0 bounds the order that finite differences reach there.
type Profile interface {
	At(x float64) (o, o1, o2 float64)
	String() string
}

// Power is Omega = 1 - x^n.
type Power int

// At implements Profile.
func (n Power) At(x float64) (o, o1, o2 float64) {
	p := float64(n)
	xn2 := math.Pow(x, p-2)
	return 1 - xn2*x*x, -p * xn2 * x, -p * (p - 1) * xn2
}

func (n Power) String() string { return fmt.Sprintf("1-x^%d", int(n)) }

// Flat is Omega = 1 - exp(k (1-1/x)), infinitely smooth at x = 0.
type Flat float64

// At implements Profile.
func (k Flat) At(x float64) (o, o1, o2 float64) {
	if x <= 0 {
		return 1, 0, 0
	}
	q := float64(k)
	g := math.Exp(q * (1 - 1/x))
	if g == 0 {
		return 1, 0, 0
	}
	g1 := g * q / (x * x)
	return -math.Expm1(q * (1 - 1/x)), -g1, -(g1*q/(x*x) - 2*g1/x)
}

func (k Flat) String() string { return fmt.Sprintf("1-exp(%g(1-1/x))", float64(k)) }

// Layers describes a slicing on rho in [Si, So]. Between Ri and Ro the slices
// are those of Schwarzschild time and rho = r_*. In the outer layer (Ro, So]
//
//	r = r_t(rho)/Omega(x),  x = (rho-Ro)/(So-Ro),  tau - rho = t - r_*,
//
// r_t the inverse of r_*(r), so that outgoing rays keep unit speed and the
// label of an outgoing ray, retarded time u, is tau - rho up to So: So is null
// infinity. In the inner layer [Si, Ri)
//
//	r - 2 = Omega(x) (r_t(rho)-2) + (1-Omega(x)) Alpha (rho-Si),
//	x = (Ri-rho)/(Ri-Si),  tau + rho = t + r_*,
//
// the mirror image: Si is the horizon, and advanced time v = tau + rho there.
// Alpha = 0 serves orbits that stay outside the inner layer; a larger one, up to
// the slope dr_t/drho = 1-2/r_t at Si, keeps dr/drho from vanishing just beyond
// the horizon. Up to that slope r_t - 2 stays above Alpha (rho-Si), so that r
// grows throughout the layer.
type Layers struct {
	Si, Ri, Ro, So float64
	Profile        Profile
	Alpha          float64
}

// Check returns an error when the four places are not in order, there is no
// profile, or Alpha is outside its range.
func (g Layers) Check() error {
	if !(g.Si < g.Ri && g.Ri < g.Ro && g.Ro < g.So) {
		return fmt.Errorf("hyperboloidal: layers want Si < Ri < Ro < So, got %g, %g, %g, %g", g.Si, g.Ri, g.Ro, g.So)
	}
	if g.Profile == nil {
		return fmt.Errorf("hyperboloidal: layers want a profile")
	}
	y := InverseTortoise(g.Si)
	if most := y / (2 + y); !(g.Alpha >= 0 && g.Alpha <= most) {
		return fmt.Errorf("hyperboloidal: layers want Alpha from 0 to %g (1-2/r at r_* = %g), got %g", most, g.Si, g.Alpha)
	}
	return nil
}

// Retarded returns the retarded time u = t - r_* at null infinity on slice tau.
func (g Layers) Retarded(tau float64) float64 { return tau - g.So }

// Advanced returns the advanced time v = t + r_* at the horizon on slice tau.
func (g Layers) Advanced(tau float64) float64 { return tau + g.Si }

// Point is the slicing at one rho.
type Point struct {
	Rho float64
	R   float64 // areal radius, +Inf at null infinity
	Y   float64 // r - 2, with its own full relative precision
	X   float64 // 1/r, 0 at null infinity
	// Boost is L = drho/dr_*, BoostPrime = dL/drho.
	Boost, BoostPrime float64
	// Height is H = dh/dr_* with tau = t - h, HeightPrime = dH/drho.
	Height, HeightPrime float64
	// Stretch is (dr/drho)/r^2, finite at both ends: V/L = (V r^2/f) Stretch.
	Stretch float64
	// H0 is h itself: t = tau + h; +Inf at the two ends.
	H0 float64
}

// At evaluates the slicing at rho in [Si, So].
func (g Layers) At(rho float64) Point {
	y := InverseTortoise(rho)
	rt := 2 + y
	f := y / rt
	p := Point{Rho: rho}
	switch {
	case rho > g.Ro: // outer layer
		w := g.So - g.Ro
		o, o1, o2 := g.Profile.At((rho - g.Ro) / w)
		if rho >= g.So {
			o = 0
		}
		o1, o2 = o1/w, o2/(w*w)
		rt2 := f * 2 / (rt * rt) // d^2 r_t/d rho^2
		d := f*o - rt*o1
		d1 := rt2*o - rt*o2
		p.X = o / rt
		p.R = rt / o
		p.Y = (rt - 2*o) / o
		fr := 1 - 2*p.X // f at the point itself
		p.Boost = fr * o * o / d
		// L' = f_r (dr/drho) Omega^2/D + 2 f Omega Omega'/D - f Omega^2 D'/D^2,
		// and f_r dr/drho Omega^2/D = 2/r^2.
		p.BoostPrime = 2*p.X*p.X + 2*fr*o*o1/d - fr*o*o*d1/(d*d)
		p.Height, p.HeightPrime = 1-p.Boost, -p.BoostPrime
		p.Stretch = d / (rt * rt)
		if o == 0 {
			p.H0 = math.Inf(1)
		} else {
			p.H0 = Tortoise(p.Y) - rho
		}
	case rho < g.Ri: // inner layer
		w := g.Ri - g.Si
		o, o1, o2 := g.Profile.At((g.Ri - rho) / w)
		if rho <= g.Si {
			o = 0
		}
		o1, o2 = -o1/w, o2/(w*w)
		y1 := f
		y2 := f * 2 / (rt * rt)
		a := g.Alpha
		z := rho - g.Si
		yy := o*y + (1-o)*a*z
		r1 := o*y1 + o1*y + (1-o)*a - o1*a*z
		r2 := o*y2 + 2*o1*y1 + o2*y - 2*o1*a - o2*a*z
		p.Y, p.R, p.X = yy, 2+yy, 1/(2+yy)
		// L = f/(dr/drho) = y/(r r').
		p.Boost = yy / (p.R * r1)
		p.BoostPrime = 1/p.R - yy/(p.R*p.R) - yy*r2/(p.R*r1*r1)
		p.Height, p.HeightPrime = -(1 - p.Boost), p.BoostPrime
		p.Stretch = r1 * p.X * p.X
		if yy == 0 {
			p.H0 = math.Inf(1)
		} else {
			p.H0 = rho - Tortoise(yy)
		}
	default:
		p.R, p.Y, p.X = rt, y, 1/rt
		p.Boost = 1
		p.Stretch = f / (rt * rt)
	}
	return p
}

// Sample evaluates the slicing at every rho, rho[0] = Si and rho[n-1] = So.
func (g Layers) Sample(rho []float64) []Point {
	out := make([]Point, len(rho))
	for i, x := range rho {
		out[i] = g.At(x)
	}
	return out
}
