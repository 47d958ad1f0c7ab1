package spectrum_test

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/signal"
	"nullmark/extract/spectrum"
)

// gauss is exp(-(u-u0)^2/(2 w^2)) e^{-i omega u} with a relative error e that
// turns with the signal.
func gauss(r *rand.Rand, u0, w, omega, dt, e float64) signal.Series {
	n := int(400 / dt)
	s := signal.Series{Start: -150, Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}
	turn, p := 0.02*r.Float64(), 6*r.Float64()
	for k := range s.Values {
		u := s.Time(k)
		x := (u - u0) / w
		h := cmplx.Rect(math.Exp(-x*x/2), -omega*u)
		s.Values[k] = h + h*cmplx.Rect(e, p+turn*u)
		s.Err[k] = e * cmplx.Abs(h) * 1.0001
	}
	return s
}

// density of gauss at omega > 0 and scale c.
func density(c, w, centre, omega float64) float64 {
	one := func(x float64) float64 { return math.Exp(-w * w * (x - centre) * (x - centre)) }
	return c * w * w * (one(omega) + one(-omega))
}

// TestGaussian: density, total energy and peak of bursts known in closed form.
func TestGaussian(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 3))
	inside, all, idle, peaks, idlePeaks := 0, 0, 0, 0, 0
	const trials = 40
	for range trials {
		w, omega, dt := 8+6*r.Float64(), 0.25+0.3*r.Float64(), 0.2+0.6*r.Float64()
		e := math.Pow(10, -10+6*r.Float64())
		p := spectrum.Strain(2, gauss(r, 40*r.Float64(), w, omega, dt, e))
		s, err := spectrum.Of([]spectrum.Part{p}, spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		c := 2 / (16 * math.Pi)
		if want := c * w * math.Sqrt(math.Pi); math.Abs(s.Energy/want-1) > 2*e+e*e+1e-12 {
			t.Errorf("energy %g, want %g", s.Energy, want)
		}
		for k, x := range s.Omega {
			if x > omega+2/w || x < omega-2/w {
				continue
			}
			want := density(c, w, omega, x)
			miss := math.Abs(s.Density[k] - want)
			all++
			if miss <= s.Err[k]*(1+1e-9)+1e-14*want {
				inside++
			}
			if s.Err[k] > 100*miss+1e-13*want {
				idle++
			}
		}
		q, err := spectrum.Peak([]spectrum.Part{p}, spectrum.Options{})
		if err != nil {
			t.Fatal(err)
		}
		// The mirror image at -omega shifts the peak by less than a rounding.
		miss := math.Abs(q.Value - omega)
		if miss <= q.Error+1e-12 {
			peaks++
		}
		if q.Error > 1000*miss+1e-11 {
			idlePeaks++
		}
	}
	if inside < all*99/100 || idle > all/2 || peaks < trials || idlePeaks > trials/2 {
		t.Errorf("%d of %d inside, %d idle; peaks %d of %d, %d idle", inside, all, idle, peaks, trials, idlePeaks)
	}
}

// TestParseval: the energy of a rough random series in time and in frequency.
func TestParseval(t *testing.T) {
	r := rand.New(rand.NewPCG(4, 4))
	s := signal.Series{Start: 3, Dt: 0.7, Values: make([]complex128, 777)}
	for k := range s.Values {
		s.Values[k] = complex(r.NormFloat64(), r.NormFloat64())
	}
	// All but invisible tapers: one sample at each end.
	got, err := spectrum.Of([]spectrum.Part{{Rate: s, Scale: 2}}, spectrum.Options{Taper: 1e-4})
	if err != nil {
		t.Fatal(err)
	}
	var want float64
	for _, v := range s.Values[1:776] {
		want += 2 * 0.7 * (real(v)*real(v) + imag(v)*imag(v))
	}
	if math.Abs(got.Energy/want-1) > 1e-12 {
		t.Errorf("energy %g in frequency, %g in time", got.Energy, want)
	}
}

