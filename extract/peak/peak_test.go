package peak_test

import (
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/peak"
	"nullmark/extract/result"
	"nullmark/extract/signal"
)

// model is A(u) = a / cosh((u-u0)/w) e^{-i phi}, omega = f + g tanh((u-u0)/v):
// rise, merger and ringdown in closed form.
type model struct{ a, u0, w, f, g, v, phase float64 }

func (m model) at(u float64) complex128 {
	x := u - m.u0
	phi := m.phase + m.f*x + m.g*m.v*math.Log(math.Cosh(x/m.v))
	return cmplx.Rect(m.a/math.Cosh(x/m.w), -phi)
}

// truth at time u: amplitude, its slope and curvature, frequency and slope.
func (m model) truth(u float64) map[string]float64 {
	x := u - m.u0
	s, th := 1/math.Cosh(x/m.w), math.Tanh(x/m.w)
	tv := math.Tanh(x / m.v)
	return map[string]float64{
		"amplitude":           m.a * s,
		"amplitude_slope":     -m.a * s * th / m.w,
		"amplitude_curvature": m.a * s * (th*th - s*s) / (m.w * m.w),
		"frequency":           m.f + m.g*tv,
		"frequency_slope":     m.g / m.v * (1 - tv*tv),
	}
}

func random(r *rand.Rand) model {
	return model{
		a: math.Pow(10, -3+3*r.Float64()), u0: 300 + r.Float64(), w: 10 + 5*r.Float64(),
		f: 0.15 + 0.6*r.Float64(), g: 0.02 + 0.1*r.Float64(), v: 8 + 8*r.Float64(), phase: 6 * r.Float64(),
	}
}

// series samples the model with a smooth error (as a scheme's is) of relative
// size e and a rough one of size rough.
func (m model) series(r *rand.Rand, dt, e, rough float64, bars bool) signal.Series {
	return m.turned(r, dt, e, rough, bars, 0)
}

// turned is series with the smooth error's phase turned by an angle.
func (m model) turned(r *rand.Rand, dt, e, rough float64, bars bool, angle float64) signal.Series {
	n := int(500 / dt)
	s := signal.Series{Start: 20, Dt: dt, Values: make([]complex128, n)}
	if bars {
		s.Err = make([]float64, n)
	}
	p, k1 := 6*r.Float64()+angle, 0.5*r.Float64()
	for k := range s.Values {
		u := s.Time(k)
		h := m.at(u)
		smooth := h * complex(e, 0) * cmplx.Rect(1, p+k1*u)
		s.Values[k] = h + smooth + cmplx.Rect(rough*r.Float64(), 6.3*r.Float64())
		if bars {
			s.Err[k] = e*cmplx.Abs(h)*1.01 + rough
		}
	}
	return s
}

type tally struct {
	inside, all int
	ratio       []float64
}

func (c *tally) add(q result.Q, want float64) {
	c.all++
	miss := math.Abs(q.Value - want)
	if miss <= q.Error {
		c.inside++
	}
	c.ratio = append(c.ratio, q.Error/(miss+1e-18))
}

func check(t *testing.T, all map[string]*tally, idle float64) {
	t.Helper()
	for name, c := range all {
		n := 0
		for _, x := range c.ratio {
			if x > idle {
				n++
			}
		}
		if c.inside < c.all*99/100 || c.all == 0 {
			t.Errorf("%s: %d of %d inside their bars", name, c.inside, c.all)
		}
		if n > c.all/2 {
			t.Errorf("%s: %d of %d bars are more than %g times the error", name, n, c.all, idle)
		}
	}
}

func record(all map[string]*tally, name string, q result.Q, want float64) {
	if all[name] == nil {
		all[name] = &tally{}
	}
	all[name].add(q, want)
}

func recordPeak(all map[string]*tally, p *result.Peak, m model) {
	top := m.truth(m.u0)
	record(all, "u", p.U, m.u0)
	record(all, "amplitude", p.Amplitude, top["amplitude"])
	record(all, "curvature", p.AmplitudeCurvature, top["amplitude_curvature"])
	record(all, "frequency", p.Frequency, top["frequency"])
	record(all, "slope", p.FrequencySlope, top["frequency_slope"])
}

// TestBarsCover: seeded populations of signals, samplings and errors.
func TestBarsCover(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	all, marks := map[string]*tally{}, map[string]*tally{}
	for range 250 {
		m := random(r)
		dt := math.Exp(math.Log(0.03) + r.Float64()*math.Log(25))
		e := math.Pow(10, -12+7*r.Float64())
		s := m.series(r, dt, e, m.a*e*r.Float64(), true)
		p, err := peak.Find(s, peak.Options{})
		if err != nil {
			t.Fatalf("%+v dt %g e %g: %v", m, dt, e, err)
		}
		recordPeak(all, p, m)
		u := m.u0 - 10 + 20*r.Float64()
		at, err := peak.At(s, u, peak.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for name, want := range m.truth(u) {
			record(marks, name, at[name], want)
		}
	}
	check(t, all, 300)
	check(t, marks, 300)
}

// TestCoarserRungCovers: no bars on the samples; two rungs whose errors are the
// same smooth function, the coarser one's larger by a known ratio and turned by
// up to 0.35 rad: differences of single quantities then vanish by accident, which
// is what the guard is for.
func TestCoarserRungCovers(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 9))
	all, marks := map[string]*tally{}, map[string]*tally{}
	for range 250 {
		m := random(r)
		e := math.Pow(10, -11+6*r.Float64())
		const ratio = 8.0
		seed := r.Uint64()
		shape := func(e, dt, angle float64) signal.Series {
			return m.turned(rand.New(rand.NewPCG(seed, 1)), dt, e, 1e-15, false, angle)
		}
		fine, coarse := shape(e, 0.11, 0), shape(ratio*e, 0.17, 0.7*(r.Float64()-0.5))
		o := peak.Options{Coarse: &coarse, Factor: 1.25 / (ratio - 1)}
		p, err := peak.Find(fine, o)
		if err != nil {
			t.Fatal(err)
		}
		recordPeak(all, p, m)
		u := m.u0 - 10 + 20*r.Float64()
		at, err := peak.At(fine, u, o)
		if err != nil {
			t.Fatal(err)
		}
		for name, want := range m.truth(u) {
			record(marks, name, at[name], want)
		}
	}
	check(t, all, 300)
	check(t, marks, 300)
}

