package source

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/equations"
)

// circular is a circular geodesic at r0, phase zero.
func circular(r0 float64) *Motion {
	ut := 1 / math.Sqrt(1-3/r0)
	return &Motion{R: r0, Y: r0 - 2, E: (1 - 2/r0) * ut, L: math.Sqrt(r0) * ut}
}

// TestCircularCoefficients at r0 = 10: values of an independent prototype in
// another language, whose source terms were checked against the linearised
// Einstein tensor in 30 digits.
func TestCircularCoefficients(t *testing.T) {
	for _, c := range []struct {
		l, m int
		g, f float64
	}{
		{2, 2, -0.3702204729317625, 1.345325703948737},
		{2, 1, 0.09784874864268997, -1.2231093580336245},
	} {
		f, g := NewMasterSource(c.l, c.m).At(circular(10))
		if cmplx.Abs(f-complex(c.f, 0)) > 4e-15 || cmplx.Abs(g-complex(c.g, 0)) > 4e-15 {
			t.Errorf("(%d,%d): F = %.17g, G = %.17g, want %.17g, %.17g", c.l, c.m, f, g, c.f, c.g)
		}
	}
}

// TestEquatorHarmonics against the explicit harmonics of l = 2 and 3 with the
// Condon–Shortley phase (e.g. J. D. Jackson, Classical Electrodynamics, section
// 3.5, from memory).
func TestEquatorHarmonics(t *testing.T) {
	pi := math.Pi
	for _, c := range []struct {
		l, m  int
		y, dy float64
	}{
		{2, 0, -math.Sqrt(5/pi) / 4, 0},
		{2, 1, 0, math.Sqrt(15/(2*pi)) / 2},
		{2, -1, 0, -math.Sqrt(15/(2*pi)) / 2},
		{2, 2, math.Sqrt(15/(2*pi)) / 4, 0},
		{2, -2, math.Sqrt(15/(2*pi)) / 4, 0},
		{3, 0, 0, 3 * math.Sqrt(7/pi) / 4},
		{3, 1, math.Sqrt(21/pi) / 8, 0},
		{3, -1, -math.Sqrt(21/pi) / 8, 0},
		{3, 2, 0, -math.Sqrt(105/(2*pi)) / 4},
		{3, 3, -math.Sqrt(35/pi) / 8, 0},
	} {
		if y, dy := equatorY(c.l, c.m), equatorYTheta(c.l, c.m); math.Abs(y-c.y) > 3e-16 || math.Abs(dy-c.dy) > 6e-16 {
			t.Errorf("(%d,%d): %.17g and %.17g, want %.17g and %.17g", c.l, c.m, y, dy, c.y, c.dy)
		}
	}
}

// harmonic is Y_lm(theta, 0), m >= 0, by the upward recursion of normalised
// associated Legendre functions.
func harmonic(l, m int, theta float64) float64 {
	x, s := math.Cos(theta), math.Sin(theta)
	p := math.Sqrt(1 / (4 * math.Pi))
	for k := 1; k <= m; k++ {
		p *= -s * math.Sqrt(float64(2*k+1)/float64(2*k))
	}
	last, coeff := 0.0, 0.0
	for k := m + 1; k <= l; k++ {
		a := math.Sqrt(float64(4*k*k-1) / float64(k*k-m*m))
		p, last = a*(x*p-coeff*last), p
		coeff = 1 / a
	}
	return p
}

// TestHarmonicsOfHighDegree against that recursion and its differences, and
// against the addition theorem: sum_m |Y|^2 = (2l+1)/(4 pi), sum_m |dY/dtheta|^2
// = l(l+1)(2l+1)/(8 pi).
func TestHarmonicsOfHighDegree(t *testing.T) {
	for l := 2; l <= 30; l++ {
		var sum, sumTheta float64
		for m := -l; m <= l; m++ {
			y, dy := equatorY(l, m), equatorYTheta(l, m)
			sum += y * y
			sumTheta += dy * dy
			if m < 0 {
				continue
			}
			wy := harmonic(l, m, math.Pi/2)
			wdy := slope(func(x float64) float64 { return harmonic(l, m, x) }, math.Pi/2, 2e-3)
			if math.Abs(y-wy) > 2e-14 || math.Abs(dy-wdy) > 1e-9*float64(l) {
				t.Errorf("(%d,%d): %.15g and %.12g, want %.15g and %.12g", l, m, y, dy, wy, wdy)
			}
		}
		n := float64(2*l+1) / (4 * math.Pi)
		if math.Abs(sum-n) > 1e-14*n || math.Abs(sumTheta-n*float64(l*(l+1))/2) > 1e-14*n*float64(l*(l+1)) {
			t.Errorf("l = %d: sums %.17g and %.17g, want %.17g and %.17g", l, sum, sumTheta, n, n*float64(l*(l+1))/2)
		}
	}
}

