package certify

import (
	"math"
	"testing"
)

// TestGregory: end corrections up to fifth differences are exact on polynomials
// up to degree 5 and miss the next term, 275/24192 of the sixth difference at
// either end (Gregory's coefficient after 863/60480, from memory), on degree 6.
func TestGregory(t *testing.T) {
	const n = 24
	for degree := 0; degree <= 6; degree++ {
		f := make([]float64, n+1)
		for i := range f {
			f[i] = math.Pow(float64(i)/n, float64(degree))
		}
		want := float64(n) / float64(degree+1)
		if degree == 6 {
			want += 2 * 275. / 24192 * 720 / math.Pow(n, 6)
		}
		if got := gregory(f); math.Abs(got-want) > 3e-15*want {
			t.Errorf("degree %d: %.17g, want %.17g", degree, got, want)
		}
	}
	miss := func(n int) float64 {
		h := 3.0 / float64(n)
		f := make([]float64, n+1)
		for i := range f {
			f[i] = math.Exp(-float64(i) * h)
		}
		return math.Abs(h*gregory(f) - (1 - math.Exp(-3)))
	}
	// Measured: 6.90, from below.
	if got := math.Log2(miss(40) / miss(80)); math.Abs(got-7) > 0.2 {
		t.Errorf("order %.2f instead of 7", got)
	}
}

// TestIntegrate a burst in closed form, Psi = e^{-x^2/2 - i w t}, x = (t-c)/s:
// Int |Psi_tau|^2 = sqrt(pi) s (w^2 + 1/(2 s^2)), Int Im(Psi conj Psi_tau) =
// sqrt(pi) s w; over a part, and over a span that no whole number of steps
// fills, against the error function.
func TestIntegrate(t *testing.T) {
	const w, c, s, dt = 0.4, 60.0, 8.0, 0.2
	sig := &Samples{Dt: dt}
	for k := 0; k <= 800; k++ {
		x := (float64(k)*dt - c) / s
		size := math.Exp(-x * x / 2)
		sin, cos := math.Sincos(w * float64(k) * dt)
		psi := complex(size*cos, -size*sin)
		for end := range sig.Psi {
			sig.Psi[end] = append(sig.Psi[end], psi)
			sig.Pi[end] = append(sig.Pi[end], psi*complex(-x/s, -w))
		}
	}
	exact := func(from, until float64) (power, spin float64) {
		a, b := (from-c)/s, (until-c)/s
		// Int e^{-x^2} and Int x^2 e^{-x^2} over [a, b].
		i0 := math.Sqrt(math.Pi) / 2 * (math.Erf(b) - math.Erf(a))
		i2 := i0/2 - (b*math.Exp(-b*b)-a*math.Exp(-a*a))/2
		return s * (w*w*i0 + i2/(s*s)), s * w * i0
	}
	for _, span := range [][2]float64{{0, 160}, {50, 70}, {50, 70.13}, {41.3, 66.66}} {
		power, spin := exact(span[0], span[1])
		for end := Infinity; end <= Horizon; end++ {
			got := Integrate(sig, end, span[0], span[1], 0.25)
			// Measured: 2e-12, the resampling's and the end corrections' error.
			if math.Abs(got.Power-power) > 2e-11*power || math.Abs(got.Spin-spin) > 2e-11*spin {
				t.Errorf("%v: %+v, want %.15g and %.15g", span, got, power, spin)
			}
		}
	}
	defer func() {
		if recover() == nil {
			t.Error("fourteen steps: no panic")
		}
	}()
	Integrate(sig, Infinity, 10, 13.5, 0.25)
}
