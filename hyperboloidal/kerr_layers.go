package hyperboloidal

import (
	"errors"
	"fmt"
	"math"
)

// KerrLayers is a hyperboloidal slicing of a Kerr hole. The grid coordinate rho
// runs over [Si, So]; between Ri and Ro it is the tortoise coordinate and the
// slices are those of constant Boyer–Lindquist time; in the two layers r is
// compactified with the profile g(z) = exp(Steepness (1 - 1/z)), O = 1 - g:
//
//	outer, z = (rho-Ro)/(So-Ro):  x = 1/r = O/(r+ + y_t(rho)),          tau - rho = t - r*
//	inner, z = (Ri-rho)/(Ri-Si):  y = O y_t(rho) + (1-O) Slope (rho-Si), tau + rho = t + r*
//
// with y_t the inverse of the tortoise coordinate. rho = So is future null
// infinity, rho = Si the future horizon. Retarded time at infinity is
// u = tau - So, advanced time at the horizon v = tau + Si; both exactly, with
// the additive constant of r* stated at Kerr.
//
// Slope = 0 serves worldlines that stay outside the horizon; one that falls in
// needs Slope > 0 (see KerrPlungeSlope), because with 0 the slope dr/drho
// vanishes just beyond the horizon.
type KerrLayers struct {
	Hole           Kerr
	Si, Ri, Ro, So float64
	Steepness      float64
	Slope          float64
}

// Check returns an error unless Si < Ri <= Ro < So, all finite, Steepness > 0
// and Slope >= 0.
func (s KerrLayers) Check() error {
	for _, v := range []float64{s.Si, s.Ri, s.Ro, s.So, s.Steepness, s.Slope} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return errors.New("hyperboloidal: a layer boundary is not a finite number")
		}
	}
	if !(s.Si < s.Ri && s.Ri <= s.Ro && s.Ro < s.So) {
		return fmt.Errorf("hyperboloidal: layers out of order: want Si < Ri <= Ro < So, have %g, %g, %g, %g", s.Si, s.Ri, s.Ro, s.So)
	}
	if !(s.Steepness > 0) || s.Slope < 0 {
		return fmt.Errorf("hyperboloidal: steepness %g must be positive and slope %g not negative", s.Steepness, s.Slope)
	}
	return nil
}

// KerrPlungeSlope returns the Slope that suits a worldline falling through the
// horizon: fraction · y_t(Si) (r+-r-)/(2 r+). Fractions 0.03 to 0.1 work.
func KerrPlungeSlope(h Kerr, si, fraction float64) float64 {
	return fraction * h.InverseTortoise(si) * 2 * h.e / (2 * h.rp)
}

// Region tells the three parts of a slicing apart.
type Region uint8

// The parts of a slicing, from the horizon outwards.
const (
	InnerPart Region = iota
	FlatPart
	OuterPart
)

// KerrPoint is the geometry of a slicing at one value of rho. A prime is
// d/drho; x = 1/r, y = r - r+, d = Delta x^2.
type KerrPoint struct {
	Rho           float64
	Where         Region
	X, X1, X2, X3 float64 // x, x', x'', x'''
	Y             float64 // r - r+ (+Inf at null infinity)
	R1, R2, R3    float64 // r', r'', r''' (inner layer and flat part; 0 in the outer layer)
	D             float64 // Delta/r^2
	B             float64 // tau = v - int B dr, v = t + r*
	C             float64 // 2 K - B Delta
	Cx            float64 // dC/dx
	Bx, Bxx       float64 // dB/dx and d2B/dx2 (inner layer and flat part; 0 in the outer layer)
}

// A0 returns C B, the coefficient of the second time derivative in the radial
// part of the wave operator.
func (p KerrPoint) A0() float64 { return p.C * p.B }

