package worldline

import (
	"math"
	"testing"

	"nullmark/hyperboloidal"
)

func kerrHole(t *testing.T, a float64) hyperboloidal.Kerr {
	t.Helper()
	h, err := hyperboloidal.NewKerr(a)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

func kerrNear(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if d := math.Abs(got - want); !(d <= tol*math.Max(math.Abs(want), 1e-300)) {
		t.Errorf("%s = %.15g, want %.15g (relative %.1e, allowed %.1e)", what, got, want, d/math.Abs(want), tol)
	}
}

// Frequency-domain reference of an inclined circular orbit, a = 0.9, r = 6, 30
// degrees, computed for this project, 12 digits.
func TestKerrInclinedConstants(t *testing.T) {
	h := kerrHole(t, 0.9)
	o, err := NewKerrBound(h, 6, 0, math.Cos(math.Pi/6), 0, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	kerrNear(t, "E", o.E, 0.924109612515, 1e-12)
	kerrNear(t, "L", o.L, 2.47345309612, 2e-12)
	kerrNear(t, "Q", o.Q, 2.03932340624, 2e-12)
	kerrNear(t, "Omega_theta", o.OmegaTheta, 0.0588691247828, 2e-12)
	kerrNear(t, "Omega_phi", o.OmegaPhi, 0.0650980853265, 2e-12)
}

// Exact formulas: Schwarzschild constants of (p, e), the separatrix p = 6 + 2e,
// and the frequencies of p = 7.50478, e = 0.188917 (C. Cutler, D. Kennefick, E.
// Poisson, PRD 50, 3816 (1994), recomputed to more digits).
func TestKerrBoundAtZeroSpin(t *testing.T) {
	h := kerrHole(t, 0)
	p, e := 7.50478, 0.188917
	for _, c := range []float64{1, 0.6, -0.3} {
		o, err := NewKerrBound(h, p, e, c, 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		kerrNear(t, "E", o.E, math.Sqrt(((p-2)*(p-2)-4*e*e)/(p*(p-3-e*e))), 1e-14)
		kerrNear(t, "L^2+Q", o.L*o.L+o.Q, p*p/(p-3-e*e), 1e-14)
		kerrNear(t, "Omega_r", o.OmegaR, 0.0210558078, 5e-9)
		kerrNear(t, "Omega_phi", o.OmegaPhi, math.Copysign(0.0475982489, c), 5e-9)
		kerrNear(t, "Omega_theta", o.OmegaTheta, 0.0475982489, 5e-9)
		kerrNear(t, "separatrix", KerrSeparatrix(h, e, c), 6+2*e, 1e-12)
	}
}

// ISCO values of Bardeen, Press and Teukolsky (1972).
func TestKerrISCO(t *testing.T) {
	for _, c := range []struct{ a, r, e, w float64 }{
		{0.5, 4.23300252953, 0.917882006661, 0.10858835898},
		{0.9, 2.32088304176, 0.844247008006, 0.225441708835},
	} {
		h := kerrHole(t, c.a)
		kerrNear(t, "ISCO", h.ISCO(), c.r, 1e-11)
		k, w, err := CircularKerr(h, c.r)
		if err != nil {
			t.Fatal(err)
		}
		kerrNear(t, "E", k.E, c.e, 1e-11)
		kerrNear(t, "Omega", w, c.w, 1e-11)
		// the separatrix at e = 0 is the ISCO; there dE/dr vanishes, so only half the digits are left
		kerrNear(t, "separatrix", KerrSeparatrix(h, 0, 1), h.ISCO(), 1e-6)
		kerrNear(t, "photon orbit", KerrPhotonOrbit(h, 1), h.LightRing(), 1e-9)
		kerrNear(t, "retrograde photon orbit", KerrPhotonOrbit(h, -1), kerrHole(t, -c.a).LightRing(), 1e-9)
	}
}

// The states obey the first-order geodesic equations, written without the
// series: Sigma^2 r'^2 = P^2 - Delta (r^2+K_C), and dt, dphi by differences.
func TestKerrBoundObeysGeodesic(t *testing.T) {
	for _, c := range []struct{ a, p, e, ci float64 }{
		{0.9, 4.64, 0.3, 1}, {0.9, 11, 0.7, -0.8}, {-0.5, 12, 0.2, 0.3}, {0.7, 8, 0, 0.5}, {0.99, 3, 0.5, 0.95},
	} {
		h := kerrHole(t, c.a)
		o, err := NewKerrBound(h, c.p, c.e, c.ci, 0.4, 1.1, 0.2)
		if err != nil {
			t.Fatal(err)
		}
		const dt = 0.01
		for _, tm := range []float64{-30, 0, 17.3, 400} {
			s, _ := o.At(tm)
			pp := s.E*(s.R*s.R+c.a*c.a) - c.a*s.L
			d := s.R*s.R - 2*s.R + c.a*c.a
			kerrNear(t, "R", s.Wr*s.Wr/(pp*pp)+d*(s.R*s.R+s.Carter(c.a))/(pp*pp), 1, 1e-12)
			tw := s.Twist(c.a)
			kerrNear(t, "Theta", s.Wtheta*s.Wtheta+tw*tw+c.a*c.a*s.Cos*s.Cos, s.Carter(c.a), 1e-12)
			b := (s.R*s.R + c.a*c.a) / d
			st := s.SigmaTau(c.a, b)
			diff := func(f func(KerrState) float64) float64 {
				g := func(x float64) float64 { v, _ := o.At(tm + x); return f(v) }
				return (8*(g(dt)-g(-dt)) - (g(2*dt) - g(-2*dt))) / (12 * dt)
			}
			if got, want := diff(func(k KerrState) float64 { return k.R }), s.Wr/st; math.Abs(got-want) > 1e-9 {
				t.Errorf("%+v: dr/dt %g, want %g", c, got, want)
			}
			if got, want := diff(func(k KerrState) float64 { return k.Phi }), s.SigmaPhi(c.a)/st; math.Abs(got-want) > 1e-9 {
				t.Errorf("%+v: dphi/dt %g, want %g", c, got, want)
			}
			if got, want := diff(func(k KerrState) float64 { return math.Acos(k.Cos) }), s.Wtheta/st; math.Abs(got-want) > 1e-9 {
				t.Errorf("%+v: dtheta/dt %g, want %g", c, got, want)
			}
		}
	}
}

func TestKerrOrbitsRefused(t *testing.T) {
	h := kerrHole(t, 0.9)
	if _, _, err := CircularKerr(h, 1.5); err == nil {
		t.Error("circular orbit inside the light ring accepted")
	}
	if _, err := NewKerrBound(h, 2.4, 0.3, 1, 0, 0, 0); err == nil {
		t.Error("orbit below the separatrix accepted")
	}
	if _, err := NewKerrBound(h, 8, 1.1, 1, 0, 0, 0); err == nil {
		t.Error("unbound orbit accepted")
	}
}

// A fall obeys the first integral all the way through the horizon, where the
// general and the factorised potential agree, and its rates match differences.
func TestKerrFall(t *testing.T) {
	for _, a := range []float64{0, 0.9, -0.5} {
		h := kerrHole(t, a)
		k, _, err := CircularKerr(h, h.ISCO())
		if err != nil {
			t.Fatal(err)
		}
		s := hyperboloidal.KerrLayers{Hole: h, Si: -23, Ri: -3, Ro: 20, So: 45, Steepness: 3}
		s.Slope = hyperboloidal.KerrPlungeSlope(h, s.Si, 0.05)
		for _, c := range []struct{ e, l, from float64 }{{k.E, k.L, 0.98 * h.ISCO()}, {1, 0, 9}, {1.1, 2, 9}} {
			f := NewKerrFall(s, c.e, c.l)
			begin, err := f.Begin(c.from, 0.3, true)
			if err != nil {
				t.Fatal(err)
			}
			const step = 0.05
			path := f.Sample(begin, step, 20000, s.Si-2)
			if last := path[len(path)-1]; last.R >= h.OuterHorizon() {
				t.Errorf("a=%g %+v: ends at r = %g, outside the horizon", a, c, last.R)
			}
			for i := 4; i < len(path)-4; i += 37 {
				p := path[i]
				pp := p.E*(p.R*p.R+a*a) - a*p.L
				want := pp*pp - (p.R*p.R-2*p.R+a*a)*(p.R*p.R+p.Carter(a))
				if d := math.Abs(p.Wr*p.Wr - want); d > 5e-12*pp*pp { // 2e-12 measured, of the step
					t.Fatalf("a=%g %+v r=%g: first integral off by %.1e", a, c, p.R, d/(pp*pp))
				}
				dphi := (8*(path[i+1].Phi-path[i-1].Phi) - (path[i+2].Phi - path[i-2].Phi)) / (12 * step)
				b := s.Along(p.Rho).B
				if want := p.SigmaPhi(a) / p.SigmaTau(a, b); math.Abs(dphi-want) > 1e-6 {
					t.Fatalf("a=%g %+v r=%g: dphi/dtau %g, want %g", a, c, p.R, dphi, want)
				}
			}
		}
		if _, err := NewKerrFall(s, 0.9, 0).Begin(50, 0, true); err == nil {
			t.Errorf("a=%g: a bound particle was started where it cannot be", a)
		}
	}
}

// E and L from the coordinate velocity of a geodesic are its own.
func TestKerrFromVelocity(t *testing.T) {
	h := kerrHole(t, 0.9)
	o, err := NewKerrBound(h, 7, 0.3, 1, 1.1, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	s, az := o.At(20)
	b := (s.R*s.R + 0.81) / (s.R*s.R - 2*s.R + 0.81)
	st := s.SigmaTau(0.9, b)
	// dphi/dt = dphi~/dt - (a/Delta) dr/dt
	rd := s.Wr / st
	k, err := KerrFromVelocity(h, s.R, az, rd, s.SigmaPhi(0.9)/st-0.9/(s.R*s.R-2*s.R+0.81)*rd)
	if err != nil {
		t.Fatal(err)
	}
	kerrNear(t, "E", k.E, o.E, 1e-13)
	kerrNear(t, "L", k.L, o.L, 1e-13)
	kerrNear(t, "W", k.Wr, s.Wr, 1e-13)
	if _, err := KerrFromVelocity(h, 4, 0, 0, 0.5); err == nil {
		t.Error("a speed above that of light was accepted")
	}
}
