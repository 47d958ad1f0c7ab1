package flux

import (
	"math"
	"testing"

	"nullmark/extract/result"
)

func TestNorm(t *testing.T) {
	for l := 2; l < 20; l++ {
		want := math.Gamma(float64(l+3)) / math.Gamma(float64(l-1))
		if got := Norm(l); math.Abs(got-want) > 1e-12*want {
			t.Errorf("(l+2)!/(l-2)! for l = %d is %g, want %g", l, got, want)
		}
	}
	if Norm(2) != 24 || Norm(3) != 120 {
		t.Errorf("l = 2: %g, l = 3: %g", Norm(2), Norm(3))
	}
}

// TestSteady: a strain of r |h_lm| = A at frequency w carries, m and -m
// together, dE/dt = 2 w^2 A^2/(16 pi) (from the Isaacson average of |dh/dt|^2,
// e.g. E. Poisson and C. M. Will, Gravity, chapter 12, from memory), and
// A = (1/2) sqrt(Norm) |Psi|. The quadrupole formula for (2,2): a mass mu on a
// wide circle of radius r has r|h_22| = 8 mu v^2 sqrt(pi/5) and radiates
// (32/5) mu^2 v^10.
func TestSteady(t *testing.T) {
	v := 0.01
	omega := 2 * v * v * v
	psi := 8 * v * v * math.Sqrt(math.Pi/5) / (math.Sqrt(Norm(2)) / 2)
	f := Steady(2, 2, omega, psi, 0)
	if want := 6.4 * math.Pow(v, 10); math.Abs(f.Energy.Value-want) > 1e-14*want {
		t.Errorf("quadrupole flux %g, want %g", f.Energy.Value, want)
	}
	// dE = Omega dL with Omega = omega/m.
	for _, c := range []struct{ l, m int }{{2, 1}, {3, 3}, {8, 5}} {
		f := Steady(c.l, c.m, 0.3, 0.7, 1e-3)
		if d := f.Energy.Value - f.AngularMomentum.Value*0.3/float64(c.m); math.Abs(d) > 1e-15*f.Energy.Value {
			t.Errorf("(%d,%d): dE - Omega dL = %g", c.l, c.m, d)
		}
		// The bar reaches to what the largest amplitude within it gives.
		up := Steady(c.l, c.m, 0.3, 0.7*1.001, 0).Energy.Value
		if d := f.Energy.Value + f.Energy.Error - up; math.Abs(d) > 1e-14*up {
			t.Errorf("(%d,%d): the bar ends %g from the largest amplitude's flux", c.l, c.m, d)
		}
		if r := f.AngularMomentum.Error/f.AngularMomentum.Value - f.Energy.Error/f.Energy.Value; math.Abs(r) > 1e-15 {
			t.Errorf("(%d,%d): relative bars differ by %g", c.l, c.m, r)
		}
	}
}

func TestSum(t *testing.T) {
	a := &result.Flux{Energy: result.Q{Value: 1, Error: 0.1}, AngularMomentum: result.Q{Value: 10, Error: 1}}
	b := &result.Flux{Energy: result.Q{Value: -3, Error: 0.2}, AngularMomentum: result.Q{Value: 20, Error: 2}}
	s := Sum(nil, a, nil, b)
	if s.Energy.Value != -2 || math.Abs(s.Energy.Error-0.3) > 1e-16 || s.AngularMomentum.Value != 30 || s.AngularMomentum.Error != 3 {
		t.Errorf("sum %+v", s)
	}
	if a.Energy.Value != 1 || b.Energy.Value != -3 {
		t.Error("Sum changes its parts")
	}
	if Sum() != nil || Sum(nil, nil) != nil {
		t.Error("a sum of nothing is something")
	}
}

func TestTail(t *testing.T) {
	series := func(n int, f func(l int) float64) (parts []float64, rest float64) {
		for l := 2; l < 2000; l++ {
			if l < 2+n {
				parts = append(parts, f(l))
			} else {
				rest += f(l)
			}
		}
		return
	}
	// A geometric series: the ratio does not change, the tail is exact.
	for _, q := range []float64{0.03, 0.3, 0.8} {
		parts, rest := series(6, func(l int) float64 { return 7 * math.Pow(q, float64(l)) })
		got, ok := Tail(parts, 0)
		if !ok || math.Abs(got.Value-rest) > 1e-12*rest || got.Error > 1e-12*rest {
			t.Errorf("q = %g: tail %+v, want %g", q, got, rest)
		}
		if wide, _ := Tail(parts, 0.02); math.Abs(wide.Error-0.02*rest) > 1e-12*rest {
			t.Errorf("q = %g: a margin of 2 %% gives the bar %g of %g", q, wide.Error, rest)
		}
	}
	// Geometric times a power: the ratio drifts; the truth is inside the bar.
	for _, k := range []float64{-3, -1, 1, 2} {
		parts, rest := series(7, func(l int) float64 { return math.Pow(float64(l), k) * math.Pow(0.12, float64(l)) })
		got, ok := Tail(parts, 0)
		if !ok || math.Abs(got.Value-rest) > got.Error {
			t.Errorf("l^%g 0.12^l: tail %+v, want %g", k, got, rest)
		}
		if got.Error > 0.2*rest {
			t.Errorf("l^%g 0.12^l: a bar of %g for %g", k, got.Error, rest)
		}
	}
	// A ratio that falls fast: the extrapolated one would be negative and the
	// last one is taken.
	if got, ok := Tail([]float64{1, 0.5, 0.05}, 0); !ok || math.Abs(got.Value-0.05*0.1/0.9) > 1e-16 {
		t.Errorf("falling ratio: %+v", got)
	}
	for _, parts := range [][]float64{
		nil, {1}, {1, 0.1}, {1, 1, 1}, {1, 2, 4}, {1, 0.97, 0.93}, {0, 1, 0.5}, {1, 0, 0}, {1, 0.1, -0.01},
		{1, math.NaN(), 0.1},
	} {
		if got, ok := Tail(parts, 0); ok {
			t.Errorf("parts %v give the tail %+v", parts, got)
		}
	}
}
