package tail

import (
	"errors"
	"flag"
	"math"
	"math/rand/v2"
	"sort"
	"testing"
)

var long = flag.Bool("long", false, "run the large seeded populations too")

// law is a tail after ringing: exp(-gamma u) cos(w u) + c u^-p (1 + a/u + b/u^2 +
// d ln u/u^2 + e ln u/u) on u = 1..last with white noise of round-off size of the peak 1.
type law struct {
	p, c, a, b, d, e float64
	last             float64
	noise            float64
}

func (q law) series(rng *rand.Rand) Series {
	s := Series{Start: 0, Step: 1}
	for k := 0; float64(k) <= q.last; k++ {
		u := float64(k)
		v := math.Exp(-0.0889*u) * math.Cos(0.3737*u)
		if k > 40 {
			v += q.c * math.Pow(u, -q.p) * (1 + q.a/u + q.b/(u*u) + q.d*math.Log(u)/(u*u) + q.e*math.Log(u)/u)
		}
		s.Values = append(s.Values, v+q.noise*rng.NormFloat64())
	}
	return s
}

// TestPopulation is the calibration on seeded laws with known exponents. The
// corrections are of the size seen in evolutions (p a of some hundred M), half
// of the laws have a logarithm in the first correction, as at null infinity, the
// others, whose form is said to be regular, at most one in the second.
func TestPopulation(t *testing.T) {
	size := 60
	if *long {
		size = 600
	}
	rng := rand.New(rand.NewPCG(7, 2026))
	var ratio []float64
	refused := 0
	for i := range size {
		p := float64(2 + i%7)
		a := 10 + 60*rng.Float64()
		q := law{p: p, c: math.Pow(250, p) * 1e-7 * math.Pow(10, -1+2*rng.Float64()), a: a, b: a * a * (rng.Float64() - 0.5),
			d: a * a * 0.1 * rng.NormFloat64(), last: 1500 + 1500*rng.Float64(), noise: 1e-16}
		regular := i%2 == 0
		if !regular {
			q.e = a * 0.2 * rng.NormFloat64()
		}
		f, err := Analyse(q.series(rng), Options{Regular: regular})
		if err != nil {
			var v *Vague
			if !errors.As(err, &v) {
				t.Errorf("law %d (%+v): %v", i, q, err)
			}
			refused++
			continue
		}
		e := math.Abs(f.Exponent.Value - p)
		ratio = append(ratio, f.Exponent.Error/(e+1e-16))
		if e > 0.05 {
			t.Errorf("law %d: exponent %.4f ± %.1g, want %g", i, f.Exponent.Value, f.Exponent.Error, p)
		}
	}
	sort.Float64s(ratio)
	covered := 1 - float64(sort.SearchFloat64s(ratio, 1))/float64(len(ratio))
	mid := ratio[len(ratio)/2]
	t.Logf("%d laws, %d refused, covered %.3f, median bar/error %.2f", size, refused, covered, mid)
	if covered < 0.95 {
		t.Errorf("the bars cover %.3f of the cases, want 0.95", covered)
	}
	if mid > 10 {
		t.Errorf("the median bar is %.1f times the error, want at most 10", mid)
	}
	if refused > size/20 {
		t.Errorf("%d of %d laws refused", refused, size)
	}
}

// TestNoiseWidens holds that the bar grows with the noise, at infinity of the
// local index as well, and that past it there is a refusal.
func TestNoiseWidens(t *testing.T) {
	last := 0.0
	for _, noise := range []float64{1e-18, 1e-15, 1e-13} {
		q := law{p: 4, c: math.Pow(250, 4) * 1e-8, a: 40, last: 2500, noise: noise}
		f, err := Analyse(q.series(rand.New(rand.NewPCG(1, 1))), Options{})
		if err != nil {
			t.Fatalf("noise %g: %v", noise, err)
		}
		if !(f.Exponent.Error > last) {
			t.Errorf("noise %g: bar %.2e, not above %.2e", noise, f.Exponent.Error, last)
		}
		if d := math.Abs(f.Exponent.Value - 4); d > f.Exponent.Error {
			t.Errorf("noise %g: %.5f ± %.1e", noise, f.Exponent.Value, f.Exponent.Error)
		}
		last = f.Exponent.Error
		loc := f.Local
		n := len(loc.Times)
		if noise > 1e-17 && loc.Values[n-1].Error < 3*loc.Values[n/2].Error {
			t.Errorf("noise %g: the local index's bar is %.1e in the middle and %.1e at the end", noise, loc.Values[n/2].Error, loc.Values[n-1].Error)
		}
	}
}

