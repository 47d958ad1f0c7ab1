package source

import (
	"math"
	"math/cmplx"

	"nullmark/equations"
)

// Motion is the state of a particle on Schwarzschild as the source needs it:
// areal radius R, height Y = R-2 (to its own relative precision), P = u^r,
// azimuth Phi, specific energy E and angular momentum L of the instantaneous
// velocity.
type Motion struct {
	R, Y, P, Phi, E, L float64
}

// MasterSource gives F and G of
//
//	-d_t^2 Psi + d_{r_*}^2 Psi - V Psi = G delta(r_*-r_*p) + F delta'(r_*-r_*p)
//
// for one (l,m) of an equatorial particle, prime = d/dr_*: Zerilli–Moncrief
// normalisation for even, Cunningham–Price–Moncrief for odd modes. It is
// regular at turning points and at the horizon.
//
// Source: the source terms of K. Martel and E. Poisson, Phys. Rev. D 71, 104003
// (2005), reduced to a particle on the equator; checked in the tests by fluxes
// and strains computed independently in the frequency domain.
type MasterSource struct {
	L, M   int
	Parity equations.Parity
	y      float64 // Y_lm(pi/2, 0) or its theta derivative
}

// NewMasterSource returns the source coefficients of (l,m), l >= 2, |m| <= l.
func NewMasterSource(l, m int) MasterSource {
	s := MasterSource{L: l, M: m, Parity: equations.EquatorialParity(l, m)}
	if s.Parity == equations.Even {
		s.y = equatorY(l, m)
	} else {
		s.y = equatorYTheta(l, m)
	}
	return s
}

// At returns F and G for the given state of motion.
func (s MasterSource) At(w *Motion) (f, g complex128) {
	fr, gr := s.Amplitudes(w)
	ph := cmplx.Exp(complex(0, -float64(s.M)*w.Phi))
	return fr * ph, gr * ph
}

// Amplitudes returns F and G without the factor e^{-i m Phi}.
func (s MasterSource) Amplitudes(w *Motion) (f, g complex128) {
	if s.Parity == equations.Even {
		return s.even(w)
	}
	return s.odd(w)
}

func (s MasterSource) even(w *Motion) (complex128, complex128) {
	l, m := float64(s.L), float64(s.M)
	l2 := l * (l + 1)
	lam := (l - 1) * (l + 2) / 2
	r, p, e := w.R, w.P, w.E
	f := w.Y / r
	u := w.L / (r * r)
	bigLam := lam + 3/r
	c := 8 * math.Pi * s.y
	ratio := 1 / ((l - 1) * l * (l + 1) * (l + 2)) // (l-2)!/(l+2)!

	qd := c * f * f * (1 + w.L*w.L/(r*r)) / (e * r * r)
	a := c * e / (r * r)
	qrrByF := c * p * p / (e * r * r) // q^rr/f
	qf := c * f * u * u / e
	qs := 32 * math.Pi * r * r * ratio * (f * u * u / e) * (l2/2 - m*m) * s.y
	qr := (16 * math.Pi / l2) * (p * f * u / e) * s.y // times -i m

	n := r * r * qd
	nr := 2*r*qd + 4*a
	F := n / ((lam + 1) * bigLam * f)
	G := (r*(bigLam-f)*qrrByF+r*f*qf-(a/(r*bigLam))*(lam*(lam-1)*r*r+(4*lam-9)*r+15))/((lam+1)*bigLam) -
		qs/r - (nr*bigLam+3*n/(r*r))/((lam+1)*bigLam*bigLam)
	return complex(F, 0), complex(G, -2*m*qr/bigLam)
}

func (s MasterSource) odd(w *Motion) (complex128, complex128) {
	l, m := float64(s.L), float64(s.M)
	l2 := l * (l + 1)
	mu := (l - 1) * (l + 2)
	r, p, e, bigL := w.R, w.P, w.E, w.L
	f := w.Y / r
	u := bigL / (r * r)
	rdot := f * p / e
	phidot := f * bigL / (r * r * e)
	// dp/dt = -(f/2E) d/dr [f (1 + L^2/r^2)]
	pdot := -(f / (2 * e)) * ((2/(r*r))*(1+bigL*bigL/(r*r)) - f*2*bigL*bigL/(r*r*r))
	c0 := (16 * math.Pi / l2) * s.y
	c := c0 * p * bigL / (r * r * e)
	// k/f = c0 u - c (rdot/f), free of the division by f.
	kByF := c0*u - c*p/e
	k := f * kByF
	cdot := complex(c0*(bigL/e)*(pdot/(r*r)-2*p*rdot/(r*r*r)), -c0*(bigL/e)*m*phidot*p/(r*r))
	F := complex(-(2*r/mu)*kByF, 0)
	G := -complex(2*r/mu, 0)*cdot + complex((2/mu)*k, 0)
	return F, G
}

// equatorY is Y_lm(pi/2, 0) with the Condon–Shortley phase.
func equatorY(l, m int) float64 {
	if m < 0 {
		y := equatorY(l, -m)
		if m%2 != 0 {
			return -y
		}
		return y
	}
	return ylmNorm(l, m) * legendreZero(l, m)
}

// equatorYTheta is d Y_lm/d theta at (pi/2, 0).
func equatorYTheta(l, m int) float64 {
	if m < 0 {
		y := equatorYTheta(l, -m)
		if m%2 != 0 {
			return -y
		}
		return y
	}
	// d/dtheta = -d/dx at x = 0, P_l^m'(0) = (l+m) P_{l-1}^m(0).
	return -ylmNorm(l, m) * float64(l+m) * legendreZero(l-1, m)
}

func ylmNorm(l, m int) float64 {
	ratio := 1.0 // (l-m)!/(l+m)!
	for k := l - m + 1; k <= l+m; k++ {
		ratio /= float64(k)
	}
	return math.Sqrt(float64(2*l+1) / (4 * math.Pi) * ratio)
}

// legendreZero is P_l^m(0) = (-1)^{(l+m)/2} (l+m-1)!!/(l-m)!! for even l+m.
func legendreZero(l, m int) float64 {
	if l < m || (l+m)%2 != 0 {
		return 0
	}
	v := 1.0
	for k := l + m - 1; k > 1; k -= 2 {
		v *= float64(k)
	}
	for k := l - m; k > 1; k -= 2 {
		v /= float64(k)
	}
	if ((l+m)/2)%2 != 0 {
		v = -v
	}
	return v
}
