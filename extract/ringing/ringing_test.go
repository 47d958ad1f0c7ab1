package ringing

import (
	"errors"
	"flag"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"sort"
	"testing"
)

var long = flag.Bool("long", false, "run the large seeded populations too")

// Quasinormal frequencies M omega of a Schwarzschild hole, gravitational, and
// of a Kerr hole with a = 0.7: E. W. Leaver, Proc. R. Soc. A 402, 285 (1985),
// tables 1 and 2 (4 to 5 digits, there with 2M = 1), the further digits from the
// continued fraction of that paper.
var (
	schwarzschild = map[int][3]complex128{
		2: {complex(0.373671684418042, -0.0889623156889357), complex(0.346710996879163, -0.273914875291235), complex(0.301053, -0.478277)},
		3: {complex(0.59944328843749, -0.0927030479449476), complex(0.582643803033299, -0.281298113435044), complex(0.551685, -0.479093)},
		4: {complex(0.809178377532239, -0.0941639609889233), complex(0.796631532034503, -0.284334349404841), complex(0.772710, -0.479908)},
	}
	kerr220 = complex(0.532600243551018, -0.0807928731550077)
	kerr221 = complex(0.521160765268038, -0.244238315812387)
	kerr320 = complex(0.7591747232, -0.0841896458)
)

// term is c exp(-i w (t - t0)).
type term struct{ c, w complex128 }

// signal is a sum of terms from the peak on, a steep smooth rise before it, a
// power-law tail b/(t-t0+shift)^p and white noise of round-off size.
func signal(terms []term, tail, p float64, conjugate bool, rng *rand.Rand) Series {
	const step, peak, last = 0.5, 40.0, 300.0
	s := Series{Start: 0, Step: step}
	top := 0.0
	for _, q := range terms {
		top += cmplx.Abs(q.c)
	}
	for k := 0; float64(k)*step <= last; k++ {
		t := float64(k)*step - peak
		var v complex128
		if t < 0 {
			v = complex(top*math.Exp(-t*t/8), 0)
		} else {
			for _, q := range terms {
				v += q.c * cmplx.Exp(-1i*q.w*complex(t, 0))
			}
			v += complex(tail*math.Pow(t/40+1.5, -p), 0)
		}
		if t == 0 { // the largest sample
			v = complex(3*top, 0)
		}
		if conjugate {
			v = complex(real(v), 0)
		}
		v += complex(top*ulp/2*rng.NormFloat64(), 0)
		s.Values = append(s.Values, v)
	}
	return s
}

// TestPopulation is the calibration of the bars on seeded signals whose
// frequencies are known: three overtones with random amplitudes and phases, a
// tail of random strength, noise of round-off size.
func TestPopulation(t *testing.T) {
	size := 24
	if *long {
		size = 200
	}
	rng := rand.New(rand.NewPCG(5, 2026))
	var ratio [2][]float64
	for i := range size {
		l := 2 + i%3
		w := schwarzschild[l]
		random := func(a float64) complex128 {
			return complex(a*math.Exp(rng.NormFloat64()), 0) * cmplx.Exp(complex(0, 2*math.Pi*rng.Float64()))
		}
		s := signal([]term{{random(1), w[0]}, {random(1), w[1]}, {random(1), w[2]}},
			math.Pow(10, -3-3*rng.Float64()), float64(l+2), true, rng)
		fit, err := Analyse(s, Options{L: l, M: 0})
		if err != nil {
			t.Fatalf("signal %d: %v", i, err)
		}
		for n := range 2 {
			m := fit.Find(l, 0, n)
			if m == nil {
				if n == 0 {
					t.Errorf("signal %d: no fundamental of l = %d", i, l)
				}
				continue
			}
			ratio[n] = append(ratio[n], ratioOf(m, w[n]))
		}
	}
	for n, r := range ratio {
		covered, mid := calibration(r)
		t.Logf("n = %d: %d of %d, covered %.3f, median bar/error %.2f", n, len(r), size, covered, mid)
		if covered < 0.95 {
			t.Errorf("n = %d: the bars cover %.3f of the cases, want 0.95", n, covered)
		}
		if mid > 10 {
			t.Errorf("n = %d: the median bar is %.1f times the error, want at most 10", n, mid)
		}
		if len(r) < size*9/10 {
			t.Errorf("n = %d: found in %d of %d signals", n, len(r), size)
		}
	}
}