// TestLocal checks the local index against its closed form.
func TestLocal(t *testing.T) {
	q := law{p: 4, c: 1e3, a: 40, last: 2500}
	f, err := Analyse(q.series(rand.New(rand.NewPCG(1, 1))), Options{})
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for i, u := range f.Local.Times {
		if u < 500 {
			continue // ringing: exp(-0.0889 u) is not yet gone against u^-4
		}
		seen++
		want := q.p + q.a/u/(1+q.a/u)
		if d := math.Abs(f.Local.Values[i].Value - want); d > 2e-6 || d > f.Local.Values[i].Error+1e-9 {
			t.Errorf("u = %.0f: %.8f ± %.1e, want %.8f", u, f.Local.Values[i].Value, f.Local.Values[i].Error, want)
		}
	}
	if seen < 50 {
		t.Errorf("only %d local indices", seen)
	}
}

func TestRefusals(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 2))
	number := func(v float64) *float64 { return &v }
	// u^-12: round-off has eaten it by 1200 M.
	steep := law{p: 12, c: math.Pow(250, 12) * 1e-9, a: 40, last: 3000, noise: 1e-16}.series(rng)
	var eaten *RoundOff
	if _, err := Analyse(steep, Options{From: number(1500)}); !errors.As(err, &eaten) || eaten.Since < 1499 || eaten.Since > 1510 {
		t.Errorf("tail past round-off: %v", err)
	}
	// Asked for from 500 M on, it is taken over at 1e-9 (250/u)^12 = 1e-16/0.02,
	// u = 690, which leaves too little.
	if _, err := Analyse(steep, Options{From: number(500)}); !errors.As(err, &eaten) || eaten.Since < 600 || eaten.Since > 750 {
		t.Errorf("tail up to round-off: %v", err)
	}
	// Errors that are smooth in time are seen by the second run alone.
	smooth := law{p: 6, c: math.Pow(250, 6) * 1e-9, a: 40, last: 3000}.series(rng)
	smooth.Other = append([]float64(nil), smooth.Values...)
	for k := range smooth.Values {
		smooth.Values[k] += 3e-15
		smooth.Other[k] -= 3e-15
	}
	// 1e-9 (250/u)^6 = 6e-15/0.2 at u = 1418.
	if _, err := Analyse(smooth, Options{From: number(1500)}); !errors.As(err, &eaten) || eaten.Level < 5e-15 {
		t.Errorf("two runs apart: %v", err)
	}
	if f, err := Analyse(smooth, Options{}); err != nil || f.End > 1450 || math.Abs(f.Exponent.Value-6) > f.Exponent.Error {
		t.Errorf("two runs apart at the end: %+v, %v", f, err)
	}
	// Ringing until the end.
	ring := law{last: 200}.series(rng)
	var none *NoTail
	if _, err := Analyse(ring, Options{}); !errors.As(err, &none) {
		t.Errorf("ringing: %v", err)
	}
	// Nothing but noise after the ringing.
	var any interface{ Error() string }
	if f, err := Analyse(law{last: 3000, noise: 1e-16}.series(rng), Options{}); !errors.As(err, &any) {
		t.Errorf("noise: %+v", f)
	}
	var bad *BadInput
	hole := Series{0, 1, append([]float64(nil), steep.Values...), nil}
	hole.Values[100] = math.Inf(1)
	for what, s := range map[string]Series{
		"infinite": hole, "short": {0, 1, steep.Values[:30], nil}, "no step": {0, 0, steep.Values, nil},
		"unequal": {0, 1, steep.Values, steep.Values[1:]},
	} {
		if _, err := Analyse(s, Options{}); !errors.As(err, &bad) {
			t.Errorf("%s: %v", what, err)
		}
	}
	if _, err := Analyse(steep, Options{From: number(500), To: number(510)}); !errors.As(err, &bad) {
		t.Errorf("narrow window: %v", err)
	}
}
