package equations

import (
	"fmt"
	"math"

	"nullmark/hyperboloidal"
)

// Teukolsky is the wave equation of spin weight S on a Kerr hole at azimuthal
// number M, written for the fields Phi_l(tau, rho) of
//
//	Psi_s = Delta^-s r^-1 SUM_l Phi_l(tau, rho) sYlm(theta) e^{i M phi~}
//
// (S. A. Teukolsky, ApJ 185, 635 (1973); Psi_-2 = (r - i a cos theta)^4 psi4,
// Psi_2 = psi0; phi~ is the azimuth regular on the future horizon). On a slicing
// of package hyperboloidal it reads
//
//	[A0 - a^2 S2] Phi_tt + Axt Phi_t,rho + Axx Phi_rho,rho + Ax Phi_rho
//	  + [At + 2 i a S Cth] Phi_t + [lam_l + V] Phi = source
//
// where Cth and S2 are the matrices of cos theta and sin^2 theta between
// spin-weighted spherical harmonics. At S = -2 and at null infinity Phi_l is
// r psi4_lm.
type Teukolsky struct {
	S, M int
	Spin float64 // a
}

// TeukolskyCoefficients holds the coefficients of Teukolsky at one point,
// those of derivatives along the grid already converted to d/drho.
type TeukolskyCoefficients struct {
	A0  float64    // of Phi_tt, without the -a^2 S2 part
	Axt float64    // of Phi_t,rho; exactly 0 in the flat part
	Axx float64    // of Phi_rho,rho
	Ax  complex128 // of Phi_rho
	At  complex128 // of Phi_t, without the 2 i a S Cth part
	V   complex128 // of Phi, without lam_l
}

// check panics unless |S| is 0, 1 or 2.
func (q Teukolsky) check() {
	if q.S < -2 || q.S > 2 {
		panic(fmt.Sprintf("equations: spin weight %d", q.S))
	}
}

// At returns the coefficients at the point p of a slicing of the hole with
// spin q.Spin.
func (q Teukolsky) At(p hyperboloidal.KerrPoint) TeukolskyCoefficients {
	q.check()
	s, m, a := float64(q.S), float64(q.M), q.Spin
	a2, x := a*a, p.X
	x2 := x * x
	axx := -x2 * p.D
	bx := complex(-2*(1+s)*x+(6+2*s)*x2-4*a2*x2*x, 2*m*a*x2)
	var b float64
	if p.Where == hyperboloidal.InnerPart {
		r := 1 / x
		b = 4*s*r - 2*s*p.B*(r-1)
	} else {
		b = s * (-4*(1-a2*x2) + 2*x*(1-x)*p.C) / p.D
	}
	c := TeukolskyCoefficients{
		A0:  p.A0(),
		Axx: axx / (p.X1 * p.X1),
		Ax:  bx/complex(p.X1, 0) - complex(axx*p.X2/(p.X1*p.X1*p.X1), 0),
		At:  complex(b+x2*p.Cx+2*x*p.C-2*a2*x, 2*m*a*(p.B-1)),
		V:   complex(2*(1+s)*x-2*a2*x2, 2*m*a*x),
	}
	if p.Where != hyperboloidal.FlatPart {
		c.Axt = -2 * (1 + a2*x2 - x2*p.C) / p.X1
	}
	return c
}

// LMin returns the lowest l that exists at this S and M.
func (q Teukolsky) LMin() int { return max(q.S, -q.S, q.M, -q.M) }

// Eigenvalue returns lam_l = (l - S)(l + S + 1).
func (q Teukolsky) Eigenvalue(l int) float64 { return float64((l - q.S) * (l + q.S + 1)) }

// Coupling holds the angular matrices over l = LMin .. LMin+n-1, by diagonals:
// Cos0[i] = <l|cos theta|l>, Cos1[i] = <l|cos theta|l+1>, and the same for
// sin^2 theta = 1 - cos^2 theta up to the second neighbour. The off-diagonals
// of the last entries (towards l that are left out) are 0.
type Coupling struct {
	LMin             int
	Cos0, Cos1       []float64
	Sin0, Sin1, Sin2 []float64
}

// Couple returns the coupling matrices for n values of l. The square of the
// matrix of cos theta is taken with one l more, so that Sin is the exact
// restriction of sin^2 theta. It panics if n < 1.
func (q Teukolsky) Couple(n int) Coupling {
	q.check()
	if n < 1 {
		panic("equations: no angular modes")
	}
	c := Coupling{
		LMin: q.LMin(),
		Cos0: make([]float64, n), Cos1: make([]float64, n),
		Sin0: make([]float64, n), Sin1: make([]float64, n), Sin2: make([]float64, n),
	}
	for i := range n {
		l := c.LMin + i
		d, up := q.cosDiagonal(l), q.cosUp(l)
		c.Cos0[i] = d
		c.Sin0[i] = 1 - d*d - up*up
		if i > 0 {
			down := q.cosUp(l - 1)
			c.Sin0[i] -= down * down
		}
		if i+1 < n {
			c.Cos1[i] = up
			c.Sin1[i] = -up * (d + q.cosDiagonal(l+1))
		}
		if i+2 < n {
			c.Sin2[i] = -up * q.cosUp(l+1)
		}
	}
	return c
}

// cosDiagonal returns <l|cos theta|l> = -m s/(l(l+1)), 0 at l = 0.
func (q Teukolsky) cosDiagonal(l int) float64 {
	if l == 0 {
		return 0
	}
	return -float64(q.M*q.S) / float64(l*(l+1))
}

// cosUp returns <l|cos theta|l+1> =
// sqrt[((l+1)^2-m^2)((l+1)^2-s^2)/((l+1)^2(2l+1)(2l+3))].
func (q Teukolsky) cosUp(l int) float64 {
	p := (l + 1) * (l + 1)
	return math.Sqrt(float64((p-q.M*q.M)*(p-q.S*q.S)) / (float64(p) * float64((2*l+1)*(2*l+3))))
}
