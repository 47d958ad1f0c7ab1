package ringing

import (
	"fmt"
	"math"
	"math/cmplx"
)

// Frequency returns the quasinormal frequency M omega of a hole of the given
// spin a/M in (-1, 1) for a field of spin weight s (0, -1 or -2; the sign does
// not matter), l >= |s|, |m| <= l and overtone n, e^{-i omega t}. It serves to
// name what a fit finds, not to judge it.
//
// Method: the continued fraction of E. W. Leaver, Proc. R. Soc. A 402, 285
// (1985), eqs 24 to 27 (there 2M = 1), inverted at n, with the angular constant
// from the spin-weighted spherical harmonics coupled by cos(theta) and its
// square. The start without spin is the expansion in 1/(l+1/2) of S. R. Dolan &
// A. C. Ottewill, Class. Quantum Grav. 26, 225003 (2009); the spin is then turned
// up in steps. It panics on labels that are none, and reports an error when an
// iteration does not settle (high overtones, |a| near 1).
func Frequency(a float64, s, l, m, n int) (complex128, error) {
	s = -max(s, -s)
	if l < -s || m > l || -m > l || n < 0 || !(math.Abs(a) < 1) {
		panic(fmt.Sprintf("ringing: no mode l = %d, m = %d, n = %d of spin weight %d at a = %g", l, m, n, s, a))
	}
	if a < 0 { // turning the hole round turns m round
		a, m = -a, -m
	}
	f := fraction{s: s, l: l, m: m, n: n}
	omega := 2 * withoutSpin(s, l, n) // 2M = 1 from here on
	sep := complex(float64(l*(l+1)-s*(s+1)), 0)
	for done := false; !done; {
		var err error
		if omega, sep, err = f.solve(omega, sep); err != nil {
			return 0, err
		}
		done = f.a == a/2
		step := 0.05 * (1 - 2*f.a)
		f.a = math.Min(a/2, f.a+math.Max(step, 2e-3))
	}
	return omega / 2, nil
}

// withoutSpin is the expansion in 1/L, L = l+1/2, N = n+1/2, M = 1.
func withoutSpin(s, l, n int) complex128 {
	L, N, beta := float64(l)+0.5, float64(n)+0.5, 1-float64(s*s)
	re := L + (beta/3-5*N*N/36-115.0/432)/L
	im := -N * (1 + (beta/9+235*N*N/3888-1415.0/15552)/(L*L))
	return complex(re, im) / complex(math.Sqrt(27), 0)
}

// fraction is one mode at one spin a (2M = 1: at most 1/2).
type fraction struct {
	a          float64
	s, l, m, n int
}

// solve finds the zero of the radial fraction near omega by the secant method.
func (f *fraction) solve(omega, sep complex128) (complex128, complex128, error) {
	w0, w1 := omega, omega*complex(1+1e-4, 1e-4)
	sep = f.separation(w0, sep)
	v0 := f.radial(w0, sep)
	for range 60 {
		sep = f.separation(w1, sep)
		v1 := f.radial(w1, sep)
		if v1 == v0 {
			return w1, sep, nil
		}
		step := v1 * (w1 - w0) / (v1 - v0)
		if c := 0.1 * cmplx.Abs(w1); cmplx.Abs(step) > c {
			step *= complex(c/cmplx.Abs(step), 0)
		}
		w0, v0 = w1, v1
		w1 -= step
		if cmplx.IsNaN(w1) {
			break
		}
		if cmplx.Abs(step) < 1e-12*cmplx.Abs(w1) {
			return w1, sep, nil
		}
	}
	return 0, 0, fmt.Errorf("ringing: the quasinormal frequency l = %d, m = %d, n = %d did not settle at a = %.4g", f.l, f.m, f.n, 2*f.a)
}

// radial is the n-th inversion of the continued fraction.
func (f *fraction) radial(w, sep complex128) complex128 {
	const depth = 600
	a, b := complex(f.a, 0), complex(math.Sqrt(1-4*f.a*f.a), 0)
	s, am := complex(float64(f.s), 0), complex(f.a*float64(f.m), 0)
	k := (w/2 - am) / b
	c0 := 1 - s - 1i*w - 2i*k
	c1 := -4 + 2i*w*(2+b) + 4i*k
	c2 := s + 3 - 3i*w - 2i*k
	c3 := w*w*(4+2*b-a*a) - 2*am*w - s - 1 + (2+b)*1i*w - sep + (4*w+2i)*k
	c4 := s + 1 - 2*w*w - (2*s+3)*1i*w - (4*w+2i)*k
	alpha := func(n int) complex128 { x := complex(float64(n), 0); return x*x + (c0+1)*x + c0 }
	beta := func(n int) complex128 { x := complex(float64(n), 0); return -2*x*x + (c1+2)*x + c3 }
	gamma := func(n int) complex128 { x := complex(float64(n), 0); return x*x + (c2-3)*x + c4 - c2 + 2 }
	// Below: beta_n - gamma_n alpha_{n-1}/(beta_{n-1} - ...); above, from far
	// down up, with the minimal solution's ratio -1 to start with.
	var down complex128
	for j := 0; j < f.n; j++ {
		down = gamma(j+1) * alpha(j) / (beta(j) - down)
	}
	up := complex128(-1)
	for j := f.n + depth; j > f.n; j-- {
		up = gamma(j) / (beta(j) - alpha(j)*up)
	}
	return beta(f.n) - down - alpha(f.n)*up
}

