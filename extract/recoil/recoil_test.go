package recoil_test

import (
	"errors"
	"math"
	"math/big"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/recoil"
	"nullmark/extract/signal"

	"gonum.org/v1/gonum/integrate/quad"
)

// harmonic is -2Y_lm from the explicit sum over powers of sin and cos of
// theta/2 (J. N. Goldberg et al., J. Math. Phys. 8, 2155 (1967), eq. 3.1, with
// the sign that makes -2Y22 positive; from memory).
func harmonic(l, m int, theta, phi float64) complex128 {
	const s = -2
	c, sn := math.Cos(theta/2), math.Sin(theta/2)
	fact := func(n int) float64 {
		f, _ := new(big.Float).SetInt(new(big.Int).MulRange(1, int64(n))).Float64()
		return f
	}
	binomial := func(n, k int) float64 {
		if k < 0 || k > n {
			return 0
		}
		f, _ := new(big.Float).SetInt(new(big.Int).Binomial(int64(n), int64(k))).Float64()
		return f
	}
	var sum float64
	for r := 0; r <= l-s; r++ {
		b := binomial(l-s, r) * binomial(l+s, r+s-m)
		if b == 0 {
			continue
		}
		sign := 1.0
		if (l-r-s)%2 != 0 {
			sign = -1
		}
		pc := 2*r + s - m
		sum += b * sign * math.Pow(c, float64(pc)) * math.Pow(sn, float64(2*l-pc))
	}
	if m%2 != 0 {
		sum = -sum
	}
	norm := math.Sqrt(fact(l+m) * fact(l-m) * float64(2*l+1) / (fact(l+s) * fact(l-s) * 4 * math.Pi))
	return cmplx.Rect(norm*sum, float64(m)*phi)
}

// sphere integrates f over the sphere: Gauss–Legendre in cos(theta), equidistant
// in phi; exact for the band-limited f here.
func sphere(f func(theta, phi float64) complex128) complex128 {
	const n, np = 12, 20
	x, w := make([]float64, n), make([]float64, n)
	quad.Legendre{}.FixedLocations(x, w, -1, 1)
	var sum complex128
	for i := range x {
		for k := range np {
			phi := 2 * math.Pi * float64(k) / np
			sum += complex(w[i]*2*math.Pi/np, 0) * f(math.Acos(x[i]), phi)
		}
	}
	return sum
}

func TestHarmonicsOfThisTest(t *testing.T) {
	// The convention the tool states.
	th, ph := 0.7, 0.3
	want := cmplx.Rect(math.Sqrt(5/(64*math.Pi))*math.Pow(1+math.Cos(th), 2), 2*ph)
	if d := cmplx.Abs(harmonic(2, 2, th, ph) - want); d > 1e-14 {
		t.Fatalf("-2Y22 off by %g", d)
	}
	for _, a := range [][2]int{{2, 2}, {3, -1}, {4, 0}, {6, 5}} {
		norm := sphere(func(th, ph float64) complex128 {
			y := harmonic(a[0], a[1], th, ph)
			return y * cmplx.Conj(y)
		})
		if cmplx.Abs(norm-1) > 1e-12 {
			t.Errorf("norm of %v: %v", a, norm)
		}
	}
	// Reflection at the equator: conj(Y_lm(pi-theta)) = (-1)^l Y_{l,-m}, which is
	// what h_{l,-m} = (-1)^l conj(h_lm) rests on.
	for _, a := range [][2]int{{2, 1}, {3, 3}, {5, 2}} {
		l, m := a[0], a[1]
		y := cmplx.Conj(harmonic(l, m, math.Pi-th, ph))
		z := harmonic(l, -m, th, ph) * complex(math.Pow(-1, float64(l)), 0)
		if cmplx.Abs(y-z) > 1e-13 {
			t.Errorf("reflection of %v: %v, %v", a, y, z)
		}
	}
}

func TestRaiseAgainstQuadrature(t *testing.T) {
	worst := 0.0
	for l := 2; l <= 6; l++ {
		for m := -l; m <= l; m++ {
			for k := 2; k <= 7; k++ {
				if m+1 > k || m+1 < -k {
					continue
				}
				got := sphere(func(th, ph float64) complex128 {
					return complex(math.Sin(th), 0) * cmplx.Rect(1, ph) * harmonic(l, m, th, ph) * cmplx.Conj(harmonic(k, m+1, th, ph))
				})
				worst = math.Max(worst, cmplx.Abs(got-complex(recoil.Raise(l, m, k), 0)))
			}
		}
	}
	if worst > 1e-12 {
		t.Errorf("coefficients off by %g", worst)
	}
}

