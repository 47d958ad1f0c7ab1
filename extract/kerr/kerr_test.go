package kerr

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/hyperboloidal"
)

func hole(t *testing.T, a float64) hyperboloidal.Kerr {
	t.Helper()
	h, err := hyperboloidal.NewKerr(a)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

// At a omega = 0 the spheroidal modes are the spherical ones, lambda =
// (l-1)(l+2), and |C|^2 = [(l-1) l (l+1)(l+2)]^2 + 144 omega^2 (S. A. Teukolsky
// and W. H. Press, ApJ 193, 443 (1974)).
func TestSpheroidalAtZeroSpin(t *testing.T) {
	const w = 0.3
	s, err := NewSpheroidal(hole(t, 0), 2, 5, w)
	if err != nil {
		t.Fatal(err)
	}
	for i, lam := range s.Lambda {
		l := float64(s.LMin + i)
		if math.Abs(lam-(l-1)*(l+2)) > 1e-13*l*l {
			t.Errorf("l=%g: lambda %g", l, lam)
		}
		want := math.Pow((l-1)*l*(l+1)*(l+2), 2) + 144*w*w
		if got := Starobinsky(0, 2, w, lam); math.Abs(got/want-1) > 1e-13 {
			t.Errorf("l=%g: |C|^2 = %g, want %g", l, got, want)
		}
	}
}

// Small a omega: lambda = (l-1)(l+2) - 2 a w m (l(l+1)+4)/(l(l+1)) + O((a w)^2)
// for s = -2 (M. Sasaki and H. Tagoshi, Living Rev. Relativity 6, 6 (2003), eq.
// 110; from memory).
func TestSpheroidalSlowRotation(t *testing.T) {
	const a, w = 0.5, 1e-5
	s, err := NewSpheroidal(hole(t, a), 2, 6, w)
	if err != nil {
		t.Fatal(err)
	}
	for i := range 4 {
		l := float64(s.LMin + i)
		want := -2 * a * w * 2 * (l*(l+1) + 4) / (l * (l + 1))
		if got := s.Lambda[i] - (l-1)*(l+2); math.Abs(got-want) > 1e-9 {
			t.Errorf("l=%g: first order %g, want %g", l, got, want)
		}
	}
}

// Absorption changes sign at omega = m Omega_H (superradiance).
func TestSuperradiance(t *testing.T) {
	h := hole(t, 0.9)
	for _, f := range []float64{0.5, 0.999, 1.001, 2} {
		s, err := NewSpheroidal(h, 2, 4, f*2*h.HorizonFrequency())
		if err != nil {
			t.Fatal(err)
		}
		if got := s.Alpha(0); (got > 0) != (f > 1) {
			t.Errorf("alpha at %g m Omega_H is %g", f, got)
		}
	}
}

// Tones closer than the window resolves by itself are separated.
func TestHarmonics(t *testing.T) {
	om := []float64{0.3, 0.31, -0.2, 0.55}
	want := []complex128{1 + 2i, -0.5i, 1e-6, 3e-3}
	const dt = 0.4
	v := make([]complex128, 3000)
	for k := range v {
		for j, w := range om {
			v[k] += want[j] * cmplx.Exp(complex(0, -w*float64(k)*dt))
		}
	}
	got, err := Harmonics(v, 0, dt, 100, 800, om)
	if err != nil {
		t.Fatal(err)
	}
	for j := range got {
		if cmplx.Abs(got[j]-want[j]) > 1e-12 {
			t.Errorf("tone %d: %v, want %v", j, got[j], want[j])
		}
	}
	if _, err := Harmonics(v, 0, dt, 900, 400, om); err == nil {
		t.Error("a window beyond the samples was accepted")
	}
}

// A burst with a known double integral: psi4 = (1/2) d2/du2 of a Gaussian wave
// packet on a slow oscillation that dies away, plus an offset that alone would
// drift by 1e-7 (1000)^2.
func TestStrainSeries(t *testing.T) {
	const dt, end = 0.25, 1100.0
	n := int(end/dt) + 1
	// h = exp(-i phi) times a switch-off; phi'' by differences is exact here
	// because h is sampled from a closed form and differentiated in closed form.
	const w = 0.12
	psi := make([]complex128, n)
	want := make([]complex128, n)
	for k := range psi {
		u := float64(k) * dt
		// envelope g = 1/(1+e^{x}), x = (u-700)/10
		x := (u - 700) / 10
		g := 1 / (1 + math.Exp(x))
		g1 := -g * (1 - g) / 10
		g2 := g * (1 - g) * (1 - 2*g) / 100
		e := cmplx.Exp(complex(0, -w*u))
		want[k] = complex(g, 0) * e
		psi[k] = 0.5*(complex(g2, 0)+complex(0, -2*w*g1)-complex(w*w*g, 0))*e + 1e-12
	}
	h, bar := StrainSeries(psi, dt, 100, 2*math.Pi/w)
	for k := 400; k < n; k += 7 {
		if d := cmplx.Abs(h[k] - want[k]); d > 3e-8 || d > 2*bar[k]+3e-9 {
			t.Fatalf("u=%g: off by %.1e, bar %.1e", float64(k)*dt, d, bar[k])
		}
	}
}

// The shear obeys its equation: sigma of a driven oscillation e^{-i w v} switched
// off smoothly is -e^{-i w v}/(kap + i w) while the drive lasts.
func TestShear(t *testing.T) {
	const dt, kap, w = 0.2, 0.15, 0.4
	psi, sigma := make([]complex128, 3000), make([]complex128, 3000)
	for k := range psi {
		v := float64(k) * dt
		psi[k] = cmplx.Exp(complex(0, -w*v)) / complex(1+math.Exp((v-450)/5), 0)
	}
	shear(sigma, psi, kap, dt)
	for _, k := range []int{200, 700, 1000} {
		want := -cmplx.Exp(complex(0, -w*float64(k)*dt)) / complex(kap, w)
		if d := cmplx.Abs(sigma[k] - want); d > 1e-11 {
			t.Errorf("sigma at %g off by %.1e", float64(k)*dt, d)
		}
	}
}
