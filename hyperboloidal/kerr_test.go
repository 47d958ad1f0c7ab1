package hyperboloidal

import (
	"math"
	"math/big"
	"testing"
)

var kerrSpins = []float64{0, 0.5, -0.9, 0.99, 0.999}

func mustKerr(t *testing.T, a float64) Kerr {
	t.Helper()
	h, err := NewKerr(a)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

func TestKerrSpinRange(t *testing.T) {
	for _, a := range []float64{1, -1, 1.5, math.NaN(), math.Inf(1)} {
		if _, err := NewKerr(a); err == nil {
			t.Errorf("spin %g accepted", a)
		}
	}
}

// The logarithm behind the residual, against the standard library's and by its
// functional equation beyond double precision.
func TestBigLog(t *testing.T) {
	for _, x := range []float64{1e-200, 0.3, 0.7071067811865, 1, 1.7, 3e40} {
		got, _ := bigLog(new(big.Float).SetPrec(residualBits).SetFloat64(x)).Float64()
		if want := math.Log(x); math.Abs(got-want) > 3e-16*math.Abs(want) {
			t.Errorf("ln %g = %g, want %g", x, got, want)
		}
	}
	f := func(n int64) *big.Float { return new(big.Float).SetPrec(residualBits).SetInt64(n) }
	d := bigLog(f(21))
	d.Sub(d, bigLog(f(3)))
	d.Sub(d, bigLog(f(7)))
	if v, _ := d.Float64(); math.Abs(v) > 1e-55 {
		t.Errorf("ln 21 - ln 3 - ln 7 = %g", v)
	}
}

// The inverse tortoise coordinate to the last place: the residual in 192 bits,
// turned into a relative error of y, from deep at the horizon to far away.
func TestKerrInverseTortoise(t *testing.T) {
	for _, a := range kerrSpins {
		h := mustKerr(t, a)
		for _, rs := range []float64{-300, -60, -15.3, -2, 0, 1.7, 3, 10, 500, 1e6} {
			y := h.InverseTortoise(rs)
			err := h.residual(y, rs) / (h.kay(y) / h.delta(y)) / y
			if !(math.Abs(err) < 1.2e-16) {
				t.Errorf("a=%g r*=%g: y=%g off by %.1e relative", a, rs, y, err)
			}
			if q := h.newtonTortoise(rs); math.Abs(q/y-1) > 2e-14*(1+math.Abs(rs)/50) {
				t.Errorf("a=%g r*=%g: plain Newton off by %.1e", a, rs, q/y-1)
			}
		}
	}
}

// At zero spin the constants are those of Schwarzschild.
func TestKerrAtZeroSpin(t *testing.T) {
	h := mustKerr(t, 0)
	for _, rs := range []float64{-30, 0, 12} {
		if got, want := h.InverseTortoise(rs), InverseTortoise(rs); math.Abs(got/want-1) > 1e-14 {
			t.Errorf("r*=%g: y=%g, Schwarzschild gives %g", rs, got, want)
		}
	}
	if h.ISCO() != 6 || math.Abs(h.LightRing()-3) > 1e-15 || h.Azimuth(3) != 0 {
		t.Errorf("ISCO %g, light ring %g, azimuth %g", h.ISCO(), h.LightRing(), h.Azimuth(3))
	}
}

// The azimuth obeys dphi~/dr = a/Delta.
func TestKerrAzimuth(t *testing.T) {
	h := mustKerr(t, 0.7)
	const d = 1e-4
	for _, y := range []float64{0.3, 2, 40} {
		got := (8*(h.Azimuth(y+d)-h.Azimuth(y-d)) - (h.Azimuth(y+2*d) - h.Azimuth(y-2*d))) / (12 * d)
		if want := h.Spin() / h.delta(y); math.Abs(got-want) > 1e-9 {
			t.Errorf("y=%g: %g, want %g", y, got, want)
		}
	}
}

func kerrLayers(h Kerr) KerrLayers {
	return KerrLayers{Hole: h, Si: -14, Ri: -2, Ro: 9, So: 24, Steepness: 3}
}

// The defining identities of the slicing: the height is rho - r* in the outer
// layer and r* - rho in the inner one, and B, C are the slopes that belong to it:
// with tau = t + H, B = K/Delta - dH/dr and C = K + Delta dH/dr.
func TestKerrLayersKeepRays(t *testing.T) {
	for _, a := range kerrSpins {
		h := mustKerr(t, a)
		s := kerrLayers(h)
		for _, rho := range []float64{-10, -5, -3, 0, 5, 11, 15, 20} {
			p := s.At(rho)
			const d = 1e-3
			f := func(x float64) (y, height float64) { q := s.At(x); return q.Y, s.Height(x) }
			y1, h1 := f(rho + d)
			y2, h2 := f(rho - d)
			y3, h3 := f(rho + 2*d)
			y4, h4 := f(rho - 2*d)
			dy := (8*(y1-y2) - (y3 - y4)) / (12 * d)
			dh := (8*(h1-h2) - (h3 - h4)) / (12 * d)
			kd := h.kay(p.Y) / h.delta(p.Y)
			if want := kd - dh/dy; math.Abs(p.B-want) > 1e-7*kd {
				t.Errorf("a=%g rho=%g: B = %g, height gives %g", a, rho, p.B, want)
			}
			if want := h.kay(p.Y) + h.delta(p.Y)*dh/dy; math.Abs(p.C-want) > 1e-7*h.kay(p.Y) {
				t.Errorf("a=%g rho=%g: C = %g, height gives %g", a, rho, p.C, want)
			}
			if d := s.Rho(p.Y) - rho; math.Abs(d) > 1e-10 {
				t.Errorf("a=%g: Rho misses %g by %.1e", a, rho, d)
			}
		}
	}
}

// Every derivative stored at a point against differences along rho, in all
// three parts and on both sides of their joints.
func TestKerrPointDerivatives(t *testing.T) {
	for _, a := range []float64{0, -0.9, 0.99} {
		s := kerrLayers(mustKerr(t, a))
		s.Slope = KerrPlungeSlope(s.Hole, s.Si, 0.05)
		const d = 2e-3
		for _, rho := range []float64{-12, -6, -2.01, -1.99, 3, 8.99, 9.01, 14, 21} {
			p := s.At(rho)
			diff := func(f func(KerrPoint) float64) float64 {
				v := func(x float64) float64 { return f(s.At(rho + x)) }
				return (8*(v(d)-v(-d)) - (v(2*d) - v(-2*d))) / (12 * d)
			}
			check := func(name string, f func(KerrPoint) float64, want float64) {
				got := diff(f)
				if !(math.Abs(got-want) < 2e-8*(math.Abs(want)+math.Abs(f(p)))) {
					t.Errorf("a=%g rho=%g: %s = %.10g, differences give %.10g", a, rho, name, want, got)
				}
			}
			check("x'", func(q KerrPoint) float64 { return q.X }, p.X1)
			check("x''", func(q KerrPoint) float64 { return q.X1 }, p.X2)
			check("x'''", func(q KerrPoint) float64 { return q.X2 }, p.X3)
			check("dC/dx", func(q KerrPoint) float64 { return q.C }, p.Cx*p.X1)
			if p.Where != OuterPart {
				check("r'", func(q KerrPoint) float64 { return q.Y }, p.R1)
				check("r''", func(q KerrPoint) float64 { return q.R1 }, p.R2)
				check("r'''", func(q KerrPoint) float64 { return q.R2 }, p.R3)
				check("dB/dx", func(q KerrPoint) float64 { return q.B }, p.Bx*p.X1)
				check("d2B/dx2", func(q KerrPoint) float64 { return q.Bx }, p.Bxx*p.X1)
			}
		}
	}
}

// The ends: x = 0 exactly at null infinity, y = 0 at the horizon, everything
// finite, and outgoing speed 1 in the outer layer (A0 (x')^2 + At x' + Axx = 0
// for a wave that moves with d rho/d tau = 1).
func TestKerrLayerEnds(t *testing.T) {
	for _, a := range kerrSpins {
		s := kerrLayers(mustKerr(t, a))
		for _, rho := range []float64{s.Si, s.So} {
			p := s.At(rho)
			for _, v := range []float64{p.X, p.X1, p.X2, p.X3, p.B, p.C, p.Cx, p.A0()} {
				if math.IsNaN(v) || math.IsInf(v, 0) {
					t.Errorf("a=%g: not finite at rho=%g: %+v", a, rho, p)
				}
			}
		}
		if s.At(s.So).X != 0 || s.At(s.Si).Y != 0 {
			t.Errorf("a=%g: the ends are at 1/r = %g and r - r+ = %g", a, s.At(s.So).X, s.At(s.Si).Y)
		}
		a2 := a * a
		for _, rho := range []float64{9.5, 13, 20, 24} {
			p := s.At(rho)
			at := -2 * (1 + a2*p.X*p.X - p.X*p.X*p.C)
			if v := p.A0()*p.X1*p.X1 - at*p.X1 - p.X*p.X*p.D; math.Abs(v) > 1e-13*p.A0()*p.X1*p.X1 {
				t.Errorf("a=%g rho=%g: outgoing rays off by %g", a, rho, v)
			}
		}
	}
}

func TestKerrLayersCheck(t *testing.T) {
	h := mustKerr(t, 0.5)
	good := kerrLayers(h)
	if err := good.Check(); err != nil {
		t.Error(err)
	}
	for _, s := range []KerrLayers{
		{Hole: h, Si: 0, Ri: -2, Ro: 9, So: 24, Steepness: 3},
		{Hole: h, Si: -14, Ri: -2, Ro: 9, So: math.NaN(), Steepness: 3},
		{Hole: h, Si: -14, Ri: -2, Ro: 9, So: 24},
	} {
		if s.Check() == nil {
			t.Errorf("accepted %+v", s)
		}
	}
}
