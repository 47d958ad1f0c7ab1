package compare

import (
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// blur is the relative bar above which a sample's phase and amplitude are not
// compared: the reference itself does not know them.
const blur = 0.3

// pair is one mode of model and reference on the same samples.
type pair struct {
	l, m       int
	u          []float64
	model, ref []complex128
	refBar     []float64 // the reference's own bar, absolute
	readBar    []float64 // what reading the model adds, and the model's own bar
	reading    float64   // the largest bar that reading alone adds
	scale      float64   // largest |ref|
	omega      []float64 // the reference's frequency, rad/M
	curves     result.ModeCurves
}

// bar is the bar of |model - ref| at sample i. It never falls below round-off.
func (p *pair) bar(i int) float64 {
	return p.refBar[i] + p.readBar[i] + 8*2.2e-16*cmplx.Abs(p.ref[i])
}

// ratio is |model - ref| over its bar.
func (p *pair) ratio(i int) float64 {
	d := cmplx.Abs(p.model[i] - p.ref[i])
	if d == 0 {
		return 0
	}
	if b := p.bar(i); b > 0 {
		return math.Min(d/b, math.MaxFloat64)
	}
	return math.MaxFloat64
}

// measure fills scale, omega and curves.
func (p *pair) measure() {
	n := len(p.u)
	nan := math.NaN()
	p.scale = 0
	for _, h := range p.ref {
		p.scale = math.Max(p.scale, cmplx.Abs(h))
	}
	p.omega = make([]float64, n)
	for i := range p.omega {
		a, b := max(i-1, 0), min(i+1, n-1)
		p.omega[i] = -cmplx.Phase(p.ref[b]*cmplx.Conj(p.ref[a])) / (p.u[b] - p.u[a])
	}
	c := &p.curves
	*c = result.ModeCurves{L: p.l, M: p.m, Model: p.model, Reference: p.ref, Amp: make([]float64, n), AmpBar: make([]float64, n)}
	if p.m == 0 { // real up to a constant phase: one signed difference against the peak
		turn := p.plane()
		for i := range p.u {
			if p.scale == 0 {
				c.Amp[i] = nan
				continue
			}
			c.Amp[i] = real((p.model[i]-p.ref[i])*turn) / p.scale
			c.AmpBar[i] = p.bar(i) / p.scale
		}
		return
	}
	c.Phase, c.PhaseBar = make([]float64, n), make([]float64, n)
	c.Freq, c.FreqBar = make([]float64, n), make([]float64, n)
	last, have := 0.0, false
	for i := range p.u {
		a := cmplx.Abs(p.ref[i])
		rel := p.bar(i) / a
		c.PhaseBar[i], c.AmpBar[i] = rel, rel
		c.Phase[i], c.Amp[i] = nan, nan
		if !(rel < blur) {
			continue
		}
		c.Amp[i] = cmplx.Abs(p.model[i])/a - 1
		if p.model[i] == 0 {
			continue
		}
		d := -cmplx.Phase(p.model[i] * cmplx.Conj(p.ref[i]))
		if have {
			d += 2 * math.Pi * math.Round((last-d)/(2*math.Pi))
		}
		c.Phase[i], last, have = d, d, true
	}
	for i := range p.u {
		a, b := max(i-1, 0), min(i+1, n-1)
		c.Freq[i] = (c.Phase[b] - c.Phase[a]) / (p.u[b] - p.u[a]) // NaN beside gaps
		if math.IsNaN(c.Phase[i]) {
			c.Freq[i] = nan
		}
		c.FreqBar[i] = 2 * math.Abs(p.omega[i]) * c.PhaseBar[i]
	}
}

// plane returns the unit number that turns an m = 0 reference onto the real
// axis.
func (p *pair) plane() complex128 {
	var s complex128
	for _, h := range p.ref {
		s += h * h
	}
	if s == 0 {
		return 1
	}
	return cmplx.Exp(complex(0, -cmplx.Phase(s)/2))
}

// marker is a named time.
type marker struct {
	name string
	u    float64
}

// stage is a named range of samples, from (inclusive) to to (exclusive).
type stage struct {
	name     string
	from, to int
}

// weights are those of mean and slope: 1/max(b, f)^2, zero in gaps, where f is
// a hundredth of the largest certain difference (at least the smallest bar). So all
// samples count alike as long as their bars are small beside what is seen, and
// samples that the reference hardly knows count little.
func weights(y, b []float64, largest result.Q) []float64 {
	f := math.Inf(1)
	for i := range y {
		if !math.IsNaN(y[i]) {
			f = math.Min(f, b[i])
		}
	}
	f = math.Max(f, 0.01*(math.Abs(largest.Value)-largest.Error))
	w := make([]float64, len(y))
	for i := range y {
		switch {
		case math.IsNaN(y[i]):
		case b[i] <= f:
			w[i] = 1
		default:
			w[i] = (f / b[i]) * (f / b[i])
		}
	}
	return w
}

// condense makes a Difference of the curve y with bars b. The bars of mean and
// slope are the bounds for errors that conspire.
func condense(u, y, b []float64, marks []marker, stages []stage) *result.Difference {
	d := &result.Difference{ByStage: map[string]result.Q{}, At: []result.MarkedQ{}}
	var ok bool
	if d.Max, ok = largest(y, b); !ok {
		return nil
	}
	w := weights(y, b, d.Max)
	var s0, s1 float64
	for i := range y {
		s0 += w[i]
		s1 += w[i] * (u[i] - u[0])
	}
	mid := u[0] + s1/s0
	var s2, mean, meanBar, slope, slopeBar float64
	for i := range y {
		if w[i] == 0 {
			continue
		}
		t := u[i] - mid
		s2 += w[i] * t * t
		mean += w[i] * y[i]
		meanBar += w[i] * b[i]
		slope += w[i] * t * y[i]
		slopeBar += w[i] * math.Abs(t) * b[i]
	}
	d.Mean = result.Q{Value: mean / s0, Error: meanBar / s0}
	if s2 > 0 {
		d.Slope = result.Q{Value: slope / s2, Error: slopeBar / s2}
	}
	for _, m := range marks {
		if i := nearest(u, m.u); i >= 0 && !math.IsNaN(y[i]) {
			d.At = append(d.At, result.MarkedQ{Marker: m.name, U: u[i], Value: result.Q{Value: y[i], Error: b[i]}})
		}
	}
	for _, s := range stages {
		if q, ok := largest(y[s.from:s.to], b[s.from:s.to]); ok {
			d.ByStage[s.name] = q
		}
	}
	return d
}

// largest returns the difference of which most is certain: the largest |y| less
// found times its bar, else the largest |y| less its bar, else the largest |y|.
func largest(y, b []float64) (result.Q, bool) {
	best, rank := -1, 0
	sure := 0.0
	for i := range y {
		if math.IsNaN(y[i]) {
			continue
		}
		a := math.Abs(y[i])
		r, x := 0, a
		switch {
		case a > found*b[i]:
			r, x = 2, a-found*b[i]
		case a > b[i]:
			r, x = 1, a-b[i]
		}
		if best < 0 || r > rank || r == rank && x > sure {
			best, rank, sure = i, r, x
		}
	}
	if best < 0 {
		return result.Q{}, false
	}
	return result.Q{Value: y[best], Error: b[best]}, true
}

// nearest returns the sample closest to x, or -1 when x lies outside.
func nearest(u []float64, x float64) int {
	n := len(u)
	if n == 0 || !(x >= u[0]-1e-9 && x <= u[n-1]+1e-9) {
		return -1
	}
	lo, hi := 0, n-1
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; u[mid] <= x {
			lo = mid
		} else {
			hi = mid
		}
	}
	if x-u[lo] <= u[hi]-x {
		return lo
	}
	return hi
}