// At evaluates the slicing at rho. It panics outside [Si, So], but allows rho
// slightly below Si (inside the horizon) when Slope > 0, where the worldline
// of a plunge still needs it.
func (s KerrLayers) At(rho float64) KerrPoint { return s.at(rho, s.Hole.InverseTortoise) }

// Along is At without the extended-precision polish of the inverse tortoise
// coordinate, a hundred times cheaper and good to a few units of 1e-15: for
// worldlines, which ask at every stage of every step.
func (s KerrLayers) Along(rho float64) KerrPoint { return s.at(rho, s.Hole.newtonTortoise) }

func (s KerrLayers) at(rho float64, inverse func(float64) float64) KerrPoint {
	h := s.Hole
	if rho > s.So || (rho < s.Si && s.Slope == 0) || math.IsNaN(rho) {
		panic(fmt.Sprintf("hyperboloidal: rho = %g outside [%g, %g]", rho, s.Si, s.So))
	}
	a2 := h.a * h.a
	p := KerrPoint{Rho: rho}
	switch {
	case rho > s.Ro:
		p.Where = OuterPart
		t := s.tortoiseJet(rho, inverse)
		t[0] += h.rp
		x := s.profile((rho-s.Ro)/(s.So-s.Ro), (rho-s.So)/(s.So-s.Ro), 1/(s.So-s.Ro)).over(t)
		p.X, p.X1, p.X2, p.X3 = x[0], x[1], x[2], x[3]
		p.Y = math.Inf(1)
		if p.X > 0 {
			p.Y = 1/p.X - h.rp
		}
		p.D = 1 - 2*p.X + a2*p.X*p.X
		p.C = p.D / -p.X1
		p.Cx = (-2+2*a2*p.X)/(-p.X1) - p.D*p.X2/(-p.X1*p.X1*p.X1)
		p.B = (2*(1+a2*p.X*p.X) - p.X*p.X*p.C) / p.D
		return p
	case rho >= s.Ri:
		p.Where = FlatPart
		y := s.tortoiseJet(rho, inverse)
		p.fromY(h, y)
		kay, delta := h.kay(p.Y), h.delta(p.Y)
		p.B, p.C = kay/delta, kay
		r := h.rp + p.Y
		p.Cx = -2 * r * r * r
	default:
		p.Where = InnerPart
		o := s.profile((s.Ri-rho)/(s.Ri-s.Si), (s.Si-rho)/(s.Ri-s.Si), -1/(s.Ri-s.Si))
		y := o.times(s.tortoiseJet(rho, inverse))
		if s.Slope > 0 {
			y = y.plus(kerrJet{1 - o[0], -o[1], -o[2], -o[3]}.times(kerrJet{s.Slope * (rho - s.Si), s.Slope, 0, 0}))
		}
		p.fromY(h, y)
		r := h.rp + p.Y
		delta := h.delta(p.Y)
		p.B = 1 / p.R1
		p.C = 2*h.kay(p.Y) - delta*p.B
		cr := 4*r - 2*(r-1)*p.B + delta*p.R2/(p.R1*p.R1*p.R1)
		p.Cx = -r * r * cr
	}
	// B = 1/r' in both cases: in the flat part r' = Delta/K.
	r1, r2, r3 := p.R1, p.R2, p.R3
	p.Bx = -r2 / (r1 * r1) / p.X1
	p.Bxx = ((-r3/(r1*r1) + 2*r2*r2/(r1*r1*r1)) - p.Bx*p.X2) / (p.X1 * p.X1)
	return p
}

func (p *KerrPoint) fromY(h Kerr, y kerrJet) {
	p.Y, p.R1, p.R2, p.R3 = y[0], y[1], y[2], y[3]
	r := y
	r[0] += h.rp
	x := kerrJet{1}.over(r)
	p.X, p.X1, p.X2, p.X3 = x[0], x[1], x[2], x[3]
	p.D = h.delta(p.Y) * p.X * p.X
}