// separation is the eigenvalue nearest to guess of l(l+1)-s(s+1) - c^2 cos^2 +
// 2 c s cos in the harmonics of this s and m, c = a omega, by inverse iteration
// for a complex symmetric matrix.
func (f *fraction) separation(w, guess complex128) complex128 {
	const size = coupled
	c, s := complex(f.a, 0)*w, float64(f.s)
	first := max(-f.s, f.m, -f.m)
	m := float64(f.m)
	up := func(l float64) float64 { // <l+1|cos|l>
		return math.Sqrt(((l+1)*(l+1) - m*m) * ((l+1)*(l+1) - s*s) / ((l + 1) * (l + 1) * (2*l + 1) * (2*l + 3)))
	}
	// cos(theta) with one l to spare, so that its square is exact.
	var cth [size + 1][size + 1]float64
	for i := range cth {
		l := float64(first + i)
		if l > 0 {
			cth[i][i] = -m * s / (l * (l + 1))
		}
		if i < size {
			cth[i][i+1] = up(l)
			cth[i+1][i] = cth[i][i+1]
		}
	}
	var mat [size][size]complex128
	for i := range size {
		for j := range size {
			sq := 0.0
			for k := range cth {
				sq += cth[i][k] * cth[k][j]
			}
			mat[i][j] = -c*c*complex(sq, 0) + 2*c*complex(s*cth[i][j], 0)
		}
		l := float64(first + i)
		mat[i][i] += complex(l*(l+1)-s*(s+1), 0)
	}
	var x [size]complex128
	x[f.l-first] = 1
	value := guess
	for range 8 {
		shifted := mat
		for i := range size {
			shifted[i][i] -= value + complex(1e-9, 1e-9)
		}
		y := x
		if !eliminate(&shifted, &y) {
			break
		}
		var xx, xy, yy complex128
		for i := range size {
			xx += x[i] * x[i]
			xy += x[i] * y[i]
			yy += y[i] * y[i]
		}
		if xy == 0 || yy == 0 {
			break
		}
		next := value + complex(1e-9, 1e-9) + xy/yy
		norm := cmplx.Sqrt(yy)
		for i := range size {
			x[i] = y[i] / norm
		}
		if cmplx.Abs(next-value) < 1e-15*cmplx.Abs(next) {
			return next
		}
		value = next
	}
	return value
}

// coupled is how many harmonics represent an angular function.
const coupled = 12

// eliminate solves m y = y in place by Gaussian elimination with pivots.
func eliminate(m *[coupled][coupled]complex128, y *[coupled]complex128) bool {
	const n = coupled
	for i := range n {
		p := i
		for r := i + 1; r < n; r++ {
			if cmplx.Abs(m[r][i]) > cmplx.Abs(m[p][i]) {
				p = r
			}
		}
		if m[p][i] == 0 {
			return false
		}
		m[i], m[p] = m[p], m[i]
		y[i], y[p] = y[p], y[i]
		for r := i + 1; r < n; r++ {
			q := m[r][i] / m[i][i]
			for j := i; j < n; j++ {
				m[r][j] -= q * m[i][j]
			}
			y[r] -= q * y[i]
		}
	}
	for i := n - 1; i >= 0; i-- {
		for j := i + 1; j < n; j++ {
			y[i] -= m[i][j] * y[j]
		}
		y[i] /= m[i][i]
	}
	return true
}

// Neighbours lists what may stand in the signal of the mode (l,m) of a hole of
// spin a, for naming: its own frequencies up to the given overtone, those of
// l-1, l+1 and l+2 with the same m, which the spin couples in, and the mirror
// images -conj(omega) of (l,-m), m != 0. Frequencies that do not settle are left out.
func Neighbours(a float64, s, l, m, overtones int) []Expected {
	var out []Expected
	add := func(l, m, n int, mirror bool) {
		if l < max(s, -s) || m > l || -m > l {
			return
		}
		w, err := Frequency(a, s, l, m, n)
		if err != nil {
			return
		}
		if mirror {
			w = -cmplx.Conj(w)
		}
		out = append(out, Expected{L: l, M: m, N: n, Omega: w})
	}
	for n := 0; n <= overtones; n++ {
		for _, k := range []int{l, l - 1, l + 1, l + 2} {
			add(k, m, n, false)
		}
		if m != 0 {
			add(l, -m, n, true)
		}
	}
	return out
}
