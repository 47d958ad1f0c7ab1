package worldline

import (
	"math"
	"testing"
)

func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol) {
		t.Errorf("%s: got %.17g, want %.17g, off by %.2g (allowed %.2g)", what, got, want, got-want, tol)
	}
}

func TestX(t *testing.T) {
	e, err := NewEccentric(7.50478, 0.188917, 0.3, 0.7)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(e.Numbers(), e.Drift(), len(e.solution.pieces), e.seam, e.azimuthDrift)
	t.Log(e.Markers())
	f, err := NewInfall(5.95, math.Sqrt(8.0/9), math.Sqrt(12), 0)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(f.Markers(), f.Drift(), f.mono, len(f.ahead.pieces), len(f.past.pieces))
	var s State
	f.At(f.Markers()[0].T, &s)
	t.Log(s, s.Omega()-math.Sqrt(6)/18)
	f, err = NewInfall(10, AtRest(), 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(f.Markers(), f.Drift(), f.mono, len(f.ahead.pieces), len(f.past.pieces))
	f, err = NewInfall(math.Inf(1), 1, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(f.Markers(), f.Drift(), f.mono, len(f.ahead.pieces), len(f.past.pieces))
	c, err := NewScatter(1.1, 6, 200, 0, 1000)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(c.Numbers(), c.Markers(), c.Drift(), len(c.solution.pieces))
	c, err = NewScatter(1, 4.001, 200, 0, 1000)
	if err != nil {
		t.Fatal(err)
	}
	t.Log(c.Numbers(), c.Markers(), c.Drift(), len(c.solution.pieces))
}

func TestY(t *testing.T) {
	for _, x := range []float64{0.1, 1.0 / 6, 0.2, 0.23, 0.26457} {
		t.Log(x, PostNewtonian{}.Ratio(x), 6.4*math.Pow(x, 5)*PostNewtonian{}.Ratio(x))
	}
	for _, nu := range []float64{1e-4, 1e-3, 1e-2} {
		for k := FollowFrequency; k <= SwitchOff; k++ {
			c, err := NewInspiral(InspiralOrbit{MassRatio: nu, From: 7, Continue: k})
			if err != nil {
				t.Fatal(err)
			}
			t.Log(nu, k, c.Numbers(), c.Markers(), c.Drift(), len(c.solution.pieces))
			var a, b State
			c.At(c.markers[0].T/2, &a)
			p, l, err := slow(&c.q, a.R)
			t.Log(a, p/a.P-1, l/a.L-1, err, b.T)
		}
	}
}