// TestBarIsAttained: the error of a single sample, at the worst phase, moves each
// quantity by the bar that it is given.
func TestBarIsAttained(t *testing.T) {
	m := model{a: 1.45, u0: 300.3, w: 11, f: 0.27, g: 0.1, v: 9, phase: 1}
	const bar, part = 1e-6, 1e-2
	for _, off := range []int{0, 1, 3} {
		s := m.series(rand.New(rand.NewPCG(5, 5)), 1.4, 0, 0, true)
		measure := func(u float64) []result.Q {
			t.Helper()
			p, err := peak.Find(s, peak.Options{})
			if err != nil {
				t.Fatal(err)
			}
			at, err := peak.At(s, u, peak.Options{})
			if err != nil {
				t.Fatal(err)
			}
			return []result.Q{p.U, p.Amplitude, p.Frequency, p.AmplitudeCurvature, p.FrequencySlope,
				at["amplitude"], at["amplitude_slope"], at["amplitude_curvature"], at["frequency"], at["frequency_slope"]}
		}
		u := 300.2
		none := measure(u)
		k := 200 + off // sample at 300 + 1.4 off
		rough := s.Roughness(k)
		s.Err[k] = bar
		base := measure(u)
		most := make([]float64, len(base))
		v := s.Values[k]
		for n := range 64 {
			s.Values[k] = v + cmplx.Rect(part*bar, 2*math.Pi*float64(n)/64)
			for i, q := range measure(u) {
				most[i] = math.Max(most[i], math.Abs(q.Value-base[i].Value)/part)
			}
		}
		for i := range base {
			// Without its bar the sample had the floor of its neighbourhood.
			claimed := (base[i].Error - none[i].Error) / (1 - rough/bar)
			if math.Abs(most[i]/claimed-1) > 0.005 {
				t.Errorf("sample %+d, quantity %d: moves by %g, bar %g", off, i, most[i], claimed)
			}
		}
	}
}

func TestAccuracyWithoutErrors(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	m := model{a: 1.45, u0: 300.123, w: 11, f: 0.27, g: 0.1, v: 9, phase: 1}
	p, err := peak.Find(m.series(r, 0.1, 0, 0, false), peak.Options{})
	if err != nil {
		t.Fatal(err)
	}
	top := m.truth(m.u0)
	for _, c := range []struct {
		name      string
		q         result.Q
		want, tol float64
	}{
		{"u", p.U, m.u0, 1e-10},
		{"amplitude", p.Amplitude, top["amplitude"], 1e-13},
		{"curvature", p.AmplitudeCurvature, top["amplitude_curvature"], 1e-12},
		{"frequency", p.Frequency, top["frequency"], 1e-12},
		{"slope", p.FrequencySlope, top["frequency_slope"], 1e-12},
	} {
		if math.Abs(c.q.Value-c.want) > c.tol || c.q.Error > 1000*c.tol {
			t.Errorf("%s: off by %g with bar %g", c.name, c.q.Value-c.want, c.q.Error)
		}
	}
	d := peak.Delay(p.U, result.Q{Value: 303, Error: 1e-3})
	if math.Abs(d.Value+2.877) > 1e-9 || d.Error < 1e-3 {
		t.Errorf("delay %+v", d)
	}
}

func TestRefusals(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 5))
	m := model{a: 1, u0: 300.1, w: 11, f: 0.27, g: 0.1, v: 9}
	s := m.series(r, 0.1, 0, 0, false)
	var no *peak.Refusal
	if _, err := peak.Find(s, peak.Options{From: 100, To: 290}); !errors.As(err, &no) {
		t.Errorf("maximum at the end: %v", err)
	}
	if _, err := peak.Find(s, peak.Options{From: 305, To: 400}); !errors.As(err, &no) {
		t.Errorf("maximum at the start: %v", err)
	}
	flat := s
	flat.Err = make([]float64, len(s.Values))
	for k := range flat.Err {
		flat.Err[k] = 0.2
	}
	if _, err := peak.Find(flat, peak.Options{}); !errors.As(err, &no) {
		t.Errorf("maximum flatter than the bars: %v", err)
	}
	if _, err := peak.At(flat, 340, peak.Options{}); !errors.As(err, &no) {
		t.Errorf("amplitude below its bar: %v", err)
	}
	if _, err := peak.At(s, 5000, peak.Options{}); err == nil {
		t.Error("a time outside the samples was accepted")
	}
	// A real field has no frequency, and a peak all the same.
	for k := range s.Values {
		x := s.Time(k) - 300
		s.Values[k] = complex(-math.Exp(-x*x/50), 0)
	}
	p, err := peak.Find(s, peak.Options{})
	if err != nil || p.Frequency.Value != 0 || math.Abs(p.U.Value-300) > 1e-9 {
		t.Errorf("real field: %+v, %v", p, err)
	}
}