// Rho inverts the slicing: the rho of the point with r - r+ = y outside the
// horizon. Newton from the tortoise coordinate, safeguarded by bisection; the
// result is good to a few units in the last place of So-Si.
func (s KerrLayers) Rho(y float64) float64 {
	rs := s.Hole.Tortoise(y)
	if rs >= s.Ri && rs <= s.Ro {
		return rs
	}
	lo, hi := s.Si, s.Ri
	if rs > s.Ro {
		lo, hi = s.Ro, s.So
	}
	x := 1 / (s.Hole.rp + y)
	for range 200 {
		mid := lo + (hi-lo)/2
		if mid == lo || mid == hi {
			break
		}
		p := s.Along(mid)
		less := p.Y < y
		if p.Where == OuterPart {
			less = p.X > x
		}
		if less {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo + (hi-lo)/2
}

// Height returns tau - t at rho: 0 in the flat part, rho - r* in the outer
// layer, r* - rho in the inner one. It panics at the two ends, where t is
// infinite.
func (s KerrLayers) Height(rho float64) float64 {
	p := s.At(rho)
	switch p.Where {
	case OuterPart:
		return rho - s.Hole.Tortoise(p.Y)
	case InnerPart:
		return s.Hole.Tortoise(p.Y) - rho
	}
	return 0
}

// kerrJet holds a function of rho and its first three derivatives.
type kerrJet [4]float64

func (a kerrJet) plus(b kerrJet) kerrJet {
	return kerrJet{a[0] + b[0], a[1] + b[1], a[2] + b[2], a[3] + b[3]}
}

func (a kerrJet) times(b kerrJet) kerrJet {
	return kerrJet{
		a[0] * b[0],
		a[1]*b[0] + a[0]*b[1],
		a[2]*b[0] + 2*a[1]*b[1] + a[0]*b[2],
		a[3]*b[0] + 3*a[2]*b[1] + 3*a[1]*b[2] + a[0]*b[3],
	}
}

// over returns a/b, solving a = c b order by order.
func (a kerrJet) over(b kerrJet) kerrJet {
	var c kerrJet
	c[0] = a[0] / b[0]
	c[1] = (a[1] - c[0]*b[1]) / b[0]
	c[2] = (a[2] - c[0]*b[2] - 2*c[1]*b[1]) / b[0]
	c[3] = (a[3] - c[0]*b[3] - 3*c[1]*b[2] - 3*c[2]*b[1]) / b[0]
	return c
}

// tortoiseJet returns y_t(rho) with derivatives, from dy/dr* = Delta/K.
func (s KerrLayers) tortoiseJet(rho float64, inverse func(float64) float64) kerrJet {
	h := s.Hole
	y := inverse(rho)
	r := h.rp + y
	n, n1, n2 := h.delta(y), 2*(y+h.e), 2.0
	k, k1, k2 := h.kay(y), 2*r, 2.0
	g := n / k
	g1 := (n1 - g*k1) / k
	g2 := (n2 - 2*g1*k1 - g*k2) / k
	return kerrJet{y, g, g1 * g, (g2*g + g1*g1) * g}
}

// profile returns O = 1 - exp(Steepness (1 - 1/z)) as a jet in rho, where
// zm1 = z - 1 comes separately so that O keeps its digits as z -> 1, and z1 is
// dz/drho. For z <= 0 it is 1.
func (s KerrLayers) profile(z, zm1, z1 float64) kerrJet {
	k := s.Steepness
	if z <= 0 || k/z > 740 {
		return kerrJet{1}
	}
	g := math.Exp(k * zm1 / z)
	i := 1 / z
	g1 := k * i * i
	g2 := k * i * i * i * (k*i - 2)
	g3 := k * i * i * i * i * (k*k*i*i - 6*k*i + 6)
	return kerrJet{-math.Expm1(k * zm1 / z), -g * g1 * z1, -g * g2 * z1 * z1, -g * g3 * z1 * z1 * z1}
}
