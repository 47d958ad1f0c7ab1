// Package pulse turns the series that a pulse leaves at one place, on two rungs
// of a resolution ladder, into certified numbers: quasinormal frequencies, the
// exponent of the tail, and the series itself with an error bar on every
// sample. It does not know how the series were evolved.
//
// Units G = c = M = 1, times in M, frequencies in 1/M.
package pulse

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/result"
	"nullmark/extract/ringing"
	"nullmark/extract/tail"
)

// Signal is the field and its time derivative at one place, sample k at
// Start + k Step in the time that belongs there: u at null infinity, v at the
// horizon, t at a fixed radius.
type Signal struct {
	Start, Step float64
	Psi, Pi     []complex128
}

// Place is one mode at one place on two rungs of equal sampling. Coarse has a
// spacing and a time step 1/Ratio times those of Fine.
type Place struct {
	L, M         int
	Where        string // "infinity", "horizon", "radius 10"
	Ratio        float64
	Fine, Coarse Signal
}

// Wanted says what is sought.
type Wanted struct {
	Ringing   bool
	Overtones int                // besides the fundamental; 0 means 1
	Expected  []ringing.Expected // may be nil
	Tail      bool
}

// Outcome is what was found at one place. What was sought and not found has a
// warning in words.
type Outcome struct {
	Ringing []result.Ringing
	Fit     *ringing.Fit // amplitudes, phases, windows; nil without ringing
	Tail    *result.Tail
	Index   *tail.Fit // local index and windows; nil without a tail
	// Tones is the sum of the fitted modes at the samples of Fine.Psi, NaN before
	// the fit begins; nil without ringing.
	Tones []complex128
	Rungs float64 // share of the fundamental's bar that comes from the rungs' difference, absolute
	// Error is the bar of each sample of Fine.Psi.
	Error    []float64
	Warnings []string
}

// Share of the difference between the rungs that remains in the finer one, for
// a scheme of order 8: r^8/(1-r^8) with r = 0.8 is 0.2. The observed order of
// difference schemes of order 12 in space and time is higher, so this is on the
// safe side.
const assumedOrder = 8

func remaining(ratio float64) float64 {
	q := math.Pow(ratio, assumedOrder)
	return q / (1 - q)
}

// Measure analyses one place. It panics when the rungs are not sampled alike.
//
// Ringing is read from the time derivative at null infinity, where the tail is
// weaker by a factor u, and from the field elsewhere; the bar adds what the two
// rungs differ by, times the share that remains, to what the fit of the finer
// one says. A tail is read from the field.
func Measure(p Place, w Wanted) Outcome {
	n := len(p.Fine.Psi)
	if p.Fine.Step != p.Coarse.Step || p.Fine.Start != p.Coarse.Start || len(p.Coarse.Psi) != n || len(p.Fine.Pi) != n || len(p.Coarse.Pi) != n {
		panic("pulse: the two rungs are not sampled alike")
	}
	o := Outcome{Error: bars(p)}
	name := fmt.Sprintf("(%d,%d) at %s", p.L, p.M, p.Where)
	if w.Ringing {
		fit, rungs, err := ring(p, w)
		if err != nil {
			o.Warnings = append(o.Warnings, name+": "+err.Error())
		} else {
			o.Fit, o.Ringing, o.Rungs = fit, fit.Ringing(p.Where), rungs
			o.Tones = tones(p, fit)
			for _, s := range fit.Warnings {
				o.Warnings = append(o.Warnings, name+": "+s)
			}
		}
	}
	if w.Tail {
		fit, err := tail.Analyse(tail.Series{Start: p.Fine.Start, Step: p.Fine.Step, Values: largestPart(p.Fine.Psi, p.Fine.Psi), Other: largestPart(p.Coarse.Psi, p.Fine.Psi)}, tail.Options{Regular: p.Where != "infinity"})
		if err != nil {
			o.Warnings = append(o.Warnings, name+": "+err.Error())
		} else {
			q := fit.Tail(p.L, p.M, p.Where)
			o.Tail, o.Index = &q, fit
		}
	}
	return o
}

