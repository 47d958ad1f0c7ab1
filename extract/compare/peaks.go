package compare

import (
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// findPeak locates the maximum of |z| away from the ends of the samples:
// amplitude from the polynomial of |z|^2, frequency from that of the phase,
// through the nine samples around it. Bars come from bar (absolute, of each
// sample) and from the polynomial of two samples fewer. ok is false when the
// largest sample lies at an end, or the maximum is not the only high one.
func findPeak(t []float64, z []complex128, bar []float64) (p result.Peak, ok bool) {
	n := len(z)
	top := 0
	for i := range z {
		if cmplx.Abs(z[i]) > cmplx.Abs(z[top]) {
			top = i
		}
	}
	const half = 4
	if top < half+2 || top > n-half-3 {
		return p, false
	}
	fine, ok1 := peakOf(t, z, top, half)
	rough, ok2 := peakOf(t, z, top, half-1)
	if !ok1 || !ok2 {
		return p, false
	}
	a, curv := fine[1], math.Abs(fine[3])
	e := 0.0
	for i := top - half; i <= top+half; i++ {
		e = math.Max(e, bar[i])
	}
	// An error e of the strain that varies like the strain itself (rate of
	// change at most twice its frequency w) moves A' by 2 w e, and so on.
	w := 2 * math.Abs(fine[2])
	q := func(k int, e float64) result.Q {
		return result.Q{Value: fine[k], Error: e + math.Abs(fine[k]-rough[k])}
	}
	p.U = q(0, w*e/curv)
	p.Amplitude = q(1, e)
	p.Frequency = q(2, w*e/a+math.Abs(fine[4])*w*e/curv)
	p.AmplitudeCurvature = q(3, w*w*e)
	p.FrequencySlope = q(4, w*w*e/a)
	return p, true
}

// peakOf returns time, amplitude, frequency, curvature of the amplitude and
// slope of the frequency at the maximum near sample top.
func peakOf(t []float64, z []complex128, top, half int) (v [5]float64, ok bool) {
	first, k := top-half, 2*half+1
	nodes := t[first : first+k]
	var amp, phase [taps]float64
	for i := 0; i < k; i++ {
		amp[i] = cmplx.Abs(z[first+i])
		phase[i] = -cmplx.Phase(z[first+i] * cmplx.Conj(z[top]))
		if i > 0 {
			phase[i] += 2 * math.Pi * math.Round((phase[i-1]-phase[i])/(2*math.Pi))
		}
	}
	var w [taps]float64
	at := func(y *[taps]float64, x float64, d int) float64 {
		fornberg(w[:k], x, nodes, d)
		s := 0.0
		for i := 0; i < k; i++ {
			s += w[i] * y[i]
		}
		return s
	}
	x := t[top]
	for it := 0; it < 30; it++ {
		c := at(&amp, x, 2)
		if !(c < 0) {
			return v, false
		}
		step := -at(&amp, x, 1) / c
		x += step
		if x < t[top-1] || x > t[top+1] {
			return v, false
		}
		if math.Abs(step) < 1e-14*(1+math.Abs(x)) {
			break
		}
	}
	return [5]float64{x, at(&amp, x, 0), at(&phase, x, 1), at(&amp, x, 2), at(&phase, x, 2)}, true
}

// lessPeak is the difference of two peaks, bars added.
func lessPeak(a, b result.Peak) result.Peak {
	d := func(x, y result.Q) result.Q { return less(x, y) }
	return result.Peak{U: d(a.U, b.U), Amplitude: d(a.Amplitude, b.Amplitude), Frequency: d(a.Frequency, b.Frequency),
		AmplitudeCurvature: d(a.AmplitudeCurvature, b.AmplitudeCurvature), FrequencySlope: d(a.FrequencySlope, b.FrequencySlope)}
}

// less is a - b with the bars added.
func less(a, b result.Q) result.Q {
	return result.Q{Value: a.Value - b.Value, Error: a.Error + b.Error}
}
