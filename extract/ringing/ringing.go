// Package ringing measures quasinormal frequencies in a time series: it fits
// sums of damped exponentials
//
//	y(t) = sum_j c_j exp(-i w_j (t - t_0)),   Im w_j < 0,
//
// on many windows and with many numbers of terms, keeps the frequencies that
// do not move when the window and the number of terms do, and quotes how much
// they still moved as their error bar. The frequencies themselves come from the
// data alone; a list of expected ones, where given, only puts names on them.
//
// Units G = c = M = 1: times in M, frequencies in 1/M.
package ringing

import (
	"fmt"

	"nullmark/extract/result"
)

// Series is a uniformly sampled signal: Values[k] at Start + k Step. A signal
// whose imaginary parts are all zero is treated as real: its frequencies come
// in pairs w, -conj(w), and the one with Re w > 0 is reported.
type Series struct {
	Start, Step float64
	Values      []complex128 // read only
}

// Expected is a frequency that may stand in the signal, given to name what is
// found. L, M, N label it; Omega need only be good to a few per cent.
type Expected struct {
	L, M, N int
	Omega   complex128
}

// Options say what is sought. The zero value looks for the fundamental and the
// first overtone on windows chosen from the signal.
type Options struct {
	L, M      int        // labels of the signal's own mode
	Overtones int        // how many overtones are wanted besides the fundamental; 0 means 1, negative none
	Expected  []Expected // names for neighbouring frequencies (mode mixing on Kerr); may be nil
	From, To  *float64   // bounds of every window, nil = chosen: peak + 10 M, end of the series
}

// Mode is one frequency found.
type Mode struct {
	L, M, N int
	Named   bool // false: a frequency that belongs to no expected name; N is -1
	Own     bool // true: l, m are those of the signal; false: a neighbour mixed in
	// Omega = Re + i Im, e^{-i omega t}, 1/M; absolute bars.
	Omega result.Complex
	// Amplitude and Phase (rad) of c in c exp(-i omega (t - Reference)). For
	// real signals the pair is y = 2 |c| cos(...), c belongs to Re omega > 0.
	Amplitude, Phase result.Q
	// Start and Length of the window, and the number of exponentials, of the
	// fit that moved least.
	Start, Length float64
	Terms         int
	Fits          int // how many fits entered the value and its bar
}

// Fit is the outcome of an analysis.
type Fit struct {
	Reference float64 // time of the largest |y|, to which amplitudes refer
	Modes     []Mode  // own modes by N, then neighbours, then unnamed ones
	Real      bool    // the series was real
	Residual  float64 // rms of the best fit's residual over the largest |y|
	Warnings  []string
}

// Ringing returns the own modes, and the named neighbours, as entries of the
// result for the given end ("infinity" or "horizon").
func (f *Fit) Ringing(where string) []result.Ringing {
	var out []result.Ringing
	for _, m := range f.Modes {
		if m.Named {
			out = append(out, result.Ringing{L: m.L, M: m.M, N: m.N, Re: m.Omega.Re, Im: m.Omega.Im, Where: where})
		}
	}
	return out
}

// Find returns the mode (l,m,n), or nil.
func (f *Fit) Find(l, m, n int) *Mode {
	for i := range f.Modes {
		if q := &f.Modes[i]; q.Named && q.L == l && q.M == m && q.N == n {
			return q
		}
	}
	return nil
}

// BadInput is a signal or a window that cannot be analysed.
type BadInput struct {
	What string // what is wrong
	Want string // what to give instead
}

func (e *BadInput) Error() string { return fmt.Sprintf("ringing: %s; give %s", e.What, e.Want) }

// EarlyWindow refuses a window that starts before the peak of the signal.
type EarlyWindow struct{ From, Peak float64 }

func (e *EarlyWindow) Error() string {
	return fmt.Sprintf("ringing: the window starts at %.6g M, before the peak of the signal at %.6g M, where it does not ring yet; start at %.6g M or later",
		e.From, e.Peak, e.Peak+settle)
}

// NotRinging says that no frequency stayed put under a change of the window.
type NotRinging struct{ From, To float64 }

func (e *NotRinging) Error() string {
	return fmt.Sprintf("ringing: no damped oscillation between %.6g M and %.6g M that keeps its frequency when the window moves", e.From, e.To)
}

// settle is the time after the peak before which a fit is warned about. A
// judgement, not a formula.
const settle = 10.0
