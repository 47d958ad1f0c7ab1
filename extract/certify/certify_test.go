package certify

import (
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"nullmark/extract/demod"
)

// TestDiscretisationCovers: on amplitudes that converge with one power p of the
// spacing, z_k = z (1 + c Ratio^{-k p}), the bar of a scheme of order p holds what
// is left on the finest rung with a margin, and does so where the convergence is
// faster than stated; of a faster one the bar is wider, not narrower, than its
// own order's.
func TestDiscretisationCovers(t *testing.T) {
	z := complex(0.2, -0.7)
	for _, order := range []int{4, 6, 8, 10, 12} {
		for _, p := range []int{order, order + 2, 16} {
			for _, rungs := range []int{2, 3} {
				c := complex(1e-8, 2e-8)
				var seq []complex128
				for k := 0; k < rungs; k++ {
					seq = append(seq, z*(1+c*complex(math.Pow(Ratio, -float64(k*p)), 0)))
				}
				bar, truth := Discretisation(seq, order), cmplx.Abs(seq[0]-z)/cmplx.Abs(z)
				if bar < 1.2*truth || p == order && bar > 1.4*truth {
					t.Errorf("order %d, convergence %d, %d rungs: bar %.3g, true error %.3g", order, p, rungs, bar, truth)
				}
				// A common factor changes nothing.
				for i := range seq {
					seq[i] *= complex(-3, 1e3)
				}
				if other := Discretisation(seq, order); math.Abs(other-bar) > 1e-6*bar {
					t.Errorf("order %d: bar %.9g, after a common factor %.9g", order, bar, other)
				}
			}
		}
	}
}

// TestDiscretisationGuard: two finest rungs that agree by accident do not make
// the bar vanish when the coarser one tells of an error; a difference in phase
// alone counts in full.
func TestDiscretisationGuard(t *testing.T) {
	bar := Discretisation([]complex128{1, 1, 1 + 1e-4}, 12)
	if !(bar > 1e-7 && bar < 1e-4) {
		t.Errorf("an accidental zero: bar %g", bar)
	}
	if plain := Discretisation([]complex128{1, 1 + 1e-4, 1 + 2e-4}, 12); !(plain > 5*bar) {
		t.Errorf("a real difference: bar %g, an accidental zero %g", plain, bar)
	}
	phase := Discretisation([]complex128{1, cmplx.Exp(1e-4i), cmplx.Exp(2e-4i)}, 12)
	size := Discretisation([]complex128{1, 1 + 1e-4, 1 + 2e-4}, 12)
	if math.Abs(phase-size) > 1e-3*size {
		t.Errorf("phase difference %g, size difference %g", phase, size)
	}
	defer func() {
		if recover() == nil {
			t.Error("one rung gives a bar")
		}
	}()
	Discretisation([]complex128{1}, 12)
}

func TestBudget(t *testing.T) {
	for _, c := range []struct {
		b    Budget
		want string
	}{
		{Budget{3, 2, 1, 0}, "discretisation"}, {Budget{1, 3, 2, 0}, "transient"}, {Budget{1, 2, 3, 0}, "round-off"},
		{Budget{2, 2, 2, 0}, "discretisation"}, {Budget{1, 2, 2, 0}, "transient"}, {Budget{1, 2, 2, 3}, "part outside the range"},
	} {
		if got := c.b.Largest(); got != c.want {
			t.Errorf("%+v: %s, want %s", c.b, got, c.want)
		}
		if got := c.b.Bar(); got != c.b.Discretisation+c.b.Transient+c.b.RoundOff+c.b.Range {
			t.Errorf("%+v: bar %g", c.b, got)
		}
	}
}

// TestRoundOff grows with N^2 and for slow modes with 1/omega; it lies at the
// measured floor of second differences: 1e-13 to 1e-11 for the grids in use.
func TestRoundOff(t *testing.T) {
	if a, b := RoundOff(400, 0.5), RoundOff(800, 0.5); math.Abs(b/a-4) > 1e-12 {
		t.Errorf("twice the points: %g and %g", a, b)
	}
	if a := RoundOff(400, 0.5); a < 1e-13 || a > 1e-11 {
		t.Errorf("400 points: %g", a)
	}
	if a, b := RoundOff(400, 0.01), RoundOff(400, 0.005); math.Abs(b/a-2) > 1e-12 || a <= RoundOff(400, 0.5) {
		t.Errorf("slow modes: %g and %g", a, b)
	}
}

