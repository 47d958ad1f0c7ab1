package ringing

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
)

// The scan, in units of the damping time of the slowest oscillation where a
// length is meant.
const (
	startStep   = 0.35 // between two window starts
	startCount  = 20   // window starts
	lengthCount = 5    // window lengths
	firstLength = 5.5
	lengthRatio = 1.22 // between two lengths
	minTerms    = 4    // exponentials of a fit
	maxTerms    = 16
	termStep    = 2
	maxSamples  = 180 // of a window; denser signals are thinned
	minSamples  = 36
)

// cell is one fit: window start i, length j, number of exponentials k.
type cell struct {
	start, length float64
	terms         int
	omega         []complex128
	amp           []complex128 // at the window's start
	rss           float64
	samples       int
	top           float64 // largest |y| in the window
}

// finding is a pole of one cell with the distance it moves between neighbouring
// cells.
type finding struct {
	omega complex128
	moved float64
	cell  *cell
	index int
}

// Analyse finds the quasinormal frequencies in s.
//
// Every window of the scan gives one decomposition and, from it, the poles of
// every number of terms. A pole's spread is the largest distance to the nearest
// pole in the neighbouring fits (window start, window length, and number of
// terms one step on). The pole that moves least decides where a frequency is
// read off: value and bar come from all fits that move hardly more than it,
// polished by variable projection.
//
// s is not modified. Errors: *BadInput, *EarlyWindow, *NotRinging.
func Analyse(s Series, o Options) (*Fit, error) {
	peak, err := check(s)
	if err != nil {
		return nil, err
	}
	fit := &Fit{Reference: s.time(peak), Real: s.isReal()}
	from := fit.Reference + settle
	to := s.time(len(s.Values) - 1)
	if o.From != nil {
		from = *o.From
		if from < fit.Reference {
			return nil, &EarlyWindow{from, fit.Reference}
		}
		if from < fit.Reference+settle {
			fit.Warnings = append(fit.Warnings, fmt.Sprintf("the ringing is fitted from %.6g M, less than %g M after the peak at %.6g M: it may still carry the pulse itself", from, settle, fit.Reference))
		}
	}
	if o.To != nil && *o.To < to {
		to = *o.To
	}
	if to-from < minSamples*s.Step {
		return nil, &BadInput{fmt.Sprintf("only %.3g M of signal between %.6g M and %.6g M", math.Max(0, to-from), from, to),
			"a series that goes on for at least 60 M after the peak"}
	}
	rough, ok := guess(s, from, to)
	if !ok {
		return nil, &NotRinging{from, to}
	}
	cells := scan(s, from, to, -imag(rough))
	all := spreads(s, cells)
	groups := group(all)
	if len(groups) == 0 {
		return nil, &NotRinging{from, to}
	}
	first := groups[0][0]
	fit.Residual = math.Sqrt(first.cell.rss/float64(first.cell.samples)) / cmplx.Abs(s.Values[peak])
	for _, g := range groups {
		fit.Modes = append(fit.Modes, settleOn(s, fit.Reference, g))
	}
	name(fit, o)
	return fit, nil
}

func (s Series) time(k int) float64 { return s.Start + float64(k)*s.Step }

// check finds the peak and refuses what cannot be a signal.
func check(s Series) (peak int, err error) {
	if !(s.Step > 0) || math.IsInf(s.Step, 0) {
		return 0, &BadInput{fmt.Sprintf("the sampling step is %g", s.Step), "a positive one"}
	}
	top := 0.0
	for k, v := range s.Values {
		a := cmplx.Abs(v)
		if math.IsNaN(a) || math.IsInf(a, 0) {
			return 0, &BadInput{fmt.Sprintf("sample %d at %.6g M is not finite", k, s.time(k)), "a finite series"}
		}
		if a > top {
			top, peak = a, k
		}
	}
	if top == 0 {
		return 0, &BadInput{"the series is zero everywhere", "one that rings"}
	}
	return peak, nil
}

// isReal tells whether every imaginary part is zero.
func (s Series) isReal() bool {
	for _, v := range s.Values {
		if imag(v) != 0 {
			return false
		}
	}
	return true
}

// cut copies the window [start, start+length], thinned to at most maxSamples.
func (s Series) cut(start, length float64) (y []complex128, t0, h float64) {
	i0 := int(math.Ceil((start - s.Start) / s.Step * (1 - 1e-12)))
	n := int(math.Floor(length/s.Step)) + 1
	n = min(n, len(s.Values)-i0)
	stride := (n + maxSamples - 1) / maxSamples
	for k := i0; k < i0+n; k += stride {
		y = append(y, s.Values[k])
	}
	return y, s.time(i0), float64(stride) * s.Step
}

// oscillates tells a ringing pole from the exponentials that make up a tail or
// round-off: it decays, and turns by more than a fraction of a radian while it
// does.
func oscillates(w complex128) bool {
	return imag(w) < 0 && math.Abs(real(w)) > 0.15*-imag(w)
}

// frequencies turns poles z into w with z = exp(-i w h).
func frequencies(z []complex128, h float64) []complex128 {
	w := make([]complex128, len(z))
	for j := range z {
		w[j] = 1i * cmplx.Log(z[j]) / complex(h, 0)
	}
	return w
}

