package kerr

import (
	"math"
	"math/cmplx"
)

// windowPeriods is the length of the windows that measure drift.
const windowPeriods = 8

// StrainSeries integrates r psi4 of a transient with m != 0 twice in time to
// r h = 2 int int psi4: backwards from the last sample, where the ringing must
// have died away and h and its rate are 0, with polynomials of degree 7. What a
// double integration turns into drift (round-off, junk, the tail) is measured
// where the signal is still a slow oscillation of the given period, whose mean
// over whole periods is 0: a drift (end-u)^2 (A + B u) through the means of two
// windows of six periods from sample first on is removed, and its size is the
// bar at every sample. It panics when psi4 is shorter than those windows.
func StrainSeries(psi4 []complex128, dt float64, first int, period float64) (h []complex128, bar []float64) {
	n := len(psi4)
	back := make([]complex128, n)
	for k := range psi4 {
		back[n-1-k] = 2 * psi4[k]
	}
	h = integral(integral(back, dt), dt) // both integrals change sign, twice
	for i, j := 0, n-1; i < j; i, j = i+1, j-1 {
		h[i], h[j] = h[j], h[i]
	}
	// Means at two places; a window of sin^8 over eight periods kills the tone.
	length := windowPeriods * period
	width := int(math.Floor(length / dt))
	mean := func(k0 int) (t float64, z complex128) {
		if k0 < 0 || k0+width >= n {
			panic("kerr: the series is too short to measure its drift")
		}
		sum := 0.0
		for k := 0; k <= width; k++ {
			s := math.Sin(math.Pi * float64(k) * dt / length)
			s *= s
			s *= s
			w := s * s
			z += complex(w, 0) * h[k0+k]
			sum += w
		}
		return float64(k0)*dt + length/2, z / complex(sum, 0)
	}
	end := float64(n-1) * dt
	t1, z1 := mean(first)
	t2, z2 := mean(first + width/3)
	q := func(t float64) complex128 { return complex((end-t)*(end-t), 0) }
	y1, y2 := z1/q(t1), z2/q(t2)
	b := (y2 - y1) / complex(t2-t1, 0)
	a := y1 - b*complex(t1, 0)
	bar = make([]float64, n)
	for k := range h {
		t := float64(k) * dt
		drift := q(t) * (a + b*complex(t, 0))
		h[k] -= drift
		bar[k] = cmplx.Abs(drift)
	}
	return h, bar
}

// Rundown integrates r psi4 of a transient that has died away at the last sample:
// rate = 2 int psi4 and r h = int rate, both 0 at the end, with polynomials of
// degree 7. What is left there by mean (round-off, the tail) over the last
// fraction of the samples is turned into a drift, whose size (end-u)^2 |mean| and
// 2 (end-u) |mean| bounds the error of both; it needs no oscillation to measure.
func Rundown(psi4 []complex128, dt, last float64) (h, rate []complex128, drift, slide []float64) {
	n := len(psi4)
	back := make([]complex128, n)
	for k := range psi4 {
		back[n-1-k] = 2 * psi4[k]
	}
	r := integral(back, dt)
	w := integral(r, dt)
	h, rate = make([]complex128, n), make([]complex128, n)
	drift, slide = make([]float64, n), make([]float64, n)
	tail := max(int(last*float64(n)), 1)
	mean := 0.0
	for _, z := range psi4[n-tail:] {
		mean += cmplx.Abs(z)
	}
	mean /= float64(tail)
	for k := range h {
		h[k], rate[k] = w[n-1-k], -r[n-1-k]
		t := float64(n-1-k) * dt
		drift[k], slide[k] = t*t*mean, 2*t*mean
	}
	return h, rate, drift, slide
}