// geodesic is a state of a geodesic of energy e and angular momentum bigL, u^r
// from the norm.
func geodesic(e, bigL, y, phi float64, inward bool) *Motion {
	r := 2 + y
	p := math.Sqrt(math.Max(0, e*e-y/r*(1+bigL*bigL/(r*r))))
	if inward {
		p = -p
	}
	return &Motion{R: r, Y: y, P: p, Phi: phi, E: e, L: bigL}
}

func each(body func(l, m int, s MasterSource)) {
	for l := 2; l <= 6; l++ {
		for m := -l; m <= l; m++ {
			body(l, m, NewMasterSource(l, m))
		}
	}
}

// TestSymmetries: (l,-m) is (-1)^m times the conjugate; running the orbit
// backwards (u^r, L and phi reversed, the same as a reflection of the orbit with
// time) conjugates an amplitude in the rotating frame; turning the orbit by an
// angle turns the phase.
func TestSymmetries(t *testing.T) {
	w := geodesic(0.97, 3.7, 6.3, 0.9, true)
	back := *w
	back.P = -w.P
	turned := *w
	turned.Phi += 0.31
	each(func(l, m int, s MasterSource) {
		f, g := s.At(w)
		fm, gm := NewMasterSource(l, -m).At(w)
		sign := complex(1, 0)
		if m%2 != 0 {
			sign = -1
		}
		near := func(what string, a, b complex128) {
			t.Helper()
			if cmplx.Abs(a-b) > 1e-14*(cmplx.Abs(a)+cmplx.Abs(b)) {
				t.Errorf("(%d,%d): %s: %v and %v", l, m, what, a, b)
			}
		}
		near("F of -m", fm, sign*cmplx.Conj(f))
		near("G of -m", gm, sign*cmplx.Conj(g))
		af, ag := s.Amplitudes(w)
		bf, bg := s.Amplitudes(&back)
		near("F backwards", bf, cmplx.Conj(af))
		near("G backwards", bg, cmplx.Conj(ag))
		tf, tg := s.At(&turned)
		turn := cmplx.Exp(complex(0, -0.31*float64(m)))
		near("F turned", tf, f*turn)
		near("G turned", tg, g*turn)
		if (l+m)%2 == 0 != (s.Parity == equations.Even) {
			t.Errorf("(%d,%d) is %s", l, m, s.Parity)
		}
	})
}

// TestOddTimeDerivative: G of an odd mode holds the time derivative, along the
// orbit, of c e^{-i m phi} with c = (16 pi/l(l+1)) Y_theta u^r L/(r^2 E). Here it
// is taken by differences in r with u^r from the norm, not from the equation of
// motion.
func TestOddTimeDerivative(t *testing.T) {
	const e, bigL = 0.97, 3.7
	each(func(l, m int, s MasterSource) {
		if s.Parity == equations.Even {
			return
		}
		for _, y := range []float64{3, 6.3, 9} {
			w := geodesic(e, bigL, y, 0, true)
			f := y / w.R
			l2, mu := float64(l*(l+1)), float64((l-1)*(l+2))
			c0 := 16 * math.Pi / l2 * equatorYTheta(l, m)
			c := func(y float64) float64 {
				v := geodesic(e, bigL, y, 0, true)
				return c0 * v.P * bigL / (v.R * v.R * e)
			}
			rdot, phidot := f*w.P/e, f*bigL/(w.R*w.R*e)
			cdot := complex(rdot*slope(c, y, 2e-3), -float64(m)*phidot*c(y))
			k := f*c0*bigL/(w.R*w.R) - c(y)*rdot
			want := complex(-2*w.R/mu, 0)*cdot + complex(2/mu*k, 0)
			wantF := complex(-2*w.R/mu*k/f, 0)
			gotF, got := s.Amplitudes(w)
			if cmplx.Abs(got-want) > 1e-9*cmplx.Abs(want) || cmplx.Abs(gotF-wantF) > 1e-12*cmplx.Abs(wantF) {
				t.Errorf("(%d,%d) at r = %g: G = %v, F = %v, want %v, %v", l, m, w.R, got, gotF, want, wantF)
			}
		}
	})
}

