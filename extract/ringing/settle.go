package ringing

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"strings"

	"nullmark/extract/result"
)

// How a group of fits becomes a value with a bar. The factor is measured: on
// pulses with known frequencies it makes the bar cover (calibration tests here
// and of the pulse package).
const (
	barFactor   = 2.5
	keepWithin  = 3.0 // fits that move at most so much more than the steadiest count
	keepAtLeast = 5
	keepAtMost  = 25
	polishSteps = 5
	// An overtone whose bar is a larger part of it than this is not reported.
	tooVague = 0.1
)

// settleOn turns a group, steadiest first, into a mode without a name: the
// value is the median of the steady fits, part by part; the bar is barFactor
// times the larger of the steadiest pole's movement and the third quartile of
// the distances from the median, plus the step by which variable projection
// moves the steadiest fit's pole from the value when it lowers the residual.
func settleOn(s Series, reference float64, g []finding) Mode {
	c := g[0].cell
	m := Mode{Start: c.start, Length: c.length, Terms: c.terms, N: -1}
	kept := g[:min(len(g), keepAtLeast)]
	for len(kept) < min(len(g), keepAtMost) && g[len(kept)].moved <= keepWithin*g[0].moved {
		kept = g[:len(kept)+1]
	}
	m.Fits = len(kept)
	omega := make([]complex128, len(kept))
	amp := make([]complex128, len(kept))
	for i, f := range kept {
		omega[i] = f.omega
		amp[i] = f.cell.amp[f.index] * cmplx.Exp(-1i*f.omega*complex(reference-f.cell.start, 0))
	}
	value := middle(omega)
	bar := barFactor * math.Max(g[0].moved, thirdQuartile(omega, value))
	if y, _, h := s.cut(c.start, c.length); len(y) > 3*c.terms {
		if better, ok := refine(y, h, c.omega, polishSteps); ok {
			bar += math.Min(cmplx.Abs(better.omega[g[0].index]-value), bar)
		}
	}
	bar = math.Max(bar, 4*ulp*cmplx.Abs(value))
	m.Omega = result.Complex{
		Re: result.Q{Value: real(value), Error: bar},
		Im: result.Q{Value: imag(value), Error: bar},
	}
	a := middle(amp)
	abar := barFactor * thirdQuartile(amp, a)
	// What the frequency's own bar does over the way back to the peak.
	abar += cmplx.Abs(a) * bar * math.Abs(c.start-reference)
	m.Amplitude = result.Q{Value: cmplx.Abs(a), Error: abar}
	m.Phase = result.Q{Value: cmplx.Phase(a), Error: math.Min(math.Pi, abar/cmplx.Abs(a))}
	return m
}

const ulp = 0x1p-52

// middle is the median of the real and of the imaginary parts.
func middle(z []complex128) complex128 {
	re := make([]float64, len(z))
	im := make([]float64, len(z))
	for i, v := range z {
		re[i], im[i] = real(v), imag(v)
	}
	return complex(median(re), median(im))
}

// thirdQuartile is that of the distances |z - centre|.
func thirdQuartile(z []complex128, centre complex128) float64 {
	d := make([]float64, len(z))
	for i, v := range z {
		d[i] = cmplx.Abs(v - centre)
	}
	sort.Float64s(d)
	return d[len(d)*3/4]
}

// median sorts x.
func median(x []float64) float64 {
	sort.Float64s(x)
	n := len(x)
	if n%2 == 1 {
		return x[n/2]
	}
	return (x[n/2-1] + x[n/2]) / 2
}

func (m *Mode) omega() complex128 { return complex(m.Omega.Re.Value, m.Omega.Im.Value) }

