package certify

import (
	"math"
	"math/cmplx"
	"testing"
)

// lines samples sum_k A_k e^{-i w_k t}, w_k = w + k radial, k = -1, 0, 1, 2, and
// its derivative, at both ends.
func lines(dt float64, n int, w, radial float64, a [4]complex128) *Samples {
	s := &Samples{Dt: dt}
	for j := 0; j < n; j++ {
		var psi, pi complex128
		for k, v := range a {
			f := w + float64(k-1)*radial
			e := v * cmplx.Exp(complex(0, -f*float64(j)*dt))
			psi += e
			pi += complex(0, -f) * e
		}
		for end := range s.Psi {
			s.Psi[end] = append(s.Psi[end], psi)
			s.Pi[end] = append(s.Pi[end], pi)
		}
	}
	return s
}

const (
	line   = 0.095
	radial = 0.021
)

func amplitudes() [4]complex128 { return [4]complex128{0.2 - 0.1i, 1 + 0.3i, 0.4i, -0.05} }

// TestMeanOver: over whole radial periods the squares average to the sum over
// the lines, <|Psi_tau|^2> = sum w_k^2 |A_k|^2 and <Im(Psi conj Psi_tau)> =
// sum w_k |A_k|^2 (Parseval), wherever the window ends and whatever its power.
func TestMeanOver(t *testing.T) {
	period := 2 * math.Pi / radial
	s := lines(0.37, 6000, line, radial, amplitudes())
	var power, spin float64
	for k, a := range amplitudes() {
		w, a2 := line+float64(k-1)*radial, real(a*cmplx.Conj(a))
		power += w * w * a2
		spin += w * a2
	}
	for _, k := range []int{1, 2, 4} {
		for _, until := range []float64{1600, 1723.456, 2219} {
			for end := Infinity; end <= Horizon; end++ {
				got, err := MeanOver(s, end, until, period, k)
				if err != nil {
					t.Fatal(err)
				}
				// Measured: 5e-11 for sin^2, whose second derivative jumps at ends
				// that fall between two samples, and round-off above.
				bound := 1e-13
				if k == 1 {
					bound = 2e-10
				}
				if math.Abs(got.Power-power) > bound*power || math.Abs(got.Spin-spin) > bound*spin {
					t.Errorf("power %d until %g: %+v, want %.17g and %.17g", k, until, got, power, spin)
				}
			}
		}
	}
	for _, until := range []float64{5 * period * 0.99, 2300} {
		if _, err := MeanOver(s, Infinity, until, period, 4); err == nil {
			t.Errorf("five periods until %g of %g: no error", until, s.Until())
		}
	}
}

// TestDistance: of two rungs in which every line differs by a known amount the
// relative distance is that of Parseval's sum; other time steps do not matter, a
// coarser rung that ends early is compared as far as it goes, and where there is
// nothing to compare nothing is known.
func TestDistance(t *testing.T) {
	period := 2 * math.Pi / radial
	fine := lines(0.37, 6000, line, radial, amplitudes())
	other := amplitudes()
	other[0] += 1e-6
	other[2] -= 2e-6i
	var d, p float64
	for k, a := range amplitudes() {
		w := line + float64(k-1)*radial
		d += w * w * real((a-other[k])*cmplx.Conj(a-other[k]))
		p += w * w * real(a*cmplx.Conj(a))
	}
	want := math.Sqrt(d / p)
	for _, dt := range []float64{0.37, 0.4625, 0.29} {
		coarse := lines(dt, int(2250/dt), line, radial, other)
		// The resampling of so slow a signal errs by 1e-12 of it, 1e-6 of the distance.
		if got := Distance(fine, coarse, Horizon, 2200, period, 2); math.Abs(got-want) > 1e-6*want {
			t.Errorf("dt = %g: distance %.9g, want %.9g", dt, got, want)
		}
	}
	if got := Distance(fine, fine, Infinity, 2200, period, 2); got > 1e-14 {
		t.Errorf("a rung is %g from itself", got)
	}
	early := lines(0.37, 5000, line, radial, other)
	if got := Distance(fine, early, Infinity, 2200, period, 2); !(got > want/3 && got < 3*want) {
		t.Errorf("a rung that ends early: %g, want about %g", got, want)
	}
	if got := Distance(fine, lines(0.37, 100, line, radial, other), Infinity, 2200, period, 2); !math.IsInf(got, 1) {
		t.Errorf("nothing in common: %g", got)
	}
}