// tones samples the sum of the fitted modes like the field.
func tones(p Place, fit *ringing.Fit) []complex128 {
	integrals := 0
	if p.Where == "infinity" { // there the fit is to the time derivative
		integrals = 1
	}
	begin := fit.Begin()
	if math.IsInf(begin, 1) {
		return nil
	}
	out := make([]complex128, len(p.Fine.Psi))
	for k := range out {
		out[k] = cmplx.NaN()
		if t := p.Fine.Start + float64(k)*p.Fine.Step; t >= begin {
			out[k] = fit.Tones(t, integrals)
		}
	}
	return out
}

// bars gives every sample of the field its error: what remains of the
// difference between the rungs, taken as the largest within a few samples so
// that a zero of the difference is no zero of the bar, and the round-off of the
// largest sample so far seen at the place.
func bars(p Place) []float64 {
	n := len(p.Fine.Psi)
	share := 2 * remaining(p.Ratio)
	diff := make([]float64, n)
	for k := range diff {
		diff[k] = cmplx.Abs(p.Fine.Psi[k] - p.Coarse.Psi[k])
	}
	half := max(1, int(math.Ceil(2/p.Fine.Step)))
	out := make([]float64, n)
	for k := range out {
		top := 0.0
		for j := max(0, k-half); j <= min(n-1, k+half); j++ {
			top = math.Max(top, diff[j])
		}
		out[k] = share*top + 0x1p-52*cmplx.Abs(p.Fine.Psi[k])
	}
	return out
}

// ring fits both rungs and joins them. rungs is what the fundamental's bar has
// from the rungs' difference.
func ring(p Place, w Wanted) (fine *ringing.Fit, rungs float64, err error) {
	pick := func(s Signal) ringing.Series {
		y := s.Psi
		if p.Where == "infinity" {
			y = s.Pi
		}
		return ringing.Series{Start: s.Start, Step: s.Step, Values: y}
	}
	opt := ringing.Options{L: p.L, M: p.M, Overtones: w.Overtones, Expected: w.Expected}
	fine, err = ringing.Analyse(pick(p.Fine), opt)
	if err != nil {
		return nil, 0, err
	}
	coarse, err := ringing.Analyse(pick(p.Coarse), opt)
	if err != nil {
		var none *ringing.NotRinging
		if !errors.As(err, &none) {
			return nil, 0, err
		}
		coarse = &ringing.Fit{}
	}
	kept := fine.Modes[:0]
	for _, m := range fine.Modes {
		if m.Named {
			other := coarse.Find(m.L, m.M, m.N)
			if other == nil {
				fine.Warnings = append(fine.Warnings, fmt.Sprintf("(%d,%d) n = %d stands out on the finer grid alone and is left out", m.L, m.M, m.N))
				continue
			}
			share := remaining(p.Ratio)
			d := share * math.Hypot(m.Omega.Re.Value-other.Omega.Re.Value, m.Omega.Im.Value-other.Omega.Im.Value)
			m.Omega.Re.Error += d
			m.Omega.Im.Error += d
			if m.Own && m.N == 0 {
				rungs = d
			}
			m.Amplitude.Error += share * math.Abs(m.Amplitude.Value-other.Amplitude.Value)
			m.Phase.Error += share * math.Abs(math.Remainder(m.Phase.Value-other.Phase.Value, 2*math.Pi))
		}
		kept = append(kept, m)
	}
	fine.Modes = kept
	return fine, rungs, nil
}

// largestPart projects a complex series on the phase that ref has at its end:
// the real series that a tail is. For real fields it is the real part.
func largestPart(y, ref []complex128) []float64 {
	turn := complex128(1)
	for k := len(ref) - 1; k >= 0; k-- {
		if imag(ref[k]) != 0 {
			turn = complex(real(ref[k]), -imag(ref[k])) / complex(cmplx.Abs(ref[k]), 0)
			break
		}
		if real(ref[k]) != 0 {
			break
		}
	}
	out := make([]float64, len(y))
	for k, v := range y {
		out[k] = real(turn * v)
	}
	return out
}