func TestSpacingAndPrediction(t *testing.T) {
	if Spacing(0) != CoarsestSpacing {
		t.Errorf("rung 0: %g", Spacing(0))
	}
	for k := 1; k < 9; k++ {
		if d := Spacing(k) - Ratio*Spacing(k-1); math.Abs(d) > 1e-16 {
			t.Errorf("rung %d: %g after %g", k, Spacing(k), Spacing(k-1))
		}
	}
	for _, end := range []End{Infinity, Horizon} {
		last := 0.0
		for l := 2; l <= 8; l++ {
			p := Predict(end, l, 7, 0.4)
			if p < last {
				t.Errorf("%s: l = %d is predicted easier than l = %d", end, l, l-1)
			}
			last = p
			if r := Predict(end, l, 7, 0.8) / p; math.Abs(r-8192) > 1e-6 {
				t.Errorf("%s, l = %d: twice the spacing costs %g", end, l, r)
			}
			if Predict(end, l, 20, 0.4) > p {
				t.Errorf("%s, l = %d: a wider orbit is predicted harder", end, l)
			}
		}
	}
	if Infinity.String() != "infinity" || Horizon.String() != "the horizon" {
		t.Errorf("ends are named %s and %s", Infinity, Horizon)
	}
}

// TestTransient: where windows shifted back show a geometric decay, w is the
// remaining error exactly: with error c at T and c/q, c/q^2 before,
// S1 = c (1-q)/q, S2 = S1/q. Its rho is kept within 0.1 and 0.9.
func TestTransient(t *testing.T) {
	tone := Tone{L: 2, M: 2, Omega: 0.1}
	const until, huge = 1e6, 1e3 // so late that the pair's own bound is small
	for _, q := range []float64{0.15, 0.5, 0.85} {
		const c = 1e-7
		r := Reading{Pair: huge, Shift1: c * (1 - q) / q, Shift2: c * (1 - q) / (q * q)}
		// At infinity 2 P (l+3)/(Omega T) = 0.1 rules with so large a pair.
		if got := (Reading{Pair: c, Shift1: r.Shift1, Shift2: r.Shift2}).Transient(Infinity, tone, until); math.Abs(got-c) > 1e-9*c {
			t.Errorf("q = %g: %g at infinity, want %g", q, got, c)
		}
		if got := r.Transient(Horizon, tone, until); math.Abs(got-2*c) > 1e-9*c {
			t.Errorf("q = %g: %g at the horizon, want %g", q, got, 2*c)
		}
	}
	inf := math.Inf(1)
	for _, c := range []struct {
		name  string
		r     Reading
		end   End
		until float64
		want  float64
	}{
		{"a switch-on in the oldest window does not feign a decay", Reading{Pair: 1, Shift1: 1e-6, Shift2: 1e6}, Horizon, until, 2e-6 * 0.1 / 0.9},
		{"growing shifts count as slow decay", Reading{Pair: 1, Shift1: 1e-6, Shift2: 1e-9}, Horizon, until, 2e-6 * 9},
		{"no older shift", Reading{Pair: 1, Shift1: 1e-6}, Horizon, until, 2e-6 * 9},
		{"no room to shift, horizon", Reading{Pair: 1e-5, Shift1: inf, Shift2: inf}, Horizon, until, 2e-5},
		{"no room to shift, infinity", Reading{Pair: 1e-5, Shift1: inf, Shift2: inf}, Infinity, until, 2e-5},
		{"the pair bounds the horizon", Reading{Pair: 1e-8, Shift1: 1e-6, Shift2: 2e-6}, Horizon, until, 2e-8},
		{"the pair bounds infinity", Reading{Pair: 1e-8, Shift1: 1e-6, Shift2: 2e-6}, Infinity, until, 2e-8},
		{"a tail's share of the pair", Reading{Pair: 1e-4, Shift1: 1e-12, Shift2: 2e-12}, Infinity, 1000, 2e-4 * 5 / 100},
		{"early, the whole pair", Reading{Pair: 1e-4, Shift1: 1e-12, Shift2: 2e-12}, Infinity, 20, 2e-4},
		{"nothing to see", Reading{}, Infinity, until, 0},
	} {
		if got := c.r.Transient(c.end, tone, c.until); math.Abs(got-c.want) > 1e-12*c.want {
			t.Errorf("%s: %g, want %g", c.name, got, c.want)
		}
	}
}

// signal samples A e^{-i w t} + extra(t) in Psi and -i w B e^{-i w t} + its own
// extra in Pi, at both ends.
func signal(omega, dt float64, n int, a, b complex128, extra, extraPi func(t float64) complex128) *Samples {
	s := &Samples{Dt: dt}
	for k := 0; k < n; k++ {
		t := float64(k) * dt
		e := cmplx.Exp(complex(0, -omega*t))
		psi, pi := a*e, complex(0, -omega)*b*e
		if extra != nil {
			psi, pi = psi+extra(t), pi+extraPi(t)
		}
		for end := range s.Psi {
			s.Psi[end] = append(s.Psi[end], psi)
			s.Pi[end] = append(s.Pi[end], pi)
		}
	}
	return s
}