// ratioOf is bar over error, the worse of the real and imaginary parts.
func ratioOf(m *Mode, w complex128) float64 {
	re := m.Omega.Re.Error / (math.Abs(m.Omega.Re.Value-real(w)) + 1e-18)
	im := m.Omega.Im.Error / (math.Abs(m.Omega.Im.Value-imag(w)) + 1e-18)
	return math.Min(re, im)
}

func calibration(r []float64) (covered, median float64) {
	sort.Float64s(r)
	n := sort.SearchFloat64s(r, 1)
	return 1 - float64(n)/float64(len(r)), r[len(r)/2]
}

// TestMixing puts a neighbouring l and a mirror mode into a complex signal: all
// are found, named from frequencies that are 2 % off, and none moves the
// fundamental.
func TestMixing(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	mirror := complex(-0.4, -0.087) // of (2,-2), roughly
	s := signal([]term{{1, kerr220}, {complex(0.3, 0.5), kerr221}, {0.02i, kerr320}, {0.01, mirror}}, 1e-6, 4, false, rng)
	off := func(w complex128) complex128 { return w * 1.02 }
	fit, err := Analyse(s, Options{L: 2, M: 2, Expected: []Expected{
		{2, 2, 0, off(kerr220)}, {2, 2, 1, off(kerr221)}, {3, 2, 0, off(kerr320)}}})
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []struct {
		l, n int
		w    complex128
		tol  float64
	}{{2, 0, kerr220, 1e-9}, {2, 1, kerr221, 1e-5}, {3, 0, kerr320, 1e-6}} {
		m := fit.Find(want.l, 2, want.n)
		if m == nil {
			t.Errorf("(%d,2) n = %d not found", want.l, want.n)
			continue
		}
		if d := cmplx.Abs(m.omega()-want.w) / cmplx.Abs(want.w); d > want.tol || ratioOf(m, want.w) < 1 {
			t.Errorf("(%d,2) n = %d: %v ± %.1e, want %v", want.l, want.n, m.omega(), m.Omega.Re.Error, want.w)
		}
		if m.Own != (want.l == 2) {
			t.Errorf("(%d,2) n = %d: own = %v", want.l, want.n, m.Own)
		}
	}
	unnamed := 0
	for _, m := range fit.Modes {
		if !m.Named {
			unnamed++
			if ratioOf(&m, mirror) < 1 && cmplx.Abs(m.omega()-mirror) < 0.1 {
				t.Errorf("mirror mode %v ± %.1e, want %v", m.omega(), m.Omega.Re.Error, mirror)
			}
		}
	}
	if unnamed == 0 {
		t.Error("the mirror mode is not reported")
	}
	if len(fit.Warnings) != 1 {
		t.Errorf("want one warning, on the mixed-in (3,2): %q", fit.Warnings)
	}
	if got := len(fit.Ringing("infinity")); got != 3 {
		t.Errorf("%d entries of the result, want the 3 named ones", got)
	}
}