// constant makes a series of one value.
func constant(v complex128, e float64) signal.Series {
	s := signal.Series{Dt: 1, Values: make([]complex128, 20), Err: make([]float64, 20)}
	for k := range s.Values {
		s.Values[k], s.Err[k] = v, e
	}
	return s
}

// TestFluxAgainstQuadrature: random modes up to l = 5; the flux from pairs
// equals the integral over the sphere of (1/16 pi) n |hdot|^2.
func TestFluxAgainstQuadrature(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 2))
	var modes []recoil.Mode
	all := map[[2]int]complex128{}
	for l := 2; l <= 5; l++ {
		for m := 0; m <= l; m++ {
			v := complex(r.NormFloat64(), r.NormFloat64())
			if m == 0 { // its own mirror image
				v = complex(real(v), 0)
				if l%2 == 1 {
					v *= 1i
				}
			}
			modes = append(modes, recoil.Mode{L: l, M: m, Rate: constant(v, 0)})
			all[[2]int{l, m}] = v
			all[[2]int{l, -m}] = complex(math.Pow(-1, float64(l)), 0) * cmplx.Conj(v)
		}
	}
	f, err := recoil.Of(modes, 0)
	if err != nil {
		t.Fatal(err)
	}
	field := func(th, ph float64) float64 {
		var h complex128
		for l := 2; l <= 5; l++ {
			for m := -l; m <= l; m++ {
				h += all[[2]int{l, m}] * harmonic(l, m, th, ph)
			}
		}
		return real(h)*real(h) + imag(h)*imag(h)
	}
	want := sphere(func(th, ph float64) complex128 {
		return complex(math.Sin(th)*field(th, ph)/(16*math.Pi), 0) * cmplx.Rect(1, ph)
	})
	if d := cmplx.Abs(f.Values[3] - want); d > 1e-13*cmplx.Abs(want)+1e-13 {
		t.Errorf("flux %v, quadrature %v", f.Values[3], want)
	}
	up := sphere(func(th, ph float64) complex128 { return complex(math.Cos(th)*field(th, ph), 0) })
	if cmplx.Abs(up) > 1e-11 {
		t.Errorf("the modes of this test are not symmetric about the equator: %v", up)
	}
}

// newtonian returns the rates of the modes that make up the leading recoil of a
// circular orbit of speed v and phase phi in the test-mass limit.
//
// Source: L. E. Kidder, Phys. Rev. D 77, 044016 (2008), leading amplitudes
// (from memory).
func newtonian(v, phi float64) []recoil.Mode {
	lead := 8 * math.Sqrt(math.Pi/5) * v * v
	omega := v * v * v
	var out []recoil.Mode
	for _, a := range []struct {
		l, m int
		c    complex128
	}{
		{2, 2, 1}, {2, 1, complex(0, v/3)}, {2, 0, 0},
		{3, 3, complex(0, -0.75*math.Sqrt(15./14)*v)}, {3, 1, complex(0, v/(12*math.Sqrt(14)))},
	} {
		h := complex(-lead, 0) * a.c * cmplx.Rect(1, -float64(a.m)*phi)
		out = append(out, recoil.Mode{L: a.l, M: a.m, Rate: constant(h*complex(0, -float64(a.m)*omega), 1e-12)})
	}
	return out
}

// TestNewtonianRecoil: |dP/dt| = (464/105) v^11 in the test-mass limit.
//
// Source: M. J. Fitchett, Mon. Not. R. Astron. Soc. 203, 1049 (1983), circular
// orbits (from memory).
func TestNewtonianRecoil(t *testing.T) {
	const v = 0.2
	f, err := recoil.Of(newtonian(v, 0.8), 0)
	if err != nil {
		t.Fatal(err)
	}
	want := 464. / 105 * math.Pow(v, 11)
	if got := cmplx.Abs(f.Values[0]); math.Abs(got/want-1) > 1e-12 {
		t.Errorf("flux %g, want %g", got, want)
	}
}

