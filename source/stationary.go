package source

import (
	"fmt"
	"math/cmplx"

	"nullmark/grid"
)

// MaxDerivative is the highest time derivative that a forcing provides.
const MaxDerivative = 12

// Stationary is the forcing of a particle on a circular orbit: for each of up
// to grid.Lanes/2 complex modes
//
//	-S(rho, t) = -ramp(t) e^{-i omega t} [ G delta(rho-rho_p) + F delta'(rho-rho_p) ],
//
// with the kernel's profile fixed on the grid. Time derivatives are exact. It
// is not safe for concurrent use (Prepare keeps state).
type Stationary struct {
	ramp    Ramp
	omega   []float64
	lo, hi  int
	profile []float64 // per point and mode, real
	factor  [MaxDerivative + 1][]complex128
	jet     [MaxDerivative + 1]float64
	modes   int
}

// NewStationary places modes with amplitudes f and g (real, as at phase zero)
// and frequencies omega on the grid's points rho; the particle sits at rhoP,
// where the slicing must be flat over the kernel's reach.
func NewStationary(rho []float64, rhoP float64, k Kernel, ramp Ramp, f, g, omega []float64) *Stationary {
	n := len(f)
	if len(g) != n || len(omega) != n || n > grid.Lanes/2 {
		panic(fmt.Sprintf("source: %d, %d, %d modes in a block of %d", len(f), len(g), len(omega), grid.Lanes/2))
	}
	s := &Stationary{ramp: ramp, omega: append([]float64(nil), omega...), modes: n}
	s.lo, s.hi = support(rho, rhoP, k.Reach())
	s.profile = make([]float64, (s.hi-s.lo)*n)
	for i := s.lo; i < s.hi; i++ {
		d, d1 := k.At(rho[i] - rhoP)
		for q := 0; q < n; q++ {
			s.profile[(i-s.lo)*n+q] = -(g[q]*d + f[q]*d1)
		}
	}
	for j := range s.factor {
		s.factor[j] = make([]complex128, n)
	}
	return s
}

// support returns the index range of points within reach of x.
func support(rho []float64, x, reach float64) (lo, hi int) {
	lo, hi = 0, len(rho)
	for lo < hi && rho[lo] < x-reach {
		lo++
	}
	for hi > lo && rho[hi-1] > x+reach {
		hi--
	}
	return lo, hi
}

// Prepare evaluates the time factors and their derivatives at t.
func (s *Stationary) Prepare(t, _ float64) {
	s.ramp.Jet(s.jet[:], t)
	for q, w := range s.omega {
		e := cmplx.Exp(complex(0, -w*t))
		// Leibniz: (ramp e)^(j) = sum_i C(j,i) ramp^(i) (-i w)^(j-i) e.
		var power [MaxDerivative + 1]complex128 // (-i w)^n
		r := 1.0
		for n := range power {
			power[n] = complex(r, 0) * minusI(n)
			r *= w
		}
		for j := range s.factor {
			var a complex128
			b := 1.0
			for i := 0; i <= j; i++ {
				a += complex(b*s.jet[i], 0) * power[j-i]
				b *= float64(j-i) / float64(i+1)
			}
			s.factor[j][q] = a * e
		}
	}
}

// minusI is (-i)^n.
func minusI(n int) complex128 {
	switch n & 3 {
	case 0:
		return 1
	case 1:
		return -1i
	case 2:
		return -1
	}
	return 1i
}

// AddDerivative adds scale times the j-th derivative (j <= MaxDerivative) to
// the block dst, grid.Lanes numbers a point.
func (s *Stationary) AddDerivative(dst []float64, j int, scale float64) {
	for q, c := range s.factor[j][:s.modes] {
		re, im := real(c)*scale, imag(c)*scale
		at := s.lo*grid.Lanes + 2*q
		for i := q; i < len(s.profile); i += s.modes {
			p := s.profile[i]
			dst[at] += re * p
			dst[at+1] += im * p
			at += grid.Lanes
		}
	}
}

// Add adds the forcing at time t.
func (s *Stationary) Add(dst []float64, t float64) {
	s.Prepare(t, 0)
	s.AddDerivative(dst, 0, 1)
}
