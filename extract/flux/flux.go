// Package flux turns amplitudes of the master functions into fluxes of energy
// and angular momentum, and sums them over modes. Units G = c = M = 1, fluxes
// in (mu/M)^2 per coordinate time, positive when they leave the orbit.
package flux

import (
	"math"

	"nullmark/extract/result"
)

// Norm is (l+2)!/(l-2)!, l >= 2.
func Norm(l int) float64 {
	x := float64(l)
	return (x - 1) * x * (x + 1) * (x + 2)
}

// Steady is the flux of a master function of amplitude |Psi| = a at frequency
// omega = m Omega, m and -m together:
//
//	dE/dt = 2 (1/64 pi) (l+2)!/(l-2)! omega^2 a^2,  dL/dt = (m/omega) dE/dt,
//
// at either end, with the relative error bar of a.
//
// Source: K. Martel and E. Poisson, Phys. Rev. D 71, 104003 (2005), eqs for the
// fluxes in terms of the Zerilli–Moncrief and Cunningham–Price–Moncrief
// functions.
func Steady(l, m int, omega, a, relative float64) *result.Flux {
	e := Norm(l) / (32 * math.Pi) * omega * omega * a * a
	// (1+x)^2 - 1, the square's bar without linearising it.
	bar := e * relative * (2 + relative)
	k := float64(m) / omega
	return &result.Flux{
		Energy:          result.Q{Value: e, Error: bar},
		AngularMomentum: result.Q{Value: k * e, Error: k * bar},
	}
}

// Sum adds fluxes in order, nil entries left out, and their bars linearly:
// errors of modes on one grid add up coherently.
func Sum(parts ...*result.Flux) *result.Flux {
	var out *result.Flux
	for _, p := range parts {
		if p == nil {
			continue
		}
		if out == nil {
			out = &result.Flux{}
		}
		add(&out.Energy, p.Energy)
		add(&out.AngularMomentum, p.AngularMomentum)
	}
	return out
}

func add(a *result.Q, b result.Q) {
	a.Value += b.Value
	a.Error += b.Error
}

// Tail estimates what all l > L add to a sum whose parts by l (ascending to L,
// at least three) are given: with q = E_L/E_{L-1}, q' = 2q - E_{L-1}/E_{L-2}
// the value is E_L q'/(1-q') and its bar the distance from E_L q/(1-q), plus
// margin times the value. ok is false when the parts do not fall.
func Tail(byL []float64, margin float64) (q result.Q, ok bool) {
	n := len(byL)
	if n < 3 || byL[n-1] == 0 || byL[n-2] == 0 || byL[n-3] == 0 {
		return q, false
	}
	e := byL[n-1]
	r1 := e / byL[n-2]
	r0 := byL[n-2] / byL[n-3]
	r2 := 2*r1 - r0
	if !(r1 > 0 && r1 < 0.95 && r2 < 0.95) {
		return q, false
	}
	if r2 < 0 {
		r2 = r1
	}
	v := e * r2 / (1 - r2)
	return result.Q{Value: v, Error: math.Abs(v-e*r1/(1-r1)) + margin*math.Abs(v)}, true
}