func TestReadPicksTheBetterField(t *testing.T) {
	tone := Tone{L: 2, M: 2, Omega: 0.0632, On: 114}
	a, b := complex(1, 1), complex(1.01, 1)
	s := signal(tone.Omega, 0.5, 4001, a, b, nil, nil)
	if s.Until() != 2000 {
		t.Errorf("until %g", s.Until())
	}
	for end, want := range map[End]complex128{Infinity: b, Horizon: a} {
		r, err := Read(s, end, tone, 2000, 4)
		if err != nil {
			t.Fatal(err)
		}
		if cmplx.Abs(r.Z-want) > 1e-13 {
			t.Errorf("%s: %v, want %v", end, r.Z, want)
		}
		if pair := cmplx.Abs(a-b) / cmplx.Abs(want); math.Abs(r.Pair-pair) > 1e-12 {
			t.Errorf("%s: pair %g, want %g", end, r.Pair, pair)
		}
		if r.Shift1 > 1e-13 || r.Shift2 > 1e-13 {
			t.Errorf("%s: a steady tone shifts by %g and %g", end, r.Shift1, r.Shift2)
		}
	}
}

// TestReadBoundsATail: under a tail with the index of l = 2 perturbations, u^-4 at
// null infinity and v^-7 at the horizon (R. H. Price, Phys. Rev. D 5, 2419
// (1972); C. Gundlach, R. H. Price, J. Pullin, Phys. Rev. D 49, 883 (1994), from
// memory), the error of the reading is inside its transient bar, for every
// window power, at several times, and falls with time.
func TestReadBoundsATail(t *testing.T) {
	tone := Tone{L: 2, M: 2, Omega: 0.0632, On: 114}
	z := complex(0.3, 0.1)
	for end, p := range map[End]float64{Infinity: 4, Horizon: 7} {
		tail := func(t float64) complex128 { return complex(20*math.Pow(t/100+1, -p), 0) }
		slope := func(t float64) complex128 { return complex(-20*p/100*math.Pow(t/100+1, -p-1), 0) }
		s := signal(tone.Omega, 0.5, 8001, z, z, tail, slope)
		for _, power := range []int{1, 2, 4} {
			last := math.Inf(1)
			for _, until := range []float64{1000, 2000, 4000} {
				if until < Earliest(tone, power) {
					t.Fatalf("power %d: the earliest time is %g", power, Earliest(tone, power))
				}
				r, err := Read(s, end, tone, until, power)
				if err != nil {
					t.Fatal(err)
				}
				bar, truth := r.Transient(end, tone, until), cmplx.Abs(r.Z-z)/cmplx.Abs(z)
				// Measured: bars 1.1 to 2.1 times the error; round-off of the sums 1e-14.
				if truth > bar+1e-14 {
					t.Errorf("power %d, %s at %g: error %.3g, bar %.3g", power, end, until, truth, bar)
				}
				if truth > last+1e-14 {
					t.Errorf("power %d, %s: error %.3g at %g, %.3g before", power, end, truth, until, last)
				}
				last = truth
			}
		}
	}
}

func TestReadWithoutRoom(t *testing.T) {
	tone := Tone{L: 2, M: 2, Omega: 0.0632}
	s := signal(tone.Omega, 0.5, 1201, 1, 1, nil, nil)
	r, err := Read(s, Infinity, tone, 600, 4) // five periods are 497
	if err != nil || !math.IsInf(r.Shift1, 1) || !math.IsInf(r.Shift2, 1) || cmplx.Abs(r.Z-1) > 1e-13 {
		t.Errorf("reading %+v, error %v", r, err)
	}
	var short *demod.ErrShort
	if _, err := Read(s, Infinity, tone, 601, 4); !errors.As(err, &short) {
		t.Errorf("beyond the samples: %v", err)
	}
	if _, err := Read(s, Horizon, tone, 400, 4); !errors.As(err, &short) {
		t.Errorf("before the first window fits: %v", err)
	}
}

func TestWindowPower(t *testing.T) {
	for asked, want := range map[float64]int{1e-3: 1, 1e-6: 1, 9e-7: 2, 1e-8: 2, 9e-9: 4, 1e-11: 4} {
		if got := WindowPower(asked); got != want {
			t.Errorf("asked %g: power %d, want %d", asked, got, want)
		}
	}
	tone := Tone{Omega: 0.5, On: 114}
	// The first window starts after the source has come to full strength.
	if start := Earliest(tone, 4) - 5*2*math.Pi/0.5; start < tone.On {
		t.Errorf("the first window starts at %g", start)
	}
}