// name labels the modes, drops what was not asked for and sorts them: own modes
// by N, named neighbours, unnamed ones, the latter two by amplitude.
func name(fit *Fit, o Options) {
	main := fundamental(fit.Modes)
	if len(o.Expected) > 0 {
		nameFrom(fit.Modes, o, -imag(fit.Modes[main].omega()))
	} else {
		nameByDamping(fit.Modes, o, main)
	}
	overtones := o.Overtones
	if overtones == 0 {
		overtones = 1
	}
	var kept []Mode
	for _, m := range fit.Modes {
		vague := m.Omega.Re.Error > tooVague*cmplx.Abs(m.omega())
		if vague || m.Own && m.N > max(0, overtones) {
			continue
		}
		kept = append(kept, m)
	}
	rank := func(m *Mode) int {
		switch {
		case m.Own:
			return 0
		case m.Named:
			return 1
		}
		return 2
	}
	sort.SliceStable(kept, func(i, j int) bool {
		a, b := &kept[i], &kept[j]
		if ra, rb := rank(a), rank(b); ra != rb {
			return ra < rb
		}
		if a.Own {
			return a.N < b.N
		}
		return a.Amplitude.Value > b.Amplitude.Value
	})
	fit.Modes = kept
	for n := 0; n <= max(0, overtones); n++ {
		if fit.Find(o.L, o.M, n) == nil {
			fit.Warnings = append(fit.Warnings, fmt.Sprintf("(%d,%d) n = %d does not stand out of the signal: no fit holds it to %g of itself", o.L, o.M, n, tooVague))
		}
	}
	var mixed []string
	for _, m := range fit.Modes {
		if m.Named && !m.Own {
			mixed = append(mixed, fmt.Sprintf("(%d,%d) n = %d with %.2g", m.L, m.M, m.N, m.Amplitude.Value))
		}
	}
	if len(mixed) > 0 {
		fit.Warnings = append(fit.Warnings, fmt.Sprintf("the signal of (%d,%d) also carries other tones, fitted beside its own and not averaged in; amplitudes at the peak: %s", o.L, o.M, strings.Join(mixed, ", ")))
	}
}

// fundamental is the strongest of the modes that decay nearly as slowly as the
// steadiest one, which comes first.
func fundamental(modes []Mode) int {
	best := 0
	for i := range modes {
		if imag(modes[i].omega()) > 1.5*imag(modes[0].omega()) && modes[i].Omega.Re.Error < 0.01*cmplx.Abs(modes[i].omega()) &&
			modes[i].Amplitude.Value > modes[best].Amplitude.Value {
			best = i
		}
	}
	return best
}

// nameFrom gives every expected frequency the nearest mode within half the
// damping rate of the fundamental, nearest pairs first.
func nameFrom(modes []Mode, o Options, damping float64) {
	taken := make([]bool, len(o.Expected))
	for {
		bm, be, dist := -1, -1, 0.5*damping
		for i := range modes {
			if modes[i].Named {
				continue
			}
			for j, e := range o.Expected {
				if d := cmplx.Abs(modes[i].omega() - e.Omega); !taken[j] && d < dist {
					bm, be, dist = i, j, d
				}
			}
		}
		if bm < 0 {
			return
		}
		e := o.Expected[be]
		taken[be] = true
		modes[bm].Named, modes[bm].L, modes[bm].M, modes[bm].N = true, e.L, e.M, e.N
		modes[bm].Own = e.L == o.L && e.M == o.M
	}
}

// nameByDamping numbers the overtones of the fundamental by their damping:
// successive ones decay by about twice the fundamental's rate faster. Where
// two claim one number, the steadier, which comes first, has it.
func nameByDamping(modes []Mode, o Options, main int) {
	w0 := modes[main].omega()
	claim := map[int]int{0: main}
	for i := range modes {
		w := modes[i].omega()
		n := int(math.Round((imag(w)/imag(w0) - 1) / 2))
		if i == main || n < 1 ||
			real(w)*real(w0) < 0 || math.Abs(real(w)) > 1.05*math.Abs(real(w0)) || math.Abs(real(w)) < 0.4*math.Abs(real(w0)) {
			continue
		}
		if _, held := claim[n]; !held {
			claim[n] = i
		}
	}
	for n, i := range claim {
		m := &modes[i]
		m.Named, m.Own, m.L, m.M, m.N = true, true, o.L, o.M, n
	}
}