// TestRegularity: the coefficients are continuous at a turning point, where u^r
// goes through zero as a square root in r, and fall to zero in proportion to
// r-2 at the horizon (the redshift; the terms of order one in G cancel there to
// round-off), down to the smallest r-2.
func TestRegularity(t *testing.T) {
	each(func(l, m int, s MasterSource) {
		// p = 9, e = 0.5: periastron at r = 6, E and L in closed form (e.g.
		// C. Cutler, D. Kennefick, E. Poisson, PRD 50, 3816 (1994), from memory).
		const p, ecc = 9.0, 0.5
		e := math.Sqrt(((p-2)*(p-2) - 4*ecc*ecc) / (p * (p - 3 - ecc*ecc)))
		bigL := p / math.Sqrt(p-3-ecc*ecc)
		turn := p/(1+ecc) - 2
		at := &Motion{R: turn + 2, Y: turn, E: e, L: bigL}
		f0, g0 := s.Amplitudes(at)
		for _, inward := range []bool{false, true} {
			near := geodesic(e, bigL, turn+1e-10, 0, inward)
			if near.P == 0 {
				t.Fatal("the test's own turning point is off")
			}
			f, g := s.Amplitudes(near)
			// u^r is 1e-5 of r there.
			if cmplx.Abs(f-f0) > 1e-6*cmplx.Abs(f0)+1e-13 || cmplx.Abs(g-g0) > 1e-3*(cmplx.Abs(g0)+cmplx.Abs(f0))+1e-13 {
				t.Errorf("(%d,%d): next to the turning point F = %v, G = %v; at it %v, %v", l, m, f, g, f0, g0)
			}
		}
		for _, bigL := range []float64{0, 2 * math.Sqrt(3)} {
			var f, g [3]complex128
			for i, y := range []float64{1e-3, 1e-6, 1e-200} {
				f[i], g[i] = s.Amplitudes(geodesic(1, bigL, y, 0, true))
				f[i], g[i] = f[i]/complex(y, 0), g[i]/complex(y, 0)
			}
			// Linear with a relative correction of order l^2 (r-2): measured below 0.02.
			size := cmplx.Abs(f[1]) + cmplx.Abs(g[1])
			if d := cmplx.Abs(f[0]-f[1]) + cmplx.Abs(g[0]-g[1]); !(d <= 0.03*size) {
				t.Errorf("(%d,%d) L = %g: F and G over r-2 are %v, %v at 1e-3 and %v, %v at 1e-6", l, m, bigL, f[0], g[0], f[1], g[1])
			}
			if !(cmplx.Abs(f[2])+cmplx.Abs(g[2]) < 1e-15/1e-200) {
				t.Errorf("(%d,%d) L = %g: F = %v, G = %v at the horizon", l, m, bigL, f[2]*1e-200, g[2]*1e-200)
			}
		}
	})
}

// TestRadialFall: without angular momentum the even modes of one l are excited in
// proportion to Y_lm of the particle's direction, the odd ones not at all.
func TestRadialFall(t *testing.T) {
	w := geodesic(1, 0, 5, 0, true)
	for l := 2; l <= 6; l++ {
		f0, g0 := NewMasterSource(l, l%2).Amplitudes(w)
		y0 := equatorY(l, l%2)
		for m := -l; m <= l; m++ {
			f, g := NewMasterSource(l, m).Amplitudes(w)
			ratio := complex(0, 0)
			if (l+m)%2 == 0 {
				ratio = complex(equatorY(l, m)/y0, 0)
			}
			if cmplx.Abs(f-ratio*f0) > 1e-13*cmplx.Abs(f0) || cmplx.Abs(g-ratio*g0) > 1e-13*cmplx.Abs(g0) {
				t.Errorf("(%d,%d): F = %v, G = %v, want %v times %v, %v", l, m, f, g, ratio, f0, g0)
			}
		}
	}
}
