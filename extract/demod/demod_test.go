package demod

import (
	"errors"
	"math"
	"math/cmplx"
	"strings"
	"testing"
)

func sampled(start, dt float64, n int, f func(t float64) complex128) Series {
	s := Series{Start: start, Dt: dt, Values: make([]complex128, n)}
	for k := range s.Values {
		s.Values[k] = f(start + float64(k)*dt)
	}
	return s
}

func tone(omega float64) func(t float64) complex128 {
	return func(t float64) complex128 { return cmplx.Exp(complex(0, -omega*t)) }
}

const omega = 0.0632

// window of a power over n periods from start.
func window(start float64, power, n int) Window {
	return Window{Start: start, Length: float64(n) * 2 * math.Pi / omega, Power: power}
}

// TestPureTone: exact to round-off whatever the window, its place between the
// samples and the first sample's time.
func TestPureTone(t *testing.T) {
	z := complex(0.3, -1.7)
	for power := 1; power <= 4; power++ {
		for _, start := range []float64{100, 333.3337, -50} {
			s := sampled(start, 0.37, 4000, func(t float64) complex128 { return z * tone(omega)(t) })
			w := window(start+41.123, power, power+1)
			got, err := Amplitude(s, w, omega)
			if err != nil {
				t.Fatal(err)
			}
			if cmplx.Abs(got-z) > 1e-14*cmplx.Abs(z) {
				t.Errorf("power %d from %g: %v, want %v", power, start, got, z)
			}
		}
	}
}

// TestWindowsSpectrum: sin^{2k} over n periods has the Fourier coefficients
// (-1)^j C(2k,k+j)/4^k at j/Length up to j = k and none beyond: a tone j/Length
// away leaks (-1)^j C(2k,k+j)/C(2k,k) for j <= k, and nothing beyond. So a
// constant, n away, is removed when n > k, and only then.
func TestWindowsSpectrum(t *testing.T) {
	binomial := func(n, k int) float64 {
		b := 1.0
		for i := 1; i <= k; i++ {
			b *= float64(n-k+i) / float64(i)
		}
		return b
	}
	for power := 1; power <= 4; power++ {
		for n := 2; n <= 6; n++ {
			w := window(70, power, n)
			// Steps that divide the window, so that the sum is the exact mean.
			dt := w.Length / 1024
			for j := 0; j <= 6; j++ {
				other := omega - 2*math.Pi*float64(j)/w.Length
				// Phase zero at the window's start.
				s := sampled(70, dt, 1025, func(t float64) complex128 { return cmplx.Exp(complex(0, -other*(t-70)-omega*70)) })
				got, err := Amplitude(s, w, omega)
				if err != nil {
					t.Fatal(err)
				}
				want := 0.0
				if j <= power {
					want = binomial(2*power, power+j) / binomial(2*power, power)
					if j%2 == 1 {
						want = -want
					}
				}
				if cmplx.Abs(got-complex(want, 0)) > 2e-14 {
					t.Errorf("power %d over %d periods: a tone %d lines away leaks %v, want %g", power, n, j, got, want)
				}
			}
		}
	}
}

// TestTailIsRejected: under a power-law tail as large as the tone, wider windows
// of higher power leave less, and the plain mean over the same time leaves much
// more than the best of them.
func TestTailIsRejected(t *testing.T) {
	tail := func(t float64) complex128 { return complex(math.Pow(t/200, -4), 0) }
	s := sampled(0.5, 0.5, 4000, tail)
	last := math.Inf(1)
	for power := 1; power <= 4; power++ {
		z, err := Amplitude(s, window(400, power, power+1), omega)
		if err != nil {
			t.Fatal(err)
		}
		got := cmplx.Abs(z)
		// Measured: 9e-4, 1e-4, 1.6e-5, 3e-6.
		if !(got < last/4) {
			t.Errorf("power %d leaves %.3g of the tail, the power below %.3g", power, got, last)
		}
		last = got
	}
	if last > 1e-5 {
		t.Errorf("power 4 leaves %.3g of the tail", last)
	}
	flat, err := Amplitude(s, Window{Start: 400, Length: window(400, 4, 5).Length, Power: 0}, omega)
	if err != nil {
		t.Fatal(err)
	}
	if cmplx.Abs(flat) < 100*last {
		t.Errorf("a mean without a window leaves %.3g, the window %.3g: the test shows nothing", cmplx.Abs(flat), last)
	}
}

func TestWeight(t *testing.T) {
	w := Window{Start: 10, Length: 8, Power: 3}
	for _, c := range []struct{ t, want float64 }{{9, 0}, {10, 0}, {12, 1. / 8}, {14, 1}, {16, 1. / 8}, {18, 0}, {19, 0}} {
		if got := w.Weight(c.t); math.Abs(got-c.want) > 1e-16 {
			t.Errorf("weight at %g is %g, want %g", c.t, got, c.want)
		}
	}
}

func TestErrors(t *testing.T) {
	s := sampled(0, 0.5, 1000, tone(omega))
	for _, w := range []Window{
		{Start: -1, Length: 100, Power: 1}, {Start: 400, Length: 100, Power: 1}, {Start: 600, Length: 10, Power: 1},
	} {
		_, err := Amplitude(s, w, omega)
		var short *ErrShort
		if !errors.As(err, &short) || short.From != w.Start || short.To != w.Start+w.Length || short.HaveTo != 499.5 {
			t.Errorf("window %+v: error %v", w, err)
		}
	}
	// A window that ends on the last sample, to a rounding, is inside.
	if _, err := Amplitude(s, Window{Start: 399.5 + 1e-11, Length: 100, Power: 1}, omega); err != nil {
		t.Error(err)
	}
	if _, err := Amplitude(s, Window{Start: 10, Length: 7, Power: 1}, omega); err == nil || !strings.Contains(err.Error(), "samples in the window") {
		t.Errorf("15 samples: error %v", err)
	}
	if _, err := Amplitude(Series{Dt: 1}, Window{Start: 0, Length: 10, Power: 1}, omega); err == nil {
		t.Error("no samples: no error")
	}
}
