// Package tail measures the exponent p of a late-time power law
//
//	|psi| = C u^-p (1 + a/u + b/u^2 + ...)
//
// in a sampled series: the local power index -d ln|psi| / d ln u against time,
// and its limit for u to infinity with an error bar. Where round-off has eaten
// the tail it refuses.
//
// Units G = c = M = 1, times in M.
package tail

import (
	"fmt"
	"math"

	"nullmark/extract/result"
)

// Series is a uniformly sampled real signal, Values[k] at Start + k Step.
type Series struct {
	Start, Step float64
	Values      []float64 // read only
	// Other is the same signal from a second run whose errors are independent
	// (another grid), or nil. What the two exponents differ by then counts as
	// an error.
	Other []float64 // read only
}

// Options bound the search. Nil means: from the end of the ringing, to the end
// of what round-off leaves.
type Options struct {
	From, To *float64
	// Regular says that the corrections are a series in 1/u without early
	// logarithms, as at a fixed radius and on the horizon. Otherwise (null
	// infinity) both forms are tried and what they differ by is an error.
	Regular bool
}

// Index is the local power index with its bar at each of Times.
type Index struct {
	Times  []float64
	Values []result.Q
}

// Fit is the outcome.
type Fit struct {
	Exponent result.Q // p > 0 for decay
	// Window of the fit that moved least, and its number of correction terms.
	From, To float64
	Terms    int
	Fits     int // how many fits entered value and bar
	// Begin and End bound what could be used at all: after the last zero of
	// the ringing, before round-off takes over.
	Begin, End float64
	Level      float64 // round-off level of the series at End, absolute
	Local      Index   // local index from Begin to End
}

// Tail returns the fit as an entry of the result.
func (f *Fit) Tail(l, m int, where string) result.Tail {
	return result.Tail{L: l, M: m, Where: where, Exponent: f.Exponent}
}

// BadInput is a series or a window that cannot be analysed.
type BadInput struct {
	What, Want string
}

func (e *BadInput) Error() string { return fmt.Sprintf("tail: %s; give %s", e.What, e.Want) }

// NoTail says that the series never settles to one sign for long enough: it
// still rings, or there is nothing but noise.
type NoTail struct{ From, To float64 }

func (e *NoTail) Error() string {
	return fmt.Sprintf("tail: between %.6g M and %.6g M the signal keeps changing sign, so that no power law stands out; evolve longer (span.until), or start with a compact pulse", e.From, e.To)
}

// RoundOff refuses a tail that double precision no longer carries.
type RoundOff struct {
	Asked  float64 // the time from which a tail was asked for
	Since  float64 // the time from which round-off has taken over
	Level  float64 // absolute level of round-off
	Signal float64 // |psi| there
}

func (e *RoundOff) Error() string {
	return fmt.Sprintf("tail: from %.6g M on round-off (%.1e) eats the signal (%.1e), so that no exponent follows from %.6g M on; ask for an earlier time, or for data that decay more slowly (moving, not static; lower l)",
		e.Since, e.Level, e.Signal, e.Asked)
}

// Vague says that every fit moves by more than half a unit of the exponent.
type Vague struct {
	Exponent result.Q
	From, To float64
}

func (e *Vague) Error() string {
	return fmt.Sprintf("tail: between %.6g M and %.6g M the exponent is only known to be %.2g ± %.1g; evolve longer (span.until)", e.From, e.To, e.Exponent.Value, e.Exponent.Error)
}

const (
	eaten    = 0.02 // white noise over signal from which the tail counts as eaten
	parted   = 0.2  // difference of two runs over signal from which it does
	vague    = 0.5  // bar of an exponent that says nothing
	binWidth = 0.01 // of ln u
	minRatio = 1.7  // u2/u1 of a fit
	minBins  = 16
)

// Analyse finds the exponent. Errors: *BadInput, *NoTail, *RoundOff, *Vague
// (which carries the poor value).
func Analyse(s Series, o Options) (*Fit, error) {
	if err := check(s); err != nil {
		return nil, err
	}
	last := s.time(len(s.Values) - 1)
	lo, hi := math.Max(s.Start, s.Step), last
	if o.From != nil {
		lo = math.Max(lo, *o.From)
	}
	if o.To != nil {
		hi = math.Min(hi, *o.To)
	}
	if hi < 1.2*lo {
		return nil, &BadInput{fmt.Sprintf("the window from %.6g M to %.6g M is too short", lo, hi), "one whose end is at least twice its start, inside the series"}
	}
	noise := newNoise(s)
	begin, end, full := quiet(s, noise, lo, hi)
	if o.From != nil && full < 1.2*lo {
		k := s.index(math.Min(full, last))
		return nil, &RoundOff{Asked: lo, Since: full, Level: noise.level(k), Signal: math.Abs(s.Values[k])}
	}
	if end < minRatio*begin {
		if full < hi && full < minRatio*begin {
			k := s.index(full)
			return nil, &RoundOff{Asked: begin, Since: full, Level: noise.level(k), Signal: math.Abs(s.Values[k])}
		}
		return nil, &NoTail{lo, hi}
	}
	f := &Fit{Begin: begin, End: end, Level: noise.level(s.index(end))}
	f.Local = local(s, noise, begin, end)
	if !scan(s, f, o.Regular) {
		return nil, &NoTail{begin, end}
	}
	if f.Exponent.Error > vague {
		return nil, &Vague{f.Exponent, begin, end}
	}
	return f, nil
}

func (s Series) time(k int) float64 { return s.Start + float64(k)*s.Step }

// index is the sample at or after t, inside the series.
func (s Series) index(t float64) int {
	k := int(math.Ceil((t-s.Start)/s.Step - 1e-9))
	return max(0, min(k, len(s.Values)-1))
}

func check(s Series) error {
	if !(s.Step > 0) || math.IsInf(s.Step, 0) {
		return &BadInput{fmt.Sprintf("the sampling step is %g", s.Step), "a positive one"}
	}
	if len(s.Values) < 64 {
		return &BadInput{fmt.Sprintf("%d samples", len(s.Values)), "at least 64"}
	}
	if s.Other != nil && len(s.Other) != len(s.Values) {
		return &BadInput{fmt.Sprintf("a second run of %d samples beside %d", len(s.Other), len(s.Values)), "two runs of equal sampling"}
	}
	for _, y := range [][]float64{s.Values, s.Other} {
		for k, v := range y {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return &BadInput{fmt.Sprintf("sample %d at %.6g M is not finite", k, s.time(k)), "a finite series"}
			}
		}
	}
	return nil
}