// TestKickOfABurst: Gaussian bursts of (2,2) and (3,3) at commensurate
// frequencies, whose flux and kick are known in closed form.
func TestKickOfABurst(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 1))
	inside, loose := 0, 0
	const trials = 200
	for range trials {
		e := math.Pow(10, -10+6*r.Float64())
		w, omega, dt := 8+8*r.Float64(), 0.05+0.15*r.Float64(), 0.1+0.3*r.Float64()
		burst := func(m int) signal.Series {
			n := int(260 / dt)
			s := signal.Series{Start: -120, Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}
			p, turn := 6*r.Float64(), float64(m)*omega // errors of a scheme go with the signal
			for k := range s.Values {
				u := s.Time(k)
				g := math.Exp(-u * u / (2 * w * w))
				s.Values[k] = cmplx.Rect(g, -float64(m)*omega*u) + cmplx.Rect(e*g, p-turn*u)
				s.Err[k] = e * g * 1.0001
			}
			return s
		}
		f, err := recoil.Of([]recoil.Mode{{L: 2, M: 2, Rate: burst(2)}, {L: 3, M: 3, Rate: burst(3)}}, 0)
		if err != nil {
			t.Fatal(err)
		}
		// (2,2)->(3,3) and, mirrored, (3,-3)->(2,-2): c twice the same product.
		c := (recoil.Raise(2, 2, 3) - recoil.Raise(3, -3, 2)) / (16 * math.Pi)
		want := -c * w * math.Sqrt(math.Pi) * math.Exp(-omega*omega*w*w/4)
		k, err := recoil.Kick(f, recoil.Options{})
		if err != nil {
			t.Fatal(err)
		}
		miss := math.Max(math.Abs(k.X.Value-want), math.Abs(k.Y.Value))
		if miss <= k.X.Error {
			inside++
		}
		if k.X.Error > 1000*miss+1e-14 {
			loose++
		}
		if math.Abs(k.Speed.Value-math.Abs(want)) > k.Speed.Error {
			inside--
		}
	}
	if inside < trials*99/100 || loose > trials/2 {
		t.Errorf("%d of %d inside, %d bars idle", inside, trials, loose)
	}
}

// TestKickOfAnInspiral: a flux that is the derivative of a known spiral; what
// lies before From is recovered, and its bar says how well.
func TestKickOfAnInspiral(t *testing.T) {
	spiral := func(u float64) complex128 {
		a := math.Pow(1+math.Exp(-u/40), -1) / math.Cosh(math.Max(u, 0)/6)
		return cmplx.Rect(a*a*1e-2, 0.12*u+1e-4*u*u)
	}
	const dt = 0.1
	n := 4200
	f := &recoil.Flux{Start: -300, Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}
	for k := range f.Values {
		u := f.Start + float64(k)*dt
		for i, c := range []float64{1. / 280, -4. / 105, 1. / 5, -4. / 5, 0, 4. / 5, -1. / 5, 4. / 105, -1. / 280} {
			f.Values[k] += complex(c/0.01, 0) * spiral(u+0.01*float64(i-4))
		}
		f.Err[k] = 1e-13
	}
	// The spiral ends at 0, so that the momentum lost is 0 as well.
	k, err := recoil.Kick(f, recoil.Options{From: -150, To: 119, Turning: true})
	if err != nil {
		t.Fatal(err)
	}
	// The bar is the second term of the series; what is left is the third.
	if k.Speed.Value > 0.3*k.Speed.Error || k.Speed.Error > 0.2*cmplx.Abs(spiral(-150)) {
		t.Errorf("kick %+v, momentum at the start %g", *k, cmplx.Abs(spiral(-150)))
	}
	var open *recoil.Open
	if _, err := recoil.Kick(f, recoil.Options{From: -150, To: -5, Turning: true}); !errors.As(err, &open) {
		t.Errorf("flux still rising at the end: %v", err)
	}
}

func TestClimbAndFaults(t *testing.T) {
	if _, err := recoil.Of(newtonian(0.2, 0)[:1], 0); err == nil {
		t.Error("a single mode gave a flux")
	}
	modes := newtonian(0.2, 0)
	if _, err := recoil.Of(append(modes, modes[1]), 0); err == nil {
		t.Error("a mode given twice was accepted")
	}
	modes[1].Rate.Start = 3
	if _, err := recoil.Of(modes, 0); err == nil {
		t.Error("different sample times were accepted")
	}
	burst := func(m int) signal.Series {
		s := signal.Series{Start: -100, Dt: 0.2, Values: make([]complex128, 1000)}
		for k := range s.Values {
			u := s.Time(k)
			s.Values[k] = cmplx.Rect(math.Exp(-u*u/200), -0.1*float64(m)*u)
		}
		return s
	}
	set := []recoil.Mode{{L: 2, M: 1, Rate: burst(1)}, {L: 2, M: 2, Rate: burst(2)}, {L: 3, M: 3, Rate: burst(3)}, {L: 4, M: 4, Rate: burst(4)}}
	steps, err := recoil.Climb(set, recoil.Options{})
	if err != nil || len(steps) != 3 || steps[2].L != 4 {
		t.Fatalf("%+v, %v", steps, err)
	}
	f, _ := recoil.Of(set, 3)
	k, _ := recoil.Kick(f, recoil.Options{})
	if steps[1].Recoil != *k || steps[0].Recoil == steps[1].Recoil {
		t.Errorf("steps %+v, kick of l <= 3 %+v", steps, *k)
	}
}
