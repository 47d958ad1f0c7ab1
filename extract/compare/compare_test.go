package compare

import (
	"math"
	"math/cmplx"
	"math/rand"
	"strings"
	"testing"

	"nullmark/extract/result"
	"nullmark/hyperboloidal"
)

func mustCompare(t *testing.T, in Input) *result.Comparison {
	t.Helper()
	c, _, err := Compare(in)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// A model identical to the reference is inside for every mode, whether it is
// sampled like the reference or not.
func TestIdenticalModelIsInside(t *testing.T) {
	modes := append([][2]int{{2, 0}}, someModes...)
	for name, times := range map[string][]float64{"same samples": grid(0, 560, 0.5), "finer": grid(-3, 570, 0.17), "uneven": uneven(-2, 565)} {
		c := mustCompare(t, Input{Reference: reference(modes, 1e-9, nil), Model: model(times, modes, truth)})
		for _, m := range c.Modes {
			if m.Verdict != result.Inside {
				t.Errorf("%s: %s", name, m.Sentence)
			}
		}
		if c.Overall.Verdict != result.Inside || len(c.Hints) > 0 {
			t.Errorf("%s: %s %v", name, c.Overall.Sentence, c.Hints)
		}
		if c.Range[0] < 40 || c.Range[1] > 560 || c.Shift != nil {
			t.Errorf("%s: range %v, shift %v", name, c.Range, c.Shift)
		}
	}
}

func uneven(from, to float64) []float64 {
	var t []float64
	for x, k := from, 0.0; x < to; k++ {
		t = append(t, x)
		x += 0.2 + 0.05*math.Sin(k)
	}
	return t
}

// 200 pairs whose references are wrong inside their bars: nothing is found.
// 200 pairs in which one mode has a fault of ten times the bar, in amplitude,
// phase, or both, over all or over half of the time: each is found, in that
// mode and in no other.
func TestSeededTrials(t *testing.T) {
	rng := rand.New(rand.NewSource(20260101))
	const rel = 1e-8
	times := grid(0, 560, 0.5)
	for trial := 0; trial < 200; trial++ {
		ref := reference(someModes, rel, rng)
		for _, m := range mustCompare(t, Input{Reference: ref, Model: model(times, someModes, truth)}).Modes {
			if m.Verdict != result.Inside {
				t.Errorf("trial %d: identical pair: %s", trial, m.Sentence)
			}
		}
		bad := someModes[rng.Intn(len(someModes))]
		angle, start := 2*math.Pi*rng.Float64(), 40.0
		if rng.Intn(2) == 0 {
			start = 40 + 400*rng.Float64()
		}
		fault := cmplx.Exp(complex(10*rel*math.Cos(angle), 10*rel*math.Sin(angle)))
		faulty := model(times, someModes, func(l, m int, u float64) complex128 {
			h := truth(l, m, u)
			if l == bad[0] && m == bad[1] && u >= start {
				h *= fault
			}
			return h
		})
		for _, m := range mustCompare(t, Input{Reference: ref, Model: faulty}).Modes {
			want := result.Inside
			if m.L == bad[0] && m.M == bad[1] {
				want = result.Differs
				if m.Leaves == nil || math.Abs(*m.Leaves-start) > 1 {
					t.Errorf("trial %d: a fault from u = %v is dated %v", trial, start, m.Leaves)
				}
			}
			if m.Verdict != want {
				t.Errorf("trial %d: fault in %v at angle %.2f from %.0f: %s", trial, bad, angle, start, m.Sentence)
			}
		}
	}
}

// A drift of 1e-6 rad/M and an amplitude error of 1e-5 are measured to 1 %
// when the bars allow; with bars as large as the fault nothing is claimed.
func TestSmallDriftAndAmplitude(t *testing.T) {
	drifting := model(grid(0, 560, 0.5), someModes, func(l, m int, u float64) complex128 {
		return truth(l, m, u) * complex(1+1e-5, 0) * cmplx.Exp(complex(0, -1e-6*u))
	})
	for _, m := range mustCompare(t, Input{Reference: reference(someModes, 1e-8, rand.New(rand.NewSource(5))), Model: drifting}).Modes {
		slope, amp := m.PhaseDifference.Slope, m.AmplitudeDifference.Mean
		if m.Verdict != result.Differs || math.Abs(slope.Value-1e-6) > 1e-8 || math.Abs(amp.Value-1e-5) > 1e-7 {
			t.Errorf("slope %v, amplitude %v: %s", slope, amp, m.Sentence)
		}
		if math.Abs(slope.Value-1e-6) > slope.Error || math.Abs(amp.Value-1e-5) > amp.Error {
			t.Errorf("(%d,%d): the bars do not cover: %v %v", m.L, m.M, slope, amp)
		}
		if !strings.Contains(m.Sentence, "drifts by +1.00e-6") || !strings.Contains(m.Sentence, "too large by 1.00e-5") {
			t.Errorf("sentence: %s", m.Sentence)
		}
	}
	coarse := reference(someModes, 4e-4, nil)
	for _, m := range mustCompare(t, Input{Reference: coarse, Model: drifting}).Modes {
		if m.Verdict != result.CannotTell || m.Settles == nil || !(*m.Settles < 4e-4) || !strings.Contains(m.Sentence, "accuracy.relative") {
			t.Errorf("bars of the fault's size: %s", m.Sentence)
		}
	}
	// Well inside the bars, but the reference has missed what was asked of it.
	coarse = reference(someModes, 2e-3, nil)
	coarse.Result.Accuracy.Asked = 1e-9
	for i := range coarse.Result.Modes {
		coarse.Result.Modes[i].Met = false
	}
	for _, m := range mustCompare(t, Input{Reference: coarse, Model: drifting}).Modes {
		if m.Verdict != result.CannotTell || m.Settles == nil {
			t.Errorf("reference short of its accuracy: %s", m.Sentence)
		}
	}
}

// Whatever the convention of the file, a model converted into it and read back
// agrees, and the page says what was done.
func TestConventionsRoundTrip(t *testing.T) {
	fine := grid(0, 560, 0.1)
	for _, quantity := range []string{"strain", "master", "curvature"} {
		for _, phase := range []string{"minus", "plus"} {
			for _, of := range []string{"particle", "heavy-body"} {
				for _, per := range []string{"mu", "nu"} {
					c := Convention{Quantity: quantity, Phase: phase, PhaseOf: of, Per: per, MassRatio: 1e-2}
					w := model(fine, someModes, truth).in(c)
					rel := 1e-9
					if quantity == "curvature" {
						rel = 1e-7 // the test's own second derivative is good to a few 1e-9
					}
					cmp := mustCompare(t, Input{Reference: reference(someModes, rel, nil), Model: w, Convention: c})
					if cmp.Overall.Verdict != result.Inside {
						t.Errorf("%+v: %s", c, cmp.Overall.Sentence)
					}
					if cmp.Settings.Quantity != quantity || len(cmp.Settings.Read) < 2 {
						t.Errorf("%+v: settings %+v", c, cmp.Settings)
					}
				}
			}
		}
	}
}

// The constants that curvature lacks are taken from where the reference is
// good: an early error inside early, large bars is not blamed on a right model.
func TestCurvatureWithAPoorStart(t *testing.T) {
	ref := reference(someModes, 1e-7, nil)
	for i := range ref.Series.Modes {
		m := &ref.Series.Modes[i]
		for k, u := range ref.Series.U {
			if u >= 40 {
				e := 1e-3 * math.Exp(-(u-40)/20)
				m.WaveErr[k] += e
				m.Wave[k] += complex(0.9*e, 0)
			}
		}
	}
	c := Convention{Quantity: "curvature"}
	cmp := mustCompare(t, Input{Reference: ref, Convention: c, Model: model(grid(0, 560, 0.1), someModes, truth).in(c)})
	for _, m := range cmp.Modes {
		if m.Verdict != result.Inside {
			t.Error(m.Sentence)
		}
	}
	// Nor does it hide a fault that only the good part can show.
	louder := model(grid(0, 560, 0.1), someModes, func(l, m int, u float64) complex128 { return truth(l, m, u) * (1 + 1e-5) })
	for _, m := range mustCompare(t, Input{Reference: ref, Convention: c, Model: louder.in(c)}).Modes {
		if m.Verdict != result.Differs {
			t.Error(m.Sentence)
		}
	}
}

// Conversions against their formulas, worked by hand: l = 2 master functions
// carry sqrt(24); psi4 of A e^{-i w t} is -w^2/2 of it; per nu is per mu times
// nu/mu = 1/(1+q)^2.
func TestConversionsByHand(t *testing.T) {
	ts := grid(0, 100, 0.05)
	h := make([]complex128, len(ts))
	for i, x := range ts {
		h[i] = 0.7 * cmplx.Exp(complex(0, -0.4*x))
	}
	mid := len(ts) / 2
	for _, c := range []struct {
		c Convention
		l int
		m int
		f complex128
	}{
		{Convention{Quantity: "master"}, 2, 2, complex(1/math.Sqrt(24), 0)},
		{Convention{Quantity: "master"}, 3, 3, complex(1/math.Sqrt(120), 0)},
		{Convention{Quantity: "curvature"}, 2, 2, -0.5 * 0.16},
		{Convention{PhaseOf: "heavy-body"}, 3, 3, -1},
		{Convention{PhaseOf: "heavy-body"}, 2, 2, 1},
		{Convention{Per: "nu", MassRatio: 0.25}, 2, 2, 1.5625},
	} {
		z, err := c.c.FromStrain(c.l, c.m, ts, h)
		if err != nil {
			t.Fatal(err)
		}
		if got := z[mid] / h[mid]; cmplx.Abs(got-c.f) > 1e-9*cmplx.Abs(c.f) {
			t.Errorf("%+v: factor %v, want %v", c.c, got, c.f)
		}
	}
	z, _ := Convention{Phase: "plus"}.FromStrain(2, 2, ts, h)
	if z[mid] != cmplx.Conj(h[mid]) {
		t.Error("phase: plus is not the conjugate")
	}
}

// orbit lends the reference a particle's path, an invented smooth infall, and
// returns the model's particle times of given retarded times.
func orbit(b *result.Bundle) {
	for _, t := range grid(-20, 640, 0.25) {
		b.Series.T = append(b.Series.T, t)
		b.Series.R = append(b.Series.R, 10-3*math.Tanh((t-300)/200)-0.002*(t-300))
	}
	b.Result.Orbit.Markers["isco"] = 430
	b.Result.Orbit.Markers["light_ring"] = 455
}

func TestParticleTime(t *testing.T) {
	ref := reference(someModes, 1e-8, nil)
	orbit(ref)
	// The model gives h at the particle's time t: that is h(u = t - r_*(t)).
	w := &memory{t: ref.Series.T, modes: someModes, z: map[[2]int][]complex128{}}
	for _, lm := range someModes {
		z := make([]complex128, len(w.t))
		for i, x := range w.t {
			z[i] = truth(lm[0], lm[1], x-hyperboloidal.TortoiseAt(ref.Series.R[i]))
		}
		w.z[lm] = z
	}
	in := Input{Reference: ref, Model: w, Tortoise: hyperboloidal.TortoiseAt, Convention: Convention{TimeIs: "particle"}}
	if c := mustCompare(t, in); c.Overall.Verdict != result.Inside {
		t.Error(c.Overall.Sentence)
	}
	in.Convention.TimeIs = "retarded"
	c := mustCompare(t, in)
	if c.Overall.Verdict != result.Differs || !strings.Contains(strings.Join(c.Hints, " "), "The difference shrinks") || !strings.Contains(c.Hints[0], "time_is: particle") {
		t.Errorf("%s %q", c.Overall.Sentence, c.Hints)
	}
	// Markers are particle times t and stand at u = t.
	if at := c.Modes[1].PhaseDifference.At; len(at) < 4 || at[0].Marker != "start" || at[1].Marker != "isco" ||
		at[1].U != 430 {
		t.Errorf("markers %+v", at)
	}
	for _, s := range []string{"inspiral", "plunge", "ringdown"} {
		if _, ok := c.Modes[1].PhaseDifference.ByStage[s]; !ok {
			t.Errorf("no stage %s", s)
		}
	}
}

// A file in another convention is read as said, and the hint names the one
// that would fit.
func TestHints(t *testing.T) {
	fine := grid(0, 560, 0.25)
	for _, c := range []struct {
		file Convention
		read Convention
		want string
	}{
		{Convention{Phase: "plus"}, Convention{}, "vanishes if phase: plus."},
		{Convention{}, Convention{Phase: "plus"}, "vanishes if phase: minus."},
		{Convention{PhaseOf: "heavy-body"}, Convention{}, "vanishes if phase_of: heavy-body."},
		{Convention{Quantity: "master"}, Convention{}, "vanishes if quantity: master."},
		{Convention{}, Convention{Quantity: "master"}, "vanishes if quantity: strain."},
		{Convention{Quantity: "master", Phase: "plus", PhaseOf: "heavy-body"}, Convention{}, "phase: plus and phase_of: heavy-body and quantity: master."},
		{Convention{Quantity: "curvature"}, Convention{}, "quantity: curvature"},
	} {
		w := model(fine, someModes, truth).in(c.file)
		cmp := mustCompare(t, Input{Reference: reference(someModes, 1e-8, nil), Model: w, Convention: c.read})
		if cmp.Overall.Verdict != result.Differs {
			t.Errorf("%+v read as %+v: %s", c.file, c.read, cmp.Overall.Sentence)
		}
		if len(cmp.Hints) != 1 || !strings.Contains(cmp.Hints[0], c.want) {
			t.Errorf("%+v read as %+v: hints %q, want %q", c.file, c.read, cmp.Hints, c.want)
		}
	}
	// A model that is simply wrong gets no hint.
	wrong := model(fine, someModes, func(l, m int, u float64) complex128 { return truth(l, m, 1.07*u) })
	if c := mustCompare(t, Input{Reference: reference(someModes, 1e-8, nil), Model: wrong}); len(c.Hints) != 0 {
		t.Errorf("hints %q", c.Hints)
	}
}

func TestAlign(t *testing.T) {
	const dt, psi = 3.25, 0.7
	w := model(grid(-20, 600, 0.25), someModes, func(l, m int, u float64) complex128 {
		return truth(l, m, u-dt) * cmplx.Exp(complex(0, float64(m)*psi))
	})
	in := Input{Reference: reference(someModes, 1e-9, nil), Model: w, Align: &[2]float64{330, 460}}
	c := mustCompare(t, in)
	if c.Overall.Verdict != result.Inside {
		t.Error(c.Overall.Sentence)
	}
	if math.Abs(c.Shift.Time.Value-dt) > 1e-7 || math.Abs(math.Remainder(c.Shift.Phase.Value-psi, 2*math.Pi)) > 1e-7 {
		t.Errorf("shift %+v, want %v, %v", c.Shift, dt, psi)
	}
	if c.Shift.Time.Error <= 0 || c.Shift.Time.Error > 1e-5 || math.Abs(c.Shift.Time.Value-dt) > c.Shift.Time.Error {
		t.Errorf("bar of the time shift: %+v", c.Shift.Time)
	}
	in.Align = nil
	if c := mustCompare(t, in); c.Overall.Verdict != result.Differs {
		t.Error("shifts were made without being asked for")
	}
	// One frequency only: time and phase cannot be told apart.
	flat := func(l, m int, u float64) complex128 { return cmplx.Exp(complex(0, -0.1*float64(m)*u)) }
	ref := reference(someModes, 1e-9, nil)
	for i := range ref.Series.Modes {
		md := &ref.Series.Modes[i]
		for k, u := range ref.Series.U {
			md.Wave[k], md.WaveErr[k] = flat(md.L, md.M, u), 1e-9
		}
	}
	turned := model(grid(0, 560, 0.5), someModes, func(l, m int, u float64) complex128 {
		return flat(l, m, u) * cmplx.Exp(complex(0, 2.9*float64(m)))
	})
	c = mustCompare(t, Input{Reference: ref, Model: turned, Align: &[2]float64{100, 500}})
	if c.Overall.Verdict != result.Inside || c.Shift.Time.Value != 0 || math.Abs(c.Shift.Phase.Value-2.9) > 1e-8 || len(c.Warnings) != 1 {
		t.Errorf("%s %+v %q", c.Overall.Sentence, c.Shift, c.Warnings)
	}
}

// The peak of the invented signal, found against the closed form: time from
// bisection of A', frequency m omega at that time.
func TestPeaks(t *testing.T) {
	ref := reference(someModes, 1e-9, nil)
	orbit(ref)
	c := mustCompare(t, Input{Reference: ref, Tortoise: hyperboloidal.TortoiseAt,
		Model: model(grid(0, 560, 0.25), someModes, func(l, m int, u float64) complex128 { return truth(l, m, u-0.01) * 1.001 })})
	lo, hi := 430.0, 470.0
	for k := 0; k < 80; k++ {
		mid := (lo + hi) / 2
		if ampAt(2, 2, mid+1e-4) > ampAt(2, 2, mid-1e-4) {
			lo = mid
		} else {
			hi = mid
		}
	}
	p := c.Modes[1].Peak
	if p == nil {
		t.Fatal("no peak")
	}
	for _, q := range []struct {
		name       string
		got        result.Q
		want, much float64
	}{
		{"time", p.Reference.U, lo, 1e-5},
		{"amplitude", p.Reference.Amplitude, ampAt(2, 2, lo), 1e-9},
		{"frequency", p.Reference.Frequency, 2 * omegaAt(lo), 1e-7},
		{"slope", p.Reference.FrequencySlope, 2 * 0.05 / 40 / math.Pow(math.Cosh((lo-400)/40), 2), 1e-6},
		{"difference of times", p.Difference.U, 0.01, 1e-5},
		{"difference of amplitudes", p.Difference.Amplitude, 0.001 * ampAt(2, 2, lo), 1e-8},
	} {
		if e := math.Abs(q.got.Value - q.want); e > q.much || e > q.got.Error+1e-6 {
			t.Errorf("%s: %v, want %v", q.name, q.got, q.want)
		}
	}
	if w := c.Modes[1].PhaseDifference.At; !strings.Contains(w[len(w)-2].Marker, "peak + 50 M") {
		t.Errorf("markers %+v", w)
	}
}

// With a constant phase error d between two equal modes' sums nothing is lost;
// an amplitude-weighted fault has a closed form: b = a (1 + e s(t)) with s
// orthogonal to a's envelope gives mismatch e^2 <s^2>/2 to leading order.
func TestMismatchAgainstClosedForm(t *testing.T) {
	const n = 4096
	u := grid(0, n-1, 1)
	a, b, bar := make([]complex128, n), make([]complex128, n), make([]float64, n)
	const e = 1e-4
	for i := range u {
		x := 2 * math.Pi * float64(i) / n
		env := math.Pow(math.Sin(x/2), 8) // no weight where the taper acts
		a[i] = complex(env, 0) * cmplx.Exp(complex(0, -0.3*u[i]))
		b[i] = a[i] * cmplx.Exp(complex(0, 1.1)) * complex(1+e*math.Cos(40*x), 0)
	}
	q, ok := mismatch(u, a, b, bar, nil)
	// <cos^2> over the envelope is 1/2: mismatch e^2/4.
	if want := e * e / 4; !ok || math.Abs(q.Value-want) > 1e-3*want {
		t.Errorf("mismatch %v, want %v", q.Value, want)
	}
	for i := range b {
		b[i] = a[i] * 3i
	}
	if q, _ = mismatch(u, a, b, bar, nil); q.Value > 1e-28 {
		t.Errorf("mismatch of a scaled and turned copy %v", q.Value)
	}
	// A shift by a non-integer time is undone.
	for i := range u {
		x := 2 * math.Pi * (float64(i) - 2.37) / n
		b[i] = complex(math.Pow(math.Sin(x/2), 8), 0) * cmplx.Exp(complex(0, -0.3*(u[i]-2.37)))
	}
	if q, _ = mismatch(u, a, b, bar, nil); q.Value > 1e-18 {
		t.Errorf("mismatch of a shifted copy %v", q.Value)
	}
	// Noise that is deaf to the fault does not see it: a fault at another
	// frequency, outside the curve.
	for i := range u {
		b[i] = a[i] + complex(1e-2*math.Pow(math.Sin(math.Pi*float64(i)/n), 8), 0)*cmplx.Exp(complex(0, -2.5*u[i]))
	}
	hz := 1 / (2 * math.Pi * SolarMassSeconds * 50)
	deaf := &Noise{Frequency: []float64{0.1 * hz, 1 * hz}, Density: []float64{1, 1}, TotalMass: 50}
	flat, _ := mismatch(u, a, b, bar, nil)
	coloured, _ := mismatch(u, a, b, bar, deaf)
	if !(flat.Value > 4e-5 && flat.Value < 6e-5) || coloured.Value > 1e-12 {
		t.Errorf("flat %v, coloured %v", flat.Value, coloured.Value)
	}
	s, is := visible(result.Q{Value: 5e-5, Error: 1e-6}, 1)
	if is != "" || math.Abs(s.Value-100) > 1e-9 || math.Abs(s.Error-1.0155) > 1e-2 {
		t.Errorf("visible from %v %q", s, is)
	}
	if s, is = visible(result.Q{Value: 1e-12, Error: 5e-11}, 1); is != "at least" || s.Value < 9e4 {
		t.Errorf("visible from %v %q", s, is)
	}
}

// Closed forms of the harmonics: -2Y22 = sqrt(5/64pi)(1+cos)^2, -2Y21 =
// sqrt(5/16pi) sin (1+cos), -2Y20 = sqrt(15/32pi) sin^2 (J. N. Goldberg et
// al., J. Math. Phys. 8, 2155 (1967), from memory), and the norm of higher ones.
func TestHarmonics(t *testing.T) {
	for _, th := range []float64{0, 0.4, 1.3, math.Pi / 2, 2.9} {
		c, s := math.Cos(th), math.Sin(th)
		for _, q := range []struct {
			l, m int
			want float64
		}{
			{2, 2, math.Sqrt(5/(64*math.Pi)) * (1 + c) * (1 + c)},
			{2, 1, math.Sqrt(5/(16*math.Pi)) * s * (1 + c)},
			{2, 0, math.Sqrt(15/(32*math.Pi)) * s * s},
			{2, -2, math.Sqrt(5/(64*math.Pi)) * (1 - c) * (1 - c)},
		} {
			if got := harmonic(q.l, q.m, th); math.Abs(got-q.want) > 1e-14 {
				t.Errorf("Y(%d,%d)(%v) = %v, want %v", q.l, q.m, th, got, q.want)
			}
		}
	}
	for l := 2; l < 7; l++ {
		for m := -l; m <= l; m++ {
			const n = 400
			sum := 0.0
			for i := 0; i < n; i++ {
				th := math.Pi * (float64(i) + 0.5) / n
				y := harmonic(l, m, th)
				sum += y * y * math.Sin(th) * math.Pi / n * 2 * math.Pi
			}
			if math.Abs(sum-1) > 1e-4 {
				t.Errorf("norm of (%d,%d): %v", l, m, sum)
			}
		}
	}
}

// A model whose samples are too far apart is not blamed for it.
// A reference whose mode vanishes, for a while or always, breaks nothing.
// Whatever a model holds, the outcome is a comparison that JSON can carry, or
// a sentence.
