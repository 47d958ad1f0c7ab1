package worldline

import (
	"errors"
	"math"
	"strings"
	"testing"
)

// rows samples a worldline at t0, t0+dt, … (spread makes the steps uneven).
func rows(w Worldline, t0, dt, spread float64, n int) (s Samples) {
	var x State
	for i := range n {
		t := t0 + dt*(float64(i)+spread*math.Sin(1.7*float64(i)))
		w.At(t, &x)
		s.T, s.R, s.Phi = append(s.T, t), append(s.R, x.R), append(s.Phi, x.Phi)
		s.E, s.L = append(s.E, x.E), append(s.L, x.L)
		s.PR, s.PPhi = append(s.PR, x.P/x.F()), append(s.PPhi, x.L)
	}
	return s
}

func TestTableReconstructs(t *testing.T) {
	for _, o := range []struct {
		name       string
		w          Worldline
		dt, spread float64
		limit      float64 // on positions away from the ends
	}{
		{"circular", must[*Circular](t)(NewCircular(10, 0)), 0.5, 0, 3e-14},
		{"eccentric", must[*Eccentric](t)(NewEccentric(7.50478, 0.188917, 0, 0)), 0.5, 0, 3e-13},
		{"eccentric, wide", must[*Eccentric](t)(NewEccentric(9, 0.5, 0, 0)), 6, 0, 1e-6},
		{"eccentric, uneven", must[*Eccentric](t)(NewEccentric(9, 0.5, 0, 0)), 0.5, 0.2, 3e-12},
	} {
		n := int(600 / o.dt)
		in := rows(o.w, 0, o.dt, o.spread, n)
		bare := Samples{T: in.T, R: in.R, Phi: in.Phi}
		c := must[*Table](t)(NewTable(bare, false))
		er, ephi := c.Uncertainty()
		var a, b State
		var dr, dphi, dE, dL, dp, endR, endPhi float64
		t0, t1 := c.Span()
		for x := t0 + 10*o.dt; x < t1-10*o.dt; x += 0.0731 {
			o.w.At(x, &a)
			c.At(x, &b)
			dr = max(dr, math.Abs(a.Y-b.Y))
			dphi = max(dphi, math.Abs(a.Phi-b.Phi), math.Abs(math.Remainder(b.Phase-a.Phase, 2*math.Pi)))
			dE = max(dE, math.Abs(a.E-b.E))
			dL = max(dL, math.Abs(a.L-b.L))
			dp = max(dp, math.Abs(a.P-b.P))
		}
		for x := t0; x < t1; x += 0.0731 {
			o.w.At(x, &a)
			c.At(x, &b)
			endR, endPhi = max(endR, math.Abs(a.Y-b.Y)), max(endPhi, math.Abs(a.Phi-b.Phi))
		}
		t.Logf("%s: with the ends r %.1e, phi %.1e", o.name, endR, endPhi)
		t.Logf("%s: errors r %.1e (bar %.1e), phi %.1e (bar %.1e), E %.1e, L %.1e, p %.1e", o.name, dr, er, dphi, ephi, dE, dL, dp)
		// ulp of phi at 60 rad is 7e-15
		if dr > o.limit || dphi > o.limit+2e-14 {
			t.Errorf("%s: positions err by %.2g, %.2g", o.name, dr, dphi)
		}
		if endR > er || endPhi > ephi {
			t.Errorf("%s: bars %.2g, %.2g do not cover errors %.2g, %.2g", o.name, er, ephi, endR, endPhi)
		}
		if er > 10*endR+5e-14 || ephi > 10*endPhi+1e-12 {
			t.Errorf("%s: bars %.2g, %.2g are padded over errors %.2g, %.2g", o.name, er, ephi, endR, endPhi)
		}
		// phi is rounded to 7e-15 in the rows; its slope counts r^2 E/f times in L
		if lim := 100*o.limit + 1e-10; dE > lim || dL > lim || dp > lim {
			t.Errorf("%s: E, L, p err by %.2g, %.2g, %.2g", o.name, dE, dL, dp)
		}
		own := must[*Table](t)(NewTable(in, true))
		own.At(300.1, &b)
		o.w.At(300.1, &a)
		near(t, "own E", b.E, a.E, 1e-14)
		near(t, "own L", b.L, a.L, 1e-13)
		near(t, "own against instantaneous", own.Drift(), 0, 1e-4)
	}
}

