package certify

import (
	"math"
	"math/cmplx"

	"nullmark/extract/strain"
)

// Radiated is the time integral of a mode's quadratic signals, per sign of m
// and without the factor (l+2)!/(l-2)!/(64 pi).
type Radiated struct {
	Power float64 // integral of |Psi_tau|^2
	Spin  float64 // integral of Im(Psi conj(Psi_tau))
}

// Integrate integrates the signals at one end from slice time from to until,
// resampled every step (less or more by what makes a whole number of steps), by
// the trapezoidal rule with Gregory's end corrections up to fifth differences.
func Integrate(s *Samples, end End, from, until, step float64) Radiated {
	n := int(math.Round((until-from)/step)) + 1
	if n < 16 {
		panic("certify: too few steps to integrate")
	}
	step = (until - from) / float64(n-1)
	at := make([]float64, n)
	for i := range at {
		at[i] = from + float64(i)*step
	}
	psi := strain.Resample(s.Psi[end], 0, s.Dt, at)
	pi := strain.Resample(s.Pi[end], 0, s.Dt, at)
	p := make([]float64, n)
	q := make([]float64, n)
	for i := range at {
		p[i] = real(pi[i])*real(pi[i]) + imag(pi[i])*imag(pi[i])
		q[i] = imag(psi[i] * cmplx.Conj(pi[i]))
	}
	return Radiated{Power: step * gregory(p), Spin: step * gregory(q)}
}

// gregory is the integral of equidistant values for unit spacing.
//
// Source: Gregory's formula, e.g. Abramowitz and Stegun (1964), 25.4.7 and the
// Euler–Maclaurin rule behind it, from memory; held by a test of its order.
func gregory(f []float64) float64 {
	n := len(f) - 1
	var sum float64
	for _, v := range f {
		sum += v
	}
	sum -= (f[0] + f[n]) / 2
	c := [...]float64{1. / 12, 1. / 24, 19. / 720, 3. / 160, 863. / 60480}
	// Differences at both ends.
	var a, b [6]float64
	for i := range a {
		a[i], b[i] = f[i], f[n-i]
	}
	for k := 1; k <= len(c); k++ {
		for i := 0; i+k < len(a); i++ {
			a[i], b[i] = a[i+1]-a[i], b[i]-b[i+1]
		}
		// b holds backward differences, a forward ones.
		if k%2 == 1 {
			sum -= c[k-1] * (b[0] - a[0])
		} else {
			sum -= c[k-1] * (b[0] + a[0])
		}
	}
	return sum
}
