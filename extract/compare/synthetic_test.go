package compare

import (
	"math"
	"math/cmplx"
	"math/rand"

	"nullmark/extract/result"
)

// The tests' signal is invented: a chirp that ends in a peak and a decay, with
// closed forms for phase and amplitude, so that every injected fault is known
// exactly.

// orbital phase and its rate: 0.05 rad/M early, 0.15 late.
func phaseAt(u float64) float64 {
	return 0.1*u + 0.05*40*lncosh((u-400)/40)
}

func omegaAt(u float64) float64 { return 0.1 + 0.05*math.Tanh((u-400)/40) }

func lncosh(x float64) float64 {
	x = math.Abs(x)
	return x + math.Log1p(math.Exp(-2*x)) - math.Ln2
}

// amplitude with its one maximum near u = 450.
func ampAt(l, m int, u float64) float64 {
	a := 0.4 * math.Pow(0.5, float64(l-2)) * math.Pow(0.4, float64(l-m))
	x := (u - 450) / 30
	return a * (1 + 0.6*math.Exp(-x*x)) / (1 + math.Exp((u-480)/9))
}

func truth(l, m int, u float64) complex128 {
	if m == 0 {
		return complex(ampAt(l, 0, u)*math.Cos(phaseAt(u)/3), 0)
	}
	return complex(ampAt(l, m, u), 0) * cmplx.Exp(complex(0, -float64(m)*phaseAt(u)-0.3*float64(l)))
}

var someModes = [][2]int{{2, 1}, {2, 2}, {3, 3}, {4, 4}}

func grid(from, to, dt float64) []float64 {
	n := int(math.Round((to-from)/dt)) + 1
	t := make([]float64, n)
	for i := range t {
		t[i] = from + float64(i)*dt
	}
	return t
}

func fill(t []float64, l, m int) []complex128 {
	z := make([]complex128, len(t))
	for i, u := range t {
		z[i] = truth(l, m, u)
	}
	return z
}

// reference makes a bundle whose strain is wrong by at most the relative bar
// (of each sample), with rng nil: not wrong at all.
func reference(modes [][2]int, rel float64, rng *rand.Rand) *result.Bundle {
	u := grid(0, 560, 0.5)
	b := &result.Bundle{
		Result: &result.Result{Accuracy: result.Accuracy{Asked: rel, Met: true}, Orbit: &result.Orbit{Kind: "inspiral", Numbers: map[string]float64{}, Markers: map[string]float64{}}},
		Series: &result.Series{Prefix: "h", U: u, JunkUntil: 40},
	}
	for _, lm := range modes {
		m := result.ModeSeries{L: lm[0], M: lm[1], Wave: fill(u, lm[0], lm[1]), WaveErr: make([]float64, len(u))}
		var size, turn, beat float64
		if rng != nil {
			size, turn, beat = rng.Float64(), 2*math.Pi*rng.Float64(), 0.4*(rng.Float64()-0.5)
		}
		for i := range u {
			m.WaveErr[i] = rel * cmplx.Abs(m.Wave[i])
			m.Wave[i] *= 1 + complex(rel*size, 0)*cmplx.Exp(complex(0, turn+beat*u[i]))
		}
		for i := 0; u[i] < 40; i++ { // start-up
			m.Wave[i] = 77
		}
		b.Series.Modes = append(b.Series.Modes, m)
		b.Result.Modes = append(b.Result.Modes, result.Mode{L: lm[0], M: lm[1], Met: true, Measure: "rate", Counts: "both signs of m"})
	}
	return b
}

// memory is a model that stands in memory.
type memory struct {
	t     []float64
	modes [][2]int
	z     map[[2]int][]complex128
}

func (m *memory) Times() []float64 { return m.t }
func (m *memory) Modes() [][2]int  { return m.modes }
func (m *memory) Notes() []string  { return nil }
func (m *memory) Load(l, k int) (Samples, error) {
	return Samples{Z: append([]complex128(nil), m.z[[2]int{l, k}]...)}, nil
}

// model samples f at the times t.
func model(t []float64, modes [][2]int, f func(l, m int, u float64) complex128) *memory {
	w := &memory{t: t, modes: modes, z: map[[2]int][]complex128{}}
	for _, lm := range modes {
		z := make([]complex128, len(t))
		for i, u := range t {
			z[i] = f(lm[0], lm[1], u)
		}
		w.z[lm] = z
	}
	return w
}

// in writes a model in another convention.
func (m *memory) in(c Convention) *memory {
	w := &memory{t: m.t, modes: m.modes, z: map[[2]int][]complex128{}}
	for lm, z := range m.z {
		x, err := c.FromStrain(lm[0], lm[1], m.t, z)
		if err != nil {
			panic(err)
		}
		w.z[lm] = x
	}
	return w
}
