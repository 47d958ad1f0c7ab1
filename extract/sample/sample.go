// Package sample holds observers that record the field at the two ends of the
// grid, every step.
package sample

import "nullmark/extract/certify"

// Ends records complex modes laid out in lanes: mode q in lanes 2q (real) and
// 2q+1 (imaginary) of a state [Psi block][Pi block] with lanes numbers a point.
// It implements the evolution's observer and only reads the state.
type Ends struct {
	Modes []certify.Samples // one a mode
	lanes int
}

// NewEnds returns a recorder of n modes for steps of length dt; steps is a hint
// of how many will come.
func NewEnds(n, lanes int, dt float64, steps int) *Ends {
	e := &Ends{Modes: make([]certify.Samples, n), lanes: lanes}
	for q := range e.Modes {
		e.Modes[q].Dt = dt
		for end := range e.Modes[q].Psi {
			e.Modes[q].Psi[end] = make([]complex128, 0, steps+1)
			e.Modes[q].Pi[end] = make([]complex128, 0, steps+1)
		}
	}
	return e
}

// Grow makes room for steps more samples, so that observing them allocates
// nothing.
func (e *Ends) Grow(steps int) {
	for q := range e.Modes {
		for end := range e.Modes[q].Psi {
			e.Modes[q].Psi[end] = grow(e.Modes[q].Psi[end], steps)
			e.Modes[q].Pi[end] = grow(e.Modes[q].Pi[end], steps)
		}
	}
}

func grow(s []complex128, n int) []complex128 {
	if cap(s)-len(s) >= n {
		return s
	}
	out := make([]complex128, len(s), len(s)+n)
	copy(out, s)
	return out
}

// Observe implements the evolution's observer: null infinity is the last point,
// the horizon the first.
func (e *Ends) Observe(_ int, _ float64, u []float64) {
	half := len(u) / 2
	inf := half - e.lanes
	for q := range e.Modes {
		s := &e.Modes[q]
		a := 2 * q
		s.Psi[certify.Infinity] = append(s.Psi[certify.Infinity], complex(u[inf+a], u[inf+a+1]))
		s.Pi[certify.Infinity] = append(s.Pi[certify.Infinity], complex(u[half+inf+a], u[half+inf+a+1]))
		s.Psi[certify.Horizon] = append(s.Psi[certify.Horizon], complex(u[a], u[a+1]))
		s.Pi[certify.Horizon] = append(s.Pi[certify.Horizon], complex(u[half+a], u[half+a+1]))
	}
}