// guess estimates the strongest slowly damped oscillation, only to set the
// scale of the scan.
func guess(s Series, from, to float64) (complex128, bool) {
	best, weight := complex128(0), 0.0
	for _, wait := range []float64{10, 25, 40} {
		length := math.Min(60, to-from-wait)
		y, _, h := s.cut(from+wait, length)
		if len(y) < minSamples {
			continue
		}
		sub, ok := newSubspace(y)
		if !ok {
			continue
		}
		z, ok := sub.poles(6)
		if !ok {
			continue
		}
		m, _, ok := amplitudes(y, h, frequencies(z, h))
		if !ok {
			continue
		}
		top := 0.0
		for _, v := range y {
			top = math.Max(top, cmplx.Abs(v))
		}
		for j, w := range m.omega {
			if !oscillates(w) || -imag(w)*length < 0.5 {
				continue
			}
			// energy of the term over the window, relative to the signal
			e := cmplx.Abs(m.amp[j]) / top / math.Sqrt(-imag(w))
			if e > weight {
				best, weight = w, e
			}
		}
	}
	return best, weight > 0
}

// grid3 indexes cells by start, length and terms; nil where no fit exists.
type grid3 [][][]*cell

// scan fits every window and number of terms.
func scan(s Series, from, to, damping float64) grid3 {
	span := to - from
	var lengths []float64
	for j := range lengthCount {
		lengths = append(lengths, firstLength*math.Pow(lengthRatio, float64(j))/damping)
	}
	if longest := lengths[len(lengths)-1]; longest > 0.8*span {
		for j := range lengths {
			lengths[j] *= 0.8 * span / longest
		}
	}
	g := make(grid3, startCount)
	for i := range g {
		start := from + float64(i)*startStep/damping
		g[i] = make([][]*cell, lengthCount)
		for j, length := range lengths {
			g[i][j] = make([]*cell, (maxTerms-minTerms)/termStep+1)
			if start+length > to {
				continue
			}
			y, t0, h := s.cut(start, length)
			if len(y) < minSamples {
				continue
			}
			sub, ok := newSubspace(y)
			if !ok {
				continue
			}
			top := 0.0
			for _, v := range y {
				top = math.Max(top, cmplx.Abs(v))
			}
			for k := range g[i][j] {
				terms := minTerms + k*termStep
				if 3*terms > len(y) {
					break
				}
				z, ok := sub.poles(terms)
				if !ok {
					continue
				}
				m, _, ok := amplitudes(y, h, frequencies(z, h))
				if !ok {
					continue
				}
				g[i][j][k] = &cell{t0, length, terms, m.omega, m.amp, m.rss, len(y), top}
			}
		}
	}
	return g
}

// spreads lists every oscillating pole with how far it moves.
func spreads(s Series, g grid3) []finding {
	real0 := s.isReal()
	at := func(i, j, k int) *cell {
		if i < 0 || i >= len(g) || j < 0 || j >= len(g[i]) || k < 0 || k >= len(g[i][j]) {
			return nil
		}
		return g[i][j][k]
	}
	var all []finding
	for i := range g {
		for j := range g[i] {
			for k, c := range g[i][j] {
				if c == nil {
					continue
				}
				var near []*cell
				starts, others := 0, 0
				for _, d := range [][3]int{{-1, 0, 0}, {1, 0, 0}, {0, -1, 0}, {0, 1, 0}, {0, 0, 1}} {
					if n := at(i+d[0], j+d[1], k+d[2]); n != nil {
						near = append(near, n)
						if d[0] != 0 {
							starts++
						} else {
							others++
						}
					}
				}
				if starts == 0 || others < 2 {
					continue
				}
				for q, w := range c.omega {
					if !oscillates(w) || (real0 && real(w) < 0) || cmplx.Abs(c.amp[q]) < 1e-12*c.top {
						continue
					}
					moved := 0.0
					for _, n := range near {
						d := math.Inf(1)
						for _, v := range n.omega {
							d = math.Min(d, cmplx.Abs(v-w))
						}
						moved = math.Max(moved, d)
					}
					all = append(all, finding{omega: w, moved: moved, cell: c, index: q})
				}
			}
		}
	}
	sort.SliceStable(all, func(a, b int) bool {
		return all[a].moved/cmplx.Abs(all[a].omega) < all[b].moved/cmplx.Abs(all[b].omega)
	})
	return all
}

// group collects the findings around the ones that move least; a group's first
// element is its steadiest. Findings closer to a seed than half the smallest
// damping rate belong to it. Seeds that move by more than a tenth are none.
func group(all []finding) [][]finding {
	var seeds []finding
	for _, f := range all {
		if f.moved > 0.1*cmplx.Abs(f.omega) {
			break
		}
		apart := true
		for _, s := range seeds {
			if cmplx.Abs(f.omega-s.omega) < 0.5*-imag(seeds[0].omega) {
				apart = false
				break
			}
		}
		if apart {
			seeds = append(seeds, f)
		}
	}
	groups := make([][]finding, len(seeds))
	for _, f := range all {
		if len(seeds) == 0 {
			return nil
		}
		best, dist := -1, 0.5*-imag(seeds[0].omega)
		for i, s := range seeds {
			if d := cmplx.Abs(f.omega - s.omega); d < dist {
				best, dist = i, d
			}
		}
		if best >= 0 {
			groups[best] = append(groups[best], f)
		}
	}
	return groups
}
