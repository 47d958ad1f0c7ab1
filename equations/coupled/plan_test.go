package coupled

import "testing"

// The grid rule keeps its promises: layers in order, a period of whole steps,
// never a coarser grid than asked, and an inner end that is not stiff (dt times
// dr/drho at the horizon below 1).
func TestGridRule(t *testing.T) {
	for _, a := range []float64{-0.9, 0, 0.5, 0.999} {
		h := hole(t, a)
		for _, r0 := range []float64{h.ISCO(), 10, 50, 100} {
			for _, dx := range []float64{0.2, 0.4, 0.6} {
				d := Bound(h, r0, r0, 0.6)
				if err := d.Layers.Check(); err != nil {
					t.Fatal(err)
				}
				r := d.Rung(dx, 5)
				if r.Dx() > dx*(1+1e-12) {
					t.Errorf("a=%g r=%g: spacing %g where %g was asked", a, r0, r.Dx(), dx)
				}
				const period = 73.1
				q := r.Align(period)
				if n := period / q.Dt; n != float64(int(n+0.5)) && (n-float64(int(n+0.5)))/n > 1e-12 || q.Dt > r.Dt {
					t.Errorf("a=%g r=%g: %g steps a period", a, r0, n)
				}
				p := d.Layers.At(d.Layers.Si)
				if s := r.Dt * p.R1; !(s < 1) {
					t.Errorf("a=%g r=%g: the inner end is stiff, dt dr/drho = %g", a, r0, s)
				}
			}
		}
	}
	if _, _, err := CircularState(hole(t, 0.9), 1.5, 0); err == nil {
		t.Error("a circular orbit inside the light ring was accepted")
	}
}

func TestAngular(t *testing.T) {
	for _, c := range []struct {
		spin, omega float64
		m, lmax     int
		asked       float64
		want        int
	}{
		{0, 0.1, 2, 6, 1e-9, 6},
		{0.9, 0.13, 2, 6, 1e-10, 8},   // measured: 8 give 1e-12 at r = 6
		{0.99, 0.66, 2, 6, 1e-10, 11}, // measured: 10 give 4e-12, 8 give 9e-9 at r = 1.6
	} {
		if got := Angular(c.spin, c.omega, c.m, c.lmax, c.asked); got != c.want {
			t.Errorf("%+v: %d", c, got)
		}
	}
}
