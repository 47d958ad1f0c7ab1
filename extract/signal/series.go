// Package signal holds uniformly sampled complex series with a bar on every
// sample, and what can be asked of them locally (value and derivatives at any
// time, each with a bound), of their phase, and of integrals over them. It
// knows nothing of how the samples were made.
package signal

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/strain"
)

const epsilon = 2.220446049250313e-16

// Series is sampled uniformly: sample k at Start + k Dt. Err[k] >= 0 bounds the
// modulus of the error of Values[k]; nil means round-off only.
type Series struct {
	Start, Dt float64
	Values    []complex128
	Err       []float64
}

// Time is that of sample k.
func (s Series) Time(k int) float64 { return s.Start + float64(k)*s.Dt }

// End is the time of the last sample.
func (s Series) End() float64 { return s.Time(len(s.Values) - 1) }

// Bar is the bound of sample k's error: that of Err, but no less than its
// round-off.
func (s Series) Bar(k int) float64 {
	b := epsilon * cmplx.Abs(s.Values[k])
	if s.Err != nil {
		b = math.Max(b, s.Err[k])
	}
	return b
}

// Fault says what is wrong with a series or with what was asked of it.
type Fault struct{ What string }

func (f *Fault) Error() string { return "signal: " + f.What }

// Check reports the first fault: too few samples, a step that is not positive,
// a bar list of another length, a value that is not finite or a bar below 0.
func (s Series) Check() error {
	switch {
	case len(s.Values) < 2*reach+1:
		return &Fault{fmt.Sprintf("%d samples, at least %d are wanted", len(s.Values), 2*reach+1)}
	case !(s.Dt > 0) || math.IsInf(s.Dt, 0) || math.IsNaN(s.Start) || math.IsInf(s.Start, 0):
		return &Fault{fmt.Sprintf("samples start at %g in steps of %g, a finite start and a positive step are wanted", s.Start, s.Dt)}
	case s.Err != nil && len(s.Err) != len(s.Values):
		return &Fault{fmt.Sprintf("%d bars for %d samples", len(s.Err), len(s.Values))}
	}
	for k, v := range s.Values {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return &Fault{fmt.Sprintf("sample %d (time %g) is not finite", k, s.Time(k))}
		}
		if s.Err != nil && !(s.Err[k] >= 0 && !math.IsInf(s.Err[k], 0)) {
			return &Fault{fmt.Sprintf("the bar of sample %d (time %g) is %g, a finite one >= 0 is wanted", k, s.Time(k), s.Err[k])}
		}
	}
	return nil
}

// Same says whether two series have the same sample times, up to a rounding.
func Same(a, b Series) bool {
	slack := 1e-9 * a.Dt
	return len(a.Values) == len(b.Values) && math.Abs(a.Start-b.Start) <= slack &&
		math.Abs(a.End()-b.End()) <= slack
}

// Span returns the first and the last index whose times lie in [from, to]
// (a rounding outside is allowed). Both zero means the whole series. It fails
// when fewer than two samples lie there or when the interval leaves the series
// by more than a step.
func (s Series) Span(from, to float64) (first, last int, err error) {
	if from == 0 && to == 0 {
		return 0, len(s.Values) - 1, nil
	}
	const slack = 1e-6
	if !(from < to) || from < s.Start-s.Dt || to > s.End()+s.Dt {
		return 0, 0, &Fault{fmt.Sprintf("the interval [%g, %g] is not inside the samples [%g, %g]", from, to, s.Start, s.End())}
	}
	first = max(0, int(math.Ceil((from-s.Start)/s.Dt-slack)))
	last = min(len(s.Values)-1, int(math.Floor((to-s.Start)/s.Dt+slack)))
	if last <= first {
		return 0, 0, &Fault{fmt.Sprintf("fewer than two samples lie in [%g, %g]", from, to)}
	}
	return first, last, nil
}

// Onto resamples b at the times of those samples of a that lie inside b, and
// returns both on these common times. Bars are taken from the nearest samples
// (the larger of the two around). The result shares no memory with b; that of a
// is a part of a.
func Onto(a, b Series) (on, resampled Series, err error) {
	if Same(a, b) {
		return a, b, nil
	}
	first, last := 0, len(a.Values)-1
	for first <= last && a.Time(first) < b.Start-1e-9*b.Dt {
		first++
	}
	for last >= first && a.Time(last) > b.End()+1e-9*b.Dt {
		last--
	}
	if last-first < 2*reach || len(b.Values) < 2*reach+1 {
		return on, resampled, &Fault{fmt.Sprintf("the samples [%g, %g] and [%g, %g] have too little time in common", a.Start, a.End(), b.Start, b.End())}
	}
	on = a.Part(first, last)
	at := make([]float64, len(on.Values))
	for k := range at {
		at[k] = on.Time(k)
	}
	resampled = Series{Start: on.Start, Dt: on.Dt, Values: strain.Resample(b.Values, b.Start, b.Dt, at)}
	if b.Err != nil {
		resampled.Err = make([]float64, len(at))
		for k, t := range at {
			j := max(0, min(int(math.Floor((t-b.Start)/b.Dt)), len(b.Err)-1))
			resampled.Err[k] = math.Max(b.Err[j], b.Err[min(j+1, len(b.Err)-1)])
		}
	}
	return on, resampled, nil
}

// Part is the series of the samples first..last, sharing memory with s.
func (s Series) Part(first, last int) Series {
	p := Series{Start: s.Time(first), Dt: s.Dt, Values: s.Values[first : last+1]}
	if s.Err != nil {
		p.Err = s.Err[first : last+1]
	}
	return p
}
