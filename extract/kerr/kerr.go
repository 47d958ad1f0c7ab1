// Package kerr turns the Fourier amplitudes of the s = -2 Teukolsky fields at
// both ends of the grid into strain and fluxes.
package kerr

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"nullmark/equations"
	"nullmark/hyperboloidal"
)

// Rate is the flux of energy and angular momentum carried by one mode at one
// frequency, per coordinate time, positive when the orbit loses it.
type Rate struct{ Energy, AngularMomentum float64 }

// Infinity returns the flux at null infinity of the spherical mode m whose
// r psi4 has the amplitude z at the frequency omega, for this sign of m alone:
// |z|^2/(4 pi omega^2) and m/omega times it.
func Infinity(m int, omega float64, z complex128) Rate {
	e := (real(z)*real(z) + imag(z)*imag(z)) / (4 * math.Pi * omega * omega)
	return Rate{e, e * float64(m) / omega}
}

// Strain returns the amplitude of r h_lm from that of r psi4_lm at the frequency
// omega: psi4 = (1/2) d^2 h/dt^2.
func Strain(omega float64, z complex128) complex128 { return -2 * z / complex(omega*omega, 0) }

// Spheroidal holds the decomposition of the spherical fields of one m at one
// frequency into spheroidal ones.
type Spheroidal struct {
	Hole   hyperboloidal.Kerr
	M      int
	Omega  float64
	LMin   int
	Lambda []float64 // Teukolsky's separation constant of s = -2, by spheroidal l

	vectors *mat.Dense // column k: spheroidal mode k over spherical l
}

// NewSpheroidal diagonalises
//
//	lam_l + a^2 w^2 (1 - cos^2) - 4 a w cos
//
// over n spherical harmonics of spin weight -2; Lambda = eigenvalue - 2 a m w.
// The modes are in the order of their eigenvalues, which is that of l.
func NewSpheroidal(h hyperboloidal.Kerr, m, n int, omega float64) (*Spheroidal, error) {
	q := equations.Teukolsky{S: -2, M: m, Spin: h.Spin()}
	c := q.Couple(n)
	aw := h.Spin() * omega
	a := mat.NewSymDense(n, nil)
	for i := range n {
		a.SetSym(i, i, q.Eigenvalue(c.LMin+i)+aw*aw*c.Sin0[i]-4*aw*c.Cos0[i])
		if i+1 < n {
			a.SetSym(i, i+1, aw*aw*c.Sin1[i]-4*aw*c.Cos1[i])
		}
		if i+2 < n {
			a.SetSym(i, i+2, aw*aw*c.Sin2[i])
		}
	}
	var e mat.EigenSym
	if !e.Factorize(a, true) {
		return nil, fmt.Errorf("kerr: the spheroidal eigenvalue problem at m = %d, a omega = %g did not converge", m, aw)
	}
	s := &Spheroidal{Hole: h, M: m, Omega: omega, LMin: c.LMin, Lambda: e.Values(nil), vectors: new(mat.Dense)}
	e.VectorsTo(s.vectors)
	for i := range s.Lambda {
		s.Lambda[i] -= 2 * aw * float64(m)
	}
	return s, nil
}

// Project returns the amplitude of spheroidal mode k from those of the
// spherical modes.
func (s *Spheroidal) Project(k int, phi []complex128) complex128 {
	var z complex128
	for i, v := range phi {
		z += complex(s.vectors.At(i, k), 0) * v
	}
	return z
}

// Alpha returns alpha of the absorbed flux alpha |Z|^2/(4 pi omega^2) of mode k:
// 256 (2 r+)^5 k (k^2+4 eps^2)(k^2+16 eps^2) omega^3/|C|^2, k = omega - m Omega_H,
// eps = sqrt(1-a^2)/(4 r+), |C|^2 the Teukolsky–Starobinsky constant (S. A.
// Teukolsky and W. H. Press, ApJ 193, 443 (1974); M. Sasaki and H. Tagoshi,
// Living Rev. Relativity 6, 6 (2003), eqs 194, 195).
func (s *Spheroidal) Alpha(k int) float64 {
	h := s.Hole
	a, w, m, lam := h.Spin(), s.Omega, float64(s.M), s.Lambda[k]
	rp := h.OuterHorizon()
	kk := w - m*h.HorizonFrequency()
	eps := h.Eccentre() / (4 * rp)
	return 256 * math.Pow(2*rp, 5) * kk * (kk*kk + 4*eps*eps) * (kk*kk + 16*eps*eps) * w * w * w / Starobinsky(a, m, w, lam)
}

// Starobinsky returns |C|^2.
func Starobinsky(a, m, w, lam float64) float64 {
	aw := a * w
	return ((lam+2)*(lam+2)+4*m*aw-4*aw*aw)*(lam*lam+36*m*aw-36*aw*aw) +
		(2*lam+3)*(96*aw*aw-48*m*aw) + 144*w*w*(1-a)*(1+a)
}

// Horizon returns the flux into the hole by spheroidal mode, for this sign of m
// alone, from the amplitudes of Phi_l at the horizon (s = -2, the field of
// package equations). Its sign is that of omega - m Omega_H.
func (s *Spheroidal) Horizon(phi []complex128) []Rate {
	out := make([]Rate, len(s.Lambda))
	for k := range out {
		z := cmplx.Abs(s.Project(k, phi)) / s.Hole.OuterHorizon()
		e := s.Alpha(k) * z * z / (4 * math.Pi * s.Omega * s.Omega)
		out[k] = Rate{e, e * float64(s.M) / s.Omega}
	}
	return out
}
