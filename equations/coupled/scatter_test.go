package coupled

import (
	"context"
	"math"
	"testing"

	"nullmark/extract/kerr"
	"nullmark/source"
)

// What the hole absorbs of a scattering particle, by two fields: the spectrum of
// s = -2 at the horizon with the Teukolsky–Starobinsky constants, and s = +2 in
// time with the shear equation. Superradiance takes energy out of the hole.
func TestScatterAbsorption(t *testing.T) {
	if !*long {
		return
	}
	const a, e, l, from, until = 0.9, 1.02, 3.2, 120.0, 820.0
	h := hole(t, a)
	for _, c := range []struct {
		m   int
		tol float64
	}{{2, 1e-4}, {3, 1e-4}} {
		read := func(s int) ([][]complex128, float64, float64) {
			d := Fall(h, from+30, 0.4)
			d.Layers.Slope = 0
			d.Ramp = source.Ramp{Centre: 60, Width: 12}
			if s == 2 {
				d = d.Absorbing()
			}
			r := d.Rung(0.28, 7)
			track, err := FallTrack(r, e, l, from, 0, true, until)
			if err != nil {
				t.Fatal(err)
			}
			run, err := Moving(Equation{S: s, M: c.m}, r, track)
			if err != nil {
				t.Fatal(err)
			}
			if err := run.Until(context.Background(), until); err != nil {
				t.Fatal(err)
			}
			f := &run.Fields
			k0 := int(220 / f.Dt)
			var phi [][]complex128
			for _, x := range f.Phi[Horizon] {
				phi = append(phi, x[k0:])
			}
			return phi, float64(k0)*f.Dt + f.Si, f.Dt
		}
		phi, v0, dt := read(-2)
		one, err := kerr.Spectral(h, c.m, phi, v0, dt, 1.5)
		if err != nil {
			t.Fatal(err)
		}
		phi, v0, dt = read(2)
		two := kerr.Burst(h, c.m, phi, v0, dt).Total
		de, dl := math.Abs(one.Energy/two.Energy-1), math.Abs(one.AngularMomentum/two.AngularMomentum-1)
		t.Logf("m=%d: energy %.6g, angular momentum %.6g; differ by %.1e, %.1e", c.m, one.Energy, one.AngularMomentum, de, dl)
		if !(de < c.tol) || !(dl < c.tol) || one.Energy >= 0 {
			t.Errorf("m=%d: the two routes differ by %.1e in energy, %.1e in angular momentum", c.m, de, dl)
		}
	}
}