// TestRingdown: a damped oscillation that sets in smoothly; two modes together.
// The density is compared with a direct sum on a finer sampling.
func TestRingdown(t *testing.T) {
	f := func(u float64) complex128 {
		return cmplx.Exp(complex(-0.089*u, -0.37*u)) / complex(1+math.Exp(-u/3), 0) / complex(1+math.Exp(-u/3), 0)
	}
	sample := func(dt float64) signal.Series {
		n := int(500/dt) + 1
		s := signal.Series{Start: -200, Dt: dt, Values: make([]complex128, n)}
		for k := range s.Values {
			s.Values[k] = f(s.Time(k))
		}
		return s
	}
	s := sample(0.5)
	parts := []spectrum.Part{spectrum.Master(2, 0, s), spectrum.Master(2, 2, s)}
	got, err := spectrum.Of(parts, spectrum.Options{})
	if err != nil {
		t.Fatal(err)
	}
	direct := func(omega float64) float64 {
		fine := sample(0.1)
		var a, b complex128
		for k, v := range fine.Values {
			a += v * cmplx.Rect(0.1, omega*fine.Time(k))
			b += v * cmplx.Rect(0.1, -omega*fine.Time(k))
		}
		// (l+2)!/(l-2)! = 24; m = 0 once, m = 2 twice.
		return 3 * 24 / (64 * math.Pi) / (2 * math.Pi) * (real(a*cmplx.Conj(a)) + real(b*cmplx.Conj(b)))
	}
	for k := 5; k < 300; k += 37 {
		want := direct(got.Omega[k])
		if miss := math.Abs(got.Density[k] - want); miss > got.Err[k]+1e-12*want || got.Err[k] > 1e-6*got.Density[30] {
			t.Errorf("omega %g: %g, want %g, bar %g", got.Omega[k], got.Density[k], want, got.Err[k])
		}
	}
	q, err := spectrum.Peak(parts, spectrum.Options{})
	if err != nil {
		t.Fatal(err)
	}
	// A maximum of the direct sum, in parts of its neighbourhood.
	h := 1e-4
	slope := (direct(q.Value+h) - direct(q.Value-h)) / (2 * h)
	bend := (direct(q.Value+h) - 2*direct(q.Value) + direct(q.Value-h)) / (h * h)
	if d := math.Abs(slope / bend); d > q.Error+1e-7 || bend >= 0 {
		t.Errorf("peak %+v is %g from the maximum of the direct sum", q, d)
	}
	// Cut off at a tenth of its amplitude: the bar says what that costs.
	short, err := spectrum.Peak(parts, spectrum.Options{From: -200, To: 26})
	if d := math.Abs(short.Value - q.Value); err != nil || d > short.Error || d < 1e-7 || short.Error > 1e-3 {
		t.Errorf("cut short: %+v, %g from %g, %v", short, d, q.Value, err)
	}
	// A coarser run that is off by a known shift widens the bar by it.
	coarse := make([]spectrum.Part, 2)
	for i, p := range parts {
		c := p.Rate
		c.Values = append([]complex128(nil), c.Values...)
		for k := range c.Values {
			c.Values[k] *= cmplx.Rect(1, -1e-3*c.Time(k))
		}
		coarse[i] = spectrum.Part{Rate: c, Scale: p.Scale}
	}
	wide, err := spectrum.Peak(parts, spectrum.Options{Coarse: coarse, Factor: 0.5})
	if err != nil || wide.Value != q.Value || math.Abs(wide.Error-q.Error-0.5e-3) > 5e-5 {
		t.Errorf("with a coarser run: %+v instead of %+v, %v", wide, q, err)
	}
}

func TestFaults(t *testing.T) {
	if _, err := spectrum.Of(nil, spectrum.Options{}); err == nil {
		t.Error("no modes")
	}
	s := gauss(rand.New(rand.NewPCG(1, 1)), 0, 10, 0, 0.5, 0)
	if _, err := spectrum.Peak([]spectrum.Part{{Rate: s, Scale: 1}}, spectrum.Options{}); err == nil {
		t.Error("a spectrum that is largest at frequency 0 has no peak frequency")
	}
	b := s
	b.Start++
	if _, err := spectrum.Of([]spectrum.Part{{Rate: s, Scale: 1}, {Rate: b, Scale: 1}}, spectrum.Options{}); err == nil {
		t.Error("different sample times")
	}
}