func TestTableThroughPlunge(t *testing.T) {
	truth := must[*Infall](t)(NewInfall(5.8, math.Sqrt(8.0/9), math.Sqrt(12), 0))
	ring := marker(t, truth, MarkLightRing).T
	for _, stop := range []float64{ring + 4, ring + 30} { // near 2.4, far below the handover
		in := rows(truth, 0, 0.25, 0, int(stop/0.25))
		c := must[*Table](t)(NewTable(Samples{T: in.T, R: in.R, Phi: in.Phi}, false))
		var a, b State
		for x := 20.0; x < ring+60; x += 0.37 {
			truth.At(x, &a)
			c.At(x, &b)
			near(t, "r_*", b.Rstar, a.Rstar, 1e-6)
			near(t, "phi", b.Phi, a.Phi, 1e-7)
			near(t, "E", b.E, a.E, 1e-6)
			near(t, "L", b.L, a.L, 5e-6)
		}
		near(t, "light ring", marker(t, c, MarkLightRing).T, ring, 1e-9)
		near(t, "peak of Omega", marker(t, c, MarkPeakOmega).T, ring, 1e-5)
		near(t, "horizon", marker(t, c, MarkHorizon).T, marker(t, truth, MarkHorizon).T, 1e-6)
		if _, end := c.Span(); !math.IsInf(end, 1) {
			t.Error("a plunging table must reach the horizon")
		}
	}
}

func TestTableFaults(t *testing.T) {
	orbit := must[*Eccentric](t)(NewEccentric(9, 0.3, 0, 0))
	for _, k := range []struct {
		name  string
		spoil func(s *Samples)
		row   int
		says  string
	}{
		{"short", func(s *Samples) { s.T, s.R, s.Phi = s.T[:9], s.R[:9], s.Phi[:9] }, 9, "at least"},
		{"not increasing", func(s *Samples) { s.T[30] = s.T[29] }, 31, "strictly"},
		{"not a number", func(s *Samples) { s.R[7] = math.NaN() }, 8, "finite"},
		{"horizon", func(s *Samples) { s.R[50] = 1.99 }, 51, "horizon"},
		{"gap", func(s *Samples) {
			s.T, s.R, s.Phi = append(s.T[:100:100], s.T[120:]...), append(s.R[:100:100], s.R[120:]...), append(s.Phi[:100:100], s.Phi[120:]...)
		}, 101, "gap"},
		{"superluminal radius", func(s *Samples) {
			for i := 80; i < len(s.R); i++ {
				s.R[i] += 5
			}
		}, 81, "faster than light"},
		{"wrapped azimuth", func(s *Samples) {
			for i := 200; i < len(s.Phi); i++ {
				s.Phi[i] -= 2 * math.Pi
			}
		}, 201, "wrapped"},
		{"spike", func(s *Samples) { s.R[150] += 1e-3 }, 151, "departs"},
		{"spike in phi", func(s *Samples) { s.Phi[33] -= 2e-5 }, 34, "departs"},
		{"noise", func(s *Samples) {
			for i := range s.R {
				s.R[i] += 1e-3 * math.Sin(float64(i*i))
			}
		}, 1, "not smooth"},
	} {
		s := rows(orbit, 0, 0.5, 0, 600)
		s.E, s.L, s.PR, s.PPhi = nil, nil, nil, nil
		k.spoil(&s)
		_, err := NewTable(s, false)
		var f TableFaults
		if !errors.As(err, &f) {
			t.Errorf("%s: got %v, want TableFaults", k.name, err)
			continue
		}
		if f[0].Row != k.row || !strings.Contains(f[0].Error(), k.says) {
			t.Errorf("%s: got %q, want row %d and %q", k.name, f[0].Error(), k.row, k.says)
		}
	}
	// velocities that do not fit together
	s := rows(orbit, 0, 0.5, 0, 600)
	s.E[40] *= 1.01
	if _, err := NewTable(s, false); err == nil || !strings.Contains(err.Error(), "row 41") {
		t.Errorf("a wrong E passed: %v", err)
	}
	// a table without E and L has no constants of its own
	s = rows(orbit, 0, 0.5, 0, 600)
	s.E, s.L, s.PR, s.PPhi = nil, nil, nil, nil
	if _, err := NewTable(s, true); err == nil {
		t.Error("own constants of a bare table passed")
	}
}