// TestAmplitude holds amplitude and phase at the peak.
func TestAmplitude(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	w := schwarzschild[2]
	c := complex(0.7, -1.1)
	s := signal([]term{{c, w[0]}, {0.4i, w[1]}}, 1e-5, 4, true, rng)
	fit, err := Analyse(s, Options{L: 2})
	if err != nil {
		t.Fatal(err)
	}
	m := fit.Find(2, 0, 0)
	// A real signal Re(c e^{..}) = (c e^{..} + conj)/2.
	if d := math.Abs(m.Amplitude.Value - cmplx.Abs(c)/2); d > m.Amplitude.Error || d > 1e-8 {
		t.Errorf("amplitude %v ± %.1e, want %v", m.Amplitude.Value, m.Amplitude.Error, cmplx.Abs(c)/2)
	}
	if d := math.Abs(m.Phase.Value - cmplx.Phase(c)); d > m.Phase.Error || d > 1e-8 {
		t.Errorf("phase %v ± %.1e, want %v", m.Phase.Value, m.Phase.Error, cmplx.Phase(c))
	}
	if fit.Reference != 40 {
		t.Errorf("reference time %v, want the peak at 40", fit.Reference)
	}
}

// TestDense is an exact check of the solver alone: noise-free exponentials come
// back to round-off from the pencil and are not spoilt by the refinement, real
// and complex.
func TestDense(t *testing.T) {
	for _, complexSignal := range []bool{false, true} {
		w := []complex128{complex(0.5, -0.08), complex(0.45, -0.25)}
		if !complexSignal {
			w = append(w, -cmplx.Conj(w[0]), -cmplx.Conj(w[1]))
		}
		y := make([]complex128, 100)
		for k := range y {
			for j, v := range w {
				y[k] += complex(1+float64(j%2), 0) * cmplx.Exp(-1i*v*complex(0.5*float64(k), 0))
			}
			if !complexSignal {
				y[k] = complex(real(y[k]), 0)
			}
		}
		sub, ok := newSubspace(y)
		if !ok || sub.real == complexSignal {
			t.Fatalf("subspace: ok %v, real %v", ok, sub.real)
		}
		z, ok := sub.poles(len(w))
		if !ok {
			t.Fatal("no poles")
		}
		start := frequencies(z, 0.5)
		better, ok := refine(y, 0.5, start, 3)
		if !ok {
			t.Fatal("refinement failed")
		}
		// From a start that is 1 % off, refinement alone gets there.
		off := make([]complex128, len(w))
		for j := range w {
			off[j] = w[j] * 1.01
		}
		far, _ := refine(y, 0.5, off, 20)
		for _, got := range [][]complex128{start, better.omega, far.omega} {
			for _, want := range w {
				d := math.Inf(1)
				for _, v := range got {
					d = math.Min(d, cmplx.Abs(v-want))
				}
				if d > 1e-11 {
					t.Errorf("complex %v: %v not among %v (%.1e)", complexSignal, want, got, d)
				}
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	good := signal([]term{{1, schwarzschild[2][0]}}, 0, 4, true, rng)
	before, close := 35.0, 45.0
	var early *EarlyWindow
	if _, err := Analyse(good, Options{L: 2, From: &before}); !errors.As(err, &early) || early.Peak != 40 {
		t.Errorf("window before the peak: %v", err)
	}
	fit, err := Analyse(good, Options{L: 2, From: &close, Overtones: -1})
	if err != nil || len(fit.Warnings) != 1 {
		t.Errorf("window 5 M after the peak: %v, %v", fit, err)
	}
	var bad *BadInput
	hole := Series{0, 0.5, append([]complex128(nil), good.Values...)}
	hole.Values[7] = complex(math.NaN(), 0)
	for what, s := range map[string]Series{
		"NaN": hole, "no step": {0, 0, good.Values}, "zero": {0, 0.5, make([]complex128, 400)},
		"short": {0, 0.5, good.Values[:110]}, "empty": {0, 0.5, nil},
	} {
		if _, err := Analyse(s, Options{L: 2}); !errors.As(err, &bad) {
			t.Errorf("%s: %v", what, err)
		}
	}
	// A pure power law does not ring.
	var none *NotRinging
	law := Series{Start: 0, Step: 0.5}
	for k := range 500 {
		law.Values = append(law.Values, complex(math.Pow(10+float64(k), -3), 0))
	}
	if _, err := Analyse(law, Options{L: 2}); !errors.As(err, &none) {
		t.Errorf("power law: %v", err)
	}
}
