package ringing

import (
	"math"
	"math/cmplx"
)

// Begin is the earliest time from which one of the named modes was fitted; +Inf
// when there is none.
func (f *Fit) Begin() float64 {
	t := math.Inf(1)
	for i := range f.Modes {
		if f.Modes[i].Named {
			t = math.Min(t, f.Modes[i].Start)
		}
	}
	return t
}

// Tones is the sum of the named modes at time t, integrated over time as often as
// integrals says (once for a fit to the time derivative of what is to be shown):
//
//	sum_j c_j (-i omega_j)^-integrals exp(-i omega_j (t - Reference)),
//
// twice its real part for a fit to a real series.
func (f *Fit) Tones(t float64, integrals int) complex128 {
	var sum complex128
	for i := range f.Modes {
		m := &f.Modes[i]
		if !m.Named {
			continue
		}
		w := m.omega()
		sum += cmplx.Rect(m.Amplitude.Value, m.Phase.Value) * cmplx.Exp(-1i*w*complex(t-f.Reference, 0)) / cmplx.Pow(-1i*w, complex(float64(integrals), 0))
	}
	if f.Real {
		return complex(2*real(sum), 0)
	}
	return sum
}