func TestPostNewtonianFlux(t *testing.T) {
	// infinity and horizon, all l: computed for this project in the frequency
	// domain (continued fractions). The remainder of the series is its first
	// omitted term, a few hundred v^12.
	for _, k := range []struct{ r, flux float64 }{
		{6, 9.37270410724672e-4 + 3.06894559e-6},
		{10, 6.150372549041e-5 + 1.259129423e-8},
	} {
		x := 1 / k.r
		got := 6.4 * math.Pow(x, 5) * PostNewtonian{}.Ratio(x)
		near(t, "flux over exact", got/k.flux, 1, 2.9e3*math.Pow(x, 6))
		if math.Abs(got/k.flux-1) < 1e-4 {
			t.Errorf("r = %v: better than a series of this order can be", k.r)
		}
	}
}

// The coefficients as numbers, T. Tanaka, H. Tagoshi, M. Sasaki, PTP 96, 1087
// (1996), abstract-level formula (from memory), four digits.
func TestPostNewtonianCoefficients(t *testing.T) {
	c, l := series()
	c[8]-- // the leading flux into the horizon
	for k, want := range [12]float64{1, 0, -3.711, 12.57, -4.928, -38.29, 115.7, -101.5, -117.5, 719.1, -1217, 958.9} {
		near(t, "coefficient", c[k], want, 6e-4*math.Abs(want))
	}
	for k, want := range [12]float64{6: -16.30, 8: 52.74, 9: -204.9, 10: 116.6, 11: 473.6} {
		near(t, "logarithm", l[k], want, 6e-4*math.Abs(want))
	}
}

func TestFluxTable(t *testing.T) {
	pn := PostNewtonian{}
	exact := func(x float64) float64 { // an invented flux with the right shape
		return 6.4 * math.Pow(x, 5) * pn.Ratio(x) * (1 + 20*math.Pow(x, 4)/(1-2.5*x))
	}
	var r, inf, hor []float64
	const n = 30
	for i := range n {
		q := 5.2 * math.Pow(20/5.2, float64(i)/(n-1))
		r, inf, hor = append(r, q), append(inf, exact(1/q)*0.999), append(hor, exact(1/q)*0.001)
	}
	f := must[*FluxTable](t)(NewFluxTable(r, inf, hor))
	worst := 0.0
	for x := 1.0 / 19.9; x < 1/5.4; x += 0.00037 {
		worst = max(worst, math.Abs(f.Ratio(x)*6.4*math.Pow(x, 5)/exact(x)-1))
	}
	t.Logf("interpolation error %.1e, bar %.1e", worst, f.Uncertainty())
	if worst > f.Uncertainty() || worst > 1e-8 {
		t.Errorf("interpolation error %.2g, bar %.2g", worst, f.Uncertainty())
	}
	// no bend or pole beyond the end
	for x := 1 / 5.3; x < 0.3; x += 0.001 {
		q := f.Ratio(x) / pn.Ratio(x)
		if q < 1 || q > 1.06 {
			t.Fatalf("ratio %v at x = %v", q, x)
		}
	}
	// a table of the post-Newtonian flux drives the post-Newtonian inspiral
	for i := range r {
		inf[i], hor[i] = 6.4*math.Pow(1/r[i], 5)*pn.Ratio(1/r[i]), 0
	}
	f = must[*FluxTable](t)(NewFluxTable(r, inf, hor))
	a := must[*Inspiral](t)(NewInspiral(InspiralOrbit{MassRatio: 1e-3, From: 7, Drive: f}))
	b := must[*Inspiral](t)(NewInspiral(InspiralOrbit{MassRatio: 1e-3, From: 7}))
	for i, m := range a.Markers() {
		near(t, m.Name, m.T, b.Markers()[i].T, 1e-8)
	}
	for _, k := range []struct {
		name  string
		spoil func()
	}{
		{"inside the light ring", func() { r[3] = 2.5 }},
		{"negative", func() { inf[4] = -1 }},
		{"twice", func() { r[5] = r[6] }},
		{"too far out", func() {
			for i := range r {
				r[i] += 2
			}
		}},
		{"short", func() { r, inf, hor = r[:6], inf[:6], hor[:6] }},
	} {
		r0, i0, h0 := append([]float64(nil), r...), append([]float64(nil), inf...), append([]float64(nil), hor...)
		k.spoil()
		_, err := NewFluxTable(r, inf, hor)
		var e TableFaults
		if !errors.As(err, &e) {
			t.Errorf("%s: got %v", k.name, err)
		}
		r, inf, hor = r0, i0, h0
	}
	_, err := NewInspiral(InspiralOrbit{MassRatio: 1e-3, From: 25, Drive: f})
	var e *Impossible
	if !errors.As(err, &e) || !strings.Contains(err.Error(), "20") {
		t.Errorf("a start outside the flux table gave %v", err)
	}
}
