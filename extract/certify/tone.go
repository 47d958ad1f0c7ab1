// Package certify gives numbers their error bars: from the samples of two rungs
// of a resolution ladder it reads complex amplitudes and bounds what is wrong
// with them, term by term. The recipe and its constants were measured; the
// study that measured them is a test of the tree (see DEVELOPERS.md).
package certify

import (
	"math"
	"math/cmplx"

	"nullmark/extract/demod"
)

// End is one of the two ends of the grid.
type End int

// The two ends: null infinity and the horizon.
const (
	Infinity End = iota
	Horizon
)

func (e End) String() string {
	if e == Infinity {
		return "infinity"
	}
	return "the horizon"
}

// Samples are the field and its time derivative at both ends, every step:
// sample k belongs to slice tau = k Dt.
type Samples struct {
	Dt      float64
	Psi, Pi [2][]complex128 // indexed by End
}

// Until is the time of the last sample.
func (s *Samples) Until() float64 { return float64(len(s.Psi[0])-1) * s.Dt }

// Tone is what is known of one mode of a circular orbit: a steady signal
// Z e^{-i Omega tau} plus a start-up that dies away.
type Tone struct {
	L, M  int
	Omega float64 // m times the orbital frequency, > 0
	// On is when the source has come to full strength, M.
	On float64
}

// Period is 2 pi/Omega.
func (t Tone) Period() float64 { return 2 * math.Pi / t.Omega }

// WindowPower is the power k of the demodulation window sin^{2k} over k+1
// periods for an asked relative accuracy: smoother windows reject the start-up
// better and cost more periods.
func WindowPower(asked float64) int {
	switch {
	case asked >= 1e-6:
		return 1
	case asked >= 1e-8:
		return 2
	}
	return 4
}

// Reading is one amplitude with what the windows say about its transients.
type Reading struct {
	Z complex128 // amplitude of Psi, e^{-i Omega tau}
	// Pair is the relative difference between the amplitudes of Psi and of
	// Psi_tau/(-i Omega): zero for a pure tone, the key to junk and tails.
	Pair float64
	// Shift1, Shift2 are the relative changes of Z when the window moves back
	// once and twice.
	Shift1, Shift2 float64
}

// Transient bounds the relative error that start-up and tail leave in the
// reading at the given end for a window ending at until.
//
// At infinity: min{2P, max[2P min(1,(l+3)/(Omega T)), w]}; at the horizon
// 2 min{P, w}; w = S1 rho/(1-rho) extrapolates the geometric decay seen in
// shifted windows, rho = S1/S2 kept within 0.1 and 0.9: a window that reaches
// back into the switch-on makes S2 huge and would feign a faster decay.
func (r Reading) Transient(end End, tone Tone, until float64) float64 {
	w := math.Inf(1) // nothing to extrapolate from when there was no room to shift
	if !math.IsInf(r.Shift2, 1) {
		rho := 0.9
		if r.Shift2 > 0 {
			rho = math.Min(math.Max(r.Shift1/r.Shift2, 0.1), 0.9)
		}
		w = r.Shift1 * rho / (1 - rho)
	}
	if end == Horizon {
		return 2 * math.Min(r.Pair, w)
	}
	p := 2 * r.Pair
	return math.Min(p, math.Max(p*math.Min(1, float64(tone.L+3)/(tone.Omega*until)), w))
}

// shift is how far the windows of the transient estimate move back.
func shift(tone Tone, until float64) float64 {
	return math.Max(tone.Period(), 0.2*until)
}

// Earliest is the first time at which Read finds its windows after the ramp.
func Earliest(tone Tone, power int) float64 {
	return tone.On + float64(power+1)*tone.Period() + 40
}

// Read demodulates the samples at one end with a window of the given power
// ending at until.
func Read(s *Samples, end End, tone Tone, until float64, power int) (Reading, error) {
	length := float64(power+1) * tone.Period()
	minusIOmega := complex(0, -tone.Omega)
	psi := demod.Series{Dt: s.Dt, Values: s.Psi[end]}
	pi := demod.Series{Dt: s.Dt, Values: s.Pi[end]}
	at := func(t float64) (a, b complex128, err error) {
		w := demod.Window{Start: t - length, Length: length, Power: power}
		if a, err = demod.Amplitude(psi, w, tone.Omega); err != nil {
			return
		}
		b, err = demod.Amplitude(pi, w, tone.Omega)
		return a, b / minusIOmega, err
	}
	// Psi_tau is the better field at infinity (the tail is one power weaker),
	// Psi at the horizon.
	pick := func(a, b complex128) complex128 {
		if end == Infinity {
			return b
		}
		return a
	}
	a, b, err := at(until)
	if err != nil {
		return Reading{}, err
	}
	z := pick(a, b)
	r := Reading{Z: z, Pair: cmplx.Abs(a-b) / cmplx.Abs(z), Shift1: math.Inf(1), Shift2: math.Inf(1)}
	d := shift(tone, until)
	if until-2*d-length < 0 {
		return r, nil
	}
	a1, b1, err := at(until - d)
	if err != nil {
		return r, err
	}
	a2, b2, err := at(until - 2*d)
	if err != nil {
		return r, err
	}
	z1, z2 := pick(a1, b1), pick(a2, b2)
	r.Shift1 = cmplx.Abs(z-z1) / cmplx.Abs(z)
	r.Shift2 = cmplx.Abs(z1-z2) / cmplx.Abs(z)
	return r, nil
}
